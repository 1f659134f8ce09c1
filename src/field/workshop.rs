//! From a chart of the plan to solved maps, sharing prepared planes between nets.

use super::ReturnMap;
use super::mask::{Mask, TooCoarse};
use super::source::{Source, landing_patch};
use super::spread::{SpreadLeg, face_currents};
use super::stage::{Stage, Stages, Voids};
use super::track::partial_inductance_h;
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::field as code;
use crate::geom::Point;
use crate::plan::{ChartPlan, PathPlan};
use crate::review::{Band, Model};
use crate::sheet::{Drive, Injection, OperatingPoint, SolveFailure};
use num_complex::Complex64;
use std::sync::Arc;

/// Relative residual to which maps are solved unless asked otherwise.
pub const TOLERANCE: f64 = 1e-5;
/// How often the cell is halved where it cannot stand for the plane.
const HALVINGS: usize = 2;

/// Solves charts of one board. May be shared between threads.
#[derive(Debug)]
pub struct Workshop<'a> {
    board: &'a Board,
    model: Model,
    tolerance: f64,
    stages: Stages,
}

/// Maps of one net, plane and frequency.
#[derive(Clone, Debug)]
pub struct Solved {
    /// The map.
    pub map: ReturnMap,
    /// The same with all voids filled.
    pub without_voids: ReturnMap,
    /// Both on cells of twice the size; none where those cannot stand for the plane.
    pub coarse: Option<(ReturnMap, ReturnMap)>,
}

/// What a chart has done so far.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Progress<'a> {
    /// Net.
    pub net: &'a str,
    /// Name of the band.
    pub band: &'a str,
    /// Frequencies done.
    pub done: usize,
    /// Frequencies in all.
    pub total: usize,
}

/// A chart ready to be solved at any frequency.
pub struct Bench<'w, 'a> {
    workshop: &'w Workshop<'a>,
    net: &'w PathPlan,
    chart: &'w ChartPlan,
    source: Source<'w>,
    fine: Option<Pair>,
    coarse: Option<Pair>,
    /// What was assumed while it was made ready.
    pub notes: Vec<Diagnostic>,
}

/// A plane with and without voids, and the currents that enter it.
struct Pair {
    kept: (Arc<Stage>, Vec<Injection>),
    filled: (Arc<Stage>, Vec<Injection>),
}

impl<'a> Workshop<'a> {
    /// A workshop for `board` that uses `model`.
    pub fn new(board: &'a Board, model: Model) -> Self {
        Self { board, model, tolerance: TOLERANCE, stages: Stages::default() }
    }

    /// The same with another relative residual for the sheet model.
    pub fn with_tolerance(mut self, tolerance: f64) -> Self {
        self.tolerance = tolerance;
        self
    }

    /// Makes a chart ready: puts its plane on cells and finds its landings.
    pub fn bench<'w>(&'w self, net: &'w PathPlan, chart: &'w ChartPlan) -> Result<Bench<'w, 'a>, Diagnostic> {
        if let Some(reason) = &chart.withheld {
            return Err(reason.clone());
        }
        let source = Source::new(self.board, chart.plane.layer, &net.track[chart.legs.clone()]);
        let mut bench =
            Bench { workshop: self, net, chart, source, fine: None, coarse: None, notes: Vec::new() };
        if self.model == Model::Sheet {
            let cell_m = bench.set_up_fine()?;
            // A second solve that cannot be had leaves the error to the bound; it withholds nothing.
            bench.coarse = bench.pair(2.0 * cell_m).ok();
        }
        Ok(bench)
    }
}

/// Why a plane cannot be put on cells of a given size.
enum Misfit {
    Coarse(TooCoarse),
    Other(Box<Diagnostic>),
}

impl Bench<'_, '_> {
    /// Solves at one frequency of a band.
    pub fn solve(&self, band: &Band, frequency_hz: f64) -> Result<Solved, Diagnostic> {
        let Some(fine) = &self.fine else { return Ok(self.spread(band, frequency_hz)) };
        let track = self.track_impedance_ohm(frequency_hz);
        let sheet = |prepared: &(Arc<Stage>, Vec<Injection>)| self.sheet(band, frequency_hz, track, prepared);
        let pair = |pair: &Pair| {
            if Arc::ptr_eq(&pair.kept.0, &pair.filled.0) {
                return sheet(&pair.kept).map(|map| (map.clone(), map));
            }
            let (kept, filled) = rayon::join(|| sheet(&pair.kept), || sheet(&pair.filled));
            Ok((kept?, filled?))
        };
        let (map, without_voids) = pair(fine)?;
        let coarse = self.coarse.as_ref().map(pair).transpose()?;
        Ok(Solved { map, without_voids, coarse })
    }

    /// Sets up the plane on the plan's cells, or on smaller ones where those cannot stand for it.
    fn set_up_fine(&mut self) -> Result<f64, Diagnostic> {
        let mut cell_m = self.chart.cell_m;
        for halving in 0..=HALVINGS {
            match self.pair(cell_m) {
                Ok(pair) => {
                    self.fine = Some(pair);
                    if halving > 0 {
                        self.notes.push(self.halved(cell_m));
                    }
                    self.notes.extend(self.mended());
                    return Ok(cell_m);
                }
                Err(Misfit::Other(reason)) => return Err(*reason),
                Err(Misfit::Coarse(place)) if halving == HALVINGS => return Err(self.too_coarse(place)),
                Err(Misfit::Coarse(_)) => cell_m *= 0.5,
            }
        }
        Ok(cell_m)
    }

    fn pair(&self, cell_m: f64) -> Result<Pair, Misfit> {
        let stage = |voids| {
            let stage = self.workshop.stages.get(self.workshop.board, self.chart, cell_m, voids);
            let stage = stage.map_err(Misfit::Coarse)?;
            let landings = self.landings(&stage.mask).map_err(|reason| Misfit::Other(Box::new(reason)))?;
            Ok((stage, landings))
        };
        Ok(Pair { kept: stage(Voids::Kept)?, filled: stage(Voids::Filled)? })
    }

    /// The return enters the plane at the receiver and leaves it at the driver, against the track's current.
    fn landings(&self, mask: &Mask) -> Result<Vec<Injection>, Diagnostic> {
        let ends = [(&self.chart.receiver_landing, 1.0), (&self.chart.driver_landing, -1.0)];
        let mut injections = Vec::with_capacity(2);
        let mut islands = Vec::with_capacity(2);
        for (landing, current_a) in ends {
            let Some((patch, island)) = landing_patch(mask, landing) else {
                let text = format!(
                    "landing `{}` of net `{}` must lie on plane `{}`; no copper within two cells",
                    landing.what, self.net.name, self.chart.plane
                );
                return Err(self.placed(Diagnostic::error(code::LANDING_OFF_COPPER, text), landing.at));
            };
            injections.push(Injection { patch, current_a });
            islands.push(island);
        }
        if islands[0] != islands[1] {
            return Err(self.landings_apart());
        }
        Ok(injections)
    }

    fn sheet(
        &self,
        band: &Band,
        frequency_hz: f64,
        track_ohm: Complex64,
        (stage, injections): &(Arc<Stage>, Vec<Injection>),
    ) -> Result<ReturnMap, Diagnostic> {
        let drive = Drive { strips: self.source.strips(frequency_hz), injections: injections.clone() };
        let zs_ohm = self.source.foil(self.chart.plane.layer).zs_ohm(frequency_hz);
        let point = OperatingPoint { frequency_hz, zs_ohm: vec![zs_ohm] };
        let solve = || stage.system()?.solve(&drive, &point, self.workshop.tolerance);
        let mut solution = solve().map_err(|failure| self.failed(&failure, band))?;
        Ok(ReturnMap {
            net: self.net.name.clone(),
            plane: self.chart.plane.clone(),
            band: band.name.clone(),
            frequency_hz,
            grid: stage.mask.grid,
            copper: stage.mask.copper.clone(),
            jx: std::mem::take(&mut solution.jx[0]),
            jy: std::mem::take(&mut solution.jy[0]),
            model: Model::Sheet,
            height_m: self.source.mean_height_m(frequency_hz),
            width_m: self.source.mean_width_m(),
            zs_ohm: Some(zs_ohm),
            residual: Some(solution.residual),
            loop_impedance_ohm: Some(track_ohm + solution.sheet_impedance_ohm),
        })
    }

    fn track_impedance_ohm(&self, frequency_hz: f64) -> Complex64 {
        let inductance_h = partial_inductance_h(&self.source.runs(frequency_hz));
        let omega = std::f64::consts::TAU * frequency_hz;
        Complex64::new(self.source.resistance_ohm(frequency_hz), omega * inductance_h)
    }

    fn spread(&self, band: &Band, frequency_hz: f64) -> Solved {
        let (board, chart) = (self.workshop.board, self.chart);
        let map = |cell_m: f64| {
            let (grid, copper) = super::stage::cells_of_plane(board, chart, cell_m);
            let leg = |leg: &crate::plan::TrackLeg| SpreadLeg {
                from: leg.from,
                to: leg.to,
                width_m: leg.width_m,
                height_m: board.stackup.gap_m(leg.layer, chart.plane.layer),
            };
            let legs: Vec<SpreadLeg> = self.net.track[chart.legs.clone()].iter().map(leg).collect();
            let (jx, jy) = face_currents(&legs, &grid);
            ReturnMap {
                net: self.net.name.clone(),
                plane: chart.plane.clone(),
                band: band.name.clone(),
                frequency_hz,
                grid,
                copper,
                jx,
                jy,
                model: Model::Spread,
                height_m: chart.height_m,
                width_m: self.source.mean_width_m(),
                zs_ohm: None,
                residual: None,
                loop_impedance_ohm: None,
            }
        };
        let (fine, coarse) = (map(chart.cell_m), map(2.0 * chart.cell_m));
        Solved { without_voids: fine.clone(), map: fine, coarse: Some((coarse.clone(), coarse)) }
    }

    fn placed(&self, message: Diagnostic, at: Point) -> Diagnostic {
        message.on_board(Some(self.chart.plane.layer + 1), at)
    }

    fn landings_apart(&self) -> Diagnostic {
        let (driver, receiver) = (&self.chart.driver_landing, &self.chart.receiver_landing);
        let text = format!(
            "landings `{}` and `{}` of net `{}` must lie on connected copper of plane `{}`; they lie on two islands",
            driver.what, receiver.what, self.net.name, self.chart.plane
        );
        self.placed(Diagnostic::error(code::LANDINGS_APART, text), receiver.at)
            .hint("name landings on one island with `driver_landing` and `receiver_landing`")
    }

    fn too_coarse(&self, place: TooCoarse) -> Diagnostic {
        let text = format!(
            "cell of plane `{}` must be smaller here to keep its pieces apart; got {:.4} mm",
            self.chart.plane,
            place.cell_m * 1e3
        );
        let half_mm = 0.5e3 * place.cell_m;
        self.placed(Diagnostic::error(code::CELL_TOO_LARGE, text), place.at)
            .hint(format!("set `cell = \"{half_mm:.4}mm\"` or less under `[solver]`"))
    }

    fn halved(&self, cell_m: f64) -> Diagnostic {
        let text = format!(
            "net `{}` on plane `{}` is solved on cells of {:.4} mm; cells of {:.4} mm cannot keep its copper apart",
            self.net.name,
            self.chart.plane,
            cell_m * 1e3,
            self.chart.cell_m * 1e3
        );
        Diagnostic::note(code::CELL_HALVED, text)
    }

    /// What the cells do not show as it is drawn.
    fn mended(&self) -> Option<Diagnostic> {
        let mask = &self.fine.as_ref()?.kept.0.mask;
        let mut parts = Vec::new();
        if mask.neck_cells > 0 {
            parts.push(format!("{} cells stand for necks narrower than a cell", mask.neck_cells));
        }
        if mask.crumbs > 0 {
            parts.push(format!("{} pieces of copper smaller than half a cell are left out", mask.crumbs));
        }
        let text = format!("plane `{}` on cells of {:.4} mm: ", self.chart.plane, mask.grid.cell_m * 1e3);
        (!parts.is_empty()).then(|| Diagnostic::note(code::PLANE_ON_CELLS, text + &parts.join("; ")))
    }

    fn failed(&self, failure: &SolveFailure, band: &Band) -> Diagnostic {
        match failure {
            SolveFailure::Unbalanced { .. } => self.landings_apart(),
            SolveFailure::NoCopper { index } => {
                let landing =
                    if *index == 0 { &self.chart.receiver_landing } else { &self.chart.driver_landing };
                let text = format!("landing `{}` must lie on plane `{}`", landing.what, self.chart.plane);
                self.placed(Diagnostic::error(code::LANDING_OFF_COPPER, text), landing.at)
            }
            SolveFailure::Factor { .. } => {
                let text = format!(
                    "plane `{}` must be small enough to be factored in memory; {failure:?}",
                    self.chart.plane
                );
                Diagnostic::error(code::NOT_FACTORED, text).hint("set a larger `cell` under `[solver]`")
            }
            SolveFailure::NoConvergence { steps, residual, tolerance } => {
                let text = format!(
                    "solve of net `{}` on plane `{}` in band `{}` must reach a residual of {tolerance:.0e}; got \
                     {residual:.1e} after {steps} steps",
                    self.net.name, self.chart.plane, band.name
                );
                Diagnostic::error(code::NOT_CONVERGED, text).hint("try another `cell` under `[solver]`")
            }
        }
    }
}
