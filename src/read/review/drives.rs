//! Drive, load, landing of the driver and noise budget of a net, path or pair in a review.

use super::desk::{Desk, Value};
use crate::diag::code::review as code;
use crate::diag::nearest;
use crate::review::drive::{
    Budget, Drive, DriverReturn, Level, Load, Pattern, Pulse, SignalRequest, Stream, TableLine, Tone,
};
use crate::unit::{Dimension, quantity_text};
use std::ops::Range;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// Noise that a converter bears unless the budget says otherwise, in LSB rms (common practice).
const DEFAULT_LSB: f64 = 0.5;
/// Orders of maximum-length sequences.
const ORDERS: std::ops::RangeInclusive<u32> = 2..=31;
/// How levels are given: key, what it measures, how it becomes a level.
type LevelKey = (&'static str, Dimension, fn(f64) -> Level);
const PEAK_TO_PEAK: &[LevelKey] =
    &[("swing", Dimension::Voltage, Level::Volts), ("current", Dimension::Current, Level::Amperes)];
const LOOP_CURRENT: &[LevelKey] = &[("current", Dimension::Current, Level::Amperes)];
const RMS: &[LevelKey] =
    &[("voltage", Dimension::Voltage, Level::Volts), ("current", Dimension::Current, Level::Amperes)];

/// Drive, load, landing and budget of an entry.
pub fn read(desk: &mut Desk<'_>, table: &DeTable<'_>) -> SignalRequest {
    let load = load(desk, table);
    let drive = table.get("drive").and_then(|value| {
        let found = drive(desk, value)?;
        let volts = matches!(found.level(), Some(Level::Volts(_)));
        if volts && table.get("load").is_none() && table.get("termination").is_none() {
            let text = "drive with a voltage must have a load to give a current";
            desk.error(code::REVIEW_MISSING_KEY, value.span(), text).hints.push(
                "add `load = \"5pF\"` or `termination = \"50ohm\"` beside it, or give `current` in the drive"
                    .into(),
            );
        }
        Some(found)
    });
    let landing = landing(desk, table);
    let budget = table.get("budget").and_then(|value| budget(desk, value));
    SignalRequest { drive, load, landing, budget }
}

fn load(desk: &mut Desk<'_>, table: &DeTable<'_>) -> Option<Load> {
    let mut get = |key: &str, wanted| table.get(key).map(|value| desk.positive(value, key, wanted));
    let series = get("series", Dimension::Resistance);
    let termination = get("termination", Dimension::Resistance);
    let capacitance = get("load", Dimension::Capacitance);
    if series.is_none() && termination.is_none() && capacitance.is_none() {
        return None;
    }
    Some(Load {
        series_ohm: series.flatten().unwrap_or(0.0),
        termination_ohm: termination.flatten(),
        capacitance_f: capacitance.flatten().unwrap_or(0.0),
    })
}

fn landing(desk: &mut Desk<'_>, table: &DeTable<'_>) -> DriverReturn {
    let Some(name) = desk.text(table, "landing") else { return DriverReturn::default() };
    match name {
        "ground" => DriverReturn::Ground,
        "supply" => DriverReturn::Supply,
        "both" => DriverReturn::Both,
        other => {
            let span = table.get("landing").map_or(0..0, Spanned::span);
            let text = format!("value `landing` must be `ground`, `supply` or `both`; got `{other}`");
            desk.error(code::REVIEW_BAD_VALUE, span, text);
            DriverReturn::default()
        }
    }
}

fn budget(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<Budget> {
    match value.get_ref() {
        DeValue::String(_) => desk.positive(value, "budget", Dimension::Voltage).map(Budget::Volts),
        DeValue::Table(table) => {
            desk.only(table, "budget", &["bits", "full_scale", "lsb"]);
            let entry = Entry { table, at: value.span(), what: "budget" };
            let bits = entry.number(desk, "bits", |bits| bits.fract() == 0.0 && (1.0..=32.0).contains(&bits));
            let full_scale_v = entry.positive(desk, "full_scale", Dimension::Voltage);
            let lsb = match table.get("lsb") {
                Some(_) => entry.number(desk, "lsb", |lsb| lsb > 0.0),
                None => Some(DEFAULT_LSB),
            };
            Some(Budget::Converter { bits: bits? as u32, full_scale_v: full_scale_v?, lsb: lsb? })
        }
        _ => {
            let rule =
                "a voltage such as `\"0.5uV\"` or a table such as `{ bits = 12, full_scale = \"2.048V\" }`";
            desk.wrong_type(value, "budget", rule);
            None
        }
    }
}

fn drive(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<Drive> {
    const KINDS: [&str; 5] = ["clock", "data", "tone", "ripple", "spectrum"];
    let Some(table) = value.get_ref().as_table() else {
        let rule = "a table such as `{ kind = \"clock\", frequency = \"8MHz\", edge = \"2ns\", current = \"10mA\" }`";
        desk.wrong_type(value, "drive", rule);
        return None;
    };
    let Some(kind) = table.get("kind") else {
        desk.error(code::REVIEW_MISSING_KEY, start_of(value.span()), "drive must have the key `kind`")
            .hints
            .push(format!("kinds are {}", KINDS.join(", ")));
        return None;
    };
    let entry = |what| Entry { table, at: value.span(), what };
    match desk.as_text(kind, "kind")? {
        "clock" => pulse(desk, &entry("clock"), PEAK_TO_PEAK).map(Drive::Clock),
        "ripple" => pulse(desk, &entry("ripple"), LOOP_CURRENT).map(Drive::Ripple),
        "data" => stream(desk, &entry("data")).map(Drive::Data),
        "tone" => tone(desk, &entry("tone")).map(Drive::Tone),
        "spectrum" => spectrum(desk, &entry("spectrum")).map(Drive::Spectrum),
        other => {
            let text = format!("value `kind` must be one of {}; got `{other}`", KINDS.join(", "));
            let message = desk.error(code::REVIEW_BAD_VALUE, kind.span(), text);
            if let Some(near) = nearest(other, KINDS) {
                message.hints.push(format!("did you mean `{near}`?"));
            }
            None
        }
    }
}

fn pulse(desk: &mut Desk<'_>, entry: &Entry<'_, '_>, levels: &[LevelKey]) -> Option<Pulse> {
    entry.only(desk, &["kind", "frequency", "edge", "rise", "fall", "duty"], levels);
    let frequency_hz = entry.positive(desk, "frequency", Dimension::Frequency);
    let edges = edges(desk, entry);
    let duty = match entry.table.get("duty") {
        Some(_) => entry.number(desk, "duty", |duty| 0.0 < duty && duty < 1.0),
        None => Some(0.5),
    };
    let level = entry.level(desk, levels);
    let (rise_s, fall_s) = edges?;
    let pulse = Pulse { frequency_hz: frequency_hz?, rise_s, fall_s, duty: duty?, level: level? };
    if !pulse.fits() {
        let (rise_s, fall_s) = pulse.whole_edges_s();
        let text = format!(
            "edges of a {} must fit into its pulse and its pause; from end to end they take {} and {}, 1/0.8 of their \
             10-90 % times, while the pulse lasts {} of {}",
            entry.what,
            quantity_text(rise_s, "s"),
            quantity_text(fall_s, "s"),
            quantity_text(pulse.duty / pulse.frequency_hz, "s"),
            quantity_text(1.0 / pulse.frequency_hz, "s")
        );
        desk.error(code::REVIEW_BAD_VALUE, entry.at.clone(), text);
        return None;
    }
    Some(pulse)
}

/// `edge` for both, or `rise` and `fall`.
fn edges(desk: &mut Desk<'_>, entry: &Entry<'_, '_>) -> Option<(f64, f64)> {
    if let Some(edge) = entry.table.get("edge") {
        for key in ["rise", "fall"] {
            if let Some(value) = entry.table.get(key) {
                let text = format!("value `{key}` must not stand beside `edge`, which sets both edges");
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            }
        }
        let edge_s = desk.positive(edge, "edge", Dimension::Time)?;
        return Some((edge_s, edge_s));
    }
    if entry.table.get("rise").is_none() && entry.table.get("fall").is_none() {
        entry.missing(desk, "edge").hints.push("write `edge = \"2ns\"`, the time from 10 to 90 %".into());
        return None;
    }
    let rise_s = entry.positive(desk, "rise", Dimension::Time);
    let fall_s = entry.positive(desk, "fall", Dimension::Time);
    Some((rise_s?, fall_s?))
}

fn stream(desk: &mut Desk<'_>, entry: &Entry<'_, '_>) -> Option<Stream> {
    entry.only(desk, &["kind", "rate", "edge", "pattern"], PEAK_TO_PEAK);
    let rate = entry.positive(desk, "rate", Dimension::BitRate);
    let edge = entry.positive(desk, "edge", Dimension::Time);
    let pattern = pattern(desk, entry);
    let level = entry.level(desk, PEAK_TO_PEAK);
    let stream = Stream { bit_rate_hz: rate?, edge_s: edge?, pattern: pattern?, level: level? };
    let bit_s = 1.0 / stream.bit_rate_hz;
    if stream.whole_edge_s() > bit_s * (1.0 + 1e-12) {
        let text = format!(
            "edge of a data stream must not be longer than a bit; from end to end it takes {}, 1/0.8 of its 10-90 % \
             time, and a bit lasts {}",
            quantity_text(stream.whole_edge_s(), "s"),
            quantity_text(bit_s, "s")
        );
        desk.error(code::REVIEW_BAD_VALUE, entry.at.clone(), text);
        return None;
    }
    Some(stream)
}

fn pattern(desk: &mut Desk<'_>, entry: &Entry<'_, '_>) -> Option<Pattern> {
    let Some(value) = entry.table.get("pattern") else { return Some(Pattern::Random) };
    let text = desk.as_text(value, "pattern")?;
    if text == "random" {
        return Some(Pattern::Random);
    }
    let order = text.strip_prefix("prbs").and_then(|digits| digits.parse().ok());
    match order {
        Some(order) if ORDERS.contains(&order) => Some(Pattern::Prbs { order }),
        _ => {
            let text = format!("value `pattern` must be `random` or `prbs2` to `prbs31`; got `{text}`");
            desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            None
        }
    }
}

fn tone(desk: &mut Desk<'_>, entry: &Entry<'_, '_>) -> Option<Tone> {
    entry.only(desk, &["kind", "frequency", "bandwidth"], RMS);
    let frequency_hz = entry.positive(desk, "frequency", Dimension::Frequency);
    let bandwidth_hz = match entry.table.get("bandwidth") {
        Some(value) => desk.positive(value, "bandwidth", Dimension::Frequency),
        None => Some(0.0),
    };
    let level = entry.level(desk, RMS);
    let tone = Tone { frequency_hz: frequency_hz?, bandwidth_hz: bandwidth_hz?, level: level? };
    if tone.bandwidth_hz > 2.0 * tone.frequency_hz {
        let span = entry.table.get("bandwidth").map_or(entry.at.clone(), Spanned::span);
        let text = format!(
            "value `bandwidth` must not reach below 0 Hz, so {} at most here; got {}",
            quantity_text(2.0 * tone.frequency_hz, "Hz"),
            quantity_text(tone.bandwidth_hz, "Hz")
        );
        desk.error(code::REVIEW_BAD_VALUE, span, text);
        return None;
    }
    Some(tone)
}

fn spectrum(desk: &mut Desk<'_>, entry: &Entry<'_, '_>) -> Option<Vec<TableLine>> {
    entry.only(desk, &["kind", "lines"], &[]);
    if entry.table.get("lines").is_none() {
        let hint = "write `lines = [[\"1MHz\", \"2mA\"], ...]`, frequencies and rms currents";
        entry.missing(desk, "lines").hints.push(hint.into());
        return None;
    }
    let mut lines: Vec<TableLine> = Vec::new();
    let mut whole = true;
    let list = desk.list(entry.table, "lines", "lines, each a frequency and an rms current")?;
    for value in &list {
        let line = table_line(desk, value);
        whole &= line.is_some();
        let Some(line) = line else { continue };
        if lines.iter().any(|known| known.frequency_hz == line.frequency_hz) {
            let text = format!("{} must stand only once in `lines`", quantity_text(line.frequency_hz, "Hz"));
            desk.error(code::REVIEW_DUPLICATE, value.span(), text);
        } else {
            lines.push(line);
        }
    }
    if list.is_empty() {
        let span = entry.table.get("lines").map_or(entry.at.clone(), Spanned::span);
        desk.error(code::REVIEW_BAD_VALUE, span, "value `lines` must hold one line at least");
        return None;
    }
    lines.sort_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz));
    whole.then_some(lines)
}

fn table_line(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<TableLine> {
    let pair = desk.as_list(value, "lines", "a frequency and an rms current")?;
    let [frequency, current] = pair[..] else {
        let text = format!("a line must hold a frequency and an rms current; got {} values", pair.len());
        desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        return None;
    };
    let frequency_hz = desk.quantity(frequency, "lines", Dimension::Frequency);
    let current_rms_a = desk.positive(current, "lines", Dimension::Current);
    let (frequency_hz, current_rms_a) = (frequency_hz?, current_rms_a?);
    if frequency_hz < 0.0 {
        desk.error(code::REVIEW_BAD_VALUE, frequency.span(), "a frequency must not be below zero");
        return None;
    }
    Some(TableLine { frequency_hz, current_rms_a })
}

/// A table in braces with its place and its kind, for messages.
struct Entry<'v, 'i> {
    table: &'v DeTable<'i>,
    at: Range<usize>,
    what: &'static str,
}

impl Entry<'_, '_> {
    fn only(&self, desk: &mut Desk<'_>, keys: &[&str], levels: &[LevelKey]) {
        let all: Vec<&str> = keys.iter().copied().chain(levels.iter().map(|level| level.0)).collect();
        desk.only(self.table, self.what, &all);
    }

    fn missing<'d>(&self, desk: &'d mut Desk<'_>, key: &str) -> &'d mut crate::diag::Diagnostic {
        let text = format!("`{}` must have the key `{key}`", self.what);
        desk.error(code::REVIEW_MISSING_KEY, start_of(self.at.clone()), text)
    }

    /// A quantity above zero that must be there.
    fn positive(&self, desk: &mut Desk<'_>, key: &str, wanted: Dimension) -> Option<f64> {
        match self.table.get(key) {
            Some(value) => desk.positive(value, key, wanted),
            None => {
                self.missing(desk, key);
                None
            }
        }
    }

    /// A plain number that must be there and keep a rule.
    fn number(&self, desk: &mut Desk<'_>, key: &str, rule: fn(f64) -> bool) -> Option<f64> {
        let Some(value) = self.table.get(key) else {
            self.missing(desk, key);
            return None;
        };
        let number = desk.number(value, key)?;
        if rule(number) {
            return Some(number);
        }
        let wanted = match key {
            "bits" => "a whole number from 1 to 32",
            "duty" => "between 0 and 1",
            _ => "above zero",
        };
        let text = format!("value `{key}` must be {wanted}; got {number}");
        desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        None
    }

    /// The level under one of `keys`; `Some(None)` where there is none, `None` after a message.
    fn level(&self, desk: &mut Desk<'_>, keys: &[LevelKey]) -> Option<Option<Level>> {
        let given: Vec<(&LevelKey, &Value<'_>)> =
            keys.iter().filter_map(|key| self.table.get(key.0).map(|value| (key, value))).collect();
        match given[..] {
            [] => Some(None),
            [(key, value)] => desk.positive(value, key.0, key.1).map(|number| Some(key.2(number))),
            [(first, _), (second, value), ..] => {
                let text = format!("`{}` must have `{}` or `{}`, not both", self.what, first.0, second.0);
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
                None
            }
        }
    }
}

/// The first bytes of an entry, so that a missing key does not mark a whole table.
fn start_of(span: Range<usize>) -> Range<usize> {
    span.start..span.end.min(span.start + 1)
}
