//! The `[[band]]` entries of a review.

use super::desk::Desk;
use crate::diag::code::review as code;
use crate::diag::nearest;
use crate::review::Band;
use crate::signal::{default_bands, itu_band, itu_names, own_band, zero_band};
use crate::unit::{Dimension, quantity_text};
use std::ops::Range;
use toml::de::DeTable;

/// All bands in the order of the file; LF to VHF where it has none.
pub fn read(desk: &mut Desk<'_>, root: &DeTable<'_>) -> Vec<Band> {
    if root.get("band").is_none() {
        return default_bands();
    }
    let mut bands: Vec<Band> = Vec::new();
    for (table, span) in desk.tables(root, "band") {
        desk.only(table, "band", &["name", "from", "to", "at"]);
        let start = span.start..span.end.min(span.start + 1);
        let Some(name) = desk.filled_text(table, "name") else {
            if table.get("name").is_none() {
                desk.error(code::REVIEW_MISSING_KEY, start, "band must have a name")
                    .hints
                    .push("write `name = \"HF\"`, or a name of your own with `from` and `to`".into());
            }
            continue;
        };
        let at = table.get("name").map_or(start, toml::Spanned::span);
        let Some(mut band) = limits(desk, table, name, at.clone()) else { continue };
        frequencies(desk, table, &mut band);
        if bands.iter().any(|known| known.name.eq_ignore_ascii_case(name)) {
            desk.error(code::REVIEW_DUPLICATE, at, format!("band `{name}` must stand only once"));
        } else {
            bands.push(band);
        }
    }
    bands
}

fn limits(desk: &mut Desk<'_>, table: &DeTable<'_>, name: &str, at: Range<usize>) -> Option<Band> {
    let known = if name == "DC" { Some(zero_band()) } else { itu_band(name) };
    let mut limit = |key: &str| table.get(key).map(|value| desk.quantity(value, key, Dimension::Frequency));
    let (from, to) = (limit("from"), limit("to"));
    match (known, from, to) {
        (Some(band), None, None) => Some(band),
        (Some(_), _, _) => {
            let text = format!("band `{name}` must not have `from` or `to`: its limits are fixed");
            desk.error(code::REVIEW_BAD_VALUE, at, text)
                .hints
                .push("give the band a name of your own".into());
            None
        }
        (None, Some(from), Some(to)) => {
            let (from, to) = (from?, to?);
            if !(0.0 <= from && from < to) {
                let text = format!(
                    "band `{name}` must run from 0 Hz or more to something above; got {} to {}",
                    quantity_text(from, "Hz"),
                    quantity_text(to, "Hz")
                );
                desk.error(code::REVIEW_BAD_VALUE, at, text);
                return None;
            }
            Some(own_band(name, from, to))
        }
        (None, None, None) => {
            let names = itu_names().join(", ");
            let text =
                format!("band `{name}` must be DC, one of {names}, or have `from` and `to`; it has neither");
            let near = nearest(name, itu_names().iter().copied());
            let message = desk.error(code::REVIEW_BAD_VALUE, at, text);
            if let Some(near) = near {
                message.hints.push(format!("did you mean `{near}`?"));
            }
            None
        }
        (None, from, _) => {
            let missing = if from.is_none() { "from" } else { "to" };
            let text = format!("band `{name}` must have both `from` and `to`; `{missing}` is missing");
            desk.error(code::REVIEW_MISSING_KEY, at, text);
            None
        }
    }
}

/// `at`: exactly the frequencies to solve, inside the band.
fn frequencies(desk: &mut Desk<'_>, table: &DeTable<'_>, band: &mut Band) {
    let Some(list) = desk.list(table, "at", "frequencies") else { return };
    if let (Some(value), true) = (table.get("at"), list.is_empty()) {
        desk.error(code::REVIEW_BAD_VALUE, value.span(), "value `at` must hold one frequency at least");
        return;
    }
    let mut found: Vec<f64> = Vec::new();
    for value in list {
        let Some(hertz) = desk.quantity(value, "at", Dimension::Frequency) else { continue };
        let from_zero = band.from_hz == 0.0 && hertz == 0.0;
        if !(from_zero || band.from_hz < hertz && hertz <= band.to_hz) {
            let text = format!(
                "value `at` of band `{}` must lie above {} and not above {}; got {}",
                band.name,
                quantity_text(band.from_hz, "Hz"),
                quantity_text(band.to_hz, "Hz"),
                quantity_text(hertz, "Hz")
            );
            desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        } else if found.contains(&hertz) {
            desk.error(
                code::REVIEW_DUPLICATE,
                value.span(),
                format!("{} must stand only once in `at`", quantity_text(hertz, "Hz")),
            );
        } else {
            found.push(hertz);
        }
    }
    found.sort_by(f64::total_cmp);
    if !found.is_empty() {
        band.at_hz = found;
        band.explicit = true;
    }
}
