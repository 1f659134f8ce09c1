//! Messages as text for a terminal: the line of the file with a mark where a message has a span, plain otherwise.

use super::{Diagnostic, Severity};
use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};
use std::fmt::Write as _;

/// How messages are rendered.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ink {
    /// Letters alone.
    Plain,
    /// With the colours of a terminal.
    Color,
}

impl Ink {
    /// Colours for a terminal, unless the environment variable `NO_COLOR` is set to something.
    pub fn for_stream(terminal: bool, no_color: Option<&std::ffi::OsStr>) -> Self {
        let refused = no_color.is_some_and(|value| !value.is_empty());
        if terminal && !refused { Self::Color } else { Self::Plain }
    }
}

/// A message as text with its line end. `source` is the whole text of the file that the message's span counts in.
pub fn render(message: &Diagnostic, source: Option<&str>, ink: Ink) -> String {
    match (source, &message.place.span) {
        (Some(source), Some(span)) if span.end <= source.len() && span.start <= span.end => {
            with_source(message, source, span.clone(), ink)
        }
        _ => plain(message, ink),
    }
}

fn with_source(message: &Diagnostic, source: &str, span: std::ops::Range<usize>, ink: Ink) -> String {
    let level = match message.severity {
        Severity::Error => Level::ERROR,
        Severity::Warning => Level::WARNING,
        Severity::Note => Level::NOTE,
    };
    let mut snippet = Snippet::source(source).line_start(1).annotation(AnnotationKind::Primary.span(span));
    if let Some(file) = &message.place.file {
        snippet = snippet.path(file.as_str());
    }
    let mut group: Group<'_> =
        level.primary_title(message.text.as_str()).id(message.code.name).element(snippet);
    for hint in &message.hints {
        group = group.element(Level::HELP.with_name("hint").message(hint.as_str()));
    }
    let renderer = match ink {
        Ink::Plain => Renderer::plain(),
        Ink::Color => Renderer::styled(),
    };
    let mut text = renderer.render(&[group]);
    text.push('\n');
    text
}

fn plain(message: &Diagnostic, ink: Ink) -> String {
    let (word, color) = match message.severity {
        Severity::Error => ("error", "\x1b[1;31m"),
        Severity::Warning => ("warning", "\x1b[1;33m"),
        Severity::Note => ("note", "\x1b[1;32m"),
    };
    let (on, off) = match ink {
        Ink::Plain => ("", ""),
        Ink::Color => (color, "\x1b[0m"),
    };
    let mut text = format!("{on}{word}[{}]{off}: {}\n", message.code.name, message.text);
    if let Some(place) = message.place.in_words() {
        // Writing to a string cannot fail.
        let _ = writeln!(text, "  at {place}");
    }
    for hint in &message.hints {
        let _ = writeln!(text, "  hint: {hint}");
    }
    text
}

#[cfg(test)]
mod tests {
    use super::super::{Code, Diagnostic};
    use super::*;

    const CODE: Code = Code { name: "test-code", meaning: "" };

    #[test]
    fn a_span_shows_its_line_and_column() {
        let source = "schema = 1\n[board]\n\u{b5} = 1\nfiels = \"fab\"\n";
        let start = source.find("fiels").unwrap();
        let mut message = Diagnostic::error(CODE, "key `fiels` must be known").hint("did you mean `files`?");
        message.place.file = Some("review.toml".into());
        message.place.span = Some(start..start + 5);
        let text = render(&message, Some(source), Ink::Plain);
        assert!(text.starts_with("error[test-code]: key `fiels` must be known\n"), "{text}");
        assert!(text.contains("review.toml:4:1") && text.contains("^^^^^"), "{text}");
        assert!(text.contains("hint: did you mean `files`?"), "{text}");
        assert!(!text.contains('\x1b'));
        assert!(render(&message, Some(source), Ink::Color).contains('\x1b'));
    }

    #[test]
    fn without_a_source_the_place_is_words() {
        let message = Diagnostic::warning(CODE, "x").in_file("a.gbr", 3).hint("do y");
        assert_eq!(
            render(&message, None, Ink::Plain),
            "warning[test-code]: x\n  at a.gbr, line 3\n  hint: do y\n"
        );
    }

    #[test]
    fn no_color_wins() {
        use std::ffi::OsStr;
        assert_eq!(Ink::for_stream(true, None), Ink::Color);
        assert_eq!(Ink::for_stream(true, Some(OsStr::new(""))), Ink::Color);
        assert_eq!(Ink::for_stream(true, Some(OsStr::new("1"))), Ink::Plain);
        assert_eq!(Ink::for_stream(false, None), Ink::Plain);
    }
}
