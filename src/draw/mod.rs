//! Drawing: scenes of placed items, the color scale, and the writers of SVG and PNG.
//!
//! A picture is a [`Scene`]: items in millimeters on a sheet, in reading order. [`svg`] turns a scene into text and
//! [`png`] renders that very text, so the two cannot differ. Nothing here knows how a board is read or solved.

pub mod callout;
pub mod change;
pub mod contour;
pub mod copper;
pub mod density;
pub mod film;
pub mod flow;
mod font;
pub mod frame;
pub mod joint;
mod label;
pub mod layer;
pub mod list;
pub mod map;
mod number;
pub mod pair;
pub mod pairsheet;
pub mod panel;
mod path;
#[cfg(feature = "pdf")]
pub mod pdf;
pub mod place;
pub mod plot;
pub mod png;
mod scale;
mod scene;
pub mod set;
pub mod svg;
mod text;
pub mod ticket;
mod view;

pub use font::width_mm;
pub use number::{grouped, significant, with_prefix};
pub use path::PathData;
pub use scale::{DensityScale, ScaleChoice};
pub use scene::{Group, Image, Item, Scene, Shape, TextBox};
pub use text::{Anchor, Span, Text, italic, plain, raised, shortened, wrapped};
pub use view::View;
