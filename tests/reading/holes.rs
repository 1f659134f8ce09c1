//! Drill and rout files, what barrels touch, what holes without a barrel cut, and the holes of pins.

use crate::support::{assert_close, board, copper, has, net_area, profile, rectangle, refused};
use ebbmap::board::{Board, Plating};
use ebbmap::diag::Diagnostic;
use ebbmap::diag::code::read as code;
use ebbmap::geom::Point;
use std::f64::consts::PI;

/// Two layers of 20 x 20 mm: GND on both, on L2 with a clear disc of 1 mm at (5, 5) and a pad of SIG at (15, 15) in a
/// clear disc of 1.5 mm; on L1 a pad of pin J1.1 on SIG at (15, 15).
fn two_layers(drills: &[(&str, &str)]) -> (Board, Vec<Diagnostic>) {
    let pad = "%TO.N,SIG*%\n%TO.P,J1,1*%\nD11*\nX15000000Y15000000D03*\n%TD*%\n";
    let antipad = "%LPC*%\nD12*\nX15000000Y15000000D03*\n%LPD*%\n";
    let top = copper(1, &format!("%ADD12C,1.5*%\n{}{antipad}{pad}", rectangle("GND", 0, 0, 20, 20)));
    let inner = copper(
        2,
        &format!(
            "%ADD12C,1.5*%\n{}{antipad}%LPC*%\nD11*\nX5000000Y5000000D03*\n%LPD*%\n{}",
            rectangle("GND", 0, 0, 20, 20),
            pad.replace("%TO.P,J1,1*%\n", "")
        ),
    );
    let profile = profile(20, 20);
    let mut files = vec![("copper-1.gbr", top.as_str()), ("copper-2.gbr", &inner), ("profile.gbr", &profile)];
    files.extend(drills);
    board(&files)
}

fn drill(function: &str, tools: &str, body: &str) -> String {
    format!("M48\n; #@! TF.FileFunction,{function}\nFMAT,2\nMETRIC\n{tools}\n%\nG90\nG05\n{body}\nT0\nM30\n")
}

#[test]
fn barrels_touch_copper_with_or_without_a_pad() {
    let file = drill(
        "Plated,1,2,PTH",
        "; #@! TA.AperFunction,Plated,PTH,ViaDrill\nT1C0.3\n; #@! TA.AperFunction,Plated,PTH,ComponentDrill\nT2C0.5",
        "T1\nX5.0Y5.0\nX10.0Y10.0\nT2\nX15.0Y15.0",
    );
    let (board, messages) = two_layers(&[("plated.drl", &file)]);
    let net = |index: usize| board.holes[index].net.map(|net| board.net_name(net));
    // In the clear disc of L2 the barrel touches L1 alone; in the solid plane it touches both without any pad.
    assert_eq!(board.holes[0].contacts.iter().map(|contact| contact.0).collect::<Vec<_>>(), [0]);
    assert_eq!(board.holes[1].contacts.iter().map(|contact| contact.0).collect::<Vec<_>>(), [0, 1]);
    assert_eq!((net(0), net(1), net(2)), (Some("GND"), Some("GND"), Some("SIG")));
    assert_eq!(board.holes.iter().map(|hole| hole.via).collect::<Vec<_>>(), [true, true, false]);
    assert_eq!((board.pins[0].label(), board.pins[0].hole), ("J1.1".to_owned(), Some(2)));
    assert!(!has(&messages, code::HOLE_NETS));
    // Barrels do not cut.
    assert_close(net_area(&board, 0, "GND").0, 400.0 - PI * 0.5625, 0.003);
}

#[test]
fn holes_without_a_barrel_cut_every_layer() {
    let tools = "; #@! TA.AperFunction,NonPlated,NPTH,ComponentDrill\nT1C2.0";
    let file = drill("NonPlated,1,2,NPTH", tools, "T1\nX10.0Y10.0\nX4.0Y15.0G85X10.0Y15.0");
    let (board, _) = two_layers(&[("npth.drl", &file)]);
    let slot = 6.0 * 2.0 + PI;
    for (layer, antipads) in [(0, PI * 0.5625), (1, PI * 0.5625 + PI * 0.25)] {
        let (area, holes) = net_area(&board, layer, "GND");
        assert_close(area, 400.0 - antipads - PI - slot, 0.02);
        assert_eq!(holes, 3 + layer);
    }
    assert_eq!(board.holes[1].path, [Point::mm(4.0, 15.0), Point::mm(10.0, 15.0)]);
    assert!(board.holes.iter().all(|hole| hole.plating == Plating::NonPlated && hole.contacts.is_empty()));
    // The composed image is that of the copper files.
    assert_close(board.layers[0].copper.area() * 1e6, 400.0 - PI * (0.5625 - 0.25), 0.01);
}

#[test]
fn a_slot_through_the_whole_plane_parts_it() {
    let file = drill("NonPlated,1,2,NPTH", "T1C1.0", "T1\nG00X-1.0Y3.0\nM15\nG01X21.0Y3.0\nM16\nG05");
    let (board, _) = two_layers(&[("npth.drl", &file)]);
    let gnd = board.net("GND");
    assert_eq!(board.layers[0].areas.iter().filter(|area| area.net == gnd).count(), 2);
}

#[test]
fn routs_follow_lines_and_arcs() {
    let body =
        "T1\nG00X10.0Y5.0\nM15\nG01X12.0Y5.0\nG03X14.0Y7.0A2.0\nG02X16.0Y9.0I2.0J0.0\nM16\nG05\nX1.0Y1.0";
    let (board, _) = two_layers(&[("a.drl", &drill("NonPlated,1,2,NPTH", "T1C0.8", body))]);
    let length: f64 = board.holes[0].path.windows(2).map(|ends| ends[0].distance(ends[1])).sum();
    assert_close(length * 1e3, 2.0 + PI + PI, 0.003);
    let contains = |x: f64, y: f64| board.holes[0].path.iter().any(|p| p.distance(Point::mm(x, y)) < 0.15e-3);
    let r = 2.0 * 0.5f64.sqrt();
    assert!(contains(12.0 + r, 7.0 - r) && contains(16.0 - r, 7.0 + r), "{:?}", board.holes[0].path);
    assert_eq!(board.holes[1].path, [Point::mm(1.0, 1.0)]);
}

#[test]
fn repeats_units_and_zero_rules_place_holes() {
    let metric =
        drill("Plated,1,2,PTH", "T1C0.3", "T1\nX1.0Y1.0\nR3X2.0Y0.5\nX9.0").replace("METRIC", "METRIC,TZ");
    let inch = "M48\n;TYPE=PLATED\nINCH,LZ\nT01C.0118\n;TYPE=NON_PLATED\nT02C0.05\n%\nT01\nX00Y005\nX005\nT02\nX0075Y0075\nM30\n";
    let (board, _) = two_layers(&[("a-metric.drl", &metric), ("b-inch.drl", inch)]);
    let centres: Vec<(f64, f64)> =
        board.holes.iter().map(|h| (h.path[0].x * 1e3, h.path[0].y * 1e3)).collect();
    let close = |a: (f64, f64), b: (f64, f64)| (a.0 - b.0).abs() < 1e-9 && (a.1 - b.1).abs() < 1e-9;
    // Files that say what they are come after those that do not.
    let expected = [
        (0.0, 12.7),
        (12.7, 12.7),
        (19.05, 19.05),
        (1.0, 1.0),
        (3.0, 1.5),
        (5.0, 2.0),
        (7.0, 2.5),
        (9.0, 2.5),
    ];
    assert!(centres.len() == 8 && centres.iter().zip(expected).all(|(a, b)| close(*a, b)), "{centres:?}");
    assert_close(board.holes[0].diameter_m * 1e3, 0.29972, 1e-9);
    assert_eq!((board.holes[0].plating, board.holes[2].plating), (Plating::Plated, Plating::NonPlated));
}

#[test]
fn where_no_file_says_plating_a_pad_decides() {
    let file = "M48\nMETRIC\nT1C0.5\n%\nT1\nX15.0Y15.0\nX10.0Y10.0\nM30\n";
    let (board, messages) = two_layers(&[("drill.drl", file)]);
    assert_eq!((board.holes[0].plating, board.holes[1].plating), (Plating::Plated, Plating::NonPlated));
    assert!(has(&messages, code::DRILL_PLATING));
}

#[test]
fn drill_files_in_gerber_format_are_holes() {
    let text = "%TF.FileFunction,Plated,1,2,PTH*%\n%FSLAX46Y46*%\n%MOMM*%\nG01*\n%TA.AperFunction,ViaDrill*%\n%ADD10C,0.3*%\n\
                %TD*%\n%ADD11O,2X0.6*%\nD10*\nX10000000Y10000000D03*\nX4000000Y4000000D02*\nX6000000D01*\n\
                D11*\nX15000000Y15000000D03*\nM02*\n";
    let (board, _) = two_layers(&[("plated.gbr", text)]);
    let lengths: Vec<usize> = board.holes.iter().map(|hole| hole.path.len()).collect();
    assert_eq!(lengths, [1, 2, 2]);
    assert!(board.holes[0].via && board.holes.iter().all(|hole| hole.plating == Plating::Plated));
    assert_close(board.holes[2].path[0].distance(board.holes[2].path[1]) * 1e3, 1.4, 1e-9);
    assert_close(board.holes[2].diameter_m * 1e3, 0.6, 1e-9);
}

#[test]
fn a_barrel_between_two_nets_joins_none() {
    let file = drill("Plated,1,2,PTH", "T1C2.0", "T1\nX15.0Y15.0");
    let (board, messages) = two_layers(&[("plated.drl", &file)]);
    assert_eq!(board.holes[0].net, None);
    let told = messages.iter().find(|message| message.code == code::HOLE_NETS).unwrap();
    assert!(told.place.at.is_some_and(|at| at.distance(Point::mm(15.0, 15.0)) < 1e-9));
}

#[test]
fn holes_on_layers_that_do_not_exist_are_refused() {
    let copper = copper(1, &rectangle("GND", 0, 0, 10, 10));
    let file = drill("Plated,1,4,PTH", "T1C0.3", "T1\nX1.0Y1.0");
    let messages = refused(&[("copper-1.gbr", &copper), ("plated.drl", &file)]);
    assert!(
        messages.iter().any(|m| m.code == code::DRILL_SPAN && m.place.file.as_deref() == Some("plated.drl"))
    );
}
