//! From a board and a review to the plan: each net's way, planes, landings, voids and cells.

use super::cell::{self, CellChoice};
use super::course::{self, Course};
use super::entry;
use super::landing::{Landed, Landings};
use super::route::{self, Way};
use super::stretch::{self, Stretch};
use super::terrain::Terrain;
use super::{ChartPlan, Entry, Landing, PathPlan, Plan, TrackLeg, Void, void};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::field::PlaneId;
use crate::geom::{Bounds, Point, Region};
use crate::review::Review;
use crate::unit::length_text;
use std::collections::BTreeMap;

/// How far from the track reference copper on its own layer counts, in heights.
const BESIDE_HEIGHTS: f64 = 3.0;

/// Plans all nets of a review on a board. Call [`super::apply_review`] before, so that the board has the review's
/// stackup.
pub fn build(board: &Board, review: &Review) -> Plan {
    let mut planner = Planner::new(board, review);
    let mut paths = Vec::new();
    for course in course::courses(board, review, &mut planner.messages) {
        match planner.path(&course) {
            Ok(path) => paths.push(path),
            Err(message) => planner.messages.push(message),
        }
    }
    Plan { paths, conductors: Default::default(), bands: review.bands.clone(), messages: planner.messages }
}

/// Copper, voids and box of a plane, kept for all nets over it.
struct Ground {
    copper: Region,
    missing: Region,
    bounds: Bounds,
    /// Voids by the height for which webs are closed, in nanometres.
    voids: BTreeMap<i64, Vec<Void>>,
}

struct Planner<'b> {
    terrain: Terrain<'b>,
    review: &'b Review,
    grounds: BTreeMap<PlaneId, Ground>,
    messages: Vec<Diagnostic>,
}

impl<'b> Planner<'b> {
    fn new(board: &'b Board, review: &'b Review) -> Self {
        let mut messages = Vec::new();
        for name in &review.reference_nets {
            if board.net(name).is_none() {
                let text = format!("reference net `{name}` must be a net of the board; it is not");
                let near = crate::diag::nearest(name, board.nets.iter().map(|net| net.name.as_str()));
                let message = Diagnostic::error(code::NET_UNKNOWN, text);
                messages.push(match near {
                    Some(near) => message.hint(format!("did you mean `{near}`?")),
                    None => message,
                });
            }
        }
        let terrain = Terrain::new(board, &review.reference_nets);
        Self { terrain, review, grounds: BTreeMap::new(), messages }
    }

    fn path(&mut self, course: &Course<'_>) -> Result<PathPlan, Diagnostic> {
        let board = self.terrain.board;
        let mut way = Way::default();
        for line in &course.lines {
            let found = route::find(&self.terrain, &course.who, line, self.review.origin)
                .map_err(|message| course.in_review("name", message))?;
            way.join(found);
        }
        let (legs, stretches) = match course.plane {
            None => stretch::divide(&self.terrain, &course.own_nets(&self.terrain), &way.legs),
            Some(plane) => self.on_plane(plane, course, std::mem::take(&mut way.legs))?,
        };
        self.messages.append(&mut way.notes);
        let mut charts: Vec<ChartPlan> = Vec::new();
        for stretch in &stretches {
            charts.push(self.chart(&course.who, &legs, stretch));
        }
        let entries = self.land(course, &way, &legs, &mut charts);
        let label = |pin: crate::board::PinId| board.pins[pin.0 as usize].label();
        Ok(PathPlan {
            name: course.name.clone(),
            driver: label(course.lines[0].driver),
            receiver: label(course.lines[0].receiver()),
            track: legs,
            entries,
            joints: Vec::new(),
            charts,
        })
    }

    /// One stretch over the plane that the review names.
    fn on_plane(
        &mut self,
        wanted: &str,
        course: &Course<'_>,
        legs: Vec<TrackLeg>,
    ) -> Result<(Vec<TrackLeg>, Vec<Stretch>), Diagnostic> {
        let board = self.terrain.board;
        let bad = |why: String| {
            let text = format!("plane `{wanted}` of {} must be a plane of the board; {why}", course.who);
            Err(course.at_key("plane", Diagnostic::error(code::PLANE_UNKNOWN, text)))
        };
        let parsed = wanted.strip_prefix('L').and_then(|rest| rest.split_once('-'));
        let layer = parsed.and_then(|(layer, _)| layer.parse::<usize>().ok()).and_then(|n| n.checked_sub(1));
        let (Some(layer), Some((_, plane_net))) = (layer, parsed) else {
            return bad("it must be written as layer and net, such as `L2-GND`".into());
        };
        if layer >= board.layers.len() {
            return bad(format!("the board has {} copper layers", board.layers.len()));
        }
        let plane = PlaneId { layer, net: plane_net.into() };
        if void::plane_copper(board, &plane).0.is_empty() {
            let mut nets: Vec<(f64, &str)> = Vec::new();
            for area in &board.layers[layer].areas {
                nets.push((area.shape.area(), self.terrain.net_name(area.net)));
            }
            nets.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(b.1)));
            let mut names: Vec<&str> = Vec::new();
            nets.iter().for_each(|net| {
                if !names.contains(&net.1) {
                    names.push(net.1)
                }
            });
            names.truncate(4);
            return bad(format!("the largest areas of L{} are of {}", layer + 1, names.join(", ")));
        }
        if legs.iter().any(|leg| leg.layer == layer) {
            return bad(format!("the track itself runs on L{}", layer + 1));
        }
        let (_, nearest) = stretch::divide(&self.terrain, &course.own_nets(&self.terrain), &legs);
        for other in
            nearest.iter().filter_map(|stretch| stretch.plane.as_ref()).filter(|other| **other != plane)
        {
            let text = format!(
                "{} is charted on `{plane}` as the review asks; nearer to the track is `{other}`",
                course.who
            );
            let message = Diagnostic::warning(code::PLANE_CHOSEN, text);
            self.messages.push(course.at_key("plane", message));
        }
        let stretch = Stretch { plane: Some(plane), legs: 0..legs.len(), between: None };
        Ok((legs, vec![stretch]))
    }

    /// A chart without its landings.
    fn chart(&mut self, who: &str, legs: &[TrackLeg], stretch: &Stretch) -> ChartPlan {
        let own = &legs[stretch.legs.clone()];
        let start = own.first().map_or(Point::default(), |leg| leg.from);
        let nowhere = Landing { at: start, radius_m: 0.0, what: "none".into() };
        let layer = own.first().map_or(0, |leg| leg.layer);
        let mut chart = ChartPlan {
            plane: PlaneId { layer, net: "(none)".into() },
            legs: stretch.legs.clone(),
            driver_landing: nowhere.clone(),
            receiver_landing: nowhere,
            height_m: 0.0,
            width_m: cell::mean(own, |leg| leg.width_m),
            voids: Vec::new(),
            cell_m: 0.0,
            unknowns: 0,
            memory_bytes: 0,
            withheld: None,
        };
        let Some(plane) = &stretch.plane else {
            let text = format!("no copper area lies above or below the track of {who} here");
            chart.withheld =
                Some(Diagnostic::warning(code::PLANE_NONE, text).on_board(Some(layer + 1), start));
            return chart;
        };
        chart.plane = plane.clone();
        let stackup = &self.terrain.board.stackup;
        chart.height_m = cell::mean(own, |leg| stackup.gap_m(leg.layer, plane.layer));
        let plane_net = self.terrain.board.net(&plane.net);
        if !self.terrain.is_reference(plane_net) {
            let text = format!(
                "{who}: the copper area nearest to its track on L{}, {} away, is `{plane}`, and `{}` is not a \
                 reference net; the return flows there first, so a map of the plane behind it would be wrong",
                layer + 1,
                length_text(chart.height_m),
                plane.net
            );
            let hint = format!(
                "if `{}` carries the return, add it to `nets` under `[reference]`; if it does not, name another \
                 plane with `plane` in the entry of the net",
                plane.net
            );
            let message =
                Diagnostic::warning(code::PLANE_NOT_REFERENCE, text).on_board(Some(layer + 1), start);
            chart.withheld = Some(message.hint(hint));
            return chart;
        }
        if let Some(between) = &stretch.between {
            let gap_m = cell::mean(own, |leg| stackup.gap_m(leg.layer, between.layer));
            let text = format!(
                "{who} lies between `{plane}`, {} away, and `{between}`, {} away, which takes a part of the \
                 return; only `{plane}` is charted",
                length_text(chart.height_m),
                length_text(gap_m)
            );
            self.messages.push(Diagnostic::warning(code::PLANE_BETWEEN, text));
        }
        self.pour_beside(who, own, chart.height_m);
        self.set_cells(who, own, plane, &mut chart);
        chart
    }

    fn set_cells(&mut self, who: &str, own: &[TrackLeg], plane: &PlaneId, chart: &mut ChartPlan) {
        let board = self.terrain.board;
        let ground = self.grounds.entry(plane.clone()).or_insert_with(|| {
            let copper = void::plane_copper(board, plane);
            let missing = void::missing(board, plane);
            let bounds = copper.bounds().union(missing.bounds());
            Ground { copper, missing, bounds, voids: BTreeMap::new() }
        });
        let key = (chart.height_m * 1e9).round() as i64;
        let origin = self.review.origin;
        let voids = ground
            .voids
            .entry(key)
            .or_insert_with(|| void::voids(&ground.missing, plane, chart.height_m, origin));
        chart.voids.clone_from(voids);
        let choice = match self.review.solver.cell_m {
            Some(cell_m) => CellChoice { cell_m, enlarged: false },
            None => cell::choose(ground.bounds, chart.height_m, own, voids),
        };
        chart.cell_m = choice.cell_m;
        (chart.unknowns, chart.memory_bytes) = cell::cost(ground.bounds, ground.copper.area(), choice.cell_m);
        if choice.enlarged {
            let text = format!(
                "{who} on `{plane}` is planned on cells of {}, more than its height of {}, to fit into memory",
                length_text(choice.cell_m),
                length_text(chart.height_m)
            );
            self.messages.push(Diagnostic::warning(code::CELL_ENLARGED, text));
        }
    }

    /// States over which length reference copper lies beside the track on its own layer.
    fn pour_beside(&mut self, who: &str, legs: &[TrackLeg], height_m: f64) {
        const STEP_M: f64 = 0.25e-3;
        let (mut beside_m, mut total_m) = (0.0, 0.0);
        for leg in legs {
            let length = leg.from.distance(leg.to);
            total_m += length;
            let n = (length / STEP_M).ceil().max(1.0) as usize;
            for k in 0..n {
                let at = leg.from + (leg.to - leg.from) * ((k as f64 + 0.5) / n as f64);
                let reach = 0.5 * leg.width_m + BESIDE_HEIGHTS * height_m;
                if self.terrain.reference_near(leg.layer, &[at], reach) {
                    beside_m += length / n as f64;
                }
            }
        }
        if beside_m > 0.0 {
            let text = format!(
                "reference copper lies within {} (3h) of {who} on its own layer over {} of {}; its part of the \
                 return is not in the map",
                length_text(BESIDE_HEIGHTS * height_m),
                length_text(beside_m),
                length_text(total_m)
            );
            self.messages.push(Diagnostic::warning(code::POUR_BESIDE, text));
        }
    }

    /// Fills in the landings and gives the entries of a path over one plane; a chart that gets none is withheld.
    fn land(
        &mut self,
        course: &Course<'_>,
        way: &Way,
        legs: &[TrackLeg],
        charts: &mut [ChartPlan],
    ) -> Vec<Entry> {
        if let [chart] = charts {
            return self.land_on_one(course, way, chart);
        }
        if course.lines.len() > 1 || course.lines[0].receivers.len() > 1 || way.ports.len() != 2 {
            for chart in charts.iter_mut().filter(|chart| chart.withheld.is_none()) {
                let text = format!("{} passes several planes and meets them at several places", course.who);
                let at = legs[chart.legs.start].from;
                chart.withheld = Some(
                    Diagnostic::warning(code::PLANES_APART, text).on_board(Some(chart.plane.layer + 1), at),
                );
            }
            return Vec::new();
        }
        let who = &course.who;
        let planes: Vec<PlaneId> = charts.iter().map(|chart| chart.plane.clone()).collect();
        let open: Vec<bool> = charts.iter().map(|chart| chart.withheld.is_none()).collect();
        let landings: Vec<Landings<'_, '_>> =
            planes.iter().map(|plane| Landings::new(&self.terrain, plane)).collect();
        let last = charts.len() - 1;
        let mut notes = Vec::new();
        // Joints between neighbouring planes: the landing on each, or why there is none.
        let joints: Vec<Result<(Landed, Landed), Diagnostic>> = (0..last)
            .map(|k| {
                let at = legs[charts[k].legs.end - 1].to;
                let apart = |why: String| {
                    let text = format!("{who} changes from `{}` to `{}`; {why}", planes[k], planes[k + 1]);
                    let layer = legs[charts[k].legs.end - 1].layer;
                    Diagnostic::warning(code::PLANES_APART, text).on_board(Some(layer + 1), at)
                };
                if let Some(closed) = [k, k + 1].into_iter().find(|&k| !open[k]) {
                    return Err(apart(format!(
                        "`{}` cannot be charted, so the way between them is unknown",
                        planes[closed]
                    )));
                }
                let found = landings[k].joint(&landings[k + 1], at);
                found.ok_or_else(|| apart("no via joins the two".into()))
            })
            .collect();
        for (k, chart) in charts.iter_mut().enumerate() {
            if !open[k] {
                continue;
            }
            let driver = if k == 0 {
                landings[k]
                    .at_pin(course.lines[0].driver, course.driver_landing, "driver_landing")
                    .map_err(|message| course.in_review("driver_landing", message))
            } else {
                joints[k - 1].clone().map(|joint| joint.1)
            };
            let receiver = if k == last {
                landings[k]
                    .at_pin(course.lines[0].receiver(), course.receiver_landing, "receiver_landing")
                    .map_err(|message| course.in_review("receiver_landing", message))
            } else {
                joints[k].clone().map(|joint| joint.0)
            };
            match (driver, receiver) {
                (Ok(driver), Ok(receiver)) => {
                    if driver.area != receiver.area {
                        chart.withheld = Some(self.on_islands(who, chart, &driver, &receiver));
                    }
                    for assumed in
                        [&driver, &receiver].into_iter().filter_map(|landed| landed.assumed.clone())
                    {
                        let text = format!("{who}: {assumed}");
                        notes.push(Diagnostic::note(code::LANDING_NEAREST_VIA, text));
                    }
                    chart.driver_landing = driver.landing;
                    chart.receiver_landing = receiver.landing;
                }
                (Err(message), _) | (_, Err(message)) => chart.withheld = Some(message),
            }
        }
        self.messages.extend(notes);
        Vec::new()
    }

    /// Landings and entries of a path over one plane.
    fn land_on_one(&mut self, course: &Course<'_>, way: &Way, chart: &mut ChartPlan) -> Vec<Entry> {
        if chart.withheld.is_some() {
            return Vec::new();
        }
        let plane = chart.plane.clone();
        let landings = Landings::new(&self.terrain, &plane);
        let (landed, notes) = match entry::land(&landings, course, &way.ports) {
            Ok(found) => found,
            Err(message) => {
                chart.withheld = Some(message);
                return Vec::new();
            }
        };
        // The picture shows where most of the return enters and where most of it leaves.
        let most = |sign: f64| landed.iter().max_by(|a, b| (sign * a.1).total_cmp(&(sign * b.1)));
        if let (Some(driver), Some(receiver)) = (most(-1.0), most(1.0)) {
            chart.driver_landing = driver.0.landing.clone();
            chart.receiver_landing = receiver.0.landing.clone();
            if let Some(other) = landed.iter().find(|other| other.0.area != driver.0.area) {
                chart.withheld = Some(self.on_islands(&course.who, chart, &driver.0, &other.0));
            }
        }
        self.messages.extend(notes);
        entry::entries(plane.layer, &landed)
    }

    fn on_islands(&self, who: &str, chart: &ChartPlan, driver: &Landed, receiver: &Landed) -> Diagnostic {
        let island = |landed: &Landed| {
            let shape = &self.terrain.board.layers[chart.plane.layer].areas[landed.area].shape;
            let at = (shape.bounds().centre() - self.review.origin) * 1e3;
            format!("the piece of {:.1} mm2 round {:.1}, {:.1}", shape.area() * 1e6, at.x, at.y)
        };
        let text = format!(
            "{who}: its return leaves `{}` at `{}` on {}, and enters it at `{}` on {}; these are not connected \
             on that layer",
            chart.plane,
            driver.landing.what,
            island(driver),
            receiver.landing.what,
            island(receiver)
        );
        Diagnostic::warning(code::LANDINGS_ON_ISLANDS, text)
            .on_board(Some(chart.plane.layer + 1), receiver.landing.at)
            .hint(
                "name landings on one piece with `driver_landing` and `receiver_landing`, or another `plane`",
            )
    }
}
