//! `ebbmap look`: prints what was understood of a board or a review.

use super::progress::Progress;
use super::{Console, Exit};
use crate::board::Board;
use crate::plan::Plan;
use crate::read::read_board;
use crate::report::{Look, PlanAccount, json};
use crate::review::Review;
use crate::run::{self, LayerOrder, Unusable};
use serde::Serialize;
use std::path::Path;

/// Folder and style of the pictures that are wanted.
type Pictures<'a> = Option<(&'a Path, &'a str)>;

/// Prints what was understood of the board or review at `path`, as text or JSON, and draws it where pictures are wanted.
pub fn look(path: &Path, as_json: bool, pictures: Pictures, console: &mut Console) -> Exit {
    if path.extension().is_some_and(|extension| extension == "toml") {
        look_review(path, as_json, pictures, console)
    } else {
        look_board(path, as_json, pictures, console)
    }
}

/// Draws the layers where pictures are wanted; says where they lie unless the answer is JSON.
fn draw(
    board: &Board,
    review: Option<(&Review, &str, &Plan)>,
    pictures: Pictures,
    as_json: bool,
    console: &mut Console,
) -> Result<(), Unusable> {
    let Some((out, style)) = pictures else { return Ok(()) };
    let progress = Progress::new(false, console.ink());
    let names = run::draw_layers(&LayerOrder { board, review, out, style }, &progress)?;
    if !as_json {
        let count = names.iter().filter(|name| name.ends_with(".svg")).count();
        console.result(&format!("\nPictures {count} layers, SVG and PNG, in `{}`\n", out.display()));
    }
    Ok(())
}

/// The account of a board with that of a plan.
#[derive(Serialize)]
struct Both {
    #[serde(flatten)]
    board: Look,
    plan: PlanAccount,
}

/// Prints what was understood of the review at `path`: its board and what would be solved.
fn look_review(path: &Path, as_json: bool, pictures: Pictures, console: &mut Console) -> Exit {
    let progress = Progress::new(false, console.ink());
    let Ok(prepared) = run::prepare(path, None, &progress) else { return Exit::Unusable };
    let board = Look::new(&prepared.board, &prepared.messages);
    let plan = PlanAccount::new(&prepared.plan, &prepared.review, &prepared.board);
    if as_json {
        console.result(&String::from_utf8_lossy(&json(&Both { board, plan })));
    } else {
        console.result(&board.text());
        console.result(&format!("\nPlan     {}", plan.text()));
    }
    let review = Some((&prepared.review, prepared.file.text.as_str(), &prepared.plan));
    if draw(&prepared.board, review, pictures, as_json, console).is_err() {
        return Exit::Unusable;
    }
    if prepared.is_complete() { Exit::Complete } else { Exit::Incomplete }
}

/// Prints what was understood of the fabrication set at `path`.
fn look_board(path: &Path, as_json: bool, pictures: Pictures, console: &mut Console) -> Exit {
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
    if draw(&board, None, pictures, as_json, console).is_err() { Exit::Unusable } else { Exit::Complete }
}
