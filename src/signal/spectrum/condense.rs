//! A few frequencies that stand for all lines of a band.
//!
//! Given lines, gives at most n frequencies with rms currents; the sum of their squares is that of all lines, and every
//! quantity that is a polynomial of degree up to 2n - 1 in ln f is summed exactly.
//!
//! Model: Gauss quadrature of the measure of the lines' powers over ln f (`math::measure`). The currents of a plane are
//! relaxations: their transfer functions have poles at negative real s = jw alone, so |H|^2 over u = ln f is analytic
//! for |Im u| < pi/2, and over a range of half-width a in u the error falls as rho^-2n with
//! rho = b + sqrt(1 + b^2), b = (pi/2)/a: rho = 3.06 for a decade. A resonance of capacitors with narrow lines is no
//! relaxation; there more points are needed and the caller compares n with 2n.
//!
//! Many lines are condensed in blocks first, each to points enough for its narrow range, so that memory is bounded.
//!
//! Checked by: `condensed_bands_match_the_full_sum`.

use super::{Limits, Line, band_current_rms, for_each_line};
use crate::math::measure::gauss_rule;
use crate::review::drive::Drive;
use num_complex::Complex64;

/// Lines in a block that is condensed at once.
const BLOCK: usize = 4096;
/// Points that stand for a block; a block of neighbours spans little of ln f, so the error is far below rounding.
const BLOCK_POINTS: usize = 16;
/// Most points that stand for a band.
const MOST_POINTS: usize = 96;

/// The spectrum of a drive in a band.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct BandSpectrum {
    /// Current of the band in amperes, rms.
    pub current_rms_a: f64,
    /// Frequencies to solve, rising: all lines where they are few, otherwise points that stand for them.
    pub points: Vec<Line>,
    /// Number of lines (or points of a density) in the band.
    pub line_count: u64,
}

impl BandSpectrum {
    /// Whether the points stand for more lines than there are points.
    pub fn is_condensed(&self) -> bool {
        self.line_count > self.points.len() as u64
    }
}

/// Number of points for which the error of a relaxation summed from `low_hz` to `high_hz` is about `tolerance`.
pub fn points_for(low_hz: f64, high_hz: f64, tolerance: f64) -> usize {
    let half_width = 0.5 * libm::log(high_hz / low_hz);
    if half_width.is_nan() || half_width <= 0.0 {
        return 1;
    }
    let rate = libm::asinh(std::f64::consts::FRAC_PI_2 / half_width);
    let count = libm::ceil(libm::log(1.0 / tolerance) / (2.0 * rate)) + 1.0;
    count.clamp(1.0, MOST_POINTS as f64) as usize
}

/// At most `count` points that stand for `lines`; lines at 0 Hz stay as they are. Phases are lost where lines are
/// joined.
pub fn condense(lines: &[Line], count: usize) -> Vec<Line> {
    if lines.len() <= count {
        return lines.to_vec();
    }
    let zeros = lines.iter().filter(|line| line.frequency_hz <= 0.0).copied();
    let powers: Vec<(f64, f64)> =
        lines.iter().filter(|line| line.frequency_hz > 0.0).map(power_over_logarithm).collect();
    zeros.chain(gauss_rule(&powers, count).into_iter().map(line_from_logarithm)).collect()
}

/// The spectrum of `drive` inside `limits` with as many points as `tolerance` asks for, see [`points_for`].
pub fn band_spectrum(
    drive: &Drive,
    limits: Limits,
    admittance: &dyn Fn(f64) -> Complex64,
    tolerance: f64,
) -> BandSpectrum {
    let (mut done, mut block) = (Vec::new(), Vec::with_capacity(BLOCK));
    let (mut line_count, mut total) = (0u64, 0.0);
    for_each_line(drive, limits, admittance, &mut |line| {
        line_count += 1;
        total += line.current_rms_a * line.current_rms_a;
        block.push(line);
        if block.len() == BLOCK {
            done.extend(condense(&block, BLOCK_POINTS));
            block.clear();
        }
    });
    done.append(&mut block);
    let positive = || done.iter().map(|line| line.frequency_hz).filter(|f| *f > 0.0);
    let low_hz = positive().fold(f64::INFINITY, f64::min);
    let high_hz = positive().fold(0.0, f64::max);
    let points = condense(&done, points_for(low_hz, high_hz, tolerance));
    debug_assert!((band_current_rms(&points) - total.sqrt()).abs() <= 1e-9 * total.sqrt());
    BandSpectrum { current_rms_a: total.sqrt(), points, line_count }
}

fn power_over_logarithm(line: &Line) -> (f64, f64) {
    (libm::log(line.frequency_hz), line.current_rms_a * line.current_rms_a)
}

fn line_from_logarithm((logarithm, power): (f64, f64)) -> Line {
    Line { frequency_hz: libm::exp(logarithm), current_rms_a: power.sqrt(), phase_rad: None }
}
