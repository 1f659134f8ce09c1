//! `ebbmap look`: prints what was understood of a board or a review.

use super::{Console, Exit};
use std::path::Path;

/// Prints what was understood of the board or review at `path`, as text or JSON.
pub fn look(_path: &Path, _json: bool, console: &mut Console) -> Exit {
    console.remark("error: `look` cannot read anything yet\n");
    Exit::Unusable
}
