//! Quantities and names as the pictures word them.

use crate::draw::{grouped, raised, significant};
use crate::review::Band;

/// A share as a whole percentage, for example `63 %`.
pub(super) fn percent(share: f64) -> String {
    let value = (share * 100.0).round();
    let text = format!("{:.0}", value.abs());
    if value < 0.0 { format!("\u{2212}{text}\u{a0}%") } else { format!("{text}\u{a0}%") }
}

/// A length in millimeters with three significant digits.
pub(super) fn millimeters(meters: f64) -> String {
    format!("{}\u{a0}mm", significant(meters * 1e3, 3))
}

/// A length that was given or chosen, in millimeters without needless zeros.
pub(super) fn given_millimeters(meters: f64) -> String {
    format!("{}\u{a0}mm", bare(meters * 1e3))
}

/// A frequency without needless zeros, for example `10 MHz`.
pub(super) fn hertz(value_hz: f64) -> String {
    let (factor, unit) = match value_hz {
        v if v >= 1e9 => (1e9, "GHz"),
        v if v >= 1e6 => (1e6, "MHz"),
        v if v >= 1e3 => (1e3, "kHz"),
        _ => (1.0, "Hz"),
    };
    format!("{}\u{a0}{unit}", bare(value_hz / factor))
}

/// A number with at most four significant digits and without trailing zeros.
fn bare(value: f64) -> String {
    let text = format!("{value:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    grouped(text)
}

/// A band with its limits, for example `HF, 3 to 30 MHz`; ITU Radio Regulations, article 2: band N is 0.3 to 3 times
/// 10^N Hz.
pub(super) fn band_range(band: &Band) -> String {
    let (from, to) = (band.from_hz, band.to_hz);
    if to <= 0.0 {
        return "0 Hz".to_owned();
    }
    let (factor, unit) = match from.max(1.0) {
        v if v >= 1e9 => (1e9, "GHz"),
        v if v >= 1e6 => (1e6, "MHz"),
        v if v >= 1e3 => (1e3, "kHz"),
        _ if to >= 1e6 => (1e6, "MHz"),
        _ if to >= 1e3 => (1e3, "kHz"),
        _ => (1.0, "Hz"),
    };
    format!("{} to {} {unit}", bare(from / factor), bare(to / factor))
}

/// A small number as a power of ten, for example 3.5 x 10^-7, with a raised exponent.
pub(super) fn power_of_ten(value: f64) -> String {
    let text = format!("{value:.1e}");
    let (mantissa, exponent) = text.split_once('e').unwrap_or((&text, "0"));
    format!("{mantissa} \u{d7} 10{}", raised(&exponent.replace('-', "\u{2212}")))
}

/// Whether a name hints at a circuit that can hurt someone: mains, medical, safety.
pub(super) fn hints_at_hazard(name: &str) -> bool {
    const HINTS: [&str; 20] = [
        "mains",
        "live",
        "neutral",
        "hv",
        "hvdc",
        "ac230",
        "ac115",
        "100v",
        "110v",
        "115v",
        "120v",
        "230v",
        "240v",
        "400v",
        "patient",
        "medical",
        "safety",
        "estop",
        "interlock",
        "isolated",
    ];
    let lower = name.to_lowercase();
    lower.split(|c: char| !c.is_alphanumeric()).any(|word| HINTS.contains(&word))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn quantities_in_words() {
        assert_eq!(percent(0.634), "63\u{a0}%");
        assert_eq!(percent(-0.02), "\u{2212}2\u{a0}%");
        assert_eq!(hertz(1e7), "10\u{a0}MHz");
        assert_eq!(hertz(1.5e5), "150\u{a0}kHz");
        assert_eq!(hertz(0.0), "0\u{a0}Hz");
        let band = |from_hz, to_hz| Band { from_hz, to_hz, ..Band::default() };
        assert_eq!(band_range(&band(3e6, 3e7)), "3 to 30 MHz");
        assert_eq!(band_range(&band(3e5, 3e6)), "300 to 3000 kHz");
        assert_eq!(band_range(&band(0.0, 0.0)), "0 Hz");
        assert_eq!(power_of_ten(3.5e-7), "3.5 \u{d7} 10\u{12}\u{2212}7\u{12}");
        assert!(hints_at_hazard("MAINS_L") && hints_at_hazard("AC-230V") && !hints_at_hazard("DELIVER"));
    }
}
