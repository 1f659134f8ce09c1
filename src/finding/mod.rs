//! Findings: which paths are in trouble, where, by how much and why, and what was computed to mend it.
//!
//! Given the figures of all charted paths of a review and its limits, gives numbered findings. Limits act on the
//! excess over the same path without voids and on noise; an absolute share is never more than a note.

mod change;
mod evidence;
mod judge;
pub mod noise;
mod remedy;
mod waive;
mod word;

pub use evidence::{MapEvidence, PlaneEvidence};
pub use judge::{grade, limits_of, number, plane};
pub use remedy::Trials;
pub use waive::{compare, waive, waiver_messages};
pub use word::{digits, hertz, place, quantity};

use crate::diag::{Code, Diagnostic};
use crate::field::PlaneId;
use crate::geom::{Point, Polygon};

/// The findings of one path, and messages about them.
#[derive(Clone, Debug, Default)]
pub struct Judged {
    /// Findings, numbered, worst first.
    pub findings: Vec<Finding>,
    /// What could not be tried.
    pub messages: Vec<Diagnostic>,
}

/// Judges a path from the evidence of its planes; `noise` are the findings that rest on other paths.
pub fn of_path(evidence: &[PlaneEvidence], noise: Vec<Finding>, trials: &Trials) -> Judged {
    let review = trials.review;
    let mut findings: Vec<Finding> =
        evidence.iter().flat_map(|evidence| plane(evidence, &review.limits)).collect();
    let (changes, mut messages) = trials.layer_changes(evidence);
    findings.extend(changes);
    findings.extend(noise);
    number(&mut findings);
    waive(&mut findings, review, &trials.board.revision);
    for finding in findings.iter_mut().filter(|finding| finding.is_exceeded() && finding.remedy.is_none()) {
        let (remedy, untried) = trials.best(evidence, finding);
        finding.remedy = remedy;
        messages.extend(untried);
    }
    Judged { findings, messages }
}

/// How much a finding matters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Grade {
    /// Above its limit.
    Fail,
    /// Above the part of its limit from which on it warns.
    Warn,
    /// Worth knowing; no limit acts on it.
    Note,
}

impl Grade {
    /// Its name in texts and files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Fail => "fail",
            Self::Warn => "warn",
            Self::Note => "note",
        }
    }
}

/// Number of a finding in the set: of its path among all of the review, and of the finding on its path, both from 1.
/// It does not depend on which paths are drawn.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Number {
    /// Number of the path in the plan of the whole review.
    pub path: usize,
    /// Number of the finding on the path, worst first.
    pub of_path: usize,
}

impl std::fmt::Display for Number {
    /// As `4.2`.
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "{}.{}", self.path, self.of_path)
    }
}

/// A place on the board.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spot {
    /// Metres, in the coordinates of the files.
    pub at: Point,
    /// Copper layer, index from 0.
    pub layer: usize,
}

/// What the figure of a finding measures.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Measured {
    /// Loop inductance more than without voids, in henry.
    ExtraInductance,
    /// Path of the return more than without voids, in metres.
    ExtraPath,
    /// Share within 3h less than without voids.
    ShareDrop,
    /// Density at the plane's edge in units of 1/(pi h).
    EdgeDensity,
    /// Share of the return over a partition boundary, more than without voids.
    Stray,
    /// Noise voltage, rms, in volts.
    Noise,
    /// Magnitude of the transfer impedance between two paths, in ohm.
    Transfer,
    /// Share within 3h.
    Share,
}

impl Measured {
    /// Its name in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::ExtraInductance => "extra_inductance",
            Self::ExtraPath => "extra_path",
            Self::ShareDrop => "share_drop",
            Self::EdgeDensity => "edge_density",
            Self::Stray => "stray",
            Self::Noise => "noise",
            Self::Transfer => "transfer_impedance",
            Self::Share => "share_3h",
        }
    }

    /// Its SI unit, `1` where it has none.
    pub fn unit(self) -> &'static str {
        match self {
            Self::ExtraInductance => "H",
            Self::ExtraPath => "m",
            Self::Noise => "V",
            Self::Transfer => "ohm",
            Self::ShareDrop | Self::EdgeDensity | Self::Stray | Self::Share => "1",
        }
    }
}

/// The figure of a finding with its limit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Excess {
    /// What it measures.
    pub what: Measured,
    /// Value in the SI unit of what it measures.
    pub value: f64,
    /// Numerical error, absolute.
    pub error: f64,
    /// Limit above which it fails; none for notes.
    pub limit: Option<f64>,
}

impl Excess {
    /// Value in parts of the limit; zero without one.
    pub fn ratio(&self) -> f64 {
        self.limit.filter(|limit| *limit > 0.0).map_or(0.0, |limit| self.value / limit)
    }
}

/// What causes a finding.
#[derive(Clone, Debug, PartialEq)]
pub enum Cause {
    /// A void of the plane, by its id.
    Void(String),
    /// The edge of the plane.
    Edge,
    /// A layer change without a via for the return.
    LayerChange,
    /// Another path, by its name.
    Path(String),
    /// Nothing but the distance: the frequency is low or the track high above its plane.
    Spread,
}

impl Cause {
    /// Its kind in files.
    pub fn kind(&self) -> &'static str {
        match self {
            Self::Void(_) => "void",
            Self::Edge => "edge",
            Self::LayerChange => "layer-change",
            Self::Path(_) => "path",
            Self::Spread => "spread",
        }
    }

    /// Id of the void or name of the path.
    pub fn name(&self) -> Option<&str> {
        match self {
            Self::Void(name) | Self::Path(name) => Some(name),
            Self::Edge | Self::LayerChange | Self::Spread => None,
        }
    }
}

/// A change of the board that mends a finding, tried by the solver.
#[derive(Clone, Debug, PartialEq)]
pub struct Remedy {
    /// What to do, one sentence.
    pub action: String,
    /// Where.
    pub place: Spot,
    /// Copper to add on the place's layer; empty where none is added.
    pub copper: Vec<Polygon>,
    /// Figure of the finding before, as computed on the cells of the trial.
    pub before: f64,
    /// Figure of the finding after.
    pub after: f64,
    /// Numerical error of their difference, absolute.
    pub error: f64,
    /// What was tried, one line each with its gain, best first.
    pub tried: Vec<(String, f64)>,
}

impl Remedy {
    /// By how much the figure becomes less.
    pub fn gain(&self) -> f64 {
        self.before - self.after
    }
}

/// Why a finding is borne.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Waived {
    /// Reason, from the review.
    pub reason: String,
    /// Revision of the board with which the waiver ends.
    pub expires: String,
}

/// One finding.
#[derive(Clone, Debug, PartialEq)]
pub struct Finding {
    /// Number in the set.
    pub number: Number,
    /// Code, explained by `ebbmap explain`.
    pub code: Code,
    /// How much it matters.
    pub grade: Grade,
    /// Name of the path.
    pub path: String,
    /// Plane; none where it concerns no single one.
    pub plane: Option<PlaneId>,
    /// Band in which it is worst; none where it concerns all bands together.
    pub band: Option<String>,
    /// Frequency in Hz in that band.
    pub frequency_hz: Option<f64>,
    /// Place.
    pub place: Spot,
    /// The figure that is above its limit.
    pub excess: Excess,
    /// What it is, one plain sentence that starts with the path's name.
    pub sentence: String,
    /// What causes it.
    pub cause: Cause,
    /// The cause in words, one sentence.
    pub cause_text: String,
    /// What mends it, if something was tried and helps.
    pub remedy: Option<Remedy>,
    /// Why it is borne, if the review waives it.
    pub waived: Option<Waived>,
}

impl Finding {
    /// Whether it counts for the exit code: a failure that nobody waived.
    pub fn is_exceeded(&self) -> bool {
        self.grade == Grade::Fail && self.waived.is_none()
    }
}
