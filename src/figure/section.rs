//! Flux of the return current through sections across the track.
//!
//! Between faces the density is taken as the field with the given face currents whose components are linear along
//! their own direction inside a cell (lowest-order face elements). It has the divergence of the face currents, so
//! the flux through any line between two corners of cells is exactly that of the faces between them. Where a line ends
//! inside a cell the stream function, linear so far, is bent by its second differences over the neighbouring faces.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | K | density per ampere of net current | A/m per A |
//! | t | unit vector along the track, towards the receiver | 1 |
//! | x | distance from the track along the section | m |
//! | F_X = -Re int K t dx over abs(x) <= X | share of the return within X of the track | 1 |

use crate::field::ReturnMap;
use crate::geom::Point;

/// In-phase return within X of the track for each of the rising distances `within_m`; station at `at`, `along` the
/// unit vector of the track. Source: the definition of F above; phase reference is the track current.
pub fn shares(map: &ReturnMap, at: Point, along: Point, within_m: &[f64]) -> Vec<f64> {
    let mut sums = vec![0.0; within_m.len()];
    for side in [1.0, -1.0] {
        add_ray(map, at, along, side, within_m, &mut sums);
    }
    sums.iter_mut().for_each(|sum| *sum = -*sum);
    sums
}

/// The same on one side of the track alone: within X to its left (`side` 1) or right (`side` -1). The far rest of a
/// section is the share of the return that goes round on that side.
pub fn one_side(map: &ReturnMap, at: Point, along: Point, side: f64, within_m: &[f64]) -> Vec<f64> {
    let mut sums = vec![0.0; within_m.len()];
    add_ray(map, at, along, side, within_m, &mut sums);
    sums.iter_mut().for_each(|sum| *sum = -*sum);
    sums
}

/// In-phase density in A/m per A along the unit vector `along` at a point of the board, zero beside the grid.
pub fn density(map: &ReturnMap, at: Point, along: Point) -> f64 {
    in_phase(map, (at - map.grid.origin) * (1.0 / map.grid.cell_m), along)
}

/// Adds the in-phase flux along `along` through the ray from `at` to the left (side 1) or right (side -1), up to each
/// distance.
fn add_ray(map: &ReturnMap, at: Point, along: Point, side: f64, within_m: &[f64], sums: &mut [f64]) {
    let grid = &map.grid;
    let out = Point::new(-along.y * side, along.x * side);
    let start = (at - grid.origin) * (1.0 / grid.cell_m);
    // Distance along the ray, in metres, to the next line x = integer and y = integer.
    let crossing = |position: f64, slope: f64, n: f64| {
        if slope == 0.0 { f64::INFINITY } else { (n - position) / slope * grid.cell_m }
    };
    let first_line = |position: f64, slope: f64| {
        if slope > 0.0 { position.floor() + 1.0 } else { position.ceil() - 1.0 }
    };
    let (mut line_x, mut line_y) = (first_line(start.x, out.x), first_line(start.y, out.y));
    let mut from = 0.0;
    let mut flux = 0.0;
    let mut sample = 0;
    while sample < sums.len() {
        let next_x = crossing(start.x, out.x, line_x);
        let next_y = crossing(start.y, out.y, line_y);
        let next_sample = within_m[sample];
        let to = next_x.min(next_y).min(next_sample);
        if to > from {
            let middle = start + out * (0.5 * (from + to) / grid.cell_m);
            flux += in_phase(map, middle, along) * (to - from);
            from = to;
        }
        if to == next_x {
            line_x += out.x.signum();
        }
        if to == next_y {
            line_y += out.y.signum();
        }
        if to == next_sample {
            let end = start + out * (to / grid.cell_m);
            sums[sample] += flux + side * bend(map, end);
            sample += 1;
        }
    }
}

/// In-phase density in A/m per A along `along` at a point in units of cells from the grid's corner.
fn in_phase(map: &ReturnMap, at: Point, along: Point) -> f64 {
    let (nx, ny) = (map.grid.nx, map.grid.ny);
    let (ix, iy) = (at.x.floor(), at.y.floor());
    if ix < 0.0 || iy < 0.0 || ix >= nx as f64 || iy >= ny as f64 {
        return 0.0;
    }
    let (fx, fy) = (at.x - ix, at.y - iy);
    let (ix, iy) = (ix as usize, iy as usize);
    let left = iy * (nx + 1) + ix;
    let kx = (1.0 - fx) * map.jx[left].re + fx * map.jx[left + 1].re;
    let ky = (1.0 - fy) * map.jy[iy * nx + ix].re + fy * map.jy[(iy + 1) * nx + ix].re;
    (kx * along.x + ky * along.y) / map.grid.cell_m
}

/// What the stream function (Kx = d psi/dy, Ky = -d psi/dx, in-phase part) is above its bilinear form at a point in
/// units of cells: -f (1 - f)/2 times the mean second difference along each axis, where neighbours are copper.
fn bend(map: &ReturnMap, at: Point) -> f64 {
    let (nx, ny) = (map.grid.nx, map.grid.ny);
    let (x, y) = (at.x.floor(), at.y.floor());
    if x < 1.0 || y < 1.0 || x >= nx as f64 - 1.0 || y >= ny as f64 - 1.0 {
        return 0.0;
    }
    let (fx, fy) = (at.x - x, at.y - y);
    let (ix, iy) = (x as usize, y as usize);
    let whole =
        (iy - 1..=iy + 1).all(|row| map.copper[row * nx + ix - 1..=row * nx + ix + 1].iter().all(|&is| is));
    if !whole {
        return 0.0;
    }
    let jx =
        |column: usize| map.jx[(iy + 1) * (nx + 1) + column].re - map.jx[(iy - 1) * (nx + 1) + column].re;
    let jy = |row: usize| map.jy[row * nx + ix + 1].re - map.jy[row * nx + ix - 1].re;
    let along_y = (1.0 - fx) * jx(ix) + fx * jx(ix + 1);
    let along_x = (1.0 - fy) * jy(iy) + fy * jy(iy + 1);
    0.25 * (fx * (1.0 - fx) * along_x - fy * (1.0 - fy) * along_y)
}
