//! The magneto-quasi-static problem of thin conducting sheets, and its solution.
//!
//! Knows nothing of boards: it gets masks, heights, verticals, sources and frequencies.

mod problem;

pub use problem::{Injection, Patch, Problem, Sheet, SourceStrip, StripProfile, Vertical};

mod solution;
mod system;
pub use solution::{Solution, SolveFailure};
pub use system::{Drive, OperatingPoint, System};
