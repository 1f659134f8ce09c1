//! What a solve gives and how it can fail.

use num_complex::Complex64;

/// Currents of a solved problem and an account of the solve.
#[derive(Clone, Debug)]
pub struct Solution {
    /// For each sheet, current in A through vertical faces, `(nx + 1) * ny` values, index `iy * (nx + 1) + ix`.
    pub jx: Vec<Vec<Complex64>>,
    /// For each sheet, current in A through horizontal faces, `nx * (ny + 1)` values, index `iy * nx + ix`.
    pub jy: Vec<Vec<Complex64>>,
    /// Current in A through each vertical, positive from `from` to `to`.
    pub verticals: Vec<Complex64>,
    /// For each gap and cell the displacement current in A from the gap's first sheet to its second.
    pub displacement: Vec<Vec<Complex64>>,
    /// For each sheet and cell the potential in V against some cell of the same connected copper (zero without copper);
    /// differences are those along the copper, without the EMF of the fields.
    pub potential_v: Vec<Vec<Complex64>>,
    /// The same for the nodes outside the board, see [`super::Patch::outside`].
    pub outside_v: Vec<Complex64>,
    /// Impedance in ohm of the loop as far as the sheets and verticals make it: the EMF that their currents and the
    /// potential difference of the landings put into the source path, for the source's unit current, without the
    /// source path's own resistance and self-inductance.
    pub sheet_impedance_ohm: Complex64,
    /// Relative residual reached.
    pub residual: f64,
    /// Steps of the iteration.
    pub steps: usize,
}

/// Why there is no solution. No map is drawn from a failed solve.
#[derive(Clone, Debug, PartialEq)]
pub enum SolveFailure {
    /// Landings lie on copper that is not connected: the net current of an island is not zero.
    Unbalanced {
        /// Cell indices (one on each side) of the two islands.
        cells: (usize, usize),
        /// Net current in A into the first island.
        current_a: f64,
    },
    /// A landing patch has no copper cell, or a gap names a sheet that does not exist.
    NoCopper {
        /// Index of the injection or vertical; gaps count on after the verticals.
        index: usize,
    },
    /// The graph of cells could not be factored: out of memory.
    Factor {
        /// Number of unknowns.
        unknowns: usize,
    },
    /// The iteration did not reach the tolerance.
    NoConvergence {
        /// Steps done.
        steps: usize,
        /// Relative residual reached.
        residual: f64,
        /// Relative residual asked for.
        tolerance: f64,
    },
}
