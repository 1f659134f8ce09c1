//! The review file, and the plan made from a board and a review.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on may panic")]

mod drives;
mod review;
