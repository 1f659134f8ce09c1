//! The one absolute scale of a set of maps: level in dB over the density under a straight thin track.
//!
//! 0 dB is K0 = 1/(pi h), h the smallest height of the set in meters: the peak of the closed-form density of a thin
//! track over an endless plane (textbook image result). It depends on inputs only, never on a result. The range is the
//! style's, or what the user asks for ([`ScaleChoice`]); a linear scale runs from 0 A/m.

use crate::style::Gradient;

/// What the user asks for.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub enum ScaleChoice {
    /// The style's range below 0 dB.
    #[default]
    OfStyle,
    /// From a level to a lower one in dB.
    Levels {
        /// Upper end.
        high_db: f64,
        /// Lower end.
        low_db: f64,
    },
    /// Between two densities in A/m per A; linear when the lower one is zero.
    Densities {
        /// Lower end.
        low: f64,
        /// Upper end.
        high: f64,
    },
}

impl ScaleChoice {
    /// Reads `0..-60dB`, `1..1000A/m` or, for a linear scale, `0..500A/m`. The error says what was expected.
    pub fn parse(text: &str) -> Result<Self, String> {
        let expected = || {
            format!(
                "scale must be two levels as `0..-60dB`, two densities as `1..1000A/m`, or `0..500A/m` for a linear \
                 scale; got `{text}`"
            )
        };
        let compact: String = text.chars().filter(|c| !c.is_whitespace()).collect();
        let (range, levels) = match (compact.strip_suffix("dB"), compact.strip_suffix("A/m")) {
            (Some(range), _) => (range, true),
            (_, Some(range)) => (range, false),
            _ => return Err(expected()),
        };
        let (a, b) = range.split_once("..").ok_or_else(expected)?;
        let number =
            |text: &str| text.parse::<f64>().ok().filter(|value| value.is_finite()).ok_or_else(expected);
        let (a, b) = (number(a)?, number(b)?);
        let (low, high) = (a.min(b), a.max(b));
        if levels {
            if !(5.0..=200.0).contains(&(high - low)) || high.abs() > 200.0 {
                return Err(format!(
                    "scale must span 5 dB to 200 dB within 200 dB of the anchor; got `{text}`"
                ));
            }
            return Ok(Self::Levels { high_db: high, low_db: low });
        }
        if low < 0.0 || high <= 0.0 || (low > 0.0 && high / low < 1.7) || high > 1e9 {
            return Err(format!(
                "scale must run from 0 A/m or more to at least 1.7 times that, at most 1e9 A/m; got `{text}`"
            ));
        }
        Ok(Self::Densities { low, high })
    }
}

/// Scale of a set of maps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct DensityScale {
    /// Smallest height of the set in meters.
    pub height_m: f64,
    /// Level at the upper end in dB.
    pub top_db: f64,
    /// Range below the upper end in dB; of a linear scale the part that is labeled.
    pub range_db: f64,
    /// Whether color follows the density instead of its level.
    pub linear: bool,
}

impl DensityScale {
    /// The scale from 0 dB down to `-range_db`.
    pub const fn new(height_m: f64, range_db: f64) -> Self {
        Self { height_m, top_db: 0.0, range_db, linear: false }
    }

    /// The scale that was asked for, else that of the style with its range.
    pub fn chosen(height_m: f64, style_range_db: f64, choice: ScaleChoice) -> Self {
        let plain = Self::new(height_m, style_range_db);
        match choice {
            ScaleChoice::OfStyle => plain,
            ScaleChoice::Levels { high_db, low_db } => {
                Self { top_db: high_db, range_db: high_db - low_db, ..plain }
            }
            ScaleChoice::Densities { low, high } => {
                let top_db = 20.0 * libm::log10(high / plain.anchor());
                if low > 0.0 {
                    Self { top_db, range_db: 20.0 * libm::log10(high / low), ..plain }
                } else {
                    Self { top_db, range_db: 60.0, linear: true, ..plain }
                }
            }
        }
    }

    /// Density at 0 dB in A/m per A.
    pub fn anchor(&self) -> f64 {
        1.0 / (std::f64::consts::PI * self.height_m)
    }

    /// Level at the upper end in dB.
    pub fn high_db(&self) -> f64 {
        self.top_db
    }

    /// Level at the lower end in dB; of a linear scale, which ends at no level, 60 dB below the upper end.
    pub fn low_db(&self) -> f64 {
        self.top_db - self.range_db
    }

    /// Level of a density in dB; at least 20 dB below the range for densities of zero.
    pub fn level_db(&self, density: f64) -> f64 {
        let ratio = density / self.anchor();
        let floor = self.low_db().min(0.0) - 20.0;
        if ratio > 0.0 { (20.0 * libm::log10(ratio)).max(floor) } else { floor }
    }

    /// Density in A/m per A at a level in dB.
    pub fn density(&self, level_db: f64) -> f64 {
        self.anchor() * libm::pow(10.0, level_db / 20.0)
    }

    /// Place of a level on the scale, 0 at its lower and 1 at its upper end; values outside are possible.
    pub fn place(&self, level_db: f64) -> f64 {
        let below = level_db - self.top_db;
        if self.linear { libm::pow(10.0, below / 20.0) } else { 1.0 + below / self.range_db }
    }

    /// Index of the color of a level: 0 to 254, or 255 above the scale. Half a step above the upper end still counts
    /// as its end.
    pub fn color_index(&self, level_db: f64) -> u8 {
        let steps = (Gradient::LEVELS - 1) as f64;
        let index = (self.place(level_db) * steps).round();
        if index > steps { Gradient::LEVELS as u8 } else { index.max(0.0) as u8 }
    }

    /// Densities for ticks, lowest first: 1, 2 and 5 in each decade (or decades alone), five even steps when linear.
    pub fn ticks(&self, decades_only: bool) -> Vec<f64> {
        let (low, high) = (self.density(self.low_db()), self.density(self.top_db));
        if self.linear {
            let step = super::frame::round_step(high / if decades_only { 3.0 } else { 6.0 });
            let count = (high / step * (1.0 + 1e-9)) as usize;
            return (0..=count).map(|n| n as f64 * step).collect();
        }
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

    const SCALE: DensityScale = DensityScale::new(0.4e-3, 60.0);

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

    #[test]
    fn choices_are_read_and_refused() {
        let levels = |high_db, low_db| Ok(ScaleChoice::Levels { high_db, low_db });
        assert_eq!(ScaleChoice::parse("0..-60dB"), levels(0.0, -60.0));
        assert_eq!(ScaleChoice::parse("-70 .. -10 dB"), levels(-10.0, -70.0));
        assert_eq!(ScaleChoice::parse("1..1000A/m"), Ok(ScaleChoice::Densities { low: 1.0, high: 1000.0 }));
        for bad in ["", "0..-60", "0-60dB", "0..xdB", "0..0dB", "5..5A/m", "-1..5A/m", "0..0A/m", "1..infA/m"]
        {
            assert!(ScaleChoice::parse(bad).is_err(), "{bad}");
        }
    }

    /// The same number has the same color in every picture of a set; what lies above the scale has its own.
    #[test]
    fn chosen_ends_are_the_ends_of_the_colors() {
        let of = |text| DensityScale::chosen(0.4e-3, 60.0, ScaleChoice::parse(text).unwrap_or_default());
        let scale = of("1..1000A/m");
        assert_eq!(scale.color_index(scale.level_db(1.0)), 0);
        assert_eq!(scale.color_index(scale.level_db(1000.0)), 254);
        assert_eq!(scale.color_index(scale.level_db(1100.0)), 255);
        assert_eq!(scale.color_index(scale.level_db(31.622_776_6)), 127);
        let linear = of("0..500A/m");
        assert!(linear.linear);
        assert_eq!(linear.color_index(linear.level_db(250.0)), 127);
        assert_eq!(linear.color_index(linear.level_db(0.0)), 0);
        assert_eq!(linear.color_index(linear.level_db(501.5)), 255);
        let ticks: Vec<i64> = linear.ticks(false).iter().map(|tick| tick.round() as i64).collect();
        assert_eq!(ticks, [0, 100, 200, 300, 400, 500]);
    }
}
