//! Closed forms of an ideal converter: step, ideal signal-to-noise ratio, noise budget.
//!
//! Model: LSB = FSR/2^N; the quantization error of a busy signal is even over one LSB, LSB/sqrt(12) rms; against a
//! full-scale sine, FSR/(2 sqrt 2) rms, that is 20 log10(2^N sqrt(3/2)) = 6.02 N + 1.76 dB.
//! Source: W. Kester (editor), The Data Conversion Handbook, 2005, chapter 2 (from memory).
//!
//! Checked by: `converter_steps_and_ratios`.

use crate::review::drive::Budget;

/// Step in volts of a converter with `bits` over `full_scale_v`.
///
/// ```
/// assert_eq!(ebbmap::signal::converter::lsb_v(2.048, 12), 500e-6);
/// ```
pub fn lsb_v(full_scale_v: f64, bits: u32) -> f64 {
    libm::ldexp(full_scale_v, -i32::try_from(bits).unwrap_or(i32::MAX))
}

/// Rms value in volts of the quantization error.
pub fn quantization_noise_v(full_scale_v: f64, bits: u32) -> f64 {
    lsb_v(full_scale_v, bits) / libm::sqrt(12.0)
}

/// Ratio in dB of a full-scale sine to the quantization error.
pub fn ideal_snr_db(bits: u32) -> f64 {
    20.0 * (f64::from(bits) * libm::log10(2.0) + 0.5 * libm::log10(1.5))
}

/// The noise in volts rms that a budget allows.
pub fn budget_v(budget: &Budget) -> f64 {
    match *budget {
        Budget::Volts(volts) => volts,
        Budget::Converter { bits, full_scale_v, lsb } => lsb * lsb_v(full_scale_v, bits),
    }
}

/// A noise voltage in steps of the converter; none if the budget names no converter.
pub fn in_lsb(budget: &Budget, noise_v: f64) -> Option<f64> {
    match *budget {
        Budget::Volts(_) => None,
        Budget::Converter { bits, full_scale_v, .. } => Some(noise_v / lsb_v(full_scale_v, bits)),
    }
}
