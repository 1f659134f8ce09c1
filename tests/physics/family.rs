//! The reduced basis against direct solves.
use crate::reciprocity::{board, net};
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Family, Gap, OperatingPoint, Patch, System};
use num_complex::Complex64;

/// Impedance of a 35 um foil with field on both faces, (eta/2) coth(gamma t/2), and one of 17.5 um.
fn foils(frequency_hz: f64) -> Vec<Complex64> {
    let (sigma, mu0) = (58e6, 4e-7 * std::f64::consts::PI);
    let foil = |t: f64| {
        if frequency_hz == 0.0 {
            return Complex64::new(1.0 / (sigma * t), 0.0);
        }
        let gamma = Complex64::new(1.0, 1.0) * (std::f64::consts::PI * frequency_hz * mu0 * sigma).sqrt();
        gamma / sigma / 2.0 / (gamma * t / 2.0).tanh()
    };
    vec![foil(35e-6), foil(17.5e-6)]
}

#[test]
fn family_matches_direct_solves() {
    let mut problem = board();
    // one of the vias becomes a capacitor, two go to a node outside the board, the sheets face each other
    problem.verticals[3].capacitance_f = Some(100e-9);
    problem.verticals[1].to = Patch::outside(0);
    problem.verticals[2].to = Patch::outside(0);
    problem.gaps = vec![Gap { sheets: (0, 1), farad_per_m2: 7.6e-8 }];
    let drive =
        net(&problem, &[Point::mm(3.0, 10.0), Point::mm(12.0, 10.5), Point::mm(21.0, 9.0)], 0.2e-3, 0);
    let system = System::new(problem).unwrap();
    let point = |f: f64| OperatingPoint { frequency_hz: f, zs_ohm: foils(f) };
    // 40 frequencies from DC to 3 GHz that follow no rule: fractional parts of multiples of the golden ratio
    let mut asked: Vec<OperatingPoint> = vec![point(0.0)];
    asked.extend((1..40).map(|k| point(10f64.powf(2.0 + 7.477 * (0.618033988749895 * k as f64).fract()))));
    let family = Family::new(&system, &drive, &asked, 1e-3).unwrap();
    println!("{} vectors, {} solves, worst bound {:.1e}", family.len(), family.solves, family.worst_bound);
    assert!(family.worst_bound <= 1e-3);
    let prepared = system.prepare(&drive).unwrap();
    let mut worst: f64 = 0.0;
    for point in &asked {
        let direct = system.solve_prepared(&prepared, point, 1e-7).unwrap();
        let reduced = family.at(point).unwrap();
        let off = system.difference(&reduced, &direct, point);
        let impedance = (reduced.sheet_impedance_ohm - direct.sheet_impedance_ohm).norm()
            / direct.sheet_impedance_ohm.norm();
        println!(
            "f {:9.3e}: off {off:.1e}, bound {:.1e}, impedance {impedance:.1e}",
            point.frequency_hz, reduced.residual
        );
        assert!(off <= reduced.residual.max(1e-6), "{off} above the bound {}", reduced.residual);
        worst = worst.max(off);
        let vertical = family.verticals(point);
        let apart = vertical.iter().zip(&reduced.verticals).map(|(a, b)| (a - b).norm()).fold(0.0, f64::max);
        assert!(apart < 1e-12, "{apart}");
    }
    assert!(worst < 1e-3, "{worst}");
}

/// Rms sums over the odd lines of a clock of 8 MHz up to 400 MHz: against the explicit sum over the family to rounding,
/// against its lines solved directly to 1e-3.
#[test]
fn sums_over_lines() {
    let mut problem = board();
    problem.verticals[3].capacitance_f = Some(100e-9);
    problem.gaps = vec![Gap { sheets: (0, 1), farad_per_m2: 7.6e-8 }];
    let drive =
        net(&problem, &[Point::mm(3.0, 10.0), Point::mm(12.0, 10.5), Point::mm(21.0, 9.0)], 0.2e-3, 0);
    let system = System::new(problem).unwrap();
    let prepared = system.prepare(&drive).unwrap();
    let point = |f: f64| OperatingPoint { frequency_hz: f, zs_ohm: foils(f) };
    let lines: Vec<(OperatingPoint, f64)> =
        (0..25).map(|n| (2 * n + 1) as f64).map(|n| (point(8e6 * n), 1.0 / (n * n))).collect();
    let asked: Vec<f64> = lines.iter().map(|(point, _)| point.frequency_hz).collect();
    let family = Family::for_band(&system, prepared.clone(), &asked, point, 5e-4).unwrap();
    println!("{} vectors, {} solves, worst bound {:.1e}", family.len(), family.solves, family.worst_bound);
    assert!(family.worst_bound <= 5e-4);
    let sums = family.sums(&lines);
    let mut explicit = vec![0.0; sums.density[1].len()];
    let (mut direct, mut jx, mut via) =
        (vec![vec![0.0; explicit.len()]; 2], vec![0.0; sums.jx[0].len()], 0.0);
    let mut displaced = 0.0;
    let grid = system.problem().grid;
    for (point, weight) in &lines {
        let reduced = family.at(point).unwrap();
        let solved = system.solve_prepared(&prepared, point, 1e-6).unwrap();
        for cell in 0..explicit.len() {
            let square = |solution, sheet| {
                let (x, y) = density(&system, solution, sheet, cell % grid.nx, cell / grid.nx);
                x.norm_sqr() + y.norm_sqr()
            };
            explicit[cell] += weight * square(&reduced, 1);
            direct[0][cell] += weight * square(&solved, 0);
            direct[1][cell] += weight * square(&solved, 1);
        }
        jx.iter_mut().zip(&reduced.jx[0]).for_each(|(sum, i)| *sum += weight * i.norm_sqr());
        via += weight * reduced.verticals[0].norm_sqr();
        displaced += weight * reduced.displacement[0].iter().sum::<Complex64>().norm_sqr();
    }
    let apart = |got: &[f64], expected: &[f64]| {
        let most = expected.iter().fold(0.0f64, |m, v| m.max(*v));
        got.iter().zip(expected).map(|(a, b)| (a - b).abs()).fold(0.0, f64::max) / most
    };
    let (cells, faces) = (apart(&sums.density[1], &explicit), apart(&sums.jx[0], &jx));
    println!("against the explicit sum: cells {cells:.1e}, faces {faces:.1e}");
    assert!(cells < 1e-12 && faces < 1e-12);
    close("via", sums.verticals[0], via, 1e-11);
    close("displaced", sums.displacement[0], displaced, 1e-9);
    for sheet in 0..2 {
        let off = apart(&sums.density[sheet], &direct[sheet]);
        println!("sheet {sheet}: {off:.1e} of the largest against lines solved directly");
        assert!(off < 1e-3);
    }
}
