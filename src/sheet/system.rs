//! The discrete system of a problem: branches, factor and kernels, independent of frequency and source.
//!
//! Model: Zs K + s A(K, strips) + grad phi = 0 on every sheet, div K = injected current, with the band-limited kernel
//! of `kernel` between the branches of all sheets, verticals r + s l + 1/(s c) between patches; solved by conjugate
//! gradients on the currents that conserve (`operator`), from the potential flow as start.
//!
//! Source: partial-element method, Ruehli, IEEE T-MTT 22, 1974 (from memory); projection see `projector`.
//!
//! Holds when: sheets are thin against the track's height and all lengths are short against the wavelength.
//!
//! Checked by: tests/physics.

use super::branches::{Branches, NO_NODE};
use super::loops::Loops;
use super::operator::{Coupling, Impedance, dot, norm, typical, vertical_impedance};
use super::projector::Projector;
use super::source;
use super::{Injection, Problem, Solution, SolveFailure, SourceStrip};
use crate::math::real::{complex_double, complex_of};
use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::sync::Arc;

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

/// A drive on the branches of a system: the part of a solve that does not depend on frequency.
#[derive(Clone, Debug)]
pub struct Prepared {
    /// Integral of the strips' vector potential along every dual edge in V s.
    pub flux: Vec<f64>,
    /// Current in A that enters each node.
    pub entering: Vec<f64>,
    /// Potential flow of the entering currents on the branches in A, with the base weights of the system.
    pub(super) start: Vec<f64>,
    /// Size of the flux through the faces without its potential part in V s.
    driving: f64,
}

/// A prepared problem: solve it for any source and frequency.
#[derive(Debug)]
pub struct System {
    pub(super) problem: Problem,
    pub(super) branches: Branches,
    pub(super) coupling: Coupling,
    loops: Option<Loops>,
    pub(super) projector: Arc<Projector>,
}

/// What a solve gives before it is put into the layout that others read.
pub(super) struct Raw {
    pub currents: Vec<Complex64>,
    pub potential: Vec<Complex64>,
    pub impedance: Complex64,
    pub residual: f64,
    pub steps: usize,
}

/// Steps after which a solve is given up.
const MOST_STEPS: usize = 400;
/// Rounds after which a solve is given up.
const MOST_ROUNDS: usize = 8;
/// Residual to which an iteration in single precision is trusted.
const SINGLE_REDUCTION: f64 = 1e-5;
/// Steps in single precision without halving after which rounding has won.
const SINGLE_PATIENCE: usize = 6;

impl System {
    /// Numbers the branches, factors the graph Laplacian and transforms the kernels of `problem`.
    pub fn new(problem: Problem) -> Result<Self, SolveFailure> {
        let branches = Branches::new(&problem)?;
        let (coupling, loops) = Coupling::new(&problem, &branches);
        let projector = Arc::new(Projector::new(&branches, vec![1.0; problem.verticals.len()])?);
        Ok(Self { problem, branches, coupling, loops, projector })
    }

    /// The problem that was prepared.
    pub fn problem(&self) -> &Problem {
        &self.problem
    }

    /// Number of unknown currents: conducting faces and verticals.
    pub fn unknowns(&self) -> usize {
        self.branches.conducts.iter().filter(|conducts| **conducts).count() + self.branches.ends.len()
    }

    /// Bytes of the factor that all solves share.
    pub fn factor_bytes(&self) -> usize {
        self.projector.bytes()
    }

    /// Evaluates the drive on the branches; use it for several frequencies with [`System::solve_prepared`].
    pub fn prepare(&self, drive: &Drive) -> Result<Prepared, SolveFailure> {
        let mut entering = vec![0.0; self.branches.nodes];
        for (index, injection) in drive.injections.iter().enumerate() {
            for (node, weight) in self.branches.on_nodes(&injection.patch, index)? {
                entering[node as usize] += weight * injection.current_a;
            }
        }
        let mut flux = source::flux(&self.problem, &drive.strips);
        flux.iter_mut().zip(&self.branches.conducts).filter(|(_, c)| !**c).for_each(|(a, _)| *a = 0.0);
        let start = self.potential_flow(&self.projector, &entering).iter().map(|i| i.re).collect();
        let mut driving: Vec<Complex64> = flux.iter().map(|&a| a.into()).collect();
        driving.resize(self.branches.len(), Complex64::default());
        self.projector.take_out_potential(&self.branches, &mut driving);
        Ok(Prepared { flux, entering, start, driving: norm(&driving[..self.branches.faces()]) })
    }

    /// Solves for one drive at one frequency to a relative residual of `tolerance`.
    pub fn solve(
        &self,
        drive: &Drive,
        point: &OperatingPoint,
        tolerance: f64,
    ) -> Result<Solution, SolveFailure> {
        self.solve_prepared(&self.prepare(drive)?, point, tolerance)
    }

    /// Solves for one prepared drive at one frequency to a relative residual of `tolerance`.
    pub fn solve_prepared(
        &self,
        drive: &Prepared,
        point: &OperatingPoint,
        tolerance: f64,
    ) -> Result<Solution, SolveFailure> {
        let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * point.frequency_hz);
        let raw = self.raw(drive, s, &point.zs_ohm, tolerance, None)?;
        Ok(self.solution(&raw.currents, &raw.potential, raw.impedance, raw.residual, raw.steps))
    }

    /// Branch currents at the complex frequency `s`; `near` are those of a frequency nearby.
    pub(super) fn raw(
        &self,
        drive: &Prepared,
        s: Complex64,
        zs: &[Complex64],
        tolerance: f64,
        near: Option<&[f64]>,
    ) -> Result<Raw, SolveFailure> {
        let projector = self.projector_at(s, zs)?;
        self.check_balance(&projector, &drive.entering)?;
        let branches = &self.branches;
        let loops = self.loops.as_ref().filter(|_| self.loops_pay(s, zs));
        let bare = Impedance::<f64>::bare;
        let mut operator = bare(&self.problem, branches, &self.coupling, &projector, s, zs);
        let emf = self.emf(drive, s);
        let suits = Arc::ptr_eq(&projector, &self.projector);
        let mut currents: Vec<Complex64> = if suits {
            drive.start.iter().map(|&i| i.into()).collect()
        } else {
            self.potential_flow(&projector, &drive.entering)
        };
        // the voltages that drive the currents: induced ones without their potential part, resistive ones of the start
        let size = s.norm() * drive.driving + operator.resistive_size(&currents);
        let mut steps = 0;
        let mut voltage = vec![Complex64::default(); branches.len()];
        if let Some(near) = near {
            currents = near.iter().map(|&i| i.into()).collect();
            // a gap that was open may carry now, a vertical that carried may be open
            let gaps = branches.first_gap();
            for (i, _) in currents[branches.faces()..gaps]
                .iter_mut()
                .zip(&projector.conductance)
                .filter(|(_, g)| **g == 0.0)
            {
                *i = Complex64::default();
            }
            self.balance(&projector, drive, &mut currents);
        }
        // Rounds end when the voltage law holds in double precision. A round solves for what is left, by loops (where
        // the EMF round loops is another measure) or by projection in single precision, which is accurate to some
        // digits of what is left; if that does not help, in double precision.
        let mut single: Option<Impedance<'_, f32>> = None;
        let mut rounds = 0;
        let mut before = f64::INFINITY;
        // the voltage of a vertical of high impedance drowns that of the faces in single precision
        let mut doubtful = projector.conductance.iter().any(|&g| g > 0.0 && g < 1.0);
        let (impedance, potential, left) = loop {
            operator.apply(&currents, &mut voltage);
            voltage.iter_mut().zip(&emf).for_each(|(v, e)| *v += e);
            let impedance = dot(&currents, &voltage) + dot(&currents, &emf);
            let potential = projector.take_out_potential(branches, &mut voltage);
            let left = operator.size(&voltage);
            if left <= tolerance * size || rounds == MOST_ROUNDS || steps >= MOST_STEPS || !left.is_finite() {
                break (impedance, potential, left);
            }
            let most = MOST_STEPS - steps;
            let reduction = 0.5 * tolerance * size / left;
            rounds += 1;
            if let Some(loops) = loops {
                steps += loops.iterate(
                    branches,
                    &operator.law(),
                    &voltage,
                    &mut currents,
                    reduction.min(0.1),
                    most,
                );
                continue;
            }
            doubtful |= left > 0.1 * before;
            if !doubtful {
                before = left;
                let make = || Impedance::new(&self.problem, branches, &self.coupling, &projector, s, zs);
                let operator = single.get_or_insert_with(make);
                let residual = voltage.iter().map(|v| complex_of(-v / left)).collect();
                let mut change = vec![complex_of(Complex64::default()); branches.len()];
                let reduction = reduction.max(SINGLE_REDUCTION);
                steps += operator.iterate(residual, &mut change, reduction, (most, SINGLE_PATIENCE)).0;
                currents.iter_mut().zip(&change).for_each(|(i, c)| *i += left * complex_double(*c));
            } else {
                let make = Impedance::<f64>::new;
                let mut operator = make(&self.problem, branches, &self.coupling, &projector, s, zs);
                voltage.iter_mut().for_each(|v| *v = -*v);
                let residual = std::mem::take(&mut voltage);
                steps += operator.iterate(residual, &mut currents, 0.5 * tolerance * size, (most, most)).0;
                voltage = vec![Complex64::default(); branches.len()];
            }
            // rounding of many steps
            self.balance(&projector, drive, &mut currents);
        };
        let residual = if size > 0.0 { left / size } else { 0.0 };
        if residual.is_nan() || residual > 1.01 * tolerance.max(1e-11) {
            return Err(SolveFailure::NoConvergence { steps, residual, tolerance });
        }
        Ok(Raw { currents, potential, impedance, residual, steps })
    }

    /// Brings the divergence of `currents` back to what enters.
    fn balance(&self, projector: &Projector, drive: &Prepared, currents: &mut [Complex64]) {
        let mut surplus = self.branches.divergence(currents);
        surplus.iter_mut().zip(&drive.entering).for_each(|(leaves, enters)| *leaves -= enters);
        projector.take_up(&self.branches, &surplus, currents);
    }

    /// EMF of the strips on every branch at `s`.
    pub(super) fn emf(&self, drive: &Prepared, s: Complex64) -> Vec<Complex64> {
        let mut emf: Vec<Complex64> = drive.flux.iter().map(|a| s * a).collect();
        emf.resize(self.branches.len(), Complex64::default());
        emf
    }

    /// Loops take cheaper steps than projection but more of them at low frequency; measured, they pay from
    /// |lambda| d = 0.15 on.
    fn loops_pay(&self, s: Complex64, zs: &[Complex64]) -> bool {
        let most = zs.iter().map(|z| z.norm()).fold(0.0, f64::max);
        s.norm() * MU0 * self.problem.grid.cell_m > 0.3 * most
    }

    /// Voltage in V that the currents of `solution` put into another path per ampere: EMF along its strips plus
    /// potential difference of its landings. For the drive of the solution itself this is the sheets' impedance. The
    /// direct mutual inductance of the two sources is not in it.
    pub fn transfer_ohm(&self, solution: &Solution, frequency_hz: f64, other: &Prepared) -> Complex64 {
        let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * frequency_hz);
        let (nx, ny) = (self.branches.nx, self.branches.ny);
        let mut flux = Complex64::default();
        let mut landing = Complex64::default();
        for sheet in 0..self.branches.sheets {
            let along_x = &other.flux[self.branches.plane(sheet, 0)];
            for (row, fluxes) in solution.jx[sheet].chunks_exact(nx + 1).zip(along_x.chunks_exact(nx)) {
                flux += row.iter().zip(fluxes).map(|(i, a)| i * a).sum::<Complex64>();
            }
            let along_y = &other.flux[self.branches.plane(sheet, 1)];
            flux += solution.jy[sheet].iter().zip(along_y).map(|(i, a)| i * a).sum::<Complex64>();
            let nodes = &self.branches.node[sheet * nx * ny..(sheet + 1) * nx * ny];
            for (&node, potential) in nodes.iter().zip(&solution.potential_v[sheet]) {
                if node != NO_NODE {
                    landing += potential * other.entering[node as usize];
                }
            }
        }
        for (potential, entering) in
            solution.outside_v.iter().zip(&other.entering[self.branches.copper_nodes..])
        {
            landing += potential * *entering;
        }
        s * flux + landing
    }

    /// Currents of the potential flow of what enters.
    fn potential_flow(&self, projector: &Projector, entering: &[f64]) -> Vec<Complex64> {
        let entering: Vec<Complex64> = entering.iter().map(|&a| a.into()).collect();
        let mut currents = vec![Complex64::default(); self.branches.len()];
        projector.take_up(&self.branches, &entering, &mut currents);
        currents.iter_mut().for_each(|i| *i = -*i);
        currents
    }

    /// Difference of two solutions relative to the second in the norm of R + w L, in which the iteration minimizes.
    pub fn difference(&self, one: &Solution, other: &Solution, point: &OperatingPoint) -> f64 {
        let (a, b) = (self.currents_of(one), self.currents_of(other));
        let off: Vec<Complex64> = a.iter().zip(&b).map(|(a, b)| a - b).collect();
        let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * point.frequency_hz);
        let Ok(projector) = self.projector_at(s, &point.zs_ohm) else { return f64::NAN };
        let mut law = Impedance::<f64>::bare(
            &self.problem,
            &self.branches,
            &self.coupling,
            &projector,
            s,
            &point.zs_ohm,
        );
        let mut size = |currents: &[Complex64]| {
            let mut voltage = vec![Complex64::default(); currents.len()];
            law.apply(currents, &mut voltage);
            let power: Complex64 = currents.iter().zip(&voltage).map(|(i, v)| i.conj() * v).sum();
            libm::sqrt(power.re.abs() + power.im.abs())
        };
        size(&off) / size(&b)
    }

    /// A solution as a vector of branch currents.
    pub(super) fn currents_of(&self, solution: &Solution) -> Vec<Complex64> {
        let nx = self.branches.nx;
        let mut currents = Vec::with_capacity(self.branches.len());
        for (jx, jy) in solution.jx.iter().zip(&solution.jy) {
            jx.chunks_exact(nx + 1).for_each(|row| currents.extend_from_slice(&row[..nx]));
            currents.extend_from_slice(&jy[..self.branches.cells()]);
        }
        currents.extend_from_slice(&solution.verticals);
        for (cells, through) in self.branches.gap_cells.iter().zip(&solution.displacement) {
            currents.extend(cells.iter().map(|&cell| through[cell as usize]));
        }
        currents
    }

    /// The prepared factor, or one with weights that suit the verticals at this frequency.
    pub(super) fn projector_at(
        &self,
        s: Complex64,
        zs: &[Complex64],
    ) -> Result<Arc<Projector>, SolveFailure> {
        let typical = typical(&self.problem, s, zs).norm();
        let suits: Vec<f64> = self
            .problem
            .verticals
            .iter()
            .map(|vertical| {
                let ratio = vertical_impedance(vertical, s).norm() / typical;
                if !ratio.is_finite() {
                    return 0.0;
                }
                // powers of four, so that small changes of frequency change nothing
                if (0.1..=10.0).contains(&ratio) || ratio < 0.1 {
                    1.0
                } else {
                    libm::exp2(-2.0 * libm::round(libm::log2(ratio) / 2.0)).max(1e-9)
                }
            })
            .collect();
        let open = s == Complex64::default() && self.projector.joins_gaps();
        let projector = match suits == self.projector.conductance {
            true if !open => return Ok(self.projector.clone()),
            true => self.projector.as_ref().clone(),
            false => Projector::new(&self.branches, suits)?,
        };
        Ok(Arc::new(if open { projector.with_open_gaps() } else { projector }))
    }

    /// The net current of every connected piece of copper must vanish.
    pub(super) fn check_balance(&self, projector: &Projector, entering: &[f64]) -> Result<(), SolveFailure> {
        let mut net = vec![0.0; entering.len()];
        let mut total = 0.0;
        for (node, &current) in entering.iter().enumerate() {
            net[projector.joined(node) as usize] += current;
            total += current.abs();
        }
        let off = |node: usize| net[projector.joined(node) as usize].abs() > 1e-9 * total;
        let lands = |node: usize| entering[node] != 0.0;
        let Some(first) = (0..entering.len()).find(|&node| lands(node) && off(node)) else {
            return Ok(());
        };
        let piece = projector.joined(first);
        let second =
            (0..entering.len()).find(|&node| lands(node) && projector.joined(node) != piece && off(node));
        let cell = |wanted: usize| {
            let at = self.branches.node.iter().position(|&node| node as usize == wanted && node != NO_NODE);
            at.unwrap_or(0) % self.branches.cells()
        };
        let cells = (cell(first), cell(second.unwrap_or(first)));
        Err(SolveFailure::Unbalanced { cells, current_a: net[piece as usize] })
    }

    /// Currents and potentials in the layout that others read.
    pub(super) fn solution(
        &self,
        currents: &[Complex64],
        potential: &[Complex64],
        impedance: Complex64,
        residual: f64,
        steps: usize,
    ) -> Solution {
        let branches = &self.branches;
        let (nx, ny, zero) = (branches.nx, branches.ny, Complex64::default());
        let (mut jx, mut jy, mut potentials) = (Vec::new(), Vec::new(), Vec::new());
        for sheet in 0..branches.sheets {
            let mut along_x = vec![zero; (nx + 1) * ny];
            let from = &currents[branches.plane(sheet, 0)];
            for (to, row) in along_x.chunks_exact_mut(nx + 1).zip(from.chunks_exact(nx)) {
                to[..nx].copy_from_slice(row);
            }
            let mut along_y = currents[branches.plane(sheet, 1)].to_vec();
            along_y.resize(nx * (ny + 1), zero);
            jx.push(along_x);
            jy.push(along_y);
            let nodes = &branches.node[sheet * nx * ny..(sheet + 1) * nx * ny];
            let at = |&node: &u32| if node == NO_NODE { zero } else { potential[node as usize] };
            potentials.push(nodes.iter().map(at).collect());
        }
        let mut displaced = currents[branches.first_gap()..].iter();
        let mut displacement = vec![vec![zero; nx * ny]; branches.gap_cells.len()];
        for (cells, through) in branches.gap_cells.iter().zip(&mut displacement) {
            cells.iter().zip(&mut displaced).for_each(|(&cell, current)| through[cell as usize] = *current);
        }
        let outside_v = potential[branches.copper_nodes..].to_vec();
        Solution {
            jx,
            jy,
            verticals: currents[branches.faces()..branches.first_gap()].to_vec(),
            displacement,
            potential_v: potentials,
            outside_v,
            sheet_impedance_ohm: impedance,
            residual,
            steps,
        }
    }
}
