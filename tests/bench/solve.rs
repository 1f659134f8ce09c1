//! Cost of a solve as a ratio to u, one padded complex Fourier transform pair of the board's grid on the same thread.
//!
//! `cargo bench --bench solve [-- CELL_MM]`: 100 x 80 mm plane, 120 antipads, a slot of 40 mm, a track with two bends;
//! then two such planes with 100 vias.
use ebbmap::geom::{Grid, Point};
use ebbmap::math::filter::{Filter, Scratch};
use ebbmap::sheet::{
    Drive, Injection, OperatingPoint, Patch, Problem, Sheet, SourceStrip, StripProfile, System, Vertical,
};
use num_complex::Complex64;

/// Seconds of processor time of this process where the system tells them, else of the clock: other programs on the
/// machine should not count.
fn seconds() -> f64 {
    let spent = std::fs::read_to_string("/proc/self/schedstat").ok();
    let nanoseconds = spent.and_then(|text| text.split(' ').next().and_then(|n| n.parse::<f64>().ok()));
    nanoseconds.map_or_else(
        || {
            std::time::SystemTime::now()
                .duration_since(std::time::UNIX_EPOCH)
                .map_or(0.0, |t| t.as_secs_f64())
        },
        |n| 1e-9 * n,
    )
}

/// A plain generator of places, the same in every run.
struct Places(u64);

impl Places {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
}

fn board(cell_m: f64, sheets: usize, vias: usize) -> (Problem, Drive) {
    let (nx, ny) = ((0.1 / cell_m).round() as usize, (0.08 / cell_m).round() as usize);
    let grid = Grid { origin: Point::new(0.0, 0.0), cell_m, nx, ny };
    let mut places = Places(7);
    let mut problem = Problem { grid, sheets: Vec::new(), verticals: Vec::new(), gaps: Vec::new() };
    for sheet in 0..sheets {
        let mut copper = vec![true; grid.len()];
        let mut voids: Vec<Point> = Vec::new();
        voids.extend((0..120).map(|_| Point::new(0.1 * places.next(), 0.08 * places.next())));
        for iy in 0..ny {
            for ix in 0..nx {
                let p = grid.centre(ix, iy);
                let slot = sheet == 0 && (p.x - 0.055).abs() < 0.5e-3 && p.y > 0.03 && p.y < 0.07;
                if slot || voids.iter().any(|v| v.distance(p) < 0.9e-3) {
                    copper[grid.index(ix, iy)] = false;
                }
            }
        }
        problem.sheets.push(Sheet::new(copper, -1e-3 * sheet as f64));
    }
    let patch = |sheet: usize, at: Point, problem: &Problem| {
        let inside = |r: f64| -> Vec<usize> {
            (0..grid.len())
                .filter(|&i| problem.sheets[sheet].copper[i] && grid.centre(i % nx, i / nx).distance(at) < r)
                .collect()
        };
        let cells = [0.3e-3, 0.7e-3, 1.5e-3, 3e-3]
            .into_iter()
            .map(inside)
            .find(|c| !c.is_empty())
            .expect("a sound problem");
        let weight = 1.0 / cells.len() as f64;
        Patch { sheet, cells: cells.into_iter().map(|c| (c, weight)).collect() }
    };
    for _ in 0..vias {
        let at = Point::new(0.002 + 0.096 * places.next(), 0.002 + 0.076 * places.next());
        let vertical = Vertical {
            from: patch(0, at, &problem),
            to: patch(1, at, &problem),
            resistance_ohm: 1e-3,
            inductance_h: 1e-10,
            capacitance_f: None,
        };
        problem.verticals.push(vertical);
    }
    let points = [(0.02, 0.06), (0.045, 0.06), (0.06, 0.045), (0.085, 0.045)].map(|(x, y)| Point::new(x, y));
    let strip = |leg: &[Point]| SourceStrip {
        from: leg[0],
        to: leg[1],
        z_m: 0.3e-3,
        width_m: 0.3e-3,
        profile: StripProfile::Uniform,
        current_a: 1.0,
    };
    let injections = vec![
        Injection { patch: patch(0, points[3], &problem), current_a: 1.0 },
        Injection { patch: patch(0, points[0], &problem), current_a: -1.0 },
    ];
    (problem, Drive { strips: points.windows(2).map(strip).collect(), injections })
}

fn main() {
    let cell_mm: f64 = std::env::args().filter_map(|a| a.parse().ok()).next().unwrap_or(0.25);
    for (sheets, vias) in [(1, 0), (2, 100)] {
        let (problem, drive) = board(cell_mm * 1e-3, sheets, vias);
        let (nx, ny) = (problem.grid.nx, problem.grid.ny);
        let (px, py) = Filter::padded(nx, ny).size();
        let full = Filter::new(px, py, px, py);
        let input = vec![Complex64::new(1.0, 0.5); px * py];
        let mut output = input.clone();
        let mut scratch = Scratch::default();
        // the system counts processor time in ticks of some milliseconds: take a mean over many pairs
        let start = seconds();
        let pairs = 20 + 20_000_000 / (px * py);
        for _ in 0..pairs {
            full.apply(&[&input], &mut [&mut output], &mut scratch, |_, _| {});
        }
        let u = (seconds() - start) / pairs as f64;
        println!(
            "{sheets} sheet(s), {vias} vias, {nx} x {ny} cells of {cell_mm} mm, padded {px} x {py}: u = {:.1} ms",
            1e3 * u
        );
        let start = seconds();
        let system = System::new(problem).expect("a sound problem");
        let new = seconds() - start;
        let start = seconds();
        let prepared = system.prepare(&drive).expect("a sound problem");
        let prepare = seconds() - start;
        println!(
            "  factor and kernels {:.0} ms = {:.1} u ({:.0} MB, {} bytes a cell); source {:.0} ms = {:.1} u",
            1e3 * new,
            new / u,
            system.factor_bytes() as f64 / 1e6,
            system.factor_bytes() / (nx * ny),
            1e3 * prepare,
            prepare / u
        );
        for f in [0.0, 1e2, 1e4, 1e5, 1e6, 1e7, 1e9] {
            let zs_ohm = vec![Complex64::new(0.5e-3, 0.0); sheets];
            let start = seconds();
            let solution = system
                .solve_prepared(&prepared, &OperatingPoint { frequency_hz: f, zs_ohm }, 1e-5)
                .expect("a sound problem");
            let time = seconds() - start;
            println!("  {f:8.0e} Hz: {:3} steps, {:6.0} ms = {:6.1} u", solution.steps, 1e3 * time, time / u);
        }
    }
}
