//! From a board and a review to what will be solved: tracks, planes, landings, voids and cells, before any solve.

mod build;
mod cell;
mod copper;
mod graph;
mod landing;
mod request;
mod route;
mod stretch;
mod terrain;
mod touch;
mod void;
mod web;

pub use build::build;
pub use request::{apply_review, matches};

use crate::diag::Diagnostic;
use crate::field::PlaneId;
use crate::geom::{Point, Polygon};
use crate::review::Band;

/// Everything that will be charted.
#[derive(Clone, Debug, Default)]
pub struct Plan {
    /// Charted nets in the order of the review.
    pub nets: Vec<NetPlan>,
    /// Bands in the order of the review.
    pub bands: Vec<Band>,
    /// What was assumed or skipped.
    pub messages: Vec<Diagnostic>,
}

/// One charted net.
#[derive(Clone, Debug)]
pub struct NetPlan {
    /// Name of the net.
    pub net: String,
    /// Driving pin, as `U5.19`.
    pub driver: String,
    /// Receiving pin.
    pub receiver: String,
    /// The way of the signal from driver to receiver.
    pub track: Vec<TrackLeg>,
    /// One entry for each plane that the track passes, in the order of the track.
    pub charts: Vec<ChartPlan>,
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
