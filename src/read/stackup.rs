//! The stackup: thicknesses and permittivities from the job file, stated assumptions where it is silent.

use super::job::{Job, Material};
use crate::board::{Dielectric, Foil, Origin, Stackup};
use crate::diag::Diagnostic;
use crate::diag::code::read as code;

/// Copper thickness where the files give none: 35 um, one ounce per square foot (common practice).
pub const ASSUMED_FOIL_M: f64 = 35e-6;
/// Relative permittivity where the files give none: glass-epoxy laminate (common practice).
pub const ASSUMED_PERMITTIVITY: f64 = 4.3;
/// Board thickness where the files give none, in metres (common practice).
pub const ASSUMED_BOARD_M: f64 = 1.6e-3;
/// Copper temperature in degC where the review gives none.
pub const ASSUMED_TEMPERATURE_C: f64 = 20.0;

/// The stackup of a board with `n_layers` copper layers.
pub fn stackup(n_layers: usize, job: Option<&(Job, String)>, messages: &mut Vec<Diagnostic>) -> Stackup {
    let warn = |text: String| {
        let mut message = Diagnostic::warning(code::STACKUP_ASSUMED, text)
            .hint("give the values of your manufacturer in the review's `[stackup]`");
        message.place.file = job.map(|(_, file)| file.clone());
        message
    };
    let listed = job.map_or(&[][..], |(job, _)| job.stackup.as_slice());
    let n_copper = listed.iter().filter(|material| material.copper).count();
    let usable = n_copper == n_layers && n_layers > 0;
    if !listed.is_empty() && !usable {
        messages.push(warn(format!(
            "the job file's stackup must have the board's {n_layers} copper layers; got {n_copper}; it is left out"
        )));
    }
    let (foils_listed, between) = if usable { split(listed) } else { (vec![None; n_layers], Vec::new()) };
    let mut foils = Vec::new();
    let mut assumed_foils = Vec::new();
    for index in 0..n_layers {
        foils.push(match foils_listed.get(index).copied().flatten() {
            Some(thickness_m) => Foil { thickness_m, origin: Origin::File },
            None => {
                assumed_foils.push(format!("L{}", index + 1));
                Foil { thickness_m: ASSUMED_FOIL_M, origin: Origin::Assumed }
            }
        });
    }
    if !assumed_foils.is_empty() {
        let um = ASSUMED_FOIL_M * 1e6;
        messages.push(warn(format!(
            "the files give no copper thickness for {}; assumed {um} um",
            assumed_foils.join(", ")
        )));
    }
    let n_between = n_layers.saturating_sub(1);
    let mut dielectrics: Vec<Dielectric> = Vec::new();
    let (mut thin, mut unknown) = (Vec::new(), Vec::new());
    let known_m: f64 = between.iter().filter_map(|gap: &Gap| gap.thickness_m).sum();
    let n_missing =
        (0..n_between).filter(|&i| between.get(i).and_then(|gap| gap.thickness_m).is_none()).count();
    let board_m = job.and_then(|(job, _)| job.thickness_m).filter(|t| *t > 1e-5 && *t < 0.05);
    let copper_m: f64 = foils.iter().map(|foil| foil.thickness_m).sum();
    let rest_m = board_m.unwrap_or(ASSUMED_BOARD_M) - copper_m - known_m;
    // A share must stay positive even where the stated board is thinner than its parts.
    let share_m = if n_missing > 0 { (rest_m / n_missing as f64).max(50e-6) } else { 0.0 };
    for index in 0..n_between {
        let name = format!("L{}-L{}", index + 1, index + 2);
        let gap = between.get(index).copied().unwrap_or_default();
        if gap.thickness_m.is_none() {
            thin.push(name.clone());
        }
        if gap.permittivity.is_none() {
            unknown.push(name);
        }
        let origin = |known: bool| if known { Origin::File } else { Origin::Assumed };
        dielectrics.push(Dielectric {
            thickness_m: gap.thickness_m.unwrap_or(share_m),
            origin: origin(gap.thickness_m.is_some()),
            permittivity: gap.permittivity.unwrap_or(ASSUMED_PERMITTIVITY),
            permittivity_origin: origin(gap.permittivity.is_some()),
        });
    }
    if !thin.is_empty() {
        let source = match board_m {
            Some(board_m) => format!("the board's {:.3} mm", board_m * 1e3),
            None => format!("an assumed board of {:.1} mm", ASSUMED_BOARD_M * 1e3),
        };
        messages.push(warn(format!(
            "the files give no dielectric thickness for {}; assumed {:.3} mm each, an even split of {source}",
            thin.join(", "),
            share_m * 1e3
        )));
    }
    if !unknown.is_empty() {
        let text = format!(
            "the files give no permittivity for {}; assumed {ASSUMED_PERMITTIVITY}",
            unknown.join(", ")
        );
        messages.push(warn(text));
    }
    let first = dielectrics.first().map_or(0.0, |sheet| sheet.thickness_m);
    let even = dielectrics.len() >= 3
        && dielectrics.iter().all(|s| s.origin == Origin::File && (s.thickness_m - first).abs() < 1e-9);
    if even {
        let text = format!(
            "all {} dielectrics have the same thickness of {:.3} mm, as a layout program's default has and real boards \
             seldom do",
            dielectrics.len(),
            first * 1e3
        );
        let mut message = Diagnostic::note(code::STACKUP_DEFAULT, text).hint(
            "compare with the stackup of your manufacturer; the height over the plane decides the result",
        );
        message.place.file = job.map(|(_, file)| file.clone());
        messages.push(message);
    }
    Stackup { foils, dielectrics, temperature_c: ASSUMED_TEMPERATURE_C }
}

/// What lies between two foils.
#[derive(Clone, Copy, Debug, Default)]
struct Gap {
    thickness_m: Option<f64>,
    permittivity: Option<f64>,
}

/// Foil thicknesses and the gaps between them; sheets between two foils are added up, their permittivities taken in
/// series as for capacitors. A gap with a sheet of unknown thickness is unknown.
fn split(materials: &[Material]) -> (Vec<Option<f64>>, Vec<Gap>) {
    let (mut foils, mut gaps) = (Vec::new(), Vec::new());
    for part in materials.split_inclusive(|material| material.copper) {
        let (sheets, foil) = match part.split_last() {
            Some((last, sheets)) if last.copper => (sheets, last.thickness_m),
            _ => break, // Behind the last foil.
        };
        if !foils.is_empty() {
            let thickness_m: Option<f64> = sheets.iter().map(|sheet| sheet.thickness_m).sum();
            let thickness_m = thickness_m.filter(|_| !sheets.is_empty());
            let over: Option<f64> =
                sheets.iter().map(|sheet| Some(sheet.thickness_m? / sheet.permittivity?)).sum();
            let permittivity = match (thickness_m, over) {
                (Some(thickness_m), Some(over)) if over > 0.0 => Some(thickness_m / over),
                _ => sheets.first().and_then(|sheet| sheet.permittivity).filter(|_| sheets.len() == 1),
            };
            gaps.push(Gap { thickness_m, permittivity });
        }
        foils.push(foil);
    }
    (foils, gaps)
}
