//! How the return divides between two endless resistive sheets that are bonded at both ends.
//!
//! Given the sheet impedances (ohm per square), distances (m) and f (Hz), gives the complex share of sheet 1.
//!
//! Model: the limit k -> 0 of Zs_i K_i = -j w (mu0/2k) [I e^{-k d_i} + sum_j K_j e^{-k |z_i - z_j|}]: both sheets on
//! one side, sheet 1 nearer, S1 = (Z2 + j w mu0 s)/(Z1 + Z2 + j w mu0 s); filament between, h1 + h2 = b,
//! S1 = (Z2 + j w mu0 h2)/(Z1 + Z2 + j w mu0 b).
//!
//! Source: derived; the perfect limit h2/b is the stripline's (Cohn 1954).
//!
//! Holds when: both sheets reach far beyond the track on either side and are bonded at its ends.
//!
//! Checked by: `two_sheets_divide_the_return` in tests/physics.

use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Share of the nearer of two sheets `gap_m` apart on one side of the filament.
pub fn share_of_nearer(frequency_hz: f64, near_ohm: Complex64, far_ohm: Complex64, gap_m: f64) -> Complex64 {
    let inductive = Complex64::new(0.0, 2.0 * PI * frequency_hz * MU0 * gap_m);
    (far_ohm + inductive) / (near_ohm + far_ohm + inductive)
}

/// Share of the sheet at distance `one_m` when the other lies at `two_m` on the other side of the filament.
pub fn share_between(
    frequency_hz: f64,
    one_ohm: Complex64,
    two_ohm: Complex64,
    one_m: f64,
    two_m: f64,
) -> Complex64 {
    let inductive = Complex64::new(0.0, 2.0 * PI * frequency_hz * MU0);
    (two_ohm + inductive * two_m) / (one_ohm + two_ohm + inductive * (one_m + two_m))
}
