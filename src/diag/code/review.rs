//! Codes raised by the room `review`.

use super::Code;

/// All codes of this room.
pub const ALL: &[Code] = &[];
