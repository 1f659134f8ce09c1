//! From files to plain data: fabrication data (folder or archive, Gerber and drill files, job file) and reviews.

mod build;
mod compose;
mod copper;
pub mod drill;
pub mod gerber;
mod holes;
pub mod job;
pub mod log;
mod outline;
pub mod review;
mod set;
mod source;
mod stackup;
pub mod style;
mod ties;

pub use build::read_board;
pub use review::{ReviewFile, parse_review, read_review};
