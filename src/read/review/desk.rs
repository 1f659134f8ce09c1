//! Takes typed values out of parsed TOML and keeps a list of everything that is wrong with them.

use crate::diag::code::review as code;
use crate::diag::{Code, Diagnostic, nearest};
use crate::review::Marks;
use crate::unit::{Dimension, parse_quantity};
use std::ops::Range;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// A value with its place in the file.
pub type Value<'i> = Spanned<DeValue<'i>>;

/// The first byte of an entry, so that a missing key does not mark a whole table.
pub fn header(span: &Range<usize>) -> Range<usize> {
    span.start..span.end.min(span.start + 1)
}

/// The file being read and the messages so far.
pub struct Desk<'t> {
    text: &'t str,
    file: &'t str,
    /// What was found wrong, in the order in which it was found.
    pub messages: Vec<Diagnostic>,
}

impl<'t> Desk<'t> {
    /// A desk for the text of `file`.
    pub fn new(text: &'t str, file: &'t str) -> Self {
        Self { text, file, messages: Vec::new() }
    }

    /// Line of a byte, from 1.
    pub fn line(&self, at: usize) -> u32 {
        let upto = at.min(self.text.len());
        1 + self.text.as_bytes()[..upto].iter().filter(|&&byte| byte == b'\n').count() as u32
    }

    /// Where those of `keys` stand that `table` has.
    pub fn marks(&self, table: &DeTable<'_>, keys: &[&'static str]) -> Marks {
        let mark = |key: &&'static str| {
            let span = table.get(*key)?.span();
            Some((*key, self.line(span.start), span))
        };
        Marks(keys.iter().filter_map(mark).collect())
    }

    /// A message at a byte range.
    pub fn place(&self, mut message: Diagnostic, span: Range<usize>) -> Diagnostic {
        message.place.file = Some(self.file.into());
        message.place.line = Some(self.line(span.start));
        message.place.span = Some(span);
        message
    }

    /// Notes an error at a byte range; hints can be added to what it returns.
    pub fn error(&mut self, code: Code, span: Range<usize>, text: impl Into<String>) -> &mut Diagnostic {
        let message = self.place(Diagnostic::error(code, text), span);
        self.messages.push(message);
        let last = self.messages.len() - 1;
        &mut self.messages[last]
    }

    /// Notes keys of `table` that are not among `known`.
    pub fn only(&mut self, table: &DeTable<'_>, name: &str, known: &[&str]) {
        for key in table.keys() {
            let typed = key.get_ref().as_ref();
            if known.contains(&typed) {
                continue;
            }
            let what = if name.is_empty() { String::new() } else { format!(" of `{name}`") };
            let list = known.iter().map(|key| format!("`{key}`")).collect::<Vec<_>>().join(", ");
            let message = self.error(
                code::REVIEW_UNKNOWN_KEY,
                key.span(),
                format!("key{what} must be one of {list}; got `{typed}`"),
            );
            if let Some(near) = nearest(typed, known.iter().copied()) {
                message.hints.push(format!("did you mean `{near}`?"));
            }
        }
    }

    /// Notes a value of the wrong type.
    pub fn wrong_type(&mut self, value: &Value<'_>, name: &str, rule: &str) {
        let got = value.get_ref().type_str();
        let article = if got.starts_with(['a', 'i', 'o']) { "an" } else { "a" };
        let text = format!("value `{name}` must be {rule}; got {article} {got}");
        self.error(code::REVIEW_WRONG_TYPE, value.span(), text);
    }

    /// A table under `key`, if there is one.
    pub fn table<'v, 'i>(&mut self, table: &'v DeTable<'i>, key: &str) -> Option<&'v DeTable<'i>> {
        let value = table.get(key)?;
        let found = value.get_ref().as_table();
        if found.is_none() {
            self.wrong_type(value, key, &format!("a table, written `[{key}]`"));
        }
        found
    }

    /// The tables of a repeated table, with the place of each.
    pub fn tables<'v, 'i>(
        &mut self,
        table: &'v DeTable<'i>,
        key: &str,
    ) -> Vec<(&'v DeTable<'i>, Range<usize>)> {
        let Some(value) = table.get(key) else { return Vec::new() };
        let rule = format!("a list of tables, each written `[[{key}]]`");
        let Some(list) = value.get_ref().as_array() else {
            self.wrong_type(value, key, &rule);
            return Vec::new();
        };
        let mut found = Vec::new();
        for entry in list.iter() {
            match entry.get_ref().as_table() {
                Some(table) => found.push((table, entry.span())),
                None => self.wrong_type(entry, key, &rule),
            }
        }
        found
    }

    /// Text under `key`.
    pub fn text<'v>(&mut self, table: &'v DeTable<'_>, key: &str) -> Option<&'v str> {
        let value = table.get(key)?;
        self.as_text(value, key)
    }

    /// A value as text.
    pub fn as_text<'v>(&mut self, value: &'v Value<'_>, name: &str) -> Option<&'v str> {
        let found = value.get_ref().as_str();
        if found.is_none() {
            self.wrong_type(value, name, "text in quotes");
        }
        found
    }

    /// Text under `key` that is not empty.
    pub fn filled_text<'v>(&mut self, table: &'v DeTable<'_>, key: &str) -> Option<&'v str> {
        let text = self.text(table, key)?;
        if text.trim().is_empty() {
            let span = table.get(key).map_or(0..0, Spanned::span);
            self.error(code::REVIEW_BAD_VALUE, span, format!("value `{key}` must not be empty"));
            return None;
        }
        Some(text)
    }

    /// A list under `key`.
    pub fn list<'v, 'i>(
        &mut self,
        table: &'v DeTable<'i>,
        key: &str,
        of: &str,
    ) -> Option<Vec<&'v Value<'i>>> {
        let value = table.get(key)?;
        self.as_list(value, key, of)
    }

    /// A value as a list.
    pub fn as_list<'v, 'i>(
        &mut self,
        value: &'v Value<'i>,
        name: &str,
        of: &str,
    ) -> Option<Vec<&'v Value<'i>>> {
        let found = value.get_ref().as_array().map(|list| list.iter().collect());
        if found.is_none() {
            self.wrong_type(value, name, &format!("a list of {of} in brackets"));
        }
        found
    }

    /// A quantity with its unit.
    pub fn quantity(&mut self, value: &Value<'_>, name: &str, wanted: Dimension) -> Option<f64> {
        let text = match value.get_ref() {
            DeValue::String(text) => text.as_ref(),
            DeValue::Integer(_) | DeValue::Float(_) => {
                let bare = self.text.get(value.span()).unwrap_or_default().to_owned();
                let text = format!(
                    "value `{name}` must be a {} with its unit in quotes ({}); got the bare number `{bare}`",
                    wanted.name(),
                    wanted.units()
                );
                self.error(code::REVIEW_WRONG_TYPE, value.span(), text);
                return None;
            }
            _ => {
                self.wrong_type(value, name, &format!("a {} with its unit in quotes", wanted.name()));
                return None;
            }
        };
        match parse_quantity(text, wanted) {
            Ok(number) => Some(number),
            Err(error) => {
                self.error(code::REVIEW_BAD_VALUE, value.span(), format!("value `{name}` {error}"));
                None
            }
        }
    }

    /// A quantity above zero.
    pub fn positive(&mut self, value: &Value<'_>, name: &str, wanted: Dimension) -> Option<f64> {
        let number = self.quantity(value, name, wanted)?;
        if number > 0.0 {
            return Some(number);
        }
        let got = value.get_ref().as_str().unwrap_or_default();
        self.error(
            code::REVIEW_BAD_VALUE,
            value.span(),
            format!("value `{name}` must be above zero; got `{got}`"),
        );
        None
    }

    /// A plain number.
    pub fn number(&mut self, value: &Value<'_>, name: &str) -> Option<f64> {
        let parsed = match value.get_ref() {
            DeValue::Integer(digits) => digits.as_str().parse().ok(),
            DeValue::Float(digits) => digits.as_str().parse::<f64>().ok(),
            _ => None,
        };
        match parsed {
            Some(number) if number.is_finite() => Some(number),
            _ => {
                self.wrong_type(value, name, "a number without quotes");
                None
            }
        }
    }

    /// A point of two lengths.
    pub fn point(&mut self, value: &Value<'_>, name: &str) -> Option<crate::geom::Point> {
        let list = self.as_list(value, name, "two lengths")?;
        let [x, y] = list[..] else {
            let text = format!("value `{name}` must hold two lengths, x and y; got {}", list.len());
            self.error(code::REVIEW_BAD_VALUE, value.span(), text);
            return None;
        };
        let x = self.quantity(x, name, Dimension::Length);
        let y = self.quantity(y, name, Dimension::Length);
        Some(crate::geom::Point::new(x?, y?))
    }
}
