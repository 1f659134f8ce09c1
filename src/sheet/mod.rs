//! The magneto-quasi-static problem of thin conducting sheets, and its solution.
//!
//! Knows nothing of boards: it gets masks, heights, verticals, sources and frequencies.

pub mod barrel;
mod branches;
mod family;
pub mod kernel;
mod loops;
pub mod mutual;
mod operator;
mod problem;
mod projector;
mod reaction;
pub mod source;

pub use problem::{Gap, Injection, Patch, Problem, Sheet, SourceStrip, StripProfile, Vertical};

mod solution;
mod sums;
mod system;
pub use family::Family;
pub use reaction::{Labels, NO_LABEL};
pub use solution::{Solution, SolveFailure};
pub use sums::Sums;
pub use system::{Drive, OperatingPoint, Prepared, System};
