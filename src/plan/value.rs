//! Values of parts that join copper: from the review, the files, or stated defaults.
//!
//! What a part is follows from the letters of its reference (IEC 60617 class letters as common practice uses them:
//! C capacitor, L inductor, FB bead, R resistor, LK link). Defaults are common practice for small parts of surface
//! technology: capacitor 100 nF with 20 mohm and 0.5 nH, bead 0.1 ohm and 1 uH, inductor 10 uH with 0.1 ohm, link
//! 1 mohm and 0.5 nH. A bead's value such as `600R` counts as its impedance at 100 MHz, as data sheets give it.

use crate::review::joint::Branch;

/// Frequency at which data sheets give the impedance of a bead, in Hz.
const BEAD_HZ: f64 = 100e6;

/// What a part is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Class {
    /// Capacitor.
    Capacitor,
    /// Bead.
    Bead,
    /// Inductor.
    Inductor,
    /// Resistor.
    Resistor,
    /// Link, wire bridge.
    Link,
    /// Anything else: joins nothing unless the review says so.
    Other,
}

/// Values of a part and what was assumed of them.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Values {
    /// Series resistance in ohm.
    pub resistance_ohm: f64,
    /// Series inductance in henry.
    pub inductance_h: f64,
    /// Series capacitance in farad.
    pub capacitance_f: Option<f64>,
    /// Whether the main value (capacitance of a capacitor, inductance of a bead) is a default.
    pub assumed: bool,
}

impl Class {
    /// The class of a reference.
    pub fn of(reference: &str) -> Self {
        let letters: String = reference.chars().take_while(char::is_ascii_alphabetic).collect();
        match letters.to_ascii_uppercase().as_str() {
            "C" => Self::Capacitor,
            "FB" | "BD" | "FL" => Self::Bead,
            "L" => Self::Inductor,
            "R" => Self::Resistor,
            "LK" | "LNK" => Self::Link,
            _ => Self::Other,
        }
    }

    /// Its name in texts, of several.
    pub fn plural(self) -> &'static str {
        match self {
            Self::Capacitor => "capacitors",
            Self::Bead => "beads",
            Self::Inductor => "inductors",
            Self::Resistor => "resistors",
            Self::Link => "links",
            Self::Other => "parts",
        }
    }

    /// Its default values in words.
    pub fn defaults(self) -> &'static str {
        match self {
            Self::Capacitor => "100 nF",
            Self::Bead => "0.1 ohm and 1 uH",
            Self::Inductor => "10 uH",
            Self::Resistor => "links of 1 mohm",
            Self::Link => "1 mohm",
            Self::Other => "1 mohm",
        }
    }

    /// The values of a part: what the review gives, then what the value of the files says, then the defaults. None
    /// where nothing tells what a resistor between other than two reference nets is.
    pub fn values(self, review: Branch, file: Option<&str>, between_references: bool) -> Option<Values> {
        let own = file.and_then(|text| self.parsed(text)).unwrap_or_default();
        let given = Branch {
            resistance_ohm: review.resistance_ohm.or(own.resistance_ohm),
            inductance_h: review.inductance_h.or(own.inductance_h),
            capacitance_f: review.capacitance_f.or(own.capacitance_f),
        };
        let from_review = review != Branch::default();
        let values = |resistance_ohm: f64, inductance_h: f64, assumed: bool| Values {
            resistance_ohm: given.resistance_ohm.unwrap_or(resistance_ohm),
            inductance_h: given.inductance_h.unwrap_or(inductance_h),
            capacitance_f: given.capacitance_f,
            assumed,
        };
        Some(match self {
            Self::Capacitor => {
                let missing = given.capacitance_f.is_none();
                Values {
                    capacitance_f: Some(given.capacitance_f.unwrap_or(100e-9)),
                    ..values(20e-3, 0.5e-9, missing)
                }
            }
            Self::Bead => {
                let missing = given.inductance_h.is_none() && !from_review;
                values(0.1, if from_review { 0.0 } else { 1e-6 }, missing)
            }
            Self::Inductor => {
                let missing = given.inductance_h.is_none() && !from_review;
                values(0.1, if from_review { 0.0 } else { 10e-6 }, missing)
            }
            Self::Resistor if given.resistance_ohm.is_none() && !from_review => {
                if !between_references {
                    return None;
                }
                values(1e-3, 0.5e-9, true)
            }
            Self::Resistor | Self::Other if from_review || given.resistance_ohm.is_some() => {
                values(0.0, 0.0, false)
            }
            Self::Link => values(1e-3, 0.5e-9, given.resistance_ohm.is_none()),
            Self::Resistor | Self::Other => return None,
        })
    }

    /// A value as component data write it: `100nF`, `4k7`, `0R`, `10uH/1A`.
    fn parsed(self, text: &str) -> Option<Branch> {
        let word = text.trim().split([' ', '/', ',', ';', '_', '@']).next()?;
        let mut branch = Branch::default();
        match self {
            Self::Capacitor => {
                branch.capacitance_f = Some(engineering(word, "F").filter(|&farad| farad > 0.0)?)
            }
            Self::Inductor => branch.inductance_h = Some(engineering(word, "H")?),
            Self::Resistor | Self::Link => branch.resistance_ohm = Some(engineering(word, "R")?),
            Self::Bead => match engineering(word, "H").filter(|_| word.ends_with(['H', 'h'])) {
                Some(henry) => branch.inductance_h = Some(henry),
                None => {
                    branch.inductance_h = Some(engineering(word, "R")? / (std::f64::consts::TAU * BEAD_HZ))
                }
            },
            Self::Other => return None,
        }
        Some(branch)
    }
}

/// A number with a prefix in SI or in the place of the decimal point (`4k7`, `0R1`); `unit` is `F`, `H` or `R` and may
/// be missing.
fn engineering(word: &str, unit: &str) -> Option<f64> {
    let plain = word
        .replace(['\u{b5}', '\u{3bc}'], "u")
        .replace('\u{3a9}', "R")
        .replace("ohm", "R")
        .replace("Ohm", "R");
    let head: String = plain.chars().take_while(|c| c.is_ascii_digit() || *c == '.').collect();
    let mut rest = &plain[head.len()..];
    if head.is_empty() {
        return None;
    }
    let mut power = 0;
    let mut marked = false;
    if let Some(letter) = rest.chars().next() {
        let prefix = match letter {
            'p' => Some(-12),
            'n' => Some(-9),
            'u' => Some(-6),
            'm' => Some(-3),
            'k' | 'K' if unit == "R" => Some(3),
            'M' if unit == "R" => Some(6),
            'R' if unit == "R" => Some(0),
            _ => None,
        };
        if let Some(prefix) = prefix {
            (power, marked) = (prefix, true);
            rest = &rest[1..];
        }
    }
    let tail: String = rest.chars().take_while(char::is_ascii_digit).collect();
    rest = &rest[tail.len()..];
    if !tail.is_empty() && (!marked || head.contains('.')) {
        return None;
    }
    if !rest.is_empty() && !rest.eq_ignore_ascii_case(unit) {
        return None;
    }
    // Farad and henry without a prefix or unit are no sizes of parts.
    if unit != "R" && !marked && rest.is_empty() {
        return None;
    }
    format!("{head}{}{tail}e{power}", if tail.is_empty() { "" } else { "." }).parse().ok()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn values_of_component_data() {
        for (text, unit, want) in [
            ("100nF", "F", Some(1e-7)),
            ("100n", "F", Some(1e-7)),
            ("4u7", "F", Some(4.7e-6)),
            ("2.2\u{b5}F", "F", Some(2.2e-6)),
            ("10k", "R", Some(1e4)),
            ("4k7", "R", Some(4.7e3)),
            ("0R", "R", Some(0.0)),
            ("0R1", "R", Some(0.1)),
            ("0", "R", Some(0.0)),
            ("33", "R", Some(33.0)),
            ("5mR", "R", Some(5e-3)),
            ("100\u{3a9}", "R", Some(100.0)),
            ("10uH", "H", Some(1e-5)),
            ("100", "F", None),
            ("DNP", "F", None),
            ("1.2.3n", "F", None),
            ("100nX", "F", None),
        ] {
            let got = engineering(text, unit);
            let near = match (got, want) {
                (Some(got), Some(want)) => (got - want).abs() <= 1e-12 * want.abs(),
                (None, None) => true,
                _ => false,
            };
            assert!(near, "{text}: {got:?} for {want:?}");
        }
    }

    #[test]
    fn the_review_beats_the_files_and_these_the_defaults() {
        let none = Branch::default();
        let values = Class::of("C14").values(none, Some("10nF/50V"), false).unwrap();
        assert_eq!(
            (values.capacitance_f, values.resistance_ohm, values.assumed),
            (Some(10e-9), 20e-3, false)
        );
        let given = Branch { capacitance_f: Some(1e-9), ..none };
        assert_eq!(Class::of("C14").values(given, Some("10nF"), false).unwrap().capacitance_f, Some(1e-9));
        let unknown = Class::of("C14").values(none, None, false).unwrap();
        assert_eq!((unknown.capacitance_f, unknown.assumed), (Some(100e-9), true));
        // A resistor of unknown value joins reference nets, as links do, and nothing else.
        assert!(Class::of("R5").values(none, None, true).unwrap().assumed);
        assert_eq!(Class::of("R5").values(none, None, false), None);
        assert_eq!(Class::of("R5").values(none, Some("4k7"), false).unwrap().resistance_ohm, 4700.0);
        let bead = Class::of("FB1").values(none, Some("600R"), true).unwrap();
        assert!((bead.inductance_h - 600.0 / (std::f64::consts::TAU * 1e8)).abs() < 1e-12 && !bead.assumed);
        assert_eq!(Class::of("U5").values(none, None, true), None);
    }
}
