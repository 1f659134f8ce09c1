//! What each void of the plane does to the return: its part of the extra impedance, and the current round its ends.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | part of a void | of Z - Z0, the sum over the void of field times current without voids ([`crate::sheet`], reaction) | ohm |
//! | extra loop R, L of a void = Re part, Im part / w | first-order gain of filling it alone | ohm, H |
//! | current round an end | in-phase flux between the void and the edge of the plane on one side of the track | 1 |
//!
//! The current round an end does not depend on the line along which it is counted: it is that of the stream function
//! between the void's rim and the edge. The line here is the normal of the track at the crossing, and where it meets
//! the track again the return of that crossing is taken off.
//!
//! Checked by: `current_round_the_ends_of_a_slot_adds_up`, `slot_across_a_strip_adds_the_squares_of_lamb` in
//! tests/finding.

use super::section;
use crate::field::ReturnMap;
use crate::geom::locate::point_segment_distance;
use crate::geom::{Point, Polygon};
use crate::plan::{TrackLeg, Void};
use num_complex::Complex64;

/// Voids that are told beside those that the track crosses.
const MOST: usize = 6;
/// A part smaller than this share of |Z - Z0| is not told.
const LEAST_PART: f64 = 0.02;

/// A void with what it does.
#[derive(Clone, Debug, PartialEq)]
pub struct VoidEffect {
    /// Id of the void.
    pub id: String,
    /// Index in the chart's voids.
    pub index: usize,
    /// Middle of the crossing, or the place of the track nearest to the void.
    pub at: Point,
    /// Whether the track crosses it.
    pub crossed: bool,
    /// Least distance from the track's centre line in metres; zero where it crosses.
    pub distance_m: f64,
    /// Part of the extra loop resistance in ohm; none without a solve that tells it.
    pub extra_resistance_ohm: Option<f64>,
    /// Part of the extra loop inductance in henry; none at DC.
    pub extra_inductance_h: Option<f64>,
    /// For a crossed void, the two ways round it: left and right of the track.
    pub ends: Option<[VoidEnd; 2]>,
}

/// One way round a crossed void.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct VoidEnd {
    /// The rim's farthest point on that side.
    pub at: Point,
    /// Share of the return that goes round there.
    pub share: f64,
}

/// The voids that matter, worst first: those that the track crosses and those with the largest parts. `parts` are
/// those of Z - Z0 by void, with the rest behind them.
pub fn effects(
    map: &ReturnMap,
    legs: &[TrackLeg],
    voids: &[Void],
    parts: Option<&[Complex64]>,
) -> Vec<VoidEffect> {
    let omega = std::f64::consts::TAU * map.frequency_hz;
    let total = parts.map_or(0.0, |parts| parts.iter().sum::<Complex64>().norm());
    let mut found = Vec::new();
    for (index, void) in voids.iter().enumerate() {
        let part = parts.and_then(|parts| parts.get(index).copied());
        let crossing = crossing(legs, &void.shape, map.grid.cell_m);
        let large = part.is_some_and(|part| part.norm() > LEAST_PART * total);
        if crossing.is_none() && !large {
            continue;
        }
        let nearest = nearest(legs, &void.shape);
        let Some((distance_m, near)) = nearest else { continue };
        found.push(VoidEffect {
            id: void.id.clone(),
            index,
            at: crossing.map_or(near, |crossing| crossing.0),
            crossed: crossing.is_some(),
            distance_m: if crossing.is_some() { 0.0 } else { distance_m },
            extra_resistance_ohm: part.map(|part| part.re),
            extra_inductance_h: part.filter(|_| omega > 0.0).map(|part| part.im / omega),
            ends: crossing.map(|crossing| ends(map, legs, &void.shape, crossing)),
        });
    }
    let size = |effect: &VoidEffect| match (effect.extra_inductance_h, effect.extra_resistance_ohm) {
        (Some(henry), _) => henry,
        (None, Some(ohm)) => ohm,
        (None, None) => f64::from(u8::from(effect.crossed)),
    };
    found.sort_by(|a, b| size(b).total_cmp(&size(a)).then(a.index.cmp(&b.index)));
    let mut beside = 0;
    found.retain(|effect| {
        beside += usize::from(!effect.crossed);
        effect.crossed || beside <= MOST
    });
    found
}

/// Middle and direction of the longest stretch of the track over the void.
fn crossing(legs: &[TrackLeg], shape: &Polygon, cell_m: f64) -> Option<(Point, Point)> {
    let bounds = shape.bounds();
    let step_m = 0.1 * cell_m;
    let mut best: Option<(usize, Point, Point)> = None;
    let mut run: Vec<(Point, Point)> = Vec::new();
    let mut close = |run: &mut Vec<(Point, Point)>| {
        if run.len() > best.as_ref().map_or(0, |best| best.0) {
            let middle = run[run.len() / 2];
            best = Some((run.len(), middle.0, middle.1));
        }
        run.clear();
    };
    for leg in legs {
        let length = leg.from.distance(leg.to);
        let reach = crate::geom::Bounds::of([leg.from, leg.to]);
        if length <= 0.0 || !reach.meets(bounds) {
            close(&mut run);
            continue;
        }
        let along = (leg.to - leg.from) * (1.0 / length);
        let count = (length / step_m).ceil() as usize;
        for k in 0..count {
            let at = leg.from + (leg.to - leg.from) * ((k as f64 + 0.5) / count as f64);
            if bounds.contains(at) && shape.contains(at) {
                run.push((at, along));
            } else {
                close(&mut run);
            }
        }
    }
    close(&mut run);
    best.map(|(_, at, along)| (at, along))
}

/// Distance from the track to the rim of the void, and the place of the track nearest to it.
fn nearest(legs: &[TrackLeg], shape: &Polygon) -> Option<(f64, Point)> {
    let mut best: Option<(f64, Point)> = None;
    let mut offer = |distance: f64, at: Point| {
        if best.is_none_or(|best| distance < best.0) {
            best = Some((distance, at));
        }
    };
    for ring in shape.rings() {
        for (i, &corner) in ring.iter().enumerate() {
            let rim = (corner, ring[(i + 1) % ring.len()]);
            for leg in legs {
                offer(point_segment_distance(corner, (leg.from, leg.to)), foot(corner, leg));
                for end in [leg.from, leg.to] {
                    offer(point_segment_distance(end, rim), end);
                }
            }
        }
    }
    best
}

/// The point of a leg nearest to `point`.
fn foot(point: Point, leg: &TrackLeg) -> Point {
    let along = leg.to - leg.from;
    let square = along.dot(along);
    let part = if square > 0.0 { ((point - leg.from).dot(along) / square).clamp(0.0, 1.0) } else { 0.0 };
    leg.from + along * part
}

/// The two ways round a void that the track crosses at a place, in a direction.
fn ends(map: &ReturnMap, legs: &[TrackLeg], shape: &Polygon, (at, along): (Point, Point)) -> [VoidEnd; 2] {
    let bounds = map.grid.bounds();
    let reach_m = bounds.width() + bounds.height();
    [1.0, -1.0].map(|side| {
        let out = Point::new(-along.y, along.x) * side;
        let flux = section::one_side(map, at, along, side, &[reach_m])[0];
        // the return of the track where it comes back over the line
        let again: f64 = legs.iter().map(|leg| crossed(leg, at, out, reach_m, along)).sum();
        let farthest = shape.outer.iter().copied().filter(|rim| (*rim - at).dot(out) > 0.0);
        let rim = farthest.max_by(|a, b| (*a - at).length().total_cmp(&(*b - at).length()));
        VoidEnd { at: rim.unwrap_or(at), share: flux - again }
    })
}

/// Current of a leg along `along` through the ray from `at` along `out`, in A per A.
fn crossed(leg: &TrackLeg, at: Point, out: Point, reach_m: f64, along: Point) -> f64 {
    let step = leg.to - leg.from;
    let across = out.cross(step);
    if across == 0.0 {
        return 0.0;
    }
    let offset = leg.from - at;
    let (on_ray, on_leg) = (offset.cross(step) / across, offset.cross(out) / across);
    let here = on_ray > 1e-9 && on_ray < reach_m && (0.0..1.0).contains(&on_leg);
    if here { leg.current * step.dot(along).signum() } else { 0.0 }
}
