//! OKLab: a space in which equal steps look equal, for gradients from stops and for two hues of one lightness.
//!
//! Source: B. Ottosson, A perceptual color space for image processing, 2020 (matrices from memory; the test checks them
//! against the white point and against its own inverse).

use super::Rgb;

/// Lightness (0 to 1), green to red, blue to yellow.
pub type Oklab = [f64; 3];

/// A color in OKLab.
pub fn to_oklab(color: Rgb) -> Oklab {
    let [r, g, b] = color.linear();
    let l = libm::cbrt(0.412_221_470_8 * r + 0.536_332_536_3 * g + 0.051_445_992_9 * b);
    let m = libm::cbrt(0.211_903_498_2 * r + 0.680_699_545_1 * g + 0.107_396_956_6 * b);
    let s = libm::cbrt(0.088_302_461_9 * r + 0.281_718_837_6 * g + 0.629_978_700_5 * b);
    [
        0.210_454_255_3 * l + 0.793_617_785_0 * m - 0.004_072_046_8 * s,
        1.977_998_495_1 * l - 2.428_592_205_0 * m + 0.450_593_709_9 * s,
        0.025_904_037_1 * l + 0.782_771_766_2 * m - 0.808_675_766_0 * s,
    ]
}

/// Linear red, green and blue of a color in OKLab; outside 0 to 1 where sRGB does not have it.
fn linear([light, a, b]: Oklab) -> [f64; 3] {
    let cube = |x: f64| x * x * x;
    let l = cube(light + 0.396_337_777_4 * a + 0.215_803_757_3 * b);
    let m = cube(light - 0.105_561_345_8 * a - 0.063_854_172_8 * b);
    let s = cube(light - 0.089_484_177_5 * a - 1.291_485_548_0 * b);
    [
        4.076_741_662_1 * l - 3.307_711_591_3 * m + 0.230_969_929_2 * s,
        -1.268_438_004_6 * l + 2.609_757_401_1 * m - 0.341_319_396_5 * s,
        -0.004_196_086_3 * l - 0.703_418_614_7 * m + 1.707_614_701_0 * s,
    ]
}

/// A color from OKLab, cut to what sRGB has.
pub fn from_oklab(lab: Oklab) -> Rgb {
    Rgb::from_linear(linear(lab))
}

/// Whether sRGB has the color.
fn in_gamut(lab: Oklab) -> bool {
    linear(lab).iter().all(|value| (-1e-4..=1.0001).contains(value))
}

/// A color of lightness `light` and hue `hue_deg` with chroma `chroma`, or as much of it as sRGB has.
pub fn from_oklch(light: f64, chroma: f64, hue_deg: f64) -> Rgb {
    let (sin, cos) = libm::sincos(hue_deg.to_radians());
    let lab = |chroma: f64| [light, chroma * cos, chroma * sin];
    let (mut low, mut high) = (0.0, chroma);
    if in_gamut(lab(high)) {
        low = high;
    }
    for _ in 0..24 {
        let middle = 0.5 * (low + high);
        if in_gamut(lab(middle)) { low = middle } else { high = middle }
    }
    from_oklab(lab(low))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn white_is_neutral_and_colors_come_back() {
        let [l, a, b] = to_oklab(Rgb(255, 255, 255));
        assert!((l - 1.0).abs() < 1e-6 && a.abs() < 1e-6 && b.abs() < 1e-6);
        for color in [Rgb(0, 0, 0), Rgb(12, 200, 77), Rgb(255, 0, 0), Rgb(30, 30, 250)] {
            assert_eq!(from_oklab(to_oklab(color)), color);
        }
        // Lightness stays where chroma is cut.
        let [l, ..] = to_oklab(from_oklch(0.5, 0.4, 255.0));
        assert!((l - 0.5).abs() < 0.01, "{l}");
    }
}
