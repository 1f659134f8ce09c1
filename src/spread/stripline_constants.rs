//! Line constants of a zero-thickness strip midway between two perfect planes.
//!
//! Given w/b (width over the distance of the planes) and the relative permittivity, gives impedance (ohm), L' (H/m) and
//! C' (F/m).
//!
//! Model: Z0 sqrt(er) = (eta0/4) K(k)/K(k'), k = sech(pi w/2b), k' = tanh(pi w/2b). The ratio of complete elliptic
//! integrals is M(1, k)/M(1, k') with the arithmetic-geometric mean M, since K(k) = pi/(2 M(1, k')).
//! L' = Z0 sqrt(er)/c, C' = er/(c Z0 sqrt(er)).
//!
//! Source: S. Cohn, "Characteristic impedance of the shielded-strip transmission line", IRE Transactions on Microwave
//! Theory and Techniques, 1954 (exact; from memory).
//!
//! Holds when: quasi-static, w/b from 0.001 to 20; the strip lies in the middle, planes much wider than b.
//!
//! Checked by: `stripline_constants_match_published_values`, `stripline_constants_have_the_right_limits`.

use crate::unit::constants::{C0, MU0};
use std::f64::consts::FRAC_PI_2;

/// Arithmetic-geometric mean of two positive numbers.
fn mean(mut a: f64, mut b: f64) -> f64 {
    for _ in 0..60 {
        if (a - b).abs() <= 1e-15 * a {
            break;
        }
        (a, b) = (0.5 * (a + b), (a * b).sqrt());
    }
    0.5 * (a + b)
}

/// Impedance in ohm of the line in air.
///
/// ```
/// let z0 = ebbmap::spread::stripline_constants::impedance_in_air_ohm(0.5) / 4.3f64.sqrt();
/// assert!((z0 - 48.4328285).abs() < 1e-6);
/// ```
pub fn impedance_in_air_ohm(width_over_gap: f64) -> f64 {
    let x = FRAC_PI_2 * width_over_gap;
    let k = 1.0 / libm::cosh(x);
    MU0 * C0 / 4.0 * mean(1.0, k) / mean(1.0, libm::tanh(x))
}

/// Impedance in ohm of the line on its dielectric.
pub fn impedance_ohm(width_over_gap: f64, permittivity: f64) -> f64 {
    impedance_in_air_ohm(width_over_gap) / permittivity.sqrt()
}

/// Inductance in H/m.
pub fn inductance_per_m(width_over_gap: f64) -> f64 {
    impedance_in_air_ohm(width_over_gap) / C0
}

/// Capacitance in F/m.
pub fn capacitance_per_m(width_over_gap: f64, permittivity: f64) -> f64 {
    permittivity / (C0 * impedance_in_air_ohm(width_over_gap))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn stripline_constants_match_published_values() {
        // w/b, Z0 sqrt(er), Z0 at er 4.3: Cohn's formula evaluated with 30 digits outside the project.
        let table = [
            (0.1, 194.226254637, 93.6642171756),
            (0.25, 139.917099343, 67.4740168572),
            (0.5, 100.43245073, 48.4328284776),
            (1.0, 65.35362511, 31.5163166121),
            (2.0, 38.5793225513, 18.6046013846),
        ];
        for (ratio, air, board) in table {
            assert!((impedance_in_air_ohm(ratio) / air - 1.0).abs() < 1e-9, "{ratio}");
            assert!((impedance_ohm(ratio, 4.3) / board - 1.0).abs() < 1e-9, "{ratio}");
        }
    }

    #[test]
    fn stripline_constants_have_the_right_limits() {
        let eta0 = MU0 * C0;
        // Narrow strip, a wire of diameter w/2: (eta0/2 pi) ln(8 b/(pi w)).
        let narrow = eta0 / std::f64::consts::TAU * libm::log(8.0 / (std::f64::consts::PI * 0.01));
        assert!((impedance_in_air_ohm(0.01) / narrow - 1.0).abs() < 1e-4);
        // Wide strip: two plates plus fringes, C'/eps0 = 4 (w/b + 2 ln 2/pi).
        let wide = eta0 / (4.0 * (8.0 + 2.0 * libm::log(2.0) / std::f64::consts::PI));
        assert!((impedance_in_air_ohm(8.0) / wide - 1.0).abs() < 1e-9);
        // L' C' = er/c^2.
        let product = inductance_per_m(0.7) * capacitance_per_m(0.7, 4.3) * C0 * C0;
        assert!((product / 4.3 - 1.0).abs() < 1e-14);
    }
}
