//! From a path of the plan to solved maps, sharing prepared copper between paths.

use super::lay::Lay;
use super::laybench::{LayBench, Setup};
use super::spread::{SpreadLeg, face_currents};
use super::stage::Stages;
use super::{JointCurrent, ReturnMap};
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::plan::{ChartPlan, Joint, PathPlan, Plan};
use crate::review::{Band, Model};
use num_complex::Complex64;

/// Relative residual to which maps are solved unless asked otherwise.
pub const TOLERANCE: f64 = 1e-5;

/// Solves paths of one board. May be shared between threads.
#[derive(Debug)]
pub struct Workshop<'a> {
    pub(super) board: &'a Board,
    pub(super) plan: &'a Plan,
    /// Joints of the conductors and of all paths, each once: a part's inside is there whatever path is charted.
    pub(super) joints: Vec<Joint>,
    pub(super) model: Model,
    pub(super) tolerance: f64,
    /// Whether only what matters near a path is solved finely.
    pub(super) windows: bool,
    pub(super) stages: Stages,
}

/// Everything solved of one path at one frequency.
#[derive(Clone, Debug)]
pub struct Solved {
    /// Maps of each chart of the bench, in its order, or why there are none.
    pub planes: Vec<Result<PlaneMaps, Diagnostic>>,
    /// What joints carry, those of at least a thousandth of the driver's current, in the order of the plan.
    pub joints: Vec<JointCurrent>,
}

/// Maps of one path on one plane at one frequency.
#[derive(Clone, Debug)]
pub struct PlaneMaps {
    /// The map.
    pub map: ReturnMap,
    /// The same with the voids of the charted planes filled.
    pub without_voids: ReturnMap,
    /// Both on cells of twice the size; none where those cannot stand for the copper.
    pub coarse: Option<(ReturnMap, ReturnMap)>,
    /// Loop impedance less that without voids, in ohm, divided among the voids of the chart, with the rest behind them;
    /// none where both are the same or the model does not tell.
    pub void_parts: Option<Vec<Complex64>>,
    /// Part of the return that was left out of the solve: layers that carry little, and what flows off its window.
    pub left_out: f64,
}

/// What a path has done so far.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Progress<'a> {
    /// Path.
    pub net: &'a str,
    /// Name of the band.
    pub band: &'a str,
    /// Frequencies done.
    pub done: usize,
    /// Frequencies in all.
    pub total: usize,
}

/// A path ready to be solved at any frequency.
pub struct Bench<'w, 'a> {
    workshop: &'w Workshop<'a>,
    path: &'w PathPlan,
    charts: Vec<ChartPlan>,
    pub(super) lays: Vec<Result<LayBench<'w, 'a>, (Vec<usize>, Diagnostic)>>,
}

impl<'a> Workshop<'a> {
    /// A workshop for `board` and its `plan` that uses `model`.
    pub fn new(board: &'a Board, plan: &'a Plan, model: Model) -> Self {
        let mut joints: Vec<Joint> = Vec::new();
        let of_paths = plan.paths.iter().flat_map(|path| &path.joints);
        for joint in plan.conductors.joints.iter().chain(of_paths) {
            if !joints.contains(joint) {
                joints.push(joint.clone());
            }
        }
        Self { board, plan, joints, model, tolerance: TOLERANCE, windows: true, stages: Stages::default() }
    }

    /// The same with another relative residual for the sheet model.
    pub fn with_tolerance(mut self, tolerance: f64) -> Self {
        self.tolerance = tolerance;
        self
    }

    /// The same with every path solved on the whole board with all its layers, which takes long.
    pub fn with_whole_boards(mut self) -> Self {
        self.windows = false;
        self
    }

    /// Makes a path ready: puts its copper on cells and finds what it is charted on.
    pub fn bench<'w>(&'w self, path: &'w PathPlan) -> Bench<'w, 'a> {
        let charts = distinct(path);
        let mut bench = Bench { workshop: self, path, charts, lays: Vec::new() };
        if self.model == Model::Sheet {
            let lays = Lay::of_path(self.board, &self.plan.conductors, &self.joints, path, &bench.charts);
            for lay in lays {
                let charts = lay.charts.iter().map(|(index, _)| *index).collect();
                bench.lays.push(match lay.single {
                    true => LayBench::whole(self, lay).map_err(|reason| (charts, reason)),
                    false => Ok(LayBench::surveyed(self, lay, path, &mut bench.charts)),
                });
            }
        }
        bench
    }
}

/// One chart for each plane, in the order of the track: of several on one plane that with the longest stretch, one
/// that is withheld last.
fn distinct(path: &PathPlan) -> Vec<ChartPlan> {
    let length_m = |chart: &ChartPlan| -> f64 {
        path.track[chart.legs.clone()].iter().map(|leg| leg.from.distance(leg.to)).sum()
    };
    let rank = |chart: &ChartPlan| (chart.withheld.is_none(), length_m(chart));
    let mut charts: Vec<ChartPlan> = Vec::new();
    for chart in &path.charts {
        match charts.iter_mut().find(|known| known.plane == chart.plane) {
            None => charts.push(chart.clone()),
            Some(known) if rank(chart) > rank(known) => *known = chart.clone(),
            Some(_) => {}
        }
    }
    charts
}

impl Bench<'_, '_> {
    /// What is charted: a map for each at every frequency, unless withheld. Planes that no stretch of the track lies
    /// over have no legs and landings without a radius.
    pub fn charts(&self) -> &[ChartPlan] {
        &self.charts
    }

    /// What was assumed while it was made ready.
    pub fn notes(&self) -> Vec<Diagnostic> {
        self.lays.iter().flatten().flat_map(LayBench::notes).collect()
    }

    /// What solves take at a frequency, for a caller that solves itself: prepared system, drive and operating point of
    /// each stretch that is solved alone (one for a plan with conductors). Cells, window and layers are those of the
    /// nearest frequency of the plan. Empty for the closed form.
    pub fn at(&self, frequency_hz: f64) -> Vec<Result<Setup, Diagnostic>> {
        let lay = |lay: &Result<LayBench, (Vec<usize>, Diagnostic)>| match lay {
            Ok(lay) => lay.at(frequency_hz),
            Err((_, reason)) => Err(reason.clone()),
        };
        self.lays.iter().map(lay).collect()
    }

    /// Solves at one frequency of a band.
    pub fn solve(&self, band: &Band, frequency_hz: f64) -> Solved {
        let missing = |chart: &ChartPlan| match &chart.withheld {
            Some(reason) => Err(reason.clone()),
            None => Ok(self.spread(chart, band, frequency_hz)),
        };
        if self.workshop.model == Model::Spread {
            return Solved { planes: self.charts.iter().map(missing).collect(), joints: Vec::new() };
        }
        let mut planes: Vec<Option<Result<PlaneMaps, Diagnostic>>> = vec![None; self.charts.len()];
        for (plane, chart) in planes.iter_mut().zip(&self.charts) {
            *plane = chart.withheld.clone().map(Err);
        }
        let mut joints = Vec::new();
        for lay in &self.lays {
            let failed = |planes: &mut Vec<Option<_>>, charts: &[usize], reason: &Diagnostic| {
                charts.iter().for_each(|&chart| planes[chart] = Some(Err(reason.clone())));
            };
            match lay {
                Err((charts, reason)) => failed(&mut planes, charts, reason),
                Ok(lay) => match lay.solve(band, frequency_hz) {
                    Err(reason) => failed(&mut planes, &lay.charts(), &reason),
                    Ok(solved) => {
                        for (chart, maps) in solved.planes {
                            planes[chart] = Some(Ok(maps));
                        }
                        joints.extend(solved.joints);
                    }
                },
            }
        }
        // every chart is withheld or served by one lay
        Solved { planes: planes.into_iter().flatten().collect(), joints }
    }

    fn spread(&self, chart: &ChartPlan, band: &Band, frequency_hz: f64) -> PlaneMaps {
        let board = self.workshop.board;
        let legs = &self.path.track[chart.legs.clone()];
        let map = |cell_m: f64| {
            let (grid, copper) = super::stage::cells_of_plane(board, chart, cell_m);
            let leg = |leg: &crate::plan::TrackLeg| SpreadLeg {
                from: leg.from,
                to: leg.to,
                width_m: leg.width_m,
                height_m: board.stackup.gap_m(leg.layer, chart.plane.layer),
                current: leg.current,
            };
            let (jx, jy) = face_currents(&legs.iter().map(leg).collect::<Vec<_>>(), &grid);
            ReturnMap {
                net: self.path.name.clone(),
                plane: chart.plane.clone(),
                band: band.name.clone(),
                frequency_hz,
                grid,
                copper,
                jx,
                jy,
                model: Model::Spread,
                height_m: chart.height_m,
                width_m: chart.width_m,
                zs_ohm: None,
                residual: None,
                loop_impedance_ohm: None,
                band_density: None,
            }
        };
        let (fine, coarse) = (map(chart.cell_m), map(2.0 * chart.cell_m));
        PlaneMaps {
            without_voids: fine.clone(),
            map: fine,
            coarse: Some((coarse.clone(), coarse)),
            void_parts: None,
            left_out: 0.0,
        }
    }
}
