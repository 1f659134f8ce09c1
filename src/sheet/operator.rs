//! The impedance operator on branch currents, the preconditioner, and the conjugate gradients between them.
//!
//! Model: Z = sum over sheets of Zs_p R_p + s L + diag(r + s l + 1/(s c)), complex symmetric. Preconditioner
//! P F P^T: F divides by the symbol of Z on the unpadded torus, for each wave number a small matrix over the sheets
//! Zs_p delta_pq + s L^(k) e^{-|k||z_p - z_q|}, and by a like impedance on the verticals; P conserves current.
//!
//! Source: COCG, van der Vorst and Melissen, IEEE T-MAG 26, 1990 (from memory), with one projection on each side.
//!
//! Checked by: `dense_direct_solve_agrees`, `fast_operator_is_the_sum` in tests/physics.

use super::branches::{Branches, EDGE_PART};
use super::kernel;
use super::loops::{Law, Loops};
use super::projector::Projector;
use super::{Problem, Vertical};
use crate::math::filter::{Filter, Scratch};
use crate::unit::constants::MU0;
use num_complex::Complex64;

/// Kernels of all pairs of sheets, as spectra for the padded and symbols for the unpadded filter.
#[derive(Debug)]
pub struct Coupling {
    /// Linear convolution.
    padded: Filter,
    /// Torus of the grid itself.
    torus: Filter,
    /// For sheets p, q the index p * sheets + q gives the entry of the next two lists.
    pair: Vec<usize>,
    /// Spectra in H (divided by the number of points).
    spectra: Vec<Vec<f64>>,
    /// Symbols in H.
    symbols: Vec<Vec<f64>>,
}

impl Coupling {
    /// Prepares the kernels of `problem`, on branches and, where no vertical needs them, on corners.
    pub fn new(problem: &Problem, branches: &Branches) -> (Self, Option<Loops>) {
        let grid = &problem.grid;
        let (nx, ny, d) = (grid.nx, grid.ny, grid.cell_m);
        let padded = Filter::padded(nx, ny);
        let torus = Filter::new(nx, ny, nx, ny);
        let mut distances: Vec<f64> = Vec::new();
        let mut pair = Vec::new();
        for p in &problem.sheets {
            for q in &problem.sheets {
                let z = (p.z_m - q.z_m).abs();
                // heights are sums of thicknesses: equal ones may differ in the last bits
                let known = distances.iter().position(|&other| (other - z).abs() < 1e-9 * d);
                pair.push(known.unwrap_or_else(|| {
                    distances.push(z);
                    distances.len() - 1
                }));
            }
        }
        let offsets: Vec<Vec<f64>> =
            distances.iter().map(|&z| kernel::offsets(nx + 2, ny + 2, z / d)).collect();
        let spectra = offsets.iter().map(|table| {
            let rows = table.chunks_exact(nx + 2).take(ny);
            let inner: Vec<f64> = rows.flat_map(|row| row[..nx].iter().copied()).collect();
            kernel::spectrum(&inner, nx, ny, d, &padded)
        });
        let spectra = spectra.collect();
        let loops =
            problem.verticals.is_empty().then(|| Loops::new(branches, d, &distances, &pair, &offsets));
        let symbols = distances.iter().map(|&z| kernel::symbol(d, z, &torus)).collect();
        (Self { padded, torus, pair, spectra, symbols }, loops)
    }
}

/// Multiplies the values of all sheets at wave number `ky` of a column of `py` by a symmetric matrix, given as its
/// upper triangle row by row; `mixed` is room for one value of each sheet.
pub(super) fn mix_sheets(
    table: &[Complex64],
    columns: &mut [Complex64],
    (ky, py): (usize, usize),
    mixed: &mut [Complex64],
) {
    let sheets = mixed.len();
    if sheets == 1 {
        columns[ky] *= table[0];
        return;
    }
    mixed.fill(Complex64::default());
    let mut at = 0;
    for p in 0..sheets {
        for q in p..sheets {
            mixed[p] += table[at] * columns[q * py + ky];
            if q > p {
                mixed[q] += table[at] * columns[p * py + ky];
            }
            at += 1;
        }
    }
    mixed.iter().enumerate().for_each(|(p, mix)| columns[p * py + ky] = *mix);
}

/// Index in a quarter spectrum of wave number `m` of `size`.
fn folded(m: usize, size: usize) -> usize {
    m.min(size - m)
}

/// The operator at one complex frequency.
pub struct Impedance<'a> {
    branches: &'a Branches,
    coupling: &'a Coupling,
    projector: &'a Projector,
    s: Complex64,
    zs: &'a [Complex64],
    /// What an outermost face has more inductance than others, in H.
    edge_h: f64,
    /// Impedance of each vertical in ohm.
    pub verticals: Vec<Complex64>,
    /// Preconditioner's division on verticals.
    vertical_inverse: Vec<Complex64>,
    /// For each wave number of the torus the inverse symbol, upper triangle over sheets, and its position.
    inverse: Vec<Complex64>,
    scratch: Scratch,
}

/// Impedance r + s l + 1/(s c) of a vertical in ohm; infinite for a capacitor at s = 0.
pub fn vertical_impedance(vertical: &Vertical, s: Complex64) -> Complex64 {
    let plain = vertical.resistance_ohm + s * vertical.inductance_h;
    match vertical.capacitance_f {
        None => plain,
        Some(_) if s == Complex64::default() => Complex64::new(f64::INFINITY, 0.0),
        Some(farad) => plain + 1.0 / (s * farad),
    }
}

impl<'a> Impedance<'a> {
    /// The operator with its preconditioner for sheet impedances `zs` at the complex frequency `s`.
    pub fn new(
        problem: &Problem,
        branches: &'a Branches,
        coupling: &'a Coupling,
        projector: &'a Projector,
        s: Complex64,
        zs: &'a [Complex64],
    ) -> Self {
        let mut operator = Self::bare(problem, branches, coupling, projector, s, zs);
        let (px, py) = coupling.torus.size();
        operator.inverse = inverse_symbols(s, zs, &coupling.pair, &coupling.symbols, px * py);
        let spread = typical(problem, s, zs);
        let both = operator.verticals.iter().zip(&projector.conductance);
        let inverse = both.map(|(z, &g)| if g > 0.0 { 1.0 / (z + spread) } else { Complex64::default() });
        operator.vertical_inverse = inverse.collect();
        operator
    }

    /// The operator alone, which cannot precondition.
    pub fn bare(
        problem: &Problem,
        branches: &'a Branches,
        coupling: &'a Coupling,
        projector: &'a Projector,
        s: Complex64,
        zs: &'a [Complex64],
    ) -> Self {
        let verticals = problem.verticals.iter().map(|v| vertical_impedance(v, s)).collect();
        let edge_h = EDGE_PART * MU0 * problem.grid.cell_m / 2.0;
        let (vertical_inverse, inverse, scratch) = (Vec::new(), Vec::new(), Scratch::default());
        Self { branches, coupling, projector, s, zs, edge_h, verticals, vertical_inverse, inverse, scratch }
    }

    /// The same law for loops.
    pub fn law(&self) -> Law<'a> {
        Law { s: self.s, zs: self.zs, edge_h: self.edge_h }
    }

    /// Voltages Z i in V of all branches that exist.
    pub fn apply(&mut self, currents: &[Complex64], out: &mut [Complex64]) {
        let (sheets, faces) = (self.branches.sheets, self.branches.faces());
        if self.s == Complex64::default() {
            out.fill(Complex64::default());
        } else {
            let (coupling, s) = (self.coupling, self.s);
            let (px, py) = coupling.padded.size();
            let half = py / 2 + 1;
            let mut mixed = vec![Complex64::default(); sheets];
            self.each_direction(currents, out, &coupling.padded, |kx, columns| {
                let row = folded(kx, px) * half;
                if sheets == 1 {
                    let table = &coupling.spectra[0][row..row + half];
                    for (ky, value) in columns.iter_mut().enumerate() {
                        *value *= s * table[folded(ky, py)];
                    }
                    return;
                }
                for ky in 0..py {
                    let at = row + folded(ky, py);
                    for (p, mix) in mixed.iter_mut().enumerate() {
                        let terms = (0..sheets).map(|q| {
                            columns[q * py + ky] * coupling.spectra[coupling.pair[p * sheets + q]][at]
                        });
                        *mix = s * terms.sum::<Complex64>();
                    }
                    mixed.iter().enumerate().for_each(|(p, mix)| columns[p * py + ky] = *mix);
                }
            });
        }
        if self.s != Complex64::default() {
            self.branches.add_edges(self.s * self.edge_h, currents, out);
        }
        for sheet in 0..sheets {
            for direction in 0..2 {
                let range = self.branches.plane(sheet, direction);
                let (from, to) = (&currents[range.clone()], &mut out[range]);
                self.branches.add_resistive(sheet, direction, self.zs[sheet], from, to);
            }
        }
        self.mask(&mut out[..faces]);
        for (index, voltage) in out[faces..].iter_mut().enumerate() {
            let open = self.projector.conductance[index] == 0.0;
            *voltage =
                if open { Complex64::default() } else { self.verticals[index] * currents[faces + index] };
        }
    }

    /// Approximate currents for given voltages: F v.
    pub fn precondition(&mut self, voltages: &[Complex64], out: &mut [Complex64]) {
        let (sheets, faces) = (self.branches.sheets, self.branches.faces());
        let coupling = self.coupling;
        let (px, py) = coupling.torus.size();
        let half = py / 2 + 1;
        let triangle = sheets * (sheets + 1) / 2;
        let inverse = std::mem::take(&mut self.inverse);
        let mut mixed = vec![Complex64::default(); sheets];
        self.each_direction(voltages, out, &coupling.torus, |kx, columns| {
            let row = folded(kx, px) * half;
            for ky in 0..py {
                let table = &inverse[(row + folded(ky, py)) * triangle..][..triangle];
                mix_sheets(table, columns, (ky, py), &mut mixed);
            }
        });
        self.inverse = inverse;
        self.mask(&mut out[..faces]);
        for index in 0..self.vertical_inverse.len() {
            out[faces + index] = self.vertical_inverse[index] * voltages[faces + index];
        }
    }

    /// Runs a filter over the x-faces of all sheets and over their y-faces.
    fn each_direction(
        &mut self,
        input: &[Complex64],
        output: &mut [Complex64],
        filter: &Filter,
        mut multiply: impl FnMut(usize, &mut [Complex64]),
    ) {
        let (cells, faces) = (self.branches.cells(), self.branches.faces());
        for direction in 0..2 {
            let from: Vec<&[Complex64]> =
                input[..faces].chunks_exact(cells).skip(direction).step_by(2).collect();
            let mut to: Vec<&mut [Complex64]> =
                output[..faces].chunks_exact_mut(cells).skip(direction).step_by(2).collect();
            filter.apply(&from, &mut to, &mut self.scratch, &mut multiply);
        }
    }

    /// Sets faces that do not conduct to zero.
    fn mask(&self, faces: &mut [Complex64]) {
        for (value, _) in faces.iter_mut().zip(&self.branches.conducts).filter(|(_, conducts)| !**conducts) {
            *value = Complex64::default();
        }
    }

    /// Resistive voltages of the faces and all voltages of the verticals.
    pub fn resistive(&self, currents: &[Complex64]) -> Vec<Complex64> {
        let mut out = vec![Complex64::default(); currents.len()];
        for sheet in 0..self.branches.sheets {
            for direction in 0..2 {
                let range = self.branches.plane(sheet, direction);
                let (from, to) = (&currents[range.clone()], &mut out[range]);
                self.branches.add_resistive(sheet, direction, self.zs[sheet], from, to);
            }
        }
        let faces = self.branches.faces();
        for (index, voltage) in out[faces..].iter_mut().enumerate() {
            if self.projector.conductance[index] > 0.0 {
                *voltage = self.verticals[index] * currents[faces + index];
            }
        }
        out
    }

    /// Improves `currents` until the size of P^T (Z i + emf) in V is at most `target_v`; they keep their divergence.
    /// Returns the steps done and the size reached.
    pub fn iterate(
        &mut self,
        emf: &[Complex64],
        currents: &mut [Complex64],
        target_v: f64,
        most_steps: usize,
    ) -> (usize, f64) {
        let zero = Complex64::default();
        let length = currents.len();
        let mut residual = vec![zero; length];
        self.apply(currents, &mut residual);
        residual.iter_mut().zip(emf).for_each(|(r, e)| *r = -(*r + e));
        self.projector.take_out_potential(self.branches, &mut residual);
        let mut reached = self.projector.size(self.branches, &residual);
        if reached <= target_v {
            return (0, reached);
        }
        let (mut search, mut work) = (vec![zero; length], vec![zero; length]);
        let mut rho = Complex64::new(1.0, 0.0);
        for step in 0..most_steps {
            self.precondition(&residual, &mut work);
            self.projector.conserve(self.branches, &mut work);
            let next = dot(&residual, &work);
            let beta = if step == 0 { zero } else { next / rho };
            rho = next;
            search.iter_mut().zip(&work).for_each(|(p, z)| *p = *z + beta * *p);
            self.apply(&search, &mut work);
            self.projector.take_out_potential(self.branches, &mut work);
            let alpha = rho / dot(&search, &work);
            if !alpha.is_finite() {
                return (step, reached);
            }
            currents.iter_mut().zip(&search).for_each(|(i, p)| *i += alpha * p);
            residual.iter_mut().zip(&work).for_each(|(r, q)| *r -= alpha * q);
            reached = self.projector.size(self.branches, &residual);
            if reached <= target_v {
                return (step + 1, reached);
            }
        }
        (most_steps, reached)
    }
}

/// For each mode the inverse of Zs_p delta_pq + s symbol_pq over `points`, upper triangle over the sheets.
pub fn inverse_symbols(
    s: Complex64,
    zs: &[Complex64],
    pair: &[usize],
    symbols: &[Vec<f64>],
    points: usize,
) -> Vec<Complex64> {
    let sheets = zs.len();
    let modes = symbols.first().map_or(0, Vec::len);
    let scale = 1.0 / points as f64;
    let mut inverse = Vec::with_capacity(modes * sheets * (sheets + 1) / 2);
    let mut matrix = vec![Complex64::default(); sheets * sheets];
    let at = |index: usize, mode: usize| s * symbols[index][mode];
    for mode in 0..modes {
        matrix.iter_mut().zip(pair).for_each(|(entry, &index)| *entry = at(index, mode));
        for (p, zs) in zs.iter().enumerate() {
            matrix[p * sheets + p] += zs;
        }
        invert(&mut matrix, sheets);
        for p in 0..sheets {
            inverse.extend((p..sheets).map(|q| matrix[p * sheets + q] * scale));
        }
    }
    inverse
}

/// A typical impedance per square of the sheets at `s`, for weighing verticals against them.
pub fn typical(problem: &Problem, s: Complex64, zs: &[Complex64]) -> Complex64 {
    let resistive = zs.iter().sum::<Complex64>() / zs.len().max(1) as f64;
    // the spread of a current of a few cells
    resistive + s * MU0 * problem.grid.cell_m / 2.0
}

/// Bilinear product, in rising order so that the bits never change.
pub fn dot(a: &[Complex64], b: &[Complex64]) -> Complex64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

/// Euclidean length.
pub fn norm(a: &[Complex64]) -> f64 {
    libm::sqrt(a.iter().map(Complex64::norm_sqr).sum())
}

/// Inverse of a small complex symmetric matrix in place by Gauss-Jordan; its real part is positive definite, so
/// pivots on the diagonal cannot vanish.
fn invert(matrix: &mut [Complex64], size: usize) {
    for pivot in 0..size {
        let inverse = 1.0 / matrix[pivot * size + pivot];
        matrix[pivot * size + pivot] = Complex64::new(1.0, 0.0);
        for column in 0..size {
            matrix[pivot * size + column] *= inverse;
        }
        for row in (0..size).filter(|&row| row != pivot) {
            let factor = std::mem::take(&mut matrix[row * size + pivot]);
            for column in 0..size {
                let change = factor * matrix[pivot * size + column];
                matrix[row * size + column] -= change;
            }
        }
    }
}
