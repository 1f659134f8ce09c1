//! Return current that flows over the boundary of a zone.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | K_n | in-phase density across the outline of the zone, outward | A/m per A |
//! | stray = (1/2) int abs(K_n) dl / I - n/2 | along the outline inside the board; n crossings of the track | 1 |
//!
//! Half, since what flows in flows out again; a track that crosses takes its own return along.
//!
//! Checked by: `stray_of_a_straight_track_is_that_of_the_sheet_formula` in tests/finding.

use super::{Figure, section};
use crate::field::ReturnMap;
use crate::geom::{Point, Ring};
use crate::plan::TrackLeg;
use crate::review::Zone;

/// Steps per cell along the outline.
const STEPS_PER_CELL: f64 = 4.0;
/// Most values of a profile.
const PROFILE: usize = 48;
/// Nearer to the track what flows over the boundary is its own return, in metres.
const CLEAR_M: f64 = 1e-3;
/// Smaller strays get no profile.
const LEAST_PROFILE: f64 = 0.02;

/// Stray over the boundary of one zone.
#[derive(Clone, Debug, PartialEq)]
pub struct Stray {
    /// Name of the zone.
    pub zone: String,
    /// Whether an end of the track lies in it.
    pub own: bool,
    /// Share of the return that flows over the boundary beside the track.
    pub share: Figure,
    /// Where most flows over it, beside the crossings of the track.
    pub worst: Option<Point>,
    /// In-phase density outward along the outline in A/m per A, mean over equal stretches, by their middles; empty
    /// where little flows.
    pub profile: Vec<(Point, f64)>,
}

/// Flux over one outline: the sum of magnitudes, and the mean density by stretch.
struct Over {
    share: f64,
    profile: Vec<(Point, f64)>,
}

/// Strays over the boundaries of all `zones`, with those without voids and the error from the coarser map. `least` is
/// the least relative error of a share.
pub fn strays(
    map: &ReturnMap,
    filled: Option<&ReturnMap>,
    coarse: Option<&ReturnMap>,
    legs: &[TrackLeg],
    zones: &[Zone],
    least: f64,
) -> Vec<Stray> {
    let (Some(first), Some(last)) = (legs.first(), legs.last()) else { return Vec::new() };
    let of = |zone: &Zone| {
        let crossings = legs.iter().map(|leg| crossings(leg, &zone.outline)).sum::<usize>();
        let here = over(map, &zone.outline, crossings);
        let other = |map: Option<&ReturnMap>| map.map(|map| over(map, &zone.outline, crossings).share);
        let change = other(coarse).map_or(0.0, |coarse| (here.share - coarse).abs());
        // the whole flux has the error, crossings included
        let size = here.share.abs() + 0.5 * crossings as f64;
        let near = |at: Point| {
            let distance =
                |leg: &TrackLeg| crate::geom::locate::point_segment_distance(at, (leg.from, leg.to));
            legs.iter().map(distance).fold(f64::INFINITY, f64::min)
        };
        let beside = here.profile.iter().filter(|(at, _)| near(*at) > CLEAR_M);
        let worst = beside.max_by(|a, b| a.1.abs().total_cmp(&b.1.abs())).map(|entry| entry.0);
        let inside =
            |at: Point| crate::geom::Polygon { outer: zone.outline.clone(), holes: vec![] }.contains(at);
        Stray {
            zone: zone.name.clone(),
            own: inside(first.from) || inside(last.to),
            share: Figure {
                value: Some(here.share),
                without_voids: other(filled),
                error: change.max(least * size),
            },
            worst,
            profile: if here.share >= LEAST_PROFILE { here.profile } else { Vec::new() },
        }
    };
    zones.iter().filter(|zone| zone.outline.len() > 2).map(of).collect()
}

/// How often a leg crosses the outline.
fn crossings(leg: &TrackLeg, outline: &Ring) -> usize {
    let side = |i: usize| (outline[i], outline[(i + 1) % outline.len()]);
    let cross = |(a, b): (Point, Point)| {
        let of = |p: Point, q: Point, r: Point| (q - p).cross(r - p) > 0.0;
        of(a, b, leg.from) != of(a, b, leg.to) && of(leg.from, leg.to, a) != of(leg.from, leg.to, b)
    };
    (0..outline.len()).filter(|&i| cross(side(i))).count()
}

fn over(map: &ReturnMap, outline: &Ring, crossings: usize) -> Over {
    let length: f64 = (0..outline.len()).map(|i| outline[i].distance(outline[(i + 1) % outline.len()])).sum();
    let stretch_m = length / PROFILE as f64;
    let mut sum = 0.0;
    let mut bins = vec![(Point::default(), 0.0, 0.0); PROFILE];
    let mut way_m = 0.0;
    for (i, &from) in outline.iter().enumerate() {
        let to = outline[(i + 1) % outline.len()];
        let side_m = from.distance(to);
        let along = (to - from) * (1.0 / side_m.max(1e-30));
        // the outline runs counter-clockwise: outward is to its right
        let outward = Point::new(along.y, -along.x);
        let count = (side_m * STEPS_PER_CELL / map.grid.cell_m).ceil().max(1.0) as usize;
        let step_m = side_m / count as f64;
        for k in 0..count {
            let at = from + (to - from) * ((k as f64 + 0.5) / count as f64);
            let density = section::density(map, at, outward);
            sum += density.abs() * step_m;
            let bin = (((way_m + (k as f64 + 0.5) * step_m) / stretch_m) as usize).min(PROFILE - 1);
            bins[bin].0 = bins[bin].0 + at * step_m;
            bins[bin].1 += density * step_m;
            bins[bin].2 += step_m;
        }
        way_m += side_m;
    }
    let full = bins.into_iter().filter(|bin| bin.2 > 0.0);
    let profile = full.map(|(at, flux, length)| (at * (1.0 / length), flux / length)).collect();
    Over { share: 0.5 * sum - 0.5 * crossings as f64, profile }
}
