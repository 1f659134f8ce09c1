//! A whole run: review -> plan -> maps -> files, with progress and threads.

mod name;
mod select;
mod store;
mod watch;

pub use name::{MapName, file_stems};
pub use select::chosen;
pub use store::{Store, StoreFailure};
pub use watch::{Unwatched, Watch};
