//! Codes raised by the room `solve`.

use super::Code;

/// All codes of this room.
pub const ALL: &[Code] = &[];
