//! Where the return of each chart enters and leaves its plane, for pictures and figures.

use super::build::Planner;
use super::course::Course;
use super::landing::Landings;
use super::{ChartPlan, Landing, TrackLeg};
use crate::field::PlaneId;
use crate::geom::Point;

/// Radius of a place that no barrel or pad gives, in metres.
const SPOT_M: f64 = 0.15e-3;

impl Planner<'_> {
    /// Fills in the landings of charts: at the ends of the path those of its pins, between two planes the nearest via
    /// that joins them; else the place on the track itself.
    pub(super) fn place(&self, course: &Course<'_>, legs: &[TrackLeg], charts: &mut [ChartPlan]) {
        let line = &course.lines[0];
        let planes: Vec<PlaneId> = charts.iter().map(|chart| chart.plane.clone()).collect();
        let landings: Vec<Landings<'_, '_>> =
            planes.iter().map(|plane| Landings::new(&self.terrain, plane)).collect();
        let last = charts.len().saturating_sub(1);
        let spot = |at: Point| Landing { at, radius_m: SPOT_M, what: "track".into() };
        for k in 0..charts.len() {
            let range = charts[k].legs.clone();
            let (Some(first), Some(end)) =
                (legs.get(range.start), range.end.checked_sub(1).map(|at| &legs[at]))
            else {
                continue;
            };
            let driver = if k == 0 {
                landings[k].at_pin(line.driver, course.driver_landing)
            } else {
                landings[k - 1].joint(&landings[k], first.from)
            };
            let receiver = if k == last {
                landings[k].at_pin(line.receiver(), course.receiver_landing)
            } else {
                landings[k].joint(&landings[k + 1], end.to)
            };
            charts[k].driver_landing = driver.unwrap_or_else(|| spot(first.from));
            charts[k].receiver_landing = receiver.unwrap_or_else(|| spot(end.to));
        }
    }
}
