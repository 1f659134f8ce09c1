//! From a plan to a solved map: coverage, masks, the closed form, figures and numbers.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on may panic")]

mod boards;
mod closed_form;
mod mask;
mod numbers;
mod scene;
mod solved;
