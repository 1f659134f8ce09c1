//! Reads Gerber files: commands, graphics state, apertures, attributes, to a list of image objects with their lines.
//!
//! Our own interpreter of the open format (Gerber layer format specification, revision 2023.08) and of the withdrawn
//! commands that are still written. Every command is either obeyed, known to change nothing, or an error with its line.

mod aperture;
mod attribute;
mod expression;
mod interpret;
mod macros;
mod number;
mod plot;
mod words;

pub(crate) use attribute::Attributes;
pub use attribute::{FileTags, NetTag, Tags};
pub use interpret::read_image;
pub(crate) use number::decimal;
pub(crate) use words::excerpt;

use crate::board::CopperKind;
use crate::geom::Bounds;
use std::sync::Arc;

/// One object of an image.
#[derive(Clone, Debug)]
pub struct Object {
    /// Geometry; draws may have a pen of no width.
    pub kind: CopperKind,
    /// Whether it adds to the image or removes from it.
    pub dark: bool,
    /// Net, pin and part.
    pub tags: Arc<Tags>,
    /// Aperture function with its further fields, for example `SMDPad,CuDef`.
    pub function: Option<Arc<str>>,
    /// Line in the file, from 1.
    pub line: u32,
}

/// A Gerber file as read.
#[derive(Debug, Default)]
pub struct Image {
    /// Its file attributes.
    pub file: FileTags,
    /// Its objects in order.
    pub objects: Vec<Object>,
}

impl Object {
    /// The smallest box round the object.
    pub fn bounds(&self) -> Bounds {
        match &self.kind {
            CopperKind::Draw { path, width_m } => Bounds::of(path.iter().copied()).grown(0.5 * width_m),
            CopperKind::Flash { shape, .. } | CopperKind::Fill { shape } => shape.bounds(),
        }
    }
}
