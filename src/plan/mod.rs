//! From a board and a review to what will be solved: tracks, planes, landings, voids and cells, before any solve.

mod barrel;
mod build;
mod cell;
mod chart;
mod conductors;
mod copper;
mod course;
mod entry;
mod extent;
mod graph;
mod landing;
mod line;
mod part;
mod place;
mod reach;
mod request;
mod route;
mod sheets;
mod signal;
mod stretch;
mod supply;
mod terrain;
mod tie;
mod touch;
mod value;
mod void;
mod web;

pub use build::build;
pub use request::{apply_review, matches};
pub use signal::SignalPlan;

use crate::diag::Diagnostic;
use crate::field::PlaneId;
use crate::geom::{Point, Polygon};
use crate::review::Band;

/// Everything that will be charted.
#[derive(Clone, Debug, Default)]
pub struct Plan {
    /// Charted paths in the order of the review.
    pub paths: Vec<PathPlan>,
    /// All copper that can carry return current and what joins it, common to all paths.
    pub conductors: Conductors,
    /// Bands in the order of the review.
    pub bands: Vec<Band>,
    /// What was assumed or skipped.
    pub messages: Vec<Diagnostic>,
}

/// One charted path: the way of a signal's current from its driver to where it ends. A charted net is a path of one
/// net.
#[derive(Clone, Debug, Default)]
pub struct PathPlan {
    /// Name: of the net, or that of the review's path or pair.
    pub name: String,
    /// Driving pin, as `U5.19`.
    pub driver: String,
    /// Receiving pin.
    pub receiver: String,
    /// The way of the signal from driver to receiver.
    pub track: Vec<TrackLeg>,
    /// Where current enters the conductors (positive) or leaves them, per ampere of the driver's current; they sum
    /// to zero.
    pub entries: Vec<Entry>,
    /// What joins conductors for this path alone, for example the reference pins of its parts, tied together inside.
    pub joints: Vec<Joint>,
    /// Pieces of [`Conductors::layers`] that are copper of the path's own nets, by layer and index: no sheets for this
    /// path, and joints that end on them are none of its.
    pub own_areas: Vec<(usize, usize)>,
    /// Frequency in Hz up to which the loop and the board are below a tenth of a wavelength; 0 where not known.
    pub valid_to_hz: f64,
    /// One entry for each plane that the track passes, in the order of the track.
    pub charts: Vec<ChartPlan>,
    /// Spectrum of the drive by band, and what is assumed of the signal.
    pub signal: SignalPlan,
}

/// A current that enters the conductors.
#[derive(Clone, Debug, PartialEq)]
pub struct Entry {
    /// Where.
    pub end: End,
    /// Current into the conductors in A per A of the driver's current.
    pub current: f64,
    /// What it is in words, for example `via of U5.20`.
    pub what: String,
}

/// All copper that can carry return current, and what joins it.
#[derive(Clone, Debug, Default)]
pub struct Conductors {
    /// Copper by layer, from the top; layers without such copper are left out.
    pub layers: Vec<ConductorLayer>,
    /// Barrels, parts and ties that join copper of different places, in a fixed order.
    pub joints: Vec<Joint>,
    /// Nodes outside the board's copper, in words: the inside of a part, a chassis, a cable shield.
    pub nodes: Vec<String>,
}

/// Copper of one layer that can carry return current: one sheet, on which areas of different nets stay apart.
#[derive(Clone, Debug, PartialEq)]
pub struct ConductorLayer {
    /// Layer, index from 0.
    pub layer: usize,
    /// Indices of the areas in the layer's `areas`, rising.
    pub areas: Vec<usize>,
}

/// What a joint is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum JointKind {
    /// A plated hole between two layers.
    Barrel,
    /// A part: capacitor, bead, resistor, link.
    Part,
    /// Copper that ties nets together, or a tie that the review names.
    Tie,
    /// Pins tied together inside a part.
    Inside,
}

/// A lumped branch r + s l + 1/(s c) between two places of the conductors.
#[derive(Clone, Debug, PartialEq)]
pub struct Joint {
    /// What it is.
    pub kind: JointKind,
    /// Its name in words: `C14`, `NT1`, `via`.
    pub what: String,
    /// Where it is drawn.
    pub at: Point,
    /// Where positive current leaves the copper.
    pub from: End,
    /// Where it enters the copper.
    pub to: End,
    /// Resistance in ohm.
    pub resistance_ohm: f64,
    /// Inductance in henry, without that of a barrel.
    pub inductance_h: f64,
    /// Series capacitance in farad; none conducts at DC.
    pub capacitance_f: Option<f64>,
    /// Radius of the barrel in metres, whose inductance the field adds as far as cells do not carry it.
    pub barrel_radius_m: Option<f64>,
}

/// An end of a joint, or a place where current enters.
#[derive(Clone, Debug, PartialEq)]
pub enum End {
    /// The circle of a barrel or pad on an area of a layer.
    Copper {
        /// Layer, index from 0.
        layer: usize,
        /// Index of the area in the layer's `areas`.
        area: usize,
        /// Middle.
        at: Point,
        /// Radius in metres.
        radius_m: f64,
    },
    /// A node of [`Conductors::nodes`].
    Node(usize),
}

/// A straight piece of the signal's way.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TrackLeg {
    /// Start, towards the driver.
    pub from: Point,
    /// End, towards the receiver.
    pub to: Point,
    /// Copper layer, index from 0.
    pub layer: usize,
    /// Width in metres; of the pad where the way crosses a pad.
    pub width_m: f64,
    /// Current from `from` to `to` in A per A of the driver's current: 1 on a plain way, less on a branch or along a
    /// loaded line, negative on the return line of a pair.
    pub current: f64,
}

/// What is charted of a net on one plane.
#[derive(Clone, Debug)]
pub struct ChartPlan {
    /// The plane.
    pub plane: PlaneId,
    /// Legs of the track that this plane serves.
    pub legs: std::ops::Range<usize>,
    /// Where the return leaves the plane (towards the driver's reference pin).
    pub driver_landing: Landing,
    /// Where the return enters the plane (at the receiver's end).
    pub receiver_landing: Landing,
    /// Thickness of the dielectric between track copper and plane copper in metres: `h` wherever it is printed.
    pub height_m: f64,
    /// Length-weighted mean width of the track in metres.
    pub width_m: f64,
    /// Voids of the plane inside the outline, webs narrower than 2h closed.
    pub voids: Vec<Void>,
    /// Side of a cell in metres.
    pub cell_m: f64,
    /// Number of unknown branch currents.
    pub unknowns: usize,
    /// Memory that the solve will take, in bytes.
    pub memory_bytes: usize,
    /// Why no map will be drawn, if none will.
    pub withheld: Option<Diagnostic>,
}

/// Where the return enters or leaves a plane.
#[derive(Clone, Debug, PartialEq)]
pub struct Landing {
    /// Middle.
    pub at: Point,
    /// Radius of the barrel or pad over whose circle the current enters, in metres.
    pub radius_m: f64,
    /// What it is in words, for example `via of U5.20`.
    pub what: String,
}

/// A void of a plane.
#[derive(Clone, Debug)]
pub struct Void {
    /// Stable id: layer and centre to 0.1 mm, or the name given in the review.
    pub id: String,
    /// Its shape.
    pub shape: Polygon,
}
