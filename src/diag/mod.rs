//! Messages to the user: what is wrong or was assumed, where, and what to do next.
//!
//! Pattern of a text: thing `name` must be rule; got value. Lower case first, no full stop, names in backticks,
//! always the unit. A hint is a second line that says what to do.

pub mod code;
mod near;
mod snippet;

pub use code::Code;
pub use near::nearest;
pub use snippet::{Ink, render};

/// How much a message matters.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Severity {
    /// Something the user may like to know: an override, a choice among several.
    Note,
    /// Something was assumed, skipped or withheld; the rest goes on.
    Warning,
    /// The input cannot be used.
    Error,
}

impl Severity {
    /// Its name in texts and files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Note => "note",
            Self::Warning => "warning",
            Self::Error => "error",
        }
    }
}

/// Where a message belongs: in a file, on the board, both or neither.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Place {
    /// Path as the user would write it, relative to the input given; never absolute.
    pub file: Option<String>,
    /// Line in the file, from 1.
    pub line: Option<u32>,
    /// Byte range in the file, for messages that show the line itself.
    pub span: Option<std::ops::Range<usize>>,
    /// Copper layer, from 1 at the top.
    pub layer: Option<usize>,
    /// Spot on the board in metres, in the coordinates of the files.
    pub at: Option<crate::geom::Point>,
}

/// One message.
#[derive(Clone, Debug, PartialEq)]
pub struct Diagnostic {
    /// How much it matters.
    pub severity: Severity,
    /// Stable code, explained by `ebbmap explain`.
    pub code: Code,
    /// One sentence.
    pub text: String,
    /// Where it belongs.
    pub place: Place,
    /// What to do, one sentence each.
    pub hints: Vec<String>,
}

impl Place {
    /// The place in words, for example `fab/copper-1.gbr, line 12` or `L2, x 12.30 mm, y 4.00 mm`; none if there is
    /// no place.
    pub fn in_words(&self) -> Option<String> {
        let mut words = Vec::new();
        if let Some(file) = &self.file {
            words.push(file.clone());
        }
        if let Some(line) = self.line {
            words.push(format!("line {line}"));
        }
        if let Some(layer) = self.layer {
            words.push(format!("L{layer}"));
        }
        if let Some(at) = self.at {
            words.push(format!("x {:.2} mm, y {:.2} mm", at.x * 1e3, at.y * 1e3));
        }
        (!words.is_empty()).then(|| words.join(", "))
    }
}

impl Diagnostic {
    /// A message without a place and without hints.
    pub fn new(severity: Severity, code: Code, text: impl Into<String>) -> Self {
        Self { severity, code, text: text.into(), place: Place::default(), hints: Vec::new() }
    }

    /// An error, see [`Severity::Error`].
    pub fn error(code: Code, text: impl Into<String>) -> Self {
        Self::new(Severity::Error, code, text)
    }

    /// A warning, see [`Severity::Warning`].
    pub fn warning(code: Code, text: impl Into<String>) -> Self {
        Self::new(Severity::Warning, code, text)
    }

    /// A note, see [`Severity::Note`].
    pub fn note(code: Code, text: impl Into<String>) -> Self {
        Self::new(Severity::Note, code, text)
    }

    /// The same message in `file`, on `line` (from 1).
    pub fn in_file(mut self, file: impl Into<String>, line: u32) -> Self {
        self.place.file = Some(file.into());
        self.place.line = Some(line);
        self
    }

    /// The same message at a spot on copper layer `layer` (from 1 at the top).
    pub fn on_board(mut self, layer: Option<usize>, at: crate::geom::Point) -> Self {
        self.place.layer = layer;
        self.place.at = Some(at);
        self
    }

    /// The same message with one more hint.
    pub fn hint(mut self, text: impl Into<String>) -> Self {
        self.hints.push(text.into());
        self
    }
}
