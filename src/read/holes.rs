//! Holes: merges the drill files, cuts what is not plated out of the copper, and finds what each barrel touches.

use super::drill::DrillHole;
use crate::board::{Board, CopperArea, CopperKind, CopperLayer, Hole, NetId, ObjectFunction, Plating};
use crate::diag::code::read as code;
use crate::diag::{Diagnostic, Place};
use crate::geom::boolean::{difference, union_with};
use crate::geom::locate::Locator;
use crate::geom::stroke::capsules;
use crate::geom::{Bounds, Point, Region};

/// Drill files and copper agree only to the rounding of either file, in metres.
const ROUNDING_M: f64 = 5e-6;

/// A drill file's holes and what the file says of all of them.
pub struct DrillSet {
    /// Name of the file.
    pub file: String,
    /// Plating of the whole file, where it says so.
    pub plating: Option<Plating>,
    /// First and last layer, indices from 0; all layers where the file does not say.
    pub span: Option<(usize, usize)>,
    /// Its holes.
    pub holes: Vec<DrillHole>,
}

/// Puts the holes into the board and joins them with copper, nets and pins.
pub fn add_holes(board: &mut Board, sets: &[DrillSet], messages: &mut Vec<Diagnostic>) {
    let n_layers = board.layers.len();
    let last = n_layers.saturating_sub(1);
    // Pads decide only where a file is silent, which is rare.
    let silent =
        sets.iter().any(|set| set.plating.is_none() && set.holes.iter().any(|hole| hole.plating.is_none()));
    let locators: Vec<Locator> = board.layers.iter().filter(|_| silent).map(pad_locator).collect();
    for set in sets {
        let place = |line: u32| Place {
            file: Some(set.file.clone()),
            line: (line > 0).then_some(line),
            ..Place::default()
        };
        let span = set.span.unwrap_or((0, last));
        if span.0 > span.1 || span.1 > last {
            let text =
                format!("the holes must end on layers 1 to {n_layers}; got {} to {}", span.0 + 1, span.1 + 1);
            messages.push(Diagnostic { place: place(0), ..Diagnostic::error(code::DRILL_SPAN, text) });
            continue;
        }
        let mut n_guessed = 0;
        for hole in &set.holes {
            let plating = hole.plating.or(set.plating).unwrap_or_else(|| {
                n_guessed += 1;
                let padded =
                    (span.0..=span.1).any(|layer| !locators[layer].containing(hole.path[0]).is_empty());
                if padded { Plating::Plated } else { Plating::NonPlated }
            });
            board.holes.push(Hole {
                path: hole.path.clone(),
                diameter_m: hole.diameter_m,
                plating,
                layers: span,
                via: hole.via.unwrap_or(false) && plating == Plating::Plated,
                contacts: Vec::new(),
                net: None,
            });
        }
        if n_guessed > 0 {
            let text = format!(
                "the file does not say whether its {n_guessed} holes are plated; those in a pad are taken as plated"
            );
            messages.push(Diagnostic { place: place(0), ..Diagnostic::warning(code::DRILL_PLATING, text) });
        }
    }
    cut_non_plated(board);
    find_contacts(board, messages);
    join_pins(board, sets);
}

/// All pads of a layer.
fn pad_locator(layer: &CopperLayer) -> Locator {
    let pads = layer.objects.iter().filter(|object| object.dark && object.function != ObjectFunction::Other);
    Locator::new(pads.flat_map(|object| match &object.kind {
        CopperKind::Flash { shape, .. } => &shape.0[..],
        _ => &[],
    }))
}

/// The smallest box round a hole.
fn hole_bounds(hole: &Hole) -> Bounds {
    Bounds::of(hole.path.iter().copied()).grown(0.5 * hole.diameter_m)
}

/// Takes holes without a barrel off the copper areas of the layers that they pass.
fn cut_non_plated(board: &mut Board) {
    for (index, layer) in board.layers.iter_mut().enumerate() {
        let cuts: Vec<(&Hole, Bounds)> = board
            .holes
            .iter()
            .filter(|hole| {
                hole.plating == Plating::NonPlated && (hole.layers.0..=hole.layers.1).contains(&index)
            })
            .map(|hole| (hole, hole_bounds(hole)))
            .collect();
        let mut areas = Vec::with_capacity(layer.areas.len());
        for area in layer.areas.drain(..) {
            let bounds = area.shape.bounds();
            let rings: Vec<_> = cuts
                .iter()
                .filter(|(_, of)| of.meets(bounds))
                .flat_map(|(hole, _)| capsules(&hole.path, hole.diameter_m))
                .collect();
            if rings.is_empty() {
                areas.push(area);
            } else {
                let net = area.net;
                let left = difference(&Region(vec![area.shape]), &union_with([], &rings));
                areas.extend(left.0.into_iter().map(|shape| CopperArea { net, shape }));
            }
        }
        layer.areas = areas;
    }
}

/// Finds the areas that each barrel touches, and the barrel's net.
fn find_contacts(board: &mut Board, messages: &mut Vec<Diagnostic>) {
    let locators: Vec<Locator> =
        board.layers.iter().map(|layer| Locator::new(layer.areas.iter().map(|area| &area.shape))).collect();
    let mut holes = std::mem::take(&mut board.holes);
    for hole in holes.iter_mut().filter(|hole| hole.plating == Plating::Plated) {
        let reach_m = 0.5 * hole.diameter_m + ROUNDING_M;
        let mut nets: Vec<NetId> = Vec::new();
        for (layer, locator) in locators.iter().enumerate().take(hole.layers.1 + 1).skip(hole.layers.0) {
            for area in locator.touching(&hole.path, reach_m) {
                hole.contacts.push((layer, area));
                nets.extend(board.layers[layer].areas[area].net);
            }
        }
        nets.sort_unstable();
        nets.dedup();
        match nets[..] {
            [net] => hole.net = Some(net),
            [first, second, ..] => {
                let text = format!(
                    "a plated hole must touch copper of one net; got `{}` and `{}`; it is left without a net",
                    board.net_name(first),
                    board.net_name(second)
                );
                messages.push(Diagnostic::warning(code::HOLE_NETS, text).on_board(None, hole.centre()));
            }
            [] => {}
        }
    }
    board.holes = holes;
}

/// Gives pins their holes; holes of which no file says what they are for are vias unless a pin has them.
fn join_pins(board: &mut Board, sets: &[DrillSet]) {
    let centres: Vec<Point> = board.holes.iter().map(Hole::centre).collect();
    let mut taken = vec![false; centres.len()];
    for pin in &mut board.pins {
        let bounds = pin.pad.bounds();
        let inside = |index: &usize| {
            let hole = &board.holes[*index];
            hole.plating == Plating::Plated
                && (hole.layers.0..=hole.layers.1).contains(&pin.layer)
                && bounds.contains(centres[*index])
                && pin.pad.contains(centres[*index])
                && !hole.via
        };
        // The hole nearest to the pad's place.
        let found = (0..centres.len()).filter(inside).min_by(|&a, &b| {
            centres[a].distance(pin.at).total_cmp(&centres[b].distance(pin.at)).then(a.cmp(&b))
        });
        if let Some(index) = found {
            pin.hole = Some(index);
            taken[index] = true;
        }
    }
    let stated = sets.iter().flat_map(|set| set.holes.iter().map(|hole| hole.via.is_some()));
    for ((hole, stated), taken) in board.holes.iter_mut().zip(stated).zip(taken) {
        if !stated && !taken && hole.plating == Plating::Plated {
            hole.via = true;
        }
    }
}
