//! The list of findings beside a map: number, what it is, where, and the best remedy that was computed.

use super::callout::{disc, disc_size};
use super::panel::heading;
use super::scene::Group;
use super::text::{Text, wrapped};
use crate::style::{Face, Style};

/// Most findings on a picture; the rest is counted.
pub const MOST: usize = 4;

/// A finding in the list. Texts may carry marks.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ListedFinding {
    /// Number in the set.
    pub number: String,
    /// What it is, in few words.
    pub title: String,
    /// Where, and against which limit.
    pub note: String,
    /// What mends it, with the computed gain.
    pub remedy: Option<String>,
}

/// Lines of an entry: face, whether soft ink, text.
fn lines(finding: &ListedFinding, width: f64, style: &Style) -> Vec<(Face, bool, String)> {
    let (body, tick) = (style.font.label, style.font.tick);
    let indent = 2.0 * disc_size(&finding.number, style).0 + 1.6;
    let room = width - indent;
    let mut all = Vec::new();
    let mut add = |face, size, soft, text: &str, most: usize| {
        let rows = wrapped(face, size, text, room);
        let cut = rows.len() > most;
        for (index, row) in rows.into_iter().take(most).enumerate() {
            let row = if cut && index + 1 == most { format!("{row} \u{2026}") } else { row };
            all.push((face, soft, row));
        }
    };
    add(Face::NarrowBold, body, false, &finding.title, 2);
    add(Face::Narrow, tick, true, &finding.note, 2);
    if let Some(remedy) = &finding.remedy {
        add(Face::Narrow, tick, false, &format!("\u{2192} {remedy}"), 3);
    }
    all
}

/// Height of the list in mm.
pub fn height(findings: &[ListedFinding], rest: usize, width: f64, style: &Style) -> f64 {
    let pitch = style.font.pitch();
    let rows = |finding| lines(finding, width, style).len() as f64 * 4.1 * pitch + 1.2;
    let more = if rest > 0 { 4.6 * pitch } else { 0.0 };
    6.6 * pitch + findings.iter().map(rows).sum::<f64>() + more
}

/// Draws the list with its upper left corner at `(x, y)`.
pub fn draw(x: f64, y: f64, width: f64, findings: &[ListedFinding], rest: usize, style: &Style) -> Group {
    let mut group = Group::new("findings-list").labeled("group", "findings");
    heading(&mut group, (x, y, width), style.word("Findings"), style);
    let pitch = style.font.pitch();
    let mut top = y + 6.6 * pitch;
    for finding in findings {
        let mut entry = Group::new("finding").labeled("group", format!("finding {}", finding.number));
        entry.id = format!("finding-{}", finding.number);
        let (half, _) = disc_size(&finding.number, style);
        disc(&mut entry, (x + half, top + 2.3 * pitch), &finding.number, style);
        let left = x + 2.0 * half + 1.6;
        for (index, (face, soft, line)) in lines(finding, width, style).into_iter().enumerate() {
            let size = if face == Face::NarrowBold { style.font.label } else { style.font.tick };
            let ink = if soft { style.color.ink_soft } else { style.color.ink };
            let base = top + (3.4 + 4.1 * index as f64) * pitch;
            entry.text(Text::new(left, base, size, face, ink, &line));
        }
        top += lines(finding, width, style).len() as f64 * 4.1 * pitch + 1.2;
        group.group(entry);
    }
    if rest > 0 {
        let words = format!("and {rest} more, see the findings file");
        let text =
            Text::new(x, top + 3.0 * pitch, style.font.tick, Face::Narrow, style.color.ink_soft, &words);
        group.text(text);
    }
    group
}
