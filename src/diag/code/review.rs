//! Codes raised while a review is read.

use super::Code;

/// The review cannot be opened.
pub const REVIEW_UNREADABLE: Code = Code {
    name: "review-unreadable",
    meaning: "The review file could not be opened or is not text in UTF-8. Nothing was done. Check the path and \
              the file's permissions.",
};

/// Not TOML.
pub const REVIEW_SYNTAX: Code = Code {
    name: "review-syntax",
    meaning: "The review is not valid TOML at this place: a bracket, a quote or an equals sign is missing, or a key \
              stands twice. Repeated tables are written with two brackets, `[[net]]`, single ones with one.",
};

/// Unknown key.
pub const REVIEW_UNKNOWN_KEY: Code = Code {
    name: "review-unknown-key",
    meaning: "The review holds a key or table that does not exist, so what it asks for would be left out silently. \
              Correct the spelling or remove it; the message names the nearest key.",
};

/// A value of the wrong type.
pub const REVIEW_WRONG_TYPE: Code = Code {
    name: "review-wrong-type",
    meaning: "A value in the review has another type than its key needs: quantities are text with their unit, \
              `\"0.2mm\"`, names are text, lists stand in brackets, tables such as `[[net]]` have two brackets.",
};

/// Missing key.
pub const REVIEW_MISSING_KEY: Code = Code {
    name: "review-missing-key",
    meaning: "The review lacks a key or table without which nothing can be charted. The message says which and \
              gives an example.",
};

/// Bad value.
pub const REVIEW_BAD_VALUE: Code = Code {
    name: "review-bad-value",
    meaning: "A value in the review has the right type but cannot be used: a quantity without its unit, a negative \
              thickness, a band whose limits are exchanged, an outline that crosses itself.",
};

/// The same name twice.
pub const REVIEW_DUPLICATE: Code = Code {
    name: "review-duplicate",
    meaning: "Two entries of the review have the same name, so it is not clear which one counts. Remove or rename \
              one of them.",
};

/// A value of the review replaces that of the files.
pub const REVIEW_OVERRIDE: Code = Code {
    name: "review-override",
    meaning: "A value in the review replaces one from the fabrication data. The review always wins; the note says \
              what the files had, so that a forgotten override does not go unseen.",
};

/// Lists of the stackup do not fit the board.
pub const REVIEW_STACKUP_LENGTH: Code = Code {
    name: "review-stackup-length",
    meaning: "A list under `[stackup]` must have one entry for each copper layer, or for each dielectric between \
              them, from the top. Write `\"\"` for an entry that shall keep the value of the files.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[
    REVIEW_UNREADABLE,
    REVIEW_SYNTAX,
    REVIEW_UNKNOWN_KEY,
    REVIEW_WRONG_TYPE,
    REVIEW_MISSING_KEY,
    REVIEW_BAD_VALUE,
    REVIEW_DUPLICATE,
    REVIEW_OVERRIDE,
    REVIEW_STACKUP_LENGTH,
];
