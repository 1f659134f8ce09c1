//! The review file, and the plan made from a board and a review.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on may panic")]

mod conductors;
mod draft;
mod drives;
mod joints;
mod paths;
mod planes;
mod review;
mod sets;
mod way;

use ebbmap::board::Board;
use ebbmap::diag::Diagnostic;
use ebbmap::plan::Plan;
use ebbmap::review::{NetRequest, Review};

/// A review that charts one net or pattern over `GND`.
fn review(name: &str) -> Review {
    Review {
        file: "review.toml".into(),
        reference_nets: vec!["GND".into()],
        nets: vec![NetRequest { name: name.into(), ..NetRequest::default() }],
        ..Review::default()
    }
}

fn plan(board: Board, review: &Review) -> Plan {
    ebbmap::plan::build(&board, review)
}

fn messages<'p>(plan: &'p Plan, code: &str) -> Vec<&'p Diagnostic> {
    plan.messages.iter().filter(|message| message.code.name == code).collect()
}
