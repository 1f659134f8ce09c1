//! Codes of messages about style files.

use super::Code;

/// A style file that is no valid TOML or does not have the keys of a style.
pub const STYLE_SYNTAX: Code = Code {
    name: "style-syntax",
    meaning: "A style file must be TOML with the tables and keys of the styles that come with the program. Nothing \
              was drawn. Copy styles/paper.toml and change values in the copy.",
};

/// A style that breaks a rule of legibility.
pub const STYLE_RULE: Code = Code {
    name: "style-rule",
    meaning: "A style must keep its pictures legible: contrast of text and marks, density maps whose lightness rises or \
              falls all the way, a page that differs from the lowest density, type that is not too small. Nothing was \
              drawn. Change the named key.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[STYLE_SYNTAX, STYLE_RULE];
