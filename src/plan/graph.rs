//! The copper of a net as a graph: nodes on layers, edges along draws, across pads and pours, and down barrels.
//!
//! Contact is decided by geometry: two draws touch where their pens overlap, a draw touches a pad where its pen
//! reaches the pad's copper. Where pens of draws that already follow each other overlap (bends, chords of an arc), the
//! overlap adds nothing.

use super::copper::{NetCopper, Segment};
use super::touch::{
    chord_across, extent_across, line_meets, nearest_part, nearest_parts, point_at, regions_meet,
};
use crate::board::{PinId, Stackup};
use crate::geom::Point;
use std::collections::{BTreeMap, BTreeSet, BinaryHeap};

/// Ends nearer to another draw's middle line than this lie on it: rounding of coarse formats, in metres.
const ON_LINE_M: f64 = 5e-6;
/// Pens must overlap by this much to touch, in metres.
const OVERLAP_M: f64 = 0.5e-6;
/// Most contacts of a pour that are joined pair by pair.
const POUR_PAIRS: usize = 300;

/// What an edge runs along.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Run {
    /// A draw.
    Track,
    /// The overlap of two draws.
    Joint,
    /// A pad.
    Pad,
    /// A pour.
    Pour,
    /// A barrel.
    Barrel,
}

/// An edge of the graph.
#[derive(Clone, Copy, Debug)]
pub struct Edge {
    /// First node.
    pub a: usize,
    /// Second node.
    pub b: usize,
    /// Length in metres.
    pub length_m: f64,
    /// Width of the copper in metres.
    pub width_m: f64,
    /// What it runs along.
    pub run: Run,
}

/// Nodes and edges of one net.
#[derive(Clone, Debug, Default)]
pub struct Graph {
    /// Layer and place of each node.
    pub nodes: Vec<(usize, Point)>,
    /// Edges.
    pub edges: Vec<Edge>,
    /// Edges of each node.
    pub at: Vec<Vec<usize>>,
    /// Nodes of each pin.
    pub pins: BTreeMap<PinId, Vec<usize>>,
    index: BTreeMap<(usize, i64, i64), usize>,
}

impl Graph {
    /// Joins the pieces of a net.
    pub fn new(copper: &NetCopper<'_>, stackup: &Stackup) -> Self {
        let mut graph = Self::default();
        let mut cuts: Vec<Vec<f64>> = vec![vec![0.0, 1.0]; copper.segments.len()];
        graph.join_pads(copper, stackup);
        let touched = graph.join_draws_to_pads(copper, &mut cuts);
        graph.join_draws(copper, &touched, &mut cuts);
        graph.join_pours(copper, &mut cuts);
        for (segment, mut parts) in copper.segments.iter().zip(cuts) {
            parts.sort_by(f64::total_cmp);
            parts.dedup();
            for pair in parts.windows(2) {
                let (from, to) = (graph.on(segment, pair[0]), graph.on(segment, pair[1]));
                graph.link(from, to, segment.width_m, Run::Track);
            }
            if segment.from == segment.to {
                graph.on(segment, 0.0);
            }
        }
        graph
    }

    fn node(&mut self, layer: usize, at: Point) -> usize {
        // Ten nanometres: below any format's step, above rounding.
        let key = (layer, (at.x * 1e8).round() as i64, (at.y * 1e8).round() as i64);
        let next = self.nodes.len();
        let node = *self.index.entry(key).or_insert(next);
        if node == next {
            self.nodes.push((layer, at));
            self.at.push(Vec::new());
        }
        node
    }

    fn on(&mut self, segment: &Segment, part: f64) -> usize {
        self.node(segment.layer, point_at((segment.from, segment.to), part))
    }

    fn link(&mut self, a: usize, b: usize, width_m: f64, run: Run) {
        if a != b {
            let length_m = self.nodes[a].1.distance(self.nodes[b].1);
            self.push(Edge { a, b, length_m, width_m, run });
        }
    }

    fn push(&mut self, edge: Edge) {
        let index = self.edges.len();
        self.at[edge.a].push(index);
        self.at[edge.b].push(index);
        self.edges.push(edge);
    }

    fn join_pads(&mut self, copper: &NetCopper<'_>, stackup: &Stackup) {
        let pads = &copper.pads;
        let nodes: Vec<usize> = pads.iter().map(|pad| self.node(pad.layer, pad.at)).collect();
        for (pad, &node) in pads.iter().zip(&nodes) {
            if let Some(pin) = pad.pin {
                let known = self.pins.entry(pin).or_default();
                if !known.contains(&node) {
                    known.push(node);
                }
            }
        }
        for passages in &copper.barrels {
            for pair in passages.windows(2) {
                let (upper, lower) = (&pads[pair[0]], &pads[pair[1]]);
                let width_m = upper.bounds.width();
                let length_m = stackup.gap_m(upper.layer, lower.layer);
                self.push(Edge { a: nodes[pair[0]], b: nodes[pair[1]], length_m, width_m, run: Run::Barrel });
            }
        }
        for i in 0..pads.len() {
            for j in i + 1..pads.len() {
                let (p, q) = (&pads[i], &pads[j]);
                let touch = p.layer == q.layer && nodes[i] != nodes[j] && p.bounds.meets(q.bounds);
                if touch && regions_meet(&p.shape, &q.shape) {
                    let across = |pad: &super::copper::Pad<'_>| extent_across(&pad.shape, p.at, q.at);
                    self.link(nodes[i], nodes[j], across(p).max(across(q)), Run::Pad);
                }
            }
        }
    }

    /// Gives for each draw the pads that it touches.
    fn join_draws_to_pads(&mut self, copper: &NetCopper<'_>, cuts: &mut [Vec<f64>]) -> Vec<Vec<usize>> {
        let mut touched = vec![Vec::new(); copper.segments.len()];
        for (i, segment) in copper.segments.iter().enumerate() {
            let ends = (segment.from, segment.to);
            for (k, pad) in copper.pads.iter().enumerate() {
                if pad.layer != segment.layer || !pad.bounds.meets(segment.bounds()) {
                    continue;
                }
                if !line_meets(ends, &pad.shape, (0.5 * segment.width_m - OVERLAP_M).max(0.0)) {
                    continue;
                }
                touched[i].push(k);
                let part = nearest_part(pad.at, ends);
                cuts[i].push(part);
                let (from, to) = (self.node(pad.layer, pad.at), self.on(segment, part));
                let across = extent_across(&pad.shape, self.nodes[from].1, self.nodes[to].1);
                self.link(from, to, across.max(segment.width_m), Run::Pad);
            }
        }
        touched
    }

    fn join_draws(&mut self, copper: &NetCopper<'_>, touched: &[Vec<usize>], cuts: &mut [Vec<f64>]) {
        let segments = &copper.segments;
        let n = segments.len();
        // Draws that follow each other, and overlaps of pens that remain to be judged.
        let mut follows: Vec<BTreeSet<usize>> = vec![BTreeSet::new(); n];
        let mut overlaps = Vec::new();
        let mut order: Vec<usize> = (0..n).collect();
        let bounds: Vec<_> = segments.iter().map(Segment::bounds).collect();
        order.sort_by(|&i, &j| bounds[i].min.x.total_cmp(&bounds[j].min.x).then(i.cmp(&j)));
        for (k, &i) in order.iter().enumerate() {
            for &j in order[k + 1..].iter().take_while(|&&j| bounds[j].min.x <= bounds[i].max.x) {
                let (i, j) = (i.min(j), i.max(j));
                if segments[i].layer != segments[j].layer || !bounds[i].meets(bounds[j]) {
                    continue;
                }
                let (a, b) = ((segments[i].from, segments[i].to), (segments[j].from, segments[j].to));
                let (s, t, distance) = nearest_parts(a, b);
                let reach = 0.5 * (segments[i].width_m + segments[j].width_m);
                let at_end = s == 0.0 || s == 1.0 || t == 0.0 || t == 1.0;
                if distance <= ON_LINE_M.min(reach) && at_end {
                    follows[i].insert(j);
                    follows[j].insert(i);
                    self.join_pair(segments, (i, s), (j, t), cuts);
                } else if distance < reach - OVERLAP_M {
                    overlaps.push((distance, i, j, s, t));
                }
            }
        }
        overlaps.sort_by(|p, q| p.0.total_cmp(&q.0).then((p.1, p.2).cmp(&(q.1, q.2))));
        let mut by_pad: BTreeMap<usize, Vec<usize>> = BTreeMap::new();
        for (i, pads) in touched.iter().enumerate() {
            pads.iter().for_each(|&pad| by_pad.entry(pad).or_default().push(i));
        }
        for (_, i, j, s, t) in overlaps {
            let reach = 2.0 * (segments[i].width_m + segments[j].width_m);
            if !near_on_the_way(segments, &follows, touched, &by_pad, (i, j), reach) {
                follows[i].insert(j);
                follows[j].insert(i);
                self.join_pair(segments, (i, s), (j, t), cuts);
            }
        }
    }

    fn join_pair(
        &mut self,
        segments: &[Segment],
        (i, s): (usize, f64),
        (j, t): (usize, f64),
        cuts: &mut [Vec<f64>],
    ) {
        cuts[i].push(s);
        cuts[j].push(t);
        let (a, b) = (self.on(&segments[i], s), self.on(&segments[j], t));
        self.link(a, b, segments[i].width_m.min(segments[j].width_m), Run::Joint);
    }

    fn join_pours(&mut self, copper: &NetCopper<'_>, cuts: &mut [Vec<f64>]) {
        for pour in &copper.pours {
            let mut contacts: BTreeSet<usize> = BTreeSet::new();
            for (i, segment) in copper.segments.iter().enumerate() {
                if segment.layer != pour.layer || !pour.bounds.meets(segment.bounds()) {
                    continue;
                }
                let ends = (segment.from, segment.to);
                let inside: Vec<f64> = [0.0, 1.0]
                    .into_iter()
                    .filter(|&part| pour.shapes.iter().any(|shape| shape.contains(point_at(ends, part))))
                    .collect();
                let reach = 0.5 * segment.width_m;
                if inside.is_empty() && pour.shapes.iter().any(|shape| line_meets(ends, shape, reach)) {
                    let part = crossing_part(&pour.shapes, ends);
                    cuts[i].push(part);
                    contacts.insert(self.on(segment, part));
                }
                for part in inside {
                    contacts.insert(self.on(segment, part));
                }
            }
            for pad in copper.pads.iter().filter(|pad| pad.layer == pour.layer) {
                let touch = || {
                    pour.shapes.iter().any(|shape| shape.contains(pad.at) || regions_meet(shape, &pad.shape))
                };
                if pad.bounds.meets(pour.bounds) && touch() {
                    contacts.insert(self.node(pad.layer, pad.at));
                }
            }
            self.join_across(&contacts.into_iter().collect::<Vec<_>>());
        }
    }

    /// Straight lines across a pour between its contacts; with very many contacts only from each to its nearest.
    fn join_across(&mut self, contacts: &[usize]) {
        for (k, &a) in contacts.iter().enumerate() {
            let mut others: Vec<usize> = contacts[k + 1..].to_vec();
            if contacts.len() > POUR_PAIRS {
                let from = self.nodes[a].1;
                let distance = |node: usize| self.nodes[node].1.distance(from);
                others = contacts.iter().copied().filter(|&other| other != a).collect();
                others.sort_by(|&p, &q| distance(p).total_cmp(&distance(q)).then(p.cmp(&q)));
                others.truncate(24);
            }
            for b in others {
                // The width is looked up when the way is known, see `pour_width_m`.
                self.link(a, b, f64::NAN, Run::Pour);
            }
        }
    }

    /// Width of a pour's copper across an edge, in metres.
    pub fn pour_width_m(&self, copper: &NetCopper<'_>, edge: &Edge) -> Option<f64> {
        let ((layer, from), (_, to)) = (self.nodes[edge.a], self.nodes[edge.b]);
        let pours = copper.pours.iter().filter(|pour| pour.layer == layer);
        pours.filter_map(|pour| chord_across(&pour.shapes, from, to)).next()
    }

    /// Shortest way from any of `sources`: for each node its distance in metres and the edge that leads to it. Edges
    /// for which `closed` holds are not used.
    pub fn distances(&self, sources: &[usize], closed: impl Fn(usize) -> bool) -> Vec<(f64, Option<usize>)> {
        let mut best = vec![(f64::INFINITY, None); self.nodes.len()];
        let mut heap = BinaryHeap::new();
        for &source in sources {
            best[source] = (0.0, None);
            heap.push(std::cmp::Reverse((Distance(0.0), source)));
        }
        while let Some(std::cmp::Reverse((Distance(distance), node))) = heap.pop() {
            if distance > best[node].0 {
                continue;
            }
            for &index in &self.at[node] {
                if closed(index) {
                    continue;
                }
                let edge = &self.edges[index];
                let other = edge.a + edge.b - node;
                let reached = distance + edge.length_m;
                if reached < best[other].0 {
                    best[other] = (reached, Some(index));
                    heap.push(std::cmp::Reverse((Distance(reached), other)));
                }
            }
        }
        best
    }
}

/// A distance that can be ordered.
#[derive(PartialEq)]
struct Distance(f64);

impl Eq for Distance {}

impl PartialOrd for Distance {
    fn partial_cmp(&self, other: &Self) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Distance {
    fn cmp(&self, other: &Self) -> std::cmp::Ordering {
        self.0.total_cmp(&other.0)
    }
}

/// Whether draw `j` follows draw `i` within `reach_m` of other draws, or over a pad.
fn near_on_the_way(
    segments: &[Segment],
    follows: &[BTreeSet<usize>],
    touched: &[Vec<usize>],
    by_pad: &BTreeMap<usize, Vec<usize>>,
    (i, j): (usize, usize),
    reach_m: f64,
) -> bool {
    let mut best: BTreeMap<usize, f64> = BTreeMap::from([(i, 0.0)]);
    let mut open = vec![i];
    while let Some(at) = open.pop() {
        let far = best[&at];
        let over_pads = touched[at].iter().filter_map(|pad| by_pad.get(pad)).flatten();
        for &next in follows[at].iter().chain(over_pads) {
            if next == j {
                return true;
            }
            let reached = far + segments[next].from.distance(segments[next].to);
            if reached <= reach_m && best.get(&next).is_none_or(|&known| reached < known) {
                best.insert(next, reached);
                open.push(next);
            }
        }
    }
    false
}

/// A part of the line that lies on one of the shapes, or its middle.
fn crossing_part(shapes: &[std::borrow::Cow<'_, crate::geom::Region>], ends: (Point, Point)) -> f64 {
    const STEPS: usize = 32;
    let parts = (0..=STEPS).map(|step| step as f64 / STEPS as f64);
    let mut on = parts.filter(|&part| shapes.iter().any(|shape| shape.contains(point_at(ends, part))));
    on.next().unwrap_or(0.5)
}
