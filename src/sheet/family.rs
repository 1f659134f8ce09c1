//! All frequencies of one drive from a handful of solves: a reduced basis with a bound of its error.
//!
//! Given a system, a drive and the operating points that will be asked, gives the solution at any frequency between
//! for the price of a small dense system; sheet impedances may change with frequency, each sheet on its own.
//!
//! Model: i = i0 + V y, V real and orthonormal, made of solutions at s = 0 and at real positive s, geometric between the
//! lowest and highest frequency asked; V^T (sum_p Zs_p R_p + s L + sum_v z_v V_v) (i0 + V y) = -s V^T a. R_p, L and the
//! currents of the verticals are projected once. Real V keeps the reduced model reciprocal and passive. At the points
//! asked the residual is measured in the dual norm of R + w L by the preconditioner, relative to the norm of the
//! solution; where it is above the tolerance the real and imaginary part of the direct solution are added.
//!
//! Source: reduced basis methods (Quarteroni, Manzoni and Negri 2016), real bases of R + s L (Kerler-Back and Stykel),
//! both from memory. |i - i_exact| <= sqrt 2 times the dual norm of the residual, in the norm of R + w L; the
//! preconditioner stands for its inverse within a factor: allow 2.
//!
//! Holds when: frequencies lie between those given; outside, the bound still tells.
//!
//! Checked by: `family_matches_direct_solves` in tests/physics.

use super::operator::{Impedance, dot, norm, vertical_impedance};
use super::system::{Drive, OperatingPoint, Prepared, System};
use super::{Solution, SolveFailure};
use crate::math::small;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Relative residual of the solves that make the basis against the tolerance of the family, and its limits.
const SOLVE_PART: f64 = 3e-3;
const SOLVE_LIMITS: (f64, f64) = (1e-8, 1e-5);
/// Real shifts in a decade of frequency.
const SHIFTS_A_DECADE: f64 = 1.6;
/// Frequencies in a band of one decade at which bounds are watched; wider bands have as many in all, but 1.5 a decade.
const WATCHED_A_DECADE: f64 = 8.0;
/// Vectors beyond which no more are added.
const MOST_VECTORS: usize = 48;
/// Series impedance that stands for an open vertical in the reduced system, in ohm.
const OPEN_OHM: f64 = 1e9;

/// Complex frequency in 1/s at which open gaps are taken in the reduced system.
const OPEN_SHIFT: f64 = 1e-6;

/// A reduced basis of one drive.
pub struct Family<'a> {
    pub(super) system: &'a System,
    drive: Prepared,
    /// Start and basis vectors: row 0 is i0, not normalized.
    pub(super) vectors: Vec<Vec<f64>>,
    /// For each sheet V^T R V over all rows.
    resistive: Vec<Vec<f64>>,
    /// V^T L V over all rows.
    inductive: Vec<f64>,
    /// V^T C^-1 V of the gaps over all rows, in 1/F.
    elastance: Vec<f64>,
    /// V^T a.
    flux: Vec<f64>,
    /// Solves that were needed.
    pub solves: usize,
    /// Largest bound at the points asked.
    pub worst_bound: f64,
}

impl<'a> Family<'a> {
    /// Solves at real shifts and adds direct solutions until the bound at all `points` is below `tolerance`.
    pub fn new(
        system: &'a System,
        drive: &Drive,
        points: &[OperatingPoint],
        tolerance: f64,
    ) -> Result<Self, SolveFailure> {
        Self::prepared(system, system.prepare(drive)?, points, tolerance)
    }

    /// The family of a prepared drive over all `frequencies_hz`, which may be thousands of lines: `at` gives the
    /// operating point of a frequency. Bounds are watched at a dozen of them spread over the band.
    pub fn for_band(
        system: &'a System,
        drive: Prepared,
        frequencies_hz: &[f64],
        at: impl Fn(f64) -> OperatingPoint,
        tolerance: f64,
    ) -> Result<Self, SolveFailure> {
        let mut sorted: Vec<f64> = frequencies_hz.to_vec();
        sorted.sort_by(f64::total_cmp);
        sorted.dedup();
        let decades = match (sorted.iter().find(|f| **f > 0.0), sorted.last()) {
            (Some(low), Some(high)) => libm::log10(high / low),
            _ => 0.0,
        };
        let steps = WATCHED_A_DECADE / decades.max(1.0);
        let mut watched: Vec<f64> = Vec::new();
        for (index, &f) in sorted.iter().enumerate() {
            let far = match watched.last() {
                None => true,
                Some(&0.0) => true,
                Some(&last) => libm::log10(f / last) >= 1.0 / steps.max(1.5) - 1e-12,
            };
            if far || index + 1 == sorted.len() {
                watched.push(f);
            }
        }
        let points: Vec<OperatingPoint> = watched.into_iter().map(at).collect();
        Self::prepared(system, drive, &points, tolerance)
    }

    /// As [`Family::new`] for a prepared drive.
    pub fn prepared(
        system: &'a System,
        drive: Prepared,
        points: &[OperatingPoint],
        tolerance: f64,
    ) -> Result<Self, SolveFailure> {
        let start = drive.start.clone();
        let mut family = Self {
            system,
            drive,
            vectors: Vec::new(),
            resistive: vec![Vec::new(); system.problem.sheets.len()],
            inductive: Vec::new(),
            elastance: Vec::new(),
            flux: Vec::new(),
            solves: 0,
            worst_bound: 0.0,
        };
        family.push(vec![start]);
        let alternating = || points.iter().map(|p| p.frequency_hz).filter(|f| *f > 0.0);
        let (low, high) =
            alternating().fold((f64::INFINITY, 0.0), |(l, h): (f64, f64), f| (l.min(f), h.max(f)));
        // beyond a few hundred MHz resistance no longer shapes the currents
        let high = high.min(3e8).max(low);
        let mut shifts = Vec::new();
        if points.iter().any(|p| p.frequency_hz == 0.0) || high > low {
            shifts.push(0.0);
        }
        if high > 0.0 {
            let count = 2 + (SHIFTS_A_DECADE * libm::log10(high / low)) as usize;
            let ratio = libm::log(high / low) / (count - 1) as f64;
            shifts.extend((0..count).map(|k| 2.0 * PI * low * libm::exp(ratio * k as f64)));
        }
        let direct: Vec<Complex64> = match points.first() {
            Some(point) => point.zs_ohm.iter().map(|z| z.re.into()).collect(),
            None => return Ok(family),
        };
        let each = (SOLVE_PART * tolerance).clamp(SOLVE_LIMITS.0, SOLVE_LIMITS.1);
        let mut solved: Vec<Vec<f64>> = Vec::new();
        for s in shifts {
            // the solution of the shift before is a good start
            let raw = system.raw(&family.drive, s.into(), &direct, each, solved.last().map(Vec::as_slice))?;
            solved.push(raw.currents.iter().map(|i| i.re).collect());
            family.solves += 1;
        }
        family.push(solved);
        loop {
            let mut worst = (0.0, 0);
            for (index, point) in points.iter().enumerate() {
                let bound = family.bound(point)?;
                if bound > worst.0 {
                    worst = (bound, index);
                }
            }
            family.worst_bound = worst.0;
            if worst.0 <= tolerance || family.vectors.len() + 2 > MOST_VECTORS {
                return Ok(family);
            }
            let point = &points[worst.1];
            let s = Complex64::new(0.0, 2.0 * PI * point.frequency_hz);
            let raw = system.raw(&family.drive, s, &point.zs_ohm, each, None)?;
            family.solves += 1;
            let before = family.vectors.len();
            let parts =
                [raw.currents.iter().map(|i| i.re).collect(), raw.currents.iter().map(|i| i.im).collect()];
            family.push(parts.to_vec());
            if family.vectors.len() == before {
                return Ok(family);
            }
        }
    }

    /// Number of vectors of the basis.
    pub fn len(&self) -> usize {
        self.vectors.len() - 1
    }

    /// Whether the basis holds no vector, so that the start alone answers.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Adds vectors: takes off the start (except from itself) and what the basis holds, normalizes, projects.
    fn push(&mut self, added: Vec<Vec<f64>>) {
        let first = self.vectors.len();
        for (index, mut vector) in added.into_iter().enumerate() {
            if first + index > 0 {
                // a solution carries the injected current once, its imaginary part not at all
                let carried = self.carried(&vector);
                subtract(&mut vector, carried, &self.vectors[0]);
                let before = length(&vector);
                for _ in 0..2 {
                    for known in &self.vectors[1..] {
                        let part = product(known, &vector);
                        subtract(&mut vector, part, known);
                    }
                }
                let left = length(&vector);
                if left <= 1e-6 * before || left == 0.0 {
                    continue;
                }
                vector.iter_mut().for_each(|v| *v /= left);
            }
            self.vectors.push(vector);
        }
        self.project(first);
    }

    /// How much of the injected current a vector carries: 1 or 0.
    fn carried(&self, vector: &[f64]) -> f64 {
        let complex: Vec<Complex64> = vector.iter().map(|&v| v.into()).collect();
        let leaves = self.system.branches.divergence(&complex);
        let (mut sum, mut size) = (0.0, 0.0);
        for (leaves, enters) in leaves.iter().zip(&self.drive.entering) {
            sum += leaves.re * enters;
            size += enters * enters;
        }
        if size > 0.0 { libm::round(sum / size) } else { 0.0 }
    }

    /// Extends the projected matrices by the rows from `first` on.
    fn project(&mut self, first: usize) {
        let (old, new) = (first, self.vectors.len());
        let grow = |matrix: &[f64]| {
            let mut grown = vec![0.0; new * new];
            (0..old).for_each(|row| {
                grown[row * new..row * new + old].copy_from_slice(&matrix[row * old..][..old])
            });
            grown
        };
        let system = self.system;
        let sheets = system.problem.sheets.len();
        self.inductive = grow(&self.inductive);
        self.elastance = grow(&self.elastance);
        self.resistive = self.resistive.iter().map(|matrix| grow(matrix)).collect();
        let nothing = vec![Complex64::default(); sheets];
        let one = Complex64::new(1.0, 0.0);
        // s = 1 with no resistance applies L; the verticals enter by their own currents
        let projector = &system.projector;
        let mut inductance = Impedance::<f64>::bare(
            &system.problem,
            &system.branches,
            &system.coupling,
            projector,
            one,
            &nothing,
        );
        let faces = system.branches.faces();
        let mut voltages = vec![Complex64::default(); system.branches.len()];
        for row in first..new {
            let currents: Vec<Complex64> = self.vectors[row].iter().map(|&v| v.into()).collect();
            inductance.apply(&currents, &mut voltages);
            voltages[faces..].fill(Complex64::default());
            let voltage: Vec<f64> = voltages.iter().map(|v| v.re).collect();
            for column in 0..new {
                let value = product(&voltage, &self.vectors[column]);
                self.inductive[row * new + column] = value;
                self.inductive[column * new + row] = value;
            }
            for sheet in 0..sheets {
                voltages.fill(Complex64::default());
                for direction in 0..2 {
                    let range = system.branches.plane(sheet, direction);
                    let (from, to) = (&currents[range.clone()], &mut voltages[range]);
                    system.branches.add_resistive(sheet, direction, one, from, to);
                }
                let voltage: Vec<f64> = voltages.iter().map(|v| v.re).collect();
                for column in 0..new {
                    let value = product(&voltage, &self.vectors[column]);
                    self.resistive[sheet][row * new + column] = value;
                    self.resistive[sheet][column * new + row] = value;
                }
            }
            let gaps = system.branches.first_gap();
            for column in 0..new {
                let both = self.vectors[row][gaps..].iter().zip(&self.vectors[column][gaps..]);
                let value = both.zip(&system.branches.facing).map(|((a, b), (_, _, c))| a * b / c).sum();
                self.elastance[row * new + column] = value;
                self.elastance[column * new + row] = value;
            }
            self.flux.push(product(&self.drive.flux, &self.vectors[row][..faces]));
        }
    }

    /// The reduced impedance matrix over all rows at `s`.
    fn matrix(&self, s: Complex64, zs: &[Complex64]) -> Vec<Complex64> {
        let rows = self.vectors.len();
        let mut matrix: Vec<Complex64> = self.inductive.iter().map(|l| s * l).collect();
        for (resistive, zs) in self.resistive.iter().zip(zs) {
            matrix.iter_mut().zip(resistive).for_each(|(z, r)| *z += zs * r);
        }
        // gaps are open at DC
        let shift = if s == Complex64::default() { OPEN_SHIFT.into() } else { s };
        matrix.iter_mut().zip(&self.elastance).for_each(|(z, e)| *z += e / shift);
        let faces = self.system.branches.faces();
        for (index, vertical) in self.system.problem.verticals.iter().enumerate() {
            let impedance = vertical_impedance(vertical, s);
            let impedance = if impedance.is_finite() { impedance } else { OPEN_OHM.into() };
            for row in 0..rows {
                for column in 0..rows {
                    let both = self.vectors[row][faces + index] * self.vectors[column][faces + index];
                    matrix[row * rows + column] += impedance * both;
                }
            }
        }
        matrix
    }

    /// Coefficients of start (1) and basis at one operating point.
    pub(super) fn coefficients(&self, point: &OperatingPoint) -> Vec<Complex64> {
        let s = Complex64::new(0.0, 2.0 * PI * point.frequency_hz);
        let rows = self.vectors.len();
        let matrix = self.matrix(s, &point.zs_ohm);
        let inner =
            (1..rows).flat_map(|row| matrix[row * rows + 1..(row + 1) * rows].iter().copied()).collect();
        let rhs = (1..rows).map(|row| -matrix[row * rows] - s * self.flux[row]).collect();
        let mut all = vec![Complex64::new(1.0, 0.0)];
        all.extend(small::solve(inner, rhs).unwrap_or_else(|| vec![Complex64::default(); rows - 1]));
        all
    }

    /// Impedance in ohm that the sheets put into the source path, as in [`Solution::sheet_impedance_ohm`]: costs nothing.
    pub fn sheet_impedance_ohm(&self, point: &OperatingPoint) -> Complex64 {
        let s = Complex64::new(0.0, 2.0 * PI * point.frequency_hz);
        let y = self.coefficients(point);
        let rows = y.len();
        let matrix = self.matrix(s, &point.zs_ohm);
        let mut sum = Complex64::default();
        for row in 0..rows {
            let line: Complex64 = (0..rows).map(|column| matrix[row * rows + column] * y[column]).sum();
            sum += y[row] * (line + 2.0 * s * self.flux[row]);
        }
        sum
    }

    /// Current in A through each vertical at one operating point: costs nothing.
    pub fn verticals(&self, point: &OperatingPoint) -> Vec<Complex64> {
        let range = self.system.branches.faces()..self.system.branches.first_gap();
        let mut currents = vec![Complex64::default(); range.len()];
        for (y, vector) in self.coefficients(point).iter().zip(&self.vectors) {
            currents.iter_mut().zip(&vector[range.clone()]).for_each(|(i, v)| *i += y * v);
        }
        currents
    }

    fn currents(&self, point: &OperatingPoint) -> Vec<Complex64> {
        let mut currents = vec![Complex64::default(); self.system.branches.len()];
        for (y, vector) in self.coefficients(point).iter().zip(&self.vectors) {
            currents.iter_mut().zip(vector).for_each(|(i, v)| *i += y * v);
        }
        currents
    }

    /// Bound of the relative error at one operating point in the norm of R + w L: twice the dual norm of the residual,
    /// evaluated with the preconditioner, over the norm of the solution.
    pub fn bound(&self, point: &OperatingPoint) -> Result<f64, SolveFailure> {
        Ok(self.examined(point)?.1)
    }

    /// The solution at one operating point; its residual is the bound of [`Family::bound`].
    pub fn at(&self, point: &OperatingPoint) -> Result<Solution, SolveFailure> {
        Ok(self.examined(point)?.0)
    }

    fn examined(&self, point: &OperatingPoint) -> Result<(Solution, f64), SolveFailure> {
        let system = self.system;
        let w = 2.0 * PI * point.frequency_hz;
        let s = Complex64::new(0.0, w);
        let projector = system.projector_at(s, &point.zs_ohm)?;
        system.check_balance(&projector, &self.drive.entering)?;
        let currents = self.currents(point);
        let mut voltage = vec![Complex64::default(); currents.len()];
        let problem = &system.problem;
        let mut law =
            Impedance::<f64>::bare(problem, &system.branches, &system.coupling, &projector, s, &point.zs_ohm);
        law.apply(&currents, &mut voltage);
        let size = dot(&conjugate(&currents), &voltage);
        // R + w L of the solution
        let size = size.re.abs() + size.im.abs();
        let emf = self.system.emf(&self.drive, s);
        voltage.iter_mut().zip(&emf).for_each(|(v, e)| *v += e);
        let potential = projector.take_out_potential(&system.branches, &mut voltage);
        let real: Vec<Complex64> = point.zs_ohm.iter().map(|z| Complex64::from(z.re)).collect();
        let mut positive =
            Impedance::<f64>::new(problem, &system.branches, &system.coupling, &projector, w.into(), &real);
        let mut answer = vec![Complex64::default(); currents.len()];
        positive.precondition(&voltage, &mut answer);
        let dual = dot(&conjugate(&voltage), &answer).re.max(0.0);
        let bound = if norm(&voltage) > 0.0 { 2.0 * libm::sqrt(dual / size) } else { 0.0 };
        let impedance = self.sheet_impedance_ohm(point);
        Ok((system.solution(&currents, &potential, impedance, bound, 0), bound))
    }
}

fn conjugate(a: &[Complex64]) -> Vec<Complex64> {
    a.iter().map(Complex64::conj).collect()
}

fn product(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(x, y)| x * y).sum()
}

fn length(a: &[f64]) -> f64 {
    libm::sqrt(product(a, a))
}

fn subtract(from: &mut [f64], factor: f64, what: &[f64]) {
    if factor != 0.0 {
        from.iter_mut().zip(what).for_each(|(a, b)| *a -= factor * b);
    }
}
