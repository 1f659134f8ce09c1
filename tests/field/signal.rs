//! Maps of bands, pairs, open lines and paths through parts.
//!
//! | case | against | tolerance | source of the right side |
//! |---|---|---|---|
//! | band map | every line of the drive solved on its own | 1e-3 | the definition of an rms value |
//! | balanced pair | difference of two strips over a perfect plane | 2 % | image of a strip (Holloway and Kuester 1995, from memory) |
//! | pair out of balance | a tenth of a single track | 1e-3 | superposition |
//! | open line | current that charges what lies beyond | 1 % | charge balance; C' of Hammerstad and Jensen, 1980 |
//! | loop against frequency | the maps' own loop at their frequencies | 3 % | direct solves |
//! | path through two parts | the same copper drawn as one net | 1e-9 | the same current in the same copper |

use crate::draft::{Draft, ground, row};
use crate::scene::{Scene, band, rectangle};
use ebbmap::board::Board;
use ebbmap::field::{PlaneMaps, ReturnMap, Workshop};
use ebbmap::figure::section;
use ebbmap::geom::Point;
use ebbmap::plan::{Plan, build};
use ebbmap::review::drive::{Drive, Level, Load, Pulse};
use ebbmap::review::path::{PairRequest, PathRequest, Receiver, Step};
use ebbmap::review::{Band, Model, NetRequest, Review, SolverRequest};
use ebbmap::signal::spectrum::{Limits, band_spectrum, lines_in_band};
use ebbmap::spread::{microstrip, strip};
use num_complex::Complex64;

/// The maps of the only plane of a plan's first path.
fn solved(board: &Board, plan: &Plan, hertz: f64, tolerance: f64) -> PlaneMaps {
    let workshop = Workshop::new(board, plan, Model::Sheet).with_tolerance(tolerance);
    let bench = workshop.bench(&plan.paths[0]);
    bench.solve(&band(hertz), hertz).planes.remove(0).unwrap()
}

#[test]
fn a_band_map_is_the_power_sum_of_its_lines() {
    let scene = Scene {
        width: 20.0,
        height: 16.0,
        track: vec![(4.0, 4.0), (16.0, 4.0), (16.0, 12.0), (4.0, 12.0)],
        voids: vec![rectangle(9.0, 2.0, 10.0, 6.0)],
        gap: 0.4,
        cell: 0.4,
        ..Scene::default()
    };
    let (board, plan) = (scene.board(), scene.plan());
    let workshop = Workshop::new(&board, &plan, Model::Sheet).with_tolerance(1e-6);
    let bench = workshop.bench(&plan.paths[0]);
    let level = Some(Level::Amperes(0.02));
    let unit = |_: f64| Complex64::new(1.0, 0.0);
    for (from_hz, to_hz, frequency_hz) in [(3e6, 3e7, 4e5), (3e5, 3e6, 4e4)] {
        let pulse = Pulse { frequency_hz, rise_s: 9e-9, fall_s: 6e-9, duty: 0.37, level };
        let (drive, limits) = (Drive::Ripple(pulse), Limits { from_hz, to_hz });
        let whole = Band { name: "band".into(), from_hz, to_hz, at_hz: vec![1e7], explicit: false };
        let spectrum = band_spectrum(&drive, limits, &unit, 1e-4);
        assert!(spectrum.points.len() < 12 && spectrum.line_count > 60, "{spectrum:?}");
        let solved = bench.solve_band(&whole, &spectrum, true).unwrap();
        let map = &solved.planes[0].as_ref().unwrap().map;
        let got = map.band_density.as_ref().unwrap();
        let (nx, cells) = (map.grid.nx, map.grid.len());
        let (mut squares, mut power, mut henry) = (vec![0.0; cells], 0.0, 0.0);
        for line in lines_in_band(&drive, limits, &unit) {
            let each = bench.solve(&whole, line.frequency_hz);
            let each = &each.planes[0].as_ref().unwrap().map;
            let own = line.current_rms_a * line.current_rms_a;
            power += own;
            henry += own * each.loop_impedance_ohm.unwrap().im / (std::f64::consts::TAU * line.frequency_hz);
            for (cell, square) in squares.iter_mut().enumerate() {
                let (kx, ky) = each.density(cell % nx, cell / nx);
                *square += own * (kx.norm_sqr() + ky.norm_sqr());
            }
        }
        assert!((got.current_rms_a.unwrap() / power.sqrt() - 1.0).abs() < 1e-9);
        let largest = squares.iter().fold(0.0f64, |a, &b| a.max(b)).sqrt();
        let mut worst = 0.0f64;
        for cell in (0..cells).filter(|&cell| map.copper[cell]) {
            let want = squares[cell].sqrt();
            let error = (got.rms[cell] * power.sqrt() - want).abs() / want.max(1e-2 * largest);
            worst = worst.max(error);
        }
        let omega = std::f64::consts::TAU * map.frequency_hz;
        let inductance = (map.loop_impedance_ohm.unwrap().im / omega) / (henry / power) - 1.0;
        println!("{from_hz:e}: {} points, worst {worst:.1e}, L {inductance:.1e}", spectrum.points.len());
        assert!(worst < 1e-3 && inductance.abs() < 1e-3, "{from_hz:e}: {worst:e}, {inductance:e}");
        assert_eq!(map.magnitude(5, 5), got.rms[5 * nx + 5]);
    }
}

/// Two lines 0.8 mm apart over a plane 0.4 mm below: as a pair with an imbalance, or one of them alone.
fn lines(wanted: &dyn Fn(&mut Review)) -> ReturnMap {
    let mut draft = Draft::new(30.0, 20.0, &[0.4]);
    draft.plane(1, "GND", &[]);
    for (number, name, y) in [(1, "LINK_P", 10.0), (3, "LINK_N", 10.8)] {
        draft.track(0, name, &[(5.0, y), (25.0, y)], 0.4);
        draft.pad(0, &format!("U1.{number}"), name, (5.0, y), 0.4);
        draft.pad(0, &format!("U2.{number}"), name, (25.0, y), 0.4);
    }
    for (part, x) in [("U1", 5.0), ("U2", 25.0)] {
        ground(&mut draft, &format!("{part}.2"), (x, 12.0));
    }
    let mut review = review(0.2e-3);
    wanted(&mut review);
    let board = draft.board();
    solved(&board, &build(&board, &review), 1e9, 1e-8).map
}

fn pair_map(imbalance: f64) -> ReturnMap {
    lines(&|review| {
        review.pairs = vec![PairRequest {
            name: "LINK".into(),
            positive: "LINK_P".into(),
            negative: "LINK_N".into(),
            imbalance,
            ..PairRequest::default()
        }];
    })
}

fn single_map(name: &str) -> ReturnMap {
    lines(&|review| review.nets = vec![NetRequest { name: name.into(), ..NetRequest::default() }])
}

#[test]
fn a_balanced_pair_leaves_the_difference_of_two_strips() {
    let map = pair_map(0.0);
    let (ix, h, w) = (map.grid.nx / 2, map.height_m, map.width_m);
    let mut worst = 0.0f64;
    for iy in 0..map.grid.ny {
        let y = map.grid.centre(ix, iy).y;
        let (to_first, to_second) = (y - 10.0e-3, y - 10.8e-3);
        let away = to_first.abs().min(to_second.abs());
        if away < 4.0 * h || away > 8.0 * h {
            continue;
        }
        // A strip's return runs against its current.
        let want = -(strip::density(to_first, w, h) - strip::density(to_second, w, h));
        let error = map.density(ix, iy).0.re / want - 1.0;
        println!("{:.1} h: {want:.2}, {error:.4}", away / h);
        worst = worst.max(error.abs());
    }
    println!("far density of a balanced pair: {worst:.4}");
    assert!(worst < 0.02, "{worst}");
}

#[test]
fn a_pair_out_of_balance_adds_a_tenth_of_a_single_track() {
    let (balanced, tilted) = (pair_map(0.0), pair_map(0.1));
    // 1.05 and -0.95 are 0.95 of the balanced pair and a tenth of the positive line alone.
    let single = single_map("LINK_P");
    let (nx, cells) = (single.grid.nx, single.grid.len());
    let largest = (0..cells).map(|cell| single.magnitude(cell % nx, cell / nx)).fold(0.0, f64::max);
    let mut worst = 0.0f64;
    for (ix, iy) in (0..cells).map(|cell| (cell % nx, cell / nx)) {
        let (a, b, one) = (balanced.density(ix, iy), tilted.density(ix, iy), single.density(ix, iy));
        let error = (b.0 - 0.95 * a.0 - 0.1 * one.0).norm() + (b.1 - 0.95 * a.1 - 0.1 * one.1).norm();
        worst = worst.max(error / (0.1 * largest));
    }
    println!("a tenth of a single track: {worst:.1e}");
    assert!(worst < 1e-3, "{worst:e}");
}

fn review(cell_m: f64) -> Review {
    Review {
        reference_nets: vec!["GND".into()],
        solver: SolverRequest { cell_m: Some(cell_m), ..SolverRequest::default() },
        ..Review::default()
    }
}

#[test]
fn plane_current_follows_the_track_of_an_open_line() {
    let mut draft = Draft::new(40.0, 20.0, &[0.2]);
    draft.plane(1, "GND", &[]);
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "TIDE", (x, 10.0), 0.4);
        ground(&mut draft, &format!("{part}.2"), (x, 12.0));
    }
    draft.track(0, "TIDE", &[(5.0, 10.0), (35.0, 10.0)], 0.2);
    let mut wanted = review(0.4e-3);
    let load_f = 2e-12;
    wanted.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
    wanted.nets[0].signal.load = Some(Load { capacitance_f: load_f, ..Load::default() });
    let board = draft.board();
    let plan = build(&board, &wanted);
    let path = &plan.paths[0];
    assert!(path.signal.remarks[0].contains("falls along the track"), "{:?}", path.signal.remarks);
    let map = solved(&board, &plan, 1e8, 1e-6).map;
    // Charge balance: the current at a place charges the line and the load beyond it.
    let per_m = microstrip::capacitance_per_m(1.0, 4.2);
    let track_f = per_m * 30e-3;
    let mut worst = 0.0f64;
    for at in 0..12 {
        let x = 8.0 + 2.15 * f64::from(at);
        let want = (load_f + per_m * (35.0 - x) * 1e-3) / (load_f + track_f);
        let whole = section::shares(&map, Point::mm(x, 10.0), Point::new(1.0, 0.0), &[20e-3])[0];
        worst = worst.max((whole - want).abs());
    }
    println!(
        "plane current against the charge beyond: {worst:.4} of the driver's, track {:.2} pF",
        track_f * 1e12
    );
    assert!(worst < 0.01, "{worst}");
}

#[test]
fn a_path_through_parts_has_the_map_of_the_same_copper_as_one_net() {
    let mut through = review(0.4e-3);
    through.paths = vec![PathRequest {
        name: "TIDE".into(),
        driver: "U1.1".into(),
        through: vec![Step::Part("R1".into()), Step::Part("R2".into())],
        receivers: vec![Receiver { pin: "U2.1".into(), share: 1.0 }],
        ..PathRequest::default()
    }];
    let mut whole = review(0.4e-3);
    whole.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
    let map = |board: &Board, review: &Review| solved(board, &build(board, review), 1e7, 1e-8).map;
    let (a, b) = (map(&row(true).board(), &through), map(&row(false).board(), &whole));
    assert_eq!((a.grid, &a.copper), (b.grid, &b.copper));
    let largest = a.jx.iter().chain(&a.jy).map(|current| current.norm()).fold(0.0, f64::max);
    let worst =
        |a: &[Complex64], b: &[Complex64]| a.iter().zip(b).map(|(a, b)| (a - b).norm()).fold(0.0, f64::max);
    let error = worst(&a.jx, &b.jx).max(worst(&a.jy, &b.jy)) / largest;
    println!("three nets against one: {error:.1e}");
    assert!(largest > 0.1 && error < 1e-9, "{error:e}");
}

#[test]
fn the_loop_curve_meets_the_maps() {
    let scene =
        Scene { width: 30.0, height: 20.0, track: vec![(5.0, 10.0), (25.0, 10.0)], ..Scene::default() };
    let (board, plan) = (scene.board(), scene.plan());
    let workshop = Workshop::new(&board, &plan, Model::Sheet).with_tolerance(1e-6);
    let bench = workshop.bench(&plan.paths[0]);
    let curve = bench.loop_curve().unwrap();
    assert!((20..40).contains(&curve.frequency_hz.len()), "{:?}", curve.frequency_hz);
    for hertz in [1e3, 1e5, 1e7, 1e9] {
        let at = curve.frequency_hz.iter().position(|f| (f / hertz - 1.0).abs() < 1e-9).unwrap();
        let map = bench.solve(&band(hertz), hertz).planes.remove(0).unwrap().map;
        let z = map.loop_impedance_ohm.unwrap();
        let inductance = curve.inductance_h[at] / (z.im / (std::f64::consts::TAU * hertz)) - 1.0;
        let resistance = curve.resistance_ohm[at] / z.re - 1.0;
        println!("{hertz:e} Hz: L {inductance:.4}, R {resistance:.4}");
        assert!(inductance.abs() < 0.03, "{hertz:e}: {inductance}");
        // At high frequency the resistance of the plane waits for cells smaller than the decay length.
        assert!(resistance.abs() < if hertz < 1e6 { 0.03 } else { 0.3 }, "{hertz:e}: {resistance}");
    }
    assert!(curve.inductance_h.windows(2).all(|pair| pair[1] <= pair[0] * 1.001), "{:?}", curve.inductance_h);
}
