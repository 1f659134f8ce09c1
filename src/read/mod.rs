//! Reads fabrication data into a board: folder or archive, Gerber and drill files, job file.

mod build;
mod compose;
mod copper;
pub mod drill;
pub mod gerber;
mod holes;
pub mod job;
pub mod log;
mod outline;
mod set;
mod source;
mod stackup;
pub mod style;
mod ties;

pub use build::read_board;
