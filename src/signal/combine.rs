//! The density of a band: power sum of the densities of its lines.
//!
//! Given the points of a band's spectrum and, for each frequency, the complex field of 1 A, gives the rms field of the
//! band: K = sqrt(sum_k I_k^2 |K_k|^2), in the field's unit times amperes. Lines of different frequency do not
//! interfere on average, so powers add.
//!
//! Checked by: `band_fields_add_in_power`, `condensed_bands_match_the_full_sum`.

use super::spectrum::{BandSpectrum, Line};
use num_complex::Complex64;

/// The rms field of a band.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct BandField {
    /// Field, rms, absolute: for densities A/m.
    pub rms: Vec<f64>,
    /// Current of the band in amperes, rms.
    pub current_rms_a: f64,
}

impl BandField {
    /// The field per ampere of band current; zero where the band carries nothing.
    pub fn per_ampere(&self) -> Vec<f64> {
        let scale = if self.current_rms_a > 0.0 { 1.0 / self.current_rms_a } else { 0.0 };
        self.rms.iter().map(|value| value * scale).collect()
    }
}

/// Sum of powers, filled line by line; for fields that the caller makes in its own order.
#[derive(Clone, Debug)]
pub struct PowerSum {
    squares: Vec<f64>,
    current_squared: f64,
}

impl PowerSum {
    /// An empty sum for fields of `len` values.
    pub fn new(len: usize) -> Self {
        Self { squares: vec![0.0; len], current_squared: 0.0 }
    }

    /// Adds the field of 1 A, times the current of `line`. A shorter field adds to the first values only.
    pub fn add(&mut self, line: &Line, field_per_ampere: &[Complex64]) {
        let power = line.current_rms_a * line.current_rms_a;
        self.current_squared += power;
        for (square, value) in self.squares.iter_mut().zip(field_per_ampere) {
            *square += power * value.norm_sqr();
        }
    }

    /// The root of the sum.
    pub fn finish(self) -> BandField {
        let rms = self.squares.into_iter().map(f64::sqrt).collect();
        BandField { rms, current_rms_a: self.current_squared.sqrt() }
    }
}

/// The rms field of a band from `field`, which gives the field of 1 A at a frequency in Hz.
///
/// ```
/// use ebbmap::signal::{combine::band_rms, spectrum::{BandSpectrum, Line}};
/// let line = |frequency_hz, current_rms_a| Line { frequency_hz, current_rms_a, phase_rad: None };
/// let spectrum = BandSpectrum { current_rms_a: 5.0, points: vec![line(1.0, 3.0), line(2.0, 4.0)], line_count: 2 };
/// let band = band_rms(&spectrum, |_| Ok::<_, String>(vec![2.0.into()])).unwrap();
/// assert_eq!(band.rms, [10.0]);
/// assert_eq!(band.per_ampere(), [2.0]);
/// ```
pub fn band_rms<E>(
    spectrum: &BandSpectrum,
    mut field: impl FnMut(f64) -> Result<Vec<Complex64>, E>,
) -> Result<BandField, E> {
    let mut sum: Option<PowerSum> = None;
    for line in &spectrum.points {
        let values = field(line.frequency_hz)?;
        sum.get_or_insert_with(|| PowerSum::new(values.len())).add(line, &values);
    }
    Ok(sum.map_or_else(BandField::default, PowerSum::finish))
}
