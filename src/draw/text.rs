//! Lines of text with measured boxes, symbols in italics, raised exponents, and names that never break a picture.
//!
//! Strings carry two marks of their own: U+0011 turns italics on and off, U+0012 raising. [`plain`] makes text from
//! outside safe: control characters become escapes. A character that a face lacks is drawn as `\uXXXX`.

use super::font::{has, width_mm};
use crate::style::{Face, Rgb};

const ITALIC: char = '\u{11}';
const RAISED: char = '\u{12}';
/// Size and lift of raised text in parts of the type size.
const RAISED_SIZE: f64 = 0.7;
const RAISED_LIFT: f64 = 0.33;

/// `text` in italics, for symbols of quantities.
pub fn italic(text: &str) -> String {
    format!("{ITALIC}{text}{ITALIC}")
}

/// `text` raised, for exponents.
pub fn raised(text: &str) -> String {
    format!("{RAISED}{text}{RAISED}")
}

/// Text from outside (names) with control characters as `\uXXXX`.
pub fn plain(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for character in text.chars() {
        if character.is_control() { push_escape(&mut out, character) } else { out.push(character) }
    }
    out
}

fn push_escape(out: &mut String, character: char) {
    let mut units = [0; 2];
    for unit in character.encode_utf16(&mut units) {
        out.push_str(&format!("\\u{unit:04X}"));
    }
}

/// Which point of a line its position names.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Anchor {
    /// The left end.
    Start,
    /// The middle.
    Middle,
    /// The right end.
    End,
}

/// A piece of a line in one face.
#[derive(Clone, Debug, PartialEq)]
pub struct Span {
    /// Characters that the face has.
    pub text: String,
    /// Face.
    pub face: Face,
    /// Whether it is an exponent.
    pub raised: bool,
}

/// One line of text.
#[derive(Clone, Debug, PartialEq)]
pub struct Text {
    /// Pieces in reading order.
    pub spans: Vec<Span>,
    /// Position of the anchor in mm.
    pub x: f64,
    /// Baseline in mm.
    pub y: f64,
    /// Type size in mm.
    pub size: f64,
    /// Which point `x` is.
    pub anchor: Anchor,
    /// Color.
    pub fill: Rgb,
    /// Color of a halo round the letters.
    pub halo: Option<Rgb>,
    /// Whether a character was replaced by its escape.
    pub escaped: bool,
}

impl Text {
    /// A line that starts at `(x, y)`; `text` may carry marks of [`italic`] and [`raised`].
    pub fn new(x: f64, y: f64, size: f64, face: Face, fill: Rgb, text: &str) -> Self {
        let (spans, escaped) = spans(face, text);
        Self { spans, x, y, size, anchor: Anchor::Start, fill, halo: None, escaped }
    }

    /// The same line with another anchor.
    pub fn anchored(mut self, anchor: Anchor) -> Self {
        self.anchor = anchor;
        self
    }

    /// The same line with a halo.
    pub fn with_halo(mut self, halo: Rgb) -> Self {
        self.halo = Some(halo);
        self
    }

    /// Width in mm.
    pub fn width(&self) -> f64 {
        self.spans.iter().map(|span| span_width(span, self.size)).sum()
    }

    /// Left edge in mm.
    pub fn left(&self) -> f64 {
        match self.anchor {
            Anchor::Start => self.x,
            Anchor::Middle => self.x - 0.5 * self.width(),
            Anchor::End => self.x - self.width(),
        }
    }

    /// The characters without marks.
    pub fn content(&self) -> String {
        self.spans.iter().map(|span| span.text.as_str()).collect()
    }
}

fn span_width(span: &Span, size: f64) -> f64 {
    width_mm(span.face, if span.raised { RAISED_SIZE * size } else { size }, &span.text)
}

/// Size and lift in mm of a span in a line of type size `size`.
pub(super) fn span_size(span: &Span, size: f64) -> (f64, f64) {
    if span.raised { (RAISED_SIZE * size, RAISED_LIFT * size) } else { (size, 0.0) }
}

fn spans(face: Face, text: &str) -> (Vec<Span>, bool) {
    let mut all: Vec<Span> = Vec::new();
    let (mut slanted, mut lifted, mut escaped) = (false, false, false);
    for character in text.chars() {
        match character {
            ITALIC => slanted = !slanted,
            RAISED => lifted = !lifted,
            _ => {
                let wanted = if slanted { Face::NarrowItalic } else { face };
                // The narrow faces lack Greek and Cyrillic, which the normal ones have.
                let wider = if wanted.weight() > 400 { Face::Bold } else { Face::Regular };
                let known = [wanted, wider].into_iter().find(|&face| has(face, character));
                let face = known.unwrap_or(wanted);
                let fits = matches!(all.last(), Some(last) if last.face == face && last.raised == lifted);
                if !fits {
                    all.push(Span { text: String::new(), face, raised: lifted });
                }
                let Some(last) = all.last_mut() else { continue };
                if known.is_some() {
                    last.text.push(character);
                } else {
                    escaped = true;
                    push_escape(&mut last.text, character);
                }
            }
        }
    }
    (all, escaped)
}

/// Width in mm of marked text.
pub(super) fn marked_width(face: Face, size: f64, text: &str) -> f64 {
    spans(face, text).0.iter().map(|span| span_width(span, size)).sum()
}

/// `name` cut in the middle so that it is at most `width` mm wide in `face`; its start and end stay.
pub fn shortened(face: Face, size: f64, name: &str, width: f64) -> String {
    let name = plain(name);
    if marked_width(face, size, &name) <= width {
        return name;
    }
    let characters: Vec<char> = name.chars().collect();
    let cut = |kept: usize| {
        let head = kept.div_ceil(2);
        let tail = kept - head;
        let start: String = characters[..head].iter().collect();
        let end: String = characters[characters.len() - tail..].iter().collect();
        format!("{start}\u{2026}{end}")
    };
    // The width grows with the number of characters kept, so the largest that fits is found by bisection.
    let (mut low, mut high) = (0, characters.len().saturating_sub(1));
    while low < high {
        let middle = (low + high).div_ceil(2);
        if marked_width(face, size, &cut(middle)) <= width { low = middle } else { high = middle - 1 }
    }
    cut(low)
}

/// `text` broken at spaces into lines of at most `width` mm; a word that is too long gets a line of its own and is
/// cut in its middle. Marks must not span a space.
pub fn wrapped(face: Face, size: f64, text: &str, width: f64) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    let mut line = String::new();
    for word in text.split(' ').filter(|word| !word.is_empty()) {
        let longer = if line.is_empty() { word.to_owned() } else { format!("{line} {word}") };
        if marked_width(face, size, &longer) <= width {
            line = longer;
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        line = if marked_width(face, size, word) <= width {
            word.to_owned()
        } else {
            shortened(face, size, word, width)
        };
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_are_cut_in_the_middle_and_escapes_are_visible() {
        let long = "A".repeat(40) + &"Z".repeat(60);
        let short = shortened(Face::Narrow, 3.6, &long, 30.0);
        assert!(short.starts_with("AAA") && short.ends_with("ZZZ") && short.contains('…'));
        let width = marked_width(Face::Narrow, 3.6, &short);
        assert!(width <= 30.0 && width > 27.0, "{width}");
        assert_eq!(shortened(Face::Narrow, 3.6, "ADC_SCK", 30.0), "ADC_SCK");
        let text = Text::new(0.0, 0.0, 3.0, Face::Narrow, Rgb::default(), &plain("漢\u{7}\u{1F600}"));
        assert!(text.escaped);
        assert_eq!(text.content(), "\\u6F22\\u0007\\uD83D\\uDE00");
        let greek = Text::new(0.0, 0.0, 3.0, Face::Narrow, Rgb::default(), "m\u{3a9}");
        assert!(!greek.escaped);
        assert_eq!(greek.spans[1].face, Face::Regular);
    }

    #[test]
    fn lines_keep_to_their_width() {
        let text = "amperes of return current in each meter across the flow, for each ampere in the net";
        let lines = wrapped(Face::Narrow, 3.3, text, 40.0);
        assert!(lines.len() > 2);
        assert!(lines.iter().all(|line| marked_width(Face::Narrow, 3.3, line) <= 40.0));
        assert_eq!(lines.join(" "), text);
    }
}
