//! The sheets a user gets: ticket map, contact sheet, tables and JSON, as bytes.

mod json;
mod manifest;
pub mod numbers;

pub use json::json;
pub use manifest::{Manifest, sha256_hex};
