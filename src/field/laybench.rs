//! A lay ready to be solved at any frequency: the cells it is put on, and its maps.

use super::lay::Lay;
use super::parts::labels;
use super::source::Source;
use super::stack::Stack;
use super::stage::{Misfit, Stage, View, Voids, plane_cells};
use super::track::partial_inductance_h;
use super::wiring::Entered;
use super::workshop::{PlaneMaps, Workshop};
use super::{JointCurrent, ReturnMap, complaint};
use crate::diag::Diagnostic;
use crate::plan::{ChartPlan, End};
use crate::review::{Band, Model};
use crate::sheet::{Drive, Labels, OperatingPoint, Solution};
use num_complex::Complex64;
use std::sync::Arc;

/// How often the cell is halved where it cannot stand for the copper.
const HALVINGS: usize = 2;
/// Least current of a joint that is told, in A per A.
const LEAST_JOINT: f64 = 1e-3;

/// A lay of a path on the bench.
pub struct LayBench<'w, 'a> {
    workshop: &'w Workshop<'a>,
    lay: Lay<'w>,
    pub(super) source: Source<'w>,
    /// The cells that stand for its copper, and whether they can be twice as large.
    view: View,
    notes: Vec<Diagnostic>,
}

/// Maps of a lay at one frequency: index of the chart and its maps.
pub struct LaySolved {
    pub planes: Vec<(usize, PlaneMaps)>,
    pub joints: Vec<JointCurrent>,
}

/// Copper on cells with and without voids, and the currents that enter it.
struct Pair {
    kept: (Arc<Stage>, Entered),
    filled: (Arc<Stage>, Entered),
}

/// Why copper cannot be put on cells of a given size.
enum Unfit {
    Coarse(Misfit),
    Other(Box<Diagnostic>),
}

impl<'w, 'a> LayBench<'w, 'a> {
    /// Finds the cells for a lay.
    pub fn new(workshop: &'w Workshop<'a>, lay: Lay<'w>) -> Result<Self, Diagnostic> {
        let source = Source::new(workshop.board, &lay.plane_layer, lay.legs);
        let layers = lay.layers.iter().map(|conductor| conductor.layer).collect();
        let view = View { cell_m: lay.cell_m, window: None, layers, lenient: false };
        let mut bench = Self { workshop, lay, source, view, notes: Vec::new() };
        bench.fit()?;
        Ok(bench)
    }

    /// Indices of the charts that it serves.
    pub fn charts(&self) -> Vec<usize> {
        self.lay.charts.iter().map(|(index, _)| *index).collect()
    }

    /// What was assumed while it was made ready.
    pub fn notes(&self) -> Vec<Diagnostic> {
        self.notes.clone()
    }

    /// Puts the copper on the plan's cells, or on smaller ones where those cannot stand for it.
    fn fit(&mut self) -> Result<(), Diagnostic> {
        let stack = self.stack(0.0);
        for halving in 0..=HALVINGS {
            match self.pair(&self.view, &stack) {
                Ok(pair) => {
                    if halving > 0 {
                        self.notes.push(complaint::halved(&self.lay, self.view.cell_m));
                    }
                    self.notes.extend(complaint::mended(self.workshop.board, &self.lay, &pair.kept.0));
                    return Ok(());
                }
                Err(Unfit::Other(reason)) => return Err(*reason),
                Err(Unfit::Coarse(place)) if halving == HALVINGS => {
                    return Err(complaint::too_coarse(self.workshop.board, &self.lay, place));
                }
                Err(Unfit::Coarse(_)) => self.view.cell_m *= 0.5,
            }
        }
        Ok(())
    }

    pub(super) fn stack(&self, frequency_hz: f64) -> Stack {
        Stack::new(&self.workshop.board.stackup, self.source.stack_part(frequency_hz))
    }

    fn pair(&self, view: &View, stack: &Stack) -> Result<Pair, Unfit> {
        let stage = |voids| {
            let workshop = self.workshop;
            let stage = workshop.stages.get(workshop.board, &self.lay, view, stack, voids);
            let stage = stage.map_err(Unfit::Coarse)?;
            let entered = self.enter(&stage).map_err(|reason| Unfit::Other(Box::new(reason)))?;
            Ok((stage, entered))
        };
        Ok(Pair { kept: stage(Voids::Kept)?, filled: stage(Voids::Filled)? })
    }

    /// The copper as it is on the largest cells that can stand for it, and the currents that enter.
    pub(super) fn coarsest(&self, stack: &Stack) -> Option<(Arc<Stage>, Entered)> {
        let coarse = View { cell_m: 2.0 * self.view.cell_m, ..self.view.clone() };
        let pair = self.pair(&coarse, stack).or_else(|_| self.pair(&self.view, stack));
        pair.ok().map(|pair| pair.kept)
    }

    fn enter(&self, stage: &Stage) -> Result<Entered, Diagnostic> {
        let entered = stage.wiring.enter(&self.lay, &stage.sheets);
        let entered =
            entered.map_err(|index| complaint::off_copper(self.workshop.board, &self.lay, index))?;
        if self.lay.single && entered.islands.windows(2).any(|pair| pair[0] != pair[1]) {
            return Err(complaint::landings_apart(&self.lay));
        }
        Ok(entered)
    }

    /// Solves at one frequency of a band.
    pub fn solve(&self, band: &Band, frequency_hz: f64) -> Result<LaySolved, Diagnostic> {
        let stack = self.stack(frequency_hz);
        let fits = |view: &View| match self.pair(view, &stack) {
            Ok(pair) => Ok(pair),
            Err(Unfit::Other(reason)) => Err(*reason),
            Err(Unfit::Coarse(place)) => Err(complaint::too_coarse(self.workshop.board, &self.lay, place)),
        };
        let fine = fits(&self.view)?;
        // A second solve that cannot be had leaves the error to the bound; it withholds nothing.
        let coarse = fits(&View { cell_m: 2.0 * self.view.cell_m, ..self.view.clone() }).ok();
        let track_ohm = self.track_impedance_ohm(&stack, frequency_hz);
        let solve = |stage: &(Arc<Stage>, Entered)| {
            let solution = self.solution(stage, &stack, frequency_hz);
            solution.map_err(|failure| complaint::failed(self.workshop.board, &self.lay, &failure, band))
        };
        let both = |pair: &Pair| {
            if Arc::ptr_eq(&pair.kept.0, &pair.filled.0) {
                return solve(&pair.kept).map(|solution| (solution, None));
            }
            let (kept, filled) = rayon::join(|| solve(&pair.kept), || solve(&pair.filled));
            Ok((kept?, Some(filled?)))
        };
        let maps = |pair: &Pair, kept: &Solution, filled: Option<&Solution>| {
            let of = |stage: &Stage, solution: &Solution| {
                let map = |(_, chart): &(usize, ChartPlan)| {
                    self.map(band, frequency_hz, stage, solution, track_ohm, chart)
                };
                self.lay.charts.iter().map(map).collect::<Vec<ReturnMap>>()
            };
            let with = of(&pair.kept.0, kept);
            let without = filled.map_or_else(|| with.clone(), |filled| of(&pair.filled.0, filled));
            with.into_iter().zip(without).collect::<Vec<_>>()
        };
        let (kept, filled) = both(&fine)?;
        let fine_maps = maps(&fine, &kept, filled.as_ref());
        let joints = self.joint_currents(&fine.kept.0, &kept);
        let parts = filled.and_then(|filled| self.void_parts(&fine, &stack, frequency_hz, &kept, &filled));
        drop(kept);
        let mut coarse_maps = match &coarse {
            Some(pair) => {
                let (kept, filled) = both(pair)?;
                maps(pair, &kept, filled.as_ref()).into_iter().map(Some).collect()
            }
            None => vec![None; fine_maps.len()],
        };
        let mut of_chart = self.parts_by_chart(parts);
        let rest = coarse_maps.iter_mut().zip(&mut of_chart);
        let planes = fine_maps.into_iter().zip(&self.lay.charts).zip(rest);
        let plane = |(((map, without_voids), (index, _)), (coarse, parts)): (
            (_, &(usize, _)),
            (&mut Option<_>, &mut Option<_>),
        )| {
            (*index, PlaneMaps { map, without_voids, coarse: coarse.take(), void_parts: parts.take() })
        };
        Ok(LaySolved { planes: planes.map(plane).collect(), joints })
    }

    fn solution(
        &self,
        prepared: &(Arc<Stage>, Entered),
        stack: &Stack,
        frequency_hz: f64,
    ) -> Result<Solution, crate::sheet::SolveFailure> {
        let (drive, point) = self.asked(prepared, stack, frequency_hz);
        prepared.0.system()?.solve(&drive, &point, self.workshop.tolerance)
    }

    /// What drives the sheets, and the point at which they are solved.
    fn asked(
        &self,
        (stage, entered): &(Arc<Stage>, Entered),
        stack: &Stack,
        frequency_hz: f64,
    ) -> (Drive, OperatingPoint) {
        let drive =
            Drive { strips: self.source.strips(stack, frequency_hz), injections: entered.injections.clone() };
        let zs = |sheet: &super::stage::StagedSheet| self.source.foil(sheet.layer).zs_ohm(frequency_hz);
        (drive, OperatingPoint { frequency_hz, zs_ohm: stage.sheets.iter().map(zs).collect() })
    }

    /// The loop impedance less that without voids, divided among the voids of all charts, with the rest behind them.
    fn void_parts(
        &self,
        pair: &Pair,
        stack: &Stack,
        frequency_hz: f64,
        kept: &Solution,
        filled: &Solution,
    ) -> Option<Vec<Complex64>> {
        let stage = &pair.filled.0;
        let (drive, point) = self.asked(&pair.filled, stack, frequency_hz);
        let system = stage.system().ok()?;
        let drive = system.prepare(&drive).ok()?;
        let (of_cells, count) = labels(&self.lay, stage);
        let of_kept = &pair.kept.0.wiring.joints;
        let same = |joint: &usize| of_kept.iter().position(|known| known == joint);
        let same_vertical: Vec<Option<usize>> = stage.wiring.joints.iter().map(same).collect();
        let labels = Labels { of_cells: &of_cells, count, same_vertical: &same_vertical };
        system.extra_impedance_parts(kept, filled, &drive, &point, &labels).ok()
    }

    /// The parts of each chart's voids; what belongs to none of them is the last.
    fn parts_by_chart(&self, parts: Option<Vec<Complex64>>) -> Vec<Option<Vec<Complex64>>> {
        let Some(parts) = parts else { return vec![None; self.lay.charts.len()] };
        let total: Complex64 = parts.iter().sum();
        let mut first = 0;
        let mut of_chart = Vec::with_capacity(self.lay.charts.len());
        for (_, chart) in &self.lay.charts {
            let mut own = parts[first..first + chart.voids.len()].to_vec();
            first += chart.voids.len();
            own.push(total - own.iter().sum::<Complex64>());
            of_chart.push(Some(own));
        }
        of_chart
    }

    fn track_impedance_ohm(&self, stack: &Stack, frequency_hz: f64) -> Complex64 {
        let inductance_h = partial_inductance_h(&self.source.runs(stack, frequency_hz));
        let omega = std::f64::consts::TAU * frequency_hz;
        Complex64::new(self.source.resistance_ohm(frequency_hz), omega * inductance_h)
    }

    /// The currents of one plane.
    fn map(
        &self,
        band: &Band,
        frequency_hz: f64,
        stage: &Stage,
        solution: &Solution,
        track_ohm: Complex64,
        chart: &ChartPlan,
    ) -> ReturnMap {
        let layer = chart.plane.layer;
        let grid = stage.grid;
        let (nx, ny) = (grid.nx, grid.ny);
        let (copper, jx, jy) = match stage.sheets.iter().position(|sheet| sheet.layer == layer) {
            Some(index) => {
                let copper = plane_cells(self.workshop.board, &self.lay, &stage.sheets[index], chart);
                let (mut jx, mut jy) = (solution.jx[index].clone(), solution.jy[index].clone());
                keep_faces(&copper, nx, &mut jx, &mut jy);
                (copper, jx, jy)
            }
            None => {
                let zero = Complex64::default();
                (vec![false; grid.len()], vec![zero; (nx + 1) * ny], vec![zero; nx * (ny + 1)])
            }
        };
        let first = self.lay.first_leg;
        let legs = chart.legs.start.saturating_sub(first)..chart.legs.end.saturating_sub(first);
        ReturnMap {
            net: self.lay.name.to_owned(),
            plane: chart.plane.clone(),
            band: band.name.clone(),
            frequency_hz,
            grid,
            copper,
            jx,
            jy,
            model: Model::Sheet,
            height_m: self.source.mean_height_m(layer, frequency_hz, legs),
            width_m: self.source.mean_width_m(),
            zs_ohm: Some(self.source.foil(layer).zs_ohm(frequency_hz)),
            residual: Some(solution.residual),
            loop_impedance_ohm: Some(track_ohm + solution.sheet_impedance_ohm),
            band_density: None,
        }
    }

    fn joint_currents(&self, stage: &Stage, solution: &Solution) -> Vec<JointCurrent> {
        let layer = |end: &End| match end {
            End::Copper { layer, .. } => Some(*layer),
            End::Node(_) => None,
        };
        let currents = stage.wiring.joints.iter().zip(&solution.verticals);
        let told = currents.filter(|(_, current)| current.norm() >= LEAST_JOINT);
        told.map(|(&index, &current)| {
            let joint = &self.lay.joints[index];
            JointCurrent {
                what: joint.what.clone(),
                kind: joint.kind,
                at: joint.at,
                layers: [layer(&joint.from), layer(&joint.to)],
                current,
            }
        })
        .collect()
    }
}

/// Takes away the currents through faces that touch no cell of `copper`.
fn keep_faces(copper: &[bool], nx: usize, jx: &mut [Complex64], jy: &mut [Complex64]) {
    let ny = copper.len() / nx;
    for iy in 0..ny {
        for ix in 0..=nx {
            let left = ix > 0 && copper[iy * nx + ix - 1];
            let right = ix < nx && copper[iy * nx + ix];
            if !left && !right {
                jx[iy * (nx + 1) + ix] = Complex64::default();
            }
        }
    }
    for iy in 0..=ny {
        for ix in 0..nx {
            let below = iy > 0 && copper[(iy - 1) * nx + ix];
            let above = iy < ny && copper[iy * nx + ix];
            if !below && !above {
                jy[iy * nx + ix] = Complex64::default();
            }
        }
    }
}
