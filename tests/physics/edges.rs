//! Finite ground planes at high frequency against conformal maps.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, System};
use ebbmap::spread::edge;
use num_complex::Complex64;

const ZS: Complex64 = Complex64::new(0.5e-3, 0.0);
/// |lambda| h = 2400 at h = 0.3 mm.
const FREQUENCY_HZ: f64 = 1e9;

/// Mean of `density` over a cell from `from` to `from + d` by the midpoint rule in 400 parts.
fn mean(from: f64, d: f64, density: impl Fn(f64) -> f64) -> f64 {
    (0..400).map(|i| density(from + d * (i as f64 + 0.5) / 400.0)).sum::<f64>() / 400.0
}

/// Densities across the middle of a plate `length` x `width` cells with a filament over row coordinate y (m).
fn section(nx: usize, ny: usize, d: f64, y: f64, h: f64) -> Vec<f64> {
    let system = System::new(plate(nx, ny, d)).unwrap();
    let ends = [Point::new(6.0 * d, y), Point::new((nx - 6) as f64 * d, y)];
    let landing = |p: Point| disc(system.problem(), 0, p, 2.0 * d);
    let drive = Drive {
        strips: vec![filament(ends[0], ends[1], h)],
        injections: landings(landing(ends[0]), landing(ends[1])),
    };
    let solution = solve(&system, &drive, &at(FREQUENCY_HZ, ZS, 1), 1e-6);
    println!("{} steps, residual {:.1e}", solution.steps, solution.residual);
    (0..ny).map(|iy| -density(&system, &solution, 0, nx / 2, iy).0.re).collect()
}

#[test]
fn ground_plane_of_finite_width() {
    let h = 0.3e-3;
    for (per_h, width, x0) in [(2, 10, 0.0), (2, 10, 0.5), (4, 10, 0.5), (2, 20, 0.8)] {
        let d = h / per_h as f64;
        let ny = width * per_h;
        let a = width as f64 * h / 2.0;
        let got = section(8 * ny + 1, ny, d, a + x0 * a, h);
        let mut worst: f64 = 0.0;
        for iy in 2..ny - 2 {
            let from = iy as f64 * d - a;
            let exact = mean(from, d, |x| edge::strip_density(x, x0 * a, h, a));
            let error = (got[iy] - exact).abs() / exact;
            println!(
                "W {width} h, x0 {x0} a, cell {iy}: {:.2} against {exact:.2}, error {error:.1e}",
                got[iy]
            );
            worst = worst.max(error);
        }
        println!("W {width} h, x0 {x0} a, d h/{per_h}: worst {worst:.2e}");
        assert!(worst < 0.02, "W {width} h, x0 {x0} a, d h/{per_h}: {worst}");
    }
}

/// Near one edge of a wide plane; the exact form for its finite width, which `closed_form_edges` ties to the
/// half-plane's.
#[test]
fn edge_of_a_wide_plane() {
    let h = 0.3e-3;
    for (per_h, inside) in [(2, 1.0), (2, 2.0), (2, 5.0)] {
        let d = h / per_h as f64;
        let ny = 60 * per_h;
        let a = 30.0 * h;
        let got = section(300 * per_h + 1, ny, d, inside * h, h);
        let mut worst: f64 = 0.0;
        for iy in 2..15 * per_h {
            let exact = mean(iy as f64 * d - a, d, |x| edge::strip_density(x, inside * h - a, h, a));
            let error = (got[iy] - exact).abs() / exact;
            println!("{inside} h inside, cell {iy}: {:.2} against {exact:.2}, error {error:.1e}", got[iy]);
            worst = worst.max(error);
        }
        println!("{inside} h inside, d h/{per_h}: worst {worst:.2e}");
        assert!(worst < 0.02, "{inside} h inside: {worst}");
    }
}
