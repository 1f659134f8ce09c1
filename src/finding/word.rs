//! Quantities and places as findings word them.

use super::Measured;
use crate::geom::Point;

/// A number with two or three significant digits and without trailing zeros beyond the point.
pub fn digits(value: f64) -> String {
    let size = value.abs();
    let places = match size {
        s if s >= 100.0 => 0,
        s if s >= 10.0 => 1,
        s if s >= 0.1 || s == 0.0 => 2,
        _ => 3,
    };
    let text = format!("{value:.places$}");
    if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.').to_owned() } else { text }
}

/// A value with the prefix that suits its size, for example `3.4 nH`.
fn prefixed(value: f64, unit: &str) -> String {
    const PREFIXES: [(f64, &str); 7] =
        [(1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n"), (1e-12, "p"), (1e-15, "f"), (1e-18, "a")];
    let size = value.abs();
    let (factor, prefix) =
        PREFIXES.into_iter().find(|(factor, _)| size >= 0.9995 * factor).unwrap_or(PREFIXES[6]);
    let factor = if size == 0.0 { 1.0 } else { factor };
    format!("{} {}{unit}", digits(value / factor), if size == 0.0 { "" } else { prefix })
}

/// A value of a measure in words: `3.4 nH`, `16.7 mm`, `43 %`.
pub fn quantity(what: Measured, value: f64) -> String {
    match what {
        Measured::ExtraInductance => prefixed(value, "H"),
        Measured::ExtraPath => format!("{} mm", digits(value * 1e3)),
        Measured::Noise => prefixed(value, "V"),
        Measured::Transfer => prefixed(value, "ohm"),
        Measured::ShareDrop | Measured::Stray | Measured::Share => format!("{} %", digits(value * 100.0)),
        Measured::EdgeDensity => digits(value),
    }
}

/// A frequency in words.
pub fn hertz(value_hz: f64) -> String {
    let (factor, unit) = match value_hz {
        v if v >= 1e9 => (1e9, "GHz"),
        v if v >= 1e6 => (1e6, "MHz"),
        v if v >= 1e3 => (1e3, "kHz"),
        _ => (1.0, "Hz"),
    };
    format!("{} {unit}", digits(value_hz / factor))
}

/// A place in millimetres from `origin`, as `x 67.20 mm, y 63.50 mm`.
pub fn place(at: Point, origin: Point) -> String {
    let tidy = |metres: f64| (metres * 1e5).round() / 100.0 + 0.0;
    format!("x {:.2} mm, y {:.2} mm", tidy(at.x - origin.x), tidy(at.y - origin.y))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantities_carry_the_unit_that_suits_them() {
        assert_eq!(quantity(Measured::ExtraInductance, 3.42e-9), "3.42 nH");
        assert_eq!(quantity(Measured::ExtraInductance, 0.0), "0 H");
        assert_eq!(quantity(Measured::ExtraInductance, -2.5e-10), "-250 pH");
        assert_eq!(quantity(Measured::ExtraPath, 16.68e-3), "16.7 mm");
        assert_eq!(quantity(Measured::ShareDrop, 0.431), "43.1 %");
        assert_eq!(quantity(Measured::Noise, 5.2e-7), "520 nV");
        assert_eq!(quantity(Measured::EdgeDensity, 0.2712), "0.27");
        assert_eq!(hertz(1e7), "10 MHz");
        assert_eq!(place(Point::mm(67.2, 63.504), Point::mm(0.0, 1.0)), "x 67.20 mm, y 62.50 mm");
    }
}
