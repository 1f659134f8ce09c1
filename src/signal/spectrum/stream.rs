//! Power of a bit stream: density of random bits, lines of a maximum-length sequence.
//!
//! Given a stream with levels 0 and 1, gives one-sided powers: density in 1/Hz or power of a line.
//!
//! Model: with the bit time Tb, levels +A and -A about their mean (A = 1/2), edges of length t (0-100 %, linear, not
//! longer than a bit): random bits 2 A^2 Tb sinc^2(f Tb) sinc^2(f t); a sequence of N = 2^n - 1 bits has lines at
//! k/(N Tb) with 2 A^2 (N + 1)/N^2 sinc^2(k/N) sinc^2(k t/(N Tb)). The mean of the levels is 1/2 for random bits and
//! (N + 1)/(2 N) for a sequence, which holds one more 1 than 0. The factor sinc^2(f t) is exact: each edge is the step
//! smeared over t.
//!
//! Source: two-sided forms in J. Proakis, Digital Communications (random NRZ), and S. Golomb, Shift Register Sequences
//! (from memory); the lines are checked against the transform of a 127-bit sequence.
//!
//! Checked by: `nrz_density_and_fractions`, `prbs_lines_match_published_values`, `prbs_lines_match_a_sequence`.

use super::pulse::sinc;
use crate::review::drive::Stream;

/// Half the difference of the levels, squared.
const A_SQUARED: f64 = 0.25;

/// One-sided power density of random bits at `frequency_hz` > 0, in 1/Hz for levels 0 and 1.
pub fn random_density(stream: &Stream, frequency_hz: f64) -> f64 {
    let bit_s = 1.0 / stream.bit_rate_hz;
    let shape = sinc(frequency_hz / stream.bit_rate_hz) * sinc(frequency_hz * stream.whole_edge_s());
    2.0 * A_SQUARED * bit_s * shape * shape
}

/// Power of random bits at 0 Hz, levels 0 and 1: the square of their mean.
pub fn random_zero() -> f64 {
    0.25
}

/// Bits in a maximum-length sequence.
pub fn sequence_length(order: u32) -> u64 {
    (1u64 << order) - 1
}

/// One-sided power of line `k` of a sequence of `length` bits, levels 0 and 1; k = 0 is the square of the mean.
pub fn sequence_line(stream: &Stream, length: u64, k: u64) -> f64 {
    let n = length as f64;
    if k == 0 {
        let mean = 0.5 * (n + 1.0) / n;
        return mean * mean;
    }
    if k.is_multiple_of(length) {
        return 0.0;
    }
    let bits = k as f64 / n;
    let shape = sinc(bits) * sinc(bits * stream.bit_rate_hz * stream.whole_edge_s());
    2.0 * A_SQUARED * (n + 1.0) / (n * n) * shape * shape
}
