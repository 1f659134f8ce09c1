//! `ebbmap look`: prints what was understood of a board or a review.

use super::{Console, Exit};
use crate::read::read_board;
use crate::report::{Look, json};
use std::path::Path;

/// Prints what was understood of the board or review at `path`, as text or JSON.
pub fn look(path: &Path, as_json: bool, console: &mut Console) -> Exit {
    look_board(path, as_json, console)
}

/// Prints what was understood of the fabrication set at `path`.
fn look_board(path: &Path, as_json: bool, console: &mut Console) -> Exit {
    let (board, messages) = match read_board(path) {
        Ok(read) => read,
        Err(messages) => {
            for message in &messages {
                console.message(message);
            }
            return Exit::Unusable;
        }
    };
    let account = Look::new(&board, &messages);
    for message in &messages {
        console.message(message);
    }
    if as_json {
        console.result(&String::from_utf8_lossy(&json(&account)));
    } else {
        console.result(&account.text());
    }
    Exit::Complete
}
