//! Published closed forms of the return current, one file for each model. All per ampere, positive = return.
//!
//! | file | source current | return conductor | frequency |
//! |---|---|---|---|
//! | [`strip`] | filament, uniform strip | endless perfect plane | high |
//! | [`stripline`] | filament, uniform strip | two perfect planes, bonded | high |
//! | [`resistive`] | filament | endless resistive sheet | any |
//! | [`pair`] | filament | two resistive sheets, bonded: shares | any |
//! | [`edge`] | filament | perfect strip, perfect half-plane | high |
//! | [`microstrip`] | zero-thickness strip | perfect plane: line constants | high |
//! | [`stripline_constants`] | zero-thickness strip | two perfect planes: line constants | high |
//!
//! Model, source, range and tests stand in each file.

pub mod edge;
pub mod microstrip;
pub mod pair;
pub mod resistive;
pub mod strip;
pub mod stripline;
pub mod stripline_constants;
