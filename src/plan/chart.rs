//! A chart of a path: its plane, height and voids.

use super::build::Planner;
use super::cell;
use super::course::Course;
use super::stretch::{self, Stretch};
use super::{ChartPlan, Landing, TrackLeg, Void, void};
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::field::PlaneId;
use crate::geom::{Point, Region};
use crate::unit::length_text;
use std::collections::BTreeMap;

/// How far from the track reference copper on its own layer counts, in heights.
const BESIDE_HEIGHTS: f64 = 3.0;

/// Voids of a plane, kept for all paths over it.
pub(super) struct Ground {
    missing: Region,
    /// Voids by the height for which webs are closed, in nanometres.
    voids: BTreeMap<i64, Vec<Void>>,
}

impl Planner<'_> {
    /// One stretch over the plane that the review names.
    pub(super) fn on_plane(
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
        let stretch = Stretch { plane: Some(plane), legs: 0..legs.len(), between: None, nearer: None };
        Ok((legs, vec![stretch]))
    }

    /// A chart without its landings.
    pub(super) fn chart(&mut self, who: &str, legs: &[TrackLeg], stretch: &Stretch) -> ChartPlan {
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
        self.around(who, own, stretch, &chart);
        self.pour_beside(who, own, chart.height_m);
        self.set_voids(plane, &mut chart);
        chart
    }

    fn set_voids(&mut self, plane: &PlaneId, chart: &mut ChartPlan) {
        let board = self.terrain.board;
        let ground = self
            .grounds
            .entry(plane.clone())
            .or_insert_with(|| Ground { missing: void::missing(board, plane), voids: BTreeMap::new() });
        let key = (chart.height_m * 1e9).round() as i64;
        let origin = self.review.origin;
        let voids = ground
            .voids
            .entry(key)
            .or_insert_with(|| void::voids(&ground.missing, plane, chart.height_m, origin));
        chart.voids.clone_from(voids);
    }

    /// Notes copper that carries a part of the return beside the plane of the chart.
    fn around(&mut self, who: &str, own: &[TrackLeg], stretch: &Stretch, chart: &ChartPlan) {
        let stackup = &self.terrain.board.stackup;
        let away =
            |plane: &PlaneId| length_text(cell::mean(own, |leg| stackup.gap_m(leg.layer, plane.layer)));
        if let Some((nearer, length_m)) = &stretch.nearer {
            let text = format!(
                "{who}: between its track and `{}`, {} away, lies `{nearer}`, {} away, over {}; it is no \
                 reference net and is solved as a sheet of its own",
                chart.plane,
                length_text(chart.height_m),
                away(nearer),
                length_text(*length_m)
            );
            self.messages.push(Diagnostic::note(code::PLANE_NOT_REFERENCE, text));
        }
        if let Some(between) = &stretch.between {
            let text = format!(
                "{who} lies between `{}`, {} away, and `{between}`, {} away; they share the return",
                chart.plane,
                length_text(chart.height_m),
                away(between)
            );
            self.messages.push(Diagnostic::note(code::PLANE_BETWEEN, text));
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
                "reference copper lies within {} (3h) of {who} on its own layer over {} of {}; it takes a part of \
                 the return",
                length_text(BESIDE_HEIGHTS * height_m),
                length_text(beside_m),
                length_text(total_m)
            );
            self.messages.push(Diagnostic::note(code::POUR_BESIDE, text));
        }
    }
}
