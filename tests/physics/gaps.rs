//! Displacement current between facing sheets.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, Gap, Patch, Problem, Sheet, SolveFailure, System};
use num_complex::Complex64;
use std::f64::consts::PI;

const EPS0: f64 = 8.854_187_812_8e-12;

/// Two plates of 30 x 20 mm, 0.2 mm of permittivity 4.3 between, nothing joins them.
fn plates(d: f64) -> (Problem, Drive) {
    let (nx, ny) = ((30e-3 / d).round() as usize, (20e-3 / d).round() as usize);
    let mut problem = plate(nx, ny, d);
    problem.sheets.push(Sheet::new(vec![true; nx * ny], -0.2e-3));
    problem.gaps = vec![Gap { sheets: (0, 1), farad_per_m2: 4.3 * EPS0 / 0.2e-3 }];
    let patch = |sheet: usize, x: f64| disc(&problem, sheet, Point::mm(x, 10.0), 1e-3);
    let injections = landings(patch(1, 27.0), patch(0, 3.0));
    (problem, Drive { strips: Vec::new(), injections })
}

/// A plate capacitor by hand: C = eps A/d, 19.04 pF/cm^2 here; 1 A through it and evenly spread while the plates are
/// short against the wavelength (91 mm at 1.6 GHz; at 1 MHz by a factor 5000).
#[test]
fn plate_capacitor() {
    let farad = 4.3 * EPS0 * 30e-3 * 20e-3 / 0.2e-3;
    close("capacitance per cm2", farad / 6.0, 19.0365038e-12, 1e-8);
    for d in [1e-3, 0.5e-3] {
        let (problem, drive) = plates(d);
        let system = System::new(problem).unwrap();
        for f in [1e3, 1e6] {
            let solution = solve(&system, &drive, &at(f, Complex64::new(5e-4, 0.0), 2), 1e-8);
            let through: Complex64 = solution.displacement[0].iter().sum();
            println!("d {d}, f {f:e}: {} steps, through {through}", solution.steps);
            assert!((through - 1.0).norm() < 1e-9, "{through}");
            let even = 1.0 / solution.displacement[0].len() as f64;
            assert!(solution.displacement[0].iter().all(|i| (i - even).norm() < 1e-3 * even));
            close("reactance", -solution.sheet_impedance_ohm.im, 1.0 / (2.0 * PI * f * farad), 1e-4);
        }
        let open = system.solve(&drive, &at(0.0, Complex64::new(5e-4, 0.0), 2), 1e-8);
        assert!(matches!(open, Err(SolveFailure::Unbalanced { .. })), "{open:?}");
    }
}

/// Half a wavelength between open ends: the plates, fed between each other near one end, resonate where their length is
/// lambda/2. Parallel plates: v = c/sqrt(er).
#[test]
fn plates_resonate_at_half_a_wavelength() {
    let (problem, mut drive) = plates(0.5e-3);
    // fed at the far ends of both plates the mode would get nothing
    drive.injections[1].patch = Patch { sheet: 1, ..drive.injections[0].patch.clone() };
    let system = System::new(problem).unwrap();
    // fringing of the magnetic field beyond the open rims makes the plates longer by a part of the gap
    let expected = 299_792_458.0 / (4.3f64.sqrt() * 2.0 * 30e-3);
    let size = |f: f64| {
        let solution = solve(&system, &drive, &at(f, Complex64::new(5e-3, 5e-3), 2), 1e-6);
        solution.displacement[0].iter().map(|i| i.norm()).fold(0.0, f64::max)
    };
    let sizes: Vec<f64> = (-6..=6).map(|k| size(expected * (1.0 + 0.01 * f64::from(k)))).collect();
    println!("{sizes:.5?}");
    let peak = (0..sizes.len()).max_by(|&a, &b| sizes[a].total_cmp(&sizes[b])).unwrap();
    assert!((2..=10).contains(&peak), "resonance off by more than 4 %: {sizes:?}");
}

/// Copper of a third sheet hides what lies behind it.
#[test]
fn copper_between_hides_a_gap() {
    let mut problem = plate(8, 6, 1e-3);
    problem.sheets.push(Sheet::new(vec![true; 48], -0.4e-3));
    problem.sheets.push(Sheet::new((0..48).map(|cell| cell % 8 < 4).collect(), -0.2e-3));
    problem.gaps =
        vec![Gap { sheets: (0, 1), farad_per_m2: 1e-7 }, Gap { sheets: (0, 2), farad_per_m2: 2e-7 }];
    let drive =
        Drive { strips: Vec::new(), injections: landings(cell(&problem, 1, 6, 3), cell(&problem, 0, 1, 3)) };
    let system = System::new(problem).unwrap();
    let solution = solve(&system, &drive, &at(1e5, Complex64::new(5e-4, 0.0), 3), 1e-8);
    let through = |gap: usize, column: usize| solution.displacement[gap][8 + column].norm();
    assert!((0..8).all(|column| (through(0, column) > 0.0) == (column >= 4)));
    // the third sheet floats: its gap carries nothing on the whole
    assert!(solution.displacement[1].iter().sum::<Complex64>().norm() < 1e-9);
    let unknown = Gap { sheets: (0, 9), farad_per_m2: 1e-7 };
    let mut wrong = plate(4, 4, 1e-3);
    wrong.gaps = vec![unknown];
    assert_eq!(System::new(wrong).unwrap_err(), SolveFailure::NoCopper { index: 0 });
}
