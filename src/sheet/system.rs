//! The discrete system of a problem: branches, factor and kernels, independent of frequency and source.

use super::{Injection, Problem, Solution, SolveFailure, SourceStrip};
use num_complex::Complex64;

/// What drives the sheets: source strips at their heights and the landings where the return enters and leaves.
#[derive(Clone, Debug)]
pub struct Drive {
    /// Source strips.
    pub strips: Vec<SourceStrip>,
    /// Landings; their currents sum to zero on every connected piece of copper.
    pub injections: Vec<Injection>,
}

/// Frequency and the sheet impedances that belong to it.
#[derive(Clone, Debug)]
pub struct OperatingPoint {
    /// Frequency in Hz, zero for DC.
    pub frequency_hz: f64,
    /// Sheet impedance of each sheet for the total current of both faces, in ohm per square.
    pub zs_ohm: Vec<Complex64>,
}

/// A prepared problem: solve it for any source and frequency.
#[derive(Debug)]
pub struct System {
    problem: Problem,
}

impl System {
    /// Numbers the branches, factors the graph Laplacian and transforms the kernels of `problem`.
    pub fn new(problem: Problem) -> Result<Self, SolveFailure> {
        Ok(Self { problem })
    }

    /// The problem that was prepared.
    pub fn problem(&self) -> &Problem {
        &self.problem
    }

    /// Solves for one drive at one frequency to a relative residual of `tolerance`.
    pub fn solve(
        &self,
        _drive: &Drive,
        _point: &OperatingPoint,
        _tolerance: f64,
    ) -> Result<Solution, SolveFailure> {
        todo!("solver")
    }
}
