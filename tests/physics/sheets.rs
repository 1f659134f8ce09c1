//! Several sheets and what joins them: shares, barrels, rings, bridges, connectors, counts of steps.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, OperatingPoint, Patch, Problem, Sheet, Solution, System, Vertical, barrel};
use ebbmap::spread::{pair, stripline};
use num_complex::Complex64;
use std::f64::consts::PI;

const MU0: f64 = 4e-7 * PI;
const ZS: Complex64 = Complex64::new(0.5e-3, 0.0);

fn join(from: Patch, to: Patch, ohm: f64, henry: f64, farad: Option<f64>) -> Vertical {
    Vertical { from, to, resistance_ohm: ohm, inductance_h: henry, capacitance_f: farad }
}

/// Two plates at heights `z`, bonded by rings of 24 vias round the landings of a track on `length`.
fn bonded(z: [f64; 2], d: f64, length: f64, width: f64) -> (System, Drive) {
    let (nx, ny) = ((length / d).round() as usize, (width / d).round() as usize | 1);
    let mut problem = plate(nx, ny, d);
    problem.sheets[0].z_m = z[0];
    problem.sheets.push(Sheet::new(vec![true; nx * ny], z[1]));
    let y = problem.grid.centre(0, ny / 2).y;
    let ends = [Point::new(4e-3, y), Point::new(length - 4e-3, y)];
    for end in ends {
        for k in 0..24 {
            let angle = PI / 12.0 * k as f64;
            let at = end + Point::new(angle.cos(), angle.sin()) * 3e-3;
            let (top, bottom) = (disc(&problem, 0, at, 0.3e-3), disc(&problem, 1, at, 0.3e-3));
            problem.verticals.push(join(top, bottom, 1e-4, 1e-12, None));
        }
    }
    let landing = |at: Point| disc(&problem, 0, at, 0.5e-3);
    let drive = Drive {
        strips: vec![filament(ends[0], ends[1], 0.0)],
        injections: landings(landing(ends[0]), landing(ends[1])),
    };
    (System::new(problem).unwrap(), drive)
}

/// Part of the return in a sheet at the middle of the track, and densities at the track and 1 mm beside.
fn middle(system: &System, solution: &Solution, sheet: usize) -> (Complex64, Vec<Complex64>) {
    let grid = system.problem().grid;
    let column = (0..grid.ny).map(|iy| solution.jx[sheet][iy * (grid.nx + 1) + grid.nx / 2]);
    let beside = (1e-3 / grid.cell_m).round() as usize;
    let at = |offset: usize| -density(system, solution, sheet, grid.nx / 2, grid.ny / 2 + offset).0;
    (-column.sum::<Complex64>(), vec![at(0), at(beside)])
}

#[test]
fn two_sheets_share_the_return() {
    for (name, z) in [("behind", [-0.2e-3, -1.2e-3]), ("between", [-0.2e-3, 0.8e-3])] {
        let (system, drive) = bonded(z, 0.5e-3, 130e-3, 60e-3);
        let prepared = system.prepare(&drive).unwrap();
        // a plane of finite width takes about 2 s/(pi W) from the flux between the sheets: 1 % here
        for f in [1e3, 1e4, 1e5, 1e6, 1e8] {
            let solution = system.solve_prepared(&prepared, &at(f, ZS, 2), 1e-5).unwrap();
            let (share, _) = middle(&system, &solution, 0);
            let expected = match name {
                "behind" => pair::share_of_nearer(f, ZS, ZS, 1e-3),
                _ => pair::share_between(f, ZS, ZS, 0.2e-3, 0.8e-3),
            };
            println!("{name} f {f:e}: {} steps, share {share:.4} against {expected:.4}", solution.steps);
            assert!((share - expected).norm() < 0.01, "{name} {f:e}: {share} against {expected}");
        }
    }
}

/// Densities under two sheets from 1 MHz on; 2 x 2 systems in wave numbers, panel Gauss quadrature, averaged over the
/// cells here by Simpson's rule through the transform itself.
#[test]
fn densities_on_two_sheets() {
    for (name, z) in [("behind", [-0.2e-3, -1.2e-3]), ("between", [-0.2e-3, 0.8e-3])] {
        let (system, drive) = bonded(z, 0.2e-3, 60e-3, 20e-3);
        let prepared = system.prepare(&drive).unwrap();
        for f in [1e6, 1e7] {
            let solution = system.solve_prepared(&prepared, &at(f, ZS, 2), 1e-6).unwrap();
            let all = [0, 1].map(|sheet| middle(&system, &solution, sheet).1);
            for (sheet, got) in all.iter().enumerate() {
                for (x, got) in [0.0, 1e-3].iter().zip(got) {
                    let expected = wave_numbers(f, z, *x, 0.2e-3)[sheet];
                    let peak = wave_numbers(f, z, 0.0, 0.2e-3)[0].norm();
                    println!("{name} f {f:e} sheet {sheet} x {x}: {got:.3} against {expected:.3}");
                    // small values as a part of the largest
                    assert!(
                        (got - expected).norm() < 0.02 * expected.norm() + 2e-3 * peak,
                        "{got} {expected}"
                    );
                }
            }
        }
    }
}

/// Mean of -K/I over a cell at x of both sheets at heights z under a filament at zero: Simpson's rule in k.
fn wave_numbers(f: f64, z: [f64; 2], x: f64, cell: f64) -> [Complex64; 2] {
    let n = 40000;
    let most = 30.0 / 0.2e-3;
    let step = most / n as f64;
    let mut sum = [Complex64::default(); 2];
    for i in 1..=n {
        let k = i as f64 * step;
        let m = Complex64::new(0.0, PI * f * MU0 / k);
        let far = (-k * (z[0] - z[1]).abs()).exp();
        let source = [(-k * z[0].abs()).exp(), (-k * z[1].abs()).exp()];
        let (a, b) = (ZS + m, m * far);
        let determinant = a * a - b * b;
        let weight = if i == n {
            1.0
        } else if i % 2 == 1 {
            4.0
        } else {
            2.0
        };
        let mean = (k * cell / 2.0).sin() / (k * cell / 2.0) * (k * x).cos() * weight * step / 3.0 / PI;
        sum[0] += m * (a * source[0] - b * source[1]) / determinant * mean;
        sum[1] += m * (a * source[1] - b * source[0]) / determinant * mean;
    }
    sum
}

#[test]
fn stripline_at_high_frequency() {
    let (system, drive) = bonded([-0.4e-3, 0.6e-3], 0.2e-3, 60e-3, 20e-3);
    let solution = solve(&system, &drive, &at(1e9, ZS, 2), 1e-6);
    let grid = system.problem().grid;
    for (sheet, near, far) in [(0, 0.4e-3, 0.6e-3), (1, 0.6e-3, 0.4e-3)] {
        let (share, _) = middle(&system, &solution, sheet);
        assert!((share.re - stripline::share(near, far)).abs() < 0.01, "{share}");
        for offset in 0..6 {
            let got = -density(&system, &solution, sheet, grid.nx / 2, grid.ny / 2 + offset).0.re;
            let x = offset as f64 * grid.cell_m;
            let half = grid.cell_m / 2.0;
            let expected = (stripline::share_within(x + half, near, far)
                - stripline::share_within(x - half, near, far))
                / (2.0 * grid.cell_m);
            close(&format!("stripline sheet {sheet}, cell {offset}"), got, expected, 0.02);
        }
    }
}

/// Offsets in cells from the barrel's axis.
fn offsets(problem: &Problem, patch: &Patch, at: Point) -> Vec<(f64, f64, f64)> {
    let grid = &problem.grid;
    let relative = |cell: usize| (grid.centre(cell % grid.nx, cell / grid.nx) - at) * (1.0 / grid.cell_m);
    patch.cells.iter().map(|&(cell, weight)| (relative(cell).x, relative(cell).y, weight)).collect()
}

/// Loop inductance of one barrel (the port) against others, planes 0.2 mm apart, barrels of radius 0.15 mm.
fn barrels(d: f64, width: f64, others: &[Point]) -> (f64, Vec<Complex64>) {
    let (gap, radius) = (0.2e-3, 0.15e-3);
    let n = (width / d).round() as usize | 1;
    let mut problem = plate(n, n, d);
    problem.sheets.push(Sheet::new(vec![true; n * n], -gap));
    let centre = problem.grid.centre(n / 2, n / 2);
    let ends = |at: Point, problem: &Problem| (disc(problem, 0, at, radius), disc(problem, 1, at, radius));
    let missing = |at: Point, problem: &Problem| {
        barrel::missing_inductance_h(d, gap, radius, &offsets(problem, &disc(problem, 0, at, radius), at))
    };
    for offset in others {
        let at = centre + *offset;
        let (from, to) = ends(at, &problem);
        let henry = missing(at, &problem);
        problem.verticals.push(join(from, to, 1e-9, henry, None));
    }
    let (top, bottom) = ends(centre, &problem);
    let own = missing(centre, &problem);
    let drive = Drive { strips: Vec::new(), injections: landings(bottom, top) };
    let system = System::new(problem).unwrap();
    let solution = solve(&system, &drive, &at(1e9, Complex64::new(1e-6, 0.0), 2), 1e-7);
    (solution.sheet_impedance_ohm.im / (2.0 * PI * 1e9) + own, solution.verticals)
}

/// Cells of a fifth, a half and the whole of an antipad of 0.6 mm.
const CELLS: [f64; 3] = [0.12e-3, 0.3e-3, 0.6e-3];

#[test]
fn via_pair_between_perfect_planes() {
    for d in CELLS {
        for spacing in [2e-3, 3.1e-3] {
            let (got, currents) = barrels(d, 25e-3, &[Point::new(spacing, 0.0)]);
            let exact = MU0 * 0.2e-3 / PI * libm::acosh(spacing / 0.3e-3);
            assert!((currents[0] - 1.0).norm() < 1e-9);
            close(&format!("via pair, D {spacing}, d {d}"), got, exact, 0.05);
        }
    }
}

#[test]
fn ring_of_vias() {
    for d in CELLS {
        let b = 2.4e-3;
        let ring = [Point::new(b, 0.0), Point::new(0.0, b), Point::new(-b, 0.0), Point::new(0.0, -b)];
        let (got, currents) = barrels(d, 25e-3, &ring);
        // four wires of radius a on a circle of radius b have the geometric mean distance (4 a b^3)^(1/4)
        let (n, a) = (4.0, 0.15e-3);
        let exact = MU0 * 0.2e-3 / (2.0 * PI) * ((b / a).ln() + (b / (n * a)).ln() / n);
        close(&format!("ring, d {d}"), got, exact, 0.05);
        let sum: Complex64 = currents.iter().sum();
        assert!((sum - 1.0).norm() < 1e-9, "{sum}");
        assert!(currents.iter().all(|i| (i - currents[0]).norm() < 1e-6), "{currents:?}");
    }
}

/// A plate split along the middle, landings left and right, and a track over both.
fn split() -> (Problem, Drive) {
    let mut problem = plate(60, 40, 0.25e-3);
    cut_out(&mut problem, 0, |p| (p.x - 7.5e-3).abs() < 0.3e-3);
    let (from, to) = (Point::mm(2.0, 5.0), Point::mm(13.0, 5.0));
    let injections = landings(disc(&problem, 0, from, 0.4e-3), disc(&problem, 0, to, 0.4e-3));
    (problem, Drive { strips: vec![filament(from, to, 0.2e-3)], injections })
}

fn over_the_split(problem: &Problem, y_mm: f64) -> [Patch; 2] {
    [6.9, 8.1].map(|x| disc(problem, 0, Point::mm(x, y_mm), 0.3e-3))
}

#[test]
fn bridges_over_a_split() {
    let (mut problem, drive) = split();
    let [left, right] = over_the_split(&problem, 3.0);
    problem.verticals = vec![join(right.clone(), left.clone(), 0.01, 1e-9, None)];
    let one = System::new(problem.clone()).unwrap();
    let solution = solve(&one, &drive, &at(0.0, ZS, 1), 1e-9);
    assert!((solution.verticals[0] - 1.0).norm() < 1e-9, "{}", solution.verticals[0]);
    // 1 ohm and 1 nF between the same pads: the divider alone decides
    problem.verticals =
        vec![join(right.clone(), left.clone(), 1.0, 0.0, None), join(right, left, 0.0, 0.0, Some(1e-9))];
    let two = System::new(problem).unwrap();
    let crossing = 1.0 / (2.0 * PI * 1e-9);
    for f in [0.1 * crossing, crossing, 10.0 * crossing] {
        let solution = solve(&two, &drive, &at(f, ZS, 1), 1e-7);
        let capacitor = 1.0 / Complex64::new(0.0, 2.0 * PI * f * 1e-9);
        let expected = capacitor / (1.0 + capacitor);
        let (resistor, all) = (solution.verticals[0], solution.verticals[0] + solution.verticals[1]);
        println!("f {f:e}: {} steps, resistor {resistor:.4} against {expected:.4}", solution.steps);
        assert!((all - 1.0).norm() < 1e-9);
        assert!((resistor - expected).norm() < 0.02);
    }
    // at DC the resistor carries all
    let solution = solve(&two, &drive, &at(0.0, ZS, 1), 1e-9);
    assert!((solution.verticals[0] - 1.0).norm() < 1e-9 && solution.verticals[1].norm() == 0.0);
}

/// Five ground pins tied inside a connector: the split against the dense solution.
#[test]
fn connector_with_five_ground_pins() {
    let mut problem = plate(18, 14, 0.3e-3);
    cut_out(&mut problem, 0, |p| (p.x - 2.6e-3).abs() < 0.2e-3 && p.y > 1.4e-3);
    for k in 0..5 {
        let at = Point::mm(4.6, 0.5 + 0.75 * k as f64);
        problem.verticals.push(join(Patch::outside(0), disc(&problem, 0, at, 0.3e-3), 5e-3, 1e-9, None));
    }
    let driver = disc(&problem, 0, Point::mm(0.7, 2.0), 0.3e-3);
    let drive = Drive {
        strips: vec![filament(Point::mm(0.7, 2.0), Point::mm(4.6, 2.0), 0.2e-3)],
        injections: landings(driver, Patch::outside(0)),
    };
    let system = System::new(problem.clone()).unwrap();
    for f in [0.0, 1e6, 1e8] {
        let point = OperatingPoint { frequency_hz: f, zs_ohm: vec![ZS] };
        let solution = solve(&system, &drive, &point, 1e-9);
        let off = crate::dense::difference(&problem, &drive, &point, &solution);
        let sum: Complex64 = solution.verticals.iter().sum();
        println!("f {f:e}: {} steps, off {off:.1e}, pins {:.3?}", solution.steps, solution.verticals);
        assert!(off < 1e-6 && (sum - 1.0).norm() < 1e-9);
    }
}

/// Steps do not grow with the number of vias by more than a quarter, nor with halving the cell by more than a third.
#[test]
fn steps_do_not_grow() {
    let count = |d: f64, vias: usize| {
        let (nx, ny) = ((40e-3 / d) as usize, (30e-3 / d) as usize);
        let mut problem = plate(nx, ny, d);
        problem.sheets.push(Sheet::new(vec![true; nx * ny], -1e-3));
        let place = |k: usize, by: f64| (0.5 + by * k as f64).fract();
        for k in 0..12 {
            let at = Point::mm(3.0 + 34.0 * place(k, 0.7549), 3.0 + 24.0 * place(k, 0.5698));
            cut_out(&mut problem, k % 2, |p| p.distance(at) < 1.1e-3);
        }
        for k in 0..vias {
            let at = Point::mm(1.0 + 38.0 * place(k + 1, 0.618034), 1.0 + 28.0 * place(k + 1, 0.414214));
            let patches = [0, 1].map(|sheet| disc(&problem, sheet, at, 0.3e-3));
            if let [from, to] = patches
                && !from.cells.is_empty()
                && !to.cells.is_empty()
            {
                problem.verticals.push(join(from, to, 1e-3, 1e-10, None));
            }
        }
        let (from, to) = (Point::mm(5.0, 15.0), Point::mm(35.0, 14.0));
        let injections = landings(disc(&problem, 0, from, 0.6e-3), disc(&problem, 0, to, 0.6e-3));
        let drive = Drive { strips: vec![filament(from, to, 0.3e-3)], injections };
        let system = System::new(problem).unwrap();
        let prepared = system.prepare(&drive).unwrap();
        let steps =
            [1e3, 1e5, 1e7].map(|f| system.solve_prepared(&prepared, &at(f, ZS, 2), 1e-5).unwrap().steps);
        println!("cell {d}, {vias} vias: steps {steps:?}");
        steps
    };
    let base = count(0.5e-3, 2);
    for (other, most) in
        [(count(0.5e-3, 100), 1.25), (count(0.5e-3, 400), 1.25), (count(0.25e-3, 2), 4.0 / 3.0)]
    {
        for (a, b) in base.iter().zip(&other) {
            // one step is the grain of the count
            assert!(*b as f64 <= most * *a as f64 + 1.0, "{base:?} becomes {other:?}");
        }
    }
}
