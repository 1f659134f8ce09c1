//! Finds where nets are joined by copper on purpose: net ties and jumpers. Nets are never merged.

use super::compose::{object_bounds, object_shape};
use crate::board::{Board, CopperKind, CopperLayer, CopperObject, NetId, ObjectFunction, Tie, TieKind};
use crate::diag::Diagnostic;
use crate::diag::code::read as code;
use crate::geom::boolean::union;
use crate::geom::locate::{Locator, segment_distance};
use crate::geom::{Point, Polygon, Region};
use std::collections::BTreeMap;

/// Copper this close touches, in metres: shapes are rounded by up to half a micrometre.
const TOUCH_M: f64 = 2e-6;

/// The ties of all layers.
pub fn find_ties(board: &Board, messages: &mut Vec<Diagnostic>) -> Vec<Tie> {
    let mut ties = Vec::new();
    for (index, layer) in board.layers.iter().enumerate() {
        let locator = Locator::new(layer.areas.iter().map(|area| &area.shape));
        etched(board, index, layer, &locator, &mut ties, messages);
        abutting(index, layer, &mut ties);
    }
    ties
}

/// The nets whose areas a shape touches.
fn touched_nets(layer: &CopperLayer, locator: &Locator, shape: &Polygon) -> Vec<NetId> {
    let mut nets = Vec::new();
    for ring in shape.rings() {
        let mut closed = ring.clone();
        closed.extend(ring.first().copied());
        nets.extend(locator.touching(&closed, TOUCH_M).into_iter().filter_map(|area| layer.areas[area].net));
    }
    nets.sort_unstable();
    nets.dedup();
    nets
}

/// Copper without a net that makes up a part and touches two nets or more.
fn etched(
    board: &Board,
    index: usize,
    layer: &CopperLayer,
    locator: &Locator,
    ties: &mut Vec<Tie>,
    messages: &mut Vec<Diagnostic>,
) {
    let etched: Vec<&CopperObject> = layer
        .objects
        .iter()
        .filter(|object| object.dark && object.net.is_none() && object.function == ObjectFunction::EtchedPart)
        .collect();
    let mut by_part: BTreeMap<&str, Vec<&CopperObject>> = BTreeMap::new();
    for object in etched {
        by_part.entry(&object.part).or_default().push(object);
    }
    for (part, objects) in by_part {
        let shapes: Vec<Region> = objects.iter().map(|object| object_shape(object)).collect();
        for shape in union(&shapes).0 {
            let nets = touched_nets(layer, locator, &shape);
            let at = shape.bounds().centre();
            if nets.len() > 1 {
                let shape = Region(vec![shape]);
                ties.push(Tie {
                    part: part.to_owned(),
                    kind: TieKind::EtchedCopper,
                    nets,
                    layer: index,
                    at,
                    shape,
                });
            }
        }
    }
    let loose = layer.areas.iter().filter(|area| area.net.is_none());
    for area in loose {
        let nets = touched_nets(layer, locator, &area.shape);
        let at = area.shape.bounds().centre();
        let known = ties.iter().any(|tie| tie.layer == index && area.shape.bounds().contains(tie.at));
        if nets.len() > 1 && !known {
            let names: Vec<String> = nets.iter().map(|&net| format!("`{}`", board.net_name(net))).collect();
            let text = format!(
                "copper without a net touches nets {}; it is not taken as a tie",
                names.join(" and ")
            );
            messages.push(Diagnostic::warning(code::NET_TOUCH, text).on_board(Some(index + 1), at));
        }
    }
}

/// Pads of one part, of different nets, that touch each other.
fn abutting(index: usize, layer: &CopperLayer, ties: &mut Vec<Tie>) {
    let mut pads: BTreeMap<&str, Vec<&CopperObject>> = BTreeMap::new();
    for object in
        layer.objects.iter().filter(|object| object.dark && object.net.is_some() && !object.part.is_empty())
    {
        if !matches!(object.kind, CopperKind::Draw { .. }) && object.function != ObjectFunction::Area {
            pads.entry(&object.part).or_default().push(object);
        }
    }
    for (part, pads) in pads {
        // Groups of pads that touch, grown pad by pad.
        let mut groups: Vec<Vec<usize>> = Vec::new();
        for (a, pad) in pads.iter().enumerate() {
            let bounds = object_bounds(pad).grown(TOUCH_M);
            let near = |b: &usize| {
                let other: &CopperObject = pads[*b];
                other.net != pad.net && object_bounds(other).meets(bounds) && touch(pad, other)
            };
            let (joined, apart): (Vec<_>, Vec<_>) =
                groups.into_iter().partition(|group: &Vec<usize>| group.iter().any(near));
            groups = apart;
            groups.push(joined.into_iter().flatten().chain([a]).collect());
        }
        for group in groups {
            let mut nets: Vec<NetId> = group.iter().filter_map(|&pad| pads[pad].net).collect();
            nets.sort_unstable();
            nets.dedup();
            if nets.len() > 1 {
                let members: Vec<&CopperObject> = group.iter().map(|&pad| pads[pad]).collect();
                let (at, shape) = super::copper::joined(&members);
                ties.push(Tie {
                    part: part.to_owned(),
                    kind: TieKind::AbuttingPads,
                    nets,
                    layer: index,
                    at,
                    shape,
                });
            }
        }
    }
}

/// Whether two pads touch or overlap.
fn touch(a: &CopperObject, b: &CopperObject) -> bool {
    let (a, b) = (object_shape(a), object_shape(b));
    let edges = |region: &Region| -> Vec<(Point, Point)> {
        let rings = region.0.iter().flat_map(Polygon::rings);
        rings.flat_map(|ring| (0..ring.len()).map(move |i| (ring[i], ring[(i + 1) % ring.len()]))).collect()
    };
    let (rim_a, rim_b) = (edges(&a), edges(&b));
    let inside =
        |region: &Region, rim: &[(Point, Point)]| rim.first().is_some_and(|edge| region.contains(edge.0));
    inside(&a, &rim_b)
        || inside(&b, &rim_a)
        || rim_a.iter().any(|&edge| rim_b.iter().any(|&other| segment_distance(edge, other) <= TOUCH_M))
}
