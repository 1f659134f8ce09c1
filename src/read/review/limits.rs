//! `[limits]`, its exceptions `[[limits.path]]`, and the `[[waiver]]` entries of a review.

use super::desk::Desk;
use crate::diag::code::{finding, review as code};
use crate::diag::nearest;
use crate::review::Marks;
use crate::review::limit::{LimitRequest, Limits, PathLimits, Waiver};
use crate::unit::Dimension;
use toml::de::DeTable;

const LIMIT_KEYS: &[&str] =
    &["extra_inductance", "extra_path", "share_drop", "edge_density", "stray", "warn_at"];
const WAIVER_KEYS: &[&str] = &["code", "path", "reason", "expires"];

/// The limits of a review; those of common practice where it gives none.
pub fn read(desk: &mut Desk<'_>, root: &DeTable<'_>) -> LimitRequest {
    let Some(table) = desk.table(root, "limits") else { return LimitRequest::default() };
    let known: Vec<&str> = LIMIT_KEYS.iter().copied().chain(["path"]).collect();
    desk.only(table, "limits", &known);
    let all = limits(desk, table, Limits::default());
    let mut paths = Vec::new();
    let known: Vec<&str> = LIMIT_KEYS.iter().copied().chain(["name"]).collect();
    for (table, span) in desk.tables(table, "path") {
        desk.only(table, "limits.path", &known);
        let Some(name) = desk.filled_text(table, "name") else {
            if table.get("name").is_none() {
                let at = span.start..span.end.min(span.start + 1);
                desk.error(code::REVIEW_MISSING_KEY, at, "limits of a path must name it")
                    .hints
                    .push("write `name = \"...\"` under `[[limits.path]]`; `*` stands for any text".into());
            }
            continue;
        };
        let name = name.to_owned();
        paths.push(PathLimits { name, limits: limits(desk, table, all), line: desk.line(span.start) });
    }
    LimitRequest { all, paths }
}

/// The limits of a table, those of `base` where it gives none.
fn limits(desk: &mut Desk<'_>, table: &DeTable<'_>, base: Limits) -> Limits {
    let mut found = base;
    let quantities = [
        ("extra_inductance", Dimension::Inductance, &mut found.extra_inductance_h),
        ("extra_path", Dimension::Length, &mut found.extra_path_m),
    ];
    for (key, dimension, target) in quantities {
        if let Some(value) = table.get(key) {
            *target = desk.positive(value, key, dimension).unwrap_or(*target);
        }
    }
    let parts = [
        ("share_drop", 1.0, &mut found.share_drop),
        ("edge_density", 100.0, &mut found.edge_density),
        ("stray", 1.0, &mut found.stray),
        ("warn_at", 1.0, &mut found.warn_at),
    ];
    for (key, most, target) in parts {
        let Some(value) = table.get(key) else { continue };
        match desk.number(value, key) {
            Some(number) if number > 0.0 && number <= most => *target = number,
            Some(number) => {
                let text = format!("value `{key}` must be above zero and no more than {most}; got {number}");
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            }
            None => {}
        }
    }
    found
}

/// All waivers in the order of the file.
pub fn read_waivers(desk: &mut Desk<'_>, root: &DeTable<'_>) -> Vec<Waiver> {
    let mut waivers = Vec::new();
    for (table, span) in desk.tables(root, "waiver") {
        desk.only(table, "waiver", WAIVER_KEYS);
        let mut waiver = Waiver { line: desk.line(span.start), marks: Marks::default(), ..Waiver::default() };
        let targets = [
            ("code", &mut waiver.code),
            ("path", &mut waiver.path),
            ("reason", &mut waiver.reason),
            ("expires", &mut waiver.expires),
        ];
        let mut whole = true;
        for (key, target) in targets {
            match table.get(key) {
                Some(value) => {
                    waiver.marks.0.push((key, desk.line(value.span().start), value.span()));
                    match desk.filled_text(table, key) {
                        Some(text) => *target = text.to_owned(),
                        None => whole = false,
                    }
                }
                None => {
                    whole = false;
                    let at = span.start..span.end.min(span.start + 1);
                    let hint = match key {
                        "code" => "the code of a finding, as in findings.json",
                        "path" => "name of the path; `*` stands for any text",
                        "reason" => "why the finding is borne",
                        _ => "revision of the board with which the waiver ends",
                    };
                    desk.error(code::REVIEW_MISSING_KEY, at, format!("waiver must have the key `{key}`"))
                        .hints
                        .push(format!("write `{key} = \"...\"`: {hint}"));
                }
            }
        }
        if let Some(value) = table.get("code")
            && whole
            && !finding::FINDINGS.iter().any(|known| known.name == waiver.code)
        {
            let text = format!("value `code` must be the code of a finding; got `{}`", waiver.code);
            let near = nearest(&waiver.code, finding::FINDINGS.iter().map(|known| known.name));
            let message = desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            message.hints.extend(near.map(|name| format!("did you mean `{name}`?")));
            whole = false;
        }
        if whole {
            waivers.push(waiver);
        }
    }
    waivers
}
