//! Where pieces of copper touch: nearest points of lines, distances between lines and areas.

use crate::geom::locate::segment_distance;
use crate::geom::{Bounds, Point, Polygon, Region};

/// Nearest point to `point` on the line between `ends`, as the part of its length.
pub fn nearest_part(point: Point, ends: (Point, Point)) -> f64 {
    let along = ends.1 - ends.0;
    let square = along.dot(along);
    if square > 0.0 { ((point - ends.0).dot(along) / square).clamp(0.0, 1.0) } else { 0.0 }
}

/// The point at a part of the length between `ends`; the ends themselves are exact.
pub fn point_at(ends: (Point, Point), part: f64) -> Point {
    if part <= 0.0 {
        ends.0
    } else if part >= 1.0 {
        ends.1
    } else {
        ends.0 + (ends.1 - ends.0) * part
    }
}

/// Parts of two lines where they are nearest to each other, and that distance in metres.
pub fn nearest_parts(a: (Point, Point), b: (Point, Point)) -> (f64, f64, f64) {
    let (da, db) = (a.1 - a.0, b.1 - b.0);
    let cross = da.cross(db);
    if cross.abs() > 1e-9 * da.length() * db.length() && cross != 0.0 {
        let between = b.0 - a.0;
        let (s, t) = (between.cross(db) / cross, between.cross(da) / cross);
        if (0.0..=1.0).contains(&s) && (0.0..=1.0).contains(&t) {
            return (s, t, 0.0);
        }
    }
    let mut best = (0.0, 0.0, f64::INFINITY);
    let mut consider = |s: f64, t: f64| {
        let distance = point_at(a, s).distance(point_at(b, t));
        if distance < best.2 {
            best = (s, t, distance);
        }
    };
    consider(nearest_part(b.0, a), 0.0);
    consider(nearest_part(b.1, a), 1.0);
    consider(0.0, nearest_part(a.0, b));
    consider(1.0, nearest_part(a.1, b));
    best
}

/// Whether the line between `ends` comes within `reach_m` of a region.
pub fn line_meets(ends: (Point, Point), region: &Region, reach_m: f64) -> bool {
    if region.contains(ends.0) || region.contains(ends.1) {
        return true;
    }
    let near = Bounds::of([ends.0, ends.1]).grown(reach_m);
    region.0.iter().any(|polygon| sides(polygon, near).any(|side| segment_distance(ends, side) <= reach_m))
}

/// Whether two regions share a point.
pub fn regions_meet(a: &Region, b: &Region) -> bool {
    let (bounds_a, bounds_b) = (a.bounds(), b.bounds());
    if !bounds_a.meets(bounds_b) {
        return false;
    }
    let first =
        |region: &Region| region.0.iter().filter_map(|p| p.outer.first().copied()).collect::<Vec<_>>();
    if first(a).into_iter().any(|point| b.contains(point))
        || first(b).into_iter().any(|point| a.contains(point))
    {
        return true;
    }
    a.0.iter().any(|p| {
        sides(p, bounds_b).any(|side| {
            let near = Bounds::of([side.0, side.1]);
            b.0.iter().any(|q| sides(q, near).any(|other| segment_distance(side, other) <= 0.0))
        })
    })
}

/// Sides of a polygon's rims whose box meets `near`.
fn sides(polygon: &Polygon, near: Bounds) -> impl Iterator<Item = (Point, Point)> + '_ {
    polygon.rings().flat_map(move |ring| {
        (0..ring.len())
            .map(move |i| (ring[i], ring[(i + 1) % ring.len()]))
            .filter(move |side| Bounds::of([side.0, side.1]).meets(near))
    })
}

/// Extent of a region across the direction from `from` to `to`, in metres.
pub fn extent_across(region: &Region, from: Point, to: Point) -> f64 {
    let along = to - from;
    let length = along.length();
    let direction = if length > 0.0 { along * (1.0 / length) } else { Point::new(1.0, 0.0) };
    let points = region.0.iter().flat_map(|polygon| polygon.outer.iter());
    let (low, high) = points.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &point| {
        let across = direction.cross(point - from);
        (low.min(across), high.max(across))
    });
    if high > low { high - low } else { 0.0 }
}

/// Length of the line through `middle` across the direction from `from` to `to` that lies on the region, in metres;
/// none where `middle` itself does not.
pub fn chord_across(regions: &[std::borrow::Cow<'_, Region>], from: Point, to: Point) -> Option<f64> {
    let middle = (from + to) * 0.5;
    let home = regions.iter().find(|region| region.contains(middle))?;
    let along = to - from;
    let length = along.length();
    if length == 0.0 {
        return None;
    }
    let across = Point::new(-along.y, along.x) * (1.0 / length);
    let (mut left, mut right) = (f64::INFINITY, f64::INFINITY);
    for polygon in &home.0 {
        for ring in polygon.rings() {
            for i in 0..ring.len() {
                let (p, q) = (ring[i] - middle, ring[(i + 1) % ring.len()] - middle);
                let (sp, sq) = (across.cross(p), across.cross(q));
                if (sp > 0.0) != (sq > 0.0) {
                    let hit = p + (q - p) * (sp / (sp - sq));
                    let distance = across.dot(hit);
                    if distance >= 0.0 {
                        right = right.min(distance);
                    } else {
                        left = left.min(-distance);
                    }
                }
            }
        }
    }
    (left.is_finite() && right.is_finite()).then_some(left + right)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nearest_parts_of_crossing_and_parallel_lines() {
        let p = |x: f64, y: f64| Point::new(x, y);
        assert_eq!(nearest_parts((p(0.0, 0.0), p(4.0, 0.0)), (p(1.0, -1.0), p(1.0, 3.0))), (0.25, 0.25, 0.0));
        assert_eq!(nearest_parts((p(0.0, 0.0), p(4.0, 0.0)), (p(1.0, 2.0), p(1.0, 3.0))), (0.25, 0.0, 2.0));
        let (_, _, distance) = nearest_parts((p(0.0, 0.0), p(4.0, 0.0)), (p(-3.0, 4.0), p(-3.0, 9.0)));
        assert_eq!(distance, 5.0);
        let (_, _, distance) = nearest_parts((p(0.0, 0.0), p(0.0, 0.0)), (p(3.0, 4.0), p(3.0, 4.0)));
        assert_eq!(distance, 5.0);
    }

    #[test]
    fn chords_end_at_the_rim() {
        let p = |x: f64, y: f64| Point::new(x, y);
        let square =
            Polygon { outer: vec![p(0.0, 0.0), p(4.0, 0.0), p(4.0, 3.0), p(0.0, 3.0)], holes: vec![] };
        let region = [std::borrow::Cow::Owned(Region(vec![square]))];
        assert_eq!(chord_across(&region, p(1.0, 1.0), p(3.0, 1.0)), Some(3.0));
        assert_eq!(chord_across(&region, p(1.0, 5.0), p(3.0, 5.0)), None);
        assert_eq!(extent_across(&region[0], p(1.0, 1.0), p(1.0, 2.0)), 4.0);
    }
}
