//! Splits a Gerber file into commands, each with its line.

use crate::diag::code::read as code;
use crate::read::log::Log;
use std::borrow::Cow;

/// One piece of a Gerber file.
#[derive(Debug, PartialEq)]
pub enum Item<'a> {
    /// A plain command without its `*`, blanks and line ends removed.
    Word(Cow<'a, str>, u32),
    /// The commands between two `%`, each with its line.
    Extended(Vec<(Cow<'a, str>, u32)>),
    /// What follows `G04`.
    Comment(&'a str, u32),
}

/// Splits `text`; what breaks the rules of the format is logged and left out.
pub fn items<'a>(text: &'a str, log: &mut Log) -> Vec<Item<'a>> {
    let mut reader = Reader { text, at: 0, line: 1 };
    let mut items = Vec::new();
    loop {
        reader.skip_blanks();
        let rest = &reader.text[reader.at..];
        if rest.is_empty() {
            return items;
        }
        let line = reader.line;
        if rest.starts_with('%') {
            reader.at += 1;
            let words = reader.extended(line, log);
            items.push(Item::Extended(words));
        } else if let Some(start) = comment_start(rest) {
            reader.at += start;
            let (comment, end) = reader.until(&['*', '\n', '\r']);
            if end != Some('*') {
                let text = "a comment must end with `*` on its line; taken to end at the end of the line";
                log.warning(line, code::GERBER_SYNTAX, text);
            }
            items.push(Item::Comment(comment.trim(), line));
        } else {
            let (word, end) = reader.until(&['*', '%']);
            match end {
                Some('*') => {
                    let word = squeeze(word);
                    if !word.is_empty() {
                        items.push(Item::Word(word, line));
                    }
                }
                Some(_) => {
                    reader.at -= 1;
                    log.error(line, code::GERBER_SYNTAX, unended(word));
                }
                None => log.error(line, code::GERBER_SYNTAX, unended(word)),
            }
        }
    }
}

/// Length of the `G04` that opens a comment.
fn comment_start(rest: &str) -> Option<usize> {
    if rest.starts_with("G04") {
        return Some(3);
    }
    let short = rest.starts_with("G4") && !rest[2..].starts_with(|c: char| c.is_ascii_digit());
    short.then_some(2)
}

fn unended(word: &str) -> String {
    format!("command `{}` must end with `*`", excerpt(word))
}

/// The first characters of a text, for messages.
pub fn excerpt(text: &str) -> String {
    let mut short: String =
        text.trim().chars().take(40).map(|c| if c.is_control() { ' ' } else { c }).collect();
    if text.trim().chars().nth(40).is_some() {
        short.push_str("...");
    }
    short
}

/// A plain command without blanks and line ends.
fn squeeze(word: &str) -> Cow<'_, str> {
    if word.contains(char::is_whitespace) {
        Cow::Owned(word.chars().filter(|c| !c.is_whitespace()).collect())
    } else {
        Cow::Borrowed(word)
    }
}

struct Reader<'a> {
    text: &'a str,
    at: usize,
    line: u32,
}

impl<'a> Reader<'a> {
    fn skip_blanks(&mut self) {
        let rest = &self.text[self.at..];
        let end =
            rest.find(|c: char| !c.is_whitespace() && c != '\0' && c != '\u{feff}').unwrap_or(rest.len());
        self.pass(end);
    }

    /// Moves on by `length` bytes and counts the lines.
    fn pass(&mut self, length: usize) {
        let bytes = &self.text.as_bytes()[self.at..self.at + length];
        let next = self.text.as_bytes().get(self.at + length).copied();
        for (index, &byte) in bytes.iter().enumerate() {
            let lone_return = byte == b'\r' && bytes.get(index + 1).copied().or(next) != Some(b'\n');
            if byte == b'\n' || lone_return {
                self.line += 1;
            }
        }
        self.at += length;
    }

    /// The text before the next of `ends`, and which one it is; moves behind it.
    fn until(&mut self, ends: &[char]) -> (&'a str, Option<char>) {
        let rest = &self.text[self.at..];
        let length = rest.find(ends).unwrap_or(rest.len());
        let end = rest[length..].chars().next();
        self.pass(length + end.map_or(0, char::len_utf8));
        (&rest[..length], end)
    }

    fn extended(&mut self, opened: u32, log: &mut Log) -> Vec<(Cow<'a, str>, u32)> {
        let mut words = Vec::new();
        loop {
            self.skip_blanks();
            let line = self.line;
            let (word, end) = self.until(&['*', '%']);
            let clean: Cow<'a, str> = if word.contains(['\n', '\r']) {
                Cow::Owned(word.chars().filter(|c| *c != '\n' && *c != '\r').collect())
            } else {
                Cow::Borrowed(word.trim_end())
            };
            match end {
                Some('*') if clean.is_empty() => {}
                Some('*') => words.push((clean, line)),
                Some(_) if clean.is_empty() => return words,
                Some(_) => {
                    log.error(line, code::GERBER_SYNTAX, unended(word));
                    return words;
                }
                None => {
                    log.error(
                        opened,
                        code::GERBER_SYNTAX,
                        "the `%` that opens here must be closed by another `%`",
                    );
                    return words;
                }
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn commands_keep_their_lines() {
        let mut log = Log::new("a.gbr");
        let text = "G04 50 % done*\r\n%FSLAX46Y46*MOMM*%\nG01*X0Y0D02*\nX1\nY2*D03*";
        let items = items(text, &mut log);
        let extended = vec![("FSLAX46Y46".into(), 2), ("MOMM".into(), 2)];
        let word = |text: &'static str, line| Item::Word(text.into(), line);
        let expected = vec![
            Item::Comment("50 % done", 1),
            Item::Extended(extended),
            word("G01", 3),
            word("X0Y0D02", 3),
            word("X1Y2", 4),
            word("D03", 5),
        ];
        assert_eq!(items, expected);
        assert!(log.diagnostics.is_empty());
    }

    #[test]
    fn lone_carriage_returns_end_lines_and_open_ends_are_errors() {
        let mut log = Log::new("a.gbr");
        assert_eq!(items("D10*\rG36*\r%LPD", &mut log).len(), 3);
        assert_eq!(log.diagnostics[0].place.line, Some(3));
    }
}
