//! The way of a signal through the copper of its net, from driver to receiver, and what hangs on it.

use super::TrackLeg;
use super::copper::NetCopper;
use super::graph::{Graph, Run};
use super::request::Ends;
use super::terrain::Terrain;
use crate::board::PinId;
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::geom::Point;
use crate::unit::length_text;
use std::collections::{BTreeMap, BTreeSet};

/// Off the way, copper shorter than this is no branch, in metres.
const BRANCH_M: f64 = 0.5e-3;
/// A second way shorter than this lies within pads and bends and is no loop, in metres.
const LOOP_M: f64 = 1.5e-3;
/// Most branches that a note lists.
const LISTED: usize = 6;

/// The way of a signal.
#[derive(Clone, Debug, Default)]
pub struct Route {
    /// Its straight pieces; where the layer changes between two, a barrel joins them.
    pub legs: Vec<TrackLeg>,
    /// Branches, loops, pours and further receivers, stated.
    pub notes: Vec<Diagnostic>,
}

/// Finds the way between two pins of a net.
pub fn find(terrain: &Terrain<'_>, ends: &Ends, origin: Point) -> Result<Route, Diagnostic> {
    let copper = NetCopper::of(terrain, ends.net);
    let graph = Graph::new(&copper, &terrain.board.stackup);
    let name = terrain.board.net_name(ends.net);
    let no_copper = |pin: PinId| {
        let label = terrain.board.pins[pin.0 as usize].label();
        let text =
            format!("pin `{label}` of net `{name}` must have copper in the fabrication data; it has none");
        Diagnostic::error(code::TRACK_OPEN, text)
    };
    let sources = graph.pins.get(&ends.driver).ok_or_else(|| no_copper(ends.driver))?;
    let targets = graph.pins.get(&ends.receiver).ok_or_else(|| no_copper(ends.receiver))?;
    let best = graph.distances(sources, |_| false);
    let target = targets.iter().copied().min_by(|&a, &b| best[a].0.total_cmp(&best[b].0).then(a.cmp(&b)));
    let target = target.filter(|&node| best[node].0.is_finite());
    let Some(target) = target else { return Err(open_track(terrain, &graph, ends, &best)) };
    let mut edges = Vec::new();
    let mut nodes = vec![target];
    let mut node = target;
    while let Some(index) = best[node].1 {
        node = graph.edges[index].a + graph.edges[index].b - node;
        edges.push(index);
        nodes.push(node);
    }
    edges.reverse();
    nodes.reverse();
    let mut route = Route::default();
    let mut poured_m = 0.0;
    for (pair, &index) in nodes.windows(2).zip(&edges) {
        let edge = &graph.edges[index];
        if edge.run == Run::Barrel {
            continue;
        }
        let mut width_m = edge.width_m;
        if edge.run == Run::Pour {
            poured_m += edge.length_m;
            let narrowest =
                copper.segments.iter().map(|segment| segment.width_m).fold(f64::INFINITY, f64::min);
            let fallback = if narrowest.is_finite() { narrowest } else { 0.2e-3 };
            width_m = graph.pour_width_m(&copper, edge).unwrap_or(fallback);
        }
        let leg = TrackLeg {
            from: graph.nodes[pair[0]].1,
            to: graph.nodes[pair[1]].1,
            layer: graph.nodes[pair[0]].0,
            width_m,
            current: 1.0,
        };
        push_leg(&mut route.legs, leg);
    }
    if route.legs.is_empty() {
        let text = format!("track of net `{name}` must have a length; its pins lie on top of each other");
        return Err(Diagnostic::error(code::TRACK_OPEN, text));
    }
    if poured_m > 0.0 {
        let text = format!(
            "track of net `{name}` runs {} across filled copper of its own; a straight line across it is taken",
            length_text(poured_m)
        );
        route.notes.push(Diagnostic::note(code::TRACK_ACROSS_AREA, text));
    }
    route.notes.extend(branches(terrain, &graph, ends, &nodes, &edges, origin));
    Ok(route)
}

/// Adds a leg, or lengthens the last one where it goes straight on.
fn push_leg(legs: &mut Vec<TrackLeg>, leg: TrackLeg) {
    if leg.from.distance(leg.to) < 1e-9 {
        return;
    }
    if let Some(last) = legs.last_mut()
        && last.layer == leg.layer
        && last.to == leg.from
        && (last.width_m - leg.width_m).abs() <= 1e-9
    {
        let (a, b) = (last.to - last.from, leg.to - leg.from);
        if a.dot(b) > 0.0 && a.cross(b).abs() <= 1e-9 * a.length() {
            last.to = leg.to;
            return;
        }
    }
    legs.push(leg);
}

/// The message for pins that no copper joins: names the gap.
fn open_track(
    terrain: &Terrain<'_>,
    graph: &Graph,
    ends: &Ends,
    best: &[(f64, Option<usize>)],
) -> Diagnostic {
    let label = |pin: PinId| terrain.board.pins[pin.0 as usize].label();
    let name = terrain.board.net_name(ends.net);
    let from_target = graph.distances(&graph.pins[&ends.receiver], |_| false);
    let reached = |best: &[(f64, Option<usize>)]| -> Vec<usize> {
        (0..best.len()).filter(|&node| best[node].0.is_finite()).collect()
    };
    let (near, far) = (reached(best), reached(&from_target));
    let mut gap = (f64::INFINITY, None);
    for &a in &near {
        for &b in &far {
            if graph.nodes[a].0 == graph.nodes[b].0 {
                let distance = graph.nodes[a].1.distance(graph.nodes[b].1);
                if distance < gap.0 {
                    gap = (distance, Some(a));
                }
            }
        }
    }
    let text = format!(
        "copper of net `{name}` must lead from `{}` to `{}`; it does not",
        label(ends.driver),
        label(ends.receiver)
    );
    let message = Diagnostic::error(code::TRACK_OPEN, text);
    let part = "a series part between them makes two nets: chart each of them";
    match gap.1 {
        Some(node) => message
            .on_board(Some(graph.nodes[node].0 + 1), graph.nodes[node].1)
            .hint(format!("the nearest pieces of the two sides are {} apart here", length_text(gap.0)))
            .hint(part),
        None => message.hint(part),
    }
}

/// What hangs on the way: one note for branches, one for loops, one for further pins.
fn branches(
    terrain: &Terrain<'_>,
    graph: &Graph,
    ends: &Ends,
    nodes: &[usize],
    edges: &[usize],
    origin: Point,
) -> Vec<Diagnostic> {
    let name = terrain.board.net_name(ends.net);
    let on_way: BTreeSet<usize> = nodes.iter().copied().collect();
    let way: BTreeSet<usize> = edges.iter().copied().collect();
    let mut along = BTreeMap::new();
    let mut station = 0.0;
    for (k, &node) in nodes.iter().enumerate() {
        if k > 0 {
            station += graph.edges[edges[k - 1]].length_m;
        }
        along.entry(node).or_insert(station);
    }
    let best = graph.distances(nodes, |index| way.contains(&index));
    let words = |at: Point| {
        let at = (at - origin) * 1e3;
        format!("{:.2}, {:.2}", at.x, at.y)
    };
    let mut receivers = Vec::new();
    let mut at_pins = BTreeSet::new();
    let mut unreached = Vec::new();
    for (index, pin) in terrain.board.pins.iter().enumerate() {
        let id = PinId(index as u32);
        if pin.net != Some(ends.net) || id == ends.driver || id == ends.receiver {
            continue;
        }
        let Some(found) = graph.pins.get(&id) else { continue };
        let nearest = found.iter().copied().min_by(|&a, &b| best[a].0.total_cmp(&best[b].0).then(a.cmp(&b)));
        let Some(nearest) = nearest.filter(|&node| best[node].0.is_finite()) else {
            unreached.push(pin.label());
            continue;
        };
        at_pins.extend(found.iter().copied());
        let away = best[nearest].0;
        receivers.push(if away < BRANCH_M {
            format!("`{}` on the way", pin.label())
        } else {
            format!("`{}` {} off the way", pin.label(), length_text(away))
        });
    }
    let (stubs, loops) = Off { graph, way: &way, on_way: &on_way, along: &along, best: &best }.find(&at_pins);
    let mut notes = Vec::new();
    if !receivers.is_empty() {
        let text = format!(
            "net `{name}` has further pins, {}; all current is taken to flow from `{}` to `{}`",
            listed(&receivers),
            terrain.board.pins[ends.driver.0 as usize].label(),
            terrain.board.pins[ends.receiver.0 as usize].label()
        );
        notes.push(Diagnostic::note(code::TRACK_FURTHER_PINS, text));
    }
    if !unreached.is_empty() {
        let text = format!("no copper of net `{name}` leads to {}", listed(&unreached));
        notes.push(Diagnostic::warning(code::TRACK_PIN_APART, text));
    }
    if !stubs.is_empty() {
        let list: Vec<String> =
            stubs.iter().map(|(reach, at)| format!("{} at {}", length_text(*reach), words(*at))).collect();
        let text = format!("net `{name}` has open branches that carry no current here: {}", listed(&list));
        notes.push(Diagnostic::note(code::TRACK_BRANCH, text));
    }
    if !loops.is_empty() {
        let list: Vec<String> = loops
            .iter()
            .map(|(length_m, a, b)| {
                let what = length_m.map_or_else(|| "filled copper".into(), length_text);
                format!("{what} from {} to {}", words(*a), words(*b))
            })
            .collect();
        let text = format!(
            "copper of net `{name}` closes a loop beside the way: {}; all current is taken along the shorter way",
            listed(&list)
        );
        notes.push(Diagnostic::warning(code::TRACK_LOOP, text));
    }
    notes
}

fn listed(items: &[String]) -> String {
    let shown = items.iter().take(LISTED).cloned().collect::<Vec<_>>().join("; ");
    if items.len() > LISTED { format!("{shown}; and {} more", items.len() - LISTED) } else { shown }
}

/// The graph off the way.
struct Off<'g> {
    graph: &'g Graph,
    way: &'g BTreeSet<usize>,
    on_way: &'g BTreeSet<usize>,
    /// Place of each node of the way along it, in metres.
    along: &'g BTreeMap<usize, f64>,
    best: &'g [(f64, Option<usize>)],
}

type Stub = (f64, Point);
/// Length of the second way (none through filled copper), and where it leaves and meets the first.
type Loop = (Option<f64>, Point, Point);

/// Connected copper off the way.
#[derive(Default)]
struct Group {
    drawn_m: f64,
    filled: bool,
    has_pin: bool,
}

impl Off<'_> {
    /// Open branches with how far they reach, and loops with their length off the way.
    fn find(&self, at_pins: &BTreeSet<usize>) -> (Vec<Stub>, Vec<Loop>) {
        let mut seen = vec![false; self.graph.nodes.len()];
        let (mut stubs, mut loops) = (Vec::new(), Vec::new());
        for start in 0..self.graph.nodes.len() {
            if seen[start] || self.on_way.contains(&start) || !self.best[start].0.is_finite() {
                continue;
            }
            let mut open = vec![start];
            seen[start] = true;
            let mut feet: BTreeSet<usize> = BTreeSet::new();
            let mut reach = 0.0f64;
            let mut group = Group::default();
            let mut drawn: BTreeSet<usize> = BTreeSet::new();
            while let Some(node) = open.pop() {
                reach = reach.max(self.best[node].0);
                group.has_pin |= at_pins.contains(&node);
                for &index in &self.graph.at[node] {
                    let edge = &self.graph.edges[index];
                    match edge.run {
                        Run::Track => drawn.insert(index),
                        Run::Pour => {
                            group.filled = true;
                            false
                        }
                        _ => false,
                    };
                    let other = edge.a + edge.b - node;
                    if self.on_way.contains(&other) {
                        feet.insert(other);
                    } else if !seen[other] {
                        seen[other] = true;
                        open.push(other);
                    }
                }
            }
            group.drawn_m = drawn.iter().map(|&index| self.graph.edges[index].length_m).sum();
            self.sort_out(&feet, reach, &group, &mut stubs, &mut loops);
        }
        // Edges beside the way between two of its own nodes.
        for (index, edge) in self.graph.edges.iter().enumerate() {
            let beside =
                !self.way.contains(&index) && self.on_way.contains(&edge.a) && self.on_way.contains(&edge.b);
            if beside && edge.run == Run::Track && edge.length_m > LOOP_M {
                let between = (self.along[&edge.a] - self.along[&edge.b]).abs();
                if between > edge.width_m {
                    loops.push((Some(edge.length_m), self.graph.nodes[edge.a].1, self.graph.nodes[edge.b].1));
                }
            }
        }
        (stubs, loops)
    }

    fn sort_out(
        &self,
        feet: &BTreeSet<usize>,
        reach: f64,
        group: &Group,
        stubs: &mut Vec<Stub>,
        loops: &mut Vec<Loop>,
    ) {
        let by_station = |node: &&usize| self.along[*node];
        let first = feet.iter().min_by(|a, b| by_station(a).total_cmp(&by_station(b)));
        let last = feet.iter().max_by(|a, b| by_station(a).total_cmp(&by_station(b)));
        let (Some(&first), Some(&last)) = (first, last) else { return };
        let at = |node: usize| self.graph.nodes[node].1;
        if self.along[&last] - self.along[&first] > LOOP_M.max(0.5 * reach)
            && (group.filled || group.drawn_m > LOOP_M)
        {
            loops.push((if group.filled { None } else { Some(group.drawn_m) }, at(first), at(last)));
        } else if !group.has_pin && reach > BRANCH_M && group.drawn_m > BRANCH_M {
            stubs.push((reach, at(first)));
        }
    }
}
