//! Direct current: closed forms of plane potential theory; conservation and power at any frequency.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, Patch, Problem, System};
use num_complex::Complex64;
use std::f64::consts::PI;

const RS: Complex64 = Complex64::new(0.5e-3, 0.0);

fn column(problem: &Problem, ix: usize) -> Patch {
    let ny = problem.grid.ny;
    Patch { sheet: 0, cells: (0..ny).map(|iy| (problem.grid.index(ix, iy), 1.0 / ny as f64)).collect() }
}

fn direct(system: &System, from: Patch, to: Patch) -> ebbmap::sheet::Solution {
    let drive = Drive { strips: Vec::new(), injections: landings(to, from) };
    solve(system, &drive, &at(0.0, RS, 1), 1e-9)
}

#[test]
fn strip_resistance() {
    let problem = plate(90, 24, 0.5e-3);
    let system = System::new(problem.clone()).unwrap();
    let solution = direct(&system, column(&problem, 0), column(&problem, 89));
    // 89 cell widths between the middles of the end columns
    close("strip", solution.sheet_impedance_ohm.re, RS.re * 89.0 / 24.0, 1e-9);
}

#[test]
fn hole_in_a_strip() {
    let (nx, ny, a) = (360, 400, 12.0);
    let mut problem = plate(nx, ny, 1e-4);
    let middle = Point::new(nx as f64 / 2.0, ny as f64 / 2.0) * 1e-4;
    cut_out(&mut problem, 0, |p| p.distance(middle) < a * 1e-4);
    let system = System::new(problem.clone()).unwrap();
    let solution = direct(&system, column(&problem, 0), column(&problem, nx - 1));
    let uniform = 1.0 / (ny as f64 * 1e-4);
    for iy in ny / 2 + 14..ny / 2 + 60 {
        let y = iy as f64 + 0.5 - ny as f64 / 2.0;
        // the section through the middle lies on the face between two columns
        let k = solution.jx[0][iy * (nx + 1) + nx / 2].re / 1e-4;
        close(&format!("hole, y = {y} cells"), k / uniform, 1.0 + a * a / (y * y), 0.02);
    }
}

#[test]
fn van_der_pauw_square() {
    let n = 160;
    let problem = plate(n, n, 1e-4);
    let system = System::new(problem.clone()).unwrap();
    let corner = |x: usize, y: usize| cell(&problem, 0, x * (n - 1), y * (n - 1));
    let solution = direct(&system, corner(0, 0), corner(1, 0));
    let voltage = |x: usize, y: usize| solution.potential_v[0][problem.grid.index(x * (n - 1), y * (n - 1))];
    let resistance = (voltage(0, 1) - voltage(1, 1)).re;
    close("van der Pauw", resistance / RS.re, 2f64.ln() / PI, 0.002);
}

#[test]
fn two_pads() {
    let n = 421;
    let problem = plate(n, n, 1e-4);
    let system = System::new(problem.clone()).unwrap();
    let resistance = |distance: usize| {
        let left = n / 2 - distance / 2;
        let solution =
            direct(&system, cell(&problem, 0, left, n / 2), cell(&problem, 0, left + distance, n / 2));
        solution.sheet_impedance_ohm.re
    };
    let (near, far) = (resistance(10), resistance(20));
    close("two pads", (far - near) / RS.re, 2f64.ln() / PI, 0.005);
}

/// Conservation and power on a plane with voids, from DC to 1 GHz, with a complex sheet impedance.
#[test]
fn current_is_conserved_and_power_is_dissipated() {
    let mut problem = plate(80, 60, 2e-4);
    for (x, y) in [(4.1, 5.0), (9.0, 6.2), (12.3, 4.4), (7.0, 9.0)] {
        cut_out(&mut problem, 0, |p| p.distance(Point::mm(x, y)) < 0.7e-3);
    }
    cut_out(&mut problem, 0, |p| (p.x - 8e-3).abs() < 0.4e-3 && p.y > 5e-3 && p.y < 8.1e-3);
    let system = System::new(problem.clone()).unwrap();
    let strips = vec![
        filament(Point::mm(2.0, 6.0), Point::mm(9.0, 6.5), 0.3e-3),
        filament(Point::mm(9.0, 6.5), Point::mm(14.0, 8.0), 0.3e-3),
    ];
    let (driver, receiver) =
        (disc(&problem, 0, Point::mm(2.0, 6.0), 3e-4), disc(&problem, 0, Point::mm(14.0, 8.0), 3e-4));
    let drive = Drive { strips, injections: landings(driver.clone(), receiver.clone()) };
    let prepared = system.prepare(&drive).unwrap();
    for (f, zs) in [(0.0, RS), (1e3, RS), (1e6, RS), (1e9, Complex64::new(4e-3, 4e-3))] {
        let solution = system.solve_prepared(&prepared, &at(f, zs, 1), 1e-9).unwrap();
        let mut surplus = leaves(&problem, &solution, 0);
        receiver.cells.iter().for_each(|&(at, weight)| surplus[at] -= weight);
        driver.cells.iter().for_each(|&(at, weight)| surplus[at] += weight);
        let most = surplus.iter().map(|s| s.norm()).fold(0.0, f64::max);
        println!("f {f:e}: {} steps, largest surplus {most:.1e} A", solution.steps);
        assert!(most < 1e-9, "{most}");
        let port = system.transfer_ohm(&solution, f, &prepared);
        let loss = resistive_loss(&problem, &solution, zs.re);
        close(&format!("power at {f:e}"), port.re, loss, 1e-6);
        let both = (port - solution.sheet_impedance_ohm).norm() / port.norm();
        assert!(both < 1e-6, "port {port}, quadratic form {}", solution.sheet_impedance_ohm);
    }
}

/// Re(Zs) times the sum of |K|^2 dA as the discrete problem defines it: (1 + (dxx - dyy)/24) between branches.
fn resistive_loss(problem: &Problem, solution: &ebbmap::sheet::Solution, rs: f64) -> f64 {
    let (nx, ny) = (problem.grid.nx, problem.grid.ny);
    let (along_x, along_y) = problem.sheets[0].conducting_faces(&problem.grid);
    let mut sum = 0.0;
    for (currents, conducts, width, height, sign) in
        [(&solution.jx[0], &along_x, nx + 1, ny, 1.0), (&solution.jy[0], &along_y, nx, ny + 1, -1.0)]
    {
        for y in 0..height {
            for x in 0..width {
                let here = y * width + x;
                if !conducts[here] {
                    continue;
                }
                sum += currents[here].norm_sqr();
                // a second difference as a sum over pairs of neighbours: minus the squared difference
                if x + 1 < width && conducts[here + 1] {
                    sum -= sign * (currents[here + 1] - currents[here]).norm_sqr() / 24.0;
                }
                if y + 1 < height && conducts[here + width] {
                    sum += sign * (currents[here + width] - currents[here]).norm_sqr() / 24.0;
                }
            }
        }
    }
    rs * sum
}
