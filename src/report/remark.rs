//! What a ticket map says about a net beyond its figures: findings on the map and in the list, what joints carry.

use super::TicketInput;
use super::words::{millimeters, percent};
use crate::draw::callout::Callout;
use crate::draw::joint::{JointForm, JointMark};
use crate::draw::list::{ListedFinding, MOST};
use crate::draw::{plain, significant, with_prefix};
use crate::field::JointCurrent;
use crate::finding::{Cause, Finding, Grade, Measured};
use crate::plan::JointKind;

/// Findings of a sheet as it shows them.
#[derive(Clone, Debug, Default)]
pub(super) struct Remarks {
    /// On the map.
    pub(super) callouts: Vec<Callout>,
    /// In the list.
    pub(super) listed: Vec<ListedFinding>,
    /// How many more there are.
    pub(super) rest: usize,
    sentences: Vec<String>,
}

/// Whether a finding concerns this plane and band.
fn is_here(finding: &Finding, input: &TicketInput) -> bool {
    finding.plane.as_ref().is_none_or(|plane| *plane == input.chart.plane)
        && finding.band.as_ref().is_none_or(|band| *band == input.band.name)
}

/// The most serious finding of this plane and band that is more than a note.
pub(super) fn worst_here<'a>(input: &TicketInput<'a>) -> Option<&'a Finding> {
    let all = input.findings?.iter();
    all.filter(|finding| finding.grade != Grade::Note).find(|finding| is_here(finding, input))
}

impl Remarks {
    pub(super) fn of(input: &TicketInput) -> Self {
        let all: &[Finding] = input.findings.unwrap_or_default();
        // Those of this plane and band first, each group as it comes: most serious first.
        let (here, elsewhere): (Vec<&Finding>, Vec<&Finding>) =
            all.iter().partition(|finding| is_here(finding, input));
        let same_plane =
            |finding: &&&Finding| finding.plane.as_ref().is_none_or(|plane| *plane == input.chart.plane);
        let mut shown: Vec<&Finding> =
            here.iter().copied().chain(elsewhere.iter().filter(same_plane).copied()).collect();
        // Notes last, whatever their band.
        shown.sort_by_key(|finding| finding.grade == Grade::Note);
        let on_map = here.iter().take(MOST).filter(|finding| finding.place.layer == input.chart.plane.layer);
        let callout = |finding: &&Finding| Callout {
            number: finding.number.to_string(),
            at: finding.place.at,
            words: few_words(finding),
        };
        Self {
            callouts: on_map.map(callout).collect(),
            listed: shown.iter().take(MOST).map(|finding| listed(finding, input)).collect(),
            rest: shown.len().saturating_sub(MOST),
            sentences: shown.iter().map(|finding| sentence(finding)).collect(),
        }
    }

    /// All findings in sentences, each with its remedy.
    pub(super) fn sentences(&self) -> String {
        self.sentences.iter().map(|sentence| format!("{sentence} ")).collect()
    }
}

fn sentence(finding: &Finding) -> String {
    let mut text = format!("Finding {}: {}", finding.number, ended(&plain(&finding.sentence)));
    if let Some(remedy) = &finding.remedy {
        text.push(' ');
        text.push_str(&ended(&remedy_words(finding, &plain(&remedy.action))));
    }
    text
}

fn ended(text: &str) -> String {
    if text.ends_with('.') { text.to_owned() } else { format!("{text}.") }
}

/// A value of a measure in words.
fn amount(what: Measured, value: f64) -> String {
    match what {
        Measured::ExtraInductance => with_prefix(value, "H", 2),
        Measured::ExtraPath => millimeters(value),
        Measured::Noise => with_prefix(value, "V", 2),
        Measured::Transfer => with_prefix(value, "ohm", 2),
        Measured::ShareDrop | Measured::Stray | Measured::Share => percent(value),
        Measured::EdgeDensity => significant(value, 2),
    }
}

fn cause_words(cause: &Cause) -> String {
    match cause {
        Cause::Void(id) => void_words(id),
        Cause::Edge => "plane edge".to_owned(),
        Cause::LayerChange => "layer change".to_owned(),
        Cause::Path(name) => plain(name),
        Cause::Spread => "wide spread".to_owned(),
    }
}

/// A void by its name or id; ids carry the word themselves.
fn void_words(id: &str) -> String {
    let id = plain(id);
    if id.to_lowercase().contains("void") { id } else { format!("void {id}") }
}

fn capital(mut text: String) -> String {
    if let Some(first) = text.get(..1).map(str::to_uppercase) {
        text.replace_range(..1, &first);
    }
    text
}

/// For the map: cause and amount.
fn few_words(finding: &Finding) -> String {
    let value = amount(finding.excess.what, finding.excess.value);
    let cause = cause_words(&finding.cause);
    match finding.excess.what {
        Measured::ExtraInductance => format!("{cause}: +{value}"),
        Measured::ExtraPath => format!("{cause}: {value} longer"),
        Measured::ShareDrop => format!("{cause}: {value} leaves the track"),
        Measured::EdgeDensity => format!("{cause}: {value} of the peak"),
        Measured::Stray => format!("{value} strays over the boundary"),
        Measured::Noise | Measured::Transfer => format!("{cause}: {value}"),
        Measured::Share => format!("{value} within 3h"),
    }
}

/// The result in one line, with `net` as the net's name.
pub(super) fn result(finding: &Finding, net: &str, band: &str) -> String {
    let value = amount(finding.excess.what, finding.excess.value);
    let cause = match &finding.cause {
        Cause::Void(id) => capital(void_words(id)),
        Cause::Edge => "The plane's edge".to_owned(),
        Cause::LayerChange => "A layer change without a via for the return".to_owned(),
        Cause::Path(name) => plain(name),
        Cause::Spread => "Distance from the plane".to_owned(),
    };
    match finding.excess.what {
        Measured::ExtraInductance => format!("{cause} adds {value} to the loop of {net} in {band}"),
        Measured::ExtraPath => format!("{cause} makes the return of {net} {value} longer in {band}"),
        Measured::ShareDrop => {
            format!("{cause} takes {value} of the return of {net} off its track in {band}")
        }
        Measured::EdgeDensity => {
            format!("The return of {net} crowds at the plane's edge in {band}: {value} of its peak")
        }
        Measured::Stray => format!("{value} of the return of {net} strays over the partition in {band}"),
        Measured::Noise => format!("{cause} puts {value} of noise on {net} in {band}"),
        Measured::Transfer => format!("{cause} and {net} are coupled by {value}"),
        Measured::Share => format!("{net}: {value} of the return stays within 3h in {band}"),
    }
}

fn remedy_words(finding: &Finding, action: &str) -> String {
    let Some(remedy) = &finding.remedy else { return String::new() };
    let what = finding.excess.what;
    let action = action.trim_end_matches('.');
    format!("{action}: {} becomes {}", amount(what, remedy.before), amount(what, remedy.after))
}

fn listed(finding: &Finding, input: &TicketInput) -> ListedFinding {
    let at = finding.place.at - input.review.origin;
    let place = |meters: f64| format!("{:.1}", meters * 1e3 + 0.0).replace('-', "\u{2212}");
    let mut note = format!("at\u{a0}({},\u{a0}{})\u{a0}mm", place(at.x), place(at.y));
    if let Some(limit) = finding.excess.limit {
        note.push_str(&format!(", limit {}", amount(finding.excess.what, limit)));
    }
    if let Some(band) = finding.band.as_ref().filter(|band| **band != input.band.name) {
        note.push_str(&format!(", worst in {}", plain(band)));
    }
    if finding.waived.is_some() {
        note.push_str(", waived");
    }
    if finding.grade != Grade::Fail {
        note.push_str(&format!(" ({})", finding.grade.name()));
    }
    let title = few_words(finding);
    let title = if matches!(finding.cause, Cause::Path(_)) { title } else { capital(title) };
    let remedy = finding.remedy.as_ref().map(|remedy| remedy_words(finding, &plain(&remedy.action)));
    ListedFinding { number: finding.number.to_string(), title, note, remedy }
}

/// Marks of the joints on a layer; of several entries at one place the largest counts.
pub(super) fn joint_marks(joints: &[JointCurrent], layer: usize) -> Vec<JointMark> {
    let mut marks: Vec<JointMark> = Vec::new();
    for joint in joints.iter().filter(|joint| joint.layers.contains(&Some(layer))) {
        let form = match joint.kind {
            // Pins that a part ties together inside are named as their vias.
            JointKind::Barrel | JointKind::Inside => JointForm::Via,
            JointKind::Part => JointForm::Part,
            JointKind::Tie => JointForm::Tie,
        };
        let current = joint.current.norm();
        match marks.iter_mut().find(|mark| mark.at == joint.at && mark.form == form) {
            Some(mark) => mark.current = mark.current.max(current),
            None => marks.push(JointMark { at: joint.at, form, name: plain(&joint.what), current }),
        }
    }
    marks
}
