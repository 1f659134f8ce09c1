//! Where a command writes: results to standard output, messages to standard error.

use super::Exit;
use crate::diag::Diagnostic;
use crate::diag::{Ink, render};
use std::io::{IsTerminal, Write};

/// The two streams of a command. A reader that goes away is a success: the rest is simply not written.
pub struct Console {
    out: Box<dyn Write>,
    err: Box<dyn Write>,
    terminal: bool,
    failure: Option<std::io::Error>,
}

impl Console {
    /// The streams of this process.
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

    /// Whether messages may carry color: only on a terminal, and never when `NO_COLOR` is set.
    pub fn ink(&self) -> Ink {
        Ink::for_stream(self.terminal, std::env::var_os("NO_COLOR").as_deref())
    }

    /// Writes a result, which brings its own line ends.
    pub fn result(&mut self, text: &str) {
        let written = self.out.write_all(text.as_bytes());
        self.note_failure(written);
    }

    /// Writes a message.
    pub fn message(&mut self, message: &Diagnostic) {
        let text = render(message, None, self.ink());
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
