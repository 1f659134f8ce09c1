//! The way of a signal through parts and the copper of its nets, from driver to receivers, and what hangs on it.
//!
//! In one net the current takes the shortest way through draws, pads, barrels and filled copper; with several receivers
//! the ways form a tree whose legs carry the sum of the shares behind them. Between two nets it passes a part straight
//! from pad to pad. Where the way runs in copper that is solved as a sheet (a reference net, or a large area of its own
//! net), there are no legs: the current enters the sheet at one port and leaves it at another.

use super::TrackLeg;
use super::copper::NetCopper;
use super::course::{Line, net_of};
use super::graph::{Graph, Run};
use super::terrain::Terrain;
use super::touch::extent_across;
use crate::board::{NetId, PinId};
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
/// Radius of a port where nothing tells one, in metres.
const PORT_RADIUS_M: f64 = 0.15e-3;

/// The way of a signal.
#[derive(Clone, Debug, Default)]
pub struct Way {
    /// Its straight pieces; where the layer changes between two, a barrel joins them. Branches follow the way that
    /// they leave.
    pub legs: Vec<TrackLeg>,
    /// Where its current meets the conductors; the currents sum to zero.
    pub ports: Vec<Port>,
    /// Parts passed, branches, loops, pours and further receivers, stated.
    pub notes: Vec<Diagnostic>,
    /// Whether the current comes back to the pin where it starts, so that nothing lands at the driver.
    pub closed: bool,
}

/// A place where current of a way enters the conductors (positive) or leaves them.
#[derive(Clone, Debug, PartialEq)]
pub struct Port {
    /// Where.
    pub place: PortPlace,
    /// Current into the conductors in A per A of the driver's current.
    pub current: f64,
}

/// Where a port is.
#[derive(Clone, Debug, PartialEq)]
pub enum PortPlace {
    /// Where the return leaves the conductors for the driver with this pin.
    Driver(PinId),
    /// Where the return enters them at the receiver with this pin.
    Receiver(PinId),
    /// A pin of a reference net that the way itself passes.
    Pin(PinId),
    /// Where the way meets a large area of its own net.
    Area {
        /// Layer, index from 0.
        layer: usize,
        /// Index of the area in the layer's `areas`.
        area: usize,
        /// Middle.
        at: Point,
        /// Radius in metres.
        radius_m: f64,
    },
}

/// A part of a way in one net.
struct Section {
    net: NetId,
    from: PinId,
    to: Vec<(PinId, f64)>,
}

/// Finds the way of a line; `who` names its course in texts.
pub fn find(terrain: &Terrain<'_>, who: &str, line: &Line, origin: Point) -> Result<Way, Diagnostic> {
    let mut way = Way::default();
    let mut at = line.driver;
    let mut parts = Vec::new();
    for &(enter, leave) in &line.through {
        way.add_section(terrain, at, &[(enter, 1.0)], origin)?;
        way.add_crossing(terrain, enter, leave);
        parts.push(terrain.board.pins[enter.0 as usize].part.as_str());
        at = leave;
    }
    way.add_section(terrain, at, &line.receivers, origin)?;
    if way.legs.is_empty() {
        let text = format!("track of {who} must have a length; its pins lie on top of each other");
        return Err(Diagnostic::error(code::TRACK_OPEN, text));
    }
    for &(pin, share) in line.receivers.iter().filter(|receiver| receiver.0 != line.driver) {
        way.ports.push(Port { place: PortPlace::Driver(line.driver), current: -share });
        way.ports.push(Port { place: PortPlace::Receiver(pin), current: share });
    }
    if !parts.is_empty() {
        let text = format!(
            "{who} passes {} straight from pad to pad, in the height of the track",
            listed_names(&parts)
        );
        way.notes.push(Diagnostic::note(code::PATH_THROUGH_PARTS, text));
    }
    for leg in &mut way.legs {
        leg.current *= line.current;
    }
    let mut ports: Vec<Port> = Vec::new();
    for port in way.ports {
        match ports.iter_mut().find(|known| known.place == port.place) {
            Some(known) => known.current += port.current * line.current,
            None => ports.push(Port { current: port.current * line.current, ..port }),
        }
    }
    ports.retain(|port| port.current != 0.0);
    way.ports = ports;
    way.closed = line.receivers.iter().all(|receiver| receiver.0 == line.driver);
    Ok(way)
}

fn listed_names(names: &[&str]) -> String {
    names.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ")
}

impl Way {
    /// Lets a part of the driver's return come through its supply: `feed` is the way from the planes to the supply
    /// pin, whose current then does not leave the planes at the driver.
    pub fn feed(&mut self, feed: Way) {
        let part: f64 = feed
            .ports
            .iter()
            .filter(|port| matches!(port.place, PortPlace::Receiver(_)))
            .map(|port| port.current)
            .sum();
        if let Some(driver) = self.ports.iter_mut().find(|port| matches!(port.place, PortPlace::Driver(_))) {
            driver.current += part;
        }
        let kept = feed.ports.into_iter().filter(|port| !matches!(port.place, PortPlace::Receiver(_)));
        // The capacitor's ground pad is a place of its own, whatever the review says of the driver's landing.
        self.ports.extend(kept.map(|port| match port.place {
            PortPlace::Driver(pin) => Port { place: PortPlace::Pin(pin), ..port },
            _ => port,
        }));
        self.ports.retain(|port| port.current != 0.0);
        self.legs.extend(feed.legs);
        self.notes.extend(feed.notes);
    }

    /// Closes the two lines of a pair inside the parts at their ends, straight from pad to pad: what both carry passes
    /// from one to the other there, and only the difference of their currents lands.
    pub fn close_pair(&mut self, terrain: &Terrain<'_>, positive: &Line, negative: &Line) {
        let shared = positive.current.abs().min(negative.current.abs()) * positive.current.signum();
        let ends = [(positive.receiver(), negative.receiver()), (negative.driver, positive.driver)];
        for (from, to) in ends {
            let [enter, leave] = [from, to].map(|pin| &terrain.board.pins[pin.0 as usize]);
            if enter.part == leave.part {
                let before = self.legs.len();
                self.add_crossing(terrain, from, to);
                self.legs[before..].iter_mut().for_each(|leg| leg.current = shared);
            }
        }
    }

    /// Adds the way of another line of the same course; the two of a pair share their landings, so that only the
    /// difference of their currents lands.
    pub fn join(&mut self, other: Way) {
        self.legs.extend(other.legs);
        self.notes.extend(other.notes);
        let same_end = |a: &PortPlace, b: &PortPlace| {
            matches!(
                (a, b),
                (PortPlace::Driver(_), PortPlace::Driver(_))
                    | (PortPlace::Receiver(_), PortPlace::Receiver(_))
            )
        };
        let own = self.ports.len();
        for port in other.ports {
            let shared = |known: &&mut Port| known.place == port.place || same_end(&known.place, &port.place);
            match self.ports[..own].iter_mut().find(shared) {
                Some(known) => known.current += port.current,
                None => self.ports.push(port),
            }
        }
        const NOTHING: f64 = 1e-12;
        self.ports.retain(|port| port.current.abs() > NOTHING);
    }

    /// Adds the way in one net from a pin to one or several others.
    fn add_section(
        &mut self,
        terrain: &Terrain<'_>,
        from: PinId,
        to: &[(PinId, f64)],
        origin: Point,
    ) -> Result<(), Diagnostic> {
        let to: Vec<(PinId, f64)> = to.iter().copied().filter(|end| end.0 != from).collect();
        // Pins without a net were refused with the review's entry.
        let Some(net) = net_of(terrain.board, from).filter(|_| !to.is_empty()) else { return Ok(()) };
        if terrain.is_reference(Some(net)) {
            for (pin, share) in to {
                self.ports.push(Port { place: PortPlace::Pin(from), current: share });
                self.ports.push(Port { place: PortPlace::Pin(pin), current: -share });
            }
            return Ok(());
        }
        self.add_tracks(terrain, &Section { net, from, to }, origin)
    }

    /// Adds the straight leg from pad to pad of a part.
    fn add_crossing(&mut self, terrain: &Terrain<'_>, enter: PinId, leave: PinId) {
        let [enter, leave] = [enter, leave].map(|pin| &terrain.board.pins[pin.0 as usize]);
        let across = |shape| extent_across(shape, enter.at, leave.at);
        let width_m = across(&enter.pad).min(across(&leave.pad));
        push_leg(
            &mut self.legs,
            TrackLeg { from: enter.at, to: leave.at, layer: enter.layer, width_m, current: 1.0 },
        );
    }

    fn add_tracks(
        &mut self,
        terrain: &Terrain<'_>,
        section: &Section,
        origin: Point,
    ) -> Result<(), Diagnostic> {
        let copper = NetCopper::of(terrain, section.net);
        let graph = Graph::new(&copper, &terrain.board.stackup);
        let name = terrain.board.net_name(section.net);
        let nodes_of = |pin: PinId| {
            graph.pins.get(&pin).ok_or_else(|| {
                let label = terrain.board.pins[pin.0 as usize].label();
                let text = format!(
                    "pin `{label}` of net `{name}` must have copper in the fabrication data; it has none"
                );
                Diagnostic::error(code::TRACK_OPEN, text)
            })
        };
        let sources = nodes_of(section.from)?;
        let best = graph.distances(sources, |_| false);
        // Ways in the order of their shares, so that a branch leaves a way that is already there.
        let mut ends = section.to.clone();
        ends.sort_by(|a, b| b.1.total_cmp(&a.1));
        let mut ways: Vec<Vec<(usize, usize)>> = Vec::new();
        let mut carried: BTreeMap<usize, f64> = BTreeMap::new();
        for &(pin, share) in &ends {
            let nearest = nodes_of(pin)?
                .iter()
                .copied()
                .min_by(|&a, &b| best[a].0.total_cmp(&best[b].0).then(a.cmp(&b)));
            let Some(target) = nearest.filter(|&node| best[node].0.is_finite()) else {
                return Err(open_track(terrain, &graph, section, pin, &best));
            };
            // Edges from the source to the pin, each with the node where it starts.
            let mut steps = Vec::new();
            let mut node = target;
            while let Some(index) = best[node].1 {
                node = graph.edges[index].a + graph.edges[index].b - node;
                steps.push((node, index));
                *carried.entry(index).or_default() += share;
            }
            steps.reverse();
            ways.push(steps);
        }
        let mut walked = BTreeSet::new();
        let mut poured_m = 0.0;
        let narrowest = copper.segments.iter().map(|segment| segment.width_m).fold(f64::INFINITY, f64::min);
        let narrowest = if narrowest.is_finite() { narrowest } else { 2.0 * PORT_RADIUS_M };
        for steps in &ways {
            for (k, &(node, index)) in steps.iter().enumerate() {
                let edge = &graph.edges[index];
                if !walked.insert(index) || edge.run == Run::Barrel {
                    continue;
                }
                let current = carried[&index];
                let next = edge.a + edge.b - node;
                let (layer, from, to) = (graph.nodes[node].0, graph.nodes[node].1, graph.nodes[next].1);
                if edge.run == Run::Pour
                    && let Some(area) = [from, to].into_iter().find_map(|at| {
                        terrain
                            .copper_of_net(layer, at, section.net)
                            .filter(|&area| terrain.is_sheet(layer, area))
                    })
                {
                    let width_m = |step: Option<&(usize, usize)>| {
                        let edge = &graph.edges[step?.1];
                        (edge.run != Run::Pour).then_some(edge.width_m)
                    };
                    let mut port = |at, step, current| {
                        let radius_m = width_m(step).map_or(PORT_RADIUS_M, |width_m| 0.5 * width_m);
                        self.ports
                            .push(Port { place: PortPlace::Area { layer, area, at, radius_m }, current });
                    };
                    port(from, k.checked_sub(1).and_then(|before| steps.get(before)), current);
                    port(to, steps.get(k + 1), -current);
                    continue;
                }
                let mut width_m = edge.width_m;
                if edge.run == Run::Pour {
                    poured_m += edge.length_m;
                    width_m = graph.pour_width_m(&copper, edge).unwrap_or(narrowest);
                }
                push_leg(&mut self.legs, TrackLeg { from, to, layer, width_m, current });
            }
        }
        if poured_m > 0.0 {
            let text = format!(
                "track of net `{name}` runs {} across filled copper of its own; a straight line across it is taken",
                length_text(poured_m)
            );
            self.notes.push(Diagnostic::note(code::TRACK_ACROSS_AREA, text));
        }
        self.notes.extend(branches(terrain, &graph, section, sources, &ways, origin));
        Ok(())
    }
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
        && last.current == leg.current
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
    section: &Section,
    target: PinId,
    best: &[(f64, Option<usize>)],
) -> Diagnostic {
    let label = |pin: PinId| terrain.board.pins[pin.0 as usize].label();
    let name = terrain.board.net_name(section.net);
    let from_target = graph.distances(&graph.pins[&target], |_| false);
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
        label(section.from),
        label(target)
    );
    let message = Diagnostic::error(code::TRACK_OPEN, text);
    let part = "where a series part lies between them they are two nets: chart a `[[path]]` with the part in `through`";
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
    section: &Section,
    sources: &[usize],
    ways: &[Vec<(usize, usize)>],
    origin: Point,
) -> Vec<Diagnostic> {
    let name = terrain.board.net_name(section.net);
    let way: BTreeSet<usize> = ways.iter().flatten().map(|step| step.1).collect();
    // Place of each node along the way from the driver's end.
    let mut along = BTreeMap::new();
    let mut nodes = Vec::new();
    for steps in ways {
        let mut station = 0.0;
        for &(node, index) in steps {
            let edge = &graph.edges[index];
            let mut reach = |node: usize, station: f64| {
                along.entry(node).or_insert_with(|| {
                    nodes.push(node);
                    station
                });
            };
            reach(node, station);
            station += edge.length_m;
            reach(edge.a + edge.b - node, station);
        }
    }
    if nodes.is_empty() {
        // Pads on top of each other: the way has no length in this net.
        nodes.extend(sources.first());
        along.extend(sources.first().map(|&node| (node, 0.0)));
    }
    let on_way: BTreeSet<usize> = nodes.iter().copied().collect();
    let best = graph.distances(&nodes, |index| way.contains(&index));
    let words = |at: Point| {
        let at = (at - origin) * 1e3;
        format!("{:.2}, {:.2}", at.x, at.y)
    };
    let mut receivers = Vec::new();
    let mut at_pins = BTreeSet::new();
    let mut unreached = Vec::new();
    for (index, pin) in terrain.board.pins.iter().enumerate() {
        let id = PinId(index as u32);
        if pin.net != Some(section.net) || id == section.from || section.to.iter().any(|end| end.0 == id) {
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
        let label = |end: &(PinId, f64)| format!("`{}`", terrain.board.pins[end.0.0 as usize].label());
        let ends: Vec<String> = section.to.iter().map(label).collect();
        let text = format!(
            "net `{name}` has further pins, {}; all current is taken to flow from `{}` to {}",
            listed(&receivers),
            terrain.board.pins[section.from.0 as usize].label(),
            listed(&ends)
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
