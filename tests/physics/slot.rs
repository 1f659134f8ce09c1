//! A diagonal track over a slot and antipads on cells of h and 2h against cells of h/4.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, Problem, Solution, System};
use num_complex::Complex64;

const H: f64 = 0.4e-3;
/// Square antipads of 1.6 mm whose rims lie on the lines of all grids, so that the copper is the same on each.
const VOIDS: [(f64, f64); 4] = [(7.2, 6.4), (16.8, 13.6), (8.8, 12.8), (15.2, 5.6)];

fn in_slot(p: Point, grow: f64) -> bool {
    (p.x - 12e-3).abs() < 0.8e-3 + grow && p.y > 4e-3 - grow && p.y < 14.4e-3 + grow
}

fn in_void(p: Point, (x, y): (f64, f64), grow: f64) -> bool {
    (p.x - x * 1e-3).abs().max((p.y - y * 1e-3).abs()) < 0.8e-3 + grow
}

fn solved(d: f64, f: f64) -> (System, Solution) {
    let mut problem: Problem = plate((24e-3 / d).round() as usize, (19.2e-3 / d).round() as usize, d);
    cut_out(&mut problem, 0, |p| in_slot(p, 0.0));
    for (x, y) in VOIDS {
        cut_out(&mut problem, 0, |p| in_void(p, (x, y), 0.0));
    }
    let (from, to) = (Point::mm(4.0, 6.4), Point::mm(20.0, 12.0));
    let landing = |p: Point| disc(&problem, 0, p, 0.8e-3);
    let drive =
        Drive { strips: vec![filament(from, to, H)], injections: landings(landing(from), landing(to)) };
    let system = System::new(problem).unwrap();
    let solution = solve(&system, &drive, &at(f, Complex64::new(5e-4, 0.0), 1), 1e-6);
    println!("d {d}: {} steps", solution.steps);
    (system, solution)
}

#[test]
fn slot_crossed_by_a_diagonal_track() {
    for f in [1e5, 1e7] {
        let (fine_system, fine) = solved(H / 4.0, f);
        // second order: twice the cell, four times the error
        for (ratio, tolerance) in [(4, 0.03), (8, 0.12)] {
            let d = H / 4.0 * ratio as f64;
            let (system, coarse) = solved(d, f);
            let grid = system.problem().grid;
            let (mut error, mut size, mut counted) = (0.0, 0.0, 0);
            for iy in 2..grid.ny - 2 {
                for ix in 2..grid.nx - 2 {
                    let p = grid.centre(ix, iy);
                    let away = 2.5 * d;
                    let near_void = VOIDS.iter().any(|&void| in_void(p, void, away));
                    let near_end = [Point::mm(4.0, 6.4), Point::mm(20.0, 12.0)]
                        .iter()
                        .any(|e| p.distance(*e) < 1.6e-3 + d);
                    if near_void || near_end || in_slot(p, away) {
                        continue;
                    }
                    let mut mean = (Complex64::default(), Complex64::default());
                    for jy in 0..ratio {
                        for jx in 0..ratio {
                            let k = density(&fine_system, &fine, 0, ix * ratio + jx, iy * ratio + jy);
                            mean.0 += k.0 / (ratio * ratio) as f64;
                            mean.1 += k.1 / (ratio * ratio) as f64;
                        }
                    }
                    let k = density(&system, &coarse, 0, ix, iy);
                    error += (k.0 - mean.0).norm_sqr() + (k.1 - mean.1).norm_sqr();
                    size += mean.0.norm_sqr() + mean.1.norm_sqr();
                    counted += 1;
                }
            }
            let error = (error / size).sqrt();
            // the current that goes round the upper end of the slot
            let above = |system: &System, solution: &Solution| {
                let grid = system.problem().grid;
                let ix = (12e-3 / grid.cell_m).round() as usize;
                let rows = (0..grid.ny).filter(|&iy| grid.centre(0, iy).y > 14.4e-3);
                rows.map(|iy| solution.jx[0][iy * (grid.nx + 1) + ix]).sum::<Complex64>()
            };
            let (round, reference) = (above(&system, &coarse), above(&fine_system, &fine));
            println!(
                "f {f:e} d {d}: field error {error:.2e} over {counted} cells, round the end {round:.5} against {reference:.5}"
            );
            assert!(error < tolerance, "f {f:e} d {d}: {error}");
            assert!((round - reference).norm() < 0.01, "{round} against {reference}");
        }
    }
}
