//! Copper layers: the objects that draw them and the copper that results.

use super::{NetId, PinId};
use crate::geom::{Point, Polygon, Region};

/// Where a layer lies in the board.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LayerRole {
    /// The outer layer on the side seen from the top.
    Top,
    /// Between the outer layers.
    Inner,
    /// The outer layer on the other side.
    Bottom,
}

/// One copper layer.
#[derive(Clone, Debug)]
pub struct CopperLayer {
    /// Where it lies.
    pub role: LayerRole,
    /// Image objects in file order, dark and clear, blocks and repeats resolved.
    pub objects: Vec<CopperObject>,
    /// The composed image (clear objects taken off what lies before them), before drilling.
    pub copper: Region,
    /// The same copper by net: connected pieces of the copper of one net (or of no net). Copper of different nets
    /// that touches stays apart, see [`super::Tie`].
    pub areas: Vec<CopperArea>,
}

/// A connected piece of copper of one net on one layer.
#[derive(Clone, Debug)]
pub struct CopperArea {
    /// Its net; none for copper that the files give no net.
    pub net: Option<NetId>,
    /// Its shape, voids as holes.
    pub shape: Polygon,
}

/// One object of a copper image.
#[derive(Clone, Debug)]
pub struct CopperObject {
    /// Geometry.
    pub kind: CopperKind,
    /// Whether it adds copper (dark) or removes it (clear).
    pub dark: bool,
    /// Net attribute; none where the file has none, an empty one, or for clear objects.
    pub net: Option<NetId>,
    /// The pin whose pad this is.
    pub pin: Option<PinId>,
    /// Reference of the part that it belongs to, empty if none.
    pub part: String,
    /// What it is for.
    pub function: ObjectFunction,
    /// Line in the layer's file, from 1.
    pub line: u32,
}

/// Geometry of a copper object.
#[derive(Clone, Debug)]
pub enum CopperKind {
    /// A line or arc drawn with a round pen of `width_m`; arcs are given as chords (sagitta below 1 um).
    Draw {
        /// Centre line, at least one point (a single point is a dot).
        path: Vec<Point>,
        /// Pen diameter in metres.
        width_m: f64,
    },
    /// A pad.
    Flash {
        /// The flash point.
        at: Point,
        /// Its shape in place.
        shape: Region,
    },
    /// A filled area, keyhole cut-ins already resolved into holes.
    Fill {
        /// Its shape in place.
        shape: Region,
    },
}

/// What a copper object is for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ObjectFunction {
    /// A signal track: a draw that is neither fill nor outline.
    Track,
    /// A draw that fills or outlines an area.
    AreaStroke,
    /// A filled area.
    Area,
    /// A pad of a part.
    Pad,
    /// The pad of a via.
    ViaPad,
    /// Copper that makes up a part (net ties, printed jumpers).
    EtchedPart,
    /// Text, logos, fiducials and other copper that carries no signal.
    Other,
}
