//! Problems that several checks share.
use ebbmap::geom::{Grid, Point};
use ebbmap::sheet::{
    Drive, Injection, OperatingPoint, Patch, Problem, Sheet, Solution, SourceStrip, StripProfile, System,
};
use num_complex::Complex64;

/// A full rectangle of copper at height zero.
pub fn plate(nx: usize, ny: usize, cell_m: f64) -> Problem {
    let grid = Grid { origin: Point::new(0.0, 0.0), cell_m, nx, ny };
    Problem { grid, sheets: vec![Sheet::new(vec![true; nx * ny], 0.0)], verticals: Vec::new() }
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
