//! Codes raised by the room `plan`.

use super::Code;

/// All codes of this room.
pub const ALL: &[Code] = &[];
