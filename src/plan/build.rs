//! From a board and a review to the plan: each net's way, planes, landings, voids and cells.

use super::cell::{self, CellChoice};
use super::landing::{Landed, Landings};
use super::request::{self, Ends};
use super::stretch::{self, Stretch};
use super::terrain::Terrain;
use super::{ChartPlan, Landing, PathPlan, Plan, TrackLeg, Void, route, void};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::field::PlaneId;
use crate::geom::{Bounds, Point, Region};
use crate::review::{NetRequest, Review};
use crate::unit::length_text;
use std::collections::BTreeMap;

/// How far from the track reference copper on its own layer counts, in heights.
const BESIDE_HEIGHTS: f64 = 3.0;

/// Plans all nets of a review on a board. Call [`super::apply_review`] before, so that the board has the review's
/// stackup.
pub fn build(board: &Board, review: &Review) -> Plan {
    let mut planner = Planner::new(board, review);
    let requests = request::expand(board, review, &mut planner.messages);
    let mut nets = Vec::new();
    for (net, request) in requests {
        let planned = request::ends(board, review, net, request).and_then(|ends| planner.net(&ends, request));
        match planned {
            Ok(net) => nets.push(net),
            Err(message) => planner.messages.push(message),
        }
    }
    Plan {
        paths: nets,
        conductors: Default::default(),
        bands: review.bands.clone(),
        messages: planner.messages,
    }
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

    fn net(&mut self, ends: &Ends, request: &NetRequest) -> Result<PathPlan, Diagnostic> {
        let board = self.terrain.board;
        let name = board.net_name(ends.net).to_owned();
        let route = route::find(&self.terrain, ends, self.review.origin)
            .map_err(|message| self.in_review(message, request, "name"))?;
        let (legs, stretches) = match &request.plane {
            None => stretch::divide(&self.terrain, &name, &route.legs),
            Some(plane) => self.on_plane(plane, &name, request, route.legs)?,
        };
        self.messages.extend(route.notes);
        let mut charts: Vec<ChartPlan> = Vec::new();
        for stretch in &stretches {
            charts.push(self.chart(&name, &legs, stretch));
        }
        self.land(ends, request, &name, &legs, &mut charts);
        Ok(PathPlan {
            name,
            driver: board.pins[ends.driver.0 as usize].label(),
            receiver: board.pins[ends.receiver.0 as usize].label(),
            track: legs,
            entries: Vec::new(),
            joints: Vec::new(),
            charts,
        })
    }

    fn in_review(&self, message: Diagnostic, request: &NetRequest, key: &str) -> Diagnostic {
        if message.place.at.is_some() { message } else { request::at_key(self.review, request, key, message) }
    }

    /// One stretch over the plane that the review names.
    fn on_plane(
        &mut self,
        wanted: &str,
        net: &str,
        request: &NetRequest,
        legs: Vec<TrackLeg>,
    ) -> Result<(Vec<TrackLeg>, Vec<Stretch>), Diagnostic> {
        let board = self.terrain.board;
        let bad = |why: String| {
            let text = format!("plane `{wanted}` of net `{net}` must be a plane of the board; {why}");
            Err(request::at_key(self.review, request, "plane", Diagnostic::error(code::PLANE_UNKNOWN, text)))
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
        let (_, nearest) = stretch::divide(&self.terrain, net, &legs);
        for other in
            nearest.iter().filter_map(|stretch| stretch.plane.as_ref()).filter(|other| **other != plane)
        {
            let text = format!(
                "net `{net}` is charted on `{plane}` as the review asks; nearer to the track is `{other}`"
            );
            let message = Diagnostic::warning(code::PLANE_CHOSEN, text);
            self.messages.push(request::at_key(self.review, request, "plane", message));
        }
        let stretch = Stretch { plane: Some(plane), legs: 0..legs.len(), between: None };
        Ok((legs, vec![stretch]))
    }

    /// A chart without its landings.
    fn chart(&mut self, net: &str, legs: &[TrackLeg], stretch: &Stretch) -> ChartPlan {
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
            let text = format!("no copper area lies above or below the track of net `{net}` here");
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
                "net `{net}`: the copper area nearest to its track on L{}, {} away, is `{plane}`, and `{}` is not a \
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
                "net `{net}` lies between `{plane}`, {} away, and `{between}`, {} away, which takes a part of the \
                 return; only `{plane}` is charted",
                length_text(chart.height_m),
                length_text(gap_m)
            );
            self.messages.push(Diagnostic::warning(code::PLANE_BETWEEN, text));
        }
        self.pour_beside(net, own, chart.height_m);
        self.set_cells(net, own, plane, &mut chart);
        chart
    }

    fn set_cells(&mut self, net: &str, own: &[TrackLeg], plane: &PlaneId, chart: &mut ChartPlan) {
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
                "net `{net}` on `{plane}` is planned on cells of {}, more than its height of {}, to fit into memory",
                length_text(choice.cell_m),
                length_text(chart.height_m)
            );
            self.messages.push(Diagnostic::warning(code::CELL_ENLARGED, text));
        }
    }

    /// States over which length reference copper lies beside the track on its own layer.
    fn pour_beside(&mut self, net: &str, legs: &[TrackLeg], height_m: f64) {
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
                "reference copper lies within {} (3h) of net `{net}` on its own layer over {} of {}; its part of the \
                 return is not in the map",
                length_text(BESIDE_HEIGHTS * height_m),
                length_text(beside_m),
                length_text(total_m)
            );
            self.messages.push(Diagnostic::warning(code::POUR_BESIDE, text));
        }
    }

    /// Fills in the landings; a chart that gets none is withheld.
    fn land(
        &mut self,
        ends: &Ends,
        request: &NetRequest,
        net: &str,
        legs: &[TrackLeg],
        charts: &mut [ChartPlan],
    ) {
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
                    let text =
                        format!("net `{net}` changes from `{}` to `{}`; {why}", planes[k], planes[k + 1]);
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
                    .at_pin(ends.driver, request.driver_landing.as_ref(), "driver_landing")
                    .map_err(|message| self.in_review(message, request, "driver_landing"))
            } else {
                joints[k - 1].clone().map(|joint| joint.1)
            };
            let receiver = if k == last {
                landings[k]
                    .at_pin(ends.receiver, request.receiver_landing.as_ref(), "receiver_landing")
                    .map_err(|message| self.in_review(message, request, "receiver_landing"))
            } else {
                joints[k].clone().map(|joint| joint.0)
            };
            match (driver, receiver) {
                (Ok(driver), Ok(receiver)) => {
                    if driver.area != receiver.area {
                        chart.withheld = Some(self.on_islands(net, chart, &driver, &receiver));
                    }
                    for assumed in
                        [&driver, &receiver].into_iter().filter_map(|landed| landed.assumed.clone())
                    {
                        let text = format!("net `{net}`: {assumed}");
                        notes.push(Diagnostic::note(code::LANDING_NEAREST_VIA, text));
                    }
                    chart.driver_landing = driver.landing;
                    chart.receiver_landing = receiver.landing;
                }
                (Err(message), _) | (_, Err(message)) => chart.withheld = Some(message),
            }
        }
        self.messages.extend(notes);
    }

    fn on_islands(&self, net: &str, chart: &ChartPlan, driver: &Landed, receiver: &Landed) -> Diagnostic {
        let island = |landed: &Landed| {
            let shape = &self.terrain.board.layers[chart.plane.layer].areas[landed.area].shape;
            let at = (shape.bounds().centre() - self.review.origin) * 1e3;
            format!("the piece of {:.1} mm2 round {:.1}, {:.1}", shape.area() * 1e6, at.x, at.y)
        };
        let text = format!(
            "net `{net}`: its return leaves `{}` at `{}` on {}, and enters it at `{}` on {}; these are not connected \
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
