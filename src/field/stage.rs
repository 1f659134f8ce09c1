//! Copper put on cells and prepared for solving, kept for all paths over the same copper and cells.

use super::lay::Lay;
use super::mask::{Mask, NO_ISLAND, TooCoarse};
use super::pieces::Copper;
use super::source::disc;
use super::stack::Stack;
use super::wiring::Wiring;
use crate::board::{Board, NetId, Plating};
use crate::geom::{Bounds, Grid, Point, Polygon, Region, raster};
use crate::plan::{ChartPlan, Void};
use crate::sheet::{Problem, Sheet, SolveFailure, System};
use std::sync::{Arc, Mutex, OnceLock, PoisonError};

/// Whether the voids of the charted planes are there.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Voids {
    /// As on the board, drilled holes cut.
    Kept,
    /// All filled, on layers that the track does not run on; the planes' pull-back from the outline stays.
    Filled,
}

/// What part of the board is solved on which cells.
#[derive(Clone, Debug, PartialEq)]
pub struct View {
    /// Side of a cell in metres.
    pub cell_m: f64,
    /// Box that the cells are kept to, in metres; none for the whole board.
    pub window: Option<Bounds>,
    /// Layers that are solved, of those of the lay.
    pub layers: Vec<usize>,
    /// Whether connections may be lost that the cells cannot keep.
    pub lenient: bool,
}

/// The copper of a layer on cells.
#[derive(Clone, Debug)]
pub struct StagedSheet {
    /// Layer, index from 0.
    pub layer: usize,
    /// The copper.
    pub mask: Arc<Mask>,
    /// Area of each group; empty where the whole layer is one group.
    pub areas: Vec<usize>,
}

impl StagedSheet {
    /// Group of the mask that an area makes, as a filter; none where the area is not on the sheet.
    pub fn group_of(&self, area: usize) -> Option<Option<u32>> {
        if self.areas.is_empty() {
            return Some(None);
        }
        self.areas.iter().position(|&known| known == area).map(|group| Some(group as u32))
    }
}

/// Copper on cells with its prepared system.
#[derive(Debug)]
pub struct Stage {
    /// Cells.
    pub grid: Grid,
    /// Sheets in the order of the problem.
    pub sheets: Vec<StagedSheet>,
    /// Joints and entries on the cells.
    pub wiring: Wiring,
    z_m: Vec<f64>,
    system: OnceLock<Result<System, SolveFailure>>,
}

impl Stage {
    /// The system, prepared at the first call.
    pub fn system(&self) -> Result<&System, SolveFailure> {
        let prepare = || {
            let sheet = |(sheet, &z_m): (&StagedSheet, &f64)| Sheet {
                copper: sheet.mask.copper.clone(),
                z_m,
                cut_x: sheet.mask.cut_x.clone(),
                cut_y: sheet.mask.cut_y.clone(),
            };
            let sheets = self.sheets.iter().zip(&self.z_m).map(sheet).collect();
            System::new(Problem {
                grid: self.grid,
                sheets,
                verticals: self.wiring.verticals.clone(),
                gaps: Vec::new(),
            })
        };
        self.system.get_or_init(prepare).as_ref().map_err(Clone::clone)
    }

    /// Whether both make the same system.
    fn equals(&self, other: &Self) -> bool {
        let same = |(a, b): (&StagedSheet, &StagedSheet)| {
            a.layer == b.layer && (Arc::ptr_eq(&a.mask, &b.mask) || a.mask == b.mask)
        };
        self.grid == other.grid
            && self.z_m == other.z_m
            && self.sheets.len() == other.sheets.len()
            && self.sheets.iter().zip(&other.sheets).all(same)
            && self.wiring == other.wiring
    }

    fn weight(&self) -> usize {
        self.grid.len() * self.sheets.len()
    }
}

/// Most cells of all stages that are kept; the least recently used go first.
const KEPT_CELLS: usize = 2_500_000;
/// Most cells of all masks that are kept.
const KEPT_MASKS: usize = 8_000_000;

/// Keeps stages and masks. Several threads may ask; what they get does not depend on the order.
#[derive(Debug, Default)]
pub struct Stages {
    kept: Mutex<Vec<Arc<Stage>>>,
    masks: Mutex<Vec<KeptMask>>,
}

#[derive(Debug)]
struct KeptMask {
    layer: usize,
    areas: Vec<usize>,
    grid: Grid,
    lenient: bool,
    mask: Arc<Mask>,
}

/// A layer whose copper needs smaller cells.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Misfit {
    /// Layer, index from 0.
    pub layer: usize,
    /// Where.
    pub place: TooCoarse,
}

impl Stages {
    /// The stage of a lay seen in a view, with sheets at the heights of `stack`.
    pub fn get(
        &self,
        board: &Board,
        lay: &Lay,
        view: &View,
        stack: &Stack,
        voids: Voids,
    ) -> Result<Arc<Stage>, Misfit> {
        let grid = view_grid(board, lay, view);
        let mut sheets = Vec::with_capacity(view.layers.len());
        for conductor in lay.layers.iter().filter(|conductor| view.layers.contains(&conductor.layer)) {
            let (layer, areas) = (conductor.layer, &conductor.areas);
            let solid = voids == Voids::Filled && fills(lay, layer);
            // What is charted keeps its connections; elsewhere a lost one is better than no map.
            let strict = !view.lenient && lay.charts.iter().any(|(_, chart)| chart.plane.layer == layer);
            let mask = if solid {
                filled_mask(board, lay, layer, areas, &grid).map(Arc::new)
            } else {
                self.mask(board, layer, areas, &grid, !strict)
            };
            let mask = mask.map_err(|place| Misfit { layer, place })?;
            sheets.push(StagedSheet { layer, mask, areas: if solid { Vec::new() } else { areas.clone() } });
        }
        let wiring = Wiring::new(lay, &sheets, &grid, stack);
        let z_m = sheets.iter().map(|sheet| stack.z_m(sheet.layer)).collect();
        let stage = Stage { grid, sheets, wiring, z_m, system: OnceLock::new() };
        if view.window.is_some() {
            // windows differ from path to path
            return Ok(Arc::new(stage));
        }
        let mut kept = self.kept.lock().unwrap_or_else(PoisonError::into_inner);
        let stage = match kept.iter().position(|known| known.equals(&stage)) {
            Some(at) => kept.remove(at),
            None => Arc::new(stage),
        };
        kept.push(Arc::clone(&stage));
        let mut cells: usize = kept.iter().map(|stage| stage.weight()).sum();
        while cells > KEPT_CELLS && kept.len() > 1 {
            cells -= kept.remove(0).weight();
        }
        Ok(stage)
    }

    /// The copper of a layer on cells, as on the board.
    fn mask(
        &self,
        board: &Board,
        layer: usize,
        areas: &[usize],
        grid: &Grid,
        lenient: bool,
    ) -> Result<Arc<Mask>, TooCoarse> {
        let known = |kept: &KeptMask| {
            kept.layer == layer && kept.grid == *grid && kept.lenient == lenient && kept.areas == areas
        };
        let lock = || self.masks.lock().unwrap_or_else(PoisonError::into_inner);
        if let Some(kept) = lock().iter().find(|kept| known(kept)) {
            return Ok(Arc::clone(&kept.mask));
        }
        let groups: Vec<Vec<&Polygon>> =
            areas.iter().map(|&area| vec![&board.layers[layer].areas[area].shape]).collect();
        let holes = drilled(board, layer);
        let copper = Copper { groups: &groups, outline: outline(board), holes: &holes };
        let mask = Arc::new(if lenient { Mask::lenient(&copper, grid) } else { Mask::new(&copper, grid)? });
        let mut masks = lock();
        if !masks.iter().any(known) {
            let (areas, grid) = (areas.to_vec(), *grid);
            masks.push(KeptMask { layer, areas, grid, lenient, mask: Arc::clone(&mask) });
        }
        let mut cells: usize = masks.iter().map(|kept| kept.grid.len()).sum();
        while cells > KEPT_MASKS && masks.len() > 1 {
            cells -= masks.remove(0).grid.len();
        }
        Ok(mask)
    }
}

/// Whether the voids of a layer are filled in the solve without voids: where a plane is charted and no track runs.
pub fn fills(lay: &Lay, layer: usize) -> bool {
    let charted = lay.charts.iter().any(|(_, chart)| chart.plane.layer == layer && !chart.voids.is_empty());
    charted && lay.legs.iter().all(|leg| leg.layer != layer)
}

/// A layer with all its copper and the voids of its charted planes as one piece.
fn filled_mask(
    board: &Board,
    lay: &Lay,
    layer: usize,
    areas: &[usize],
    grid: &Grid,
) -> Result<Mask, TooCoarse> {
    let copper = areas.iter().map(|&area| &board.layers[layer].areas[area].shape);
    let charts = lay.charts.iter().filter(|(_, chart)| chart.plane.layer == layer);
    let filled = copper.chain(charts.flat_map(|(_, chart)| chart.voids.iter().map(|void| &void.shape)));
    Mask::new(
        &Copper { groups: &[filled.collect()], outline: outline(board), holes: &Region::default() },
        grid,
    )
}

fn outline(board: &Board) -> Option<&Region> {
    (!board.outline.0.is_empty()).then_some(&board.outline)
}

/// Which cells of a sheet belong to a plane: of its net, or on a solid layer to no other charted plane.
pub fn plane_cells(board: &Board, lay: &Lay, sheet: &StagedSheet, chart: &ChartPlan) -> Vec<bool> {
    if sheet.areas.is_empty() {
        let others = lay.charts.iter().filter(|(_, other)| {
            other.plane.layer == chart.plane.layer && other.plane.net != chart.plane.net
        });
        let mut cells = sheet.mask.copper.clone();
        for (_, other) in others {
            let theirs = plane_on(board, other, &sheet.mask.grid);
            cells.iter_mut().zip(theirs).for_each(|(cell, theirs)| *cell &= !theirs);
        }
        return cells;
    }
    let of_net: Vec<bool> = sheet
        .areas
        .iter()
        .map(|&area| is_net(board, board.layers[sheet.layer].areas[area].net, &chart.plane.net))
        .collect();
    sheet.mask.group.iter().map(|&group| group != NO_ISLAND && of_net[group as usize]).collect()
}

/// Which cells of a grid a chart's plane covers by half.
pub fn plane_on(board: &Board, chart: &ChartPlan, grid: &Grid) -> Vec<bool> {
    let region = Region(plane_areas(board, chart).into_iter().cloned().collect());
    raster::coverage(&region, grid).into_iter().map(|part| part >= 0.5).collect()
}

/// The grid of a chart's plane and which cells are copper, for a model that does not ask what is connected.
pub fn cells_of_plane(board: &Board, chart: &ChartPlan, cell_m: f64) -> (Grid, Vec<bool>) {
    let grid = grid_over(board, &plane_areas(board, chart), &chart.voids, cell_m);
    (grid, plane_on(board, chart, &grid))
}

fn is_net(board: &Board, net: Option<NetId>, name: &str) -> bool {
    net.map_or(name.is_empty(), |net| board.net_name(net) == name)
}

fn plane_areas<'b>(board: &'b Board, chart: &ChartPlan) -> Vec<&'b Polygon> {
    let areas = board.layers[chart.plane.layer].areas.iter();
    areas.filter(|area| is_net(board, area.net, &chart.plane.net)).map(|area| &area.shape).collect()
}

/// The grid over all copper of a lay on cells of `cell_m`.
pub fn lay_grid(board: &Board, lay: &Lay, cell_m: f64) -> Grid {
    let areas = lay.layers.iter().flat_map(|conductor| {
        conductor.areas.iter().map(|&area| &board.layers[conductor.layer].areas[area].shape)
    });
    let areas: Vec<&Polygon> = areas.collect();
    let voids: Vec<&Void> = lay.charts.iter().flat_map(|(_, chart)| &chart.voids).collect();
    grid_over(board, &areas, voids, cell_m)
}

/// The part of [`lay_grid`] that a view keeps: whole cells that the window meets.
fn view_grid(board: &Board, lay: &Lay, view: &View) -> Grid {
    let whole = lay_grid(board, lay, view.cell_m);
    let Some(window) = view.window else { return whole };
    let cells = |metres: f64| (metres / whole.cell_m).round().max(0.0) as usize;
    let (min, max) = (window.min - whole.origin, window.max - whole.origin);
    let (x0, y0) = (cells(min.x).min(whole.nx - 1), cells(min.y).min(whole.ny - 1));
    Grid {
        origin: whole.origin + Point::new(x0 as f64, y0 as f64) * whole.cell_m,
        cell_m: whole.cell_m,
        nx: cells(max.x).clamp(x0 + 1, whole.nx) - x0,
        ny: cells(max.y).clamp(y0 + 1, whole.ny) - y0,
    }
}

/// Cells aligned with the lower left corner of the outline, over copper and voids; cells of twice the size share every
/// second line.
fn grid_over<'v>(
    board: &Board,
    areas: &[&Polygon],
    voids: impl IntoIterator<Item = &'v Void>,
    cell_m: f64,
) -> Grid {
    let shapes = areas.iter().copied().chain(voids.into_iter().map(|void| &void.shape));
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
