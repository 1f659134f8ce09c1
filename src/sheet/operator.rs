//! The impedance operator on branch currents, the preconditioner, and the conjugate gradients between them.
//!
//! Model: Z = sum over sheets of Zs_p R_p + s L + diag(r + s l + 1/(s c)), complex symmetric; gaps 1/(s c). Preconditioner
//! P F P^T: F divides by the symbol of Z on the unpadded torus, for each wave number a small matrix over the sheets
//! Zs_p delta_pq + s L^(k) e^{-|k||z_p - z_q|}, and by a like impedance on the verticals; P conserves current.
//!
//! Source: COCG, van der Vorst and Melissen, IEEE T-MAG 26, 1990 (from memory), with one projection on each side.
//!
//! Checked by: `dense_direct_solve_agrees`, `fast_operator_is_the_sum` in tests/physics.

use super::branches::{Branches, EDGE_PART};
use super::kernel;
use super::loops::{Law, Loops};
use super::projector::{Precision, Projector};
use super::{Problem, Vertical};
use crate::math::filter::{Filter, FilterOf, Scratch};
use crate::math::real::{Real, complex_double, complex_of};
use crate::unit::constants::MU0;
use num_complex::{Complex, Complex64};

/// Filters and spectra in one precision.
#[derive(Debug)]
pub struct Kernels<T> {
    /// Linear convolution.
    padded: FilterOf<T>,
    /// Torus of the grid itself.
    torus: FilterOf<T>,
    /// Spectra in H (divided by the number of points).
    spectra: Vec<Vec<T>>,
}

impl<T: Precision> Kernels<T> {
    fn new(nx: usize, ny: usize, spectra: &[Vec<f64>]) -> Self {
        let spectra = spectra.iter().map(|all| all.iter().map(|&value| T::of(value)).collect()).collect();
        Self { padded: FilterOf::padded(nx, ny), torus: FilterOf::new(nx, ny, nx, ny), spectra }
    }
}

/// Kernels of all pairs of sheets, as spectra for the padded and symbols for the unpadded filter.
#[derive(Debug)]
pub struct Coupling {
    double: Kernels<f64>,
    single: Kernels<f32>,
    /// For sheets p, q the index p * sheets + q gives the entry of spectra and symbols.
    pair: Vec<usize>,
    /// Symbols in H.
    symbols: Vec<Vec<f64>>,
}

/// A precision in which an operator runs.
pub trait Operand: Precision {
    /// The kernels in this precision.
    fn kernels(coupling: &Coupling) -> &Kernels<Self>;
}

impl Operand for f64 {
    fn kernels(coupling: &Coupling) -> &Kernels<f64> {
        &coupling.double
    }
}

impl Operand for f32 {
    fn kernels(coupling: &Coupling) -> &Kernels<f32> {
        &coupling.single
    }
}

impl Coupling {
    /// Prepares the kernels of `problem`, on branches and, where no vertical needs them, on corners.
    pub fn new(problem: &Problem, branches: &Branches) -> (Self, Option<Loops>) {
        let grid = &problem.grid;
        let (nx, ny, d) = (grid.nx, grid.ny, grid.cell_m);
        let padded = Filter::padded(nx, ny);
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
        let spectra: Vec<Vec<f64>> = spectra.collect();
        let alone = problem.verticals.is_empty() && branches.facing.is_empty();
        let loops = alone.then(|| Loops::new(branches, d, &distances, &pair, &offsets));
        let double = Kernels::new(nx, ny, &spectra);
        let symbols = distances.iter().map(|&z| kernel::symbol(d, z, &double.torus)).collect();
        (Self { double, single: Kernels::new(nx, ny, &spectra), pair, symbols }, loops)
    }
}

/// Multiplies one column of wave numbers of all sheets (`py` values each) by a symmetric matrix over the sheets; `table`
/// gives for sheets p <= q the entries for wave numbers 0 to py/2, `mixed` is room for all columns.
pub(super) fn mix_sheets<'t, T: Real, F: Copy + 't>(
    table: impl Fn(usize, usize) -> &'t [F],
    columns: &mut [Complex<T>],
    py: usize,
    mixed: &mut Vec<Complex<T>>,
) where
    Complex<T>: std::ops::Mul<F, Output = Complex<T>>,
{
    let sheets = columns.len() / py;
    let half = py / 2 + 1;
    let multiply = |entries: &[F], from: &[Complex<T>], to: &mut [Complex<T>]| {
        let (low, high) = to.split_at_mut(half);
        let parts = low.iter_mut().zip(from).zip(entries);
        parts.for_each(|((to, &from), &entry)| *to += from * entry);
        let parts = high.iter_mut().zip(&from[half..]).zip(entries[1..].iter().rev().skip(1 - py % 2));
        parts.for_each(|((to, &from), &entry)| *to += from * entry);
    };
    mixed.clear();
    mixed.resize(columns.len(), Complex::new(T::zero(), T::zero()));
    for p in 0..sheets {
        for q in 0..sheets {
            let entries = table(p.min(q), p.max(q));
            multiply(entries, &columns[q * py..(q + 1) * py], &mut mixed[p * py..(p + 1) * py]);
        }
    }
    columns.copy_from_slice(mixed);
}

/// Index of sheets p <= q among the entries of an upper triangle row by row.
pub(super) fn triangle_index(p: usize, q: usize, sheets: usize) -> usize {
    p * sheets - p * (p + 1) / 2 + q
}

/// Index in a quarter spectrum of wave number `m` of `size`.
fn folded(m: usize, size: usize) -> usize {
    m.min(size - m)
}

/// The operator at one complex frequency.
pub struct Impedance<'a, T: Operand = f64> {
    branches: &'a Branches,
    coupling: &'a Coupling,
    projector: &'a Projector,
    s: Complex<T>,
    zs: Vec<Complex<T>>,
    /// What an outermost face has more inductance than others, in H.
    edge_h: f64,
    /// Impedance of a few cells of copper in ohm.
    typical: f64,
    /// Impedance of each vertical in ohm.
    pub verticals: Vec<Complex<T>>,
    /// Preconditioner's division on verticals.
    vertical_inverse: Vec<Complex<T>>,
    /// For each wave number of the torus the inverse symbol, upper triangle over sheets, and its position.
    inverse: Vec<Complex<T>>,
    scratch: Scratch<T>,
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

impl<'a, T: Operand> Impedance<'a, T> {
    /// The operator with its preconditioner for sheet impedances `zs` at the complex frequency `s`.
    pub fn new(
        problem: &Problem,
        branches: &'a Branches,
        coupling: &'a Coupling,
        projector: &'a Projector,
        s: Complex64,
        zs: &[Complex64],
    ) -> Self {
        let mut operator = Self::bare(problem, branches, coupling, projector, s, zs);
        let (px, py) = coupling.double.torus.size();
        operator.inverse = inverse_symbols(s, zs, &coupling.pair, &coupling.symbols, px * py);
        let spread = typical(problem, s, zs);
        let both = problem.verticals.iter().zip(&projector.conductance);
        let inverse = both.map(|(vertical, &g)| {
            let z = vertical_impedance(vertical, s);
            complex_of(if g > 0.0 { 1.0 / (z + spread) } else { Complex64::default() })
        });
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
        zs: &[Complex64],
    ) -> Self {
        Self {
            branches,
            coupling,
            projector,
            s: complex_of(s),
            zs: zs.iter().map(|&z| complex_of(z)).collect(),
            edge_h: EDGE_PART * MU0 * problem.grid.cell_m / 2.0,
            typical: typical(problem, s, zs).norm(),
            verticals: problem.verticals.iter().map(|v| complex_of(vertical_impedance(v, s))).collect(),
            vertical_inverse: Vec::new(),
            inverse: Vec::new(),
            scratch: Scratch::default(),
        }
    }

    /// Voltages Z i in V of all branches that exist.
    pub fn apply(&mut self, currents: &[Complex<T>], out: &mut [Complex<T>]) {
        let (sheets, faces) = (self.branches.sheets, self.branches.faces());
        let zero = Complex::new(T::zero(), T::zero());
        if self.s == zero {
            out.fill(zero);
        } else {
            let (coupling, s) = (self.coupling, self.s);
            let kernels = T::kernels(coupling);
            let (px, py) = kernels.padded.size();
            let half = py / 2 + 1;
            let mut mixed = Vec::new();
            self.each_direction(currents, out, &kernels.padded, |kx, columns| {
                let row = folded(kx, px) * half;
                let table =
                    |p: usize, q: usize| &kernels.spectra[coupling.pair[p * sheets + q]][row..row + half];
                mix_sheets(table, columns, py, &mut mixed);
                columns.iter_mut().for_each(|value| *value = s * *value);
            });
        }
        if self.s != zero {
            self.branches.add_edges(self.s * T::of(self.edge_h), currents, out);
        }
        for sheet in 0..sheets {
            for direction in 0..2 {
                let range = self.branches.plane(sheet, direction);
                let (from, to) = (&currents[range.clone()], &mut out[range]);
                self.branches.add_resistive(sheet, direction, self.zs[sheet], from, to);
            }
        }
        self.mask(&mut out[..faces]);
        let verticals = &mut out[faces..self.branches.first_gap()];
        for (index, voltage) in verticals.iter_mut().enumerate() {
            let open = self.projector.conductance[index] == 0.0;
            *voltage = if open { zero } else { self.verticals[index] * currents[faces + index] };
        }
        self.gap_voltages(currents, out);
    }

    /// Voltages i/(s c) of the gaps, zero where they are open.
    fn gap_voltages(&self, currents: &[Complex<T>], out: &mut [Complex<T>]) {
        let gaps = self.branches.first_gap();
        if !self.projector.joins_gaps() {
            out[gaps..].fill(Complex::new(T::zero(), T::zero()));
            return;
        }
        let one = Complex::new(T::one(), T::zero()) / self.s;
        let both = out[gaps..].iter_mut().zip(&currents[gaps..]);
        both.zip(&self.branches.facing).for_each(|((v, i), (_, _, c))| *v = one * i / T::of(*c));
    }

    /// Approximate currents for given voltages: F v.
    pub fn precondition(&mut self, voltages: &[Complex<T>], out: &mut [Complex<T>]) {
        let (sheets, faces) = (self.branches.sheets, self.branches.faces());
        let kernels = T::kernels(self.coupling);
        let (px, py) = kernels.torus.size();
        let half = py / 2 + 1;
        let inverse = std::mem::take(&mut self.inverse);
        let modes = inverse.len() / (sheets * (sheets + 1) / 2);
        let mut mixed = Vec::new();
        self.each_direction(voltages, out, &kernels.torus, |kx, columns| {
            let row = folded(kx, px) * half;
            let table = |p: usize, q: usize| &inverse[triangle_index(p, q, sheets) * modes + row..][..half];
            mix_sheets(table, columns, py, &mut mixed);
        });
        self.inverse = inverse;
        self.mask(&mut out[..faces]);
        for index in 0..self.vertical_inverse.len() {
            out[faces + index] = self.vertical_inverse[index] * voltages[faces + index];
        }
        let gaps = self.branches.first_gap();
        let both = out[gaps..].iter_mut().zip(&voltages[gaps..]);
        both.zip(&self.branches.facing).for_each(|((i, v), (_, _, c))| *i = self.s * v * T::of(*c));
    }

    /// Runs a filter over the x-faces of all sheets and over their y-faces.
    fn each_direction(
        &mut self,
        input: &[Complex<T>],
        output: &mut [Complex<T>],
        filter: &FilterOf<T>,
        mut multiply: impl FnMut(usize, &mut [Complex<T>]),
    ) {
        let (cells, faces) = (self.branches.cells(), self.branches.faces());
        for direction in 0..2 {
            let from: Vec<&[Complex<T>]> =
                input[..faces].chunks_exact(cells).skip(direction).step_by(2).collect();
            let mut to: Vec<&mut [Complex<T>]> =
                output[..faces].chunks_exact_mut(cells).skip(direction).step_by(2).collect();
            filter.apply(&from, &mut to, &mut self.scratch, &mut multiply);
        }
    }

    /// Sets faces that do not conduct to zero.
    fn mask(&self, faces: &mut [Complex<T>]) {
        for (value, _) in faces.iter_mut().zip(&self.branches.conducts).filter(|(_, conducts)| !**conducts) {
            *value = Complex::new(T::zero(), T::zero());
        }
    }

    /// Size of the voltages of `currents` in V, inductive ones left out; verticals as in [`Projector::size`], gaps as if
    /// they had the impedance of a few cells of copper, so that their voltage does not hide the rest.
    pub fn resistive_size(&self, currents: &[Complex<T>]) -> f64 {
        let mut out = vec![Complex::new(T::zero(), T::zero()); self.branches.faces()];
        for sheet in 0..self.branches.sheets {
            for direction in 0..2 {
                let range = self.branches.plane(sheet, direction);
                let (from, to) = (&currents[range.clone()], &mut out[range]);
                self.branches.add_resistive(sheet, direction, self.zs[sheet], from, to);
            }
        }
        let square = |v: Complex<T>| complex_double(v).norm_sqr();
        let faces: f64 = out.iter().map(|v| square(*v)).sum();
        let gaps = self.branches.first_gap();
        let verticals =
            currents[out.len()..gaps].iter().zip(&self.verticals).zip(&self.projector.conductance);
        let verticals: f64 =
            verticals.filter(|(_, g)| **g > 0.0).map(|((i, z), g)| g * square(*i * *z)).sum();
        let displaced: f64 = currents[gaps..].iter().map(|i| square(*i)).sum();
        libm::sqrt(faces + verticals + self.typical * self.typical * displaced)
    }

    /// Size of voltages after their potential part is taken out, see [`Projector::size`].
    pub fn size(&self, voltages: &[Complex<T>]) -> f64 {
        let gap_weight = self.typical * complex_double(self.s).norm();
        self.projector.size(self.branches, voltages, gap_weight)
    }

    /// Improves `currents` until the size of P^T (Z i + emf) in V is at most `target_v`; they keep their divergence.
    /// `residual` is -P^T (Z i + emf) of the currents given. Gives up after `most_steps`, or after `patience` steps that
    /// did not halve what is left. Returns the steps done and the size reached.
    pub fn iterate(
        &mut self,
        mut residual: Vec<Complex<T>>,
        currents: &mut [Complex<T>],
        target_v: f64,
        (most_steps, patience): (usize, usize),
    ) -> (usize, f64) {
        let zero = Complex::new(T::zero(), T::zero());
        let length = currents.len();
        let mut reached = self.size(&residual);
        if reached <= target_v {
            return (0, reached);
        }
        let (mut search, mut work) = (vec![zero; length], vec![zero; length]);
        let mut rho = Complex64::new(1.0, 0.0);
        let mut halved = (reached, 0);
        for step in 0..most_steps {
            self.precondition(&residual, &mut work);
            self.projector.conserve(self.branches, &mut work);
            let next = dot(&residual, &work);
            let beta = if step == 0 { zero } else { complex_of(next / rho) };
            rho = next;
            search.iter_mut().zip(&work).for_each(|(p, z)| *p = *z + beta * *p);
            self.apply(&search, &mut work);
            self.projector.take_out_potential(self.branches, &mut work);
            let alpha: Complex<T> = complex_of(rho / dot(&search, &work));
            if !complex_double(alpha).is_finite() {
                return (step, reached);
            }
            currents.iter_mut().zip(&search).for_each(|(i, p)| *i += alpha * p);
            residual.iter_mut().zip(&work).for_each(|(r, q)| *r -= alpha * q);
            reached = self.size(&residual);
            if reached <= 0.5 * halved.0 {
                halved = (reached, step);
            }
            if reached <= target_v || step - halved.1 >= patience {
                return (step + 1, reached);
            }
        }
        (most_steps, reached)
    }
}

impl Impedance<'_> {
    /// The same law for loops.
    pub fn law(&self) -> Law<'_> {
        Law { s: self.s, zs: &self.zs, edge_h: self.edge_h }
    }
}

/// The inverse of Zs_p delta_pq + s symbol_pq over `points`: for each entry of the upper triangle over the sheets all
/// modes.
pub fn inverse_symbols<T: Real>(
    s: Complex64,
    zs: &[Complex64],
    pair: &[usize],
    symbols: &[Vec<f64>],
    points: usize,
) -> Vec<Complex<T>> {
    let sheets = zs.len();
    let modes = symbols.first().map_or(0, Vec::len);
    let scale = 1.0 / points as f64;
    let mut inverse = vec![Complex::new(T::zero(), T::zero()); modes * sheets * (sheets + 1) / 2];
    let mut matrix = vec![Complex64::default(); sheets * sheets];
    let at = |index: usize, mode: usize| s * symbols[index][mode];
    for mode in 0..modes {
        matrix.iter_mut().zip(pair).for_each(|(entry, &index)| *entry = at(index, mode));
        for (p, zs) in zs.iter().enumerate() {
            matrix[p * sheets + p] += zs;
        }
        invert(&mut matrix, sheets);
        for p in 0..sheets {
            for q in p..sheets {
                inverse[triangle_index(p, q, sheets) * modes + mode] =
                    complex_of(matrix[p * sheets + q] * scale);
            }
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
pub fn dot<T: Real>(a: &[Complex<T>], b: &[Complex<T>]) -> Complex64 {
    a.iter().zip(b).map(|(x, y)| complex_double(*x) * complex_double(*y)).sum()
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
