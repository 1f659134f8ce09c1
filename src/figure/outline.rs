//! Lines of equal density on the board, for files that are laid over it.
//!
//! The density is that of the cells at their middles; lines are those of marching squares between them.

use crate::field::ReturnMap;
use crate::geom::{Point, Region, boolean, simplify};
use contour::ContourBuilder;

/// Deviation of a line from its points that is dropped, in cells.
const TOLERANCE_CELLS: f64 = 0.2;
/// Shorter lines are left out, in cells.
const SHORTEST_CELLS: f64 = 12.0;

/// Closed lines in metres round the parts of the plane where |K| is above `level` (A/m per A); the last point is the
/// first again.
pub fn lines(map: &ReturnMap, level: f64) -> Vec<Vec<Point>> {
    let (nx, ny) = (map.grid.nx, map.grid.ny);
    if nx < 2 || ny < 2 || !(level.is_finite() && level > 0.0) {
        return Vec::new();
    }
    let values: Vec<f64> = (0..nx * ny)
        .map(|cell| if map.copper[cell] { map.magnitude(cell % nx, cell / nx) / level } else { 0.0 })
        .collect();
    let Ok(found) = ContourBuilder::new(nx, ny, false).lines(&values, &[1.0]) else { return Vec::new() };
    let mut lines = Vec::new();
    for ring in found.iter().flat_map(|line| &line.geometry().0) {
        let points: Vec<Point> =
            ring.0.iter().map(|c| map.grid.origin + Point::new(c.x, c.y) * map.grid.cell_m).collect();
        let length: f64 = points.windows(2).map(|pair| pair[0].distance(pair[1])).sum();
        if length >= SHORTEST_CELLS * map.grid.cell_m {
            lines.push(simplified(&points, TOLERANCE_CELLS * map.grid.cell_m));
        }
    }
    lines
}

/// The part of the board where |K| is above `level`.
pub fn region(map: &ReturnMap, level: f64) -> Region {
    boolean::fill(&lines(map, level), boolean::Filling::EvenOdd)
}

/// Area in square metres that two such parts have in common: the overlap of two paths.
pub fn overlap_m2(one: &Region, other: &Region) -> f64 {
    if !one.bounds().meets(other.bounds()) {
        return 0.0;
    }
    boolean::intersection(one, other).area()
}

/// Fewer points, none dropped that lies farther than `tolerance_m` from the line (Ramer, Douglas and Peucker).
fn simplified(points: &[Point], tolerance_m: f64) -> Vec<Point> {
    let n = points.len();
    if n < 4 {
        return points.to_vec();
    }
    let kept = simplify::kept(points, &[0, n / 2, n - 1], tolerance_m);
    points.iter().zip(kept).filter(|(_, kept)| *kept).map(|(&point, _)| point).collect()
}
