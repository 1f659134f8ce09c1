//! Quantities as text: a number and its unit, `0.2mm` or `30 MHz`, to numbers in SI units and back.
//!
//! A bare number is refused, and each way to get a quantity wrong has its own message. Powers of ten are applied to
//! the digits, so `0.1mm` is the number nearest to 1e-4 and not 0.1 times 1e-3.

use std::fmt;

/// What a quantity measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Dimension {
    /// Metres.
    Length,
    /// Hertz.
    Frequency,
    /// Degrees Celsius.
    Temperature,
    /// Ohm.
    Resistance,
    /// Henry.
    Inductance,
    /// Farad.
    Capacitance,
    /// Volt.
    Voltage,
    /// Ampere.
    Current,
    /// Seconds.
    Time,
    /// Bits per second.
    BitRate,
}

use Dimension::{
    BitRate, Capacitance, Current, Frequency, Inductance, Length, Resistance, Temperature, Time, Voltage,
};

/// Unit, what it measures, power of ten, and the factor that is left (1 but for inches).
const UNITS: &[(&str, Dimension, i32, f64)] = &[
    ("um", Length, -6, 1.0),
    ("mm", Length, -3, 1.0),
    ("cm", Length, -2, 1.0),
    ("mil", Length, -6, 25.4),
    ("in", Length, -3, 25.4),
    ("Hz", Frequency, 0, 1.0),
    ("kHz", Frequency, 3, 1.0),
    ("MHz", Frequency, 6, 1.0),
    ("GHz", Frequency, 9, 1.0),
    ("degC", Temperature, 0, 1.0),
    ("°C", Temperature, 0, 1.0),
    ("uohm", Resistance, -6, 1.0),
    ("mohm", Resistance, -3, 1.0),
    ("ohm", Resistance, 0, 1.0),
    ("kohm", Resistance, 3, 1.0),
    ("Mohm", Resistance, 6, 1.0),
    ("pH", Inductance, -12, 1.0),
    ("nH", Inductance, -9, 1.0),
    ("uH", Inductance, -6, 1.0),
    ("mH", Inductance, -3, 1.0),
    ("H", Inductance, 0, 1.0),
    ("fF", Capacitance, -15, 1.0),
    ("pF", Capacitance, -12, 1.0),
    ("nF", Capacitance, -9, 1.0),
    ("uF", Capacitance, -6, 1.0),
    ("mF", Capacitance, -3, 1.0),
    ("F", Capacitance, 0, 1.0),
    ("uV", Voltage, -6, 1.0),
    ("mV", Voltage, -3, 1.0),
    ("V", Voltage, 0, 1.0),
    ("kV", Voltage, 3, 1.0),
    ("nA", Current, -9, 1.0),
    ("uA", Current, -6, 1.0),
    ("mA", Current, -3, 1.0),
    ("A", Current, 0, 1.0),
    ("ps", Time, -12, 1.0),
    ("ns", Time, -9, 1.0),
    ("us", Time, -6, 1.0),
    ("ms", Time, -3, 1.0),
    ("s", Time, 0, 1.0),
    ("bit/s", BitRate, 0, 1.0),
    ("kbit/s", BitRate, 3, 1.0),
    ("Mbit/s", BitRate, 6, 1.0),
    ("Gbit/s", BitRate, 9, 1.0),
];

impl Dimension {
    /// What it measures, in words.
    pub fn name(self) -> &'static str {
        match self {
            Length => "length",
            Frequency => "frequency",
            Temperature => "temperature",
            Resistance => "resistance",
            Inductance => "inductance",
            Capacitance => "capacitance",
            Voltage => "voltage",
            Current => "current",
            Time => "time",
            BitRate => "bit rate",
        }
    }

    /// Units that are understood, as a list in words.
    pub fn units(self) -> String {
        let names: Vec<&str> = UNITS.iter().filter(|unit| unit.1 == self).map(|unit| unit.0).collect();
        names.join(", ")
    }

    fn example(self) -> &'static str {
        match self {
            Length => "0.2mm",
            Frequency => "30MHz",
            Temperature => "20degC",
            Resistance => "50ohm",
            Inductance => "10nH",
            Capacitance => "100nF",
            Voltage => "3.3V",
            Current => "20mA",
            Time => "2ns",
            BitRate => "10Mbit/s",
        }
    }
}

/// Why a text is not a quantity.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum QuantityError {
    /// Nothing there.
    Empty(Dimension),
    /// A number without a unit.
    NoUnit(Dimension, String),
    /// A unit without a number before it.
    NoNumber(Dimension, String),
    /// Digits that are no number.
    BadNumber(String),
    /// A decimal comma.
    Comma(String),
    /// A unit that nobody knows, with the one that was likely meant.
    UnknownUnit(Dimension, String, Option<&'static str>),
    /// A unit of something else.
    WrongUnit(Dimension, String, Dimension),
    /// A number too large to be kept.
    TooLarge(String),
}

impl fmt::Display for QuantityError {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Empty(wanted) => {
                write!(f, "must be a {} such as `{}`; got nothing", wanted.name(), wanted.example())
            }
            Self::NoUnit(wanted, number) => write!(
                f,
                "must be a {} with its unit ({}); got the bare number `{number}`",
                wanted.name(),
                wanted.units()
            ),
            Self::NoNumber(wanted, text) => {
                write!(f, "must start with a number, such as `{}`; got `{text}`", wanted.example())
            }
            Self::BadNumber(text) => write!(f, "must have a decimal number before its unit; got `{text}`"),
            Self::Comma(text) => write!(f, "must have a decimal point, not a comma; got `{text}`"),
            Self::UnknownUnit(wanted, unit, near) => {
                write!(f, "must be in a unit of {} ({}); got `{unit}`", wanted.name(), wanted.units())?;
                near.map_or(Ok(()), |near| write!(f, ", did you mean `{near}`?"))
            }
            Self::WrongUnit(wanted, unit, got) => write!(
                f,
                "must be a {} ({}); got `{unit}`, which measures {}",
                wanted.name(),
                wanted.units(),
                got.name()
            ),
            Self::TooLarge(text) => write!(f, "must be a finite number; got `{text}`"),
        }
    }
}

impl std::error::Error for QuantityError {}

/// Reads a quantity: a decimal number, an optional space and a unit.
///
/// ```
/// use ebbmap::unit::{Dimension, parse_quantity};
/// assert_eq!(parse_quantity("0.2mm", Dimension::Length), Ok(2e-4));
/// assert_eq!(parse_quantity("8 mil", Dimension::Length), Ok(203.2e-6));
/// assert!(parse_quantity("0.2", Dimension::Length).is_err());
/// ```
pub fn parse_quantity(text: &str, wanted: Dimension) -> Result<f64, QuantityError> {
    let text = text.trim();
    if text.is_empty() {
        return Err(QuantityError::Empty(wanted));
    }
    let (number, unit) = split(text);
    let unit = unit.trim_start();
    if number.is_empty() {
        return Err(QuantityError::NoNumber(wanted, text.into()));
    }
    if unit.starts_with(',') && unit[1..].starts_with(|c: char| c.is_ascii_digit()) {
        return Err(QuantityError::Comma(text.into()));
    }
    if unit.is_empty() {
        return Err(QuantityError::NoUnit(wanted, number.into()));
    }
    if unit.starts_with(|c: char| c.is_ascii_digit() || ".+-_,".contains(c)) {
        return Err(QuantityError::BadNumber(text.into()));
    }
    let plain = plain_unit(unit);
    let Some(&(_, dimension, power, factor)) = UNITS.iter().find(|known| known.0 == plain) else {
        let near = nearest_unit(&plain, wanted);
        return Err(QuantityError::UnknownUnit(wanted, unit.into(), near));
    };
    if dimension != wanted {
        return Err(QuantityError::WrongUnit(wanted, unit.into(), dimension));
    }
    let value = scaled(number, power).ok_or_else(|| QuantityError::BadNumber(text.into()))?;
    let value = if factor == 1.0 { value } else { inches(number, power, factor)? };
    if value.is_finite() { Ok(value) } else { Err(QuantityError::TooLarge(text.into())) }
}

/// The digits before the unit and the rest.
fn split(text: &str) -> (&str, &str) {
    let bytes = text.as_bytes();
    let mut at = usize::from(matches!(bytes.first(), Some(b'+' | b'-')));
    let digits_from = at;
    while at < bytes.len() && (bytes[at].is_ascii_digit() || bytes[at] == b'.') {
        at += 1;
    }
    if at == digits_from {
        return ("", text);
    }
    // An exponent only where digits follow.
    if matches!(bytes.get(at), Some(b'e' | b'E')) {
        let mut end = at + 1 + usize::from(matches!(bytes.get(at + 1), Some(b'+' | b'-')));
        let first = end;
        while end < bytes.len() && bytes[end].is_ascii_digit() {
            end += 1;
        }
        if end > first {
            at = end;
        }
    }
    text.split_at(at)
}

/// `number` times ten to `power`, rounded once.
fn scaled(number: &str, power: i32) -> Option<f64> {
    let (digits, exponent) = match number.find(['e', 'E']) {
        Some(at) => (&number[..at], number[at + 1..].parse::<i32>().ok()?),
        None => (number, 0),
    };
    format!("{digits}e{}", exponent.checked_add(power)?).parse().ok()
}

/// A number of inches or mils: 25.4 is exact in decimals, so it goes in before the power of ten.
fn inches(number: &str, power: i32, factor: f64) -> Result<f64, QuantityError> {
    let bad = || QuantityError::BadNumber(number.into());
    let value: f64 = number.parse().map_err(|_| bad())?;
    Ok(value * (factor * 10.0) / libm::exp10(f64::from(1 - power)))
}

/// The unit with its letters as the table writes them.
fn plain_unit(unit: &str) -> String {
    let plain = unit.replace(['\u{b5}', '\u{3bc}'], "u").replace(['\u{2126}', '\u{3a9}'], "ohm");
    match plain.as_str() {
        "inch" | "\"" => "in".into(),
        _ => plain,
    }
}

fn nearest_unit(unit: &str, wanted: Dimension) -> Option<&'static str> {
    let of_wanted = || UNITS.iter().filter(|known| known.1 == wanted);
    of_wanted().find(|known| known.0.eq_ignore_ascii_case(unit)).map(|known| known.0)
}

/// A length in the unit that suits it, for texts: `0.2 mm`, `35 um`.
pub fn length_text(metres: f64) -> String {
    if metres != 0.0 && metres.abs() < 0.0999e-3 {
        format!("{} um", short(metres * 1e6, 1))
    } else {
        format!("{} mm", short(metres * 1e3, 3))
    }
}

/// A value with an SI prefix before `unit`, three significant digits: `2.5 MHz`, `340 kHz`, `0 Hz`.
pub fn quantity_text(value: f64, unit: &str) -> String {
    const PREFIXES: [(f64, &str); 8] =
        [(1e9, "G"), (1e6, "M"), (1e3, "k"), (1.0, ""), (1e-3, "m"), (1e-6, "u"), (1e-9, "n"), (1e-12, "p")];
    let size = value.abs();
    let found = PREFIXES.iter().find(|(step, _)| size >= 0.999_5 * step);
    let (step, prefix) = match found {
        Some(&found) => found,
        None => (1.0, ""),
    };
    let shown = value / step;
    let decimals = if shown.abs() >= 99.95 {
        0
    } else if shown.abs() >= 9.995 {
        1
    } else {
        2
    };
    format!("{} {prefix}{unit}", short(shown, decimals))
}

/// Fixed decimals without trailing zeros.
fn short(value: f64, decimals: usize) -> String {
    let text = format!("{value:.decimals$}");
    let text = if text.contains('.') { text.trim_end_matches('0').trim_end_matches('.') } else { &text };
    if text == "-0" { "0".into() } else { text.into() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn length(text: &str) -> Result<f64, QuantityError> {
        parse_quantity(text, Length)
    }

    #[test]
    fn lengths_are_the_nearest_numbers() {
        assert_eq!(length("0.1mm"), Ok(1e-4));
        assert_eq!(length("35um"), Ok(35e-6));
        assert_eq!(length("35 \u{b5}m"), Ok(35e-6));
        assert_eq!(length("35\u{3bc}m"), Ok(35e-6));
        assert_eq!(length("-147.3mm"), Ok(-0.1473));
        assert_eq!(length("2.5cm"), Ok(0.025));
        assert_eq!(length("1in"), Ok(0.0254));
        assert_eq!(length("1e1mil"), Ok(254e-6));
        assert_eq!(length("1.5e-1mm"), Ok(1.5e-4));
        assert_eq!(parse_quantity("300kHz", Frequency), Ok(3e5));
        assert_eq!(parse_quantity("2.4GHz", Frequency), Ok(2.4e9));
        assert_eq!(parse_quantity("10m\u{3a9}", Resistance), Ok(0.01));
        assert_eq!(parse_quantity("4.7uF", Capacitance), Ok(4.7e-6));
    }

    #[test]
    fn each_mistake_has_its_own_message() {
        use QuantityError as E;
        assert_eq!(length(" "), Err(E::Empty(Length)));
        assert_eq!(length("0.2"), Err(E::NoUnit(Length, "0.2".into())));
        assert_eq!(length("mm"), Err(E::NoNumber(Length, "mm".into())));
        assert_eq!(length("0,2mm"), Err(E::Comma("0,2mm".into())));
        assert_eq!(length("1.2.3mm"), Err(E::BadNumber("1.2.3mm".into())));
        assert_eq!(length("1_000mm"), Err(E::BadNumber("1_000mm".into())));
        assert_eq!(length("2MM"), Err(E::UnknownUnit(Length, "MM".into(), Some("mm"))));
        assert_eq!(length("2MHz"), Err(E::WrongUnit(Length, "MHz".into(), Frequency)));
        assert_eq!(parse_quantity("1mhz", Frequency).unwrap_err().to_string().matches("MHz`?").count(), 1);
        assert!(matches!(length("1e999mm"), Err(E::TooLarge(_))));
        let texts: Vec<String> = ["", "1", "mm", "0,2mm", "1..mm", "2MM", "2V"]
            .iter()
            .map(|t| length(t).unwrap_err().to_string())
            .collect();
        for (index, text) in texts.iter().enumerate() {
            assert!(text.starts_with("must "), "{text}");
            assert!(!texts[..index].contains(text), "{text}");
        }
    }

    #[test]
    fn texts_are_short() {
        assert_eq!(length_text(35e-6), "35 um");
        assert_eq!(length_text(1e-4), "0.1 mm");
        assert_eq!(length_text(0.0), "0 mm");
        assert_eq!(quantity_text(1e6, "Hz"), "1 MHz");
        assert_eq!(quantity_text(948_683.3, "Hz"), "949 kHz");
        assert_eq!(quantity_text(0.0, "Hz"), "0 Hz");
        assert_eq!(quantity_text(999_999.0, "Hz"), "1 MHz");
    }
}
