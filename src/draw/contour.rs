//! Lines of equal density that enclose 50, 80 and 95 % of the integral of |K|, made ready to draw.
//!
//! A line is left out where it runs along an edge or void (it follows the rim there and says nothing), where the
//! track covers it, and when what remains is too short to be read.

use super::density::{Density, Raster};
use super::scale::DensityScale;
use super::view::View;
use contour::ContourBuilder;

/// Percentages of the three contours.
pub const SHARES: [u32; 3] = [50, 80, 95];
/// Distance in mm on the sheet that each line keeps from edges and voids.
const CLEARANCE: [f64; 3] = [0.2, 0.5, 1.2];
/// Shortest piece in mm on the sheet.
const SHORTEST: [f64; 3] = [3.0, 6.0, 14.0];
/// Smallest extent in mm on the sheet: crescents round single voids say nothing.
const SMALLEST: [f64; 3] = [2.0, 5.0, 9.0];
/// Step of the raster on which lines are sought, in mm on the sheet.
const STEP: f64 = 0.4;
/// Largest deviation in mm when points are dropped.
const SIMPLIFIED: f64 = 0.03;

/// Lines of one level.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Contour {
    /// Density in A/m per A.
    pub density: f64,
    /// Open lines in mm on the sheet; empty when nothing of the contour can be shown.
    pub lines: Vec<Vec<(f64, f64)>>,
}

/// The contours at three densities. `hidden` tells where the track or a symbol covers the map (mm on the sheet).
pub fn contours(
    density: &Density,
    view: &View,
    scale: &DensityScale,
    levels: [f64; 3],
    hidden: &dyn Fn((f64, f64)) -> bool,
) -> [Contour; 3] {
    let nx = ((view.width() / STEP) as usize).max(8);
    let ny = ((view.height() / STEP) as usize).max(8);
    let raster = density.raster(view, nx, ny, scale);
    let step = (view.width() / nx as f64, view.height() / ny as f64);
    let clearance = clearance_mm(density, view, &raster, step);
    let builder = ContourBuilder::new(nx, ny, true);
    let mut all = levels.map(|density| Contour { density, lines: Vec::new() });
    for (rank, contour) in all.iter_mut().enumerate() {
        if !(contour.density.is_finite() && contour.density > 0.0) {
            continue;
        }
        let Ok(found) = builder.lines(&raster.level_db, &[scale.level_db(contour.density)]) else { continue };
        for ring in found.iter().flat_map(|line| &line.geometry().0) {
            let points: Vec<(f64, f64)> =
                ring.0.iter().map(|c| (view.x + c.x * step.0, view.y + c.y * step.1)).collect();
            let shown = |&(x, y): &(f64, f64)| {
                let (ix, iy) = ((x - view.x) / step.0, (y - view.y) / step.1);
                let inside = ix > 0.6 && iy > 0.6 && ix < nx as f64 - 0.6 && iy < ny as f64 - 0.6;
                inside && clearance[iy as usize * nx + ix as usize] > CLEARANCE[rank] && !hidden((x, y))
            };
            let pieces = pieces(&points, shown)
                .into_iter()
                .filter(|piece| length(piece) >= SHORTEST[rank] && extent(piece) >= SMALLEST[rank]);
            contour.lines.extend(pieces.map(|piece| simplified(&piece, SIMPLIFIED)));
        }
    }
    all
}

/// Lines of one level of a raster that fills `view` (columns, rows, values), where `shown` holds; short ones left out.
pub fn level_lines(
    (nx, ny, values): (usize, usize, &[f64]),
    view: &View,
    level: f64,
    shown: impl Fn((f64, f64)) -> bool,
) -> Vec<Vec<(f64, f64)>> {
    let step = (view.width() / nx as f64, view.height() / ny as f64);
    let Ok(found) = ContourBuilder::new(nx, ny, true).lines(values, &[level]) else { return Vec::new() };
    let mut all = Vec::new();
    for ring in found.iter().flat_map(|line| &line.geometry().0) {
        let points: Vec<(f64, f64)> =
            ring.0.iter().map(|c| (view.x + c.x * step.0, view.y + c.y * step.1)).collect();
        let inside = |&(x, y): &(f64, f64)| {
            let (ix, iy) = ((x - view.x) / step.0, (y - view.y) / step.1);
            ix > 0.6 && iy > 0.6 && ix < nx as f64 - 0.6 && iy < ny as f64 - 0.6 && shown((x, y))
        };
        let long = |piece: &Vec<(f64, f64)>| length(piece) >= SHORTEST[1] && extent(piece) >= SMALLEST[0];
        all.extend(
            pieces(&points, inside).into_iter().filter(long).map(|piece| simplified(&piece, SIMPLIFIED)),
        );
    }
    all
}

/// The runs of points that are shown. A closed line is cut open at a point that is not shown, if there is one.
fn pieces(points: &[(f64, f64)], shown: impl Fn(&(f64, f64)) -> bool) -> Vec<Vec<(f64, f64)>> {
    let closed = points.len() > 2 && points.first() == points.last();
    let mut turned = points.to_vec();
    if closed && let Some(gap) = points.iter().position(|point| !shown(point)) {
        turned.pop();
        turned.rotate_left(gap);
    }
    let mut all = Vec::new();
    let mut piece = Vec::new();
    for point in turned {
        if shown(&point) {
            piece.push(point);
        } else if piece.len() > 1 {
            all.push(std::mem::take(&mut piece));
        } else {
            piece.clear();
        }
    }
    if piece.len() > 1 {
        all.push(piece);
    }
    all
}

/// Larger side of the box round a line, in mm.
fn extent(points: &[(f64, f64)]) -> f64 {
    let range = |pick: fn(&(f64, f64)) -> f64| {
        let values = points.iter().map(pick);
        let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), v| (a.min(v), b.max(v)));
        high - low
    };
    range(|point| point.0).max(range(|point| point.1))
}

/// Length of a line in mm.
pub fn length(points: &[(f64, f64)]) -> f64 {
    points.windows(2).map(|w| libm::hypot(w[1].0 - w[0].0, w[1].1 - w[0].1)).sum()
}

/// The line with fewer points, none of the dropped ones farther than `tolerance` from it (Douglas and Peucker 1973).
pub fn simplified(points: &[(f64, f64)], tolerance: f64) -> Vec<(f64, f64)> {
    if points.len() < 3 {
        return points.to_vec();
    }
    let mut keep = vec![false; points.len()];
    (keep[0], keep[points.len() - 1]) = (true, true);
    let mut open = vec![(0, points.len() - 1)];
    while let Some((from, to)) = open.pop() {
        let far = (from + 1..to)
            .map(|index| (index, from_segment(points[index], points[from], points[to])))
            .fold((from, 0.0), |best, next| if next.1 > best.1 { next } else { best });
        if far.1 > tolerance {
            keep[far.0] = true;
            open.push((from, far.0));
            open.push((far.0, to));
        }
    }
    points.iter().zip(&keep).filter(|(_, keep)| **keep).map(|(&point, _)| point).collect()
}

/// Distance of a point from a segment.
pub fn from_segment(p: (f64, f64), a: (f64, f64), b: (f64, f64)) -> f64 {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let square = dx * dx + dy * dy;
    let t = if square > 0.0 { (((p.0 - a.0) * dx + (p.1 - a.1) * dy) / square).clamp(0.0, 1.0) } else { 0.0 };
    libm::hypot(p.0 - a.0 - t * dx, p.1 - a.1 - t * dy)
}

/// Distance in mm from each pixel to the nearest pixel without copper (city-block steps of 1 and diagonals of 1.4,
/// off by at most 8 %; Borgefors 1986).
fn clearance_mm(density: &Density, view: &View, raster: &Raster, step: (f64, f64)) -> Vec<f64> {
    let (nx, ny) = (raster.nx, raster.ny);
    let mut far = vec![0.0_f64; nx * ny];
    for iy in 0..ny {
        for ix in 0..nx {
            let at = (view.x + (ix as f64 + 0.5) * step.0, view.y + (iy as f64 + 0.5) * step.1);
            if density.is_copper(view.back(at)) {
                far[iy * nx + ix] = 1e9;
            }
        }
    }
    let unit = 0.5 * (step.0 + step.1);
    let diagonal = unit * std::f64::consts::SQRT_2;
    for iy in 0..ny {
        for ix in 0..nx {
            let mut best = far[iy * nx + ix];
            if ix > 0 {
                best = best.min(far[iy * nx + ix - 1] + unit);
            }
            if iy > 0 {
                best = best.min(far[(iy - 1) * nx + ix] + unit);
                if ix > 0 {
                    best = best.min(far[(iy - 1) * nx + ix - 1] + diagonal);
                }
                if ix + 1 < nx {
                    best = best.min(far[(iy - 1) * nx + ix + 1] + diagonal);
                }
            }
            far[iy * nx + ix] = best;
        }
    }
    for iy in (0..ny).rev() {
        for ix in (0..nx).rev() {
            let mut best = far[iy * nx + ix];
            if ix + 1 < nx {
                best = best.min(far[iy * nx + ix + 1] + unit);
            }
            if iy + 1 < ny {
                best = best.min(far[(iy + 1) * nx + ix] + unit);
                if ix > 0 {
                    best = best.min(far[(iy + 1) * nx + ix - 1] + diagonal);
                }
                if ix + 1 < nx {
                    best = best.min(far[(iy + 1) * nx + ix + 1] + diagonal);
                }
            }
            far[iy * nx + ix] = best;
        }
    }
    far
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::{Grid, Point};

    #[test]
    fn a_ring_of_equal_density_is_found_at_its_radius() {
        let grid = Grid { origin: Point::mm(-10.0, -10.0), cell_m: 0.1e-3, nx: 200, ny: 200 };
        let scale = DensityScale::new(0.4e-3, 60.0);
        let values = (0..grid.len())
            .map(|index| 1e-1 / grid.centre(index % 200, index / 200).length())
            .collect::<Vec<f64>>();
        let density = Density::new(grid, vec![true; grid.len()], values);
        let view = View::filling(grid.bounds(), 0.0, 0.0, 100.0, 100.0);
        let all = contours(&density, &view, &scale, [1e-1 / 2e-3, 1e-1 / 4e-3, 1e-1 / 30e-3], &|_| false);
        for (contour, radius_mm) in all.iter().zip([2.0, 4.0]) {
            assert_eq!(contour.lines.len(), 1);
            for point in &contour.lines[0] {
                let got = view.back(*point).length() * 1e3;
                assert!((got - radius_mm).abs() < 0.01, "{got} instead of {radius_mm}");
            }
        }
        assert!(all[2].lines.is_empty(), "beyond the corners of the plane there is no line");
    }

    #[test]
    fn few_points_are_enough_for_a_straight_line() {
        let line: Vec<(f64, f64)> = (0..100).map(|i| (f64::from(i), 0.001 * f64::from(i % 2))).collect();
        assert_eq!(simplified(&line, 0.03), [(0.0, 0.0), (99.0, 0.001)]);
    }
}
