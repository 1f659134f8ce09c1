//! Attributes of files, apertures and objects, in their `%T...%` and their comment form.

use std::collections::BTreeMap;
use std::sync::Arc;

/// What an object's `.N` attribute says.
#[derive(Clone, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub enum NetTag {
    /// There is none.
    #[default]
    Missing,
    /// It is empty: not connected to any net.
    Empty,
    /// `N/C`: a pad that is a net of its own.
    Single,
    /// A net name, escapes decoded.
    Named(String),
}

/// The attributes that objects carry.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Tags {
    /// `.N`.
    pub net: NetTag,
    /// `.P`: part, pin number, pin function.
    pub pin: Option<(String, String, Option<String>)>,
    /// `.C`.
    pub part: Option<String>,
    /// `.CVal`: the value of a part.
    pub value: Option<String>,
}

/// File attributes: name without the leading point, fields, line.
pub type FileTags = BTreeMap<String, (Vec<String>, u32)>;

/// The attribute dictionaries while a file is read.
#[derive(Debug, Default)]
pub struct Attributes {
    /// Of the file.
    pub file: FileTags,
    /// Object attributes in force.
    pub object: Arc<Tags>,
    /// Aperture function in force: first field and the rest.
    pub function: Option<Arc<str>>,
}

impl Attributes {
    /// Takes in one command that starts with `TF`, `TA`, `TO` or `TD`; an error is a sentence about it.
    pub fn take(&mut self, command: &str, line: u32) -> Result<(), String> {
        // All callers have seen the two ASCII letters at the start.
        let (kind, rest) = command.split_at(2);
        let mut fields = rest.split(',');
        let name = fields.next().unwrap_or_default().trim();
        let values: Vec<String> = fields.map(|field| decode(field.trim())).collect();
        if kind == "TD" {
            self.delete(name.trim_start_matches('.'));
            return Ok(());
        }
        let Some(name) = name.strip_prefix('.').or((!name.is_empty()).then_some(name)) else {
            return Err(format!("attribute command `{kind}` must name an attribute"));
        };
        match kind {
            "TF" => {
                self.file.entry(name.to_owned()).or_insert((values, line));
            }
            "TA" if name == "AperFunction" => self.function = Some(values.join(",").into()),
            "TO" => return self.take_object(name, &values),
            _ => {}
        }
        Ok(())
    }

    fn take_object(&mut self, name: &str, values: &[String]) -> Result<(), String> {
        let first = values.first().map(String::as_str).unwrap_or_default();
        if !matches!(name, "N" | "P" | "C" | "CVal") {
            return Ok(());
        }
        let tags = Arc::make_mut(&mut self.object);
        match name {
            "N" => {
                tags.net = match first {
                    "" => NetTag::Empty,
                    "N/C" => NetTag::Single,
                    name => NetTag::Named(name.to_owned()),
                };
                if values.len() > 1 {
                    return Err(format!(
                        "object attribute `.N` must name one net here; got {}: the first, `{first}`, is used",
                        values.len()
                    ));
                }
            }
            "P" => {
                let number = values.get(1).map(String::as_str).unwrap_or_default();
                tags.pin = None;
                if number.is_empty() && !first.is_empty() && values.len() > 1 {
                    // Pads without a number, as fiducials and mounting pads have, belong to a part but are no pin.
                    tags.part = Some(first.to_owned());
                    return Ok(());
                }
                if first.is_empty() || number.is_empty() {
                    return Err("object attribute `.P` must give a part and a pin number".to_owned());
                }
                let function = values.get(2).filter(|text| !text.is_empty()).cloned();
                tags.pin = Some((first.to_owned(), number.to_owned(), function));
            }
            "C" => tags.part = (!first.is_empty()).then(|| first.to_owned()),
            _ => tags.value = (!first.is_empty()).then(|| first.to_owned()),
        }
        Ok(())
    }

    fn delete(&mut self, name: &str) {
        if matches!(name, "" | "AperFunction") {
            self.function = None;
        }
        if matches!(name, "" | "N" | "P" | "C" | "CVal") && *self.object != Tags::default() {
            let tags = Arc::make_mut(&mut self.object);
            match name {
                "N" => tags.net = NetTag::Missing,
                "P" => tags.pin = None,
                "C" => tags.part = None,
                "CVal" => tags.value = None,
                _ => *tags = Tags::default(),
            }
        }
    }
}

/// Resolves the escapes for characters: `\u` with four, `\U` with eight and a bare backslash with four
/// hexadecimal digits. What is none of these stays as it is.
pub fn decode(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    let mut rest = text;
    while let Some(at) = rest.find('\\') {
        out.push_str(&rest[..at]);
        let tail = &rest[at + 1..];
        let (skip, digits) = match tail.as_bytes().first() {
            Some(b'u') => (1, 4),
            Some(b'U') => (1, 8),
            _ => (0, 4),
        };
        let code = tail.get(skip..skip + digits).filter(|hex| hex.bytes().all(|b| b.is_ascii_hexdigit()));
        match code.and_then(|hex| u32::from_str_radix(hex, 16).ok()).and_then(char::from_u32) {
            Some(character) => {
                out.push(character);
                rest = &tail[skip + digits..];
            }
            None => {
                out.push('\\');
                rest = tail;
            }
        }
    }
    out.push_str(rest);
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn all_three_escape_forms_are_decoded_once() {
        assert_eq!(decode(r"A\u002AB"), "A*B");
        assert_eq!(decode(r"A\002CB\005C0041"), r"A,B\0041");
        assert_eq!(decode(r"\U000003A9"), "\u{3a9}");
        assert_eq!(decode(r"a\b {slash} \uZZZZ \uD800"), r"a\b {slash} \uZZZZ \uD800");
    }

    #[test]
    fn deleting_one_attribute_keeps_the_others() {
        let mut attributes = Attributes::default();
        for command in ["TO.N,GND", "TO.C,U1", "TO.P,U1,3,IO, 5", "TD.P"] {
            attributes.take(command, 1).unwrap();
        }
        assert_eq!(attributes.object.net, NetTag::Named("GND".into()));
        assert_eq!((attributes.object.part.as_deref(), &attributes.object.pin), (Some("U1"), &None));
        attributes.take("TD", 1).unwrap();
        assert_eq!(*attributes.object, Tags::default());
        assert!(attributes.take("TO.P,U1", 1).is_err());
    }
}
