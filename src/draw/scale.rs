//! The one absolute scale of a set of maps: level in dB over the density under a straight thin track.
//!
//! 0 dB is K0 = 1/(pi h), h the smallest height of the set in meters: the peak of the closed-form density of a thin
//! track over an endless plane (textbook image result). It depends on inputs only, never on a result.

use crate::style::Gradient;

/// Scale of a set of maps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DensityScale {
    /// Smallest height of the set in meters.
    pub height_m: f64,
    /// Range below 0 dB in dB.
    pub range_db: f64,
}

impl DensityScale {
    /// Density at 0 dB in A/m per A.
    pub fn anchor(&self) -> f64 {
        1.0 / (std::f64::consts::PI * self.height_m)
    }

    /// Level of a density in dB; at least 20 dB below the range for densities of zero.
    pub fn level_db(&self, density: f64) -> f64 {
        let ratio = density / self.anchor();
        let floor = -self.range_db - 20.0;
        if ratio > 0.0 { (20.0 * libm::log10(ratio)).max(floor) } else { floor }
    }

    /// Density in A/m per A at a level in dB.
    pub fn density(&self, level_db: f64) -> f64 {
        self.anchor() * libm::pow(10.0, level_db / 20.0)
    }

    /// Place of a level on the scale, 0 at its lower and 1 at its upper end; values outside are possible.
    pub fn place(&self, level_db: f64) -> f64 {
        1.0 + level_db / self.range_db
    }

    /// Index of the color of a level: 0 to 254, or 255 above the scale. Half a step above 0 dB still counts as 0 dB.
    pub fn color_index(&self, level_db: f64) -> u8 {
        let steps = (Gradient::LEVELS - 1) as f64;
        let index = (self.place(level_db) * steps).round();
        if index > steps { Gradient::LEVELS as u8 } else { index.max(0.0) as u8 }
    }

    /// Densities for ticks, 1, 2 and 5 in each decade (or decades alone), lowest first.
    pub fn ticks(&self, decades_only: bool) -> Vec<f64> {
        let (low, high) = (self.density(-self.range_db), self.anchor());
        let factors: &[f64] = if decades_only { &[1.0] } else { &[1.0, 2.0, 5.0] };
        let first = libm::floor(libm::log10(low)) as i32;
        let last = libm::ceil(libm::log10(high)) as i32;
        let all = (first..=last).flat_map(|n| factors.iter().map(move |f| f * libm::pow(10.0, f64::from(n))));
        all.filter(|&value| value >= low * 0.999 && value <= high * 1.001).collect()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SCALE: DensityScale = DensityScale { height_m: 0.4e-3, range_db: 60.0 };

    /// 1/(pi 0.4 mm) = 795.77 per meter; the ends of the range are a factor of 1000 apart.
    #[test]
    fn anchor_levels_and_colors() {
        assert!((SCALE.anchor() - 795.774_715).abs() < 1e-5);
        assert!((SCALE.density(-60.0) - 0.795_774_715).abs() < 1e-8);
        assert_eq!(SCALE.color_index(0.0), 254);
        assert_eq!(SCALE.color_index(0.1), 254);
        assert_eq!(SCALE.color_index(0.2), 255);
        assert_eq!(SCALE.color_index(-60.0), 0);
        assert_eq!(SCALE.color_index(SCALE.level_db(0.0)), 0);
        assert_eq!(SCALE.color_index(-30.0), 127);
        let ticks = SCALE.ticks(false);
        assert_eq!(ticks.len(), 9);
        assert!((ticks[0] - 1.0).abs() < 1e-12 && (ticks[8] - 500.0).abs() < 1e-9);
    }
}
