//! A map of a whole plane from a fine solve in a window and the survey outside of it.
//!
//! Outside, the coarse face currents are divided: evenly among the fine faces on a coarse one, linearly between two
//! coarse ones, which keeps the divergence. Towards the window's rim, a free edge that the board does not have, the
//! solve fades into the survey over the margin.

use crate::geom::Grid;
use num_complex::Complex64;

/// Cells of the fine grid over which a window fades into the survey.
const FADE: f64 = 8.0;

/// Face currents on a grid.
#[derive(Clone, Debug)]
pub struct Faces {
    /// Cells.
    pub grid: Grid,
    /// Through vertical faces, as in a return map.
    pub jx: Vec<Complex64>,
    /// Through horizontal faces.
    pub jy: Vec<Complex64>,
}

/// Cells from the corner of `whole` to that of `part`, both of the same size.
fn offset(whole: &Grid, part: &Grid) -> (isize, isize) {
    let away = (part.origin - whole.origin) * (1.0 / whole.cell_m);
    (away.x.round() as isize, away.y.round() as isize)
}

/// The currents of `coarse` (`jx`, `jy` on its faces) on the smaller cells of `grid`.
pub fn refined(coarse: &Grid, jx: &[Complex64], jy: &[Complex64], grid: &Grid) -> Faces {
    let ratio = (coarse.cell_m / grid.cell_m).round().max(1.0);
    let zero = Complex64::default();
    if jx.is_empty() || jy.is_empty() {
        let (jx, jy) = (vec![zero; (grid.nx + 1) * grid.ny], vec![zero; grid.nx * (grid.ny + 1)]);
        return Faces { grid: *grid, jx, jy };
    }
    // Positions in coarse cells of fine lines.
    let start = (grid.origin - coarse.origin) * (1.0 / coarse.cell_m);
    let place = |line: usize, start: f64, count: usize| {
        let at = ((line as f64 + start * ratio).round() / ratio).max(0.0);
        let cell = (at.floor() as usize).min(count - 1);
        (cell, at - cell as f64)
    };
    let middle = |line: usize, start: f64| -> isize {
        (((line as f64 + 0.5) + (start * ratio).round()) / ratio).floor() as isize
    };
    let mut faces = Faces {
        grid: *grid,
        jx: vec![zero; (grid.nx + 1) * grid.ny],
        jy: vec![zero; grid.nx * (grid.ny + 1)],
    };
    for iy in 0..grid.ny {
        let row = middle(iy, start.y);
        if row < 0 || row >= coarse.ny as isize {
            continue;
        }
        let row = row as usize * (coarse.nx + 1);
        for ix in 0..=grid.nx {
            let (cell, part) = place(ix, start.x, coarse.nx);
            if part <= 1.0 {
                let value = jx[row + cell] * (1.0 - part) + jx[row + cell + 1] * part;
                faces.jx[iy * (grid.nx + 1) + ix] = value / ratio;
            }
        }
    }
    for iy in 0..=grid.ny {
        let (row, part) = place(iy, start.y, coarse.ny);
        if part > 1.0 {
            continue;
        }
        for ix in 0..grid.nx {
            let column = middle(ix, start.x);
            if column >= 0 && column < coarse.nx as isize {
                let at = row * coarse.nx + column as usize;
                faces.jy[iy * grid.nx + ix] = (jy[at] * (1.0 - part) + jy[at + coarse.nx] * part) / ratio;
            }
        }
    }
    faces
}

impl Faces {
    /// Puts the currents of a window over these.
    pub fn lay_over(&mut self, part: &Faces) {
        let (x0, y0) = offset(&self.grid, &part.grid);
        let (x0, y0) = (x0.max(0) as usize, y0.max(0) as usize);
        let (nx, ny) = (part.grid.nx, part.grid.ny);
        // Weight of the window at a line or middle `at` (in cells from its corner), by sides that are not the board's.
        let ramp = |at: f64, count: usize, first: usize, whole: usize| {
            let low = if first == 0 { 1.0 } else { (at / FADE).min(1.0) };
            let high = if first + count >= whole { 1.0 } else { ((count as f64 - at) / FADE).min(1.0) };
            f64::min(low, high).max(0.0)
        };
        let weight = |x: f64, y: f64| f64::min(ramp(x, nx, x0, self.grid.nx), ramp(y, ny, y0, self.grid.ny));
        for iy in 0..ny {
            for ix in 0..=nx {
                let w = weight(ix as f64, iy as f64 + 0.5);
                let to = &mut self.jx[(y0 + iy) * (self.grid.nx + 1) + x0 + ix];
                *to = *to * (1.0 - w) + part.jx[iy * (nx + 1) + ix] * w;
            }
        }
        for iy in 0..=ny {
            for ix in 0..nx {
                let w = weight(ix as f64 + 0.5, iy as f64);
                let to = &mut self.jy[(y0 + iy) * self.grid.nx + x0 + ix];
                *to = *to * (1.0 - w) + part.jy[iy * nx + ix] * w;
            }
        }
    }
}

/// Puts the cells of a window over `whole`.
pub fn lay_cells_over(whole_grid: &Grid, whole: &mut [bool], part_grid: &Grid, part: &[bool]) {
    let (x0, y0) = offset(whole_grid, part_grid);
    let (x0, y0) = (x0.max(0) as usize, y0.max(0) as usize);
    for (iy, row) in part.chunks_exact(part_grid.nx).enumerate() {
        let first = (y0 + iy) * whole_grid.nx + x0;
        whole[first..first + part_grid.nx].copy_from_slice(row);
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::Point;

    #[test]
    fn refinement_keeps_the_divergence() {
        let coarse = Grid { origin: Point::new(0.0, 0.0), cell_m: 4.0, nx: 3, ny: 2 };
        let fine = Grid { origin: Point::new(0.0, 0.0), cell_m: 1.0, nx: 12, ny: 8 };
        let value = |i: usize| Complex64::new((i * i % 7) as f64 - 2.0, (i % 5) as f64);
        let jx: Vec<Complex64> = (0..8).map(value).collect();
        let jy: Vec<Complex64> = (3..12).map(value).collect();
        let faces = refined(&coarse, &jx, &jy, &fine);
        for iy in 0..8 {
            for ix in 0..12 {
                let (cx, cy) = (ix / 4, iy / 4);
                let out = |jx: &[Complex64], jy: &[Complex64], x: usize, y: usize, nx: usize| {
                    jx[y * (nx + 1) + x + 1] - jx[y * (nx + 1) + x] + jy[(y + 1) * nx + x] - jy[y * nx + x]
                };
                let coarse = out(&jx, &jy, cx, cy, 3) / 16.0;
                let fine = out(&faces.jx, &faces.jy, ix, iy, 12);
                assert!((coarse - fine).norm() < 1e-12, "{ix} {iy}: {coarse} {fine}");
            }
        }
        let sum: Complex64 = (0..4).map(|iy| faces.jx[iy * 13 + 4]).sum();
        assert!((sum - jx[1]).norm() < 1e-12);
    }
}
