//! What findings are judged from: the figures and effects of every map of a path on a plane.

use crate::figure::{Effects, Figures};
use crate::plan::{ChartPlan, PathPlan};

/// One map of a path on a plane.
#[derive(Clone, Debug)]
pub struct MapEvidence {
    /// Name of the band.
    pub band: String,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Its figures.
    pub figures: Figures,
    /// What voids, edges and boundaries do.
    pub effects: Effects,
}

/// All maps of a path on a plane.
#[derive(Clone, Debug)]
pub struct PlaneEvidence<'a> {
    /// Number of the path in the plan of the whole review, from 1.
    pub number: usize,
    /// The path.
    pub path: &'a PathPlan,
    /// Its chart on the plane.
    pub chart: &'a ChartPlan,
    /// Maps in the order of bands and frequencies; those that were withheld are left out.
    pub maps: Vec<MapEvidence>,
}
