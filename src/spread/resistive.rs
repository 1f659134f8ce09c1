//! Return of a filament in an endless resistive sheet at any frequency.
//!
//! Given h (m), Zs (ohm per square, total current of both faces), f (Hz); gives the complex -K/I in 1/m, the share
//! within |x| < X and half-widths of the in-phase part.
//!
//! Model: lambda = j w mu0/(2 Zs); in wave numbers K(k) = -I e^{-|k|h} lambda/(lambda + |k|), hence
//! -K/I = (lambda/2 pi) [g(h - jx) + g(h + jx)], g(z) = e^{lambda z} E1(lambda z), and within X
//! (2/pi) atan(X/h) + [g(h + jX) - g(h - jX)]/(pi j).
//!
//! Source: J. C. Maxwell's receding images of the thin sheet, J. R. Wait's complex image theory (from memory); derived
//! and checked against quadrature.
//!
//! Holds when: the sheet is wide against h + 1/|lambda| and thin against the distance over which the field varies.
//!
//! Checked by: `resistive_sheet_in_closed_form` in tests/physics.

use crate::math::exponential_integral::scaled_e1;
use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::f64::consts::PI;

/// lambda = j w mu0/(2 Zs) in 1/m.
pub fn lambda(frequency_hz: f64, zs_ohm: Complex64) -> Complex64 {
    Complex64::new(0.0, PI * frequency_hz * MU0) / zs_ohm
}

/// Frequency in Hz at which |lambda| h = 1: above it the return follows the track within a few h.
pub fn corner_hz(height_m: f64, zs_ohm: Complex64) -> f64 {
    zs_ohm.norm() / (PI * MU0 * height_m)
}

/// Density of the return in 1/m at `x_m` for `lambda` in 1/m.
///
/// ```
/// use ebbmap::spread::resistive::{density, lambda};
/// // 1 oz foil, 0.2 mm, 1 MHz: still 24 % below the perfect plane's 1592 A/m
/// let zs = num_complex::Complex64::new(0.5e-3, 0.0);
/// let k = density(0.0, 0.2e-3, lambda(1e6, zs));
/// assert!((k.re - 1182.09).abs() < 0.01 && (k.im - 499.31).abs() < 0.01);
/// ```
pub fn density(x_m: f64, height_m: f64, lambda: Complex64) -> Complex64 {
    let g = |z: Complex64| scaled_e1(lambda * z);
    lambda / (2.0 * PI) * (g(Complex64::new(height_m, -x_m)) + g(Complex64::new(height_m, x_m)))
}

/// Complex share of the return within `reach_m` on either side.
pub fn share_within(reach_m: f64, height_m: f64, lambda: Complex64) -> Complex64 {
    let g = |z: Complex64| scaled_e1(lambda * z);
    let rest = g(Complex64::new(height_m, reach_m)) - g(Complex64::new(height_m, -reach_m));
    2.0 / PI * libm::atan(reach_m / height_m) + rest / Complex64::new(0.0, PI)
}

/// Mean density in 1/m over the cell from `x_m` - `cell_m`/2 to `x_m` + `cell_m`/2.
pub fn cell_mean(x_m: f64, cell_m: f64, height_m: f64, lambda: Complex64) -> Complex64 {
    let half = cell_m / 2.0;
    (share_within(x_m + half, height_m, lambda) - share_within(x_m - half, height_m, lambda)) / (2.0 * cell_m)
}

/// Distance in metres within which `part` of the in-phase return flows (0 < part < 1), by bisection.
pub fn half_width_m(part: f64, height_m: f64, lambda: Complex64) -> f64 {
    let inside = |x: f64| share_within(x, height_m, lambda).re < part;
    let mut high = height_m;
    while inside(high) && high < 1e9 * height_m {
        high *= 2.0;
    }
    let mut low = 0.0;
    for _ in 0..80 {
        let middle = 0.5 * (low + high);
        if inside(middle) { low = middle } else { high = middle }
    }
    0.5 * (low + high)
}
