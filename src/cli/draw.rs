//! `ebbmap draw`: resolves what was typed and runs a whole review.

use super::args::DrawArguments;
use super::{Console, Exit};

/// Draws the maps of a review.
pub fn draw(_order: &DrawArguments, console: &mut Console) -> Exit {
    console.remark("error: `draw` cannot draw anything yet\n");
    Exit::Unusable
}
