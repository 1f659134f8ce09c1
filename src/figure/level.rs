//! Contour levels of the density, and its integrals over the plane.

use crate::field::ReturnMap;

/// Points per cell side at which the density is sampled.
const SAMPLES: usize = 3;
/// Classes of the histogram per factor of e, and the factor's power down to which it reaches below the largest.
const CLASSES: f64 = 100.0;
const REACH: f64 = 30.0;

/// Densities in A/m per A such that the part of the plane where |K| is larger holds `parts` (0 to 1) of the integral
/// of |K| over the plane. |K| is that of the cells (mean of the face currents divided by the side) at their middles
/// and bilinear between, as contours are drawn; where a neighbour is no copper the cell's own value stands for it.
pub fn levels<const N: usize>(map: &ReturnMap, parts: [f64; N]) -> [f64; N] {
    let (nx, ny) = (map.grid.nx, map.grid.ny);
    let density: Vec<f64> = (0..map.grid.len())
        .map(|cell| if map.copper[cell] { map.magnitude(cell % nx, cell / nx) } else { f64::NAN })
        .collect();
    let largest = density.iter().copied().fold(0.0, f64::max);
    if largest == 0.0 {
        return [0.0; N];
    }
    // Sums of the density by class of ln(largest/density).
    let classes = (CLASSES * REACH) as usize;
    let mut sums = vec![0.0; classes + 1];
    let or = |value: f64, own: f64| if value.is_nan() { own } else { value };
    for iy in 0..ny {
        for ix in 0..nx {
            let own = density[iy * nx + ix];
            if own.is_nan() {
                continue;
            }
            let at = |dx: isize, dy: isize| {
                let (x, y) = (ix as isize + dx, iy as isize + dy);
                let inside = x >= 0 && y >= 0 && x < nx as isize && y < ny as isize;
                if inside { or(density[y as usize * nx + x as usize], own) } else { own }
            };
            for sy in 0..SAMPLES {
                for sx in 0..SAMPLES {
                    let place = |s: usize| (s as f64 + 0.5) / SAMPLES as f64 - 0.5;
                    let (fx, fy) = (place(sx), place(sy));
                    let (dx, dy) = (fx.signum() as isize, fy.signum() as isize);
                    let (fx, fy) = (fx.abs(), fy.abs());
                    let here = own * (1.0 - fx) + at(dx, 0) * fx;
                    let there = at(0, dy) * (1.0 - fx) + at(dx, dy) * fx;
                    let value = here * (1.0 - fy) + there * fy;
                    if value > 0.0 {
                        let class = (CLASSES * libm::log(largest / value)).max(0.0) as usize;
                        sums[class.min(classes)] += value;
                    }
                }
            }
        }
    }
    let total: f64 = sums.iter().sum();
    parts.map(|part| {
        let mut before = 0.0;
        for (class, &sum) in sums.iter().enumerate() {
            if sum > 0.0 && before + sum >= part * total {
                let depth = class as f64 + (part * total - before) / sum;
                return largest * libm::exp(-depth / CLASSES);
            }
            before += sum;
        }
        0.0
    })
}

/// int |Re K| dA in metres per ampere over the plane: the mean length of the in-phase return where it runs one way.
pub fn in_phase_path_m(map: &ReturnMap) -> f64 {
    let grid = &map.grid;
    let area = grid.cell_m * grid.cell_m;
    let row = |iy: usize| -> f64 {
        let cells = (0..grid.nx).filter(|&ix| map.copper[grid.index(ix, iy)]);
        let size = |ix| {
            let (kx, ky) = map.density(ix, iy);
            libm::hypot(kx.re, ky.re)
        };
        cells.map(size).sum()
    };
    (0..grid.ny).map(row).sum::<f64>() * area
}
