//! A plane put on cells and prepared for solving, kept for all nets over the same plane and cells.

use super::mask::{Mask, TooCoarse};
use super::pieces::Copper;
use super::source::disc;
use crate::board::{Board, NetId, Plating};
use crate::geom::{Bounds, Grid, Point, Polygon, Region, raster};
use crate::plan::{ChartPlan, Void};
use crate::sheet::{Problem, Sheet, SolveFailure, System};
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

/// Whether the voids of the plane are there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Voids {
    /// As on the board, drilled holes cut.
    Kept,
    /// All filled; the plane's pull-back from the outline stays.
    Filled,
}

/// A plane on cells with its prepared system.
#[derive(Debug)]
pub struct Stage {
    /// The plane on cells.
    pub mask: Mask,
    system: OnceLock<Result<System, SolveFailure>>,
}

impl Stage {
    /// The system, prepared at the first call.
    pub fn system(&self) -> Result<&System, SolveFailure> {
        let prepare = || {
            let sheet = Sheet {
                copper: self.mask.copper.clone(),
                z_m: 0.0,
                cut_x: self.mask.cut_x.clone(),
                cut_y: self.mask.cut_y.clone(),
            };
            System::new(Problem { grid: self.mask.grid, sheets: vec![sheet], verticals: Vec::new() })
        };
        self.system.get_or_init(prepare).as_ref().map_err(Clone::clone)
    }
}

/// Most cells of all stages that are kept; the least recently used go first.
const KEPT_CELLS: usize = 1_500_000;

/// Keeps stages. Several threads may ask; each stage is made once.
#[derive(Debug, Default)]
pub struct Stages {
    kept: Mutex<Vec<Arc<Stage>>>,
}

impl Stages {
    /// The stage of a chart's plane on cells of `cell_m`.
    pub fn get(
        &self,
        board: &Board,
        chart: &ChartPlan,
        cell_m: f64,
        voids: Voids,
    ) -> Result<Arc<Stage>, TooCoarse> {
        let mask = lower(board, chart, cell_m, voids)?;
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let stage = match kept.iter().position(|stage| stage.mask == mask) {
            Some(at) => kept.remove(at),
            None => Arc::new(Stage { mask, system: OnceLock::new() }),
        };
        kept.push(Arc::clone(&stage));
        let mut cells: usize = kept.iter().map(|stage| stage.mask.grid.len()).sum();
        while cells > KEPT_CELLS && kept.len() > 1 {
            cells -= kept.remove(0).mask.grid.len();
        }
        Ok(stage)
    }
}

/// Puts a chart's plane on cells.
fn lower(board: &Board, chart: &ChartPlan, cell_m: f64, voids: Voids) -> Result<Mask, TooCoarse> {
    let plane = &chart.plane;
    let areas = plane_areas(board, chart);
    let grid = plane_grid(board, &areas, &chart.voids, cell_m);
    let outline = (!board.outline.0.is_empty()).then_some(&board.outline);
    match voids {
        Voids::Kept => {
            let groups: Vec<Vec<&Polygon>> = areas.iter().map(|&area| vec![area]).collect();
            Mask::new(&Copper { groups: &groups, outline, holes: &drilled(board, plane.layer) }, &grid)
        }
        Voids::Filled => {
            let filled = areas.into_iter().chain(chart.voids.iter().map(|void| &void.shape)).collect();
            Mask::new(&Copper { groups: &[filled], outline, holes: &Region::default() }, &grid)
        }
    }
}

/// The grid of a chart's plane and which cells are copper, for a model that does not ask what is connected.
pub fn cells_of_plane(board: &Board, chart: &ChartPlan, cell_m: f64) -> (Grid, Vec<bool>) {
    let areas = plane_areas(board, chart);
    let grid = plane_grid(board, &areas, &chart.voids, cell_m);
    let region = Region(areas.into_iter().cloned().collect());
    let covered = raster::coverage(&region, &grid);
    (grid, covered.into_iter().map(|part| part >= 0.5).collect())
}

fn plane_areas<'b>(board: &'b Board, chart: &ChartPlan) -> Vec<&'b Polygon> {
    let of_plane = |net: Option<NetId>| net.is_some_and(|net| board.net_name(net) == chart.plane.net);
    let areas = board.layers[chart.plane.layer].areas.iter();
    areas.filter(|area| of_plane(area.net)).map(|area| &area.shape).collect()
}

/// Cells aligned with the lower left corner of the outline, over the plane and its voids; cells of twice the size
/// share every second line.
fn plane_grid(board: &Board, areas: &[&Polygon], voids: &[Void], cell_m: f64) -> Grid {
    let shapes = areas.iter().copied().chain(voids.iter().map(|void| &void.shape));
    let mut bounds = shapes.fold(Bounds::EMPTY, |all, shape| all.union(shape.bounds()));
    let outline = board.outline.bounds();
    let corner = if outline.is_empty() { bounds.min } else { outline.min };
    if !outline.is_empty() {
        bounds.min = Point::new(bounds.min.x.max(outline.min.x), bounds.min.y.max(outline.min.y));
        bounds.max = Point::new(bounds.max.x.min(outline.max.x), bounds.max.y.min(outline.max.y));
    }
    // A rim that misses a line by rounding must not add a row of empty cells.
    const SLACK: f64 = 1e-6;
    let first = |metres: f64| 2.0 * ((metres / (2.0 * cell_m)) + SLACK).floor();
    let count = |metres: f64, first: f64| ((metres / cell_m - first - SLACK).ceil().max(1.0)) as usize;
    let (x, y) = (first(bounds.min.x - corner.x), first(bounds.min.y - corner.y));
    Grid {
        origin: corner + Point::new(x, y) * cell_m,
        cell_m,
        nx: count(bounds.max.x - corner.x, x),
        ny: count(bounds.max.y - corner.y, y),
    }
}

/// Non-plated holes and slots through a layer.
fn drilled(board: &Board, layer: usize) -> Region {
    let mut cuts = Vec::new();
    for hole in &board.holes {
        let (first, last) = hole.layers;
        if hole.plating != Plating::NonPlated || !(first..=last).contains(&layer) {
            continue;
        }
        let radius_m = 0.5 * hole.diameter_m;
        cuts.extend(hole.path.iter().map(|&at| disc(at, radius_m)));
        for ends in hole.path.windows(2) {
            let length = ends[0].distance(ends[1]);
            if length > 0.0 {
                let along = (ends[1] - ends[0]) * (radius_m / length);
                let side = Point::new(-along.y, along.x);
                let outer = vec![ends[0] - side, ends[1] - side, ends[1] + side, ends[0] + side];
                cuts.push(Polygon { outer, holes: Vec::new() });
            }
        }
    }
    Region(cuts)
}
