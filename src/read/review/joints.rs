//! The `[[part]]` and `[[tie]]` entries of a review: what joins copper.

use super::desk::{Desk, Value, header};
use super::nets;
use crate::diag::code::review as code;
use crate::geom::Point;
use crate::review::joint::{Branch, PartRequest, TieEnd, TieRequest};
use crate::unit::Dimension;
use toml::de::{DeTable, DeValue};

const PART_KEYS: &[&str] =
    &["reference", "value", "nets", "fitted", "resistance", "inductance", "capacitance", "joins"];
const TIE_KEYS: &[&str] = &["name", "from", "to", "resistance", "inductance", "capacitance"];
const END_RULE: &str = "a pin such as `\"J1.3\"`, a point such as `[\"3mm\", \"4mm\"]`, `{ net = \"AGND\", at = [...] }` \
                        or `{ outside = \"chassis\" }`";

/// All parts in the order of the file.
pub fn read_parts(desk: &mut Desk<'_>, root: &DeTable<'_>) -> Vec<PartRequest> {
    let mut parts: Vec<PartRequest> = Vec::new();
    for (table, span) in desk.tables(root, "part") {
        desk.only(table, "part", PART_KEYS);
        let known = ["reference", "value", "nets"].iter().any(|key| table.get(*key).is_some());
        if !known {
            desk.error(code::REVIEW_MISSING_KEY, header(&span), "part must say which parts it is about")
                .hints
                .push(
                    "write `reference = \"C14\"` or a pattern such as `\"C*\"`, or `value` or `nets`".into(),
                );
        }
        let reference = desk.filled_text(table, "reference").map(str::to_owned);
        let value = desk.filled_text(table, "value").map(str::to_owned);
        let of_nets = names(desk, table, "nets");
        let joins = names(desk, table, "joins");
        if table.get("joins").is_some_and(|_| joins.len() < 2) {
            let at = table.get("joins").map_or(header(&span), toml::Spanned::span);
            let text = "value `joins` must name the nets that the part joins inside, two at least";
            desk.error(code::REVIEW_BAD_VALUE, at, text);
        }
        let fitted = table.get("fitted").is_none_or(|value| truth(desk, value, "fitted"));
        let branch = branch(desk, table);
        if let Some(reference) = &reference
            && let Some(earlier) = parts.iter().find(|known| {
                known.reference.as_ref() == Some(reference) && known.value == value && known.nets == of_nets
            })
        {
            let text = format!(
                "part `{reference}` must have one `[[part]]` only; the first is in line {}",
                earlier.line
            );
            let at = table.get("reference").map_or(header(&span), toml::Spanned::span);
            desk.error(code::REVIEW_DUPLICATE, at, text);
        }
        let (line, marks) = (desk.line(span.start), desk.marks(table, PART_KEYS));
        parts.push(PartRequest { reference, value, nets: of_nets, fitted, branch, joins, line, marks });
    }
    parts
}

/// All ties in the order of the file; points are moved by `origin`.
pub fn read_ties(desk: &mut Desk<'_>, root: &DeTable<'_>, origin: Point) -> Vec<TieRequest> {
    let mut ties = Vec::new();
    for (table, span) in desk.tables(root, "tie") {
        desk.only(table, "tie", TIE_KEYS);
        let mut end = |key: &str| match table.get(key) {
            Some(value) => tie_end(desk, value, key, origin),
            None => {
                desk.error(code::REVIEW_MISSING_KEY, header(&span), format!("tie must have the key `{key}`"))
                    .hints
                    .push(format!("write `{key} =` and {END_RULE}"));
                None
            }
        };
        let (from, to) = (end("from"), end("to"));
        let name = desk.filled_text(table, "name").map(str::to_owned);
        let branch = branch(desk, table);
        let (Some(from), Some(to)) = (from, to) else { continue };
        let nowhere = |end: &TieEnd| matches!(end, TieEnd::Net { at: None, .. } | TieEnd::Outside(_));
        let at = table.get("to").map_or(header(&span), toml::Spanned::span);
        if from == to {
            desk.error(code::REVIEW_BAD_VALUE, at, "a tie must join two different places");
            continue;
        }
        if nowhere(&from)
            && nowhere(&to)
            && !(matches!((&from, &to), (TieEnd::Outside(_), TieEnd::Outside(_))))
        {
            desk.error(
                code::REVIEW_BAD_VALUE,
                at,
                "a tie must have a place on the board; neither end says one",
            )
            .hints
            .push("write `at = [\"3mm\", \"4mm\"]` beside `net`".into());
            continue;
        }
        let (line, marks) = (desk.line(span.start), desk.marks(table, TIE_KEYS));
        let name = name.unwrap_or_else(|| format!("tie in line {line}"));
        ties.push(TieRequest { name, from, to, branch, line, marks });
    }
    ties
}

fn tie_end(desk: &mut Desk<'_>, value: &Value<'_>, key: &str, origin: Point) -> Option<TieEnd> {
    match value.get_ref() {
        DeValue::String(_) => nets::pin(desk, value, key).map(TieEnd::Pin),
        DeValue::Array(_) => desk.point(value, key).map(|point| TieEnd::At(origin + point)),
        DeValue::Table(table) => {
            desk.only(table, key, &["net", "at", "outside"]);
            let at = match table.get("at") {
                Some(at) => Some(origin + desk.point(at, "at")?),
                None => None,
            };
            let (net, outside) = (desk.filled_text(table, "net"), desk.filled_text(table, "outside"));
            match (net, outside) {
                (Some(net), None) => Some(TieEnd::Net { net: net.into(), at }),
                (None, Some(node)) if at.is_none() => Some(TieEnd::Outside(node.into())),
                _ => {
                    let text =
                        format!("value `{key}` must have `net`, with or without `at`, or `outside` alone");
                    desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
                    None
                }
            }
        }
        _ => {
            desk.wrong_type(value, key, END_RULE);
            None
        }
    }
}

/// Resistance, inductance and capacitance: zero is allowed but for the capacitance.
fn branch(desk: &mut Desk<'_>, table: &DeTable<'_>) -> Branch {
    let mut not_negative = |key: &str, dimension| {
        let value = table.get(key)?;
        let number = desk.quantity(value, key, dimension)?;
        if number < 0.0 {
            let text = format!("value `{key}` must not be below zero");
            desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            return None;
        }
        Some(number)
    };
    let resistance_ohm = not_negative("resistance", Dimension::Resistance);
    let inductance_h = not_negative("inductance", Dimension::Inductance);
    let capacitance_f = table
        .get("capacitance")
        .and_then(|value| desk.positive(value, "capacitance", Dimension::Capacitance));
    Branch { resistance_ohm, inductance_h, capacitance_f }
}

fn names(desk: &mut Desk<'_>, table: &DeTable<'_>, key: &str) -> Vec<String> {
    let mut found: Vec<String> = Vec::new();
    for value in desk.list(table, key, "net names").unwrap_or_default() {
        let Some(name) = desk.as_text(value, key) else { continue };
        if name.is_empty() {
            desk.error(
                code::REVIEW_BAD_VALUE,
                value.span(),
                format!("a net name in `{key}` must not be empty"),
            );
        } else if found.iter().any(|known| known == name) {
            let text = format!("net `{name}` must stand only once in `{key}`");
            desk.error(code::REVIEW_DUPLICATE, value.span(), text);
        } else {
            found.push(name.into());
        }
    }
    found
}

fn truth(desk: &mut Desk<'_>, value: &Value<'_>, key: &str) -> bool {
    match value.get_ref() {
        DeValue::Boolean(truth) => *truth,
        _ => {
            desk.wrong_type(value, key, "`true` or `false` without quotes");
            true
        }
    }
}
