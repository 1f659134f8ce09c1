//! What the user asks of a board: the review file as plain data, all quantities in SI units.
//!
//! Nothing here reads a file; `read::review` does.

pub mod drive;
pub mod joint;
pub mod limit;
pub mod path;

use crate::geom::{Point, Ring};
use std::path::PathBuf;

/// A review: one board, the nets to chart and the bands to chart them in.
#[derive(Clone, Debug, Default)]
pub struct Review {
    /// Name of the review's file, for messages.
    pub file: String,
    /// Folder or ZIP with the fabrication data, resolved against the review's folder.
    pub files: PathBuf,
    /// Title for the pictures; empty takes the job file's.
    pub title: String,
    /// Revision for the pictures; empty takes the job file's.
    pub revision: String,
    /// Point of the files' coordinates that zones, rulers, findings and numbers call (0, 0).
    pub origin: Point,
    /// Overrides of the stackup.
    pub stackup: StackupOverride,
    /// Names of the reference nets.
    pub reference_nets: Vec<String>,
    /// Nets to chart, patterns still unexpanded, in the order of the file.
    pub nets: Vec<NetRequest>,
    /// Paths to chart, in the order of the file.
    pub paths: Vec<path::PathRequest>,
    /// Pairs to chart, in the order of the file.
    pub pairs: Vec<path::PairRequest>,
    /// What parts are that join copper, in the order of the file.
    pub parts: Vec<joint::PartRequest>,
    /// Ties, in the order of the file.
    pub ties: Vec<joint::TieRequest>,
    /// Zones of the board.
    pub zones: Vec<Zone>,
    /// Bands, in the order of the file; the default bands where the file has none.
    pub bands: Vec<Band>,
    /// Model and cell.
    pub solver: SolverRequest,
    /// Limits for findings.
    pub limits: limit::LimitRequest,
    /// Findings that are borne, in the order of the file.
    pub waivers: Vec<limit::Waiver>,
}

/// Stackup values that replace those of the files; `None` keeps the file's.
#[derive(Clone, Debug, Default)]
pub struct StackupOverride {
    /// Copper thicknesses in metres from the top; empty keeps all.
    pub copper_m: Vec<Option<f64>>,
    /// Dielectric thicknesses in metres from the top; empty keeps all.
    pub dielectric_m: Vec<Option<f64>>,
    /// Relative permittivities from the top; empty keeps all.
    pub permittivity: Vec<Option<f64>>,
    /// Temperature of the copper in degC.
    pub temperature_c: Option<f64>,
    /// Thickness of the copper in barrels in metres.
    pub plating_m: Option<f64>,
}

/// One `[[net]]`.
#[derive(Clone, Debug, Default)]
pub struct NetRequest {
    /// Name or pattern with `*`.
    pub name: String,
    /// Pin that drives, as `U5.19`.
    pub driver: Option<String>,
    /// Pin that receives.
    pub receiver: Option<String>,
    /// Plane to chart, as `L2-GND`.
    pub plane: Option<String>,
    /// Pin, or point in the coordinates of the files, where the return reaches the plane at the driver.
    pub driver_landing: Option<LandingRequest>,
    /// The same at the receiver.
    pub receiver_landing: Option<LandingRequest>,
    /// Drive, load, landing of the driver, budget.
    pub signal: drive::SignalRequest,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}

/// Where keys of an entry stand in the review: key, line from 1, byte range of the value.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Marks(pub Vec<(&'static str, u32, std::ops::Range<usize>)>);

impl Marks {
    /// Line and byte range of a key's value.
    pub fn get(&self, key: &str) -> Option<(u32, std::ops::Range<usize>)> {
        self.0.iter().find(|mark| mark.0 == key).map(|mark| (mark.1, mark.2.clone()))
    }
}

/// Where the user wants a landing.
#[derive(Clone, Debug, PartialEq)]
pub enum LandingRequest {
    /// A pin, as `U5.20`.
    Pin(String),
    /// A point in the coordinates of the files; the nearest reference via or copper there is meant.
    At(Point),
}

/// A zone of the board, for example `analog`.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Zone {
    /// Its name.
    pub name: String,
    /// Its outline in the coordinates of the files (origin already added).
    pub outline: Ring,
}

/// A frequency band and the frequencies at which it is solved.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Band {
    /// Name: an ITU name, `DC`, or the user's.
    pub name: String,
    /// Lower limit in Hz, exclusive.
    pub from_hz: f64,
    /// Upper limit in Hz, inclusive.
    pub to_hz: f64,
    /// Frequencies to solve, rising.
    pub at_hz: Vec<f64>,
    /// Whether `at` was given, which adds the frequency to file names where there are several.
    pub explicit: bool,
}

/// Which model computes the density.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Model {
    /// Magneto-quasi-static solve of the sheet with its voids and edges.
    #[default]
    Sheet,
    /// Published closed form over an endless plane, voids not considered.
    Spread,
}

/// `[solver]`.
#[derive(Clone, Copy, Debug, Default)]
pub struct SolverRequest {
    /// Model.
    pub model: Model,
    /// Cell in metres; none lets the plan choose.
    pub cell_m: Option<f64>,
}
