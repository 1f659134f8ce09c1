//! Exact area coverage of regions on a grid of cells, by adding up signed areas along the edges.
//!
//! For each piece of an edge inside one cell, the area between the piece and the right side of the cell goes into
//! that cell and the rest of the row to its right is covered by the piece's height; a running sum along the row then
//! gives the covered part of every cell. Cost: one step for each cell that an edge passes, plus one for each cell.
//! Checked by: `coverage_is_exact`, and `raster_areas_equal_polygon_areas` in tests/field.rs.

use super::{Grid, Point, Polygon, Region};

/// Covered part (0 to 1) of each cell of `grid`, `grid.len()` values, for disjoint polygons. Edges outside the grid
/// are cut off.
pub fn coverage(region: &Region, grid: &Grid) -> Vec<f64> {
    let mut raster = Raster::new(*grid);
    region.0.iter().for_each(|polygon| raster.add(polygon));
    raster.finish()
}

/// Accumulates signed areas of polygons on a grid.
#[derive(Clone, Debug)]
pub struct Raster {
    grid: Grid,
    /// `(nx + 1) * ny` differences along each row; the last column takes what lies right of the grid.
    differences: Vec<f64>,
}

impl Raster {
    /// An empty raster.
    pub fn new(grid: Grid) -> Self {
        Self { grid, differences: vec![0.0; (grid.nx + 1) * grid.ny] }
    }

    /// Adds a polygon; its holes run the other way and so take area off.
    pub fn add(&mut self, polygon: &Polygon) {
        for ring in polygon.rings() {
            let Some(&last) = ring.last() else { continue };
            let mut from = self.scaled(last);
            for &point in ring {
                let to = self.scaled(point);
                self.edge(from, to);
                from = to;
            }
        }
    }

    /// Covered part of each cell. Rounding noise next to 0 and 1 is taken off.
    pub fn finish(self) -> Vec<f64> {
        let (nx, ny) = (self.grid.nx, self.grid.ny);
        let mut covered = Vec::with_capacity(nx * ny);
        for row in self.differences.chunks_exact(nx + 1) {
            let mut sum = 0.0;
            for &difference in &row[..nx] {
                sum += difference;
                covered.push(settled(sum));
            }
        }
        covered
    }

    fn scaled(&self, point: Point) -> Point {
        (point - self.grid.origin) * (1.0 / self.grid.cell_m)
    }

    /// Adds one edge in units of cells. A ring that runs counter-clockwise has its area right of edges that fall.
    fn edge(&mut self, from: Point, to: Point) {
        let rows = self.grid.ny as f64;
        let (low, high, sign) = if from.y < to.y { (from, to, -1.0) } else { (to, from, 1.0) };
        let bottom = low.y.max(0.0);
        let top = high.y.min(rows);
        if bottom >= top {
            return;
        }
        let slope = (high.x - low.x) / (high.y - low.y);
        let x_at = |y: f64| {
            if y == low.y {
                low.x
            } else if y == high.y {
                high.x
            } else {
                low.x + (y - low.y) * slope
            }
        };
        let mut y = bottom;
        let mut x = x_at(y);
        let mut row = (bottom.floor() as usize).min(self.grid.ny - 1);
        while y < top {
            let next_y = ((row + 1) as f64).min(top);
            let next_x = x_at(next_y);
            self.row_piece(row, (x, next_x), sign * (next_y - y));
            (y, x) = (next_y, next_x);
            row += 1;
        }
    }

    /// Adds a straight piece inside one row, of signed height `height`, from x to x (cells).
    fn row_piece(&mut self, row: usize, (from, to): (f64, f64), height: f64) {
        let columns = self.grid.nx as f64;
        let start = row * (self.grid.nx + 1);
        let (left, right) = if from < to { (from, to) } else { (to, from) };
        if left >= columns {
            return;
        }
        if right <= 0.0 {
            self.differences[start] += height;
            return;
        }
        let width = right - left;
        if width == 0.0 {
            self.cell_piece(start, left, left, height);
            return;
        }
        let mut x = left;
        if x < 0.0 {
            self.differences[start] += height * (-x / width);
            x = 0.0;
        }
        let end = right.min(columns);
        while x < end {
            let next = (x.floor() + 1.0).min(end);
            self.cell_piece(start, x, next, height * ((next - x) / width));
            x = next;
        }
    }

    /// Adds a piece inside one cell of the row that starts at `start`.
    fn cell_piece(&mut self, start: usize, from: f64, to: f64, height: f64) {
        let column = (from.floor() as usize).min(self.grid.nx - 1);
        let right_of_middle = 1.0 - (0.5 * (from + to) - column as f64);
        self.differences[start + column] += height * right_of_middle;
        self.differences[start + column + 1] += height * (1.0 - right_of_middle);
    }
}

fn settled(value: f64) -> f64 {
    const NOISE: f64 = 1e-12;
    if value < NOISE {
        0.0
    } else if value > 1.0 - NOISE {
        1.0
    } else {
        value
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn grid(nx: usize, ny: usize) -> Grid {
        Grid { origin: Point::new(0.0, 0.0), cell_m: 1.0, nx, ny }
    }

    #[test]
    fn coverage_is_exact() {
        let triangle = Polygon {
            outer: vec![Point::new(0.0, 0.0), Point::new(2.0, 0.0), Point::new(0.0, 2.0)],
            holes: vec![],
        };
        assert_eq!(coverage(&Region(vec![triangle]), &grid(3, 2)), [1.0, 0.5, 0.0, 0.5, 0.0, 0.0]);
    }

    #[test]
    fn what_lies_off_the_grid_is_cut_off() {
        let square =
            |a: f64, b: f64| vec![Point::new(a, a), Point::new(b, a), Point::new(b, b), Point::new(a, b)];
        let mut hole = square(0.5, 1.0);
        hole.reverse();
        let frame = Polygon { outer: square(-3.0, 7.0), holes: vec![hole] };
        assert_eq!(coverage(&Region(vec![frame]), &grid(2, 2)), [0.75, 1.0, 1.0, 1.0]);
    }
}
