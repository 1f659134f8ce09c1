//! Problems that several checks share.
use ebbmap::geom::{Grid, Point};
use ebbmap::sheet::{
    Drive, Injection, OperatingPoint, Patch, Problem, Sheet, Solution, SourceStrip, StripProfile, System,
};
use num_complex::Complex64;

/// A full rectangle of copper at height zero.
pub fn plate(nx: usize, ny: usize, cell_m: f64) -> Problem {
    let grid = Grid { origin: Point::new(0.0, 0.0), cell_m, nx, ny };
    Problem {
        grid,
        sheets: vec![Sheet::new(vec![true; nx * ny], 0.0)],
        verticals: Vec::new(),
        gaps: Vec::new(),
    }
}

/// Everything at one cell.
pub fn cell(problem: &Problem, sheet: usize, ix: usize, iy: usize) -> Patch {
    Patch { sheet, cells: vec![(problem.grid.index(ix, iy), 1.0)] }
}

/// A filament with unit current.
pub fn filament(from: Point, to: Point, z_m: f64) -> SourceStrip {
    SourceStrip { from, to, z_m, width_m: 0.0, profile: StripProfile::Uniform, current_a: 1.0 }
}

/// The return of a unit current that enters at `receiver` and leaves at `driver`.
pub fn landings(driver: Patch, receiver: Patch) -> Vec<Injection> {
    vec![Injection { patch: receiver, current_a: 1.0 }, Injection { patch: driver, current_a: -1.0 }]
}

/// A frequency with the same real or complex impedance for all sheets.
pub fn at(frequency_hz: f64, zs_ohm: Complex64, sheets: usize) -> OperatingPoint {
    OperatingPoint { frequency_hz, zs_ohm: vec![zs_ohm; sheets] }
}

/// Mean of the two face currents of a cell over its width, along x and y, in A/m.
pub fn density(
    system: &System,
    solution: &Solution,
    sheet: usize,
    ix: usize,
    iy: usize,
) -> (Complex64, Complex64) {
    let grid = &system.problem().grid;
    let (jx, jy) = (&solution.jx[sheet], &solution.jy[sheet]);
    let x = jx[iy * (grid.nx + 1) + ix] + jx[iy * (grid.nx + 1) + ix + 1];
    let y = jy[iy * grid.nx + ix] + jy[(iy + 1) * grid.nx + ix];
    (x / (2.0 * grid.cell_m), y / (2.0 * grid.cell_m))
}

/// Solves or stops the test.
pub fn solve(system: &System, drive: &Drive, point: &OperatingPoint, tolerance: f64) -> Solution {
    system.solve(drive, point, tolerance).expect("the solve converges")
}

/// Prints both numbers and stops if they differ by more than `tolerance` of the second.
#[track_caller]
pub fn close(what: &str, got: f64, expected: f64, tolerance: f64) {
    let error = (got - expected).abs() / expected.abs().max(1e-300);
    println!("{what}: {got:.9e} against {expected:.9e}, relative error {error:.1e}");
    assert!(error <= tolerance, "{what}: {got:.12e} against {expected:.12e}, relative error {error:.1e}");
}

/// The same for complex numbers.
#[track_caller]
pub fn close_complex(what: &str, got: Complex64, re: f64, im: f64, tolerance: f64) {
    let expected = Complex64::new(re, im);
    let error = (got - expected).norm() / expected.norm();
    println!("{what}: {got:.9e} against {expected:.9e}, relative error {error:.1e}");
    assert!(error <= tolerance, "{what}: {got:.12e} against {expected:.12e}, relative error {error:.1e}");
}

/// Cells of a disc with copper, weighted by the area inside (8 x 8 samples of each cell).
pub fn disc(problem: &Problem, sheet: usize, middle: Point, radius_m: f64) -> Patch {
    let grid = &problem.grid;
    let mut cells = Vec::new();
    for iy in 0..grid.ny {
        for ix in 0..grid.nx {
            let index = grid.index(ix, iy);
            let centre = grid.centre(ix, iy);
            if !problem.sheets[sheet].copper[index] || centre.distance(middle) > radius_m + grid.cell_m {
                continue;
            }
            let sample = |k: usize| ((k as f64 + 0.5) / 8.0 - 0.5) * grid.cell_m;
            let inside = (0..64)
                .filter(|k| (centre + Point::new(sample(k % 8), sample(k / 8))).distance(middle) < radius_m)
                .count();
            if inside > 0 {
                cells.push((index, inside as f64));
            }
        }
    }
    let sum: f64 = cells.iter().map(|(_, weight)| weight).sum();
    Patch { sheet, cells: cells.into_iter().map(|(index, weight)| (index, weight / sum)).collect() }
}

/// Removes the copper of a sheet wherever `hole` holds at the middle of a cell.
pub fn cut_out(problem: &mut Problem, sheet: usize, hole: impl Fn(Point) -> bool) {
    let grid = problem.grid;
    for iy in 0..grid.ny {
        for ix in 0..grid.nx {
            if hole(grid.centre(ix, iy)) {
                problem.sheets[sheet].copper[grid.index(ix, iy)] = false;
            }
        }
    }
}

/// Current that leaves each cell of a sheet through its faces.
pub fn leaves(problem: &Problem, solution: &Solution, sheet: usize) -> Vec<Complex64> {
    let (nx, ny) = (problem.grid.nx, problem.grid.ny);
    let (jx, jy) = (&solution.jx[sheet], &solution.jy[sheet]);
    let at = |i: usize| {
        let (ix, iy) = (i % nx, i / nx);
        jx[iy * (nx + 1) + ix + 1] - jx[iy * (nx + 1) + ix] + jy[(iy + 1) * nx + ix] - jy[iy * nx + ix]
    };
    (0..nx * ny).map(at).collect()
}
