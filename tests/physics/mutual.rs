//! Direct mutual inductance of strips, and transfer impedances of ten paths with each other.
use crate::reciprocity::{board, net};
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::math::quadrature::legendre;
use ebbmap::sheet::mutual::inductance_h;
use ebbmap::sheet::{Drive, Gap, OperatingPoint, SourceStrip, StripProfile, System};
use faer::{Mat, Side};
use num_complex::Complex64;
use std::f64::consts::PI;

/// Neumann's double integral, with panels.
fn neumann(a: &SourceStrip, b: &SourceStrip) -> f64 {
    let gauss = legendre(10);
    let cut = |s: &SourceStrip| -> Vec<(Point, f64)> {
        let half = 0.5 / 40.0;
        let panels =
            (0..40).flat_map(|k| gauss.iter().map(move |&(x, w)| ((2 * k + 1) as f64 * half + x * half, w)));
        panels.map(|(t, w)| (s.from + (s.to - s.from) * t, w * half)).collect()
    };
    let (one, other) = (cut(a), cut(b));
    let z = a.z_m - b.z_m;
    let sum: f64 = one
        .iter()
        .flat_map(|(p, wp)| other.iter().map(move |(q, wq)| wp * wq / p.distance(*q).hypot(z)))
        .sum();
    1e-7 * (a.to - a.from).dot(b.to - b.from) * sum
}

#[test]
fn mutual_inductance_of_strips() {
    // parallel filaments of equal length (Grover 1946, from memory)
    let (l, d) = (50e-3, 2e-3);
    let a = filament(Point::new(0.0, 0.0), Point::new(l, 0.0), 0.3e-3);
    let b = filament(Point::new(0.0, d), Point::new(l, d), 0.3e-3);
    let grover = 2e-7 * (l * (l / d).asinh() - l.hypot(d) + d);
    close("equal parallel filaments", inductance_h(&[a], &[b]), grover, 1e-9);
    let back = filament(b.to, b.from, b.z_m);
    close("antiparallel", -inductance_h(&[a], &[back]), grover, 1e-9);
    // in line with each other: l ln 2 each (Grover, from memory): M = 2e-7 l ln 2
    let next = filament(a.to, a.to + Point::new(l, 0.0), a.z_m);
    close("end to end", inductance_h(&[a], &[next]), 2e-7 * l * 2.0f64.ln(), 1e-6);
    // over a perfect plane: minus the image, per length of long lines, equal and unequal heights
    for (h1, h2, dx, expected) in [
        (0.2e-3, 0.2e-3, 1e-3, 14.8420005e-9),
        (0.2e-3, 1e-3, 0.0, 81.0930216e-9),
        (0.2e-3, 1e-3, 1e-3, 39.7301797e-9),
        (0.1e-3, 0.3e-3, 0.5e-3, 34.6276237e-9),
    ] {
        let whole = |l: f64| {
            let line = |y: f64, z: f64| filament(Point::new(0.0, y), Point::new(l, y), z);
            let one = [line(0.0, h1)];
            inductance_h(&one, &[line(dx, h2)]) - inductance_h(&one, &[line(dx, -h2)])
        };
        close("per length over a plane", (whole(8.0) - whole(4.0)) / 4.0, expected, 1e-6);
    }
    // two filaments that meet at an angle (Grover 1946, from memory)
    let angle = 0.7f64;
    let m = 30e-3;
    let slanted = filament(a.from, Point::new(m * angle.cos(), m * angle.sin()), a.z_m);
    let third = (l * l + m * m - 2.0 * l * m * angle.cos()).sqrt();
    let meeting = 2e-7 * angle.cos() * (l * (m / (l + third)).atanh() + m * (l / (m + third)).atanh());
    close("at an angle", inductance_h(&[a], &[slanted]), meeting, 1e-6);
    // skew at different heights against the double integral
    let skew = filament(Point::mm(10.0, -8.0), Point::mm(35.0, 17.0), -1.2e-3);
    close("skew", inductance_h(&[a], &[skew]), neumann(&a, &skew), 1e-6);
    // strips: the mean over their widths
    for profile in [StripProfile::Uniform, StripProfile::Edge] {
        let wide = SourceStrip { width_m: 1.5e-3, profile, ..a };
        let below = SourceStrip { width_m: 0.8e-3, profile, z_m: -0.4e-3, ..skew };
        let mean = |n: usize, strip: &SourceStrip| -> Vec<SourceStrip> {
            let across = (strip.to - strip.from) * (1.0 / (strip.to - strip.from).length());
            let across = Point::new(-across.y, across.x);
            let at = move |k: usize| match profile {
                StripProfile::Uniform => (2.0 * k as f64 + 1.0) / n as f64 - 1.0,
                StripProfile::Edge => ((2.0 * k as f64 + 1.0) * PI / (2.0 * n as f64)).cos(),
            };
            let shift = |k: usize| across * (at(k) * strip.width_m / 2.0);
            let line = |k: usize| SourceStrip {
                from: strip.from + shift(k),
                to: strip.to + shift(k),
                width_m: 0.0,
                current_a: 1.0 / n as f64,
                ..*strip
            };
            (0..n).map(line).collect()
        };
        let fine = inductance_h(&mean(60, &wide), &mean(61, &below));
        close(&format!("{profile:?} strips"), inductance_h(&[wide], &[below]), fine, 1e-5);
        close("exchanged", inductance_h(&[below], &[wide]), inductance_h(&[wide], &[below]), 1e-6);
    }
}

/// Ten paths over and under two sheets with voids, barrels, a capacitor and plane capacitance: every Z_AB against Z_BA,
/// and the real part of the matrix positive.
#[test]
fn ten_paths_are_reciprocal_and_passive() {
    let mut problem = board();
    problem.verticals[3].capacitance_f = Some(10e-9);
    problem.gaps = vec![Gap { sheets: (0, 1), farad_per_m2: 7.6e-8 }];
    let place = |k: usize, by: f64| (0.37 + by * k as f64).fract();
    let at = |k: usize| Point::mm(2.0 + 21.0 * place(k, 0.754_877_666), 2.0 + 16.0 * place(k, 0.569_840_291));
    // places with copper on both sheets
    let sound = |k: &usize| (0..2).all(|sheet| !disc(&problem, sheet, at(*k), 0.3e-3).cells.is_empty());
    let places: Vec<usize> = (0..60).filter(sound).collect();
    let at = |k: usize| at(places[k]);
    let drives: Vec<Drive> = (0..10)
        .map(|k| {
            let (sheet, z) = if k % 3 == 2 { (1, -0.7e-3) } else { (0, 0.2e-3 + 0.1e-3 * (k % 2) as f64) };
            let mut drive = net(&problem, &[at(3 * k), at(3 * k + 1), at(3 * k + 2)], z, sheet);
            let all: Vec<_> = drive.injections.iter().map(|landing| landing.patch.cells.len()).collect();
            assert!(all.iter().all(|cells| *cells > 0), "path {k} lands in a void");
            if k == 4 {
                // a wide strip
                drive.strips.iter_mut().for_each(|strip| strip.width_m = 0.4e-3);
            }
            drive
        })
        .collect();
    let system = System::new(problem).unwrap();
    let prepared: Vec<_> = drives.iter().map(|drive| system.prepare(drive).unwrap()).collect();
    let mut pairs = 0;
    for (f, zs) in [(0.0, 0.5e-3), (1e4, 0.5e-3), (1e6, 0.5e-3), (3e8, 2e-3)] {
        let point = OperatingPoint {
            frequency_hz: f,
            zs_ohm: vec![Complex64::new(zs, if f > 1e8 { zs } else { 0.0 }), Complex64::new(2.0 * zs, 0.0)],
        };
        let solved: Vec<_> =
            prepared.iter().map(|path| system.solve_prepared(path, &point, 1e-8).unwrap()).collect();
        let z = |a: usize, b: usize| {
            let (from, to) = ((&solved[a], &drives[a].strips[..]), (&prepared[b], &drives[b].strips[..]));
            // a path's own strips lie in themselves: only what the sheets add
            if a == b {
                system.transfer_ohm(&solved[a], f, &prepared[b])
            } else {
                system.coupling_ohm(from, f, to)
            }
        };
        let mut worst: f64 = 0.0;
        let mut matrix = Mat::<f64>::zeros(10, 10);
        for a in 0..10 {
            for b in 0..=a {
                let (ab, ba) = (z(a, b), z(b, a));
                let size = (solved[a].sheet_impedance_ohm * solved[b].sheet_impedance_ohm).norm().sqrt();
                worst = worst.max((ab - ba).norm() / size);
                pairs += usize::from(a != b);
                matrix[(a, b)] = 0.5 * (ab.re + ba.re);
                matrix[(b, a)] = matrix[(a, b)];
                if a == b {
                    let off = (ab - solved[a].sheet_impedance_ohm).norm() / size;
                    assert!(off < 1e-6, "own impedance off by {off}");
                }
            }
        }
        let values = matrix.self_adjoint_eigenvalues(Side::Lower).unwrap();
        println!("f {f:e}: worst {worst:.1e}, eigenvalues {:.2e} to {:.2e} ohm", values[0], values[9]);
        assert!(worst < 1e-6, "f {f:e}: {worst}");
        assert!(values[0] > -1e-9 * values[9], "{values:?}");
    }
    assert_eq!(pairs, 4 * 45);
}
