//! Copper foil: sheet impedance for the total current of both faces, and where in the foil the current lies.
//!
//! gamma = (1 + j)/delta, delta = sqrt(2/(w mu0 sigma)), Zs = (gamma/(2 sigma)) coth(gamma t/2): equal field on both
//! faces, total current (Wheeler 1942; Ramo, Whinnery, Van Duzer, from memory). sigma follows the temperature.
//! Range: smooth copper; roughness adds loss above about 1 GHz and is not modelled.
//! Checked by: `foil_matches_the_published_table`, and `a_thick_foil_is_a_sheet_at_its_depth` in tests/field.

use crate::unit::constants::{COPPER_ALPHA_20C, COPPER_SIGMA_20C, MU0};
use num_complex::Complex64;

/// A foil at a temperature.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Foil {
    thickness_m: f64,
    sigma: f64,
}

impl Foil {
    /// A copper foil of `thickness_m` at `temperature_c` degC.
    pub fn new(thickness_m: f64, temperature_c: f64) -> Self {
        Self { thickness_m, sigma: COPPER_SIGMA_20C / (1.0 + COPPER_ALPHA_20C * (temperature_c - 20.0)) }
    }

    /// Resistance in ohm per square at DC.
    pub fn resistance_ohm(&self) -> f64 {
        1.0 / (self.sigma * self.thickness_m)
    }

    /// Sheet impedance in ohm per square for the total current of both faces.
    pub fn zs_ohm(&self, frequency_hz: f64) -> Complex64 {
        self.resistance_ohm() / self.tanh_ratio(frequency_hz)
    }

    /// Depth in metres below the facing copper face at which a sheet stands for the foil, for a current at
    /// `height_m` over that face: (t/2)/(1 + |lam| h), lam = j w mu0/(2 Zs).
    ///
    /// The field on the two faces gives the sheet law the factor S = (1 + e^{-kt})/2, so to first order in kt the
    /// current of wave number k is e^{-kh} lam/(lam + k) times 1 - (kt/2) k/(lam + k), and k is about 1/h.
    /// Range: within 3.5 % of the thick foil at the peak for t <= 0.35 h (the face alone errs by 7 %, mid-copper by
    /// 14 %). Checked by: `a_thick_foil_is_a_sheet_at_its_depth` in tests/field.
    pub fn current_depth_m(&self, frequency_hz: f64, height_m: f64) -> f64 {
        let decay = std::f64::consts::PI * frequency_hz * MU0 / self.zs_ohm(frequency_hz).norm();
        0.5 * self.thickness_m / (1.0 + decay * height_m)
    }

    /// tanh(z)/z with z = gamma t/2.
    fn tanh_ratio(&self, frequency_hz: f64) -> Complex64 {
        let omega = 2.0 * std::f64::consts::PI * frequency_hz;
        let z = Complex64::new(1.0, 1.0) * ((0.5 * omega * MU0 * self.sigma).sqrt() * 0.5 * self.thickness_m);
        if z.norm() < 1e-2 {
            let z2 = z * z;
            return 1.0 - z2 / 3.0 + z2 * z2 * (2.0 / 15.0) - z2 * z2 * z2 * (17.0 / 315.0);
        }
        // tanh z = (1 - e^{-2z})/(1 + e^{-2z}), which cannot overflow.
        let fade = Complex64::new(libm::cos(2.0 * z.im), -libm::sin(2.0 * z.im)) * libm::exp(-2.0 * z.re);
        (1.0 - fade) / (1.0 + fade) / z
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn foil_matches_the_published_table() {
        // Source: the same formula evaluated in 30 digits; 34.3 um and 68.6 um at 20 degC.
        for (thickness_m, hertz, re, im) in [
            (34.3e-6, 1e3, 0.00050266412, 2.25684954e-08),
            (34.3e-6, 1e7, 0.000522585843, 0.000223132079),
            (34.3e-6, 1e9, 0.00412511238, 0.00412511318),
            (68.6e-6, 1e8, 0.00130436251, 0.00130449475),
        ] {
            let zs = Foil::new(thickness_m, 20.0).zs_ohm(hertz);
            assert!((zs.re / re - 1.0).abs() < 2e-9 && (zs.im / im - 1.0).abs() < 2e-8, "{zs} at {hertz}");
        }
        assert!((Foil::new(34.3e-6, 85.0).resistance_ohm() / 0.000631069669 - 1.0).abs() < 1e-8);
        assert!((Foil::new(35e-6, 20.0).current_depth_m(0.0, 1e-3) - 17.5e-6).abs() < 1e-12);
    }
}
