//! The uniform grid of square cells on which fields are solved and stored.

use super::{Bounds, Point};

/// A grid of square cells. Cell `(ix, iy)` covers `origin + (ix, iy) cell_m` to `origin + (ix + 1, iy + 1) cell_m`;
/// arrays over cells are stored row by row from the bottom: `index = iy * nx + ix`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Grid {
    /// Lower left corner of cell (0, 0) in metres.
    pub origin: Point,
    /// Side of a cell in metres.
    pub cell_m: f64,
    /// Number of columns.
    pub nx: usize,
    /// Number of rows.
    pub ny: usize,
}

impl Grid {
    /// Number of cells.
    pub fn len(&self) -> usize {
        self.nx * self.ny
    }

    /// Whether the grid has no cell.
    pub fn is_empty(&self) -> bool {
        self.len() == 0
    }

    /// Index of a cell in arrays over cells.
    pub fn index(&self, ix: usize, iy: usize) -> usize {
        iy * self.nx + ix
    }

    /// Centre of a cell.
    pub fn centre(&self, ix: usize, iy: usize) -> Point {
        self.origin + Point::new(ix as f64 + 0.5, iy as f64 + 0.5) * self.cell_m
    }

    /// The cell that holds `point`, if it lies on the grid.
    pub fn cell_at(&self, point: Point) -> Option<(usize, usize)> {
        let at = (point - self.origin) * (1.0 / self.cell_m);
        let (ix, iy) = (at.x.floor(), at.y.floor());
        let inside = ix >= 0.0 && iy >= 0.0 && (ix as usize) < self.nx && (iy as usize) < self.ny;
        inside.then_some((ix as usize, iy as usize))
    }

    /// The box that the grid covers.
    pub fn bounds(&self) -> Bounds {
        let max = self.origin + Point::new(self.nx as f64, self.ny as f64) * self.cell_m;
        Bounds { min: self.origin, max }
    }
}
