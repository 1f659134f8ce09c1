//! The `[[net]]` entries of a review.

use super::desk::{Desk, Value, header};
use super::drives;
use crate::diag::code::review as code;
use crate::geom::Point;
use crate::review::{LandingRequest, NetRequest};
use toml::de::{DeTable, DeValue};

const KEYS: &[&str] = &[
    "name",
    "driver",
    "receiver",
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

/// All nets in the order of the file; landings given as points are moved by `origin`.
pub fn read(desk: &mut Desk<'_>, root: &DeTable<'_>, origin: Point) -> Vec<NetRequest> {
    let mut nets: Vec<NetRequest> = Vec::new();
    for (table, span) in desk.tables(root, "net") {
        desk.only(table, "net", KEYS);
        let Some(name) = desk.filled_text(table, "name") else {
            if table.get("name").is_none() {
                desk.error(code::REVIEW_MISSING_KEY, header(&span), "net must have a name")
                    .hints
                    .push("write `name = \"...\"` under `[[net]]`".into());
            }
            continue;
        };
        let mut net = NetRequest { name: name.into(), line: desk.line(span.start), ..NetRequest::default() };
        for key in KEYS {
            if let Some(value) = table.get(*key) {
                net.marks.0.push((key, desk.line(value.span().start), value.span()));
            }
        }
        net.driver = table.get("driver").and_then(|value| pin(desk, value, "driver"));
        net.receiver = table.get("receiver").and_then(|value| pin(desk, value, "receiver"));
        net.plane = table.get("plane").and_then(|value| plane(desk, value));
        net.driver_landing =
            table.get("driver_landing").and_then(|value| landing(desk, value, "driver_landing", origin));
        net.receiver_landing =
            table.get("receiver_landing").and_then(|value| landing(desk, value, "receiver_landing", origin));
        net.signal = drives::read(desk, table);
        if let (Some(driver), Some(receiver)) = (&net.driver, &net.receiver)
            && driver == receiver
        {
            let at = table.get("receiver").map_or(span.clone(), toml::Spanned::span);
            let text =
                format!("receiver of net `{name}` must be another pin than its driver; both are `{driver}`");
            desk.error(code::REVIEW_BAD_VALUE, at, text);
        }
        if let Some(earlier) = nets.iter().find(|known| known.name == net.name) {
            let text =
                format!("net `{name}` must have one `[[net]]` only; the first is in line {}", earlier.line);
            let at = table.get("name").map_or(span.clone(), toml::Spanned::span);
            desk.error(code::REVIEW_DUPLICATE, at, text);
        } else {
            nets.push(net);
        }
    }
    nets
}

/// A pin, part and number joined by a dot.
pub fn pin(desk: &mut Desk<'_>, value: &Value<'_>, name: &str) -> Option<String> {
    let text = desk.as_text(value, name)?;
    match text.split_once('.') {
        Some((part, number)) if !part.is_empty() && !number.is_empty() => Some(text.into()),
        _ => {
            let rule = format!("value `{name}` must be a pin such as `U5.19`; got `{text}`");
            desk.error(code::REVIEW_BAD_VALUE, value.span(), rule);
            None
        }
    }
}

/// A plane, layer and net joined by a hyphen.
pub fn plane(desk: &mut Desk<'_>, value: &Value<'_>) -> Option<String> {
    let text = desk.as_text(value, "plane")?;
    let number = text.strip_prefix('L').and_then(|rest| rest.split_once('-'));
    let good =
        number.is_some_and(|(layer, net)| layer.parse::<u16>().is_ok_and(|n| n > 0) && !net.is_empty());
    if !good {
        let rule = format!("value `plane` must be a layer and a net such as `L2-GND`; got `{text}`");
        desk.error(code::REVIEW_BAD_VALUE, value.span(), rule);
        return None;
    }
    Some(text.into())
}

/// A landing: a pin, or a point moved by `origin`.
pub fn landing(desk: &mut Desk<'_>, value: &Value<'_>, name: &str, origin: Point) -> Option<LandingRequest> {
    match value.get_ref() {
        DeValue::String(_) => pin(desk, value, name).map(LandingRequest::Pin),
        DeValue::Array(_) => desk.point(value, name).map(|point| LandingRequest::At(origin + point)),
        _ => {
            desk.wrong_type(value, name, "a pin such as `\"U5.20\"` or a point such as `[\"3mm\", \"4mm\"]`");
            None
        }
    }
}
