//! The closed form on cells: over an endless plane the return follows the track with the strip's published profile.
//!
//! Model: uniform strip of the leg's width at the dielectric's thickness h over an endless perfect plane; within the
//! plane -K is directed along the nearest stretch of the track and depends on the distance u to it alone. With
//! F(u) = int_0^u -K du the current through a face is the difference of F between its ends, so the flux through any
//! section is exact and no current is lost along a straight stretch. On the outside of a bend the nearest point is
//! the corner and u the distance to it. Beyond the ends of the track there is no current; voids are not considered.
//! Source: image of a uniform strip, F(u) = [G(u + w/2) - G(u - w/2)]/(pi w),
//! G(u) = u atan(u/h) - (h/2) ln(1 + u^2/h^2) (textbook; Holloway & Kuester 1995). Range: frequencies at which the
//! plane's resistance does not matter, plane much wider than h.
//! Checked by: `closed_form_integrates_to_the_strip_shares` in tests/field.rs.

use crate::geom::{Grid, Point};
use crate::spread::strip;
use num_complex::Complex64;

/// A leg of the track as the closed form sees it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SpreadLeg {
    /// Start.
    pub from: Point,
    /// End.
    pub to: Point,
    /// Width in metres.
    pub width_m: f64,
    /// Height over the plane in metres.
    pub height_m: f64,
    /// Current from `from` to `to` in A per A of the driver's current.
    pub current: f64,
}

/// Ends of legs nearer than this are one place, in metres.
const SAME_M: f64 = 1e-7;

/// In-phase return between the track and the distance `u_m` to one side, odd in u: -1/2 to 1/2.
fn one_sided_share(u_m: f64, width_m: f64, height_m: f64) -> f64 {
    0.5 * strip::share_within(u_m, width_m, height_m)
}

/// What the distance is measured from.
#[derive(Clone, Copy)]
enum Nearest {
    /// A leg, along its unit vector.
    Leg(usize, Point),
    /// The corner after a leg; distances on its outer side have this sign.
    Corner(usize, f64),
    /// An end of the track.
    End,
}

/// Face currents (vertical faces, horizontal faces) per ampere of the driver's current, as in a return map: the sum over
/// the ways that the legs make, each of which ends where the next leg starts elsewhere.
pub fn face_currents(legs: &[SpreadLeg], grid: &Grid) -> (Vec<Complex64>, Vec<Complex64>) {
    let legs: Vec<SpreadLeg> = legs.iter().copied().filter(|leg| leg.from.distance(leg.to) > 0.0).collect();
    let follows = |a: &SpreadLeg, b: &SpreadLeg| a.to.distance(b.from) < SAME_M;
    let mut ways = legs.chunk_by(follows).map(|way| way_currents(way, grid));
    let Some((mut jx, mut jy)) = ways.next() else { return way_currents(&[], grid) };
    for (x, y) in ways {
        jx.iter_mut().zip(x).for_each(|(sum, own)| *sum += own);
        jy.iter_mut().zip(y).for_each(|(sum, own)| *sum += own);
    }
    (jx, jy)
}

fn way_currents(legs: &[SpreadLeg], grid: &Grid) -> (Vec<Complex64>, Vec<Complex64>) {
    let (nx, ny) = (grid.nx, grid.ny);
    let mut jx = vec![Complex64::new(0.0, 0.0); (nx + 1) * ny];
    let mut jy = vec![Complex64::new(0.0, 0.0); nx * (ny + 1)];
    if legs.is_empty() {
        return (jx, jy);
    }
    let corner = |ix: usize, iy: usize| grid.origin + Point::new(ix as f64, iy as f64) * grid.cell_m;
    const BLOCK: usize = 16;
    for by in (0..=ny).step_by(BLOCK) {
        for bx in (0..=nx).step_by(BLOCK) {
            let near = candidates(legs, corner(bx + BLOCK / 2, by + BLOCK / 2), BLOCK as f64 * grid.cell_m);
            for iy in by..(by + BLOCK).min(ny + 1) {
                for ix in bx..(bx + BLOCK).min(nx + 1) {
                    if iy < ny {
                        let flux = crossing(legs, &near, corner(ix, iy), corner(ix, iy + 1));
                        jx[iy * (nx + 1) + ix] = Complex64::new(-flux, 0.0);
                    }
                    if ix < nx {
                        let flux = crossing(legs, &near, corner(ix, iy), corner(ix + 1, iy));
                        jy[iy * nx + ix] = Complex64::new(flux, 0.0);
                    }
                }
            }
        }
    }
    (jx, jy)
}

/// Legs that can be nearest to a point within `reach_m` of `middle`.
fn candidates(legs: &[SpreadLeg], middle: Point, reach_m: f64) -> Vec<usize> {
    let distances: Vec<f64> = legs.iter().map(|leg| foot(leg, middle).0.distance(middle)).collect();
    let least = distances.iter().copied().fold(f64::INFINITY, f64::min);
    (0..legs.len()).filter(|&i| distances[i] <= least + 2.0 * reach_m).collect()
}

/// Nearest point of a leg, and its place along the leg, 0 to 1.
fn foot(leg: &SpreadLeg, point: Point) -> (Point, f64) {
    let along = leg.to - leg.from;
    let part = ((point - leg.from).dot(along) / along.dot(along)).clamp(0.0, 1.0);
    (leg.from + along * part, part)
}

/// Difference of F between two ends of a face, both measured from what is nearest to its middle.
fn crossing(legs: &[SpreadLeg], near: &[usize], from: Point, to: Point) -> f64 {
    let middle = (from + to) * 0.5;
    let mut best = (f64::INFINITY, 0, 0.0);
    for &i in near {
        let (at, part) = foot(&legs[i], middle);
        let distance = at.distance(middle);
        if distance < best.0 {
            best = (distance, i, part);
        }
    }
    let (_, leg, part) = best;
    let (SpreadLeg { width_m, height_m, current, .. }, measured) = (legs[leg], nearest(legs, leg, part));
    let share = |point: Point| match measured {
        Nearest::Leg(leg, unit) => one_sided_share(unit.cross(point - legs[leg].from), width_m, height_m),
        Nearest::Corner(leg, sign) => one_sided_share(sign * point.distance(legs[leg].to), width_m, height_m),
        Nearest::End => 0.0,
    };
    current * (share(to) - share(from))
}

fn nearest(legs: &[SpreadLeg], leg: usize, part: f64) -> Nearest {
    let unit = |i: usize| {
        let along = legs[i].to - legs[i].from;
        along * (1.0 / along.length())
    };
    let joint = if part <= 0.0 { leg.checked_sub(1) } else { Some(leg) };
    if part > 0.0 && part < 1.0 {
        return Nearest::Leg(leg, unit(leg));
    }
    match joint {
        Some(before) if before + 1 < legs.len() => {
            let turn = unit(before).cross(unit(before + 1));
            if turn.abs() < 1e-9 {
                Nearest::Leg(leg, unit(leg))
            } else {
                Nearest::Corner(before, -turn.signum())
            }
        }
        _ => Nearest::End,
    }
}
