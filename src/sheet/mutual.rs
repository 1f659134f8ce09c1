//! The direct mutual inductance of two sets of source strips, through the air alone.
//!
//! Given strips of two paths, gives in H the flux that 1 A of the first puts through the second without the sheets;
//! together with [`super::System::transfer_ohm`] it makes the transfer impedance of two whole paths.
//!
//! Model: strips are cut into parallel filaments as in `source`. Parallel filaments at distance D, F(u) = u asinh(u/D) -
//! sqrt(u^2 + D^2): M = (mu0/4 pi) [F(c) - F(b) - F(d) + F(a)] with the distances along the axis between their ends.
//! Others: Gauss sums over panels that double away from the nearest point, of the closed potential of one filament.
//!
//! Source: Neumann's formula; parallel filaments as in Grover, Inductance Calculations, 1946, chapter 6 (from memory).
//!
//! Holds when: the strips of the two sets do not lie in each other; vertical parts carry no strips.
//!
//! Checked by: `mutual_inductance_of_strips` in tests/physics.

use super::source::filaments;
use super::{SourceStrip, System};
use crate::geom::Point;
use crate::math::quadrature::legendre;
use crate::sheet::{Prepared, Solution};
use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::f64::consts::PI;

/// A straight filament with a share of the current.
#[derive(Clone, Copy)]
struct Wire {
    from: Point,
    along: Point,
    length: f64,
    z: f64,
    current: f64,
}

impl Wire {
    /// Distance of a point of the plane at height `z` from the filament.
    fn distance(&self, at: Point, z: f64) -> f64 {
        let offset = at - self.from;
        let a = offset.dot(self.along);
        let beyond = (a - self.length).max(-a).max(0.0);
        libm::sqrt(offset.cross(self.along).powi(2) + beyond * beyond + (z - self.z).powi(2))
    }

    /// Integral of ds/r over the filament, in closed form.
    fn inverse_distances(&self, at: Point, z: f64) -> f64 {
        let offset = at - self.from;
        let a = offset.dot(self.along);
        let rho = offset.cross(self.along).powi(2) + (z - self.z).powi(2);
        let b = a - self.length;
        let sum = libm::sqrt(rho + a * a) + libm::sqrt(rho + b * b);
        libm::log1p(2.0 * self.length / (sum - self.length).max(1e-12 * self.length))
    }
}

/// Filaments of a strip.
fn wires(strip: &SourceStrip, distance_m: f64) -> Vec<Wire> {
    let whole = strip.to - strip.from;
    let length = whole.length();
    if length == 0.0 {
        return Vec::new();
    }
    let along = whole * (1.0 / length);
    let across = Point::new(-along.y, along.x);
    let wire = |(offset, share): (f64, f64)| Wire {
        from: strip.from + across * (offset * strip.width_m / 2.0),
        along,
        length,
        z: strip.z_m,
        current: share * strip.current_a,
    };
    filaments(strip, distance_m).into_iter().map(wire).collect()
}

/// F(u) = u asinh(u/D) - sqrt(u^2 + D^2), with its limit on the axis.
fn parallel_term(u: f64, distance: f64) -> f64 {
    if u == 0.0 {
        return -distance;
    }
    if distance < 1e-9 * u.abs() {
        // u (ln 2|u| - ln D) sgn: ln D drops out of the four terms where they do not overlap
        return u.abs() * libm::log(2.0 * u.abs()) - u.abs();
    }
    u * libm::asinh(u / distance) - libm::hypot(u, distance)
}

/// Mutual inductance of two filaments in units of mu0/4 pi.
fn pair(a: &Wire, b: &Wire, gauss: &[(f64, f64)]) -> f64 {
    let cosine = a.along.dot(b.along);
    if cosine.abs() < 1e-14 {
        return 0.0;
    }
    if a.along.cross(b.along).abs() < 1e-9 {
        let offset = b.from - a.from;
        let distance = libm::hypot(offset.cross(a.along), b.z - a.z);
        let first = offset.dot(a.along);
        let (low, high) = if cosine > 0.0 { (first, first + b.length) } else { (first - b.length, first) };
        let term = |u: f64| parallel_term(u, distance);
        return cosine.signum() * (term(high) - term(low) - term(high - a.length) + term(low - a.length));
    }
    // nearest point of b by golden section: the distance from a segment is convex along a line
    let distance = |t: f64| a.distance(b.from + b.along * t, b.z);
    let (mut low, mut high) = (0.0, b.length);
    for _ in 0..60 {
        let part = 0.381_966_011_250_105 * (high - low);
        if distance(low + part) <= distance(high - part) {
            high -= part;
        } else {
            low += part;
        }
    }
    let nearest = 0.5 * (low + high);
    let finest = distance(nearest).max(1e-7 * b.length);
    let mut sum = 0.0;
    for (sign, reach) in [(-1.0, nearest), (1.0, b.length - nearest)] {
        let (mut done, mut panel) = (0.0, finest);
        while done < reach {
            let end = if done + 1.5 * panel >= reach { reach } else { done + panel };
            let (middle, half) = (0.5 * (done + end), 0.5 * (end - done));
            for &(x, weight) in gauss {
                let at = b.from + b.along * (nearest + sign * (middle + half * x));
                sum += weight * half * a.inverse_distances(at, b.z);
            }
            done = end;
            panel = done;
        }
    }
    cosine * sum
}

/// Mutual inductance in H of two sets of strips, for the currents that they carry; the same whichever comes first.
pub fn inductance_h(one: &[SourceStrip], other: &[SourceStrip]) -> f64 {
    // quadrature treats the two differently where they cross
    0.5 * (one_way(one, other) + one_way(other, one))
}

/// Flux of `one` through `other`.
fn one_way(one: &[SourceStrip], other: &[SourceStrip]) -> f64 {
    let gauss = legendre(12);
    let mut sum = 0.0;
    for a in one {
        for b in other {
            let Some(axis) = wires(&SourceStrip { width_m: 0.0, ..*a }, 1.0).first().copied() else {
                continue;
            };
            // the distance decides on the number of filaments alone: three places are enough
            let place = |t: f64| axis.distance(b.from + (b.to - b.from) * t, b.z_m);
            let near = [0.0, 0.5, 1.0].map(place).into_iter().fold(f64::INFINITY, f64::min);
            let height = (a.z_m - b.z_m).abs();
            let wide = a.width_m.max(b.width_m);
            let distance = if near > 4.0 * wide { near } else { height.max(0.1 * wide) };
            let (first, second) = (wires(a, distance), wires(b, 0.9 * distance));
            for i in &first {
                for j in &second {
                    sum += i.current * j.current * pair(i, j, &gauss);
                }
            }
        }
    }
    MU0 / (4.0 * PI) * sum
}

impl System {
    /// Transfer impedance in ohm between the whole paths of two drives: what the currents of `solution` in sheets and
    /// verticals put into the other path ([`System::transfer_ohm`]) and what the strips put there directly, s M.
    pub fn coupling_ohm(
        &self,
        (solution, strips): (&Solution, &[SourceStrip]),
        frequency_hz: f64,
        (other, other_strips): (&Prepared, &[SourceStrip]),
    ) -> Complex64 {
        let direct = 2.0 * PI * frequency_hz * inductance_h(strips, other_strips);
        self.transfer_ohm(solution, frequency_hz, other) + Complex64::new(0.0, direct)
    }
}
