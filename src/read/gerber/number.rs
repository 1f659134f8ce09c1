//! Numbers of Gerber files: coordinates in the format of the file, decimals in apertures and macros.

use crate::geom::Point;

/// Coordinates must stay within this distance of the origin, in nanometres.
const FARTHEST_NM: f64 = 1e9;

/// The coordinate format that a file states.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Format {
    /// Whether trailing zeros are left out (leading ones otherwise).
    pub trailing_omitted: bool,
    /// Digits before and after the point, for X and I.
    pub x: (u32, u32),
    /// The same for Y and J.
    pub y: (u32, u32),
}

impl Format {
    /// Reads what follows `FS`, for example `LAX46Y46`.
    pub fn parse(text: &str) -> Result<Self, String> {
        let wrong = || format!("format `{text}` must read like `LAX46Y46`");
        let trailing_omitted = match text.chars().next() {
            Some('L') => false,
            Some('T') => true,
            Some('D') => return Err("format with explicit points (`D`) is not supported".to_owned()),
            _ => return Err(wrong()),
        };
        match text.chars().nth(1) {
            Some('A') => {}
            Some('I') => return Err("incremental coordinates (`I`) are not supported".to_owned()),
            _ => return Err(wrong()),
        }
        let digits = |letter: char| -> Option<(u32, u32)> {
            let at = text.find(letter)?;
            let mut digits = text[at + 1..].chars();
            let pair = (digits.next()?.to_digit(10)?, digits.next()?.to_digit(10)?);
            (pair.0 <= 6 && pair.1 <= 7).then_some(pair)
        };
        match (digits('X'), digits('Y')) {
            (Some(x), Some(y)) => Ok(Self { trailing_omitted, x, y }),
            _ => Err(wrong()),
        }
    }
}

/// A coordinate in nanometres, rounded to whole ones. `unit_nm` is the length of the file's unit.
pub fn coordinate(
    text: &str,
    format: (u32, u32),
    trailing_omitted: bool,
    unit_nm: f64,
) -> Result<f64, String> {
    let wrong = || format!("coordinate `{text}` must be a sign and digits");
    let (sign, digits) = match text.as_bytes().first() {
        Some(b'-') => (-1.0, &text[1..]),
        Some(b'+') => (1.0, &text[1..]),
        _ => (1.0, text),
    };
    if digits.is_empty() || digits.len() > 15 || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return Err(wrong());
    }
    let mut value: f64 = digits.parse::<u64>().map_err(|_| wrong())? as f64;
    if trailing_omitted {
        let all = (format.0 + format.1) as usize;
        if digits.len() > all {
            return Err(format!("coordinate `{text}` must have at most {all} digits"));
        }
        value *= 10f64.powi((all - digits.len()) as i32);
    }
    let nm = (sign * value * unit_nm / 10f64.powi(format.1 as i32)).round();
    if nm.abs() > FARTHEST_NM {
        return Err(format!("coordinate `{text}` must lie within 1 m of the origin; got {} mm", nm * 1e-6));
    }
    Ok(nm)
}

/// A plain decimal number.
pub fn decimal(text: &str) -> Option<f64> {
    let text = text.trim();
    let body = text.strip_prefix(['+', '-']).unwrap_or(text);
    let plain =
        body.bytes().all(|b| b.is_ascii_digit() || b == b'.') && body.bytes().any(|b| b.is_ascii_digit());
    let value: f64 = text.parse().ok().filter(|_| plain)?;
    (value.abs() < 1e6).then_some(value)
}

/// Cosine and sine of an angle in degrees, exact for quarter turns.
pub fn turn(degrees: f64) -> (f64, f64) {
    match degrees.rem_euclid(360.0) {
        0.0 => (1.0, 0.0),
        90.0 => (0.0, 1.0),
        180.0 => (-1.0, 0.0),
        270.0 => (0.0, -1.0),
        angle => (libm::cos(angle.to_radians()), libm::sin(angle.to_radians())),
    }
}

/// `point` turned counter-clockwise round the origin; `by` from [`turn`].
pub fn turned(point: Point, by: (f64, f64)) -> Point {
    Point::new(point.x * by.0 - point.y * by.1, point.x * by.1 + point.y * by.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coordinates_follow_the_stated_format() {
        assert_eq!(coordinate("-1500000", (4, 6), false, 1e6), Ok(-1.5e6));
        assert_eq!(coordinate("+5", (2, 4), false, 25.4e6), Ok(12_700.0));
        assert_eq!(coordinate("015", (3, 3), true, 1e6), Ok(15e6));
        for bad in ["", "+", "1.5", "1-2", "1234567890123456", "\u{3a9}"] {
            assert!(coordinate(bad, (4, 6), false, 1e6).is_err(), "{bad}");
        }
        assert!(coordinate("9999999999", (4, 6), false, 1e6).is_err());
    }

    #[test]
    fn formats_and_decimals_are_strict() {
        assert_eq!(Format::parse("LAX24Y35").unwrap().y, (3, 5));
        for bad in ["", "LA", "LIX24Y24", "AX24Y24", "LAX2Y24", "LAX99Y99"] {
            assert!(Format::parse(bad).is_err(), "{bad}");
        }
        assert_eq!((decimal("-.5"), decimal("+1.")), (Some(-0.5), Some(1.0)));
        for bad in ["", ".", "1e3", "NaN", "inf", "--1", "1.2.3"] {
            assert_eq!(decimal(bad), None, "{bad}");
        }
    }
}
