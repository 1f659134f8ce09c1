//! The second half of a plan: sheets, what joins them, and each path's ends on them.

use super::build::{Draft, Planner};
use super::entry::{Finder, Nodes};
use super::extent::{self, Whole};
use super::reach::Reach;
use super::route::PortPlace;
use super::sheets::{Groups, Piece, Sheets, Tracked};
use super::{Conductors, End, Entry, Joint, PathPlan, barrel, part, tie};
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::unit::length_text;

/// Currents below this are none, in A per A.
const NOTHING: f64 = 1e-9;

/// Chooses sheets for all paths, joins them, and lands each path's return on them.
pub fn finish(planner: &mut Planner<'_>, drafts: Vec<Draft<'_>>) -> (Vec<PathPlan>, Conductors) {
    if drafts.is_empty() {
        return (Vec::new(), Conductors::default());
    }
    let tracks: Vec<Tracked> = drafts.iter().map(|draft| tracked(planner, draft)).collect();
    let sheets = Sheets::choose(&planner.terrain, &tracks);
    let mut nodes = Nodes::default();
    let (joints, tied) = joints(planner, &sheets, &mut nodes);
    let whole = Whole::of(planner.terrain.board, &sheets);
    let mut paths = Vec::new();
    for (draft, track) in drafts.into_iter().zip(&tracks) {
        let mut path = land(planner, &sheets, (&joints, &tied), &mut nodes, draft, track);
        let enlarged = extent::set_cells(&planner.terrain, planner.review, &sheets, &whole, track, &mut path);
        planner.messages.extend(enlarged);
        paths.push(path);
    }
    let conductors = Conductors { layers: sheets.layers(), joints, nodes: nodes.0 };
    for path in &mut paths {
        path.valid_to_hz = extent::valid_to_hz(planner.terrain.board, path, &conductors);
    }
    planner.messages.extend(extent::beyond(&paths, &planner.review.bands));
    (paths, conductors)
}

/// All joints common to the paths: barrels, ties, parts; and the parts that tie nets inside, with the node of each.
fn joints(
    planner: &mut Planner<'_>,
    sheets: &Sheets,
    nodes: &mut Nodes,
) -> (Vec<Joint>, Vec<(String, usize)>) {
    let terrain = &planner.terrain;
    let reach = Reach { terrain, sheets };
    let mut joints = barrel::joints(terrain, sheets);
    if !joints.is_empty() && planner.review.stackup.plating_m.is_none() {
        let text = format!("plating of barrels is taken as {}", length_text(terrain.plating_m));
        planner.messages.push(Diagnostic::note(code::PLATING_ASSUMED, text));
    }
    joints.extend(tie::of_board(reach));
    let tie_parts = terrain.board.ties.iter().map(|tie| tie.part.as_str()).collect();
    let parts = part::joints(reach, planner.review, &tie_parts, nodes);
    joints.extend(parts.joints);
    planner.messages.extend(parts.messages);
    let (ties, messages) = tie::of_review(reach, planner.review, nodes);
    joints.extend(ties);
    planner.messages.extend(messages);
    (joints, parts.tied)
}

fn tracked(planner: &Planner<'_>, draft: &Draft<'_>) -> Tracked {
    let mut legs = Vec::new();
    for chart in &draft.path.charts {
        legs.extend(draft.path.track[chart.legs.clone()].iter().map(|&leg| (leg, chart.height_m)));
    }
    let board = planner.terrain.board;
    let own = draft.course.own_nets(&planner.terrain);
    let areas = draft.ports.iter().filter_map(|port| match port.place {
        PortPlace::Area { layer, area, .. } => Some((layer, area)),
        _ => None,
    });
    Tracked { nets: own.iter().filter_map(|name| board.net(name)).collect(), legs, areas: areas.collect() }
}

/// Gives a path its entries, joints and own copper; where they cannot be had, its charts carry the reason.
fn land(
    planner: &mut Planner<'_>,
    sheets: &Sheets,
    (common, tied): (&[Joint], &[(String, usize)]),
    nodes: &mut Nodes,
    draft: Draft<'_>,
    track: &Tracked,
) -> PathPlan {
    let Draft { course, mut path, ports } = draft;
    let terrain = &planner.terrain;
    path.own_areas = sheets
        .pieces()
        .filter(|&piece| terrain.net_of(piece.0, piece.1).is_some_and(|net| track.nets.contains(&net)))
        .filter(|piece| !track.areas.contains(piece))
        .collect();
    let finder = Finder { reach: Reach { terrain, sheets }, tied };
    let mut notes = Vec::new();
    let mut reason = None;
    for port in &ports {
        let chart = match port.place {
            PortPlace::Driver(_) => path.charts.first(),
            _ => path.charts.last(),
        };
        let Some(chart) = chart else { continue };
        match finder.land(&course, port, &chart.plane, nodes) {
            Ok(landed) => {
                if let Some(assumed) = &landed.assumed {
                    let text = format!("{}: {assumed}", course.who);
                    notes.push(Diagnostic::note(code::LANDING_NEAREST_VIA, text));
                }
                let new: Vec<Joint> =
                    landed.joints.into_iter().filter(|joint| !path.joints.contains(joint)).collect();
                path.joints.extend(new);
                match path.entries.iter_mut().find(|known| known.end == landed.end) {
                    Some(known) => known.current += port.current,
                    None => {
                        path.entries.push(Entry { end: landed.end, current: port.current, what: landed.what })
                    }
                }
            }
            Err((key, message)) => {
                reason.get_or_insert(course.in_review(key, message));
            }
        }
    }
    path.entries.retain(|entry| entry.current.abs() > NOTHING);
    if reason.is_none() {
        match closes(planner, &course.who, &path, common, nodes) {
            Closure::Open(message) => reason = Some(*message),
            Closure::Capacitors(message) => notes.push(*message),
            Closure::Conducting => {}
        }
    }
    planner.messages.extend(notes);
    if let Some(reason) = reason {
        path.entries.clear();
        path.joints.clear();
        for chart in path.charts.iter_mut().filter(|chart| chart.withheld.is_none()) {
            chart.withheld = Some(reason.clone());
        }
    }
    path
}

/// Whether a path's return can flow.
enum Closure {
    /// Through copper, ties and parts that conduct at any frequency.
    Conducting,
    /// Only through capacitors, stated.
    Capacitors(Box<Diagnostic>),
    /// Not at all, with the reason.
    Open(Box<Diagnostic>),
}

/// What joints join: a piece of copper or a node outside it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum Spot {
    Piece(Piece),
    Node(usize),
}

fn spot(end: &End) -> Spot {
    match *end {
        End::Copper { layer, area, .. } => Spot::Piece((layer, area)),
        End::Node(node) => Spot::Node(node),
    }
}

fn closes(planner: &Planner<'_>, who: &str, path: &PathPlan, common: &[Joint], nodes: &Nodes) -> Closure {
    let own = |end: &End| matches!(spot(end), Spot::Piece(piece) if path.own_areas.contains(&piece));
    let joined = |through_capacitors: bool| {
        let mut groups = Groups::default();
        let all = common.iter().chain(&path.joints);
        for joint in all.filter(|joint| through_capacitors || joint.capacitance_f.is_none()) {
            if !own(&joint.from) && !own(&joint.to) {
                groups.join(spot(&joint.from), spot(&joint.to));
            }
        }
        groups
    };
    // The first two entries whose currents have no common way.
    let apart = |groups: &Groups<Spot>| {
        let roots: Vec<Spot> = path.entries.iter().map(|entry| groups.root(spot(&entry.end))).collect();
        let balance = |root: Spot| -> f64 {
            let here = path.entries.iter().zip(&roots).filter(|(_, other)| **other == root);
            here.map(|(entry, _)| entry.current).sum()
        };
        let open = (0..roots.len()).find(|&k| balance(roots[k]).abs() > NOTHING)?;
        let other =
            (0..roots.len()).find(|&k| roots[k] != roots[open] && balance(roots[k]).abs() > NOTHING)?;
        Some((open, other))
    };
    let words = |(a, b): (usize, usize)| {
        let place = |k: usize| {
            let entry = &path.entries[k];
            match &entry.end {
                End::Node(node) => format!("`{}`", nodes.0[*node]),
                End::Copper { layer, area, .. } => {
                    let piece = &planner.terrain.board.layers[*layer].areas[*area];
                    let at = (piece.shape.bounds().centre() - planner.review.origin) * 1e3;
                    format!(
                        "`{}` on the piece of `L{}-{}` of {:.1} mm2 round {:.1}, {:.1}",
                        entry.what,
                        layer + 1,
                        planner.terrain.net_name(piece.net),
                        piece.shape.area() * 1e6,
                        at.x,
                        at.y
                    )
                }
            }
        };
        (place(a), place(b))
    };
    let located = |message: Diagnostic, k: usize| match &path.entries[k].end {
        End::Copper { layer, at, .. } => message.on_board(Some(layer + 1), *at),
        End::Node(_) => message,
    };
    if let Some(pair) = apart(&joined(true)) {
        let (a, b) = words(pair);
        let text = format!("{who}: its return is at {a} and at {b}; no via, pin, tie or part joins the two");
        let message = Diagnostic::warning(code::RETURN_OPEN, text).hint(
            "name the landings with `driver_landing` and `receiver_landing`, or what joins the two with `[[part]]` or \
             `[[tie]]`",
        );
        return Closure::Open(Box::new(located(message, pair.1)));
    }
    if let Some(pair) = apart(&joined(false)) {
        let (a, b) = words(pair);
        let text = format!("{who}: its return passes from {a} to {b} through capacitors only");
        return Closure::Capacitors(Box::new(Diagnostic::note(code::RETURN_THROUGH_CAPACITORS, text)));
    }
    Closure::Conducting
}
