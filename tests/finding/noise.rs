//! Noise between paths: a worked example, steps of converters, mutual inductance, reciprocity.

use crate::scene::{Scene, band};
use ebbmap::field::{Couplings, Workshop};
use ebbmap::finding::noise::{TRANSFER_ERROR, magnitude_at, noise, of_others};
use ebbmap::finding::{Grade, Measured};
use ebbmap::plan::{ConductorLayer, Conductors, End, Entry, PathPlan, Plan};
use ebbmap::review::drive::{Budget, Drive, SignalRequest, TableLine};
use ebbmap::review::{Band, Model, NetRequest, Review};
use ebbmap::signal::converter::{in_lsb, lsb_v};
use num_complex::Complex64;

/// Two paths over the plane of a scene, at the heights of its track.
fn pair(scene: &Scene, tracks: [Vec<(f64, f64)>; 2]) -> Plan {
    let path = |(name, track): (&str, &Vec<(f64, f64)>)| {
        let mut path = Scene { track: track.clone(), ..scene.clone() }.net();
        path.name = name.into();
        let chart = &path.charts[0];
        let entry = |landing: &ebbmap::plan::Landing, current| Entry {
            end: End::Copper { layer: 1, area: 0, at: landing.at, radius_m: landing.radius_m },
            current,
            what: landing.what.clone(),
        };
        path.entries = vec![entry(&chart.receiver_landing, 1.0), entry(&chart.driver_landing, -1.0)];
        path
    };
    let paths: Vec<PathPlan> = ["TIDE_CLK", "LEVEL_IN"].into_iter().zip(&tracks).map(path).collect();
    let layers = vec![ConductorLayer { layer: 1, areas: vec![0] }];
    Plan { paths, conductors: Conductors { layers, ..Conductors::default() }, ..Plan::default() }
}

fn couplings(scene: &Scene, plan: &Plan, hertz: f64, tolerance: f64) -> Couplings {
    let board = scene.board();
    let workshop = Workshop::new(&board, plan, Model::Sheet).with_tolerance(tolerance);
    workshop.couplings(&[true; 2], &[hertz]).unwrap().remove(0)
}

/// M' = (mu0/4 pi) ln(1 + 4 h1 h2/d^2) over a perfect plane (images; Paul, Inductance, 2010, from memory): 14.842 nH/m at
/// d = 5h, 36.772 nH/m at 3h. Ends of the tracks are taken off by the difference of two lengths.
#[test]
fn two_tracks_over_a_plane_have_the_published_mutual_inductance() {
    for (heights, nanohenry_per_m) in [(3.0, 36.772478), (5.0, 14.8420005)] {
        let h = 1.0;
        let mut found = Vec::new();
        for length in [40.0, 80.0] {
            let scene = Scene {
                width: length + 30.0,
                height: 70.0,
                gap: h,
                cell: 0.4,
                track_width: 0.1,
                ..Scene::default()
            };
            let line = |y: f64| vec![(15.0, y), (15.0 + length, y)];
            let plan = pair(&scene, [line(35.0), line(35.0 + heights * h)]);
            let z = couplings(&scene, &plan, 1e9, 1e-6).z_ohm[0][1].unwrap();
            found.push(z.im / (std::f64::consts::TAU * 1e9));
        }
        let per_m = (found[1] - found[0]) / 40e-3 * 1e9;
        println!("{heights} h: {per_m} nH/m, published {nanohenry_per_m}");
        assert!((per_m / nanohenry_per_m - 1.0).abs() < 0.02, "{per_m} nH/m");
    }
}

/// Lorentz: exchanging source and victim gives the same impedance; both are solved on their own.
#[test]
fn transfer_is_reciprocal() {
    let scene =
        Scene { voids: vec![crate::scene::rectangle(19.6, 10.0, 20.4, 18.0)], cell: 0.4, ..Scene::default() };
    let plan = pair(&scene, [vec![(5.0, 15.0), (35.0, 15.0)], vec![(8.0, 12.0), (25.0, 17.0), (33.0, 17.0)]]);
    for hertz in [0.0, 1e5, 1e8] {
        let z = couplings(&scene, &plan, hertz, 1e-8).z_ohm;
        let z: Vec<Vec<Complex64>> =
            z.into_iter().map(|row| row.into_iter().map(Option::unwrap).collect()).collect();
        let size = (z[0][0] * z[1][1]).norm().sqrt();
        println!("{hertz:e} Hz: {} and {} of {size}", z[0][1], z[1][0]);
        assert!((z[0][1] - z[1][0]).norm() <= 1e-6 * size);
        assert!(z[0][1].norm() > 1e-3 * size, "nothing is coupled");
    }
}

/// At DC two tracks with the same landings share all of the plane's resistance. For landings over which the current enters
/// evenly, R(D2) - R(D1) = (Rs/pi) ln(D2/D1) on a wide sheet (point sources, superposition); the insulating rim of the
/// plane adds the images of both landings in all rectangles round it.
#[test]
fn common_resistance_of_two_tracks_with_the_same_landings() {
    let scene = Scene { width: 140.0, height: 120.0, cell: 0.25, landing_radius: 1.0, ..Scene::default() };
    let share = |half: f64| {
        let track = |bend: f64| vec![(70.0 - half, 60.0), (70.0, 60.0 + bend), (70.0 + half, 60.0)];
        couplings(&scene, &pair(&scene, [track(0.0), track(3.0)]), 0.0, 1e-8).z_ohm[0][1].unwrap().re
    };
    let (far, near) = (share(5.0), share(2.5));
    let want = (squares(5.0) - squares(2.5)) / (58e6 * 35e-6);
    println!("{far} - {near} ohm, want {want}");
    assert!(((far - near) / want - 1.0).abs() < 0.005, "{} want {want}", far - near);
}

/// Squares between landings `half` to both sides of the middle of 140 x 120 mm, but for the part of a landing itself.
fn squares(half: f64) -> f64 {
    let (width, height) = (140.0, 120.0);
    let ends = [70.0 - half, 70.0 + half];
    let potential = |at: f64| {
        let mut sum = 0.0;
        for m in -12..=12 {
            for n in -12..=12 {
                for side in [1.0, -1.0] {
                    for (end, sign) in ends.into_iter().zip([-1.0, 1.0]) {
                        let x = at - 2.0 * f64::from(m) * width - side * end;
                        for y in [2.0 * f64::from(n) * height, 2.0 * f64::from(n) * height + height] {
                            let distance = x.hypot(y);
                            sum += if distance > 1e-9 { sign * distance.ln() } else { 0.0 };
                        }
                    }
                }
            }
        }
        sum / std::f64::consts::TAU
    };
    potential(ends[0]) - potential(ends[1])
}

fn table() -> Drive {
    let line = |frequency_hz, current_rms_a| TableLine { frequency_hz, current_rms_a };
    Drive::Spectrum(vec![line(1e6, 10e-3), line(2e6, 5e-3), line(50e6, 1e-3)])
}

/// By hand: M = 1 nH, lines of 10 mA at 1 MHz, 5 mA at 2 MHz and 1 mA at 50 MHz. 2 pi 1 MHz 1 nH is 6.283 mohm; the first
/// two put 62.83 uV each, together 88.86 uV, into the band to 3 MHz; the third 314.2 uV into that to 300 MHz; all 326.5
/// uV. A converter of 16 bits over 2.5 V has steps of 38.147 uV: 8.559 LSB; half a step is the budget, 19.07 uV.
#[test]
fn noise_of_a_worked_example() {
    let scene = Scene::default();
    let mut plan = pair(&scene, [vec![(5.0, 15.0), (35.0, 15.0)], vec![(5.0, 20.0), (35.0, 20.0)]]);
    let own = |name: &str, from_hz, to_hz, at| Band {
        name: name.into(),
        from_hz,
        to_hz,
        at_hz: vec![at],
        explicit: false,
    };
    plan.bands = vec![own("low", 3e5, 3e6, 1e6), own("high", 3e6, 3e8, 3e7)];
    let budget = Budget::Converter { bits: 16, full_scale_v: 2.5, lsb: 0.5 };
    let net = |name: &str, signal| NetRequest { name: name.into(), signal, ..NetRequest::default() };
    let review = Review {
        nets: vec![
            net("TIDE_CLK", SignalRequest { drive: Some(table()), ..SignalRequest::default() }),
            net("LEVEL_*", SignalRequest { budget: Some(budget), ..SignalRequest::default() }),
        ],
        ..Review::default()
    };
    let at = |hertz: f64| {
        let z = Complex64::new(0.0, std::f64::consts::TAU * hertz * 1e-9);
        Couplings { frequency_hz: hertz, paths: vec![0, 1], z_ohm: vec![vec![Some(z); 2]; 2] }
    };
    let solved = [at(1e6), at(3e7)];
    let all = noise(&solved, &plan, &review);
    let of =
        |band: Option<&str>| all.iter().find(|n| n.path == "LEVEL_IN" && n.band.as_deref() == band).unwrap();
    for (band, volts) in [(Some("low"), 88.86e-6), (Some("high"), 314.16e-6), (None, 326.49e-6)] {
        let got = of(band).volts_rms;
        assert!((got / volts - 1.0).abs() < 0.02, "{band:?}: {got} V, by hand {volts}");
    }
    let total = of(None);
    assert!((total.lsb.unwrap() - 8.559).abs() < 0.02 && total.parts[0].from == "TIDE_CLK");
    let found = of_others(1, &solved, &all, &plan, &review);
    assert_eq!((found.len(), found[0].code.name, found[0].grade), (1, "noise-over-budget", Grade::Fail));
    assert_eq!(found[0].excess.what, Measured::Noise);
    assert!((found[0].excess.limit.unwrap() - 19.0735e-6).abs() < 1e-10);
    assert!(found[0].excess.error == TRANSFER_ERROR * found[0].excess.value);
    assert!(found[0].cause_text.contains("TIDE_CLK"), "{}", found[0].cause_text);
    assert!(all.iter().all(|n| n.path != "TIDE_CLK"), "the other has no drive, so it puts nothing back");
}

#[test]
fn powers_between_frequencies() {
    let solved = [(1e6, 1e-3), (1e8, 1e-1)];
    for (hertz, ohm) in [(1e7, 1e-2), (1e5, 1e-3), (1e9, 1.0), (1e6, 1e-3), (1e8, 1e-1)] {
        assert!((magnitude_at(&solved, hertz) / ohm - 1.0).abs() < 1e-12, "{hertz}");
    }
    assert!((magnitude_at(&[(0.0, 1.0), (10.0, 2.0)], 5.0) - 1.5).abs() < 1e-12);
    assert_eq!(magnitude_at(&[], 1.0), 0.0);
    let _ = band(1.0);
}

/// Steps of converters in microvolts: FSR/2^N, exact (Kester, The Data Conversion Handbook, 2005, from memory).
#[test]
fn steps_of_converters() {
    let table = [
        (1.0, [3906.25, 976.5625, 244.140625, 61.0351562, 15.2587891, 3.81469727, 0.0596046448]),
        (1.8, [7031.25, 1757.8125, 439.453125, 109.863281, 27.4658203, 6.86645508, 0.107288361]),
        (2.048, [8000.0, 2000.0, 500.0, 125.0, 31.25, 7.8125, 0.122070312]),
        (2.5, [9765.625, 2441.40625, 610.351562, 152.587891, 38.1469727, 9.53674316, 0.149011612]),
        (3.3, [12890.625, 3222.65625, 805.664062, 201.416016, 50.3540039, 12.588501, 0.196695328]),
        (5.0, [19531.25, 4882.8125, 1220.70312, 305.175781, 76.2939453, 19.0734863, 0.298023224]),
    ];
    for (full_scale_v, steps) in table {
        for (bits, microvolt) in [8, 10, 12, 14, 16, 18, 24].into_iter().zip(steps) {
            let got = lsb_v(full_scale_v, bits) * 1e6;
            assert!((got / microvolt - 1.0).abs() < 2e-9 + 5e-9, "{full_scale_v} V, {bits} bit: {got}");
            let budget = Budget::Converter { bits, full_scale_v, lsb: 0.5 };
            assert!((in_lsb(&budget, 1e-6 * microvolt).unwrap() - 1.0).abs() < 1e-8);
        }
    }
}
