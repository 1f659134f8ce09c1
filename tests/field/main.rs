//! From a plan to a solved map: coverage, masks, the closed form, figures and numbers.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on may panic")]

mod boards;
mod closed_form;
#[path = "../plan/draft.rs"]
#[allow(dead_code, reason = "this binary needs a part of the drafts")]
mod draft;
mod mask;
mod numbers;
mod paths;
mod sample;
mod scene;
mod signal;
mod solved;
mod stacked;
