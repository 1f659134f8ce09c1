//! Style files (`styles/*.toml`): TOML to a checked [`Style`], every fault with its line.

use crate::diag::{Diagnostic, code::style as code};
use crate::style::{
    ChangeLook, Colors, DensityLook, Gradient, LABELS, Lettering, Lines, PairLook, Rgb, Rules, Sheet, Style,
    check, gradient_names,
};
use serde::Deserialize;
use std::collections::BTreeMap;
use std::ops::Range;

/// The styles that come with the program: name and text.
pub const BUILT_IN: [(&str, &str); 4] = [
    ("paper", include_str!("../../styles/paper.toml")),
    ("screen", include_str!("../../styles/screen.toml")),
    ("mono", include_str!("../../styles/mono.toml")),
    ("large", include_str!("../../styles/large.toml")),
];

/// A style that comes with the program. The faults of an unknown name list the known ones.
pub fn built_in(name: &str) -> Result<Style, Vec<Diagnostic>> {
    match BUILT_IN.iter().find(|(known, _)| *known == name) {
        Some((_, text)) => load(text, &format!("styles/{name}.toml")),
        None => {
            let names: Vec<String> = BUILT_IN.iter().map(|(name, _)| format!("`{name}`")).collect();
            let text = format!("style `{name}` is neither one of the program's nor a file");
            let hint = format!("take {}, or give the path of a style file", names.join(" or "));
            Err(vec![Diagnostic::error(code::STYLE_SYNTAX, text).hint(hint)])
        }
    }
}

/// A style from the text of a style file; `file` is its path for messages.
pub fn load(text: &str, file: &str) -> Result<Style, Vec<Diagnostic>> {
    let parsed: StyleFile = toml::from_str(text).map_err(|error| {
        let message = error.message().trim_end_matches('.').to_owned();
        let fault = Diagnostic::error(code::STYLE_SYNTAX, message);
        vec![placed(fault, text, file, error.span())]
    })?;
    let mut faults = Vec::new();
    let style = parsed.build(&mut |key: &str, message: String| {
        let fault = Diagnostic::error(code::STYLE_SYNTAX, message);
        faults.push(placed(fault, text, file, span_of(text, key)));
    });
    let Some(style) = style.filter(|_| faults.is_empty()) else { return Err(faults) };
    let broken = check(&style).into_iter().map(|fault| {
        placed(Diagnostic::error(code::STYLE_RULE, fault.text), text, file, span_of(text, &fault.key))
    });
    let broken: Vec<Diagnostic> = broken.collect();
    if broken.is_empty() { Ok(style) } else { Err(broken) }
}

fn placed(mut fault: Diagnostic, text: &str, file: &str, span: Option<Range<usize>>) -> Diagnostic {
    let line = span.as_ref().map(|span| text[..span.start.min(text.len())].matches('\n').count() as u32 + 1);
    fault.place.file = Some(file.to_owned());
    fault.place.line = line;
    fault.place.span = span;
    fault
}

/// Bytes of the value at a dotted key.
fn span_of(text: &str, key: &str) -> Option<Range<usize>> {
    let root = toml::de::DeTable::parse(text).ok()?;
    let (table, name) = match key.split_once('.') {
        Some((table, name)) => (root.get_ref().get(table)?.get_ref().as_table()?, name),
        None => (root.get_ref(), key),
    };
    Some(table.get(name)?.span())
}

/// Reports a fault at a dotted key.
type Report<'a> = &'a mut dyn FnMut(&str, String);

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct StyleFile {
    schema: u32,
    name: String,
    #[serde(default, rename = "note")]
    _note: String,
    font: FontTable,
    colour: ColorTable,
    line: LineTable,
    density: DensityTable,
    change: ChangeTable,
    pair: PairTable,
    series: GradientTable,
    sheet: SheetTable,
    rules: RuleTable,
    #[serde(default)]
    labels: BTreeMap<String, String>,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct FontTable {
    family: String,
    narrow: String,
    fallback: String,
    headline: f64,
    lead: f64,
    body: f64,
    value: f64,
    tick: f64,
    label: f64,
    field: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct ColorTable {
    page: String,
    panel: String,
    ink: String,
    ink_soft: String,
    rule: String,
    hair: String,
    mark: String,
    mark_text: String,
    plane_edge: String,
    void_edge: String,
    boundary: String,
    part: String,
    track: String,
    track_case: String,
    on_dark: String,
    on_light: String,
    over: String,
    worse: String,
    better: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct LineTable {
    plane_edge: f64,
    void_edge: f64,
    boundary: f64,
    track: f64,
    track_case: f64,
    contour: [f64; 3],
    contour_dash: [String; 3],
    boundary_dash: String,
    part: f64,
    leader: f64,
    frame: f64,
    rule: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct DensityTable {
    map: Option<String>,
    stops: Option<Vec<String>>,
    #[serde(default)]
    turn_over: bool,
    #[serde(default = "whole")]
    clip: [f64; 2],
    /// Number of even steps; 0 for a smooth map.
    #[serde(default)]
    steps: usize,
    range_db: f64,
}

fn whole() -> [f64; 2] {
    [0.0, 1.0]
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct GradientTable {
    map: String,
    turn_over: bool,
    clip: [f64; 2],
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct ChangeTable {
    low: [String; 3],
    zero: String,
    high: [String; 3],
    dead_db: f64,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct PairTable {
    hue_a: f64,
    hue_b: f64,
    light: [f64; 2],
    range_db: [f64; 2],
    #[serde(default = "usual_chroma")]
    chroma: f64,
}

fn usual_chroma() -> f64 {
    0.17
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct SheetTable {
    ticket: SheetEntry,
    set: SheetEntry,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct SheetEntry {
    w: f64,
    h: f64,
    px: u32,
    margin: Margin,
}

#[derive(Deserialize)]
#[serde(untagged)]
enum Margin {
    Same(f64),
    Each([f64; 4]),
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct RuleTable {
    text_min: f64,
    mark_min: f64,
    text_size_min: f64,
}

impl StyleFile {
    fn build(self, report: Report<'_>) -> Option<Style> {
        if self.schema != 1 {
            report("schema", format!("schema must be 1; got {}", self.schema));
        }
        let font = self.font.build(report);
        let color = self.colour.build(report);
        let line = self.line.build(report);
        let density = self.density.gradient(report);
        let labels = labels(self.labels, report);
        let series = gradient("series", &self.series.map, self.series.turn_over, self.series.clip, report);
        let change = self.change.build(report);
        let ticket = self.sheet.ticket.build("sheet.ticket", report);
        let set = self.sheet.set.build("sheet.set", report);
        Some(Style {
            name: self.name,
            font,
            color,
            line,
            density: DensityLook { gradient: density?, range_db: self.density.range_db },
            change,
            pair: PairLook {
                hue_a: self.pair.hue_a,
                hue_b: self.pair.hue_b,
                light: self.pair.light,
                range_db: self.pair.range_db,
                chroma: self.pair.chroma,
            },
            series: series?,
            ticket,
            set,
            rules: Rules {
                text_min: self.rules.text_min,
                mark_min: self.rules.mark_min,
                text_size_min: self.rules.text_size_min,
            },
            labels,
        })
    }
}

fn rgb(key: &str, text: &str, report: Report<'_>) -> Rgb {
    Rgb::parse(text).unwrap_or_else(|| {
        report(key, format!("color must be written #RRGGBB; got `{text}`"));
        Rgb::default()
    })
}

fn gradient(table: &str, map: &str, turn: bool, clip: [f64; 2], report: Report<'_>) -> Option<Gradient> {
    if !(0.0 <= clip[0] && clip[0] < clip[1] && clip[1] <= 1.0) {
        let message = format!("clip must be two rising numbers from 0 to 1; got [{}, {}]", clip[0], clip[1]);
        report(&format!("{table}.clip"), message);
        return None;
    }
    let found = Gradient::named(map, turn, clip);
    if found.is_none() {
        let names: Vec<&str> = gradient_names().collect();
        report(&format!("{table}.map"), format!("map must be one of {}; got `{map}`", names.join(", ")));
    }
    found
}

impl DensityTable {
    fn gradient(&self, report: Report<'_>) -> Option<Gradient> {
        if self.steps == 1 || self.steps > 60 {
            report(
                "density.steps",
                format!("steps must be 0 for a smooth map, or 2 to 60; got {}", self.steps),
            );
            return None;
        }
        let smooth = match (&self.map, &self.stops) {
            (Some(map), None) => gradient("density", map, self.turn_over, self.clip, report)?,
            (None, Some(stops)) => {
                if self.turn_over || self.clip != whole() {
                    report(
                        "density.stops",
                        "`turn_over` and `clip` belong to `map`, not to `stops`".to_owned(),
                    );
                }
                let colors: Vec<Rgb> = stops.iter().map(|stop| rgb("density.stops", stop, report)).collect();
                let found = Gradient::through(&colors);
                if found.is_none() {
                    report(
                        "density.stops",
                        format!("stops must be two colors or more; got {}", colors.len()),
                    );
                }
                found?
            }
            (map, _) => {
                let got = if map.is_some() { "both" } else { "none" };
                report("density", format!("density needs either `map` or `stops`; got {got}"));
                return None;
            }
        };
        Some(if self.steps > 0 { smooth.stepped(self.steps) } else { smooth })
    }
}

/// Words in place of the program's own, each key one of [`LABELS`].
fn labels(table: BTreeMap<String, String>, report: Report<'_>) -> Vec<(String, String)> {
    for (word, own) in &table {
        if !LABELS.contains(&word.as_str()) {
            let near = crate::diag::nearest(word, LABELS.iter().copied());
            let hint = near.map_or(String::new(), |near| format!("; `{near}` is one"));
            report("labels", format!("label `{word}` must be a word of the pictures{hint}"));
        } else if own.trim().is_empty() || own.chars().count() > 60 {
            report("labels", format!("label for `{word}` must have 1 to 60 characters"));
        }
    }
    table.into_iter().collect()
}

/// A positive length of at most half a meter.
fn length(key: &str, value_mm: f64, report: Report<'_>) -> f64 {
    if !(value_mm > 0.0 && value_mm <= 500.0) {
        report(key, format!("length must be above 0 mm and at most 500 mm; got {value_mm} mm"));
    }
    value_mm
}

fn dashes(key: &str, text: &str, report: Report<'_>) -> Vec<f64> {
    let mut all = Vec::new();
    for part in text.split_whitespace() {
        match part.parse::<f64>() {
            Ok(value) if value > 0.0 && value <= 100.0 => all.push(value),
            _ => report(key, format!("dash must be a number of mm above 0 and at most 100; got `{part}`")),
        }
    }
    all
}

impl FontTable {
    fn build(self, report: Report<'_>) -> Lettering {
        let bundled =
            [("family", &self.family, "IBM Plex Sans"), ("narrow", &self.narrow, "IBM Plex Sans Condensed")];
        for (key, got, known) in bundled {
            if got != known {
                report(
                    &format!("font.{key}"),
                    format!("family must be `{known}`, which is bundled; got `{got}`"),
                );
            }
        }
        Lettering {
            fallback: self.fallback,
            headline: length("font.headline", self.headline, report),
            lead: length("font.lead", self.lead, report),
            body: length("font.body", self.body, report),
            value: length("font.value", self.value, report),
            tick: length("font.tick", self.tick, report),
            label: length("font.label", self.label, report),
            field: length("font.field", self.field, report),
        }
    }
}

impl ColorTable {
    fn build(self, report: Report<'_>) -> Colors {
        let mut get = |key: &str, text: &str| rgb(&format!("colour.{key}"), text, report);
        Colors {
            page: get("page", &self.page),
            panel: get("panel", &self.panel),
            ink: get("ink", &self.ink),
            ink_soft: get("ink_soft", &self.ink_soft),
            rule: get("rule", &self.rule),
            hair: get("hair", &self.hair),
            mark: get("mark", &self.mark),
            mark_text: get("mark_text", &self.mark_text),
            plane_edge: get("plane_edge", &self.plane_edge),
            void_edge: get("void_edge", &self.void_edge),
            boundary: get("boundary", &self.boundary),
            part: get("part", &self.part),
            track: get("track", &self.track),
            track_case: get("track_case", &self.track_case),
            on_dark: get("on_dark", &self.on_dark),
            on_light: get("on_light", &self.on_light),
            over: get("over", &self.over),
            worse: get("worse", &self.worse),
            better: get("better", &self.better),
        }
    }
}

impl LineTable {
    fn build(self, report: Report<'_>) -> Lines {
        let contour_dash = self.contour_dash.map(|text| dashes("line.contour_dash", &text, report));
        let contour = self.contour.map(|width| length("line.contour", width, report));
        Lines {
            plane_edge: length("line.plane_edge", self.plane_edge, report),
            void_edge: length("line.void_edge", self.void_edge, report),
            boundary: length("line.boundary", self.boundary, report),
            track: length("line.track", self.track, report),
            track_case: length("line.track_case", self.track_case, report),
            contour,
            part: length("line.part", self.part, report),
            leader: length("line.leader", self.leader, report),
            frame: length("line.frame", self.frame, report),
            rule: length("line.rule", self.rule, report),
            contour_dash,
            boundary_dash: dashes("line.boundary_dash", &self.boundary_dash, report),
        }
    }
}

impl ChangeTable {
    fn build(self, report: Report<'_>) -> ChangeLook {
        ChangeLook {
            low: self.low.map(|text| rgb("change.low", &text, report)),
            zero: rgb("change.zero", &self.zero, report),
            high: self.high.map(|text| rgb("change.high", &text, report)),
            dead_db: self.dead_db,
        }
    }
}

impl SheetEntry {
    fn build(self, key: &str, report: Report<'_>) -> Sheet {
        if !(200..=8000).contains(&self.px) {
            report(key, format!("px must be from 200 to 8000; got {}", self.px));
        }
        let margin = match self.margin {
            Margin::Same(all) => [all; 4],
            Margin::Each(each) => each,
        };
        let (width, height) = (length(key, self.w, report), length(key, self.h, report));
        Sheet { width, height, px: self.px, margin }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn built_in_styles_keep_all_rules() {
        for (name, _) in BUILT_IN {
            match built_in(name) {
                Ok(style) => assert_eq!(style.name, name),
                Err(faults) => panic!("{name}: {faults:#?}"),
            }
        }
        assert!(built_in("sepia").is_err());
    }

    fn changed(from: &str, to: &str) -> Vec<Diagnostic> {
        let text = BUILT_IN[0].1;
        assert!(text.contains(from), "the test must change something: {from}");
        load(&text.replacen(from, to, 1), "my.toml").err().unwrap_or_default()
    }

    /// A user's copy with stops of its own and other words; stops that turn in lightness are refused.
    #[test]
    fn stops_and_words_of_a_user_are_taken_or_refused() {
        let own = |stops: &str| {
            let text = BUILT_IN[0].1.replacen("map        = \"MAGMA\"", stops, 1);
            let text = text.replacen("turn_over  = true", "", 1).replacen("clip       = [0.02, 0.95]", "", 1);
            load(&format!("{text}\n[labels]\n\"Key figures\" = \"Kennzahlen\"\n"), "my.toml")
        };
        match own("stops      = [\"#DCE9F5\", \"#4A7FB5\", \"#08203A\"]") {
            Ok(style) => {
                assert_eq!(style.word("Key figures"), "Kennzahlen");
                assert_eq!(style.word("track"), "track");
                assert_eq!(style.density.gradient.colors()[0], Rgb(0xDC, 0xE9, 0xF5));
            }
            Err(faults) => panic!("{faults:#?}"),
        }
        let faults = own("stops      = [\"#DCE9F5\", \"#08203A\", \"#4A7FB5\"]").err().unwrap_or_default();
        assert!(faults.iter().any(|fault| fault.text.contains("lightness")), "{faults:#?}");
    }

    #[test]
    fn faults_name_line_and_rule() {
        let cases = [
            ("ink        = \"#15181E\"", "ink        = \"#999999\"", "contrast of `ink`"),
            ("ink        = \"#15181E\"", "ink        = \"black\"", "#RRGGBB"),
            ("map        = \"MAGMA\"", "map        = \"TURBO\"", "lightness"),
            ("map        = \"MAGMA\"", "map        = \"JET\"", "must be one of"),
            ("turn_over  = true", "turn_over  = false", "stand out"),
            ("tick       = 3.3", "tick       = 2.0", "at least 3.2 mm"),
            ("schema  = 1", "schema  = 2", "schema must be 1"),
            ("page       =", "paper      =", "unknown field `paper`"),
            ("boundary_dash = \"6 1", "boundary_dash = \"6 -1", "dash must be"),
            ("family     = \"IBM Plex Sans\"", "family     = \"Comic\"", "bundled"),
            ("range_db   = 60", "range_db   = 60\nsteps      = 1", "steps must be"),
            (
                "map        = \"MAGMA\"",
                "stops      = [\"#FFFFFF\", \"#000000\", \"#FFFFFF\"]",
                "belong to `map`",
            ),
            ("\n[rules]\n", "\n[labels]\n\"Key figurs\" = \"Zahlen\"\n[rules]\n", "`Key figures` is one"),
        ];
        for (from, to, word) in cases {
            let faults = changed(from, to);
            let found = faults.iter().find(|fault| fault.text.contains(word));
            let Some(fault) = found else { panic!("{to}: {faults:#?}") };
            assert!(fault.place.line.is_some_and(|line| line >= 3), "{to}: {fault:?}");
            assert_eq!(fault.place.file.as_deref(), Some("my.toml"));
        }
    }
}
