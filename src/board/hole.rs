//! Holes and slots, and what their barrels join.

use super::NetId;
use crate::geom::Point;

/// Whether a hole has a conducting barrel.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Plating {
    /// Has a barrel.
    Plated,
    /// Has none: it only cuts the copper.
    NonPlated,
}

/// A drilled hole or routed slot.
#[derive(Clone, Debug)]
pub struct Hole {
    /// Centre (one point) or the centre line of a slot (two or more).
    pub path: Vec<Point>,
    /// Tool diameter in metres.
    pub diameter_m: f64,
    /// Whether it has a barrel.
    pub plating: Plating,
    /// First and last copper layer that it passes, indices from 0.
    pub layers: (usize, usize),
    /// Whether the files call it a via rather than a part's hole.
    pub via: bool,
    /// Copper that the barrel touches: layer index and index of the area in [`super::CopperLayer::areas`], by layer.
    /// Found by the hole against the copper, since unused pads may be missing and a solid contact has no pad.
    pub contacts: Vec<(usize, usize)>,
    /// The net of the barrel: that of its contacts where they agree.
    pub net: Option<NetId>,
}

impl Hole {
    /// The middle of the hole or slot.
    pub fn centre(&self) -> Point {
        let sum = self.path.iter().fold(Point::default(), |sum, &point| sum + point);
        sum * (1.0 / self.path.len() as f64)
    }
}
