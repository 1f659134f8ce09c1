//! Webs between voids: thin copper that separates them, and one shape for all that it fails to separate.
//!
//! From each corner of a rim the nearest point of a neighbouring void is looked up; where it is closer than the limit,
//! the strip between the two facing rims is a web and is filled.

use super::void::simplified;
use crate::geom::{Bounds, Point, Polygon, Region, Ring, boolean, stroke};
use std::collections::BTreeMap;

/// Corners of voids are dropped where they lie this near to the line between others, as a part of the limit.
const COARSE: f64 = 0.01;
/// Rims are looked at in steps of this part of the limit.
const STEP: f64 = 0.5;

/// The voids, those whose webs are narrower than `limit_m` as one polygon with the webs.
pub fn joined(missing: &Region, limit_m: f64) -> Vec<Polygon> {
    let coarse: Vec<Coarse> = missing
        .0
        .iter()
        .map(|polygon| Coarse::new(&simplified(polygon, COARSE * limit_m), limit_m))
        .collect();
    let mut order: Vec<usize> = (0..coarse.len()).collect();
    order.sort_by(|&a, &b| coarse[a].bounds.min.x.total_cmp(&coarse[b].bounds.min.x).then(a.cmp(&b)));
    let mut sets = Sets((0..coarse.len()).collect());
    let mut webs: Vec<(usize, Vec<Ring>)> = Vec::new();
    for (k, &i) in order.iter().enumerate() {
        let right = coarse[i].bounds.max.x + limit_m;
        for &j in order[k + 1..].iter().take_while(|&&j| coarse[j].bounds.min.x <= right) {
            if coarse[i].bounds.grown(limit_m).meets(coarse[j].bounds) {
                let found = web(&coarse[i], &coarse[j], limit_m);
                if !found.is_empty() {
                    sets.join(i, j);
                    webs.push((i, found));
                }
            }
        }
    }
    let mut groups: BTreeMap<usize, (Vec<usize>, Vec<Ring>)> = BTreeMap::new();
    for i in 0..coarse.len() {
        groups.entry(sets.find(i)).or_default().0.push(i);
    }
    for (i, rings) in webs {
        groups.entry(sets.find(i)).or_default().1.extend(rings);
    }
    let mut shapes = Vec::new();
    for (members, rings) in groups.into_values() {
        if let [only] = members[..] {
            shapes.push(missing.0[only].clone());
            continue;
        }
        let members = Region(members.iter().map(|&index| missing.0[index].clone()).collect());
        shapes.extend(boolean::union_with([&members], &rings).0);
    }
    shapes
}

/// A void with fewer corners.
struct Coarse {
    bounds: Bounds,
    /// Rims, sides no longer than a step.
    rings: Vec<Ring>,
}

impl Coarse {
    fn new(polygon: &Polygon, limit_m: f64) -> Self {
        let rings = polygon.rings().map(|ring| {
            let mut fine = Ring::new();
            for i in 0..ring.len() {
                let (from, to) = (ring[i], ring[(i + 1) % ring.len()]);
                let n = (from.distance(to) / (STEP * limit_m)).ceil().max(1.0) as usize;
                fine.extend((0..n).map(|k| from + (to - from) * (k as f64 / n as f64)));
            }
            fine
        });
        Self { bounds: polygon.bounds(), rings: rings.collect() }
    }

    /// Sides whose box meets `near`.
    fn sides(&self, near: Bounds) -> Vec<(Point, Point)> {
        let mut sides = Vec::new();
        for ring in &self.rings {
            for i in 0..ring.len() {
                let side = (ring[i], ring[(i + 1) % ring.len()]);
                if Bounds::of([side.0, side.1]).meets(near) {
                    sides.push(side);
                }
            }
        }
        sides
    }
}

/// Counter-clockwise rings that fill the web between two voids; none where they are farther apart than the limit.
fn web(a: &Coarse, b: &Coarse, limit_m: f64) -> Vec<Ring> {
    let mut rings = Vec::new();
    let mut nearest = (f64::INFINITY, Point::default(), Point::default());
    for (from, to) in [(a, b), (b, a)] {
        let facing = to.sides(from.bounds.grown(limit_m));
        let near = to.bounds.grown(limit_m);
        for ring in &from.rings {
            let mut before: Option<(Point, Point)> = None;
            for &corner in ring.iter().chain(ring.first()) {
                let found = if near.contains(corner) { nearest_on(&facing, corner, limit_m) } else { None };
                if let Some((distance, there)) = found {
                    if distance < nearest.0 {
                        nearest = (distance, corner, there);
                    }
                    if let Some((corner_before, there_before)) = before {
                        push_triangle(&mut rings, [corner_before, corner, there_before]);
                        push_triangle(&mut rings, [corner, there, there_before]);
                    }
                }
                before = found.map(|(_, there)| (corner, there));
            }
        }
    }
    if nearest.0.is_finite() {
        // Makes the two one polygon even where they face each other at one corner.
        rings.push(stroke::capsule(nearest.1, nearest.2, 0.05 * limit_m));
    }
    rings
}

fn nearest_on(sides: &[(Point, Point)], point: Point, limit_m: f64) -> Option<(f64, Point)> {
    let mut best = (limit_m, None);
    for &side in sides {
        let there = super::touch::point_at(side, super::touch::nearest_part(point, side));
        let distance = there.distance(point);
        if distance < best.0 {
            best = (distance, Some(there));
        }
    }
    best.1.map(|there| (best.0, there))
}

fn push_triangle(rings: &mut Vec<Ring>, corners: [Point; 3]) {
    let turn = (corners[1] - corners[0]).cross(corners[2] - corners[0]);
    // Slivers below the grid of set operations fill nothing.
    const NOTHING_M2: f64 = 1e-16;
    if turn > NOTHING_M2 {
        rings.push(corners.to_vec());
    } else if turn < -NOTHING_M2 {
        rings.push(vec![corners[0], corners[2], corners[1]]);
    }
}

/// Disjoint sets; the smaller index is the root.
struct Sets(Vec<usize>);

impl Sets {
    fn find(&mut self, mut at: usize) -> usize {
        while self.0[at] != at {
            self.0[at] = self.0[self.0[at]];
            at = self.0[at];
        }
        at
    }

    fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.find(a), self.find(b));
        self.0[a.max(b)] = a.min(b);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(x: f64, y: f64, side: f64) -> Polygon {
        let p = |dx: f64, dy: f64| Point::mm(x + dx * side, y + dy * side);
        Polygon { outer: vec![p(0.0, 0.0), p(1.0, 0.0), p(1.0, 1.0), p(0.0, 1.0)], holes: vec![] }
    }

    #[test]
    fn a_web_narrower_than_the_limit_joins_and_is_filled() {
        // Two squares of 1 mm with a web of 0.3 mm, a third 0.5 mm farther on.
        let missing = Region(vec![square(0.0, 0.0, 1.0), square(1.3, 0.0, 1.0), square(2.8, 0.0, 1.0)]);
        let found = joined(&missing, 0.4e-3);
        assert_eq!(found.len(), 2);
        let area = found.iter().map(Polygon::area).fold(0.0, f64::max) * 1e6;
        assert!((area - 2.3).abs() < 0.02, "{area}");
        assert_eq!(joined(&missing, 0.25e-3).len(), 3);
        assert_eq!(joined(&missing, 0.6e-3).len(), 1);
    }

    #[test]
    fn corners_that_face_each_other_join_too() {
        let missing = Region(vec![square(0.0, 0.0, 1.0), square(1.1, 1.1, 1.0)]);
        assert_eq!(joined(&missing, 0.2e-3).len(), 1);
        assert_eq!(joined(&missing, 0.14e-3).len(), 2);
    }
}
