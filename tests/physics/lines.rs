//! Tracks as lines: loop inductance of a strip, and a U whose return changes from short cut to following.
use crate::support::*;
use ebbmap::geom::Point;
use ebbmap::sheet::{Drive, SourceStrip, StripProfile, System};
use ebbmap::spread::microstrip;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Partial inductance in H of a straight strip, its cross-section given by its geometric mean distance.
fn partial(length: f64, distance: f64) -> f64 {
    2e-7 * (length * libm::asinh(length / distance) - length.hypot(distance) + distance)
}

/// Loop inductance per length at 1 GHz over a plane 60 h wide: the difference of two lengths, so that ends drop out.
fn inductance_per_m(h: f64, w: f64, profile: StripProfile) -> f64 {
    let d = h / 2.0;
    // even current over a thin strip: ln g = ln w - 3/2; density 1/sqrt(1 - (2x/w)^2): g = w/4 (Grover)
    let distance = match profile {
        StripProfile::Uniform => w * (-1.5f64).exp(),
        StripProfile::Edge => w / 4.0,
    };
    let whole = |length: f64| {
        let (nx, ny) = (((length + 60.0 * h) / d) as usize, 121);
        let system = System::new(plate(nx, ny, d)).unwrap();
        let y = system.problem().grid.centre(0, ny / 2).y;
        let (from, to) = (Point::new(30.0 * h, y), Point::new(30.0 * h + length, y));
        let landing = |at: Point| disc(system.problem(), 0, at, h);
        let strip = SourceStrip { width_m: w, profile, ..filament(from, to, h) };
        let drive = Drive { strips: vec![strip], injections: landings(landing(from), landing(to)) };
        let solution = solve(&system, &drive, &at(1e9, Complex64::new(1e-5, 0.0), 1), 1e-7);
        partial(length, distance) + solution.sheet_impedance_ohm.im / (2.0 * PI * 1e9)
    };
    let (short, long) = (60.0 * h, 120.0 * h);
    (whole(long) - whole(short)) / (long - short)
}

#[test]
fn loop_inductance_of_a_strip() {
    let h = 0.2e-3;
    for u in [0.25, 1.0, 2.0] {
        let published = microstrip::inductance_per_m(u);
        let crowded = inductance_per_m(h, u * h, StripProfile::Edge);
        close(&format!("w = {u} h, edge-crowded"), crowded, published, 0.02);
        let even = inductance_per_m(h, u * h, StripProfile::Uniform);
        println!("w = {u} h, even current: {even:.4e}, {:.2} % more", 100.0 * (even / published - 1.0));
        // 5.9 % is rounded, and a plane of 60 h adds 0.1 to 0.3 %
        assert!((0.026..0.0605).contains(&(even / published - 1.0)), "{}", even / published);
    }
}

/// U of arms 100 mm, 50 mm apart, 1 mm over 0.5 mohm: share of the return that crosses the middle line beyond half the
/// arms. Values: potential flow plus the transverse part lambda/(lambda + k) on an endless sheet, 30 digits; the change
/// at a few kHz as published (U-shaped microstrip, PCD&F 2008, excerpt).
#[test]
fn u_shaped_track_over_a_wide_plane() {
    let d = 1e-3;
    let (nx, ny) = (500, 400);
    let system = System::new(plate(nx, ny, d)).unwrap();
    let corner = Point::mm(200.0, 175.0);
    let at_mm = |x: f64, y: f64| corner + Point::mm(x, y);
    let points = [at_mm(0.0, 0.0), at_mm(100.0, 0.0), at_mm(100.0, 50.0), at_mm(0.0, 50.0)];
    let strips = points.windows(2).map(|leg| filament(leg[0], leg[1], 1e-3)).collect();
    let landing = |at: Point| disc(system.problem(), 0, at, 2e-3);
    let drive = Drive { strips, injections: landings(landing(points[0]), landing(points[3])) };
    let prepared = system.prepare(&drive).unwrap();
    let table = [
        (0.0, 0.147583618, 0.0),
        (1e3, 0.212727413, 0.184764708),
        (3e3, 0.419545944, 0.353414461),
        (1e4, 0.830077781, 0.324309828),
        (1e5, 0.974252736, 0.0325729993),
        (1e7, 0.974390416, 0.000323997911),
    ];
    for (f, re, im) in table {
        let solution =
            system.solve_prepared(&prepared, &at(f, Complex64::new(0.5e-3, 0.0), 1), 1e-5).unwrap();
        // faces on the line y = 25 mm, from x = 50 mm on
        let share = -(250..nx).map(|ix| solution.jy[0][200 * nx + ix]).sum::<Complex64>();
        let off = (share - Complex64::new(re, im)).norm();
        println!(
            "U at {f:e}: {} steps, {share:.4} against {re:.4} + {im:.4}i, off {off:.1e}",
            solution.steps
        );
        assert!(off < 0.03, "{f}: {share} against {re} + {im}i");
    }
}
