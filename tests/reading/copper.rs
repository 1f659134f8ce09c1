//! What each construct of a copper file covers, with areas computed by hand.

use crate::support::{assert_close, board, copper, data, has, layer, net_area, rectangle, track_length};
use ebbmap::board::{CopperKind, LayerRole, ObjectFunction, TieKind};
use ebbmap::diag::code::read as code;
use std::f64::consts::PI;

/// Chords leave an arc by 0.5 um at most: what a rim of this length in mm may lose in mm2.
fn chords(rim_mm: f64) -> f64 {
    rim_mm * 0.5e-3
}

#[test]
fn clear_objects_take_off_only_what_lies_before_them() {
    let board = layer("polarity.gbr");
    let (plane, holes) = net_area(&board, 0, "GND");
    assert_close(plane, 400.0 - 16.0, 1e-9);
    assert_eq!(holes, 1);
    assert_close(net_area(&board, 0, "SIG").0, 4.0, 1e-9);
    assert_close(board.layers[0].copper.area() * 1e6, 388.0, 1e-9);
    assert_eq!(board.layers[0].objects.iter().map(|object| object.line).collect::<Vec<_>>(), [10, 18, 28]);
    assert_eq!((board.layers[0].objects[1].net, board.layers[0].role), (None, LayerRole::Top));
}

#[test]
fn many_levels_of_polarity_alternate_as_in_the_file() {
    // Squares of 2 n mm, dark and clear in turn, the largest first: 20^2 - 18^2 + 16^2 - ... - 2^2.
    let mut body = String::new();
    for n in (1..=10).rev() {
        body += if n % 2 == 0 { "%LPD*%\n" } else { "%LPC*%\n" };
        body += &rectangle("GND", -n, -n, n, n);
    }
    let (board, _) = board(&[("copper-1.gbr", &copper(1, &body))]);
    let expected: i64 = (1..=10).map(|n| if n % 2 == 0 { 4 * n * n } else { -4 * n * n }).sum();
    assert_close(net_area(&board, 0, "GND").0, expected as f64, 1e-9);
    assert_eq!(board.layers[0].areas.len(), 5);
}

#[test]
fn a_cut_in_leaves_no_slit() {
    let board = layer("keyhole.gbr");
    let (plane, holes) = net_area(&board, 0, "GND");
    assert_close(plane, 96.0, 1e-9);
    assert_eq!((holes, board.layers[0].areas.len()), (1, 1));
}

#[test]
fn outline_strokes_widen_the_area_and_are_no_tracks() {
    let board = layer("outline-strokes.gbr");
    // The square grown by half a pen (Steiner's formula), and 3 mm of track from the edge of that, its round end.
    let grown = 100.0 + 40.0 * 0.1 + PI * 0.01;
    let track = 2.9 * 0.2 + 0.5 * PI * 0.01;
    assert_close(net_area(&board, 0, "GND").0, grown + track, chords(2.0));
    assert_close(track_length(&board, "GND"), 3.0, 1e-9);
    let strokes = board.layers[0].objects.iter().filter(|o| o.function == ObjectFunction::AreaStroke).count();
    assert_eq!(strokes, 4);
}

#[test]
fn a_plane_of_strokes_is_one_area_and_no_track() {
    let board = layer("hatch.gbr");
    // 21 capsules of length 10 and width 0.2 at a pitch of 0.15: a rectangle, and at the two ends discs that overlap
    // in lenses of 2 r^2 acos(p / 2r) - p / 2 sqrt(4 r^2 - p^2).
    let (r, p, n) = (0.1f64, 0.15f64, 21.0);
    let lens = 2.0 * r * r * (p / (2.0 * r)).acos() - 0.5 * p * (4.0 * r * r - p * p).sqrt();
    let discs = PI * r * r + (n - 1.0) * (PI * r * r - lens);
    let expected = 10.0 * ((n - 1.0) * p + 2.0 * r) + discs;
    let (area, holes) = net_area(&board, 0, "GND");
    assert_close(area, expected, chords(8.0));
    assert_eq!((board.layers[0].areas.len(), holes), (1, 0));
    assert_close(track_length(&board, "GND"), 0.0, 0.0);
}

#[test]
fn apertures_have_the_areas_of_elementary_geometry() {
    let board = layer("apertures.gbr");
    // The ring's bar of 4 x 0.25 mm crosses the gap and reaches 1 mm beyond the ring on both sides; what it shares
    // with the ring itself is bounded by arcs of radius 1 and 0.5.
    let strip = |r: f64| 2.0 * (0.125 * (r * r - 0.125f64.powi(2)).sqrt() + r * r * (0.125 / r).asin());
    let ring = PI - 0.25 * PI + 4.0 * 0.25 - (strip(1.0) - strip(0.5));
    let cases = [
        ("CIRCLE", PI),
        ("ANNULUS", 0.75 * PI),
        ("RECTANGLE", 6.0),
        ("OBROUND", 4.0 + PI),
        ("HEXAGON", 1.5 * 3f64.sqrt()),
        ("RING", ring),
    ];
    for (net, expected) in cases {
        assert_close(net_area(&board, 0, net).0, expected, chords(10.0));
    }
    assert_eq!(net_area(&board, 0, "ANNULUS").1, 1);
    assert_eq!(net_area(&board, 0, "RING").1, 2);
}

#[test]
fn arcs_follow_both_quadrant_modes() {
    let board = layer("arcs.gbr");
    for (net, expected) in [("HALF", 12.5 * PI), ("FULL", 25.0 * PI), ("QUARTER", 6.25 * PI)] {
        assert_close(net_area(&board, 0, net).0, expected, chords(32.0));
    }
    assert_close(track_length(&board, "ARC"), 5.0 * PI, chords(16.0));
    let drawn = board.layers[0].areas.iter().find(|area| area.net == board.net("ARC")).unwrap();
    // Clockwise from (60, 0) to (60, 10) round (60, 5): over the left side.
    assert_close(drawn.shape.bounds().min.x * 1e3, 55.0 - 0.1, 1e-3);
}

#[test]
fn contours_of_one_region_are_united() {
    let board = layer("contours.gbr");
    let (area, _) = net_area(&board, 0, "GND");
    assert_close(area, 100.0 + 100.0 - 16.0, 1e-9);
    assert_eq!(board.layers[0].objects.len(), 1);
}

#[test]
fn commands_of_older_files_are_obeyed() {
    let board = layer("old-style.gbr");
    assert_close(track_length(&board, "SIG"), 2.0 * 25.4, 1e-9);
    let flashes =
        board.layers[0].objects.iter().filter(|o| matches!(o.kind, CopperKind::Flash { .. })).count();
    assert_eq!(flashes, 2);
    // Two tracks of one inch in a right angle with a pen of 0.01 inch, and the pad of 0.1 x 0.2 inch.
    let inch2 = 25.4f64.powi(2);
    let track = 2.0 * 0.01 + PI * 0.25e-4 + (0.25 * PI - 1.0) * 0.25e-4;
    assert_close(net_area(&board, 0, "SIG").0, (track + 0.02) * inch2, 2e-3);
}

#[test]
fn repeats_blocks_and_transforms_place_copies() {
    let board = layer("repeats.gbr");
    assert_close(net_area(&board, 0, "GRID").0, 6.0, 1e-9);
    assert_eq!(board.layers[0].areas.iter().filter(|area| area.net == board.net("GRID")).count(), 6);
    assert_close(net_area(&board, 0, "SCALED").0, 9.0, 1e-9);
    // The block is a 2 x 1 bar from x = 0 to 2 with its right half cleared: 1 mm2, turned up and mirrored left.
    assert_close(net_area(&board, 0, "BLOCK").0, 2.0, 1e-9);
    let contains = |x, y| board.layers[0].copper.contains(ebbmap::geom::Point::mm(x, y));
    assert!(contains(30.1, 0.5) && !contains(30.1, 1.5) && contains(39.5, 0.1) && !contains(38.5, 0.1));
}

#[test]
fn attributes_give_nets_pins_and_functions() {
    let board = layer("attributes.gbr");
    let names: Vec<&str> = board.nets.iter().map(|net| net.name.as_str()).collect();
    assert_eq!(names, ["A,B", "C*D"]);
    let pins: Vec<(String, Option<&str>)> =
        board.pins.iter().map(|pin| (pin.label(), pin.net.map(|net| board.net_name(net)))).collect();
    let expected =
        [("U1.1", Some("A,B")), ("U1.2", Some("C*D")), ("U1.3", None), ("U1.4", None), ("U1.5", None)];
    assert_eq!(pins, expected.map(|(label, net)| (label.to_owned(), net)));
    assert_eq!(board.pins[0].function.as_deref(), Some("IO"));
    assert_eq!(board.parts.iter().map(|part| part.reference.as_str()).collect::<Vec<_>>(), ["FID1", "U1"]);
    let functions: Vec<ObjectFunction> =
        board.layers[0].objects.iter().skip(5).map(|object| object.function).collect();
    use ObjectFunction::{Area, Other, Pad, Track, ViaPad};
    assert_eq!(functions, [Pad, ViaPad, Track, Other, Area]);
    assert_close(net_area(&board, 0, "A,B").0, 1.0 + 4.0, 1e-9);
}

#[test]
fn the_comment_form_says_the_same() {
    let text = data("attributes.gbr");
    let mut comments = String::new();
    for line in text.lines() {
        match line.strip_prefix("%T") {
            Some(rest) => comments += &format!("G04 #@! T{}*\n", rest.trim_end_matches("*%")),
            None => comments += &format!("{line}\n"),
        }
    }
    let (a, _) = board(&[("copper-1.gbr", &text)]);
    let (b, _) = board(&[("copper-1.gbr", &comments)]);
    assert_eq!(format!("{a:?}"), format!("{b:?}"));
}

#[test]
fn ties_join_nets_without_merging_them() {
    let (board, messages) = board(&[("copper-1.gbr", &data("ties.gbr"))]);
    let ties: Vec<(&str, TieKind, Vec<&str>)> = board
        .ties
        .iter()
        .map(|tie| (tie.part.as_str(), tie.kind, tie.nets.iter().map(|&net| board.net_name(net)).collect()))
        .collect();
    assert_eq!(
        ties,
        [
            ("NT1", TieKind::EtchedCopper, vec!["AGND", "GND"]),
            ("NT2", TieKind::AbuttingPads, vec!["CHASSIS", "GND"]),
        ]
    );
    assert_close(board.ties[0].at.x * 1e3, 1.0, 1e-9);
    assert_close(board.ties[1].shape.area() * 1e6, 2.0, 1e-9);
    assert_close(net_area(&board, 0, "GND").0, 3.0, 1e-9);
    let touch = messages.iter().find(|message| message.code == code::NET_TOUCH).unwrap();
    assert_eq!(touch.place.layer, Some(1));
    assert!(touch.text.contains("`AGND` and `GND`"), "{}", touch.text);
}

#[test]
fn a_pen_that_is_not_round_covers_what_it_sweeps() {
    let body = "%ADD12R,2X2*%\nD12*\n%TO.N,BAR*%\nX0Y0D02*\nX3000000Y4000000D01*\n%TO.N,DOT*%\nX20000000Y0D02*\nX20000000Y0D01*";
    let (board, messages) = board(&[("copper-1.gbr", &copper(1, body))]);
    // A square of side s moved by (a, b) covers s^2 + s (a + b).
    assert_close(net_area(&board, 0, "BAR").0, 4.0 + 14.0, 1e-9);
    assert_close(net_area(&board, 0, "DOT").0, 4.0, 1e-9);
    assert!(has(&messages, code::GERBER_PEN));
}

#[test]
fn a_draw_of_no_length_paints_a_dot() {
    let body = "D11*\n%TO.N,DOT*%\nX0Y0D02*\nX0Y0D01*";
    let (board, _) = board(&[("copper-1.gbr", &copper(1, body))]);
    assert_close(net_area(&board, 0, "DOT").0, 0.25 * PI, chords(PI));
}
