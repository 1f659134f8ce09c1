//! The sheets a user gets: ticket map, contact sheet, tables and JSON, as bytes.

mod conductors;
mod contact;
mod csv;
mod current;
mod finding;
mod findings;
mod json;
mod layer;
mod look;
mod manifest;
mod marks;
pub mod numbers;
mod pair;
mod picture;
mod plan;
mod remark;
mod sheet;
mod ticket;
mod words;

pub use contact::{ContactCell, ContactInput, ContactRow, Thumbnail, contact, contact_scenes, thumbnail};
pub use csv::csv;
pub use findings::{FINDINGS_SCHEMA, Findings, Subject};
pub use json::json;
pub use layer::{LayerInput, layer_scenes, layers};
pub use look::Look;
pub use manifest::{Manifest, is_inside, sha256_hex};
pub use marks::{Outlined, marks};
pub use pair::{PairInput, PairSide, pair, pair_scene};
pub use picture::Picture;
pub use plan::PlanAccount;
pub use sheet::{SheetInput, listing, sheet};
pub use ticket::{TicketInput, ticket, ticket_scene};
