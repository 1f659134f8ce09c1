//! Codes raised by the room `run`.

use super::Code;

/// An output cannot be written.
pub const CANNOT_WRITE: Code = Code {
    name: "cannot-write",
    meaning: "The output folder, or a file in it, cannot be made, written, renamed or removed. The message gives the \
              path and what the operating system said. The folder is tried before anything is computed; files \
              appear whole or not at all. Choose another folder with `--out`, or mend its rights or the disk.",
};

/// `--only` names no net of the review.
pub const ONLY_UNKNOWN: Code = Code {
    name: "only-unknown",
    meaning: "`--only` chooses among the nets that the review charts; this name or pattern matches none of them. \
              Nothing was drawn. Correct the name, or add the net to the review as `[[net]]`: the common scale and \
              the numbering of findings count all nets of the review, whatever `--only` says.",
};

/// The picture cannot be rendered.
pub const CANNOT_RENDER: Code = Code {
    name: "cannot-render",
    meaning: "A picture could not be turned into SVG or PNG, which no input should cause: please report the review and \
              the board. The other outputs are complete.",
};

/// A style file cannot be read.
pub const STYLE_UNREADABLE: Code = Code {
    name: "style-unreadable",
    meaning: "The style file named with `--style` cannot be read; the message says what the operating system said. A \
              name without `.toml` means a style that comes with the program, anything else a file.",
};

/// All codes of this room.
pub const ALL: &[Code] = &[CANNOT_WRITE, ONLY_UNKNOWN, CANNOT_RENDER, STYLE_UNREADABLE];
