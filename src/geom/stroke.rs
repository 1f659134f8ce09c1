//! Circles, arcs and lines drawn with a round pen, as polygons.
//!
//! A circle becomes an inscribed polygon with corners in the four main directions; the chords leave the circle by
//! [`SAGITTA_M`] at most. Transcendental functions come from `libm`, so the points are the same on every machine.

use super::{Point, Region, Ring, boolean};
use std::f64::consts::{PI, TAU};

/// Largest distance between an arc and its chords in metres.
pub const SAGITTA_M: f64 = 0.5e-6;

/// Largest angle in radians between neighbouring points of an arc of radius `radius_m`.
fn chord_angle(radius_m: f64) -> f64 {
    if radius_m <= 2.0 * SAGITTA_M {
        return PI / 2.0;
    }
    (2.0 * libm::acos(1.0 - SAGITTA_M / radius_m)).min(PI / 4.0)
}

/// Point at `angle` on a circle round `centre`.
fn on_circle(centre: Point, radius_m: f64, angle: f64) -> Point {
    centre + Point::new(libm::cos(angle), libm::sin(angle)) * radius_m
}

/// A circle as a counter-clockwise ring whose number of corners is a multiple of four.
pub fn circle(centre: Point, diameter_m: f64) -> Ring {
    let radius_m = 0.5 * diameter_m;
    let n_quarter = (0.5 * PI / chord_angle(radius_m)).ceil().max(1.0) as usize;
    let mut quarter = Vec::with_capacity(n_quarter);
    quarter.push(Point::new(radius_m, 0.0));
    for index in 1..n_quarter {
        quarter.push(on_circle(Point::default(), radius_m, 0.5 * PI * index as f64 / n_quarter as f64));
    }
    let mut ring = Vec::with_capacity(4 * n_quarter);
    for turn in 0..4 {
        ring.extend(quarter.iter().map(|&p| {
            centre
                + match turn {
                    0 => p,
                    1 => Point::new(-p.y, p.x),
                    2 => Point::new(-p.x, -p.y),
                    _ => Point::new(p.y, -p.x),
                }
        }));
    }
    ring
}

/// Points of an arc from `from` to `to` round `centre`, both ends included. Equal ends make a full circle. Where the
/// ends lie at different distances from the centre, the radius changes evenly along the arc.
pub fn arc(from: Point, to: Point, centre: Point, clockwise: bool) -> Vec<Point> {
    let (a, b) = (from - centre, to - centre);
    let (radius_a, radius_b) = (a.length(), b.length());
    let start = libm::atan2(a.y, a.x);
    let mut sweep = libm::atan2(a.cross(b), a.dot(b));
    if clockwise {
        sweep = -sweep;
    }
    if from == to {
        sweep = TAU;
    } else if sweep <= 0.0 {
        sweep += TAU;
    }
    let n = (sweep / chord_angle(radius_a.max(radius_b))).ceil().max(1.0) as usize;
    let mut points = Vec::with_capacity(n + 1);
    points.push(from);
    for index in 1..n {
        let part = index as f64 / n as f64;
        let angle = if clockwise { start - sweep * part } else { start + sweep * part };
        points.push(on_circle(centre, radius_a + (radius_b - radius_a) * part, angle));
    }
    points.push(to);
    points
}

/// A straight line drawn with a round pen, as a counter-clockwise ring.
pub fn capsule(from: Point, to: Point, width_m: f64) -> Ring {
    let along = to - from;
    let length = along.length();
    if length == 0.0 {
        return circle(from, width_m);
    }
    let radius_m = 0.5 * width_m;
    let unit = along * (1.0 / length);
    let left = Point::new(-unit.y, unit.x);
    let n = (PI / chord_angle(radius_m)).ceil().max(2.0) as usize;
    let mut ring = Vec::with_capacity(2 * n + 2);
    for (end, sign) in [(to, 1.0), (from, -1.0)] {
        for index in 0..=n {
            // From the right side round the end to the left side; the sides themselves are exact.
            let (cos, sin) = match index {
                0 => (-1.0, 0.0),
                i if i == n => (1.0, 0.0),
                i => {
                    let angle = PI * i as f64 / n as f64;
                    (-libm::cos(angle), libm::sin(angle))
                }
            };
            ring.push(end + (left * cos + unit * sin) * (sign * radius_m));
        }
    }
    ring
}

/// The rings that together make up a line drawn with a round pen: one for each straight piece, a circle for a dot.
pub fn capsules(path: &[Point], width_m: f64) -> Vec<Ring> {
    match path {
        [] => Vec::new(),
        [dot] => vec![circle(*dot, width_m)],
        _ => path.windows(2).map(|ends| capsule(ends[0], ends[1], width_m)).collect(),
    }
}

/// A line of any number of points drawn with a round pen, as a region.
pub fn stroke(path: &[Point], width_m: f64) -> Region {
    boolean::union_with([], &capsules(path, width_m))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::polygon::ring_area;

    #[test]
    fn circles_and_lines_have_the_areas_of_elementary_geometry() {
        for diameter_m in [1e-6, 50e-6, 0.3e-3, 2e-3, 50e-3] {
            let exact = 0.25 * PI * diameter_m * diameter_m;
            let area = ring_area(&circle(Point::mm(3.0, -4.0), diameter_m));
            // The chords lose less than the rim's length times two thirds of the sagitta.
            let lost = PI * diameter_m * SAGITTA_M.min(0.5 * diameter_m);
            assert!(area < exact && area > exact - lost, "{diameter_m}: {area} against {exact}");
        }
        let line = capsule(Point::mm(0.0, 0.0), Point::mm(3.0, 4.0), 0.2e-3);
        let exact = 5.0 * 0.2 + PI * 0.01;
        assert!((ring_area(&line) * 1e6 - exact).abs() < 3e-4);
    }

    #[test]
    fn arcs_keep_their_ends_and_stay_within_the_sagitta() {
        let (from, to, centre) = (Point::mm(10.0, 0.0), Point::mm(0.0, 10.0), Point::mm(0.0, 0.0));
        for clockwise in [false, true] {
            let points = arc(from, to, centre, clockwise);
            assert_eq!((points[0], points[points.len() - 1]), (from, to));
            let length: f64 = points.windows(2).map(|w| w[0].distance(w[1])).sum();
            let exact = if clockwise { 15.0 * PI } else { 5.0 * PI };
            assert!((length * 1e3 - exact).abs() < 1e-3 * exact);
            for pair in points.windows(2) {
                assert!(((pair[0] + pair[1]) * 0.5).length() > 10e-3 - SAGITTA_M - 1e-12);
            }
        }
        assert!(ring_area(&arc(from, from, centre, false)) > 0.0);
    }
}
