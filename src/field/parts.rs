//! Which void each cell of a filled plane belongs to, so that the extra impedance can be divided among the voids.
//!
//! A cell that a void covers by any part belongs to the void that covers most of it. Faces between two cells of copper
//! carry nothing of the difference, so it does no harm that cells of the rim count too.

use super::lay::Lay;
use super::stage::Stage;
use crate::geom::{Grid, Polygon, Region, raster};
use crate::plan::ChartPlan;
use crate::sheet::NO_LABEL;

/// Labels of the cells of every sheet of `stage`, and how many labels there are: those of the voids of each chart of
/// the lay, chart after chart.
pub fn labels(lay: &Lay, stage: &Stage) -> (Vec<Vec<u32>>, usize) {
    let mut labels: Vec<Vec<u32>> = stage.sheets.iter().map(|_| vec![NO_LABEL; stage.grid.len()]).collect();
    let mut count = 0;
    for (_, chart) in &lay.charts {
        if let Some(sheet) = stage.sheets.iter().position(|sheet| sheet.layer == chart.plane.layer) {
            label(chart, &stage.grid, count, &mut labels[sheet]);
        }
        count += chart.voids.len();
    }
    (labels, count)
}

fn label(chart: &ChartPlan, grid: &Grid, first: usize, cells: &mut [u32]) {
    let mut most = vec![0.0; cells.len()];
    for (index, void) in chart.voids.iter().enumerate() {
        for (cell, part) in covered(&void.shape, grid) {
            if part > most[cell] {
                most[cell] = part;
                cells[cell] = (first + index) as u32;
            }
        }
    }
}

/// Cells of the grid that a polygon covers, with the covered part.
fn covered(shape: &Polygon, grid: &Grid) -> Vec<(usize, f64)> {
    let bounds = shape.bounds();
    let index =
        |metres: f64, limit: usize| (metres / grid.cell_m).floor().clamp(0.0, limit as f64 - 1.0) as usize;
    let (x0, x1) =
        (index(bounds.min.x - grid.origin.x, grid.nx), index(bounds.max.x - grid.origin.x, grid.nx));
    let (y0, y1) =
        (index(bounds.min.y - grid.origin.y, grid.ny), index(bounds.max.y - grid.origin.y, grid.ny));
    let origin = grid.origin + crate::geom::Point::new(x0 as f64, y0 as f64) * grid.cell_m;
    let part = Grid { origin, cell_m: grid.cell_m, nx: x1 - x0 + 1, ny: y1 - y0 + 1 };
    let covered = raster::coverage(&Region(vec![shape.clone()]), &part);
    let cell = |at: usize| grid.index(x0 + at % part.nx, y0 + at / part.nx);
    covered.iter().enumerate().filter(|(_, part)| **part > 0.0).map(|(at, part)| (cell(at), *part)).collect()
}
