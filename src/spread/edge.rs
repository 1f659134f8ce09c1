//! Return of a filament in perfect conductors with edges: a strip of finite width, a half-plane.
//!
//! Given the filament's height h and place (m), gives -K/I in 1/m (sum of both faces), shares and inductances in H/m.
//!
//! Model: conformal maps. Strip |x| < a: z = (a/2)(zeta + 1/zeta), zeta0 the image of the filament, rho = |zeta0|,
//! P(t) = (1/2 pi)(rho^2 - 1)/(1 - 2 rho cos(t - arg zeta0) + rho^2), -K/I = [P(t) + P(-t)]/(a sin t), x = a cos t.
//! Half-plane: zeta = sqrt z, zeta0 = p + j q, v = sqrt u (u: distance from the edge into the plane),
//! -K/I = [Q(v) + Q(-v)]/(2 v), Q(v) = (p/pi)/((v - q)^2 + p^2).
//!
//! Source: derived with the Joukowski map and the square root; trace near an edge by complex analysis: M. Leone, IEEE
//! T-EMC 43(4), 2001; net inductance of the strip: C. L. Holloway and E. F. Kuester, NTIA Report 98-344 (abstracts).
//!
//! Holds when: the resistance does not matter (|lambda| h of the resistive sheet well above 1).
//!
//! Checked by: `perfect_edges_in_closed_form` in tests/physics.

use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Image of the filament outside the unit circle for a strip of half width `a_m`.
fn outside(x0_m: f64, height_m: f64, a_m: f64) -> Complex64 {
    let z = Complex64::new(x0_m, height_m);
    (z + (z - a_m).sqrt() * (z + a_m).sqrt()) / a_m
}

/// Density in 1/m at `x_m` on a strip |x| < `a_m` below a filament at (`x0_m`, `height_m`).
pub fn strip_density(x_m: f64, x0_m: f64, height_m: f64, a_m: f64) -> f64 {
    let zeta = outside(x0_m, height_m, a_m);
    let (rho, at) = (zeta.norm(), zeta.arg());
    let theta = libm::acos((x_m / a_m).clamp(-1.0, 1.0));
    let p = |t: f64| (rho * rho - 1.0) / (1.0 - 2.0 * rho * libm::cos(t - at) + rho * rho) / (2.0 * PI);
    (p(theta) + p(-theta)) / (a_m * libm::sin(theta))
}

/// Net inductance in H/m of the strip as a return.
pub fn strip_net_inductance(x0_m: f64, height_m: f64, a_m: f64) -> f64 {
    MU0 / (2.0 * PI) * libm::log(outside(x0_m, height_m, a_m).norm())
}

/// Loop inductance in H/m of a wire of radius `wire_m` (small against its height) over the strip.
pub fn strip_loop_inductance(x0_m: f64, height_m: f64, a_m: f64, wire_m: f64) -> f64 {
    let zeta = outside(x0_m, height_m, a_m);
    let slope = (a_m / 2.0 * (1.0 - 1.0 / (zeta * zeta))).norm();
    MU0 / (2.0 * PI) * libm::log((zeta.norm_sqr() - 1.0) * slope / wire_m)
}

/// Density in 1/m at `u_m` from the edge of a half-plane, filament `inside_m` inside the edge at `height_m`.
pub fn half_plane_density(u_m: f64, inside_m: f64, height_m: f64) -> f64 {
    let zeta = Complex64::new(-inside_m, height_m).sqrt();
    let (p, q, v) = (zeta.re, zeta.im, libm::sqrt(u_m));
    let one = |v: f64| p / PI / ((v - q) * (v - q) + p * p);
    (one(v) + one(-v)) / (2.0 * v)
}

/// Share of the return within `u_m` of the edge.
pub fn half_plane_share_within(u_m: f64, inside_m: f64, height_m: f64) -> f64 {
    let zeta = Complex64::new(-inside_m, height_m).sqrt();
    let (p, q, v) = (zeta.re, zeta.im, libm::sqrt(u_m));
    (libm::atan((v - q) / p) - libm::atan((-v - q) / p)) / PI
}

/// Loop inductance in H/m of a wire of radius `wire_m` near the edge of a half-plane.
pub fn half_plane_loop_inductance(inside_m: f64, height_m: f64, wire_m: f64) -> f64 {
    let zeta = Complex64::new(-inside_m, height_m).sqrt();
    MU0 / (2.0 * PI) * libm::log(4.0 * zeta.re * zeta.norm() / wire_m)
}
