//! The planted faults are where FAULTS.md says, and mended where it says so.

use super::{A, B, CLEAN, legs, net, samples};
use ebbmap::board::{Board, ObjectFunction, Plating};
use ebbmap::geom::Point;
use ebbmap::geom::locate::{Locator, segment_distance};

/// Length in millimetres of a net's track on the top layer that has no copper of the ground plane below it.
fn over_void_mm(board: &Board, name: &str) -> f64 {
    let ground = net(board, "GND");
    let areas = board.layers[1].areas.iter().filter(|area| area.net == Some(ground)).map(|area| &area.shape);
    let plane = Locator::new(areas);
    let mut length_mm = 0.0;
    for (from, to, _) in legs(board, name, 0) {
        let n = (from.distance(to) / 10e-6).ceil().max(1.0);
        for k in 0..n as usize {
            let at = from + (to - from) * ((k as f64 + 0.5) / n);
            if plane.containing(at).is_empty() {
                length_mm += from.distance(to) / n * 1e3;
            }
        }
    }
    length_mm
}

fn plane_at(board: &Board, x_mm: f64, y_mm: f64) -> bool {
    let ground = net(board, "GND");
    let mut areas = board.layers[1].areas.iter().filter(|area| area.net == Some(ground));
    areas.any(|area| area.shape.contains(Point::mm(x_mm, y_mm)))
}

/// Least distance in millimetres between the edges of tracks of two nets on the top layer.
fn gap_mm(board: &Board, a: &str, b: &str) -> f64 {
    let mut least = f64::MAX;
    for (p, q, w) in legs(board, a, 0) {
        for (r, s, v) in legs(board, b, 0) {
            least = least.min(segment_distance((p, q), (r, s)) - 0.5 * (w + v));
        }
    }
    least * 1e3
}

#[test]
fn the_clock_runs_over_the_slot_only_in_a() {
    assert!(!plane_at(&A, 67.2, 63.5) && !plane_at(&CLEAN, 67.2, 63.5), "the slot is in all revisions");
    let a = over_void_mm(&A, "MEM_SCK");
    assert!((a - 1.0).abs() < 0.05, "{a} mm over the slot of 1 mm");
    for board in [&*B, &*CLEAN] {
        assert_eq!(over_void_mm(board, "MEM_SCK"), 0.0);
    }
}

#[test]
fn the_bus_runs_over_the_row_of_antipads_only_in_a() {
    // The webs of the row are narrower than twice the height of the tracks over the plane, 0.4 mm.
    for y_mm in [46.46, 49.0, 51.54] {
        let width_mm = (0..400).filter(|k| plane_at(&A, 76.0, y_mm - 0.4 + 0.002 * f64::from(*k))).count()
            as f64
            * 0.002;
        assert!(width_mm > 0.1 && width_mm < 0.4, "web at {y_mm}: {width_mm} mm");
    }
    for name in ["RTC_SCL", "RTC_SDA", "RTC_INT"] {
        let crossing = |board: &Board| {
            let row = (Point::mm(76.0, 40.11), Point::mm(76.0, 57.89));
            legs(board, name, 0).iter().any(|leg| segment_distance((leg.0, leg.1), row) < 0.1e-3)
        };
        assert!(crossing(&A) && !crossing(&B) && !crossing(&CLEAN), "{name}");
    }
}

#[test]
fn the_layer_change_lacks_return_vias_only_in_a() {
    let nearest_mm = |board: &Board, at: Point| {
        let ground = net(board, "GND");
        let vias =
            board.holes.iter().filter(|hole| hole.plating == Plating::Plated && hole.net == Some(ground));
        vias.map(|hole| hole.centre().distance(at) * 1e3).fold(f64::MAX, f64::min)
    };
    for at in [Point::mm(69.6, 55.3), Point::mm(79.2, 60.1)] {
        let change = |board: &Board| {
            board
                .holes
                .iter()
                .any(|hole| hole.net == board.net("BUS_TX") && hole.centre().distance(at) < 1e-6)
        };
        assert!(change(&A) && change(&B) && change(&CLEAN));
        assert!(nearest_mm(&A, at) > 3.0, "{} mm", nearest_mm(&A, at));
        assert!(nearest_mm(&B, at) < 1.2 && nearest_mm(&CLEAN, at) < 1.2);
    }
    // Between them the track runs on the bottom layer over the ground area of the third.
    let ground = net(&A, "GND");
    for (from, to, _) in legs(&A, "BUS_TX", 3) {
        for at in [from, to, (from + to) * 0.5] {
            let mut areas = A.layers[2].areas.iter().filter(|area| area.net == Some(ground));
            let near = areas.any(|area| area.shape.contains(at));
            let change =
                [Point::mm(69.6, 55.3), Point::mm(79.2, 60.1)].iter().any(|via| via.distance(at) < 1e-6);
            assert!(near || change, "{at:?}");
        }
    }
}

#[test]
fn the_temperature_input_runs_through_the_switching_loop_only_in_a() {
    assert!(gap_mm(&A, "TEMP_IN", "SW_NODE") < 2.0, "{}", gap_mm(&A, "TEMP_IN", "SW_NODE"));
    for board in [&*B, &*CLEAN] {
        assert!(gap_mm(board, "TEMP_IN", "SW_NODE") > 20.0);
    }
}

#[test]
fn the_pulse_hugs_the_edge_in_a_and_more_so_in_b() {
    // Distance from the track's centre line to the edge of the plane, which ends 0.3 mm inside the board.
    let edge_mm = |board: &Board| {
        let y = legs(board, "SYNC", 0).iter().map(|leg| leg.0.y.max(leg.1.y)).fold(f64::MIN, f64::max);
        79.7 - y * 1e3
    };
    assert!((edge_mm(&A) - 0.6).abs() < 1e-6 && (edge_mm(&B) - 0.35).abs() < 1e-6);
    assert!(edge_mm(&CLEAN) > 5.0);
    assert!(plane_at(&A, 80.0, 79.69) && !plane_at(&A, 80.0, 79.71));
}

#[test]
fn the_bridge_lies_at_the_bus_except_in_a() {
    for (board, at_bus) in [(&*A, false), (&*B, true), (&*CLEAN, true)] {
        assert_eq!(plane_at(board, 38.0, 52.0), at_bus);
        assert_eq!(plane_at(board, 38.0, 70.0), !at_bus);
        let over = over_void_mm(board, "ADC_SCK");
        assert!(if at_bus { over == 0.0 } else { (over - 1.0).abs() < 0.05 }, "{over}");
    }
}

#[test]
fn a_net_tie_joins_the_reference_to_ground() {
    for board in [&*A, &*B, &*CLEAN] {
        let names: Vec<&str> =
            board.ties.iter().flat_map(|tie| tie.nets.iter().map(|net| board.net_name(*net))).collect();
        assert_eq!(names, ["GND", "REF_N"]);
        assert_eq!(board.ties[0].part, "NT1");
        let etched =
            board.layers[0].objects.iter().filter(|object| object.function == ObjectFunction::EtchedPart);
        assert_eq!(etched.count(), 1);
    }
}

#[test]
fn the_list_of_faults_names_every_net_and_place() {
    let text = std::fs::read_to_string(samples().join("FAULTS.md")).unwrap();
    for wanted in [
        "MEM_SCK",
        "67.2, 63.5",
        "RTC_SCL",
        "76.0, 49.0",
        "BUS_TX",
        "69.6, 55.3",
        "79.2, 60.1",
        "TEMP_IN",
        "46.8, 16.6",
        "SYNC",
        "80.0, 79.1",
        "ADC_SCK",
        "38.0, 70.0",
        "38.0, 52.0",
    ] {
        assert!(text.contains(wanted), "FAULTS.md does not name `{wanted}`");
    }
}
