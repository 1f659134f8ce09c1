//! Paths over all their conductors: layer changes, splits, pours beside the track, power planes, windows.

use crate::scene::{band, rectangle, solved_path};
use crate::stacked::{AGND, DGND, GND, Stacked, V3, barrel, joint, layer_change, on, through};
use ebbmap::field::{ReturnMap, Workshop};
use ebbmap::figure::{ChartedPath, chart};
use ebbmap::plan::Joint;
use ebbmap::review::Model;
use num_complex::Complex64;
use std::f64::consts::{PI, TAU};

/// Solved with windows, or on the whole board.
fn solve(board: &Stacked, hertz: f64, windows: bool) -> ChartedPath {
    let (made, mut plan) = (board.board(), board.plan());
    plan.bands = vec![band(hertz)];
    let workshop = Workshop::new(&made, &plan, Model::Sheet).with_tolerance(1e-7);
    let workshop = if windows { workshop } else { workshop.with_whole_boards() };
    let bench = workshop.bench(&plan.paths[0]);
    chart(&bench, &plan.paths[0], &plan.bands[0], hertz)
}

fn map(charted: &ChartedPath, plane: &str) -> ReturnMap {
    let maps = charted.planes.iter().map(|plane| &plane.as_ref().unwrap().map);
    maps.into_iter().find(|map| map.plane.to_string() == plane).unwrap().clone()
}

#[test]
fn stitching_vias_share_alike() {
    // Mirror symmetry: about the track's axis, and under exchange of the two planes together with the two ends.
    for vias in [
        vec![(13.0, 6.0)],
        vec![(12.0, 7.4), (12.0, 4.6)],
        vec![(14.0, 6.0), (12.0, 8.0), (10.0, 6.0), (12.0, 4.0)],
    ] {
        for hertz in [0.0, 1e7] {
            let charted = solve(&layer_change(&vias), hertz, false);
            let currents: Vec<Complex64> = charted.joints.iter().map(|joint| joint.current).collect();
            eprintln!("{hertz:e} Hz: {currents:?}");
            assert_eq!(currents.len(), vias.len());
            let sum: Complex64 = currents.iter().sum();
            assert!((sum + 1.0).norm() < 1e-9, "all of the return changes the layer: {sum}");
            let half = currents.len() / 2;
            for (a, b) in currents.iter().zip(&currents[half..]) {
                assert!((a - b).norm() < 1e-6, "opposite vias carry alike: {currents:?}");
            }
        }
    }
}

/// A plane split in two by a slot of 0.4 mm, the track across it at y = 6.
fn split(bridges: Vec<Joint>) -> Stacked {
    Stacked {
        size: (24.0, 12.0),
        gaps: vec![0.3],
        copper: vec![
            Vec::new(),
            vec![(AGND, rectangle(0.0, 0.0, 11.8, 12.0)), (DGND, rectangle(12.2, 0.0, 24.0, 12.0))],
        ],
        foil: 0.035,
        track: vec![(0, (4.0, 6.0), (12.0, 6.0), 0.3, 1.0), (0, (12.0, 6.0), (20.0, 6.0), 0.3, 1.0)],
        entries: vec![(1, 1, (20.0, 6.0), 1.0), (1, 0, (4.0, 6.0), -1.0)],
        joints: bridges,
        charts: vec![(1, AGND, 0..1), (1, DGND, 1..2)],
        cell: 0.2,
    }
}

fn bridge(what: &str, y: f64, ohm: f64, farad: Option<f64>) -> Joint {
    let ends = (on(1, 0, (11.4, y)), on(1, 1, (12.6, y)));
    Joint { resistance_ohm: ohm, capacitance_f: farad, ..joint(what, ends.0, ends.1) }
}

#[test]
fn all_current_takes_the_only_bridge() {
    for hertz in [0.0, 1e7] {
        let charted = solve(&split(vec![bridge("NT1", 10.0, 1e-3, None)]), hertz, true);
        assert_eq!(charted.joints.len(), 1);
        let current = charted.joints[0].current;
        assert!((current + 1.0).norm() < 1e-9, "{current}");
        let (left, right) = (map(&charted, "L2-AGND"), map(&charted, "L2-DGND"));
        for (map, x) in [(&left, 8.0), (&right, 16.0)] {
            let all = through(map, x);
            assert!((all + 1.0).norm() < 1e-9, "{all}");
        }
        assert!(left.copper.iter().zip(&right.copper).all(|(a, b)| !(a & b)), "a cell is one net's");
    }
}

#[test]
fn a_return_without_a_way_is_refused() {
    let charted = solve(&split(vec![bridge("C1", 10.0, 1e-3, Some(1e-9))]), 0.0, true);
    let reason = charted.planes[0].as_ref().unwrap_err();
    assert_eq!(reason.code.name, "return-does-not-close");
    assert!(reason.text.contains("pin at 20 6") && reason.text.contains("TIDE_CLK"), "{}", reason.text);
}

#[test]
fn two_bridges_divide_the_current() {
    // Bridges at mirrored places: (Z1 + Zd) i1 = (Z2 + Zd) i2, Zd being what the copper adds to each against the
    // other, the same for all values of the bridges. It is found with 1 and 3 ohm, and used for 1 ohm and 1 nF.
    let crossing = 1.0 / (TAU * 1e-9);
    for hertz in [0.1 * crossing, crossing, 10.0 * crossing] {
        let ratio = |second: (f64, Option<f64>)| {
            let bridges = vec![bridge("R1", 10.0, 1.0, None), bridge("C1", 2.0, second.0, second.1)];
            let charted = solve(&split(bridges), hertz, false);
            let [one, two] = &charted.joints[..] else { panic!("two bridges carry current") };
            assert!((one.current + two.current + 1.0).norm() < 1e-9);
            one.current / two.current
        };
        let known = ratio((3.0, None));
        let own = (3.0 - known) / (known - 1.0);
        let capacitor = Complex64::new(0.0, -1.0 / (TAU * hertz * 1e-9));
        let expected = (capacitor + own) / (1.0 + own);
        let found = ratio((0.0, Some(1e-9)));
        eprintln!("{hertz:e} Hz: copper {own}, ratio {found}, divider {expected}");
        assert!((found - expected).norm() < 0.02 * expected.norm(), "{found} against {expected}");
    }
}

#[test]
fn a_resistor_and_a_capacitor_on_one_pair_of_pads_are_a_divider() {
    let crossing = 1.0 / (TAU * 1e-9);
    for hertz in [0.1 * crossing, crossing, 10.0 * crossing] {
        let bridges = vec![bridge("R1", 10.0, 1.0, None), bridge("C1", 10.0, 0.0, Some(1e-9))];
        let charted = solve(&split(bridges), hertz, true);
        let admittance = Complex64::new(0.0, TAU * hertz * 1e-9);
        let exact = -1.0 / (1.0 + admittance);
        let found = charted.joints.iter().find(|joint| joint.what == "R1").unwrap().current;
        assert!((found - exact).norm() < 1e-4, "{found} against {exact}");
    }
}

/// Pours on both sides of a track, at a gap in mm, over a plane; bonded at both ends.
fn pours(gap: f64, cell: f64) -> Stacked {
    let (h, width, length) = (0.4, 8.0, 56.0);
    let (low, high) = (0.5 * width - 0.5 * h - gap, 0.5 * width + 0.5 * h + gap);
    let mut board = Stacked {
        size: (length, width),
        gaps: vec![h],
        copper: vec![
            vec![(GND, rectangle(0.0, 0.0, length, low)), (GND, rectangle(0.0, high, length, width))],
            Vec::new(),
        ],
        foil: 0.035,
        // Eight strips side by side carry alike: the uniform profile of a perfect strip.
        track: (0..8)
            .map(|i| {
                let y = 0.5 * width + h * ((i as f64 + 0.5) / 8.0 - 0.5);
                (0, (2.0, y), (length - 2.0, y), h / 8.0, 0.125)
            })
            .collect(),
        entries: vec![(1, 0, (length - 2.0, 0.5 * width), 1.0), (1, 0, (2.0, 0.5 * width), -1.0)],
        joints: Vec::new(),
        charts: vec![(1, GND, 0..8)],
        cell,
    };
    board.copper[1] = vec![board.whole(GND)];
    // Bonds as dense as cells allow, so that what they add counts little on the length between them.
    for i in 0..6 {
        let x = 0.4 + 0.4 * f64::from(i);
        for x in [x, length - x] {
            for j in 0..4 {
                let off = 0.3 + 0.4 * f64::from(j);
                for (area, y) in [(0, low - off), (1, high + off)] {
                    board.joints.push(joint("via", on(0, area, (x, y)), on(1, 0, (x, y))));
                }
            }
        }
    }
    board
}

#[test]
#[ignore = "the board is too short and narrow for the two-dimensional value: 0.03 off"]
fn pours_beside_the_track_take_their_share() {
    // Source: two-dimensional integral equation of perfect conductors, uniform strip of w = h between two half-planes
    // and over a plane: 59.2, 45.3, 24.6 and 13.1 % at gaps of h/2, h, 2.5 h and 5 h.
    let mut worst: f64 = 0.0;
    for (gap, exact) in [(0.2, 0.592), (0.4, 0.453), (1.0, 0.246), (2.0, 0.131)] {
        let charted = solve(&pours(gap, 0.1), 1e9, false);
        let (pour, plane) =
            (through(&map(&charted, "L1-GND"), 28.0), through(&map(&charted, "L2-GND"), 28.0));
        eprintln!("gap {gap}: pours {pour}, plane {plane}, source {exact}");
        assert!((pour + plane + 1.0).norm() < 1e-6, "{pour} {plane}");
        worst = worst.max((-pour.re - exact).abs());
    }
    assert!(worst < 0.02, "{worst}");
}

#[test]
#[ignore = "for the notes"]
fn pours_and_cells() {
    for cell in [0.2, 0.1, 0.05] {
        for gap in [0.2, 0.4, 1.0, 2.0] {
            let charted = solve(&pours(gap, cell), 1e9, false);
            eprintln!("cell {cell} gap {gap}: pours {}", through(&map(&charted, "L1-GND"), 28.0).re);
        }
    }
}

/// A track on the bottom under a power plane under ground.
fn power(joints: Vec<Joint>) -> Stacked {
    let mut board = Stacked {
        size: (96.0, 16.0),
        gaps: vec![1.0, 0.2],
        copper: vec![Vec::new(); 3],
        foil: 0.035,
        track: vec![(2, (4.0, 8.0), (92.0, 8.0), 0.4, 1.0)],
        entries: vec![(0, 0, (92.0, 8.0), 1.0), (0, 0, (4.0, 8.0), -1.0)],
        joints,
        charts: vec![(1, V3, 0..1)],
        cell: 0.4,
    };
    board.copper[0] = vec![board.whole(GND)];
    board.copper[1] = vec![board.whole(V3)];
    board
}

#[test]
fn a_floating_power_plane_carries_no_net_current() {
    let charted = solve(&power(Vec::new()), 1e7, false);
    let (ground, supply) = (map(&charted, "L1-GND"), map(&charted, "L2-V3"));
    assert!((through(&ground, 48.0) + 1.0).norm() < 1e-9);
    assert!(through(&supply, 48.0).norm() < 1e-9);
    // Its own current follows the track all the same: -1 A under it and back beside it.
    let middle = supply.density(supply.grid.nx / 2, supply.grid.ny / 2).0.re;
    assert!(middle < -100.0, "{middle} A/m under the track");
}

#[test]
#[ignore = "not met: 5 % off the expected currents at 1 MHz"]
fn capacitors_bring_the_return_to_the_power_plane() {
    // Source: two bonded sheets on one side of the track, k = 0: share of the nearer
    // (Z2 + jw mu0 s)/(Z1 + Z2 + jw mu0 s), s the distance of the sheets.
    let ring = |x: f64| {
        (0..8).map(move |i| {
            let angle = PI * (i as f64 + 0.5) / 4.0;
            (x + 1.5 * angle.cos(), 8.0 + 1.5 * angle.sin())
        })
    };
    let capacitor = |at| Joint {
        capacitance_f: Some(1e-3),
        resistance_ohm: 1e-6,
        ..joint("C1", on(0, 0, at), on(1, 0, at))
    };
    let joints: Vec<Joint> = ring(4.0).chain(ring(92.0)).map(capacitor).collect();
    for hertz in [1e5, 1e6] {
        let charted = solve(&power(joints.clone()), hertz, false);
        let (ground, supply) = (map(&charted, "L1-GND"), map(&charted, "L2-V3"));
        let (ground, near) = (through(&ground, 48.0), through(&supply, 48.0));
        let zs = supply.zs_ohm.unwrap();
        let between = Complex64::new(0.0, TAU * hertz * 4e-7 * PI * 1e-3);
        let exact = (zs + between) / (2.0 * zs + between);
        eprintln!("{hertz:e} Hz: power plane {near}, formula {exact}");
        assert!((ground + near + 1.0).norm() < 1e-9);
        assert!((near + exact).norm() < 0.03, "{near} against {exact}");
    }
}

#[test]
fn results_do_not_depend_on_the_number_of_threads() {
    let board = layer_change(&[(13.0, 6.0), (12.0, 8.0)]);
    let with = |threads: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| solved_path(&board.board(), &board.plan(), Model::Sheet, 1e7))
    };
    let (one, two) = (with(1), with(2));
    for (a, b) in one.planes.iter().zip(&two.planes) {
        let (a, b) = (&a.as_ref().unwrap().map, &b.as_ref().unwrap().map);
        assert!(a.jx == b.jx && a.jy == b.jy && a.loop_impedance_ohm == b.loop_impedance_ohm);
    }
    assert_eq!(one.joints, two.joints);
}

#[test]
#[ignore = "not met: no window is taken on this board"]
fn a_window_agrees_with_the_whole_board() {
    let vias = [(11.0, 12.0), (12.0, 14.0), (60.0, 50.0)];
    let mut board = layer_change(&vias);
    board.size = (88.0, 72.0);
    board.cell = 0.4;
    board.copper[1] = vec![board.whole(GND)];
    board.copper[2] = vec![board.whole(GND)];
    board.track = vec![(0, (4.0, 12.0), (12.0, 12.0), 0.2, 1.0), (3, (12.0, 12.0), (20.0, 12.0), 0.2, 1.0)];
    board.entries = vec![(2, 0, (20.0, 12.0), 1.0), (1, 0, (4.0, 12.0), -1.0)];
    for hertz in [1e6, 1e8] {
        let (window, whole) = (solve(&board, hertz, true), solve(&board, hertz, false));
        for (a, b) in window.planes.iter().zip(&whole.planes) {
            let (a, b) = (a.as_ref().unwrap(), b.as_ref().unwrap());
            let pairs = [
                ("share", Some(a.figures.share_3h), Some(b.figures.share_3h)),
                ("half-width", Some(a.figures.half_width_m[0]), Some(b.figures.half_width_m[0])),
                ("half-width 80 %", Some(a.figures.half_width_m[1]), Some(b.figures.half_width_m[1])),
                ("R", a.figures.loop_resistance_ohm, b.figures.loop_resistance_ohm),
                ("L", a.figures.loop_inductance_h, b.figures.loop_inductance_h),
            ];
            assert_eq!(a.map.grid.bounds(), b.map.grid.bounds());
            assert!(hertz < 1e7 || a.map.loop_impedance_ohm != b.map.loop_impedance_ohm, "no window");
            let near = (a.figures.share_3h.value.unwrap() - b.figures.share_3h.value.unwrap()).abs();
            assert!(near < 0.01, "share at {hertz:e} Hz off by {near}");
            for (name, a, b) in pairs {
                let (Some(a), Some(b)) = (a, b) else { panic!("{name} is missing") };
                let off = (a.value.unwrap_or(0.0) - b.value.unwrap_or(0.0)).abs();
                eprintln!("{hertz:e} Hz {name}: {:?} whole {:?}, error {:e}", a.value, b.value, a.error);
                assert!(off <= a.error, "{name} at {hertz:e} Hz: {a:?} against {b:?}");
            }
        }
        for (a, b) in window.joints.iter().zip(&whole.joints) {
            assert!((a.current - b.current).norm() < 0.02, "{a:?} against {b:?}");
        }
    }
}

#[test]
fn a_barrel_leads_through_a_layer_that_is_left_out() {
    // The plane between carries nothing of a track that has both its own planes: via by via through it.
    let mut board = layer_change(&[]);
    board.gaps = vec![0.2, 0.3, 0.3, 0.2];
    board.copper.insert(2, vec![(V3, rectangle(0.0, 0.0, 0.5, 0.5)), (GND, rectangle(9.0, 5.0, 11.0, 7.0))]);
    board.track[1].0 = 4;
    board.entries[0].0 = 3;
    board.charts[1].0 = 3;
    board.joints = vec![
        Joint {
            barrel_radius_m: Some(0.15e-3),
            ..joint("via", on(1, 0, (10.0, 6.0)), on(2, 1, (10.0, 6.0)))
        },
        Joint {
            barrel_radius_m: Some(0.15e-3),
            ..joint("via", on(2, 1, (10.0, 6.0)), on(3, 0, (10.0, 6.0)))
        },
        barrel((1, 3), (14.0, 6.0)),
    ];
    let (window, whole) = (solve(&board, 1e7, true), solve(&board, 1e7, false));
    for (a, b) in window.joints.iter().zip(&whole.joints) {
        eprintln!("{} {} {}", a.what, a.current, b.current);
        assert!((a.current - b.current).norm() < 0.03, "{a:?} against {b:?}");
    }
    assert_eq!(window.joints.len(), 3);
}
