//! Two nets on one board: transfer impedances both ways, and the same bits from any number of threads.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, Problem, Sheet, System, Vertical};
use num_complex::Complex64;

/// Two sheets with voids and vias.
pub fn board() -> Problem {
    let mut problem = plate(100, 80, 0.25e-3);
    problem.sheets.push(Sheet::new(vec![true; 100 * 80], -0.5e-3));
    for (x, y) in [(5.0, 6.0), (9.0, 12.0), (14.0, 4.0), (18.0, 15.0), (7.5, 16.0)] {
        cut_out(&mut problem, 0, |p| p.distance(Point::mm(x, y)) < 0.8e-3);
        cut_out(&mut problem, 1, |p| p.distance(Point::mm(24.0 - x, y)) < 0.6e-3);
    }
    cut_out(&mut problem, 0, |p| (p.x - 11.6e-3).abs() < 0.4e-3 && p.y > 6e-3 && p.y < 15e-3);
    for (x, y) in [(3.0, 3.0), (22.0, 17.0), (12.0, 18.0), (3.0, 17.0)] {
        let at = Point::mm(x, y);
        problem.verticals.push(Vertical {
            from: disc(&problem, 0, at, 0.3e-3),
            to: disc(&problem, 1, at, 0.3e-3),
            resistance_ohm: 1e-3,
            inductance_h: 1e-10,
            capacitance_f: None,
        });
    }
    problem
}

pub fn net(problem: &Problem, points: &[Point], z: f64, sheet: usize) -> Drive {
    let strips = points.windows(2).map(|leg| filament(leg[0], leg[1], z)).collect();
    let landing = |at: &Point| disc(problem, sheet, *at, 0.3e-3);
    Drive { strips, injections: landings(landing(&points[0]), landing(&points[points.len() - 1])) }
}

#[test]
fn transfer_impedance_is_reciprocal() {
    let problem = board();
    let system = System::new(problem.clone()).unwrap();
    let a = net(&problem, &[Point::mm(3.0, 10.0), Point::mm(12.0, 10.5), Point::mm(21.0, 9.0)], 0.2e-3, 0);
    let b = net(&problem, &[Point::mm(6.0, 4.0), Point::mm(15.0, 11.5), Point::mm(21.0, 13.0)], -0.7e-3, 1);
    let (a, b) = (system.prepare(&a).unwrap(), system.prepare(&b).unwrap());
    for (f, zs) in [(0.0, 0.5e-3), (1e3, 0.5e-3), (1e6, 0.5e-3), (1e9, 4e-3)] {
        let point = at(f, Complex64::new(zs, if f > 1e8 { zs } else { 0.0 }), 2);
        let solved = [&a, &b].map(|drive| system.solve_prepared(drive, &point, 1e-8).unwrap());
        let ab = system.transfer_ohm(&solved[0], f, &b);
        let ba = system.transfer_ohm(&solved[1], f, &a);
        let size = (solved[0].sheet_impedance_ohm * solved[1].sheet_impedance_ohm).norm().sqrt();
        let off = (ab - ba).norm() / size;
        println!("f {f:e}: Z_AB {ab:.6e}, Z_BA {ba:.6e}, difference {off:.1e} of {size:.2e}");
        assert!(off < 1e-6);
        assert!(ab.norm() > 1e-3 * size, "nothing is coupled");
    }
}

#[test]
fn bits_do_not_depend_on_threads() {
    let problem = board();
    let drive = net(&problem, &[Point::mm(3.0, 10.0), Point::mm(21.0, 9.0)], 0.2e-3, 0);
    let solve = || {
        let system = System::new(problem.clone()).unwrap();
        solve(&system, &drive, &at(1e6, Complex64::new(5e-4, 0.0), 2), 1e-6)
    };
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| rayon::join(solve, solve)).0
    };
    let (one, many) = (with(1), with(4));
    let same = |a: &[Complex64], b: &[Complex64]| {
        a.iter().zip(b).all(|(a, b)| a.re.to_bits() == b.re.to_bits() && a.im.to_bits() == b.im.to_bits())
    };
    for sheet in 0..2 {
        assert!(same(&one.jx[sheet], &many.jx[sheet]) && same(&one.jy[sheet], &many.jy[sheet]));
    }
    assert!(same(&one.verticals, &many.verticals));
}
