//! The capacitance of a line against the planes, and how the current of an unterminated line falls along it.
//!
//! Given the legs of a way with their shares and a load, gives legs whose current falls along them, and ports where the
//! displacement current enters the copper under the track.
//!
//! Model: the line is short against the wavelength, so its voltage is the same all along; the current at a place is that
//! which charges everything beyond, I(s)/I(0) = (C beyond s)/(C of all), the same at every frequency. C per length is
//! that of a strip over the nearest plane (Hammerstad and Jensen), or between two planes the mean of the symmetric
//! striplines at the two distances (common practice). The current falls in steps of at most one hundredth, each in the
//! middle of the piece that it stands for, so it is within half a step of the true one; the step enters the plane there,
//! spread over half the track's width and the height.
//!
//! Holds when: the line is open but for the load's capacitance, and shorter than a tenth of the wavelength.
//!
//! Checked by: `an_open_line_draws_its_current_along_the_way` in tests/plan,
//! `plane_current_follows_the_track_of_an_open_line` in tests/field.

use super::TrackLeg;
use super::route::{Port, PortPlace, Way};
use super::terrain::Terrain;
use super::touch::point_at;
use crate::board::Stackup;
use crate::geom::Point;
use crate::spread::{microstrip, stripline_constants};

/// Largest step of the current, as a part of the driver's.
const STEP: f64 = 0.01;
/// Ends nearer than this are one place, in metres.
const SAME_M: f64 = 1e-7;

/// Capacitance of a way in farad, against the planes nearest to each of its legs; `own` are the nets of the way.
pub fn capacitance_f(terrain: &Terrain<'_>, own: &[&str], legs: &[TrackLeg]) -> f64 {
    legs.iter().map(|leg| leg_capacitance_f(terrain, own, leg)).sum()
}

fn leg_capacitance_f(terrain: &Terrain<'_>, own: &[&str], leg: &TrackLeg) -> f64 {
    let stackup = &terrain.board.stackup;
    let middle = (leg.from + leg.to) * 0.5;
    let [above, below] = around(terrain, own, leg.layer, middle);
    let per_m = match (above, below) {
        (Some(above), Some(below)) => {
            let side = |layer: usize| {
                let (gap_m, er) = (stackup.gap_m(leg.layer, layer), permittivity(stackup, leg.layer, layer));
                stripline_constants::capacitance_per_m(leg.width_m / (2.0 * gap_m), er)
            };
            0.5 * (side(above.0) + side(below.0))
        }
        (Some(plane), None) | (None, Some(plane)) => {
            let (gap_m, er) = (stackup.gap_m(leg.layer, plane.0), permittivity(stackup, leg.layer, plane.0));
            microstrip::capacitance_per_m(leg.width_m / gap_m, er)
        }
        (None, None) => 0.0,
    };
    per_m * leg.from.distance(leg.to)
}

/// Layer and index of the nearest area above and below a point of a layer, copper of the nets `own` left out.
fn around(terrain: &Terrain<'_>, own: &[&str], layer: usize, at: Point) -> [Option<(usize, usize)>; 2] {
    let look = |other: usize| {
        let area = terrain.area_at(other, at)?;
        let net = terrain.net_name(terrain.net_of(other, area));
        (!own.contains(&net)).then_some((other, area))
    };
    [(0..layer).rev().find_map(look), (layer + 1..terrain.board.layers.len()).find_map(look)]
}

/// The nearer of the two.
fn nearest_copper(terrain: &Terrain<'_>, own: &[&str], layer: usize, at: Point) -> Option<(usize, usize)> {
    let gap_m = |place: &(usize, usize)| terrain.board.stackup.gap_m(layer, place.0);
    around(terrain, own, layer, at).into_iter().flatten().min_by(|a, b| gap_m(a).total_cmp(&gap_m(b)))
}

/// Permittivity between two layers: sheets in series.
fn permittivity(stackup: &Stackup, a: usize, b: usize) -> f64 {
    let sheets = &stackup.dielectrics[a.min(b)..a.max(b)];
    let (mut thickness, mut reduced) = (0.0, 0.0);
    for sheet in sheets {
        thickness += sheet.thickness_m;
        reduced += sheet.thickness_m / sheet.permittivity;
    }
    if reduced > 0.0 { thickness / reduced } else { 1.0 }
}

/// Lets the current of an open way fall along it: `load_f` is the capacitance of all receivers together, which share
/// it as they share the current. The way is one line, not yet joined with another.
pub fn fall(terrain: &Terrain<'_>, own: &[&str], way: &mut Way, load_f: f64) {
    let legs = std::mem::take(&mut way.legs);
    let own_f: Vec<f64> = legs.iter().map(|leg| leg_capacitance_f(terrain, own, leg)).collect();
    let size = legs.iter().map(|leg| leg.current.abs()).fold(0.0, f64::max);
    let sign = legs.first().map_or(1.0, |leg| leg.current.signum());
    if size <= 0.0 {
        way.legs = legs;
        return;
    }
    let parent: Vec<Option<usize>> = (0..legs.len()).map(|leg| parent(&legs, leg)).collect();
    // What hangs behind each leg: its own line, its receivers, and all legs that go on from its end.
    let mut behind_f = own_f.clone();
    let mut passed_on = vec![0.0; legs.len()];
    for leg in (0..legs.len()).rev() {
        let shared = (legs[leg].current.abs() - passed_on[leg]).max(0.0) / size;
        behind_f[leg] += load_f * shared;
        if let Some(parent) = parent[leg] {
            behind_f[parent] += behind_f[leg];
            passed_on[parent] += legs[leg].current.abs();
        }
    }
    let total_f: f64 = (0..legs.len()).filter(|&leg| parent[leg].is_none()).map(|leg| behind_f[leg]).sum();
    if total_f <= 0.0 {
        way.legs = legs;
        return;
    }
    let amperes = sign * size;
    let mut entered = 0.0;
    let mut late = 0.0;
    for (index, leg) in legs.iter().enumerate() {
        let start = behind_f[index] / total_f;
        let drop = own_f[index] / total_f;
        let steps = (drop / STEP).ceil().max(1.0) as usize;
        let mut from = leg.from;
        for step in 0..steps {
            let part = (step as f64 + 0.5) / steps as f64;
            let at = point_at((leg.from, leg.to), part);
            let current = amperes * (start - drop * step as f64 / steps as f64);
            way.legs.push(TrackLeg { from, to: at, current, ..*leg });
            from = at;
            let taken = amperes * drop / steps as f64 + late;
            // Over a void the displacement current enters where there is copper again.
            late = match nearest_copper(terrain, own, leg.layer, at) {
                Some((layer, area)) => {
                    let gap_m = terrain.board.stackup.gap_m(leg.layer, layer);
                    let radius_m = 0.5 * leg.width_m + gap_m;
                    way.ports
                        .push(Port { place: PortPlace::Area { layer, area, at, radius_m }, current: taken });
                    entered += taken;
                    0.0
                }
                None => taken,
            };
        }
        way.legs.push(TrackLeg { from, to: leg.to, current: amperes * (start - drop), ..*leg });
    }
    // What does not enter along the way enters at the receivers, in their shares.
    for port in way.ports.iter_mut().filter(|port| matches!(port.place, PortPlace::Receiver(_))) {
        port.current -= port.current / amperes * entered;
    }
}

/// The leg at whose end a leg starts: the one before it, or for a branch the one that ends there.
fn parent(legs: &[TrackLeg], leg: usize) -> Option<usize> {
    let before = leg.checked_sub(1)?;
    let ends_here = |other: usize| legs[other].to.distance(legs[leg].from) < SAME_M;
    if ends_here(before) {
        return Some(before);
    }
    if legs[0].from.distance(legs[leg].from) < SAME_M {
        return None;
    }
    (0..before).rev().find(|&other| ends_here(other)).or(Some(before))
}
