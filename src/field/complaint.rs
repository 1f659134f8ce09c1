//! What the field says when copper cannot be put on cells or a solve fails.

use super::PlaneId;
use super::lay::Lay;
use super::stage::{Misfit, Stage};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::field as code;
use crate::plan::{End, Entry};
use crate::review::Band;
use crate::sheet::SolveFailure;

/// What a lay is called: the plane of its only layer, or its number of layers.
fn copper_of(lay: &Lay) -> String {
    match lay.charts.first() {
        Some((_, chart)) if lay.single => format!("plane `{}`", chart.plane),
        _ => format!("copper of {} layers", lay.layers.len()),
    }
}

/// The copper of one layer of a lay.
fn layer_of(lay: &Lay, layer: usize) -> String {
    match lay.charts.iter().find(|(_, chart)| chart.plane.layer == layer) {
        Some((_, chart)) => format!("plane `{}`", chart.plane),
        None => format!("copper of layer L{}", layer + 1),
    }
}

/// The plane that an entry lies on, in words.
fn plane_of(board: &Board, entry: &Entry) -> String {
    let End::Copper { layer, area, .. } = entry.end else { return "a node that a joint reaches".into() };
    let net = board.layers[layer].areas.get(area).and_then(|area| area.net);
    let net = net.map_or(String::new(), |net| board.net_name(net).to_owned());
    format!("plane `{}`", PlaneId { layer, net })
}

fn placed(message: Diagnostic, entry: &Entry) -> Diagnostic {
    match entry.end {
        End::Copper { layer, at, .. } => message.on_board(Some(layer + 1), at),
        End::Node(_) => message,
    }
}

/// Entry `index` finds no copper.
pub fn off_copper(board: &Board, lay: &Lay, index: usize) -> Diagnostic {
    let entry = &lay.entries[index];
    let plane = match lay.charts.first() {
        Some((_, chart)) if lay.single => format!("plane `{}`", chart.plane),
        _ => plane_of(board, entry),
    };
    let text = format!(
        "landing `{}` of net `{}` must lie on {plane}; no copper within two cells",
        entry.what, lay.name
    );
    placed(Diagnostic::error(code::LANDING_OFF_COPPER, text), entry)
}

/// The landings of a lay of one plane lie on two islands.
pub fn landings_apart(lay: &Lay) -> Diagnostic {
    let what = |index: usize| lay.entries.get(index).map_or("", |entry| entry.what.as_str());
    let text = format!(
        "landings `{}` and `{}` of net `{}` must lie on connected copper of {}; they lie on two islands",
        what(1),
        what(0),
        lay.name,
        copper_of(lay)
    );
    let message = Diagnostic::error(code::LANDINGS_APART, text)
        .hint("name landings on one island with `driver_landing` and `receiver_landing`");
    match lay.entries.first() {
        Some(entry) => placed(message, entry),
        None => message,
    }
}

/// A cell of a layer cannot stand for its copper.
pub fn too_coarse(lay: &Lay, misfit: Misfit) -> Diagnostic {
    let Misfit { layer, place } = misfit;
    let text = format!(
        "cell of {} must be smaller here to keep its pieces apart; got {:.4} mm",
        layer_of(lay, layer),
        place.cell_m * 1e3
    );
    let half_mm = 0.5e3 * place.cell_m;
    Diagnostic::error(code::CELL_TOO_LARGE, text)
        .on_board(Some(layer + 1), place.at)
        .hint(format!("set `cell = \"{half_mm:.4}mm\"` or less under `[solver]`"))
}

/// Nothing is known of where the return of a lay flows, because no frequency was asked for.
pub fn not_surveyed(lay: &Lay) -> Diagnostic {
    let text = format!("net `{}` must be solved at one frequency at least; the plan has none", lay.name);
    Diagnostic::error(code::RETURN_OPEN, text)
}

/// Cells are smaller than wanted, by so many halvings.
pub fn halved(lay: &Lay, cell_m: f64, halvings: usize) -> Diagnostic {
    let text = format!(
        "net `{}` on {} is solved on cells of {:.4} mm; cells of {:.4} mm cannot keep its copper apart",
        lay.name,
        copper_of(lay),
        cell_m * 1e3,
        cell_m * 1e3 * f64::from(1 << halvings)
    );
    Diagnostic::note(code::CELL_HALVED, text)
}

/// What the cells do not show as it is drawn, one message for each layer.
pub fn mended(lay: &Lay, stage: &Stage) -> Vec<Diagnostic> {
    let mut messages = Vec::new();
    for sheet in &stage.sheets {
        let mask = &sheet.mask;
        let mut parts = Vec::new();
        if mask.neck_cells > 0 {
            parts.push(format!("{} cells stand for necks narrower than a cell", mask.neck_cells));
        }
        if mask.crumbs > 0 {
            parts.push(format!("{} pieces of copper smaller than half a cell are left out", mask.crumbs));
        }
        if mask.severed > 0 {
            parts.push(format!("{} connections narrower than a cell are lost", mask.severed));
        }
        if !parts.is_empty() {
            let cell_mm = mask.grid.cell_m * 1e3;
            let text = format!("{} on cells of {cell_mm:.4} mm: ", layer_of(lay, sheet.layer));
            messages.push(Diagnostic::note(code::PLANE_ON_CELLS, text + &parts.join("; ")));
        }
    }
    messages
}

/// Entries lie on copper that nothing joins.
fn return_open(lay: &Lay, band: &Band) -> Diagnostic {
    let entries: Vec<String> = lay.entries.iter().map(|entry| format!("`{}`", entry.what)).collect();
    let text = format!(
        "return of net `{}` in band `{}` must find a way between {}; no copper, via or part joins them at that \
         frequency",
        lay.name,
        band.name,
        entries.join(" and ")
    );
    Diagnostic::error(code::RETURN_OPEN, text)
        .hint("join the copper on the board, or tell of what joins it with `[[part]]` or `[[tie]]`")
}

/// A solve failed.
pub fn failed(board: &Board, lay: &Lay, failure: &SolveFailure, band: &Band) -> Diagnostic {
    match failure {
        SolveFailure::Unbalanced { .. } if lay.single => landings_apart(lay),
        SolveFailure::Unbalanced { .. } => return_open(lay, band),
        SolveFailure::NoCopper { index } if *index < lay.entries.len() => off_copper(board, lay, *index),
        SolveFailure::NoCopper { .. } => return_open(lay, band),
        SolveFailure::Factor { .. } => {
            let text =
                format!("{} must be small enough to be factored in memory; {failure:?}", copper_of(lay));
            Diagnostic::error(code::NOT_FACTORED, text).hint("set a larger `cell` under `[solver]`")
        }
        SolveFailure::NoConvergence { steps, residual, tolerance } => {
            let text = format!(
                "solve of net `{}` on {} in band `{}` must reach a residual of {tolerance:.0e}; got \
                 {residual:.1e} after {steps} steps",
                lay.name,
                copper_of(lay),
                band.name
            );
            Diagnostic::error(code::NOT_CONVERGED, text).hint("try another `cell` under `[solver]`")
        }
    }
}
