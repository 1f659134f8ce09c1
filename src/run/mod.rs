//! A whole run: review -> plan -> maps -> files, with progress and threads.

mod name;
mod store;

pub use name::{MapName, file_stems};
pub use store::{Store, StoreFailure};
