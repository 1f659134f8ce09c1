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
    /// Size of the flux without its potential part in V s.
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
        Ok(Prepared { flux, entering, start, driving: norm(&driving) })
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
        let raw = self.raw(drive, s, &point.zs_ohm, tolerance)?;
        Ok(self.solution(&raw.currents, &raw.potential, raw.impedance, raw.residual, raw.steps))
    }

    /// Branch currents at the complex frequency `s`.
    pub(super) fn raw(
        &self,
        drive: &Prepared,
        s: Complex64,
        zs: &[Complex64],
        tolerance: f64,
    ) -> Result<Raw, SolveFailure> {
        let projector = self.projector_at(s, zs)?;
        self.check_balance(&projector, &drive.entering)?;
        let branches = &self.branches;
        let loops = self.loops.as_ref().filter(|_| self.loops_pay(s, zs));
        let make = if loops.is_some() { Impedance::bare } else { Impedance::new };
        let mut operator = make(&self.problem, branches, &self.coupling, &projector, s, zs);
        let emf = self.emf(drive, s);
        let mut currents: Vec<Complex64> = if Arc::ptr_eq(&projector, &self.projector) {
            drive.start.iter().map(|&i| i.into()).collect()
        } else {
            self.potential_flow(&projector, &drive.entering)
        };
        // the voltages that drive the currents: induced ones without their potential part, resistive ones of the start
        let size = s.norm() * drive.driving + projector.size(branches, &operator.resistive(&currents));
        let mut steps = 0;
        let mut voltage = vec![Complex64::default(); branches.len()];
        if loops.is_none() {
            (steps, _) = operator.iterate(&emf, &mut currents, tolerance * size, MOST_STEPS);
            // rounding of many steps: bring the divergence back
            let mut surplus = branches.divergence(&currents);
            surplus.iter_mut().zip(&drive.entering).for_each(|(leaves, enters)| *leaves -= enters);
            let potential = projector.potential(&surplus);
            branches.subtract_gradient(&potential, Some(&projector.conductance), &mut currents);
        }
        // what is left of the voltage law; the size of the EMF round loops is another measure, so that loops are
        // added until the law holds
        let mut rounds = 0;
        let (impedance, potential, left) = loop {
            operator.apply(&currents, &mut voltage);
            voltage.iter_mut().zip(&emf).for_each(|(v, e)| *v += e);
            let impedance = dot(&currents, &voltage) + dot(&currents, &emf);
            let potential = projector.take_out_potential(branches, &mut voltage);
            let left = projector.size(branches, &voltage);
            let Some(loops) = loops.filter(|_| left > tolerance * size && rounds < 4) else {
                break (impedance, potential, left);
            };
            let reduction = (0.5 * tolerance * size / left).min(0.1);
            let most = MOST_STEPS - steps;
            steps += loops.iterate(branches, &operator.law(), &voltage, &mut currents, reduction, most);
            rounds += 1;
        };
        let residual = if size > 0.0 { left / size } else { 0.0 };
        if residual.is_nan() || residual > 1.01 * tolerance.max(1e-11) {
            return Err(SolveFailure::NoConvergence { steps, residual, tolerance });
        }
        Ok(Raw { currents, potential, impedance, residual, steps })
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
        let flow = projector.potential(&entering);
        self.branches.subtract_gradient(&flow, Some(&projector.conductance), &mut currents);
        currents.iter_mut().for_each(|i| *i = -*i);
        currents
    }

    /// Difference of two solutions relative to the second in the norm of R + w L, in which the iteration minimizes.
    pub fn difference(&self, one: &Solution, other: &Solution, point: &OperatingPoint) -> f64 {
        let (a, b) = (self.currents_of(one), self.currents_of(other));
        let off: Vec<Complex64> = a.iter().zip(&b).map(|(a, b)| a - b).collect();
        let s = Complex64::new(0.0, 2.0 * std::f64::consts::PI * point.frequency_hz);
        let Ok(projector) = self.projector_at(s, &point.zs_ohm) else { return f64::NAN };
        let mut law =
            Impedance::bare(&self.problem, &self.branches, &self.coupling, &projector, s, &point.zs_ohm);
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
        if suits == self.projector.conductance {
            return Ok(self.projector.clone());
        }
        Ok(Arc::new(Projector::new(&self.branches, suits)?))
    }

    /// The net current of every connected piece of copper must vanish.
    pub(super) fn check_balance(&self, projector: &Projector, entering: &[f64]) -> Result<(), SolveFailure> {
        let mut net = vec![0.0; entering.len()];
        let mut total = 0.0;
        for (node, &current) in entering.iter().enumerate() {
            net[projector.piece[node] as usize] += current;
            total += current.abs();
        }
        let off = |piece: &&u32| net[**piece as usize].abs() > 1e-9 * total;
        let lands = |node: usize| entering[node] != 0.0;
        let Some(first) = (0..entering.len()).find(|&node| lands(node) && off(&&projector.piece[node]))
        else {
            return Ok(());
        };
        let piece = projector.piece[first];
        let second = (0..entering.len())
            .find(|&node| lands(node) && projector.piece[node] != piece && off(&&projector.piece[node]));
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
        let outside_v = potential[branches.copper_nodes..].to_vec();
        Solution {
            jx,
            jy,
            verticals: currents[branches.faces()..].to_vec(),
            potential_v: potentials,
            outside_v,
            sheet_impedance_ohm: impedance,
            residual,
            steps,
        }
    }
}
