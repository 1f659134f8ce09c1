//! Straight track over a wide plane: closed form of the endless sheet, and the strip plane's integral equation.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, SourceStrip, StripProfile, System};
use ebbmap::spread::resistive;
use num_complex::Complex64;

const ZS: Complex64 = Complex64::new(0.5e-3, 0.0);

/// Track along the middle of a plate, landings under its ends; the middle column's densities at `offsets` cells from
/// the track, positive = return.
fn middle_column(
    system: &System,
    strip: SourceStrip,
    frequency_hz: f64,
    offsets: &[usize],
) -> Vec<Complex64> {
    let grid = system.problem().grid;
    let landing = |at: Point| disc(system.problem(), 0, at, 1.5 * grid.cell_m);
    let drive = Drive { strips: vec![strip], injections: landings(landing(strip.from), landing(strip.to)) };
    let solution = solve(system, &drive, &at(frequency_hz, ZS, 1), 1e-6);
    println!("f {frequency_hz:e} steps {} residual {:.1e}", solution.steps, solution.residual);
    let cell = |offset: &usize| -density(system, &solution, 0, grid.nx / 2, grid.ny / 2 + offset).0;
    offsets.iter().map(cell).collect()
}

fn centred(system: &System, margin_m: f64, h: f64) -> SourceStrip {
    let grid = system.problem().grid;
    let y = grid.centre(0, grid.ny / 2).y;
    let length = grid.nx as f64 * grid.cell_m;
    filament(Point::new(margin_m, y), Point::new(length - margin_m, y), h)
}

/// Largest error over |x| <= 10 h relative to the local value.
fn against_endless_sheet(h: f64, cells_per_h: f64, frequencies: &[f64]) -> f64 {
    let d = h / cells_per_h;
    let n = ((400.0 * cells_per_h) as usize) | 1;
    let system = System::new(plate(n, n, d)).unwrap();
    let offsets: Vec<usize> = (0..=(10.0 * cells_per_h) as usize).collect();
    let mut worst: f64 = 0.0;
    for &f in frequencies {
        let lambda = resistive::lambda(f, ZS);
        let got = middle_column(&system, centred(&system, 5.0 * d, h), f, &offsets);
        for (offset, k) in offsets.iter().zip(&got) {
            let exact = resistive::cell_mean(*offset as f64 * d, d, h, lambda);
            let error = (k - exact).norm() / exact.norm();
            if *offset < 6 {
                println!("h {h} d {d} f {f:e} cell {offset}: {k:.2} against {exact:.2}, error {error:.1e}");
            }
            worst = worst.max(error);
        }
    }
    worst
}

#[test]
fn straight_track_on_a_resistive_sheet_cells_of_two_heights() {
    for h in [0.1e-3, 0.2e-3, 1.0e-3] {
        let worst = against_endless_sheet(h, 0.5, &[1e7, 1e8]);
        println!("d = 2h, h {h}: worst {worst:.2e}");
        assert!(worst < 0.06, "d = 2h, h {h}: {worst}");
    }
}

#[test]
fn straight_track_on_a_resistive_sheet_cells_of_one_height() {
    for (h, f) in [(0.1e-3, 1e8), (0.2e-3, 1e7), (1.0e-3, 1e7)] {
        let worst = against_endless_sheet(h, 1.0, &[f]);
        println!("d = h, h {h}: worst {worst:.2e}");
        assert!(worst < 0.02, "d = h, h {h}: {worst}");
    }
}

#[test]
fn straight_track_on_a_resistive_sheet_cells_of_half_a_height() {
    let worst = against_endless_sheet(0.2e-3, 2.0, &[1e7]);
    println!("d = h/2: worst {worst:.2e}");
    assert!(worst < 0.01, "d = h/2: {worst}");
}

/// A plane 60 h wide and four times as long, from 1 kHz to 100 MHz, track in and off the middle, narrow and wide.
#[test]
fn straight_track_over_a_strip_plane() {
    let (h, d) = (0.2e-3, 0.1e-3);
    let (nx, ny) = (481, 121);
    let system = System::new(plate(nx, ny, d)).unwrap();
    let offsets: Vec<usize> = (0..=20).collect();
    let half = ny as f64 * d / 2.0;
    let cells: Vec<(f64, f64)> =
        offsets.iter().map(|&i| ((i as f64 - 0.5) * d, (i as f64 + 0.5) * d)).collect();
    for (width, profile) in
        [(0.0, StripProfile::Uniform), (2.0 * h, StripProfile::Uniform), (2.0 * h, StripProfile::Edge)]
    {
        let strip = SourceStrip { width_m: width, profile, ..centred(&system, 5.0 * d, h) };
        let nodes = match (width, profile) {
            (0.0, _) => vec![(0.0, 1.0)],
            // midpoints of 200 equal parts, and of 200 parts of equal current
            (_, StripProfile::Uniform) => (0..200).map(|i| ((i as f64 + 0.5) / 100.0 - 1.0, 5e-3)).collect(),
            (_, StripProfile::Edge) => {
                (0..200).map(|i| (((i as f64 + 0.5) * std::f64::consts::PI / 200.0).cos(), 5e-3)).collect()
            }
        };
        let filaments: Vec<_> = nodes.iter().map(|&(x, part)| (x * width / 2.0, h, part)).collect();
        for f in [1e3, 1e4, 1e5, 1e6, 1e8] {
            let expected = crate::strip_plane::density(half, &filaments, ZS, f, &cells);
            let got = middle_column(&system, strip, f, &offsets);
            let mut worst: f64 = 0.0;
            for (offset, (k, exact)) in got.iter().zip(&expected).enumerate() {
                let error = (k - exact).norm() / exact.norm();
                if offset < 4 {
                    println!("w {width} f {f:e} cell {offset}: {k:.2} against {exact:.2}, error {error:.1e}");
                }
                worst = worst.max(error);
            }
            println!("w {width} {profile:?} f {f:e}: worst {worst:.2e}");
            assert!(worst < 0.01, "w {width} {profile:?} f {f:e}: {worst}");
        }
    }
}
