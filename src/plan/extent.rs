//! How finely and how far a path is solved: the cell common to its sheets, and the frequency up to which it holds.
//!
//! Range of validity: the board and the loop below a tenth of a wavelength, f = c/(10 L sqrt(er)), L the larger of the
//! board's diagonal and the length of the track, er that of the stackup across: sum t / sum (t/er). Above it
//! displacement current and standing waves matter (physics of lumped loops; common practice).

use super::cell::{self, CellChoice};
use super::sheets::{Sheets, Tracked};
use super::terrain::Terrain;
use super::{Conductors, PathPlan, TrackLeg};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::geom::Bounds;
use crate::review::{Band, Review};
use crate::unit::constants::C0;
use crate::unit::{length_text, quantity_text};

/// Part of the track beside which copper must lie to ask for smaller cells.
const BESIDE_PART: f64 = 0.05;
/// Distance between samples along the track in metres.
const STEP_M: f64 = 0.5e-3;

/// Box, number and copper of all sheets.
pub struct Whole {
    bounds: Bounds,
    sheets: usize,
    copper_m2: f64,
}

impl Whole {
    /// Measures the conductors of a plan.
    pub fn of(board: &Board, sheets: &Sheets) -> Self {
        let mut whole = Self { bounds: Bounds::EMPTY, sheets: sheets.layers().len(), copper_m2: 0.0 };
        for (layer, area) in sheets.pieces() {
            let shape = &board.layers[layer].areas[area].shape;
            whole.bounds = whole.bounds.union(shape.bounds());
            whole.copper_m2 += shape.area();
        }
        whole
    }
}

/// Sets the cells of a path, one size for all its charts.
pub fn set_cells(
    terrain: &Terrain<'_>,
    review: &Review,
    sheets: &Sheets,
    whole: &Whole,
    track: &Tracked,
    path: &mut PathPlan,
) -> Option<Diagnostic> {
    let open = || path.charts.iter().filter(|chart| chart.withheld.is_none());
    let height_m = open().map(|chart| chart.height_m).fold(f64::INFINITY, f64::min);
    if !height_m.is_finite() || whole.bounds.is_empty() {
        return None;
    }
    let by_voids =
        open().map(|chart| cell::by_voids(height_m, &path.track[chart.legs.clone()], &chart.voids));
    let by_voids = by_voids.fold(f64::INFINITY, f64::min);
    let choice = match review.solver.cell_m {
        Some(cell_m) => CellChoice { cell_m, enlarged: false },
        None => {
            let finest_m = by_voids.min(by_gap(terrain, sheets, track, height_m));
            cell::choose(whole.bounds, whole.sheets, height_m, finest_m)
        }
    };
    let (unknowns, memory_bytes) = cell::cost(whole.bounds, whole.sheets, whole.copper_m2, choice.cell_m);
    for chart in path.charts.iter_mut().filter(|chart| chart.withheld.is_none()) {
        (chart.cell_m, chart.unknowns, chart.memory_bytes) = (choice.cell_m, unknowns, memory_bytes);
    }
    choice.enlarged.then(|| {
        let text = format!(
            "`{}` is planned on cells of {}, more than its height of {}, to fit into memory",
            path.name,
            length_text(choice.cell_m),
            length_text(height_m)
        );
        Diagnostic::warning(code::CELL_ENLARGED, text)
    })
}

/// The cell that copper beside the track on its own layer asks for, in metres: as wide as the gap where that is below
/// the height.
fn by_gap(terrain: &Terrain<'_>, sheets: &Sheets, track: &Tracked, height_m: f64) -> f64 {
    let near = |leg: &TrackLeg, gap_m: f64| -> f64 {
        let length_m = leg.from.distance(leg.to);
        let n = (length_m / STEP_M).ceil().max(1.0) as usize;
        let beside = (0..n).filter(|&k| {
            let at = leg.from + (leg.to - leg.from) * ((k as f64 + 0.5) / n as f64);
            let found = terrain.copper_near(leg.layer, &[at], 0.5 * leg.width_m + gap_m);
            found.into_iter().any(|area| {
                let own = terrain.net_of(leg.layer, area).is_some_and(|net| track.nets.contains(&net));
                !own && sheets.holds((leg.layer, area))
            })
        });
        length_m * beside.count() as f64 / n as f64
    };
    let total_m: f64 = track.legs.iter().map(|(leg, _)| leg.from.distance(leg.to)).sum();
    for part in [0.5, 0.7] {
        let gap_m = part * height_m;
        let beside_m: f64 = track.legs.iter().map(|(leg, _)| near(leg, gap_m)).sum();
        if beside_m > BESIDE_PART * total_m {
            return gap_m;
        }
    }
    f64::INFINITY
}

/// Frequency in Hz up to which a path's loop and the board are below a tenth of a wavelength.
pub fn valid_to_hz(board: &Board, path: &PathPlan, conductors: &Conductors) -> f64 {
    let mut bounds = board.outline.bounds();
    if bounds.is_empty() {
        for layer in &conductors.layers {
            for &area in &layer.areas {
                bounds = bounds.union(board.layers[layer.layer].areas[area].shape.bounds());
            }
        }
    }
    let diagonal_m = if bounds.is_empty() { 0.0 } else { bounds.min.distance(bounds.max) };
    let track_m: f64 = path.track.iter().map(|leg| leg.from.distance(leg.to)).sum();
    let sheets = &board.stackup.dielectrics;
    let (mut thickness_m, mut electric_m) = (0.0, 0.0);
    for sheet in sheets {
        thickness_m += sheet.thickness_m;
        electric_m += sheet.thickness_m / sheet.permittivity.max(1.0);
    }
    let permittivity = if electric_m > 0.0 { thickness_m / electric_m } else { 1.0 };
    C0 / (10.0 * diagonal_m.max(track_m).max(1e-9) * permittivity.sqrt())
}

/// One note for each band with frequencies above what the paths hold for.
pub fn beyond(paths: &[PathPlan], bands: &[Band]) -> Vec<Diagnostic> {
    let mut notes = Vec::new();
    for band in bands {
        for &hertz in &band.at_hz {
            let over: Vec<&PathPlan> =
                paths.iter().filter(|path| path.valid_to_hz > 0.0 && hertz > path.valid_to_hz).collect();
            let lowest = over.iter().map(|path| path.valid_to_hz).fold(f64::INFINITY, f64::min);
            if over.is_empty() {
                continue;
            }
            let names: Vec<String> = over.iter().map(|path| path.name.clone()).collect();
            let text = format!(
                "band {} at {} lies above {}, where board or loop reach a tenth of a wavelength: {}",
                band.name,
                quantity_text(hertz, "Hz"),
                quantity_text(lowest, "Hz"),
                super::part::listed(&names)
            );
            notes.push(Diagnostic::note(code::BAND_BEYOND, text));
        }
    }
    notes
}
