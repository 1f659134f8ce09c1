//! Spectra of drives: the lines or the power density of a drive inside a band, as currents.
//!
//! Given a [`Drive`], a band (lower limit exclusive, upper inclusive; the band from 0 to 0 is direct current) and the
//! admittance through which a voltage drives the path, gives lines with rms currents whose squares add up to the
//! square of the band's current.
//!
//! Densities are sampled at Gauss-Legendre points of every lobe between two zeros of the stream's spectrum, so that the
//! power in a band is exact to rounding. A drive without a level counts as one of 1 A.
//!
//! A line's phase refers to the start of the pulse's rise; densities, sequences, tones and tables have none.
//!
//! Not here: fewer points for many lines, see `condense`; the sum of maps over them, see `signal::combine`.

mod condense;
pub mod pulse;
pub mod stream;

pub use condense::{BandSpectrum, band_spectrum, condense, points_for};

use crate::math::quadrature::legendre;
use crate::review::drive::{Drive, Level, Pattern, Pulse, Stream, TableLine, Tone};
use num_complex::Complex64;

/// One line of a spectrum, or one point that stands for a piece of it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Line {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Current in amperes, rms.
    pub current_rms_a: f64,
    /// Phase in radians of the rms phasor, time factor exp(+jwt); none where the drive has no phase.
    pub phase_rad: Option<f64>,
}

/// Limits of a band in Hz: lower exclusive, upper inclusive; both 0 is direct current alone.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limits {
    /// Lower limit, exclusive.
    pub from_hz: f64,
    /// Upper limit, inclusive.
    pub to_hz: f64,
}

/// Part by which a limit may miss a multiple of a frequency through rounding alone.
const ROUNDING: f64 = 1e-12;
/// Gauss points in each lobe of a density: integrates a lobe to 1e-15 of its power.
const POINTS_PER_LOBE: usize = 12;
/// Halvings below the first zero of a density, towards a lower limit near 0 Hz.
const HALVINGS: u32 = 40;
/// A sequence with more lines than this in a band is taken as random bits of the same power.
const MOST_SEQUENCE_LINES: u64 = 1 << 22;
/// Below this part of its envelope 1/(pi n) a Fourier coefficient is rounding.
const SILENT: f64 = 1e-12;

impl From<&crate::review::Band> for Limits {
    fn from(band: &crate::review::Band) -> Self {
        Self { from_hz: band.from_hz, to_hz: band.to_hz }
    }
}

impl Limits {
    /// Whether a frequency belongs to the band.
    pub fn contain(&self, frequency_hz: f64) -> bool {
        if self.has_zero() {
            return frequency_hz == 0.0;
        }
        frequency_hz > self.from_hz * (1.0 + ROUNDING) && frequency_hz <= self.to_hz * (1.0 + ROUNDING)
    }

    /// Whether this is the band of direct current.
    fn has_zero(&self) -> bool {
        self.from_hz == 0.0 && self.to_hz == 0.0
    }

    /// Multiples n >= 1 of `step_hz` inside: first and last, first > last if there are none.
    fn multiples(&self, step_hz: f64) -> (u64, u64) {
        if self.has_zero() {
            return (1, 0);
        }
        let whole = |limit_hz: f64| (limit_hz * (1.0 + ROUNDING) / step_hz).floor().max(0.0) as u64;
        (whole(self.from_hz) + 1, whole(self.to_hz))
    }
}

/// A piece of a spectrum: frequency, power in squared amperes (or volts) and phase.
struct Piece {
    frequency_hz: f64,
    power: f64,
    phase_rad: Option<f64>,
}

/// All lines (or points of a density) of a drive inside a band. `admittance` turns volts of the driver into amperes
/// and is not asked for drives whose level is a current.
///
/// ```
/// use ebbmap::review::drive::{Drive, Level, Pulse};
/// use ebbmap::signal::spectrum::{Limits, lines_in_band};
/// let pulse = Pulse { frequency_hz: 8e6, rise_s: 2e-9, fall_s: 2e-9, duty: 0.5, level: Some(Level::Amperes(0.01)) };
/// let hf = Limits { from_hz: 3e6, to_hz: 30e6 };
/// let lines = lines_in_band(&Drive::Clock(pulse), hf, &|_| 1.0.into());
/// assert_eq!(lines.iter().map(|line| line.frequency_hz).collect::<Vec<_>>(), [8e6, 24e6]);
/// ```
pub fn lines_in_band(drive: &Drive, limits: Limits, admittance: &dyn Fn(f64) -> Complex64) -> Vec<Line> {
    let mut lines = Vec::new();
    for_each_line(drive, limits, admittance, &mut |line| lines.push(line));
    lines
}

/// Current of a band in amperes rms: the root of the sum of squares of its lines.
pub fn band_current_rms(lines: &[Line]) -> f64 {
    lines.iter().map(|line| line.current_rms_a * line.current_rms_a).sum::<f64>().sqrt()
}

/// Hands every line of the band to `sink`, frequencies rising, without holding them all.
fn for_each_line(
    drive: &Drive,
    limits: Limits,
    admittance: &dyn Fn(f64) -> Complex64,
    sink: &mut dyn FnMut(Line),
) {
    let (height, volts) = match drive.level() {
        Some(Level::Volts(height)) => (height, true),
        Some(Level::Amperes(height)) => (height, false),
        None => (1.0, false),
    };
    let mut emit = |piece: Piece| {
        let flow = if volts { admittance(piece.frequency_hz) } else { Complex64::new(1.0, 0.0) };
        let current_rms_a = height.abs() * piece.power.sqrt() * flow.norm();
        if current_rms_a > 0.0 {
            let turn = if height < 0.0 { std::f64::consts::PI } else { 0.0 };
            let phase_rad = piece.phase_rad.map(|phase| phase + turn + flow.arg());
            sink(Line { frequency_hz: piece.frequency_hz, current_rms_a, phase_rad });
        }
    };
    match drive {
        Drive::Clock(pulse) | Drive::Ripple(pulse) => pulse_pieces(pulse, limits, &mut emit),
        Drive::Data(stream) => stream_pieces(stream, limits, &mut emit),
        Drive::Tone(tone) => tone_pieces(tone, limits, &mut emit),
        Drive::Spectrum(table) => table_pieces(table, limits, &mut emit),
    }
}

fn pulse_pieces(pulse: &Pulse, limits: Limits, emit: &mut dyn FnMut(Piece)) {
    if limits.has_zero() {
        let mean = pulse::coefficient(pulse, 0).re;
        emit(Piece { frequency_hz: 0.0, power: mean * mean, phase_rad: Some(0.0) });
    }
    let (first, last) = limits.multiples(pulse.frequency_hz);
    for n in first..=last {
        let c = pulse::coefficient(pulse, n);
        if c.norm() > SILENT / (std::f64::consts::PI * n as f64) {
            let frequency_hz = n as f64 * pulse.frequency_hz;
            emit(Piece { frequency_hz, power: 2.0 * c.norm_sqr(), phase_rad: Some(c.arg()) });
        }
    }
}

fn stream_pieces(stream: &Stream, limits: Limits, emit: &mut dyn FnMut(Piece)) {
    let mut plain = |frequency_hz, power| emit(Piece { frequency_hz, power, phase_rad: None });
    match stream.pattern {
        Pattern::Random if limits.has_zero() => plain(0.0, stream::random_zero()),
        Pattern::Random => density_pieces(stream, limits, 1.0, &mut plain),
        Pattern::Prbs { order } => {
            let length = stream::sequence_length(order);
            let step_hz = stream.bit_rate_hz / length as f64;
            let (first, last) = limits.multiples(step_hz);
            if limits.has_zero() {
                plain(0.0, stream::sequence_line(stream, length, 0));
            } else if last.saturating_sub(first) > MOST_SEQUENCE_LINES {
                let excess = (length as f64 + 1.0) / length as f64;
                density_pieces(stream, limits, excess, &mut plain);
            } else {
                for k in first..=last {
                    plain(k as f64 * step_hz, stream::sequence_line(stream, length, k));
                }
            }
        }
    }
}

/// Points of the density of random bits, lobe by lobe; the first lobe is halved towards the lower limit.
fn density_pieces(stream: &Stream, limits: Limits, factor: f64, plain: &mut dyn FnMut(f64, f64)) {
    let nodes = legendre(POINTS_PER_LOBE);
    let mut panel = |from_hz: f64, to_hz: f64| {
        let (from_hz, to_hz) = (from_hz.max(limits.from_hz), to_hz.min(limits.to_hz));
        if to_hz <= from_hz {
            return;
        }
        let half_hz = 0.5 * (to_hz - from_hz);
        for (x, weight) in &nodes {
            let frequency_hz = from_hz + half_hz * (1.0 + x);
            let power = factor * stream::random_density(stream, frequency_hz) * half_hz * weight;
            plain(frequency_hz, power);
        }
    };
    let rate_hz = stream.bit_rate_hz;
    if limits.from_hz < rate_hz {
        panel(0.0, libm::ldexp(rate_hz, -(HALVINGS as i32)));
        for halving in (1..=HALVINGS as i32).rev() {
            panel(libm::ldexp(rate_hz, -halving), libm::ldexp(rate_hz, 1 - halving));
        }
    }
    let first = ((limits.from_hz / rate_hz).floor() as u64).max(1);
    let last = (limits.to_hz / rate_hz).ceil() as u64;
    for lobe in first..last {
        panel(lobe as f64 * rate_hz, (lobe + 1) as f64 * rate_hz);
    }
}

fn tone_pieces(tone: &Tone, limits: Limits, emit: &mut dyn FnMut(Piece)) {
    if tone.bandwidth_hz <= 0.0 {
        if limits.contain(tone.frequency_hz) {
            emit(Piece { frequency_hz: tone.frequency_hz, power: 1.0, phase_rad: None });
        }
        return;
    }
    let from_hz = (tone.frequency_hz - 0.5 * tone.bandwidth_hz).max(limits.from_hz);
    let to_hz = (tone.frequency_hz + 0.5 * tone.bandwidth_hz).min(limits.to_hz);
    let half_hz = 0.5 * (to_hz - from_hz);
    if half_hz > 0.0 {
        for (x, weight) in legendre(POINTS_PER_LOBE) {
            let frequency_hz = from_hz + half_hz * (1.0 + x);
            emit(Piece { frequency_hz, power: weight * half_hz / tone.bandwidth_hz, phase_rad: None });
        }
    }
}

fn table_pieces(table: &[TableLine], limits: Limits, emit: &mut dyn FnMut(Piece)) {
    let mut inside: Vec<&TableLine> = table.iter().filter(|line| limits.contain(line.frequency_hz)).collect();
    inside.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
    for line in inside {
        let power = line.current_rms_a * line.current_rms_a;
        emit(Piece { frequency_hz: line.frequency_hz, power, phase_rad: None });
    }
}
