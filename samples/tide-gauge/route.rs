//! A small router: shortest paths on a grid of 0.1 mm over the two outer layers, other tracks moved where needed.

use super::design::{Design, Pour, Track, VIA_PAD, Via, Xy, length};
use super::obstacle::{Body, CLEARANCE, EDGE, Obstacle, contains, obstacles};
use std::cmp::Reverse;
use std::collections::BinaryHeap;

/// Step of the grid in mm.
const STEP: f64 = 0.1;
/// Cost of a straight step; a diagonal one costs 14.
const STRAIGHT: u32 = 10;
/// Cost of a via.
const VIA_COST: u32 = 180;
/// Cost of a step through what another net would have to leave.
const PUSH: u32 = 60;
/// Layers that carry tracks.
const LAYERS: [usize; 2] = [0, 3];
/// Steps to the eight neighbours.
const TURNS: [(i32, i32); 8] = [(1, 0), (1, 1), (0, 1), (-1, 1), (-1, 0), (-1, -1), (0, -1), (1, -1)];

/// A net to route.
#[derive(Clone, Debug)]
pub struct Wish {
    /// Name of the net.
    pub net: String,
    /// Track width.
    pub width: f64,
    /// Extra cost of a step on the top and on the bottom layer.
    pub toll: [u32; 2],
    /// Boxes that the net stays out of.
    pub avoid: Vec<(Xy, Xy)>,
}

/// A place on the grid: layer (0 top, 1 bottom), column, row.
type Cell = (usize, i32, i32);

struct Maps {
    nx: i32,
    ny: i32,
    /// Per layer and cell: 0 free, 1 occupied by something movable, 2 occupied.
    tracks: [Vec<u8>; 2],
    vias: Vec<u8>,
}

impl Maps {
    fn index(&self, x: i32, y: i32) -> usize {
        (y * self.nx + x) as usize
    }

    fn new(design: &Design, wish: &Wish, things: &[Obstacle]) -> Self {
        let nx = (design.size.0 / STEP).round() as i32 + 1;
        let ny = (design.size.1 / STEP).round() as i32 + 1;
        let n = (nx * ny) as usize;
        let mut maps = Self { nx, ny, tracks: [vec![0; n], vec![0; n]], vias: vec![0; n] };
        let (half, via) = (0.5 * wish.width, 0.5 * VIA_PAD);
        for y in 0..ny {
            for x in 0..nx {
                let margin = f64::from(x.min(y).min(nx - 1 - x).min(ny - 1 - y)) * STEP;
                let index = maps.index(x, y);
                if margin < EDGE + half - 1e-9 {
                    maps.tracks[0][index] = 2;
                    maps.tracks[1][index] = 2;
                }
                if margin < EDGE + via - 1e-9 {
                    maps.vias[index] = 2;
                }
            }
        }
        for thing in things {
            let mark = if thing.movable { 1 } else { 2 };
            if thing.net == wish.net {
                if thing.pad || thing.barrel {
                    maps.paint(&thing.body, via + 0.1, 2, None);
                }
                continue;
            }
            for (slot, layer) in LAYERS.into_iter().enumerate() {
                if thing.layers[layer] {
                    maps.paint(&thing.body, half + CLEARANCE, mark, Some(slot));
                }
            }
            maps.paint(&thing.body, via + CLEARANCE, mark, None);
        }
        for &(low, high) in &wish.avoid {
            let middle = (0.5 * (low.0 + high.0), 0.5 * (low.1 + high.1));
            let block = Body::Block(middle, 0.5 * (high.0 - low.0), 0.5 * (high.1 - low.1));
            maps.paint(&block, 0.0, 2, Some(0));
            maps.paint(&block, 0.0, 2, Some(1));
            maps.paint(&block, 0.0, 2, None);
        }
        maps
    }

    /// Marks the cells nearer than `room` to a body on one track layer, or for vias.
    fn paint(&mut self, body: &Body, room: f64, mark: u8, slot: Option<usize>) {
        let (low, high) = body.limits();
        let from = |v: f64| ((v - room) / STEP).floor() as i32;
        let to = |v: f64| ((v + room) / STEP).ceil() as i32;
        for y in from(low.1).max(0)..=to(high.1).min(self.ny - 1) {
            for x in from(low.0).max(0)..=to(high.0).min(self.nx - 1) {
                let p = (f64::from(x) * STEP, f64::from(y) * STEP);
                if body.distance_to_point(p) < room - 1e-6 {
                    let index = self.index(x, y);
                    let map = match slot {
                        Some(slot) => &mut self.tracks[slot],
                        None => &mut self.vias,
                    };
                    map[index] = map[index].max(mark);
                }
            }
        }
    }
}

fn place(x: i32, y: i32) -> Xy {
    (f64::from(x) / 10.0, f64::from(y) / 10.0)
}

fn snap(at: Xy) -> (i32, i32) {
    ((at.0 / STEP).round() as i32, (at.1 / STEP).round() as i32)
}

/// A piece of a net with the grid cells at which a path may end, each with the exact point that it stands for.
struct Piece {
    body: Body,
    layers: [bool; 4],
    ends: Vec<(Cell, Xy)>,
    group: usize,
}

/// The pieces of a net, grouped by what touches.
fn pieces(design: &Design, net: &str) -> Vec<Piece> {
    let mut found: Vec<Piece> = Vec::new();
    for thing in obstacles(design, 0, 0).into_iter().filter(|thing| thing.net == net) {
        let mut ends = Vec::new();
        for (slot, layer) in LAYERS.into_iter().enumerate().filter(|(_, layer)| thing.layers[*layer]) {
            let mut end = |at: Xy| {
                let (x, y) = snap(at);
                ends.push(((slot, x, y), at));
            };
            match thing.body {
                Body::Block(c, ..) => end(c),
                Body::Bar(a, b, _) => {
                    end(a);
                    if a != b {
                        end(b);
                        let n = ((b.0 - a.0).abs().max((b.1 - a.1).abs()) / STEP).round();
                        for k in 1..(n as usize) {
                            let t = k as f64 / n;
                            let at = (a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1));
                            let (x, y) = snap(at);
                            let on = place(x, y);
                            if length(on.0 - at.0, on.1 - at.1) < 1e-6 {
                                end(on);
                            }
                        }
                    }
                }
            }
            let _ = layer;
        }
        let group = found.len();
        found.push(Piece { body: thing.body, layers: thing.layers, ends, group });
    }
    // Join what an inner area joins.
    let inner = |pour: &&Pour| pour.net == net && (1..3).contains(&pour.layer);
    for pour in design.pours.iter().filter(inner) {
        let above = |other: &&Pour| other.layer == pour.layer && other.rank > pour.rank;
        let within = |at: Xy| {
            contains(&pour.outline, at, 0.4)
                && !design.pours.iter().filter(above).any(|other| {
                    let steps = [(0.0, 0.0), (0.6, 0.0), (-0.6, 0.0), (0.0, 0.6), (0.0, -0.6)];
                    steps.iter().any(|step| contains(&other.outline, (at.0 + step.0, at.1 + step.1), 0.0))
                })
        };
        let mut first = None;
        for piece in &mut found {
            let Body::Bar(at, end, _) = piece.body else { continue };
            if piece.layers == [true; 4] && at == end && within(at) {
                piece.group = *first.get_or_insert(piece.group);
            }
        }
    }
    // Join what touches.
    for i in 0..found.len() {
        for j in 0..i {
            let common = (0..4).any(|layer| found[i].layers[layer] && found[j].layers[layer]);
            let distance = match found[j].body {
                Body::Bar(a, b, r) => found[i].body.distance_to_bar(a, b, r),
                Body::Block(c, w, h) => found[i].body.distance_to_bar(c, c, 0.0) - w.min(h),
            };
            let (a, b) = (found[i].group, found[j].group);
            if common && distance < -0.01 && a != b {
                let (low, high) = (a.min(b), a.max(b));
                found.iter_mut().filter(|piece| piece.group == high).for_each(|piece| piece.group = low);
            }
        }
    }
    found
}

/// Routes all wishes in their order; gives the nets that could not be finished.
pub fn route(design: &mut Design, wishes: &[Wish]) -> Vec<String> {
    let (n_tracks, n_vias) = (design.tracks.len(), design.vias.len());
    let mut open: std::collections::VecDeque<usize> = (0..wishes.len()).collect();
    let mut tries = vec![0_u32; wishes.len()];
    let mut failed = Vec::new();
    while let Some(index) = open.pop_front() {
        let wish = &wishes[index];
        tries[index] += 1;
        if tries[index] > 25 {
            failed.push(wish.net.clone());
            continue;
        }
        loop {
            let parts = pieces(design, &wish.net);
            let Some(first) = parts.first().map(|piece| piece.group) else { break };
            if parts.iter().all(|piece| piece.group == first) {
                break;
            }
            let things = obstacles(design, n_tracks, n_vias);
            let maps = Maps::new(design, wish, &things);
            let push = PUSH * (1 + tries[index] / 3);
            let Some(path) = search(&maps, wish, &parts, first, push) else {
                failed.push(wish.net.clone());
                break;
            };
            let (tracks, vias) = shape(&maps, wish, &path);
            // Whoever is in the way routes again later.
            let mut moved: Vec<String> = Vec::new();
            for thing in things.iter().filter(|thing| thing.movable && thing.net != wish.net) {
                let by_track = tracks.iter().any(|track| {
                    thing.layers[track.layer]
                        && track.path.windows(2).any(|leg| {
                            thing.body.distance_to_bar(leg[0], leg[1], 0.5 * track.width) < CLEARANCE - 0.015
                        })
                });
                let by_via = vias
                    .iter()
                    .any(|via| thing.body.distance_to_bar(via.at, via.at, 0.5 * VIA_PAD) < CLEARANCE - 0.015);
                if (by_track || by_via) && !moved.contains(&thing.net) {
                    moved.push(thing.net.clone());
                }
            }
            for net in moved {
                let mut seen = 0;
                design.tracks.retain(|track| {
                    seen += 1;
                    seen <= n_tracks || track.net != net
                });
                seen = 0;
                design.vias.retain(|via| {
                    seen += 1;
                    seen <= n_vias || via.net != net
                });
                let other = wishes.iter().position(|other| other.net == net);
                open.extend(other.filter(|other| !open.contains(other)));
            }
            design.tracks.extend(tracks);
            design.vias.extend(vias);
        }
    }
    failed
}

/// The cheapest path from the first group to any other: exact start, cells, exact end.
fn search(maps: &Maps, wish: &Wish, parts: &[Piece], first: usize, push: u32) -> Option<(Xy, Vec<Cell>, Xy)> {
    let n = (maps.nx * maps.ny) as usize;
    let id = |cell: Cell| cell.0 * n + maps.index(cell.1, cell.2);
    let mut cost = vec![u32::MAX; 2 * n];
    let mut from = vec![255_u8; 2 * n];
    let mut goal = vec![false; 2 * n];
    let (mut low, mut high) = ((i32::MAX, i32::MAX), (i32::MIN, i32::MIN));
    for (cell, _) in parts.iter().filter(|piece| piece.group != first).flat_map(|piece| &piece.ends) {
        goal[id(*cell)] = true;
        low = (low.0.min(cell.1), low.1.min(cell.2));
        high = (high.0.max(cell.1), high.1.max(cell.2));
    }
    let guess = |cell: Cell| {
        let dx = (low.0 - cell.1).max(cell.1 - high.0).max(0) as u32;
        let dy = (low.1 - cell.2).max(cell.2 - high.1).max(0) as u32;
        STRAIGHT * dx.max(dy) + 4 * dx.min(dy)
    };
    let mut heap = BinaryHeap::new();
    for (cell, _) in parts.iter().filter(|piece| piece.group == first).flat_map(|piece| &piece.ends) {
        cost[id(*cell)] = 0;
        heap.push(Reverse((guess(*cell), 0_u32, *cell)));
    }
    let mut end = None;
    while let Some(Reverse((_, spent, cell))) = heap.pop() {
        if spent > cost[id(cell)] {
            continue;
        }
        if goal[id(cell)] {
            end = Some(cell);
            break;
        }
        let mut go = |next: Cell, price: u32, turn: u8| {
            let total = spent + price;
            if total < cost[id(next)] {
                cost[id(next)] = total;
                from[id(next)] = turn;
                heap.push(Reverse((total + guess(next), total, next)));
            }
        };
        for (turn, (dx, dy)) in TURNS.into_iter().enumerate() {
            let next = (cell.0, cell.1 + dx, cell.2 + dy);
            if next.1 < 0 || next.2 < 0 || next.1 >= maps.nx || next.2 >= maps.ny {
                continue;
            }
            let state = maps.tracks[cell.0][maps.index(next.1, next.2)];
            if state == 2 && !goal[id(next)] {
                continue;
            }
            let base = if turn % 2 == 0 { STRAIGHT } else { 14 };
            go(next, base + wish.toll[cell.0] + if state == 1 { push } else { 0 }, turn as u8);
        }
        let state = maps.vias[maps.index(cell.1, cell.2)];
        if state < 2 {
            go((1 - cell.0, cell.1, cell.2), VIA_COST + if state == 1 { 4 * push } else { 0 }, 8);
        }
    }
    let mut cell = end?;
    let exact = |cell: Cell, start: bool| {
        let ends = parts.iter().filter(|piece| (piece.group == first) == start).flat_map(|piece| &piece.ends);
        ends.into_iter().find(|end| end.0 == cell).map(|end| end.1)
    };
    let finish = exact(cell, false)?;
    let mut path = vec![cell];
    loop {
        let turn = from[id(cell)];
        if turn == 255 {
            break;
        }
        cell = match turn {
            8 => (1 - cell.0, cell.1, cell.2),
            turn => {
                let (dx, dy) = TURNS[turn as usize];
                (cell.0, cell.1 - dx, cell.2 - dy)
            }
        };
        path.push(cell);
    }
    path.reverse();
    Some((exact(cell, true)?, path, finish))
}

/// Tracks and vias along a path, pulled tight.
fn shape(maps: &Maps, wish: &Wish, path: &(Xy, Vec<Cell>, Xy)) -> (Vec<Track>, Vec<Via>) {
    let (mut tracks, mut vias) = (Vec::new(), Vec::new());
    let (start, cells, finish) = path;
    let mut at = 0;
    while at < cells.len() {
        let layer = cells[at].0;
        let mut end = at;
        while end + 1 < cells.len() && cells[end + 1].0 == layer {
            end += 1;
        }
        let mut line: Vec<Xy> = tighten(maps, &cells[at..=end]).iter().map(|c| place(c.1, c.2)).collect();
        if at == 0 && line[0] != *start {
            line.insert(0, *start);
        }
        if end + 1 == cells.len() && line[line.len() - 1] != *finish {
            line.push(*finish);
        }
        if line.len() > 1 {
            tracks.push(Track {
                net: wish.net.clone(),
                layer: LAYERS[layer],
                width: wish.width,
                path: line,
                tag: "",
            });
        }
        if end + 1 < cells.len() {
            vias.push(Via { net: wish.net.clone(), at: place(cells[end].1, cells[end].2), tag: "" });
        }
        at = end + 1;
    }
    (tracks, vias)
}

/// Replaces staircases by one diagonal and one straight piece wherever that way is as free as the path itself.
fn tighten(maps: &Maps, cells: &[Cell]) -> Vec<Cell> {
    let mut kept = vec![cells[0]];
    let mut at = 0;
    while at + 1 < cells.len() {
        let mut best = (at + 1, Vec::new());
        for next in ((at + 1)..cells.len()).rev() {
            let worst =
                cells[at..=next].iter().map(|c| maps.tracks[c.0][maps.index(c.1, c.2)]).max().unwrap_or(0);
            let ways = doglegs(cells[at], cells[next]);
            let free = ways.into_iter().find(|way| {
                let inside = &way[..];
                is_free(maps, inside, worst)
            });
            if let Some(way) = free {
                best = (next, way);
                break;
            }
        }
        let (next, way) = best;
        if way.len() == 3 {
            kept.push(way[1]);
        }
        kept.push(cells[next]);
        at = next;
    }
    // Leave out corners on straight lines.
    let mut line: Vec<Cell> = Vec::new();
    for cell in kept {
        if line.last() == Some(&cell) {
            continue;
        }
        while line.len() > 1 {
            let (a, b) = (line[line.len() - 2], line[line.len() - 1]);
            let cross = (b.1 - a.1) * (cell.2 - a.2) - (b.2 - a.2) * (cell.1 - a.1);
            if cross != 0 {
                break;
            }
            line.pop();
        }
        line.push(cell);
    }
    line
}

/// Ways from `a` to `b` with at most one bend of 45 degrees.
fn doglegs(a: Cell, b: Cell) -> Vec<Vec<Cell>> {
    let (dx, dy) = (b.1 - a.1, b.2 - a.2);
    let diagonal = dx.abs().min(dy.abs());
    if diagonal == 0 || dx.abs() == dy.abs() {
        return vec![vec![a, b]];
    }
    let (sx, sy) = (dx.signum() * diagonal, dy.signum() * diagonal);
    vec![vec![a, (a.0, a.1 + sx, a.2 + sy), b], vec![a, (a.0, b.1 - sx, b.2 - sy), b]]
}

fn is_free(maps: &Maps, way: &[Cell], worst: u8) -> bool {
    way.windows(2).all(|leg| {
        let (a, b) = (leg[0], leg[1]);
        let n = (b.1 - a.1).abs().max((b.2 - a.2).abs());
        let (sx, sy) = ((b.1 - a.1).signum(), (b.2 - a.2).signum());
        (0..=n).all(|k| {
            let (x, y) = (a.1 + k * sx, a.2 + k * sy);
            // The ends may lie in a pad of the net that others crowd.
            let end = (k == 0 && a == way[0]) || (k == n && b == way[way.len() - 1]);
            end || maps.tracks[a.0][maps.index(x, y)] <= worst.min(1)
        })
    })
}

/// Takes the pads of `nets` without hole down to their planes: a short track and a via next to each pad. `inside` says
/// whether a net has its plane at a place.
pub fn fan_out(
    design: &mut Design,
    nets: &[&str],
    width: f64,
    inside: &dyn Fn(&str, Xy) -> bool,
) -> Vec<String> {
    let mut failed = Vec::new();
    let parts = design.parts.clone();
    for part in &parts {
        for pad in part.pads.iter().filter(|pad| pad.drill.is_none() && nets.contains(&pad.net.as_str())) {
            let things = obstacles(design, 0, 0);
            let (w, h) = pad.shape.size();
            let width = width.min(w).min(h);
            let done = things.iter().any(|thing| {
                thing.net == pad.net && !thing.pad && thing.body.distance_to_point(pad.at) < 0.0
            });
            if done {
                continue;
            }
            // Away from the part's middle first.
            let out = (pad.at.0 - part.at.0, pad.at.1 - part.at.1);
            let mut tried: Vec<(i64, Xy)> = Vec::new();
            for (dx, dy) in TURNS.map(|(x, y)| (f64::from(x), f64::from(y))) {
                for k in 6..30 {
                    let r = f64::from(k) * STEP;
                    let at = (pad.at.0 + dx * r, pad.at.1 + dy * r);
                    let reach = r * length(dx, dy);
                    let along = (out.0 * dx + out.1 * dy) / (length(out.0, out.1) * length(dx, dy)).max(1e-9);
                    tried.push((((reach + 0.5 * (1.0 - along)) * 1e4).round() as i64, at));
                }
            }
            tried.sort_by_key(|entry| entry.0);
            let fits = |at: Xy| {
                let (low, high) = (EDGE + 0.3, (design.size.0 - EDGE - 0.3, design.size.1 - EDGE - 0.3));
                let on_board = at.0 > low && at.1 > low && at.0 < high.0 && at.1 < high.1;
                on_board
                    && inside(&pad.net, at)
                    && things.iter().all(|thing| {
                        let via = thing.body.distance_to_bar(at, at, 0.5 * VIA_PAD);
                        if thing.net == pad.net {
                            // No via in a pad, no two vias in one place.
                            return !(thing.pad || thing.barrel) || via > 0.08;
                        }
                        // Copper that ties the pad to another net touches it.
                        if thing.net.is_empty() && thing.body.distance_to_point(pad.at) < 0.25 {
                            return via > CLEARANCE;
                        }
                        let track = thing.body.distance_to_bar(pad.at, at, 0.5 * width);
                        via > CLEARANCE && (!thing.layers[0] || track > CLEARANCE)
                    })
            };
            match tried.into_iter().map(|entry| entry.1).find(|&at| fits(at)) {
                Some(at) => {
                    let at = (super::package::tidy(at.0), super::package::tidy(at.1));
                    design.track(&pad.net, 0, width, &[pad.at, at]);
                    design.via(&pad.net, at);
                }
                None => failed.push(format!("{}.{}", part.reference, pad.number)),
            }
        }
    }
    failed
}
