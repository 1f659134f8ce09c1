//! Where the way of a signal meets the conductors: ports of the way become entries of current.

use super::course::Course;
use super::landing::{Landed, Landings};
use super::route::{Port, PortPlace};
use super::{End, Entry};
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;

/// Ports on one plane: landings with their currents, and what was assumed.
type OnPlane = (Vec<(Landed, f64)>, Vec<Diagnostic>);

/// Finds where each port meets a plane.
pub fn land(landings: &Landings<'_, '_>, course: &Course<'_>, ports: &[Port]) -> Result<OnPlane, Diagnostic> {
    let mut found: Vec<(Landed, f64)> = Vec::new();
    let mut notes = Vec::new();
    for port in ports {
        let (landed, key) = match port.place {
            PortPlace::Driver(pin) => {
                (landings.at_pin(pin, course.driver_landing, "driver_landing"), "driver_landing")
            }
            PortPlace::Receiver(pin) => {
                (landings.at_pin(pin, course.receiver_landing, "receiver_landing"), "receiver_landing")
            }
            PortPlace::Pin(pin) => (landings.at_pin(pin, None, "through"), "through"),
            PortPlace::Area { layer, at, .. } => {
                let text = format!(
                    "{} runs in an area of its own net on L{}, which is not part of plane `{}`",
                    course.who,
                    layer + 1,
                    landings.plane()
                );
                return Err(Diagnostic::warning(code::PLANES_APART, text).on_board(Some(layer + 1), at));
            }
        };
        let landed = landed.map_err(|message| course.in_review(key, message))?;
        if let Some(assumed) = &landed.assumed {
            let text = format!("{}: {assumed}", course.who);
            notes.push(Diagnostic::note(code::LANDING_NEAREST_VIA, text));
        }
        match found.iter_mut().find(|known| known.0.landing.at == landed.landing.at) {
            Some(known) => known.1 += port.current,
            None => found.push((landed, port.current)),
        }
    }
    const NOTHING: f64 = 1e-12;
    found.retain(|landed| landed.1.abs() > NOTHING);
    Ok((found, notes))
}

/// The entries of landings on a layer.
pub fn entries(layer: usize, landed: &[(Landed, f64)]) -> Vec<Entry> {
    let entry = |(landed, current): &(Landed, f64)| Entry {
        end: End::Copper {
            layer,
            area: landed.area,
            at: landed.landing.at,
            radius_m: landed.landing.radius_m,
        },
        current: *current,
        what: landed.landing.what.clone(),
    };
    landed.iter().map(entry).collect()
}
