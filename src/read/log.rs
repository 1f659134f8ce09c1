//! Collects the messages of one file.

use crate::diag::{Code, Diagnostic, Severity};

/// Most messages of one code that a file may raise; the rest is counted.
const MOST_OF_A_CODE: usize = 30;

/// The messages of one file.
#[derive(Debug, Default)]
pub struct Log {
    /// Name of the file, relative to the folder or archive.
    pub file: String,
    /// Messages in the order of their finding.
    pub diagnostics: Vec<Diagnostic>,
    /// Number of messages by code.
    counts: Vec<(Code, Severity, usize)>,
}

impl Log {
    /// An empty log for `file`.
    pub fn new(file: impl Into<String>) -> Self {
        Self { file: file.into(), ..Self::default() }
    }

    /// Adds a message about `line` (from 1; 0 for the file as a whole).
    pub fn add(&mut self, line: u32, mut message: Diagnostic) {
        message.place.file = Some(self.file.clone());
        message.place.line = (line > 0).then_some(line);
        let key = (message.code, message.severity);
        let count = match self.counts.iter_mut().find(|count| (count.0, count.1) == key) {
            Some(count) => count,
            None => {
                self.counts.push((key.0, key.1, 0));
                // The list was just given an entry, so it has a last one.
                #[allow(clippy::unwrap_used)]
                self.counts.last_mut().unwrap()
            }
        };
        count.2 += 1;
        if count.2 <= MOST_OF_A_CODE {
            self.diagnostics.push(message);
        }
    }

    /// Adds an error.
    pub fn error(&mut self, line: u32, code: Code, text: impl Into<String>) {
        self.add(line, Diagnostic::error(code, text));
    }

    /// Adds a warning.
    pub fn warning(&mut self, line: u32, code: Code, text: impl Into<String>) {
        self.add(line, Diagnostic::warning(code, text));
    }

    /// Adds a note.
    pub fn note(&mut self, line: u32, code: Code, text: impl Into<String>) {
        self.add(line, Diagnostic::note(code, text));
    }

    /// Whether an error was logged.
    pub fn has_error(&self) -> bool {
        self.counts.iter().any(|count| count.1 == Severity::Error)
    }

    /// The messages, closed by the number of those that were left out.
    pub fn finish(mut self) -> Vec<Diagnostic> {
        for (code, severity, count) in std::mem::take(&mut self.counts) {
            if count > MOST_OF_A_CODE {
                let text = format!("{} more of the same kind", count - MOST_OF_A_CODE);
                let mut message = Diagnostic::new(severity, code, text);
                message.place.file = Some(self.file.clone());
                self.diagnostics.push(message);
            }
        }
        self.diagnostics
    }
}
