//! An sRGB color with the measures that the style rules need: contrast, lightness, difference.
//!
//! Sources: WCAG 2.2, definitions of relative luminance and contrast ratio; CIE 1976 L*a*b* for the white point D65
//! (IEC 61966-2-1 for the sRGB primaries).

/// A color, 8 bits each of red, green and blue in sRGB.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Rgb(pub u8, pub u8, pub u8);

/// A color in CIE 1976 L*a*b*, white point D65.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Lab {
    /// Lightness, 0 to 100.
    pub l: f64,
    /// Green to red.
    pub a: f64,
    /// Blue to yellow.
    pub b: f64,
}

impl Rgb {
    /// A color from `#RRGGBB`.
    pub fn parse(text: &str) -> Option<Self> {
        let digits = text.strip_prefix('#')?;
        if digits.len() != 6 || !digits.bytes().all(|byte| byte.is_ascii_hexdigit()) {
            return None;
        }
        let part = |at: usize| u8::from_str_radix(&digits[at..at + 2], 16).ok();
        Some(Self(part(0)?, part(2)?, part(4)?))
    }

    /// The color as `#RRGGBB`.
    pub fn hex(self) -> String {
        format!("#{:02X}{:02X}{:02X}", self.0, self.1, self.2)
    }

    /// Red, green and blue as linear light, 0 to 1.
    pub fn linear(self) -> [f64; 3] {
        [self.0, self.1, self.2].map(|byte| {
            let value = f64::from(byte) / 255.0;
            if value <= 0.04045 { value / 12.92 } else { libm::pow((value + 0.055) / 1.055, 2.4) }
        })
    }

    /// The nearest color of linear red, green and blue, each cut to 0 to 1.
    pub fn from_linear(linear: [f64; 3]) -> Self {
        let [r, g, b] = linear.map(|value| {
            let value = value.clamp(0.0, 1.0);
            let coded = if value <= 0.003_130_8 {
                12.92 * value
            } else {
                1.055 * libm::pow(value, 1.0 / 2.4) - 0.055
            };
            (coded * 255.0).round() as u8
        });
        Self(r, g, b)
    }

    /// Relative luminance, 0 to 1.
    pub fn luminance(self) -> f64 {
        let [r, g, b] = self.linear();
        0.2126 * r + 0.7152 * g + 0.0722 * b
    }

    /// Contrast ratio with `other`, 1 to 21.
    pub fn contrast(self, other: Self) -> f64 {
        let (a, b) = (self.luminance() + 0.05, other.luminance() + 0.05);
        if a > b { a / b } else { b / a }
    }

    /// The color in L*a*b*.
    pub fn lab(self) -> Lab {
        let [r, g, b] = self.linear();
        let x = (0.412_456_4 * r + 0.357_576_1 * g + 0.180_437_5 * b) / 0.950_47;
        let y = 0.212_672_9 * r + 0.715_152_2 * g + 0.072_175_0 * b;
        let z = (0.019_333_9 * r + 0.119_192_0 * g + 0.950_304_1 * b) / 1.088_83;
        let f = |t: f64| {
            if t > 216.0 / 24389.0 { libm::cbrt(t) } else { (24389.0 / 27.0 * t + 16.0) / 116.0 }
        };
        let (fx, fy, fz) = (f(x), f(y), f(z));
        Lab { l: 116.0 * fy - 16.0, a: 500.0 * (fx - fy), b: 200.0 * (fy - fz) }
    }

    /// CIE 1976 color difference.
    pub fn difference(self, other: Self) -> f64 {
        let (p, q) = (self.lab(), other.lab());
        let squares = [p.l - q.l, p.a - q.a, p.b - q.b].map(|d| d * d);
        libm::sqrt(squares.iter().sum())
    }

    /// Of two inks the one with the higher contrast on this ground.
    pub fn ink_of(self, first: Self, second: Self) -> Self {
        if self.contrast(first) >= self.contrast(second) { first } else { second }
    }

    /// The color that results from painting `over` with opacity 0 to 1 on this one.
    pub fn mixed(self, over: Self, opacity: f64) -> Self {
        let mix = |a: u8, b: u8| (f64::from(a) + (f64::from(b) - f64::from(a)) * opacity).round() as u8;
        Self(mix(self.0, over.0), mix(self.1, over.1), mix(self.2, over.2))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const WHITE: Rgb = Rgb(255, 255, 255);
    const BLACK: Rgb = Rgb(0, 0, 0);

    #[test]
    fn hex_round_trip_and_bad_colors() {
        assert_eq!(Rgb::parse("#0B5C8A"), Some(Rgb(0x0b, 0x5c, 0x8a)));
        assert_eq!(Rgb(0x0b, 0x5c, 0x8a).hex(), "#0B5C8A");
        for bad in ["0B5C8A", "#0B5C8", "#0B5C8AA", "#0B5C8G", "#€00", ""] {
            assert_eq!(Rgb::parse(bad), None, "{bad}");
        }
    }

    /// The ends of the WCAG scale are 1 and 21; #777777 on white is 4.48 and #767676 is 4.54, the gray on either side of
    /// the 4.5 limit (common practice, quoted by many accessibility guides).
    #[test]
    fn contrast_has_its_known_values() {
        assert!((WHITE.contrast(BLACK) - 21.0).abs() < 1e-12);
        assert!((WHITE.contrast(WHITE) - 1.0).abs() < 1e-12);
        assert!((WHITE.contrast(Rgb(0x77, 0x77, 0x77)) - 4.48).abs() < 0.005);
        assert!((WHITE.contrast(Rgb(0x76, 0x76, 0x76)) - 4.54).abs() < 0.005);
    }

    /// L*a*b* of the sRGB primaries under D65: red (53.24, 80.09, 67.20), blue (32.30, 79.19, -107.86), from the
    /// standard matrices (values from memory, widely tabulated).
    #[test]
    fn lab_has_its_known_values() {
        let near = |lab: Lab, l: f64, a: f64, b: f64| {
            assert!(
                (lab.l - l).abs() < 0.02 && (lab.a - a).abs() < 0.03 && (lab.b - b).abs() < 0.03,
                "{lab:?}"
            );
        };
        near(Rgb(255, 0, 0).lab(), 53.24, 80.09, 67.20);
        near(Rgb(0, 0, 255).lab(), 32.30, 79.19, -107.86);
        assert!((WHITE.lab().l - 100.0).abs() < 1e-3);
    }
}
