//! The `[[path]]` and `[[pair]]` entries of a review.

use super::desk::{Desk, Value, header};
use super::{drives, nets};
use crate::diag::code::review as code;
use crate::geom::Point;
use crate::review::path::{PairRequest, PathRequest, Receiver, Step};
use std::ops::Range;
use toml::de::{DeTable, DeValue};

const PATH_KEYS: &[&str] = &[
    "name",
    "driver",
    "through",
    "receiver",
    "receivers",
    "plane",
    "driver_landing",
    "receiver_landing",
    "drive",
    "series",
    "termination",
    "load",
    "landing",
    "budget",
];
const PAIR_KEYS: &[&str] = &[
    "name",
    "positive",
    "negative",
    "imbalance",
    "drive",
    "series",
    "termination",
    "load",
    "landing",
    "budget",
];
/// Rounding that shares may leave between their sum and 1.
const SHARE_ROUNDING: f64 = 1e-6;

/// All paths in the order of the file; landings given as points are moved by `origin`.
pub fn read_paths(desk: &mut Desk<'_>, root: &DeTable<'_>, origin: Point) -> Vec<PathRequest> {
    let mut paths: Vec<PathRequest> = Vec::new();
    for (table, span) in desk.tables(root, "path") {
        desk.only(table, "path", PATH_KEYS);
        let name = required_text(desk, table, &span, "path", "name");
        let driver = match table.get("driver") {
            Some(value) => nets::pin(desk, value, "driver"),
            None => {
                missing(desk, &span, "path", "driver");
                None
            }
        };
        let receivers = receivers(desk, table, &span);
        let through = through(desk, table);
        let plane = table.get("plane").and_then(|value| nets::plane(desk, value));
        let mut landing =
            |key: &str| table.get(key).and_then(|value| nets::landing(desk, value, key, origin));
        let (driver_landing, receiver_landing) = (landing("driver_landing"), landing("receiver_landing"));
        let signal = drives::read(desk, table);
        let (Some(name), Some(driver), Some(receivers), Some(through)) = (name, driver, receivers, through)
        else {
            continue;
        };
        if through.is_empty() && receivers.iter().any(|receiver| receiver.pin == driver) {
            let text =
                format!("path `{name}` must end at another pin than its driver or pass `through` parts");
            desk.error(code::REVIEW_BAD_VALUE, header(&span), text);
        }
        let line = desk.line(span.start);
        let marks = desk.marks(table, PATH_KEYS);
        paths.push(PathRequest {
            name,
            driver,
            through,
            receivers,
            plane,
            driver_landing,
            receiver_landing,
            signal,
            line,
            marks,
        });
    }
    paths
}

/// All pairs in the order of the file.
pub fn read_pairs(desk: &mut Desk<'_>, root: &DeTable<'_>) -> Vec<PairRequest> {
    let mut pairs = Vec::new();
    for (table, span) in desk.tables(root, "pair") {
        desk.only(table, "pair", PAIR_KEYS);
        let name = required_text(desk, table, &span, "pair", "name");
        let positive = required_text(desk, table, &span, "pair", "positive");
        let negative = required_text(desk, table, &span, "pair", "negative");
        let imbalance = table.get("imbalance").map_or(Some(0.0), |value| imbalance(desk, value));
        let signal = drives::read(desk, table);
        let (Some(name), Some(positive), Some(negative), Some(imbalance)) =
            (name, positive, negative, imbalance)
        else {
            continue;
        };
        if positive == negative {
            let at = table.get("negative").map_or(header(&span), toml::Spanned::span);
            let text = format!("pair `{name}` must have two different nets or paths; both are `{positive}`");
            desk.error(code::REVIEW_BAD_VALUE, at, text);
        }
        let line = desk.line(span.start);
        let marks = desk.marks(table, PAIR_KEYS);
        pairs.push(PairRequest { name, positive, negative, imbalance, signal, line, marks });
    }
    pairs
}

/// Notes names that stand more than once among nets, paths and pairs: they name maps and findings.
pub fn ensure_distinct(desk: &mut Desk<'_>, root: &DeTable<'_>) {
    let mut seen: Vec<(String, &str, u32)> = Vec::new();
    for kind in ["net", "path", "pair"] {
        // Entries that are no tables have had their message.
        let list = root.get(kind).and_then(|value| value.get_ref().as_array());
        for value in list.into_iter().flat_map(|list| list.iter()) {
            let name = value.get_ref().as_table().and_then(|table| table.get("name"));
            let Some((name, span)) = name.and_then(|name| Some((name.get_ref().as_str()?, name.span())))
            else {
                continue;
            };
            match seen.iter().find(|known| known.0 == name) {
                // Two nets of one name are told where nets are read.
                Some(known) if known.1 == "net" && kind == "net" => {}
                Some(&(_, other, line)) => {
                    let text = format!(
                        "{kind} `{name}` must have a name of its own; line {line} has a {other} of that name"
                    );
                    desk.error(code::REVIEW_DUPLICATE, span, text);
                }
                None => seen.push((name.into(), kind, desk.line(value.span().start))),
            }
        }
    }
}

fn imbalance(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<f64> {
    let number = desk.number(value, "imbalance")?;
    if !(-2.0..=2.0).contains(&number) {
        let text = format!(
            "value `imbalance` must be (I+ - I-)/I, from -2 to 2; got {number}: 10 % more on the positive side is 0.1"
        );
        desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        return None;
    }
    Some(number)
}

/// Parts in order: a name for a part with two pins, a list of two pins for one with more.
fn through(desk: &mut Desk<'_>, table: &DeTable<'_>) -> Option<Vec<Step>> {
    if table.get("through").is_none() {
        return Some(Vec::new());
    }
    let mut steps = Vec::new();
    let mut whole = true;
    for value in desk.list(table, "through", "parts")? {
        let step = step(desk, value);
        whole &= step.is_some();
        steps.extend(step);
    }
    whole.then_some(steps)
}

fn step(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<Step> {
    match value.get_ref() {
        DeValue::String(text) => {
            if text.trim().is_empty() || text.contains('.') {
                let rule = format!(
                    "a part in `through` must be its name such as `R12`, or its two pins such as `[\"Q1.5\", \"Q1.2\"]`; \
                     got `{text}`"
                );
                desk.error(code::REVIEW_BAD_VALUE, value.span(), rule);
                return None;
            }
            Some(Step::Part(text.to_string()))
        }
        DeValue::Array(_) => {
            let pins = desk.as_list(value, "through", "two pins")?;
            let [enter, leave] = pins[..] else {
                let text = format!("a part in `through` must have two pins, in and out; got {}", pins.len());
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
                return None;
            };
            let (enter, leave) = (nets::pin(desk, enter, "through"), nets::pin(desk, leave, "through"));
            let (enter, leave) = (enter?, leave?);
            let part = |pin: &str| pin.split('.').next().map(str::to_owned);
            if part(&enter) != part(&leave) || enter == leave {
                let text =
                    format!("pins in `through` must be two pins of one part; got `{enter}` and `{leave}`");
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
                return None;
            }
            Some(Step::Pins { enter, leave })
        }
        _ => {
            desk.wrong_type(
                value,
                "through",
                "a part such as `\"R12\"` or two pins such as `[\"Q1.5\", \"Q1.2\"]`",
            );
            None
        }
    }
}

/// `receiver = "U7.2"`, or `receivers = [{ pin = "U7.2", share = 0.6 }, ...]`.
fn receivers(desk: &mut Desk<'_>, table: &DeTable<'_>, span: &Range<usize>) -> Option<Vec<Receiver>> {
    match (table.get("receiver"), table.get("receivers")) {
        (Some(_), Some(several)) => {
            let text = "path must have `receiver` or `receivers`, not both";
            desk.error(code::REVIEW_BAD_VALUE, several.span(), text);
            None
        }
        (Some(one), None) => nets::pin(desk, one, "receiver").map(|pin| vec![Receiver { pin, share: 1.0 }]),
        (None, Some(several)) => shares(desk, table, several),
        (None, None) => {
            missing(desk, span, "path", "receiver");
            None
        }
    }
}

fn shares(desk: &mut Desk<'_>, table: &DeTable<'_>, value: &Value<'_>) -> Option<Vec<Receiver>> {
    let mut found: Vec<Receiver> = Vec::new();
    let mut whole = true;
    let list = desk.list(table, "receivers", "tables such as `{ pin = \"U7.2\", share = 0.5 }`")?;
    for entry in &list {
        let receiver = receiver(desk, entry);
        whole &= receiver.is_some();
        let Some(receiver) = receiver else { continue };
        if found.iter().any(|known| known.pin == receiver.pin) {
            let text = format!("pin `{}` must stand only once in `receivers`", receiver.pin);
            desk.error(code::REVIEW_DUPLICATE, entry.span(), text);
        }
        found.push(receiver);
    }
    let sum: f64 = found.iter().map(|receiver| receiver.share).sum();
    if whole && (sum - 1.0).abs() > SHARE_ROUNDING {
        let text = format!("shares of `receivers` must sum to 1; got {sum}");
        desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        return None;
    }
    whole.then_some(found)
}

fn receiver(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<Receiver> {
    let Some(table) = value.get_ref().as_table() else {
        desk.wrong_type(value, "receivers", "a table such as `{ pin = \"U7.2\", share = 0.5 }`");
        return None;
    };
    desk.only(table, "receivers", &["pin", "share"]);
    let (Some(pin), Some(share)) = (table.get("pin"), table.get("share")) else {
        desk.error(code::REVIEW_MISSING_KEY, header(&value.span()), "receiver must have `pin` and `share`");
        return None;
    };
    let (pin, number) = (nets::pin(desk, pin, "pin"), desk.number(share, "share"));
    let (pin, number) = (pin?, number?);
    if !(number > 0.0 && number <= 1.0) {
        let text = format!("value `share` must be above 0 and not above 1; got {number}");
        desk.error(code::REVIEW_BAD_VALUE, share.span(), text);
        return None;
    }
    Some(Receiver { pin, share: number })
}

fn required_text(
    desk: &mut Desk<'_>,
    table: &DeTable<'_>,
    span: &Range<usize>,
    what: &str,
    key: &str,
) -> Option<String> {
    if table.get(key).is_none() {
        missing(desk, span, what, key);
    }
    desk.filled_text(table, key).map(str::to_owned)
}

fn missing(desk: &mut Desk<'_>, span: &Range<usize>, what: &str, key: &str) {
    desk.error(code::REVIEW_MISSING_KEY, header(span), format!("{what} must have the key `{key}`"))
        .hints
        .push(format!("write `{key} = \"...\"` under `[[{what}]]`"));
}
