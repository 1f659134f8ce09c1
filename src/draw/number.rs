//! Numbers as text: coordinates for files, quantities for readers.

/// A coordinate with at most `decimals` (0 to 3) decimals, without trailing zeros and without a negative zero.
pub(super) fn push_coordinate(out: &mut String, value: f64, decimals: u32) {
    let scale = 10_i64.pow(decimals.min(3));
    let scaled = (value * scale as f64).round();
    // Nothing on a sheet lies a kilometer away; what is not finite is drawn at the origin rather than breaking the file.
    let scaled = if scaled.is_finite() && scaled.abs() < 1e12 { scaled as i64 } else { 0 };
    if scaled < 0 {
        out.push('-');
    }
    let (whole, mut rest) = (scaled.unsigned_abs() / scale as u64, scaled.unsigned_abs() % scale as u64);
    out.push_str(&whole.to_string());
    if rest != 0 {
        let mut digits = decimals.min(3) as usize;
        while rest % 10 == 0 {
            rest /= 10;
            digits -= 1;
        }
        out.push_str(&format!(".{rest:0digits$}"));
    }
}

/// A coordinate with at most 3 decimals.
pub(super) fn coordinate(value: f64) -> String {
    let mut out = String::new();
    push_coordinate(&mut out, value, 3);
    out
}

/// A value with `digits` significant digits for readers: minus sign U+2212, digits in groups of three from 10 000 on.
pub fn significant(value: f64, digits: usize) -> String {
    if !value.is_finite() {
        return "\u{2013}".to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    // Rounding may carry into a new digit (9.996 -> 10.0), so the exponent is taken after rounding.
    let rounded = format!("{:.*e}", digits.saturating_sub(1), value.abs());
    let exponent: i32 = rounded.split_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0);
    let decimals = (digits as i32 - 1 - exponent).max(0) as usize;
    let magnitude = if exponent >= digits as i32 {
        let unit = libm::pow(10.0, f64::from(exponent + 1 - digits as i32));
        (value.abs() / unit).round() * unit
    } else {
        value.abs()
    };
    let text = grouped(&format!("{magnitude:.decimals$}"));
    if value < 0.0 { format!("\u{2212}{text}") } else { text }
}

/// A number with its whole part in groups of three digits when it has more than four, thin spaces between.
pub fn grouped(text: &str) -> String {
    let (whole, rest) = text.split_once('.').map_or((text, None), |(whole, rest)| (whole, Some(rest)));
    let mut out = String::new();
    for (index, digit) in whole.chars().enumerate() {
        let left = whole.len() - index;
        if whole.len() > 4 && index > 0 && left.is_multiple_of(3) {
            out.push('\u{2009}');
        }
        out.push(digit);
    }
    if let Some(rest) = rest {
        out.push('.');
        out.push_str(rest);
    }
    out
}

/// A value in an SI unit with a prefix from pico to giga and `digits` significant digits, for example `3.20 nH`.
pub fn with_prefix(value: f64, unit: &str, digits: usize) -> String {
    const PREFIXES: [(f64, &str); 8] = [
        (1e9, "G"),
        (1e6, "M"),
        (1e3, "k"),
        (1.0, ""),
        (1e-3, "m"),
        (1e-6, "\u{b5}"),
        (1e-9, "n"),
        (1e-12, "p"),
    ];
    if value == 0.0 || !value.is_finite() {
        return format!("{} {unit}", significant(value, digits));
    }
    // Half a unit of the last digit decides, so that 999.96 kHz becomes 1.00 MHz.
    let size = value.abs() * (1.0 + 0.5 * libm::pow(10.0, -(digits as f64)));
    let last = PREFIXES[PREFIXES.len() - 1];
    let (factor, prefix) = PREFIXES.into_iter().find(|(factor, _)| size >= *factor).unwrap_or(last);
    format!("{}\u{a0}{prefix}{unit}", significant(value / factor, digits))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coordinates_are_short_and_never_negative_zero() {
        let cases = [
            (0.0, "0"),
            (-0.0, "0"),
            (-0.0004, "0"),
            (1.0, "1"),
            (1.5, "1.5"),
            (-1.25, "-1.25"),
            (0.0625, "0.063"),
            (12.3456, "12.346"),
            (-0.001, "-0.001"),
            (100.02, "100.02"),
            (f64::NAN, "0"),
            (f64::INFINITY, "0"),
        ];
        for (value, text) in cases {
            assert_eq!(coordinate(value), text);
        }
    }

    #[test]
    fn readers_get_three_digits() {
        let cases = [
            (0.0, "0"),
            (9.996, "10.0"),
            (-1.234, "\u{2212}1.23"),
            (1234.5, "1230"),
            (123_456.0, "123\u{2009}000"),
            (0.000_123_4, "0.000123"),
        ];
        for (value, text) in cases {
            assert_eq!(significant(value, 3), text, "{value}");
        }
        assert_eq!(with_prefix(999.96e3, "Hz", 3), "1.00\u{a0}MHz");
        assert_eq!(with_prefix(3.2e-9, "H", 3), "3.20\u{a0}nH");
        assert_eq!(with_prefix(-5e-15, "s", 2), "\u{2212}0.0050\u{a0}ps");
    }
}
