//! The return-current density of one path on the planes that carry it at one frequency, and how it comes from a model.

mod band;
mod complaint;
mod compose;
mod coupling;
mod curve;
mod foil;
mod lay;
mod laybench;
mod mask;
mod parts;
mod pieces;
mod source;
pub mod spread;
mod stack;
mod stage;
mod survey;
pub mod track;
mod wiring;
mod workshop;

pub use band::BandDensity;
pub use coupling::Couplings;
pub use curve::LoopCurve;
pub use foil::Foil;
pub use laybench::Setup;
pub use mask::{Mask, NO_ISLAND, TooCoarse};
pub use pieces::Copper;
pub use source::Source;
pub use stack::Stack;
pub use stage::{Stage, StagedSheet, Voids};
pub use workshop::{Bench, PlaneMaps, Progress, Solved, TOLERANCE, Workshop};

use crate::geom::{Grid, Point};
use crate::plan::JointKind;
use crate::review::Model;
use num_complex::Complex64;

/// A plane: a connected or divided sheet of one net on one layer.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct PlaneId {
    /// Layer index from 0 at the top.
    pub layer: usize,
    /// Name of the net.
    pub net: String,
}

impl std::fmt::Display for PlaneId {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(f, "L{}-{}", self.layer + 1, self.net)
    }
}

/// Return-current density per ampere of net current. Phasors are rms, time factor exp(+jwt), phase reference the
/// track current at the driver; the density is that of the plane's own current, so under a track that runs along +x
/// the in-phase part of `kx` is negative.
#[derive(Clone, Debug)]
pub struct ReturnMap {
    /// Net.
    pub net: String,
    /// Plane.
    pub plane: PlaneId,
    /// Name of the band.
    pub band: String,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// Cells.
    pub grid: Grid,
    /// Whether a cell is copper, `grid.len()` values.
    pub copper: Vec<bool>,
    /// Current through the left and right faces of cells in A per A, positive to +x: `(nx + 1) * ny` values,
    /// index `iy * (nx + 1) + ix` for the face at x = origin.x + ix * cell.
    pub jx: Vec<Complex64>,
    /// Current through the lower and upper faces in A per A, positive to +y: `nx * (ny + 1)` values, index
    /// `iy * nx + ix` for the face at y = origin.y + iy * cell.
    pub jy: Vec<Complex64>,
    /// Model that computed it.
    pub model: Model,
    /// Height of the track's current above the plane's that the model used, in metres.
    pub height_m: f64,
    /// Track width that the model used (length-weighted mean over the path), in metres.
    pub width_m: f64,
    /// Sheet impedance in ohm per square; none for the closed form.
    pub zs_ohm: Option<Complex64>,
    /// Relative residual reached; none for the closed form.
    pub residual: Option<f64>,
    /// Loop impedance of track and plane seen at the driver in ohm (resistance of the track included); none for the
    /// closed form.
    pub loop_impedance_ohm: Option<Complex64>,
    /// For the map of a whole band of a drive: its rms density. The currents above then are their mean weighted by
    /// power, see [`BandDensity`].
    pub band_density: Option<BandDensity>,
}

/// What a joint (via, part, tie) carries of a path's return, per ampere of the driver's current. Of several joints at
/// one place on different layers each has its own entry.
#[derive(Clone, Debug, PartialEq)]
pub struct JointCurrent {
    /// Its name in words, as in the plan: `C14`, `via`.
    pub what: String,
    /// What it is.
    pub kind: JointKind,
    /// Where it is drawn.
    pub at: Point,
    /// Layers of its two ends (index from 0); none for an end outside the board's copper.
    pub layers: [Option<usize>; 2],
    /// Current from its first end to its second in A per A, rms phasor with the phase reference of the maps.
    pub current: Complex64,
}

impl ReturnMap {
    /// Density in a cell in A/m per A: mean of its two face currents divided by the cell.
    pub fn density(&self, ix: usize, iy: usize) -> (Complex64, Complex64) {
        let (nx, cell) = (self.grid.nx, self.grid.cell_m);
        let row = iy * (nx + 1) + ix;
        let kx = (self.jx[row] + self.jx[row + 1]) * (0.5 / cell);
        let ky = (self.jy[iy * nx + ix] + self.jy[(iy + 1) * nx + ix]) * (0.5 / cell);
        (kx, ky)
    }

    /// Magnitude of the density in a cell in A/m per A: the root of |Kx|^2 + |Ky|^2, of a band its rms value.
    pub fn magnitude(&self, ix: usize, iy: usize) -> f64 {
        if let Some(band) = &self.band_density {
            return band.rms[self.grid.index(ix, iy)];
        }
        let (kx, ky) = self.density(ix, iy);
        (kx.norm_sqr() + ky.norm_sqr()).sqrt()
    }
}
