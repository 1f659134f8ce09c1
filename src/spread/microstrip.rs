//! Line constants of a zero-thickness strip over a perfect plane.
//!
//! Given u = w/h and the relative permittivity, gives effective permittivity, impedance (ohm), L' (H/m), C' (F/m).
//!
//! Model: Z01 = (eta0/2 pi) ln[f/u + sqrt(1 + 4/u^2)], f = 6 + (2 pi - 6) exp(-(30.666/u)^0.7528);
//! eeff = (er + 1)/2 + (er - 1)/2 (1 + 10/u)^{-a b},
//! a = 1 + ln[(u^4 + (u/52)^2)/(u^4 + 0.432)]/49 + ln[1 + (u/18.1)^3]/18.7, b = 0.564 ((er - 0.9)/(er + 3))^0.053;
//! L' = Z01/c, C' = eeff/(c Z01).
//!
//! Source: E. Hammerstad and O. Jensen, IEEE MTT-S 1980 (formula from memory; Z01 agrees with an integral equation to
//! 5e-5 for u up to 5).
//!
//! Holds when: quasi-static, 0.01 <= u <= 100; stated accuracy 0.01 to 0.2 %.
//!
//! Checked by: `microstrip_line_constants` in tests/physics.

use crate::unit::constants::{C0, MU0};
use std::f64::consts::PI;

/// Impedance in ohm of the line in air.
pub fn impedance_in_air_ohm(width_over_height: f64) -> f64 {
    let u = width_over_height;
    let f = 6.0 + (2.0 * PI - 6.0) * libm::exp(-libm::pow(30.666 / u, 0.7528));
    MU0 * C0 / (2.0 * PI) * libm::log(f / u + libm::sqrt(1.0 + 4.0 / (u * u)))
}

/// Effective relative permittivity.
pub fn effective_permittivity(width_over_height: f64, permittivity: f64) -> f64 {
    let (u, er) = (width_over_height, permittivity);
    let u4 = u * u * u * u;
    let a = 1.0
        + libm::log((u4 + (u / 52.0) * (u / 52.0)) / (u4 + 0.432)) / 49.0
        + libm::log1p((u / 18.1) * (u / 18.1) * (u / 18.1)) / 18.7;
    let b = 0.564 * libm::pow((er - 0.9) / (er + 3.0), 0.053);
    (er + 1.0) / 2.0 + (er - 1.0) / 2.0 * libm::pow(1.0 + 10.0 / u, -a * b)
}

/// Impedance in ohm of the line on its dielectric.
pub fn impedance_ohm(width_over_height: f64, permittivity: f64) -> f64 {
    impedance_in_air_ohm(width_over_height)
        / libm::sqrt(effective_permittivity(width_over_height, permittivity))
}

/// Inductance in H/m.
pub fn inductance_per_m(width_over_height: f64) -> f64 {
    impedance_in_air_ohm(width_over_height) / C0
}

/// Capacitance in F/m.
pub fn capacitance_per_m(width_over_height: f64, permittivity: f64) -> f64 {
    effective_permittivity(width_over_height, permittivity) / (C0 * impedance_in_air_ohm(width_over_height))
}
