//! Where a command writes: results to standard output, messages to standard error.

use super::Exit;
use crate::diag::{Diagnostic, Severity};
use std::io::{IsTerminal, Write};

/// The two streams of a command. A reader that goes away is a success: the rest is simply not written.
pub struct Console {
    out: Box<dyn Write>,
    err: Box<dyn Write>,
    terminal: bool,
    failure: Option<std::io::Error>,
}

impl Console {
    /// The streams of this process. Color only on a terminal, and never when `NO_COLOR` is set.
    pub fn of_process() -> Self {
        Self {
            out: Box::new(std::io::BufWriter::new(std::io::stdout())),
            err: Box::new(std::io::stderr()),
            terminal: std::io::stderr().is_terminal(),
            failure: None,
        }
    }

    /// Whether a person watches standard error, so that progress makes sense.
    pub fn is_terminal(&self) -> bool {
        self.terminal
    }

    /// Whether messages may carry color.
    pub fn has_color(&self) -> bool {
        self.terminal && std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty())
    }

    /// Writes a result, which brings its own line ends.
    pub fn result(&mut self, text: &str) {
        let written = self.out.write_all(text.as_bytes());
        self.note_failure(written);
    }

    /// Writes a message.
    pub fn message(&mut self, message: &Diagnostic) {
        let mut text = String::new();
        let (word, color) = match message.severity {
            Severity::Error => ("error", "31"),
            Severity::Warning => ("warning", "33"),
            Severity::Note => ("note", "36"),
        };
        if self.has_color() {
            text.push_str(&format!(
                "\x1b[1;{color}m{word}[{}]\x1b[0m: {}\n",
                message.code.name, message.text
            ));
        } else {
            text.push_str(&format!("{word}[{}]: {}\n", message.code.name, message.text));
        }
        if let Some(place) = message.place.in_words() {
            text.push_str(&format!("  at {place}\n"));
        }
        for hint in &message.hints {
            text.push_str(&format!("  hint: {hint}\n"));
        }
        self.remark(&text);
    }

    /// Writes plain text, which brings its own line ends, to standard error.
    pub fn remark(&mut self, text: &str) {
        // Nobody can be told that standard error is gone.
        let _ = self.err.write_all(text.as_bytes());
    }

    /// Flushes the results and gives the exit of the command: a full disk turns success into failure.
    pub fn finish(mut self, exit: Exit) -> Exit {
        let flushed = self.out.flush();
        self.note_failure(flushed);
        match self.failure.take() {
            None => exit,
            Some(error) => {
                self.remark(&format!("error: cannot write the result to standard output: {error}\n"));
                Exit::Unusable
            }
        }
    }

    fn note_failure(&mut self, written: std::io::Result<()>) {
        if let Err(error) = written
            && error.kind() != std::io::ErrorKind::BrokenPipe
        {
            self.failure.get_or_insert(error);
        }
    }
}
