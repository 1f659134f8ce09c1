//! Ties: copper that joins nets on purpose, and what the review ties, also to nodes outside the board.
//!
//! A tie of copper has the sheet resistance of its foil times the squares of its shape (longest side over mean width).
//! Its ends are the pads of its part, or the spots of the nets' copper nearest to its middle.

use super::barrel::{LEAST_OHM, resistivity_ohm_m};
use super::entry::Nodes;
use super::reach::{Reach, Reached};
use super::{End, Joint, JointKind};
use crate::board::{NetId, Plating, Tie};
use crate::diag::code::plan as code;
use crate::diag::{Diagnostic, nearest};
use crate::geom::Point;
use crate::review::Review;
use crate::review::joint::{TieEnd, TieRequest};
use std::f64::consts::PI;

/// Copper this close touches, in metres.
const TOUCH_M: f64 = 2e-6;
/// Radius of a spot of copper that the review names, in metres.
const SPOT_M: f64 = 0.15e-3;
/// Copper of a net counts within this distance of a named point, in metres.
const NEAR_M: f64 = 3e-3;
/// Resistance of a tie of the review that gives none, in ohm.
const TIE_OHM: f64 = 1e-3;

/// Joints of the ties that the board has.
pub fn of_board(reach: Reach<'_, '_>) -> Vec<Joint> {
    let board = reach.terrain.board;
    let mut joints = Vec::new();
    for tie in &board.ties {
        let ends: Vec<Reached> = tie.nets.iter().filter_map(|&net| tie_end(reach, tie, net)).collect();
        let bounds = tie.shape.bounds();
        let longest_m = bounds.width().max(bounds.height()).max(1e-6);
        let squares = longest_m * longest_m / tie.shape.area().max(1e-12);
        let foil_m = board.stackup.foils[tie.layer].thickness_m;
        let resistance_ohm = resistivity_ohm_m(board) / foil_m * squares;
        for pair in ends.windows(2).filter(|pair| pair[0].piece != pair[1].piece) {
            joints.push(Joint {
                kind: JointKind::Tie,
                what: if tie.part.is_empty() { "tie".into() } else { tie.part.clone() },
                at: tie.at,
                from: pair[0].end(),
                to: pair[1].end(),
                resistance_ohm: (resistance_ohm + pair[0].resistance_ohm + pair[1].resistance_ohm)
                    .max(LEAST_OHM),
                inductance_h: pair[0].inductance_h + pair[1].inductance_h,
                capacitance_f: None,
                barrel_radius_m: None,
            });
        }
    }
    joints
}

/// Where a net's copper meets a tie, and from there the sheet.
fn tie_end(reach: Reach<'_, '_>, tie: &Tie, net: NetId) -> Option<Reached> {
    let terrain = reach.terrain;
    let pins = terrain.board.pins.iter();
    let mut own = pins.filter(|pin| !tie.part.is_empty() && pin.part == tie.part && pin.net == Some(net));
    if let Some(reached) = own.find_map(|pin| reach.of_pin(pin)) {
        return Some(reached);
    }
    let width_m =
        (tie.shape.area() / tie.shape.bounds().width().max(tie.shape.bounds().height()).max(1e-6)).max(1e-5);
    for polygon in &tie.shape.0 {
        let mut ring = polygon.outer.clone();
        ring.extend(polygon.outer.first().copied());
        for area in terrain.copper_near(tie.layer, &ring, TOUCH_M) {
            if terrain.net_of(tie.layer, area) == Some(net) {
                let at = spot_nearest(reach, (tie.layer, area), tie.at);
                return reach.of_piece((tie.layer, area), at, 0.5 * width_m.max(2.0 * SPOT_M), width_m);
            }
        }
    }
    None
}

/// The point of a piece of copper nearest to `at`.
fn spot_nearest(reach: Reach<'_, '_>, (layer, area): (usize, usize), at: Point) -> Point {
    let shape = &reach.terrain.board.layers[layer].areas[area].shape;
    if shape.contains(at) {
        return at;
    }
    let mut best = (f64::INFINITY, at);
    for ring in shape.rings() {
        for k in 0..ring.len() {
            let side = (ring[k], ring[(k + 1) % ring.len()]);
            let there = super::touch::point_at(side, super::touch::nearest_part(at, side));
            if there.distance(at) < best.0 {
                best = (there.distance(at), there);
            }
        }
    }
    best.1
}

/// Joints of the ties of the review, and what of them cannot be done.
pub fn of_review(reach: Reach<'_, '_>, review: &Review, nodes: &mut Nodes) -> (Vec<Joint>, Vec<Diagnostic>) {
    let (mut joints, mut messages) = (Vec::new(), Vec::new());
    for tie in &review.ties {
        let mut end = |end: &TieEnd, other: &TieEnd, key: &str| -> Option<(End, Reached)> {
            if let TieEnd::Outside(name) = end {
                let nowhere = Reached {
                    piece: (0, 0),
                    at: Point::default(),
                    radius_m: 0.0,
                    through_via: false,
                    length_m: 0.0,
                    resistance_ohm: 0.0,
                    inductance_h: 0.0,
                };
                return Some((End::Node(nodes.named(name)), nowhere));
            }
            match place(reach, end, other) {
                Ok(reached) => Some((reached.end(), reached)),
                Err(message) => {
                    messages.push(at_key(review, tie, key, message));
                    None
                }
            }
        };
        let (from, to) = (end(&tie.from, &tie.to, "from"), end(&tie.to, &tie.from, "to"));
        let (Some(from), Some(to)) = (from, to) else { continue };
        let on_board: Vec<Point> = [&from, &to]
            .iter()
            .filter(|end| matches!(end.0, End::Copper { .. }))
            .map(|end| end.1.at)
            .collect();
        let middle = on_board.iter().fold(Point::default(), |sum, &at| sum + at)
            * (1.0 / on_board.len().max(1) as f64);
        joints.push(Joint {
            kind: JointKind::Tie,
            what: tie.name.clone(),
            at: middle,
            from: from.0,
            to: to.0,
            resistance_ohm: (tie.branch.resistance_ohm.unwrap_or(TIE_OHM)
                + from.1.resistance_ohm
                + to.1.resistance_ohm)
                .max(LEAST_OHM),
            inductance_h: tie.branch.inductance_h.unwrap_or(0.0) + from.1.inductance_h + to.1.inductance_h,
            capacitance_f: tie.branch.capacitance_f,
            barrel_radius_m: None,
        });
    }
    (joints, messages)
}

fn at_key(review: &Review, tie: &TieRequest, key: &str, mut message: Diagnostic) -> Diagnostic {
    message.place.file = Some(review.file.clone());
    let mark = tie.marks.get(key);
    message.place.line = Some(mark.as_ref().map_or(tie.line, |mark| mark.0));
    message.place.span = mark.map(|mark| mark.1);
    message
}

fn place(reach: Reach<'_, '_>, end: &TieEnd, other: &TieEnd) -> Result<Reached, Diagnostic> {
    let terrain = reach.terrain;
    let board = terrain.board;
    let bad = |text: String| Diagnostic::error(code::TIE_BAD, text);
    match end {
        TieEnd::Pin(label) => {
            let Some(pin) = board.pins.iter().find(|pin| pin.label() == *label) else {
                return Err(bad(format!("end `{label}` of a tie must be a pin of the board; it is not")));
            };
            reach.of_pin(pin).ok_or_else(|| {
                let net = terrain.net_name(pin.net);
                bad(format!(
                    "end `{label}` of a tie must lead to copper that carries return; its net is `{net}`"
                ))
            })
        }
        TieEnd::At(point) => {
            let found = terrain.reference_nets().filter_map(|net| on_net(reach, net, *point));
            let nearest = found.min_by(|a, b| a.0.total_cmp(&b.0).then(a.1.piece.cmp(&b.1.piece)));
            nearest.map(|found| found.1).ok_or_else(|| {
                bad("end of a tie must be a point on, or within 3 mm of, reference copper".into())
            })
        }
        TieEnd::Net { net, at } => {
            let Some(id) = board.net(net) else {
                let message = bad(format!("net `{net}` of a tie must be a net of the board; it is not"));
                let near = nearest(net, board.nets.iter().map(|net| net.name.as_str()));
                return Err(match near {
                    Some(near) => message.hint(format!("did you mean `{near}`?")),
                    None => message,
                });
            };
            let there = match (at, other) {
                (Some(at), _) => Some(*at),
                (None, TieEnd::Pin(label)) => {
                    board.pins.iter().find(|pin| pin.label() == *label).map(|pin| pin.at)
                }
                (None, TieEnd::At(at) | TieEnd::Net { at: Some(at), .. }) => Some(*at),
                _ => None,
            };
            let found = there.and_then(|at| on_net(reach, id, at));
            found.map(|found| found.1).ok_or_else(|| {
                bad(format!("net `{net}` of a tie must have copper that carries return within 3 mm of its place; it has none"))
            })
        }
        TieEnd::Outside(_) => Err(bad("end of a tie must be on the board".into())),
    }
}

/// A spot of a net's sheets at a point or near it, with its distance: copper at the point from the top, then barrels and
/// rims nearby.
fn on_net(reach: Reach<'_, '_>, net: NetId, point: Point) -> Option<(f64, Reached)> {
    let terrain = reach.terrain;
    for layer in 0..terrain.board.layers.len() {
        let piece = terrain.copper_of_net(layer, point, net).map(|area| (layer, area));
        if let Some(piece) = piece.filter(|&piece| reach.sheets.holds(piece)) {
            return reach.of_piece(piece, point, SPOT_M, 2.0 * SPOT_M).map(|reached| (0.0, reached));
        }
    }
    let mut best: Option<(f64, Reached)> = None;
    for (index, hole) in
        terrain.board.holes.iter().enumerate().filter(|(_, hole)| hole.plating == Plating::Plated)
    {
        let distance = hole.centre().distance(point);
        if distance > best.as_ref().map_or(NEAR_M, |known| known.0) {
            continue;
        }
        if let Some(piece) = reach.sheets_at(index, Some(net)).into_iter().min() {
            let radius_m = super::barrel::radius_m(hole);
            best = reach
                .of_piece(piece, hole.centre(), radius_m, 2.0 * PI * radius_m)
                .map(|reached| (distance, reached));
        }
    }
    for layer in 0..terrain.board.layers.len() {
        for area in terrain.copper_near(layer, &[point], NEAR_M) {
            let piece = (layer, area);
            if terrain.net_of(layer, area) != Some(net) || !reach.sheets.holds(piece) {
                continue;
            }
            let at = spot_nearest(reach, piece, point);
            let distance = at.distance(point);
            if best.as_ref().is_none_or(|known| distance < known.0) {
                best = reach.of_piece(piece, at, SPOT_M, 2.0 * SPOT_M).map(|reached| (distance, reached));
            }
        }
    }
    best
}
