//! Findings and the figures they rest on, each against a closed form, a worked example or a second solve.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on may panic")]

mod documents;
mod effects;
mod gauge;
mod judging;
mod noise;
mod remedies;
#[path = "../field/scene.rs"]
#[allow(dead_code, reason = "the scene serves several tests")]
mod scene;
