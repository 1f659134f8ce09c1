//! A cheap look at a path on coarse cells: where its return flows, and so which sheets, window and cells a solve needs.
//!
//! Model: all sheets of the board on cells of eight times the size at each frequency asked.
//! - A plane is charted when its net current through some section along x or y is at least 1 % of the driver's.
//! - A layer is left out of a solve where it has less than 2 % of int |K| dA over all layers (entries keep theirs).
//! - The window is the box round track and entries, 30 heights wider, and grows on the side where a strip holds most
//!   until at most 4 % of the current runs outside, counted as the sum of |K| through any section along x or y. Where
//!   that is most of the board the whole board is taken.
//! - At low frequency (2 d |lam| < 1/4, lam = j w mu0/(2 Zs)) the density has no detail as fine as a cell and cells of
//!   twice the size are taken; so are they where the cells of all layers would be too many.
//! - What is left out is added to the stated errors.
//!
//! A window's rim is a free edge: the density at x from the middle of a strip of half-width X changes by
//! x^2/(2 X^2), that is 11 t^2 at 3h where a part t = 2h/(pi X) of the return runs outside; half of t is stated.
//! Checked by: `a_window_agrees_with_the_whole_board` in tests/field.

use super::lay::Lay;
use super::stage::{Stage, View};
use crate::board::Board;
use crate::field::PlaneId;
use crate::geom::{Bounds, Grid, Point};
use crate::plan::{ChartPlan, End, Landing, PathPlan};
use crate::sheet::Solution;
use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::sync::Arc;

/// Cells of a survey against those of a solve.
pub const COARSER: f64 = 8.0;
/// Relative residual of a survey: the iteration starts from the potential flow, whose wide spread must be gone.
pub const TOLERANCE: f64 = 1e-4;
/// Net current through a section from which on a plane is charted, in A per A.
const CHARTED: f64 = 0.01;
/// Part of int |K| dA below which a layer is left out.
const MATTERS: f64 = 0.02;
/// Current that may run outside the window, in A per A.
const OUTSIDE: f64 = 0.04;
/// Heights by which a window is wider than track and entries at least.
const HEIGHTS: f64 = 30.0;
/// Part of the board from which on a window is the whole board.
const MOST: f64 = 0.7;
/// Largest 2 d |lam| at which cells of twice the size do.
const SMOOTH: f64 = 0.25;
/// Most cells of all layers of a solve.
const MOST_CELLS: f64 = 300e3;

/// The return of a path at one frequency on coarse cells.
#[derive(Debug)]
pub struct Survey {
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// The cells and sheets.
    pub stage: Arc<Stage>,
    /// Its currents.
    pub solution: Solution,
    /// For each sheet and cell |Kx| d and |Ky| d in A per A.
    across: Vec<[Vec<f64>; 2]>,
}

/// What a solve at one frequency takes.
#[derive(Clone, Debug)]
pub struct Choice {
    /// Cells, window and layers.
    pub view: View,
    /// Part of the return that is left out.
    pub left_out: f64,
}

impl Survey {
    /// Keeps what a coarse solve gave.
    pub fn new(frequency_hz: f64, stage: Arc<Stage>, mut solution: Solution) -> Self {
        let grid = stage.grid;
        let across = |(jx, jy): (&Vec<Complex64>, &Vec<Complex64>)| {
            let along_x = |at: usize| {
                let row = at / grid.nx * (grid.nx + 1) + at % grid.nx;
                0.5 * (jx[row] + jx[row + 1]).norm()
            };
            let along_y = |at: usize| 0.5 * (jy[at] + jy[at + grid.nx]).norm();
            [(0..grid.len()).map(along_x).collect(), (0..grid.len()).map(along_y).collect()]
        };
        let across = solution.jx.iter().zip(&solution.jy).map(across).collect();
        solution.potential_v = Vec::new();
        Self { frequency_hz, stage, solution, across }
    }

    /// Planes whose net current through some section is at least [`CHARTED`].
    pub fn planes(&self, board: &Board) -> Vec<PlaneId> {
        let grid = self.stage.grid;
        let mut planes = Vec::new();
        for (index, sheet) in self.stage.sheets.iter().enumerate() {
            let net_of = |area: usize| board.layers[sheet.layer].areas[area].net;
            let mut nets: Vec<Option<crate::board::NetId>> =
                sheet.areas.iter().map(|&area| net_of(area)).collect();
            nets.sort();
            nets.dedup();
            for net in nets {
                let of_net: Vec<bool> = sheet.areas.iter().map(|&area| net_of(area) == net).collect();
                let own = |cell: usize| of_net.get(sheet.mask.group[cell] as usize) == Some(&true);
                let (jx, jy) = (&self.solution.jx[index], &self.solution.jy[index]);
                let mut columns = vec![Complex64::default(); grid.nx];
                let mut rows = vec![Complex64::default(); grid.ny];
                for cell in (0..grid.len()).filter(|&cell| own(cell)) {
                    let (ix, iy) = (cell % grid.nx, cell / grid.nx);
                    columns[ix] += jx[iy * (grid.nx + 1) + ix];
                    rows[iy] += jy[cell];
                }
                if columns.iter().chain(&rows).any(|current| current.norm() >= CHARTED) {
                    let net = net.map_or(String::new(), |net| board.net_name(net).to_owned());
                    planes.push(PlaneId { layer: sheet.layer, net });
                }
            }
        }
        planes
    }

    /// What a solve at this frequency takes; `zs_ohm` is the least sheet impedance.
    pub fn choose(&self, lay: &Lay, zs_ohm: f64) -> Choice {
        let entered = |layer: usize| {
            let on = |end: &End| matches!(end, End::Copper { layer: known, .. } if *known == layer);
            lay.entries.iter().any(|entry| on(&entry.end))
        };
        let all = |[x, y]: &[Vec<f64>; 2]| x.iter().zip(y).map(|(x, y)| libm::hypot(*x, *y)).sum::<f64>();
        let total: f64 = self.across.iter().map(all).sum();
        let mut layers = Vec::new();
        let mut left_out = 0.0;
        let grid = self.stage.grid;
        let mut sums = [vec![0.0; grid.len()], vec![0.0; grid.len()]];
        for (sheet, across) in self.stage.sheets.iter().zip(&self.across) {
            let part = all(across) / total;
            if part < MATTERS && !entered(sheet.layer) {
                left_out += part;
                continue;
            }
            layers.push(sheet.layer);
            for (sum, across) in sums.iter_mut().zip(across) {
                sum.iter_mut().zip(across).for_each(|(sum, current)| *sum += current);
            }
        }
        let height_m = lay.charts.iter().map(|(_, chart)| chart.height_m).fold(0.0, f64::max);
        let (window, outside) = window(&grid, &sums, start(lay).grown(HEIGHTS * height_m));
        let decay = std::f64::consts::PI * self.frequency_hz * MU0 / zs_ohm;
        let smooth = 2.0 * lay.cell_m * decay < SMOOTH;
        let mut cell_m = if smooth { 2.0 * lay.cell_m } else { lay.cell_m };
        let solved = window.unwrap_or(grid.bounds());
        let count = |cell_m: f64| solved.width() * solved.height() / (cell_m * cell_m) * layers.len() as f64;
        while count(cell_m) > MOST_CELLS && cell_m < 0.5 * COARSER * lay.cell_m {
            cell_m *= 2.0;
        }
        let view = View { cell_m, window, layers, lenient: false };
        Choice { view, left_out: left_out + 0.5 * outside }
    }
}

/// The box round track and entries.
fn start(lay: &Lay) -> Bounds {
    let legs = lay.legs.iter().flat_map(|leg| [leg.from, leg.to]);
    let entries = lay.entries.iter().filter_map(|entry| match entry.end {
        End::Copper { at, .. } => Some(at),
        End::Node(_) => None,
    });
    Bounds::of(legs.chain(entries))
}

/// The smallest box from `start` outside of which at most [`OUTSIDE`] runs, and what runs there; none where that is
/// most of the grid. `across` are |Kx| d and |Ky| d of each cell.
fn window(grid: &Grid, across: &[Vec<f64>; 2], start: Bounds) -> (Option<Bounds>, f64) {
    let cell = |metres: f64, limit: usize| ((metres / grid.cell_m).max(0.0) as usize).min(limit - 1);
    let (min, max) = (start.min - grid.origin, start.max - grid.origin);
    let mut x = (cell(min.x, grid.nx), cell(max.x, grid.nx) + 1);
    let mut y = (cell(min.y, grid.ny), cell(max.y, grid.ny) + 1);
    let sum = |direction: usize, x: (usize, usize), y: (usize, usize)| -> f64 {
        let row = |iy: usize| across[direction][iy * grid.nx + x.0..iy * grid.nx + x.1].iter().sum::<f64>();
        (y.0..y.1).map(row).sum()
    };
    let (whole_x, whole_y) = ((0, grid.nx), (0, grid.ny));
    let outside = |x: (usize, usize), y: (usize, usize)| {
        let column = |ix: usize| {
            let inside = if (x.0..x.1).contains(&ix) { sum(0, (ix, ix + 1), y) } else { 0.0 };
            sum(0, (ix, ix + 1), whole_y) - inside
        };
        let row = |iy: usize| {
            let inside = if (y.0..y.1).contains(&iy) { sum(1, x, (iy, iy + 1)) } else { 0.0 };
            sum(1, whole_x, (iy, iy + 1)) - inside
        };
        let columns = (0..grid.nx).map(column).fold(0.0, f64::max);
        (0..grid.ny).map(row).fold(columns, f64::max)
    };
    let mut left = outside(x, y);
    while left > OUTSIDE {
        let both = |x: (usize, usize), y: (usize, usize)| sum(0, x, y) + sum(1, x, y);
        let strips = [
            if x.0 > 0 { both((x.0 - 1, x.0), y) } else { -1.0 },
            if x.1 < grid.nx { both((x.1, x.1 + 1), y) } else { -1.0 },
            if y.0 > 0 { both(x, (y.0 - 1, y.0)) } else { -1.0 },
            if y.1 < grid.ny { both(x, (y.1, y.1 + 1)) } else { -1.0 },
        ];
        let mut best = 0;
        for side in 1..4 {
            if strips[side] > strips[best] {
                best = side;
            }
        }
        match best {
            _ if strips[best] < 0.0 => break,
            0 => x.0 -= 1,
            1 => x.1 += 1,
            2 => y.0 -= 1,
            _ => y.1 += 1,
        }
        left = outside(x, y);
    }
    if ((x.1 - x.0) * (y.1 - y.0)) as f64 > MOST * grid.len() as f64 {
        return (None, 0.0);
    }
    let corner = |ix: usize, iy: usize| grid.origin + Point::new(ix as f64, iy as f64) * grid.cell_m;
    (Some(Bounds { min: corner(x.0, y.0), max: corner(x.1, y.1) }), left)
}

/// A chart for a plane that no stretch of the track lies over.
pub fn chart_without_track(board: &Board, path: &PathPlan, like: &ChartPlan, plane: PlaneId) -> ChartPlan {
    let nowhere = |at| Landing { at, radius_m: 0.0, what: String::new() };
    let gaps = path.track.iter().map(|leg| board.stackup.gap_m(leg.layer, plane.layer));
    let height_m = gaps.filter(|gap| *gap > 0.0).fold(f64::INFINITY, f64::min);
    let ends = (path.track.first().map(|leg| leg.from), path.track.last().map(|leg| leg.to));
    ChartPlan {
        plane,
        legs: 0..0,
        driver_landing: nowhere(ends.0.unwrap_or_default()),
        receiver_landing: nowhere(ends.1.unwrap_or_default()),
        height_m: if height_m.is_finite() { height_m } else { like.height_m },
        width_m: like.width_m,
        voids: Vec::new(),
        cell_m: like.cell_m,
        unknowns: 0,
        memory_bytes: 0,
        withheld: None,
    }
}
