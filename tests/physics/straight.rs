//! Straight track over a wide plane.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, System};
use num_complex::Complex64;
use std::time::Instant;

#[test]
fn quick_look() {
    let d = 0.2e-3;
    let n = 301;
    let problem = plate(n, n, d);
    let middle = (n / 2) as f64 * d + d / 2.0;
    let (a, b) = (0.006, n as f64 * d - 0.006);
    let cellx = |x: f64| (x / d) as usize;
    let drive = |h: f64| Drive {
        strips: vec![filament(Point::new(a, middle), Point::new(b, middle), h)],
        injections: landings(cell(&problem, 0, cellx(a), n / 2), cell(&problem, 0, cellx(b), n / 2)),
    };
    let t = Instant::now();
    let system = System::new(problem.clone()).unwrap();
    println!("new {:?}", t.elapsed());
    for h in [0.2e-3, 0.1e-3, 0.4e-3] {
        let t = Instant::now();
        let p = system.prepare(&drive(h)).unwrap();
        println!("prepare {:?}", t.elapsed());
        for f in [0.0, 1e3, 1e5, 1e6, 1e7, 1e8] {
            let t = Instant::now();
            let s = solve(&system, &drive(h), &at(f, Complex64::new(0.5e-3, 0.0), 1), 1e-6);
            let k: Vec<_> =
                [0, 1, 2, 3, 5, 8].iter().map(|o| density(&system, &s, 0, n / 2, n / 2 + o).0).collect();
            println!(
                "h {h} f {f:e} steps {} res {:.1e} {:?} Z {:.4e} K {:.3?}",
                s.steps,
                s.residual,
                t.elapsed(),
                s.sheet_impedance_ohm,
                k
            );
        }
    }
}
