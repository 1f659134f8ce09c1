//! Nets, pins, parts, and the places where nets are tied together.

use crate::geom::{Point, Region};

/// Index of a net in [`super::Board::nets`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct NetId(pub u32);

/// Index of a pin in [`super::Board::pins`].
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PinId(pub u32);

/// A net.
#[derive(Clone, Debug, PartialEq)]
pub struct Net {
    /// Name, escapes decoded.
    pub name: String,
}

/// A pin of a part.
#[derive(Clone, Debug)]
pub struct Pin {
    /// Reference of the part, for example `U5`.
    pub part: String,
    /// Number or name of the pin, for example `19` or `A11`.
    pub number: String,
    /// Function if the files give one.
    pub function: Option<String>,
    /// Its net.
    pub net: Option<NetId>,
    /// Layer of its pad, index from 0; for a plated hole the layer on which the files name the pin.
    pub layer: usize,
    /// Place of its pad.
    pub at: Point,
    /// Shape of its pad on that layer.
    pub pad: Region,
    /// Index of the plated hole in its pad, in [`super::Board::holes`].
    pub hole: Option<usize>,
}

impl Pin {
    /// The pin as texts name it, for example `U5.19`.
    pub fn label(&self) -> String {
        format!("{}.{}", self.part, self.number)
    }
}

/// A part.
#[derive(Clone, Debug, PartialEq)]
pub struct Part {
    /// Reference, for example `R12`.
    pub reference: String,
    /// Value if the files give one.
    pub value: Option<String>,
}

/// How a tie joins its nets.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TieKind {
    /// Copper without a net that touches copper of two or more nets.
    EtchedCopper,
    /// Pads of one part, of different nets, that touch each other.
    AbuttingPads,
}

/// A place where nets are joined by copper on purpose. The nets themselves are never merged.
#[derive(Clone, Debug)]
pub struct Tie {
    /// Reference of the part, empty if the copper names none.
    pub part: String,
    /// How it joins them.
    pub kind: TieKind,
    /// The nets that it joins, sorted, at least two.
    pub nets: Vec<super::NetId>,
    /// Layer index from 0.
    pub layer: usize,
    /// Its middle.
    pub at: Point,
    /// The joining copper.
    pub shape: Region,
}
