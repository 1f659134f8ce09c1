//! The problem as plain data: sheets on one grid, verticals between them, source strips and landings.
//!
//! Checked by: `dense_direct_solve_agrees` and `both_routes_agree` in tests/physics.

use crate::geom::{Grid, Point};

/// A thin conducting sheet.
#[derive(Clone, Debug)]
pub struct Sheet {
    /// Which cells are copper, `grid.len()` values.
    pub copper: Vec<bool>,
    /// Height in metres on a common axis.
    pub z_m: f64,
    /// Rising indices (as in [`super::Solution::jx`]) of vertical faces between two copper cells that do not conduct:
    /// a slot narrower than a cell passes there.
    pub cut_x: Vec<usize>,
    /// The same of horizontal faces (as in [`super::Solution::jy`]).
    pub cut_y: Vec<usize>,
}

impl Sheet {
    /// A sheet without cut faces.
    pub fn new(copper: Vec<bool>, z_m: f64) -> Self {
        Self { copper, z_m, cut_x: Vec::new(), cut_y: Vec::new() }
    }

    /// Which faces conduct, that is have copper on both sides and are not cut: vertical faces, `(nx + 1) * ny`
    /// values as in [`super::Solution::jx`], and horizontal faces, `nx * (ny + 1)` values as in
    /// [`super::Solution::jy`]. A branch of the system is a face that conducts.
    pub fn conducting_faces(&self, grid: &Grid) -> (Vec<bool>, Vec<bool>) {
        let (nx, ny) = (grid.nx, grid.ny);
        let mut along_x = vec![false; (nx + 1) * ny];
        let mut along_y = vec![false; nx * (ny + 1)];
        for iy in 0..ny {
            for ix in 0..nx {
                let here = self.copper[iy * nx + ix];
                if ix > 0 {
                    along_x[iy * (nx + 1) + ix] = here && self.copper[iy * nx + ix - 1];
                }
                if iy > 0 {
                    along_y[iy * nx + ix] = here && self.copper[(iy - 1) * nx + ix];
                }
            }
        }
        self.cut_x.iter().for_each(|&face| along_x[face] = false);
        self.cut_y.iter().for_each(|&face| along_y[face] = false);
        (along_x, along_y)
    }
}

/// Cells of one sheet over which a current spreads evenly by weight (weights sum to 1).
#[derive(Clone, Debug, PartialEq)]
pub struct Patch {
    /// Index of the sheet.
    pub sheet: usize,
    /// Cell index and weight.
    pub cells: Vec<(usize, f64)>,
}

impl Patch {
    /// Mark in `sheet` of a node outside the board: a tie inside a part, a chassis, a cable shield.
    pub const OUTSIDE: usize = usize::MAX;

    /// The node outside the board with this number, from 0 without gaps; it exists as soon as a vertical ends on it.
    pub fn outside(node: usize) -> Self {
        Self { sheet: Self::OUTSIDE, cells: vec![(node, 1.0)] }
    }
}

/// A lumped branch between two patches: barrel, bridging part, tie, capacitor.
#[derive(Clone, Debug, PartialEq)]
pub struct Vertical {
    /// Where positive current leaves a sheet.
    pub from: Patch,
    /// Where it enters a sheet.
    pub to: Patch,
    /// Series resistance in ohm.
    pub resistance_ohm: f64,
    /// Series inductance in henry, only what the grid does not already carry.
    pub inductance_h: f64,
    /// Series capacitance in farad; none conducts at DC.
    pub capacitance_f: Option<f64>,
}

/// Capacitance between two facing sheets, spread evenly over their area: it joins every cell of one with the cell above
/// or below, where both are copper and no copper of a third sheet lies between. It carries displacement current and is
/// open at DC.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gap {
    /// Indices of the sheets; current is positive from the first to the second.
    pub sheets: (usize, usize),
    /// Capacitance per area in F/m^2, permittivity over thickness.
    pub farad_per_m2: f64,
}

/// How the current spreads over a source strip's width.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum StripProfile {
    /// Evenly (low frequency).
    Uniform,
    /// Edge-crowded, density 1/sqrt(1 - (2x/w)^2) (high frequency).
    Edge,
}

/// A straight piece of source current at a given height.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SourceStrip {
    /// Start.
    pub from: Point,
    /// End.
    pub to: Point,
    /// Height in metres on the common axis.
    pub z_m: f64,
    /// Width in metres.
    pub width_m: f64,
    /// Profile across the width.
    pub profile: StripProfile,
    /// Current from `from` to `to` in A (1 for the signal itself).
    pub current_a: f64,
}

/// A current that enters (positive) the sheets over a patch.
#[derive(Clone, Debug, PartialEq)]
pub struct Injection {
    /// Where.
    pub patch: Patch,
    /// Current into the sheet in A.
    pub current_a: f64,
}

/// Sheets and what joins them; sources and frequency are given when solving.
#[derive(Clone, Debug)]
pub struct Problem {
    /// Cells, common to all sheets.
    pub grid: Grid,
    /// Sheets.
    pub sheets: Vec<Sheet>,
    /// Verticals between sheets (or between two places of one sheet).
    pub verticals: Vec<Vertical>,
    /// Capacitance between facing sheets.
    pub gaps: Vec<Gap>,
}
