//! The inductance of a barrel between two sheets that the grid does not carry by itself.
//!
//! Given cell d, gap s of the sheets, barrel radius a and the cells over which the barrel's current spreads, gives in H
//! what the vertical must have so that barrel and grid together make (mu0 s/2 pi) ln(D/a) at any distance D.
//!
//! Model: currents that spread from the barrel's cells in both sheets, opposite in sign, already have on the lattice
//!   int d2k/(2 pi)^2 2 (1 - e^{-k s/d}) L^(k) |w^(k)|^2 / kh^2 = (mu0 s/2 pi) ln(D/rho) per barrel for large D,
//! w^ being the transform of the weights. rho is found by taking off mu0 s e^{-4 k^2}/k^2, whose integral is known in
//! closed form, and summing the smooth rest over the band; the missing part is (mu0 s/2 pi) ln(rho/a). It is negative
//! where cells are finer than the barrel needs (the grid's current spreads over the disc, the barrel's does not).
//! For one cell rho/d = 0.3 to 2.3 for s/d = 0.25 to 4.
//!
//! Source: image of the barrel in two perfect planes, loop of two (mu0 s/pi) acosh(D/2a) (C. R. Paul, Inductance, 2010,
//! from memory); lattice integral derived here.
//!
//! Holds when: sheets reach beyond the next barrels, s short against the wavelength.
//!
//! Checked by: `via_pair_between_perfect_planes`, `ring_of_vias` in tests/physics.

use crate::unit::constants::MU0;
use std::f64::consts::PI;

/// Points of the sum over the band in each direction.
const POINTS: usize = 96;
/// Width of the Gaussian that is taken off, in cells squared.
const TAU: f64 = 4.0;
/// Euler's constant.
const GAMMA: f64 = 0.577_215_664_901_532_9;

/// Radius in metres that a grid's barrel acts like; `weights` are offsets in cells and weights that sum to 1.
pub fn grid_radius_m(cell_m: f64, gap_m: f64, weights: &[(f64, f64, f64)]) -> f64 {
    let z = gap_m / cell_m;
    let mut sum = 0.0;
    // symmetric under k -> -k: half of the band, midpoints
    for b in 0..POINTS {
        for a in 0..POINTS / 2 {
            let kx = PI * (2.0 * a as f64 + 1.0) / POINTS as f64;
            let ky = PI * ((2 * b + 1) as f64 / POINTS as f64 - 1.0);
            let k2 = kx * kx + ky * ky;
            let k = libm::sqrt(k2);
            let (sx, sy) = (libm::sin(kx / 2.0), libm::sin(ky / 2.0));
            let lattice = 4.0 * (sx * sx + sy * sy);
            let flux = k2 * (2.0 * sx / kx) * (2.0 * sy / ky) / lattice;
            let (mut re, mut im) = (0.0, 0.0);
            for &(x, y, weight) in weights {
                let phase = kx * x + ky * y;
                re += weight * libm::cos(phase);
                im += weight * libm::sin(phase);
            }
            // in units of mu0 s
            let carried = -libm::expm1(-k * z) / (k * z) * flux * (re * re + im * im) / lattice;
            sum += 2.0 * (carried - libm::exp(-TAU * k2) / k2);
        }
    }
    let rest = sum / (POINTS * POINTS) as f64;
    // one barrel has (1/2 pi) (ln D - ln sqrt(4 tau) + gamma/2) of the Gaussian part
    let log_rho = 0.5 * libm::log(4.0 * TAU) - 0.5 * GAMMA - 2.0 * PI * rest;
    cell_m * libm::exp(log_rho)
}

/// Series inductance in H of a vertical that stands for a barrel of `radius_m`.
pub fn missing_inductance_h(cell_m: f64, gap_m: f64, radius_m: f64, weights: &[(f64, f64, f64)]) -> f64 {
    MU0 * gap_m / (2.0 * PI) * libm::log(grid_radius_m(cell_m, gap_m, weights) / radius_m)
}
