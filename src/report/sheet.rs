//! `review.md`: the findings as CommonMark text, ready to paste into a ticket.

use crate::diag::Diagnostic;
use crate::finding::noise::{Noise, NoisePart};
use crate::finding::{Finding, Grade, Measured, digits, hertz, place, quantity};
use crate::geom::Point;
use std::fmt::Write as _;

/// What the text is about.
#[derive(Clone, Copy)]
pub struct SheetInput<'a> {
    /// Title of the board.
    pub title: &'a str,
    /// Its revision.
    pub revision: &'a str,
    /// Point of the files' coordinates that the review calls (0, 0).
    pub origin: Point,
    /// Findings in the order of their numbers.
    pub findings: &'a [&'a Finding],
    /// Names of the paths that were charted.
    pub paths: &'a [&'a str],
    /// Why paths or maps are missing.
    pub missing: &'a [&'a Diagnostic],
    /// The picture of a finding, relative to the text, where there is one.
    pub picture: &'a dyn Fn(&Finding) -> Option<String>,
    /// The contact sheet, relative to the text, where there is one.
    pub contact: Option<&'a str>,
    /// Noise in the paths.
    pub noise: &'a [Noise],
}

/// The text.
pub fn sheet(input: &SheetInput) -> Vec<u8> {
    let mut text = String::new();
    let title = if input.title.is_empty() { "Board" } else { input.title };
    let mut line = |words: &str| {
        text += words;
        text.push('\n');
    };
    line(&format!("# Return current: {}", plain(title)));
    line("");
    if !input.revision.is_empty() {
        line(&format!("Revision {}. {}", plain(input.revision), summary(input)));
    } else {
        line(&summary(input));
    }
    line("");
    if let Some(contact) = input.contact {
        line(&format!("![All maps on one sheet]({contact})"));
        line("");
    }
    let grades = [(Grade::Fail, "Above the limit"), (Grade::Warn, "Near the limit"), (Grade::Note, "Notes")];
    for (grade, heading) in grades {
        let of_grade: Vec<&&Finding> =
            input.findings.iter().filter(|f| f.grade == grade && f.waived.is_none()).collect();
        if of_grade.is_empty() {
            continue;
        }
        line(&format!("## {heading}"));
        line("");
        of_grade.iter().for_each(|finding| line(&entry(finding, input)));
    }
    let waived: Vec<&&Finding> = input.findings.iter().filter(|f| f.waived.is_some()).collect();
    if !waived.is_empty() {
        line("## Waived");
        line("");
        waived.iter().for_each(|finding| line(&entry(finding, input)));
    }
    let totals: Vec<&Noise> = input.noise.iter().filter(|noise| noise.band.is_none()).collect();
    if !totals.is_empty() {
        line("## Noise between paths");
        line("");
        totals.iter().for_each(|noise| line(&noise_item(noise)));
        line("");
    }
    if !input.missing.is_empty() {
        line("## Not charted");
        line("");
        input.missing.iter().for_each(|reason| line(&format!("- {}", marked(&reason.text))));
        line("");
    }
    line("## How to read this");
    line("");
    line(
        "Figures are those of the worst band; the error is numerical. Limits act on what voids add to the same path \
         without voids, and on noise. A remedy was tried by the solver on the changed board. `ebbmap explain CODE` \
         says what a code means.",
    );
    line("");
    line(
        "These figures are no proof of electromagnetic compatibility or of safety. Where mains, patients or other \
         hazards are near, do not bridge, fill or narrow a gap because a figure would be better: local codes and \
         standards apply, and a licensed practitioner decides.",
    );
    text.into_bytes()
}

/// The findings as plain text for a terminal, worst first, with a last line that sums up.
pub fn listing(input: &SheetInput) -> String {
    let mut text = String::new();
    let mut ordered: Vec<&&Finding> = input.findings.iter().collect();
    ordered.sort_by_key(|finding| (finding.waived.is_some(), finding.grade, finding.number));
    for finding in ordered {
        let grade = if finding.waived.is_some() { "waived" } else { finding.grade.name() };
        // Writing to a string cannot fail.
        let _ = writeln!(
            text,
            "{grade:<6} {:<5} [{}] {}",
            finding.number.to_string(),
            finding.code.name,
            finding.sentence
        );
        let _ = writeln!(
            text,
            "             at L{}, {}; {}",
            finding.place.layer + 1,
            place(finding.place.at, input.origin),
            figure(finding)
        );
        let _ = writeln!(text, "             cause: {}", finding.cause_text);
        if let Some(remedy) = remedy(finding) {
            let _ = writeln!(text, "             remedy: {remedy}");
        }
        if let Some(waived) = &finding.waived {
            let _ = writeln!(text, "             waived until {}: {}", waived.expires, waived.reason);
        }
    }
    text + &summary(input) + "\n"
}

fn summary(input: &SheetInput) -> String {
    let count =
        |grade: Grade| input.findings.iter().filter(|f| f.grade == grade && f.waived.is_none()).count();
    let waived = input.findings.iter().filter(|f| f.waived.is_some()).count();
    let mut words = vec![
        format!("{} above the limit", count(Grade::Fail)),
        format!("{} near it", count(Grade::Warn)),
        match count(Grade::Note) {
            1 => "1 note".to_owned(),
            notes => format!("{notes} notes"),
        },
    ];
    if waived > 0 {
        words.push(format!("{waived} waived"));
    }
    let paths = match input.paths.len() {
        1 => "1 path".to_owned(),
        paths => format!("{paths} paths"),
    };
    format!("{paths} charted: {}.", words.join(", "))
}

fn entry(finding: &Finding, input: &SheetInput) -> String {
    let mut text = format!("### {} {}\n\n", finding.number, marked(&finding.sentence));
    let mut item = |name: &str, words: String| {
        let _ = writeln!(text, "- {name}: {words}");
    };
    let plane = finding.plane.as_ref().map(|plane| format!(" on plane {}", code(&plane.to_string())));
    item(
        "Code",
        format!("{}, path {}{}", code(finding.code.name), code(&finding.path), plane.unwrap_or_default()),
    );
    let band = match (&finding.band, finding.frequency_hz) {
        (Some(band), Some(frequency)) => format!(", band {} at {}", plain(band), hertz(frequency)),
        _ => String::new(),
    };
    item("Place", format!("{} on L{}{band}", place(finding.place.at, input.origin), finding.place.layer + 1));
    item("Figure", figure(finding));
    item("Cause", marked(&finding.cause_text));
    if let Some(remedy) = remedy(finding) {
        item("Remedy", marked(&remedy));
    }
    if let Some(waived) = &finding.waived {
        item("Waived", format!("{}, until revision {}", plain(&waived.reason), plain(&waived.expires)));
    }
    if let Some(picture) = (input.picture)(finding) {
        item("Map", format!("[{}]({})", plain(&picture), target(&picture)));
    }
    text
}

/// One line on the noise in a path: total, budget, and the largest sources.
fn noise_item(noise: &Noise) -> String {
    let volts = |volts: f64| quantity(Measured::Noise, volts);
    let lsb = noise.lsb.map(|lsb| format!(", {} LSB", digits(lsb))).unwrap_or_default();
    let budget = noise.budget_v.map(|budget| format!(", budget {}", volts(budget))).unwrap_or_default();
    let part = |part: &NoisePart| format!("{} from {}", volts(part.volts_rms), code(&part.from));
    let parts: Vec<String> = noise.parts.iter().take(3).map(part).collect();
    format!("- {}: {} rms{lsb}{budget}; {}", code(&noise.path), volts(noise.volts_rms), parts.join(", "))
}

/// The figure with its error and limit.
fn figure(finding: &Finding) -> String {
    let excess = &finding.excess;
    let name = match excess.what {
        Measured::ExtraInductance => "extra loop inductance",
        Measured::ExtraPath => "extra path",
        Measured::ShareDrop => "share within 3h lost",
        Measured::EdgeDensity => "density at the edge in parts of 1/(pi h)",
        Measured::Stray => "stray more than without voids",
        Measured::Noise => "noise, rms",
        Measured::Transfer => "transfer impedance",
        Measured::Share => "share within 3h",
    };
    let value = quantity(excess.what, excess.value);
    let error = quantity(excess.what, excess.error);
    let limit = excess.limit.map(|limit| format!(", limit {}", quantity(excess.what, limit)));
    format!("{name} {value}, error {error}{}", limit.unwrap_or_default())
}

fn remedy(finding: &Finding) -> Option<String> {
    let remedy = finding.remedy.as_ref()?;
    let what = finding.excess.what;
    let share = if remedy.before != 0.0 { 100.0 * remedy.gain() / remedy.before } else { 0.0 };
    Some(format!(
        "{}; computed gain {} of {} ({} %, error {})",
        remedy.action,
        quantity(what, remedy.gain()),
        quantity(what, remedy.before),
        digits(share),
        quantity(what, remedy.error)
    ))
}

/// Text without markup: what CommonMark would take for it is escaped.
fn plain(text: &str) -> String {
    let mut escaped = String::new();
    for c in text.chars() {
        if c.is_control() {
            escaped.push(' ');
            continue;
        }
        if "\\`*_{}[]<>()#+-!|~&".contains(c) {
            escaped.push('\\');
        }
        escaped.push(c);
    }
    escaped
}

/// Text with names in back quotes, which become code; the rest is escaped.
fn marked(text: &str) -> String {
    let mut out = String::new();
    for (index, piece) in text.split('`').enumerate() {
        out += &if index % 2 == 0 { escaped_lightly(piece) } else { code(piece) };
    }
    out
}

/// Escapes what starts markup inside a sentence.
fn escaped_lightly(text: &str) -> String {
    let mut escaped = String::new();
    for c in text.chars() {
        if "\\*_[]<>&".contains(c) {
            escaped.push('\\');
        }
        escaped.push(if c.is_control() { ' ' } else { c });
    }
    escaped
}

/// A name as code.
fn code(name: &str) -> String {
    format!("`{}`", name.replace('`', "'"))
}

/// A relative file as the target of a link.
fn target(file: &str) -> String {
    let mut text = String::new();
    for byte in file.bytes() {
        if byte.is_ascii_alphanumeric() || b"-_.~/@".contains(&byte) {
            text.push(char::from(byte));
        } else {
            let _ = write!(text, "%{byte:02X}");
        }
    }
    text
}
