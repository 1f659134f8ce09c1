//! The reduced basis against direct solves.
use crate::reciprocity::{board, net};
use ebbmap::geom::Point;
use ebbmap::sheet::{Family, OperatingPoint, System};
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
    // one of the vias becomes a capacitor
    problem.verticals[3].capacitance_f = Some(100e-9);
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
    }
    assert!(worst < 1e-3, "{worst}");
}
