//! The review file: TOML to [`Review`], with every problem of the file listed at its exact place.
//!
//! The tree of values is walked by hand instead of through derived types, since each value must keep its place and
//! reading must go on after the first problem. Unknown keys are errors: a mistyped key would change the result
//! silently.

mod bands;
mod desk;
mod drives;
mod joints;
mod limits;
mod nets;
mod paths;
mod zones;

use crate::diag::Diagnostic;
use crate::diag::code::review as code;
use crate::review::{Model, Review, SolverRequest, StackupOverride};
use crate::unit::Dimension;
use desk::{Desk, Value};
use std::path::Path;
use toml::de::DeTable;

/// A review as read.
#[derive(Clone, Debug)]
pub struct ReviewFile {
    /// Name of the file, without folders.
    pub name: String,
    /// Its text, for messages that show a line.
    pub text: String,
    /// The review; none where the file has errors.
    pub review: Option<Review>,
    /// All problems and notes, in the order of the file.
    pub messages: Vec<Diagnostic>,
}

/// Reads the review at `path`. Files that it names are taken relative to its folder.
pub fn read_review(path: &Path) -> ReviewFile {
    let name = path.file_name().map_or_else(String::new, |name| name.to_string_lossy().into_owned());
    let failed = |text: String| ReviewFile {
        name: name.clone(),
        text: String::new(),
        review: None,
        messages: vec![Diagnostic::error(code::REVIEW_UNREADABLE, text)],
    };
    let bytes = match std::fs::read(path) {
        Ok(bytes) => bytes,
        Err(error) => return failed(format!("review `{}` cannot be read: {error}", path.display())),
    };
    match String::from_utf8(bytes) {
        Ok(text) => parse_review(&text, &name, path.parent().unwrap_or(Path::new(""))),
        Err(error) => {
            let at = error.utf8_error().valid_up_to();
            failed(format!("review `{}` must be text in UTF-8; byte {at} is not", path.display()))
        }
    }
}

/// Reads the text of a review called `name` that lies in `folder`.
pub fn parse_review(text: &str, name: &str, folder: &Path) -> ReviewFile {
    let mut desk = Desk::new(text, name);
    let (root, faults) = DeTable::parse_recoverable(text);
    for fault in &faults {
        let span = fault.span().unwrap_or(0..0);
        desk.error(code::REVIEW_SYNTAX, span, format!("review must be valid TOML; {}", fault.message()));
    }
    let mut review = Review { file: name.into(), ..Review::default() };
    fill(&mut desk, root.get_ref(), folder, &mut review, faults.is_empty());
    let mut messages = desk.messages;
    messages.sort_by_key(|message| message.place.span.as_ref().map(|span| (span.start, span.end)));
    messages.dedup();
    let usable = messages.iter().all(|message| message.severity < crate::diag::Severity::Error);
    ReviewFile { name: name.into(), text: text.into(), review: usable.then_some(review), messages }
}

const TABLES: &[&str] = &[
    "schema",
    "board",
    "stackup",
    "reference",
    "net",
    "path",
    "pair",
    "part",
    "tie",
    "zone",
    "band",
    "solver",
    "limits",
    "waiver",
];

/// `whole` is false after a syntax error: what is missing then may only have been lost.
fn fill(desk: &mut Desk<'_>, root: &DeTable<'_>, folder: &Path, review: &mut Review, whole: bool) {
    desk.only(root, "", TABLES);
    schema(desk, root, whole);
    if let Some(table) = desk.table(root, "board") {
        board(desk, table, folder, review);
    }
    let has_files = root.get("board").is_none_or(|board| board.get_ref().get("files").is_some());
    if whole && (root.get("board").is_none() || !has_files) {
        let at = root.keys().find(|key| key.get_ref() == "board").map_or(0..0, toml::Spanned::span);
        let hint = "write `files = \"fab\"` under `[board]`: folder or ZIP, relative to the review";
        desk.error(code::REVIEW_MISSING_KEY, at, "review must name the fabrication data of its board")
            .hints
            .push(hint.into());
    }
    if let Some(table) = desk.table(root, "stackup") {
        review.stackup = stackup(desk, table);
    }
    reference(desk, root, review, whole);
    review.nets = nets::read(desk, root, review.origin);
    review.paths = paths::read_paths(desk, root, review.origin);
    review.pairs = paths::read_pairs(desk, root);
    review.parts = joints::read_parts(desk, root);
    review.ties = joints::read_ties(desk, root, review.origin);
    paths::ensure_distinct(desk, root);
    if whole && ["net", "path", "pair"].iter().all(|kind| root.get(*kind).is_none()) {
        desk.error(code::REVIEW_MISSING_KEY, 0..0, "review must chart one net, path or pair at least")
            .hints
            .push("add `[[net]]` with `name = \"...\"`".into());
    }
    review.zones = zones::read(desk, root, review.origin);
    review.bands = bands::read(desk, root);
    review.limits = limits::read(desk, root);
    review.waivers = limits::read_waivers(desk, root);
    if let Some(table) = desk.table(root, "solver") {
        review.solver = solver(desk, table);
    }
}

fn schema(desk: &mut Desk<'_>, root: &DeTable<'_>, whole: bool) {
    match root.get("schema") {
        Some(value) => {
            if let Some(number) = desk.number(value, "schema")
                && number != 1.0
            {
                let text = format!("value `schema` must be 1, the only form known here; got {number}");
                desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
            }
        }
        None if whole => {
            desk.error(code::REVIEW_MISSING_KEY, 0..0, "review must say its form")
                .hints
                .push("write `schema = 1` in the first line".into());
        }
        None => {}
    }
}

fn board(desk: &mut Desk<'_>, table: &DeTable<'_>, folder: &Path, review: &mut Review) {
    desk.only(table, "board", &["files", "title", "revision", "origin"]);
    if let Some(files) = desk.filled_text(table, "files") {
        review.files = folder.join(files);
    }
    review.title = desk.text(table, "title").unwrap_or_default().into();
    review.revision = desk.text(table, "revision").unwrap_or_default().into();
    if let Some(value) = table.get("origin") {
        review.origin = desk.point(value, "origin").unwrap_or_default();
    }
}

fn stackup(desk: &mut Desk<'_>, table: &DeTable<'_>) -> StackupOverride {
    desk.only(table, "stackup", &["copper", "dielectric", "permittivity", "temperature", "plating"]);
    let mut found = StackupOverride::default();
    for (key, target) in [("copper", &mut found.copper_m), ("dielectric", &mut found.dielectric_m)] {
        for value in desk.list(table, key, "thicknesses").unwrap_or_default() {
            target.push(if kept(value) { None } else { desk.positive(value, key, Dimension::Length) });
        }
    }
    for value in desk.list(table, "permittivity", "numbers").unwrap_or_default() {
        let number = if kept(value) { None } else { desk.number(value, "permittivity") };
        if number.is_some_and(|number| number < 1.0) {
            desk.error(code::REVIEW_BAD_VALUE, value.span(), "value `permittivity` must be 1 at least");
        }
        found.permittivity.push(number);
    }
    if let Some(value) = table.get("plating") {
        found.plating_m = desk.positive(value, "plating", Dimension::Length);
    }
    if let Some(value) = table.get("temperature") {
        found.temperature_c = desk.quantity(value, "temperature", Dimension::Temperature);
        if found.temperature_c.is_some_and(|celsius| !(-200.0..=300.0).contains(&celsius)) {
            let text = "value `temperature` must lie between -200 and 300 degC";
            desk.error(code::REVIEW_BAD_VALUE, value.span(), text);
        }
    }
    found
}

/// Whether an entry of a stackup list keeps the value of the files.
fn kept(value: &Value<'_>) -> bool {
    value.get_ref().as_str() == Some("")
}

fn reference(desk: &mut Desk<'_>, root: &DeTable<'_>, review: &mut Review, whole: bool) {
    let Some(table) = desk.table(root, "reference") else {
        if whole && root.get("reference").is_none() {
            desk.error(code::REVIEW_MISSING_KEY, 0..0, "review must name the nets that carry the return")
                .hints
                .push("write `nets = [\"GND\"]` under `[reference]`".into());
        }
        return;
    };
    desk.only(table, "reference", &["nets"]);
    let names = desk.list(table, "nets", "net names").unwrap_or_default();
    for value in &names {
        let Some(name) = desk.as_text(value, "nets") else { continue };
        if name.is_empty() {
            desk.error(
                code::REVIEW_BAD_VALUE,
                value.span(),
                "a net name under `[reference]` must not be empty",
            );
        } else if review.reference_nets.iter().any(|known| known == name) {
            desk.error(
                code::REVIEW_DUPLICATE,
                value.span(),
                format!("net `{name}` must stand only once under `[reference]`"),
            );
        } else {
            review.reference_nets.push(name.into());
        }
    }
    if names.is_empty() && (whole || table.get("nets").is_some()) {
        let span = match table.get("nets") {
            Some(value) => value.span(),
            None => root.keys().find(|key| key.get_ref() == "reference").map_or(0..0, toml::Spanned::span),
        };
        desk.error(code::REVIEW_MISSING_KEY, span, "table `reference` must name one net at least")
            .hints
            .push("write `nets = [\"GND\"]`".into());
    }
}

fn solver(desk: &mut Desk<'_>, table: &DeTable<'_>) -> SolverRequest {
    desk.only(table, "solver", &["model", "cell"]);
    let mut found = SolverRequest::default();
    if let Some(name) = desk.text(table, "model") {
        found.model = match name {
            "sheet" => Model::Sheet,
            "spread" => Model::Spread,
            other => {
                let span = table.get("model").map_or(0..0, toml::Spanned::span);
                let text = format!("value `model` must be `sheet` or `spread`; got `{other}`");
                desk.error(code::REVIEW_BAD_VALUE, span, text);
                Model::Sheet
            }
        };
    }
    if let Some(value) = table.get("cell") {
        found.cell_m = desk.positive(value, "cell", Dimension::Length);
    }
    found
}
