//! Codes raised by the room `read`.

use super::Code;

/// All codes of this room.
pub const ALL: &[Code] = &[];
