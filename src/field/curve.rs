//! Loop resistance and inductance of a path against frequency, from two reduced bases.
//!
//! Given a path on the bench, gives R and L of its loop at frequencies from 1 kHz to 3 GHz.
//!
//! Model: the sheet impedance of each foil is exact at every frequency. Height and profile of the current go from one
//! form to another: mid-copper and even at low frequency, the facing faces and crowded at the edges at high. Each form
//! has a reduced basis of its own ([`Family`]), and Z between is their mean weighted by the part of the foil's half
//! that counts, theta = 1/(1 + |lam| h) ([`super::Foil::current_depth_m`]): Z = theta Z_low + (1 - theta) Z_high. Both
//! vary smoothly, and Z is nearly linear in a height that changes by little.
//! Each form sees the copper as maps at its frequencies do, on cells of twice the size where those can stand for it,
//! so L is within about 2 %.
//! Source: the formulas of the rooms that it uses. Range: below a tenth of a wavelength, as the maps.
//! Checked by: `the_loop_curve_meets_the_maps` in tests/field.

use super::laybench::LayBench;
use super::stack::Stack;
use super::track::partial_inductance_h;
use super::workshop::Bench;
use crate::sheet::{Drive, Family, OperatingPoint};
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Lowest frequency in Hz, and points in a decade.
const FROM_HZ: f64 = 1e3;
const A_DECADE: usize = 3;
/// Highest frequency in Hz.
const TO_HZ: f64 = 3e9;
/// Frequencies that stand for low and high in the forms of height and profile, in Hz.
const FORMS_HZ: [f64; 2] = [0.0, 1e13];
/// Bound of the reduced bases.
const TOLERANCE: f64 = 1e-3;

/// A loop's resistance and inductance against frequency.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct LoopCurve {
    /// Frequencies in Hz, rising.
    pub frequency_hz: Vec<f64>,
    /// Resistance in ohm at each.
    pub resistance_ohm: Vec<f64>,
    /// Inductance in henry at each.
    pub inductance_h: Vec<f64>,
}

impl Bench<'_, '_> {
    /// The loop of the path against frequency; none where it is not solved as one, or not by the sheet model.
    pub fn loop_curve(&self) -> Option<LoopCurve> {
        let [lay] = &self.lays[..] else { return None };
        let frequency_hz = frequencies();
        let impedance = lay.as_ref().ok()?.loop_ohm(&frequency_hz)?;
        Some(LoopCurve {
            resistance_ohm: impedance.iter().map(|z| z.re).collect(),
            inductance_h: impedance.iter().zip(&frequency_hz).map(|(z, f)| z.im / (TAU * f)).collect(),
            frequency_hz,
        })
    }
}

/// Frequencies of a curve: three in a decade, and the last.
fn frequencies() -> Vec<f64> {
    let mut all = Vec::new();
    for step in 0.. {
        let hertz = FROM_HZ * libm::exp10(step as f64 / A_DECADE as f64);
        if hertz >= 0.99 * TO_HZ {
            break;
        }
        all.push(hertz);
    }
    all.push(TO_HZ);
    all
}

impl LayBench<'_, '_> {
    /// Loop impedance in ohm at frequencies above 0 Hz; none where a solve fails.
    fn loop_ohm(&self, frequency_hz: &[f64]) -> Option<Vec<Complex64>> {
        let mut total: Vec<Complex64> =
            frequency_hz.iter().map(|&hertz| self.source.resistance_ohm(hertz).into()).collect();
        for (form, form_hz) in FORMS_HZ.into_iter().enumerate() {
            let stack = self.stack(form_hz);
            let sheets = self.sheets_ohm(&stack, form_hz, frequency_hz)?;
            let track_h = partial_inductance_h(&self.source.runs(&stack, form_hz));
            for ((sum, sheets), &hertz) in total.iter_mut().zip(sheets).zip(frequency_hz) {
                let theta = self.source.stack_part(hertz).clamp(0.0, 1.0);
                let weight = if form == 0 { theta } else { 1.0 - theta };
                *sum += weight * (sheets + Complex64::new(0.0, TAU * hertz * track_h));
            }
        }
        Some(total)
    }

    /// What the sheets put into the loop, with height and profile as at `form_hz`.
    fn sheets_ohm(&self, stack: &Stack, form_hz: f64, frequency_hz: &[f64]) -> Option<Vec<Complex64>> {
        let (stage, entered) = self.coarsest(stack, form_hz)?;
        let drive =
            Drive { strips: self.source.strips(stack, form_hz), injections: entered.injections.clone() };
        let points: Vec<OperatingPoint> = frequency_hz
            .iter()
            .map(|&frequency_hz| {
                let zs = |layer: usize| self.source.foil(layer).zs_ohm(frequency_hz);
                OperatingPoint {
                    frequency_hz,
                    zs_ohm: stage.sheets.iter().map(|sheet| zs(sheet.layer)).collect(),
                }
            })
            .collect();
        let family = Family::new(stage.system().ok()?, &drive, &points, TOLERANCE).ok()?;
        Some(points.iter().map(|point| family.sheet_impedance_ohm(point)).collect())
    }
}
