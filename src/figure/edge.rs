//! Density of the return at the edge of the plane, beside the track.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | h | dielectric between track and plane | m |
//! | D | distance from the track to the edge along its normal | m |
//! | F(x) | share of the return within x of the track on the side of the edge ([`super::section`]) | 1 |
//! | edge density = pi (F(D) - F(D - h)) | mean in-phase density within h of the edge, in units of 1/(pi h) | 1 |
//!
//! The edge is that of the plane with all voids filled: voids have figures of their own. Reference: a filament at d
//! inside the edge of a perfect half-plane holds [atan((v - q)/p) - atan((-v - q)/p)]/pi of its return within u = v^2
//! of the edge, with sqrt(-d + jh) = p + jq (conformal map; derived).
//!
//! Checked by: `edge_density_is_that_of_a_half_plane` in tests/finding.

use super::section;
use super::station::Station;
use crate::field::ReturnMap;
use crate::geom::Point;
use std::f64::consts::PI;

/// Edges farther from the track than this many heights are not looked for.
const FARTHEST_HEIGHTS: f64 = 12.0;
/// Steps per cell in the search of the edge.
const STEPS_PER_CELL: f64 = 8.0;

/// Density at the edge beside one station.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AtEdge {
    /// Density in units of 1/(pi h).
    pub density: f64,
    /// Distance from the track to the edge in metres.
    pub distance_m: f64,
}

/// Density at the nearer edge of the plane beside a station; none where no edge is near. `filled` tells the edge.
pub fn beside(map: &ReturnMap, filled: &ReturnMap, station: &Station, height_m: f64) -> Option<AtEdge> {
    let one = |side: f64| {
        let distance_m = edge_distance_m(filled, station, side, FARTHEST_HEIGHTS * height_m)?;
        let inner = (distance_m - height_m).max(0.0);
        // nearer to the edge than h the strip of h reaches to the other side of the track
        let rest = (height_m - distance_m).max(0.0);
        let near = section::one_side(map, station.at, station.along, side, &[inner, distance_m]);
        let other = section::one_side(map, station.at, station.along, -side, &[rest]);
        let within = near[1] - if inner > 0.0 { near[0] } else { 0.0 };
        let share = within + if rest > 0.0 { other[0] } else { 0.0 };
        Some(AtEdge { density: PI * share, distance_m })
    };
    let sides = [one(1.0), one(-1.0)];
    sides.into_iter().flatten().min_by(|a, b| a.distance_m.total_cmp(&b.distance_m))
}

/// Distance to where the copper of `filled` ends along the normal, in metres; none within `reach_m`.
fn edge_distance_m(filled: &ReturnMap, station: &Station, side: f64, reach_m: f64) -> Option<f64> {
    let out = Point::new(-station.along.y, station.along.x) * side;
    let step_m = filled.grid.cell_m / STEPS_PER_CELL;
    let copper =
        |at: Point| filled.grid.cell_at(at).is_some_and(|(ix, iy)| filled.copper[filled.grid.index(ix, iy)]);
    if !copper(station.at) {
        return None;
    }
    let count = (reach_m / step_m).ceil() as usize;
    let first = (1..=count).find(|&k| !copper(station.at + out * (k as f64 * step_m)))?;
    Some((first as f64 - 0.5) * step_m)
}

/// Middle of the run of stations round the largest value over which it stays above nine tenths of that.
pub fn middle_of_run(values: &[f64]) -> Option<usize> {
    let worst = (0..values.len()).max_by(|&a, &b| values[a].total_cmp(&values[b]))?;
    let high = |at: &usize| values[*at] >= 0.9 * values[worst];
    let first = (0..=worst).rev().take_while(high).last().unwrap_or(worst);
    let last = (worst..values.len()).take_while(high).last().unwrap_or(worst);
    Some((first + last) / 2)
}
