//! A whole run: review -> plan -> maps -> files, with progress and threads.

mod chart;
mod documents;
mod draw;
mod input;
mod look;
mod name;
#[cfg(feature = "pdf")]
mod pdf;
mod select;
mod store;
mod watch;

pub use draw::{Ending, Order, Outcome, Prepared, Unusable, draw, prepare};
pub use look::{LayerOrder, draw_layers};
pub use name::{MapName, file_stems};
pub use select::chosen;
pub use store::{Store, StoreFailure};
pub use watch::{Unwatched, Watch};
