//! A lay ready to be solved at any frequency: the cells it is put on, and its maps.

use super::compose::{Faces, lay_cells_over, refined};
use super::lay::Lay;
use super::parts::labels;
use super::source::Source;
use super::stack::Stack;
use super::stage::{Misfit, Stage, View, Voids, lay_grid, plane_cells, plane_on};
use super::survey::{self, Choice, Survey, chart_without_track};
use super::track::partial_inductance_h;
use super::wiring::Entered;
use super::workshop::{PlaneMaps, Workshop};
use super::{JointCurrent, ReturnMap, complaint};
use crate::diag::Diagnostic;
use crate::geom::Grid;
use crate::plan::{ChartPlan, End, PathPlan};
use crate::review::{Band, Model};
use crate::sheet::{Drive, Labels, OperatingPoint, Solution, SolveFailure};
use num_complex::Complex64;
use std::sync::{Arc, Mutex, PoisonError};

/// How often the cell is halved where it cannot stand for the copper.
const HALVINGS: usize = 2;
/// Least current of a joint that is told, in A per A.
const LEAST_JOINT: f64 = 1e-3;

/// A lay of a path on the bench.
pub struct LayBench<'w, 'a> {
    workshop: &'w Workshop<'a>,
    lay: Lay<'w>,
    pub(super) source: Source<'w>,
    /// What a solve takes at the frequencies asked, with the survey that says so; one entry without a survey where the
    /// whole is always solved.
    asked: Vec<(f64, Surveyed)>,
    notes: Mutex<Vec<Diagnostic>>,
    /// Cells of planes on whole boards: index of the chart, grid, cells.
    planes: Mutex<Vec<PlaneCells>>,
}

/// What a solve takes at a frequency and the survey that says so, or why it cannot be had.
type Surveyed = Result<(Choice, Option<Survey>), Diagnostic>;
/// Index of a chart, a grid, and which of its cells are copper.
type PlaneCells = (usize, Grid, Arc<Vec<bool>>);

/// Maps of a lay at one frequency: index of the chart and its maps.
pub struct LaySolved {
    pub planes: Vec<(usize, PlaneMaps)>,
    pub joints: Vec<JointCurrent>,
}

/// What a solve takes, for a caller that solves itself: any other frequency of the same view, other drives, a family.
#[derive(Clone, Debug)]
pub struct Setup {
    /// Copper on cells with its prepared system.
    pub stage: Arc<Stage>,
    /// The track and the entries.
    pub drive: Drive,
    /// Frequency and sheet impedances.
    pub point: OperatingPoint,
    /// Impedance of the track alone in ohm; the loop's is this and the sheets'.
    pub track_ohm: Complex64,
    /// Part of the return that is left out.
    pub left_out: f64,
}

/// Maps with and without voids of each chart, what joints carry, and what each void adds to the loop.
struct Mapped {
    maps: Vec<(ReturnMap, ReturnMap)>,
    joints: Vec<JointCurrent>,
    parts: Option<Vec<Complex64>>,
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

/// A frequency with what depends on it alone.
struct Moment<'b> {
    band: &'b Band,
    frequency_hz: f64,
    stack: Stack,
    track_ohm: Complex64,
}

impl<'w, 'a> LayBench<'w, 'a> {
    fn empty(workshop: &'w Workshop<'a>, lay: Lay<'w>) -> Self {
        let source = Source::new(workshop.board, &lay.plane_layer, lay.legs);
        let (notes, planes) = (Mutex::new(Vec::new()), Mutex::new(Vec::new()));
        Self { workshop, lay, source, asked: Vec::new(), notes, planes }
    }

    /// Finds the cells for a lay that is always solved as a whole.
    pub fn whole(workshop: &'w Workshop<'a>, lay: Lay<'w>) -> Result<Self, Diagnostic> {
        let mut bench = Self::empty(workshop, lay);
        let view = bench.whole_view();
        let (view, pair) = bench.fitted(&view, &bench.stack(0.0))?;
        bench.note(complaint::mended(&bench.lay, &pair.kept.0));
        bench.asked = vec![(0.0, Ok((Choice { view, left_out: 0.0 }, None)))];
        Ok(bench)
    }

    /// Surveys a lay at the frequencies of the plan; adds charts for planes that carry return without a stretch of the
    /// track over them.
    pub fn surveyed(
        workshop: &'w Workshop<'a>,
        lay: Lay<'w>,
        path: &PathPlan,
        charts: &mut Vec<ChartPlan>,
    ) -> Self {
        let mut bench = Self::empty(workshop, lay);
        let mut frequencies: Vec<f64> =
            workshop.plan.bands.iter().flat_map(|band| band.at_hz.iter().copied()).collect();
        frequencies.sort_by(f64::total_cmp);
        frequencies.dedup();
        if frequencies.is_empty() {
            let choice = Choice { view: bench.whole_view(), left_out: 0.0 };
            bench.asked = vec![(0.0, Ok((choice, None)))];
            return bench;
        }
        let surveys: Vec<(f64, Result<Survey, Diagnostic>)> =
            frequencies.into_iter().map(|hertz| (hertz, bench.survey(hertz))).collect();
        let mut found: Vec<super::PlaneId> = surveys
            .iter()
            .filter_map(|(_, survey)| survey.as_ref().ok())
            .flat_map(|survey| survey.planes(workshop.board))
            .collect();
        found.sort();
        found.dedup();
        for plane in found {
            if charts.iter().any(|chart| chart.plane == plane) {
                continue;
            }
            let chart = chart_without_track(workshop.board, path, &bench.lay.charts[0].1, plane);
            bench.lay.charts.push((charts.len(), chart.clone()));
            charts.push(chart);
        }
        let layers: Vec<usize> = bench.lay.layers.iter().map(|conductor| conductor.layer).collect();
        let asked = surveys.into_iter().map(|(hertz, survey)| {
            let choice = survey.map(|survey| {
                let zs = layers.iter().map(|&layer| bench.source.foil(layer).zs_ohm(hertz).norm());
                let choice = match workshop.windows {
                    true => survey.choose(&bench.lay, zs.fold(f64::INFINITY, f64::min)),
                    false => Choice { view: bench.whole_view(), left_out: 0.0 },
                };
                (choice, Some(survey))
            });
            (hertz, choice)
        });
        bench.asked = asked.collect();
        bench
    }

    /// All layers on the plan's cells over the whole board.
    fn whole_view(&self) -> View {
        let layers = self.lay.layers.iter().map(|conductor| conductor.layer).collect();
        View { cell_m: self.lay.cell_m, window: None, layers, lenient: false }
    }

    /// Indices of the charts that it serves.
    pub fn charts(&self) -> Vec<usize> {
        self.lay.charts.iter().map(|(index, _)| *index).collect()
    }

    /// What was assumed so far.
    pub fn notes(&self) -> Vec<Diagnostic> {
        self.notes.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }

    fn note(&self, messages: impl IntoIterator<Item = Diagnostic>) {
        let mut notes = self.notes.lock().unwrap_or_else(PoisonError::into_inner);
        for message in messages {
            if !notes.contains(&message) {
                notes.push(message);
            }
        }
    }

    /// A cheap solve on coarse cells, or on less coarse ones where those do not hold the path.
    fn survey(&self, frequency_hz: f64) -> Result<Survey, Diagnostic> {
        // One stack for all surveys, so that they share what is prepared.
        let stack = Stack::new(&self.workshop.board.stackup, 0.0);
        let on_cells = |cell_m: f64| {
            let view = View { cell_m, lenient: true, ..self.whole_view() };
            let workshop = self.workshop;
            let stage = workshop.stages.get(workshop.board, &self.lay, &view, &stack, Voids::Kept);
            let stage = stage.map_err(|place| complaint::too_coarse(&self.lay, place))?;
            let entered = self.enter(&stage)?;
            let stage = (stage, entered);
            let solution = self.solution(&stage, &stack, frequency_hz, survey::TOLERANCE);
            let solution = solution.map_err(|failure| {
                complaint::failed(workshop.board, &self.lay, &failure, &named(frequency_hz))
            })?;
            Ok(Survey::new(frequency_hz, stage.0, solution))
        };
        on_cells(survey::COARSER * self.lay.cell_m)
            .or_else(|_: Diagnostic| on_cells(0.5 * survey::COARSER * self.lay.cell_m))
    }

    /// What a solve takes at a frequency: as surveyed there, or at the nearest frequency surveyed.
    fn choice(&self, frequency_hz: f64) -> Result<&(Choice, Option<Survey>), Diagnostic> {
        let away = |hertz: f64| libm::fabs(libm::log(hertz.max(1.0)) - libm::log(frequency_hz.max(1.0)));
        let nearest = self.asked.iter().min_by(|a, b| away(a.0).total_cmp(&away(b.0)));
        match nearest {
            Some((_, Ok(choice))) => Ok(choice),
            Some((_, Err(reason))) => Err(reason.clone()),
            None => Err(complaint::not_surveyed(&self.lay)),
        }
    }

    /// Puts the copper on the cells of a view, or on smaller ones where those cannot stand for it.
    fn fitted(&self, view: &View, stack: &Stack) -> Result<(View, Pair), Diagnostic> {
        let mut view = view.clone();
        for halving in 0..=HALVINGS {
            match self.pair(&view, stack) {
                Ok(pair) => {
                    if halving > 0 {
                        self.note([complaint::halved(&self.lay, view.cell_m, halving)]);
                    }
                    return Ok((view, pair));
                }
                Err(Unfit::Other(reason)) => return Err(*reason),
                Err(Unfit::Coarse(place)) if halving == HALVINGS => {
                    return Err(complaint::too_coarse(&self.lay, place));
                }
                Err(Unfit::Coarse(_)) => view.cell_m *= 0.5,
            }
        }
        // the last round of the loop always returns
        Err(complaint::not_surveyed(&self.lay))
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

    /// The copper as it is, in the view of a solve at a frequency but on twice its cells where those can stand for it,
    /// and the currents that enter.
    pub(super) fn coarsest(&self, stack: &Stack, frequency_hz: f64) -> Option<(Arc<Stage>, Entered)> {
        let view = &self.choice(frequency_hz).ok()?.0.view;
        let coarse = View { cell_m: 2.0 * view.cell_m, ..view.clone() };
        let pair = self.pair(&coarse, stack).or_else(|_| self.pair(view, stack));
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

    /// What a solve with voids takes at a frequency.
    pub fn at(&self, frequency_hz: f64) -> Result<Setup, Diagnostic> {
        let (choice, _) = self.choice(frequency_hz)?;
        let stack = self.stack(frequency_hz);
        let (_, pair) = self.fitted(&choice.view, &stack)?;
        let (drive, point) = self.drive(&pair.kept, &stack, frequency_hz);
        let track_ohm = self.track_impedance_ohm(&stack, frequency_hz);
        Ok(Setup { stage: pair.kept.0, drive, point, track_ohm, left_out: choice.left_out })
    }

    /// Solves at one frequency of a band.
    pub fn solve(&self, band: &Band, frequency_hz: f64) -> Result<LaySolved, Diagnostic> {
        let (choice, survey) = self.choice(frequency_hz)?;
        let survey = survey.as_ref();
        let stack = self.stack(frequency_hz);
        let track_ohm = self.track_impedance_ohm(&stack, frequency_hz);
        let moment = Moment { band, frequency_hz, stack, track_ohm };
        let (view, fine) = self.fitted(&choice.view, &moment.stack)?;
        // A second solve that cannot be had leaves the error to the bound; it withholds nothing.
        let coarse = self.pair(&View { cell_m: 2.0 * view.cell_m, ..view }, &moment.stack).ok();
        let fine = self.maps(&fine, &moment, survey, true)?;
        let coarse = coarse.map(|pair| self.maps(&pair, &moment, survey, false)).transpose()?;
        let mut coarse = coarse.map(|coarse| coarse.maps.into_iter());
        let parts = self.parts_by_chart(fine.parts);
        let planes = fine.maps.into_iter().zip(&self.lay.charts).zip(parts);
        let plane = |(((map, without_voids), (index, _)), void_parts): ((_, &(usize, _)), _)| {
            let coarse = coarse.as_mut().and_then(Iterator::next);
            (*index, PlaneMaps { map, without_voids, coarse, void_parts, left_out: choice.left_out })
        };
        Ok(LaySolved { planes: planes.map(plane).collect(), joints: fine.joints })
    }

    /// Solves with and without voids; with the parts of the voids where asked.
    fn maps(
        &self,
        pair: &Pair,
        moment: &Moment,
        survey: Option<&Survey>,
        with_parts: bool,
    ) -> Result<Mapped, Diagnostic> {
        let solve = |stage: &(Arc<Stage>, Entered)| {
            let tolerance = self.workshop.tolerance;
            let solution = self.solution(stage, &moment.stack, moment.frequency_hz, tolerance);
            solution
                .map_err(|failure| complaint::failed(self.workshop.board, &self.lay, &failure, moment.band))
        };
        let (kept, filled) = if Arc::ptr_eq(&pair.kept.0, &pair.filled.0) {
            (solve(&pair.kept)?, None)
        } else {
            let (kept, filled) = rayon::join(|| solve(&pair.kept), || solve(&pair.filled));
            (kept?, Some(filled?))
        };
        let of = |stage: &Stage, solution: &Solution| {
            let charts = self.lay.charts.iter();
            charts.map(|chart| self.map(moment, stage, solution, survey, chart)).collect::<Vec<ReturnMap>>()
        };
        let with = of(&pair.kept.0, &kept);
        let without = filled.as_ref().map_or_else(|| with.clone(), |filled| of(&pair.filled.0, filled));
        let joints = self.joint_currents(&pair.kept.0, &kept, survey);
        let parts = filled
            .filter(|_| with_parts)
            .and_then(|filled| self.void_parts(pair, &moment.stack, moment.frequency_hz, &kept, &filled));
        Ok(Mapped { maps: with.into_iter().zip(without).collect(), joints, parts })
    }

    fn drive(
        &self,
        (stage, entered): &(Arc<Stage>, Entered),
        stack: &Stack,
        frequency_hz: f64,
    ) -> (Drive, OperatingPoint) {
        let strips = self.source.strips(stack, frequency_hz);
        let drive = Drive { strips, injections: entered.injections.clone() };
        let zs = |sheet: &super::stage::StagedSheet| self.source.foil(sheet.layer).zs_ohm(frequency_hz);
        let point = OperatingPoint { frequency_hz, zs_ohm: stage.sheets.iter().map(zs).collect() };
        (drive, point)
    }

    fn solution(
        &self,
        stage: &(Arc<Stage>, Entered),
        stack: &Stack,
        frequency_hz: f64,
        tolerance: f64,
    ) -> Result<Solution, SolveFailure> {
        let (drive, point) = self.drive(stage, stack, frequency_hz);
        stage.0.system()?.solve(&drive, &point, tolerance)
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
        let (drive, point) = self.drive(&pair.filled, stack, frequency_hz);
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

    /// The currents of one plane, over the whole of it.
    fn map(
        &self,
        moment: &Moment,
        stage: &Stage,
        solution: &Solution,
        survey: Option<&Survey>,
        (index, chart): &(usize, ChartPlan),
    ) -> ReturnMap {
        let frequency_hz = moment.frequency_hz;
        let layer = chart.plane.layer;
        let whole = lay_grid(self.workshop.board, &self.lay, stage.grid.cell_m);
        let solved = self.plane(stage, solution, chart);
        let (copper, faces) = match (solved, survey) {
            (Some((copper, faces)), None) => (copper, faces),
            (Some((copper, faces)), _) if faces.grid == whole => (copper, faces),
            (solved, survey) => self.filled_in(*index, chart, &whole, solved, survey),
        };
        let first = self.lay.first_leg;
        let legs = chart.legs.start.saturating_sub(first)..chart.legs.end.saturating_sub(first);
        ReturnMap {
            net: self.lay.name.to_owned(),
            plane: chart.plane.clone(),
            band: moment.band.name.clone(),
            frequency_hz,
            grid: faces.grid,
            copper,
            jx: faces.jx,
            jy: faces.jy,
            model: Model::Sheet,
            height_m: self.source.mean_height_m(layer, frequency_hz, legs),
            width_m: self.source.mean_width_m(),
            zs_ohm: Some(self.source.foil(layer).zs_ohm(frequency_hz)),
            residual: Some(solution.residual),
            loop_impedance_ohm: Some(moment.track_ohm + solution.sheet_impedance_ohm),
            band_density: None,
        }
    }

    /// Cells and currents of a plane on a stage; none where its layer is not there.
    fn plane(&self, stage: &Stage, solution: &Solution, chart: &ChartPlan) -> Option<(Vec<bool>, Faces)> {
        let index = stage.sheets.iter().position(|sheet| sheet.layer == chart.plane.layer)?;
        let copper = plane_cells(self.workshop.board, &self.lay, &stage.sheets[index], chart);
        let (mut jx, mut jy) = (solution.jx[index].clone(), solution.jy[index].clone());
        keep_faces(&copper, stage.grid.nx, &mut jx, &mut jy);
        Some((copper, Faces { grid: stage.grid, jx, jy }))
    }

    /// A plane on the cells of the whole board, from the survey where it was not solved.
    fn filled_in(
        &self,
        index: usize,
        chart: &ChartPlan,
        whole: &Grid,
        solved: Option<(Vec<bool>, Faces)>,
        survey: Option<&Survey>,
    ) -> (Vec<bool>, Faces) {
        let mut copper = self.cells_of(index, chart, whole).as_ref().clone();
        let coarse = survey.and_then(|survey| self.plane(&survey.stage, &survey.solution, chart));
        let mut faces = match coarse {
            Some((_, coarse)) => refined(&coarse.grid, &coarse.jx, &coarse.jy, whole),
            None => refined(whole, &[], &[], whole),
        };
        if let Some((cells, part)) = solved {
            faces.lay_over(&part);
            lay_cells_over(whole, &mut copper, &part.grid, &cells);
        }
        keep_faces(&copper, whole.nx, &mut faces.jx, &mut faces.jy);
        (copper, faces)
    }

    fn cells_of(&self, index: usize, chart: &ChartPlan, grid: &Grid) -> Arc<Vec<bool>> {
        let mut planes = self.planes.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some((_, _, cells)) = planes.iter().find(|(known, on, _)| *known == index && on == grid) {
            return Arc::clone(cells);
        }
        let cells = Arc::new(plane_on(self.workshop.board, chart, grid));
        planes.push((index, *grid, Arc::clone(&cells)));
        cells
    }

    /// What joints carry, from the survey where they are not in the solve.
    fn joint_currents(
        &self,
        stage: &Stage,
        solution: &Solution,
        survey: Option<&Survey>,
    ) -> Vec<JointCurrent> {
        let layer = |end: &End| match end {
            End::Copper { layer, .. } => Some(*layer),
            End::Node(_) => None,
        };
        let mut currents = vec![None; self.lay.joints.len()];
        if let Some(survey) = survey {
            let coarse = survey.stage.wiring.joints.iter().zip(&survey.solution.verticals);
            coarse.for_each(|(&index, current)| currents[index] = Some(*current));
        }
        let fine = stage.wiring.joints.iter().zip(&solution.verticals);
        fine.for_each(|(&index, current)| currents[index] = Some(*current));
        let all = self.lay.joints.iter().zip(currents);
        let told =
            all.filter_map(|(joint, current)| Some((joint, current.filter(|i| i.norm() >= LEAST_JOINT)?)));
        told.map(|(joint, current)| JointCurrent {
            what: joint.what.clone(),
            kind: joint.kind,
            at: joint.at,
            layers: [layer(&joint.from), layer(&joint.to)],
            current,
        })
        .collect()
    }
}

/// A band of one frequency, for messages.
fn named(frequency_hz: f64) -> Band {
    let name = crate::unit::quantity_text(frequency_hz, "Hz");
    Band { name, at_hz: vec![frequency_hz], ..Band::default() }
}

/// Takes away the currents through faces that do not lie between two cells of `copper`.
fn keep_faces(copper: &[bool], nx: usize, jx: &mut [Complex64], jy: &mut [Complex64]) {
    let ny = copper.len() / nx;
    for iy in 0..ny {
        for ix in 0..=nx {
            let left = ix > 0 && copper[iy * nx + ix - 1];
            let right = ix < nx && copper[iy * nx + ix];
            if !left || !right {
                jx[iy * (nx + 1) + ix] = Complex64::default();
            }
        }
    }
    for iy in 0..=ny {
        for ix in 0..nx {
            let below = iy > 0 && copper[(iy - 1) * nx + ix];
            let above = iy < ny && copper[iy * nx + ix];
            if !below || !above {
                jy[iy * nx + ix] = Complex64::default();
            }
        }
    }
}
