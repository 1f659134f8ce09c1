//! What joins copper on the board and outside it: parts and ties, the user's words as plain data.

use super::Marks;
use crate::geom::Point;

/// Values of a branch r + s l + 1/(s c); what is not given is left to the files or to a stated default.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Branch {
    /// Series resistance in ohm.
    pub resistance_ohm: Option<f64>,
    /// Series inductance in henry.
    pub inductance_h: Option<f64>,
    /// Series capacitance in farad.
    pub capacitance_f: Option<f64>,
}

/// One `[[part]]`: what parts are that join copper. A part must fit all selectors that are given.
#[derive(Clone, Debug, Default)]
pub struct PartRequest {
    /// Reference or pattern with `*`.
    pub reference: Option<String>,
    /// Value of the part in the files.
    pub value: Option<String>,
    /// Nets of its pins, in any order.
    pub nets: Vec<String>,
    /// Whether the part is there at all.
    pub fitted: bool,
    /// Its values.
    pub branch: Branch,
    /// Reference nets that it joins inside.
    pub joins: Vec<String>,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}

/// One `[[tie]]`: a branch between two places.
#[derive(Clone, Debug)]
pub struct TieRequest {
    /// Its name in texts.
    pub name: String,
    /// One end.
    pub from: TieEnd,
    /// The other.
    pub to: TieEnd,
    /// Its values.
    pub branch: Branch,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}

/// An end of a tie.
#[derive(Clone, Debug, PartialEq)]
pub enum TieEnd {
    /// A pin, as `J1.3`.
    Pin(String),
    /// Reference copper at a point in the coordinates of the files.
    At(Point),
    /// Copper of a net, nearest to a point, or to the other end.
    Net {
        /// Name of the net.
        net: String,
        /// The point in the coordinates of the files.
        at: Option<Point>,
    },
    /// A node outside the board: a chassis, a cable shield.
    Outside(String),
}
