//! Which plane a track is charted on, where its return lands, and what is withheld with which words.

use super::draft::{Draft, rectangle};
use super::{messages, plan, review};
use ebbmap::geom::Point;
use ebbmap::plan::ChartPlan;
use ebbmap::review::LandingRequest;

/// A top track over L2 and a bottom track over L3; `second` and `third` are the nets of those planes.
fn four_layers(second: &str, third: &str) -> Draft {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    draft.plane(1, second, &[]);
    draft.plane(2, third, &[]);
    for (layer, net, y) in [(0, "TIDE_SCK", 10.0), (3, "LEVEL_OUT", 20.0)] {
        for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
            draft.pad(layer, &format!("{part}.{layer}"), net, (x, y), 0.6);
        }
        draft.track(layer, net, &[(5.0, y), (35.0, y)], 0.2);
    }
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.9"), "GND", (x, 11.5), 0.6);
        draft.via("GND", (x, 11.5), 0.3);
    }
    draft
}

fn reason(chart: &ChartPlan) -> (&'static str, String) {
    let message = chart.withheld.clone().expect("must be withheld");
    (message.code.name, format!("{} {}", message.text, message.hints.join(" ")))
}

#[test]
fn the_plane_of_a_chart_is_of_a_reference_net_or_what_the_review_names() {
    let board = four_layers("GND", "V3").board();
    let planned = plan(board.clone(), &review("LEVEL_OUT"));
    let chart = &planned.paths[0].charts[0];
    assert_eq!((chart.withheld.as_ref(), chart.plane.to_string().as_str()), (None, "L2-GND"));
    assert!((chart.height_m - (0.2 + 0.035 + 1.0) * 1e-3).abs() < 1e-9, "{}", chart.height_m);
    assert!(messages(&planned, "plane-not-reference")[0].text.contains("`L3-V3`"));
    let mut wanted = review("LEVEL_OUT");
    wanted.reference_nets.push("V3".into());
    let planned = plan(board.clone(), &wanted);
    assert_eq!(planned.paths[0].charts[0].plane.to_string(), "L3-V3");
    let mut wanted = review("TIDE_SCK");
    wanted.nets[0].plane = Some("L3-V3".into());
    let planned = plan(board, &wanted);
    let chart = &planned.paths[0].charts[0];
    assert_eq!((chart.withheld.as_ref(), chart.plane.to_string().as_str()), (None, "L3-V3"));
    assert_eq!(messages(&planned, "plane-chosen").len(), 1);
}

#[test]
fn an_island_in_the_plane_is_a_void_of_it() {
    let mut draft = Draft::new(40.0, 30.0, &[0.2]);
    draft.plane(1, "GND", &[rectangle(15.0, 5.0, 20.0, 15.0)]);
    draft.fill(1, "V3", rectangle(15.3, 5.3, 19.7, 14.7));
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "TIDE_SCK", (x, 10.0), 0.6);
        draft.via("GND", (x, 12.0), 0.3);
    }
    draft.track(0, "TIDE_SCK", &[(5.0, 10.0), (35.0, 10.0)], 0.2);
    let planned = plan(draft.board(), &review("TIDE_SCK"));
    let charts = &planned.paths[0].charts;
    assert_eq!((charts.len(), charts[0].plane.to_string().as_str()), (1, "L2-GND"));
    assert_eq!(charts[0].withheld, None);
    // The island and the moat round it: one void, as large as both.
    assert_eq!(charts[0].voids.len(), 1);
    assert!((charts[0].voids[0].shape.area() * 1e6 - 50.0).abs() < 1e-3);
    assert_eq!(messages(&planned, "landing-nearest-via").len(), 2);
}

#[test]
fn a_reference_area_nearer_than_the_plane_hides_it() {
    // A bottom track over L2 with an island on L3 between, 8 mm long; one of 0.8 mm is too short to matter.
    for (net, length, planes) in [
        ("GND", 8.0, vec!["L2-GND", "L3-GND", "L2-GND"]),
        ("GND", 0.8, vec!["L2-GND"]),
        ("V3", 8.0, vec!["L2-GND"]),
    ] {
        let mut draft = Draft::new(40.0, 30.0, &[0.2, 0.3, 0.2]);
        draft.plane(1, "GND", &[]);
        draft.fill(2, net, rectangle(15.0, 5.0, 15.0 + length, 15.0));
        for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
            draft.pad(3, &format!("{part}.1"), "TIDE_SCK", (x, 10.0), 0.6);
            draft.via("GND", (x, 12.0), 0.3);
        }
        draft.track(3, "TIDE_SCK", &[(5.0, 10.0), (35.0, 10.0)], 0.2);
        let planned = plan(draft.board(), &review("TIDE_SCK"));
        let charts = &planned.paths[0].charts;
        let found: Vec<String> = charts.iter().map(|chart| chart.plane.to_string()).collect();
        assert_eq!(found, planes);
        assert!(charts.iter().all(|chart| chart.withheld.is_none()), "{charts:#?}");
    }
}

#[test]
fn own_pins_are_landings_before_nearer_vias() {
    let mut draft = four_layers("GND", "V3");
    draft.via("GND", (5.9, 10.0), 0.2);
    let planned = plan(draft.board(), &review("TIDE_SCK"));
    let chart = &planned.paths[0].charts[0];
    assert_eq!(chart.driver_landing.what, "via of U1.9");
    assert!(chart.driver_landing.at.distance(Point::mm(5.0, 11.5)) < 1e-9);
}

#[test]
fn landings_of_the_review_win() {
    let mut wanted = review("TIDE_SCK");
    wanted.nets[0].driver_landing = Some(LandingRequest::At(Point::mm(8.0, 20.0)));
    wanted.nets[0].receiver_landing = Some(LandingRequest::Pin("U1.9".into()));
    let planned = plan(four_layers("GND", "V3").board(), &wanted);
    let chart = &planned.paths[0].charts[0];
    assert!(chart.driver_landing.at.distance(Point::mm(8.0, 20.0)) < 1e-9);
    assert!(chart.receiver_landing.at.distance(Point::mm(5.0, 11.5)) < 1e-9);
    wanted.nets[0].receiver_landing = Some(LandingRequest::Pin("U1.0".into()));
    let planned = plan(four_layers("GND", "V3").board(), &wanted);
    let (code, text) = reason(&planned.paths[0].charts[0]);
    assert_eq!(code, "landing-bad");
    assert!(text.contains("it is on net `TIDE_SCK`"), "{text}");
}

#[test]
fn without_a_pin_or_a_via_near_the_key_is_named() {
    let mut draft = Draft::new(40.0, 30.0, &[0.2]);
    draft.plane(1, "GND", &[]);
    draft.via("GND", (5.0, 14.0), 0.3);
    draft.via("GND", (35.0, 12.0), 0.3);
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "TIDE_SCK", (x, 10.0), 0.6);
    }
    draft.track(0, "TIDE_SCK", &[(5.0, 10.0), (35.0, 10.0)], 0.2);
    let planned = plan(draft.board(), &review("TIDE_SCK"));
    let (code, text) = reason(&planned.paths[0].charts[0]);
    assert_eq!(code, "landing-none");
    assert!(text.contains("4 mm away") && text.contains("`driver_landing`"), "{text}");
}

#[test]
fn a_net_that_changes_plane_is_charted_plane_by_plane() {
    let build = |stitched: bool| {
        let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
        draft.plane(1, "GND", &[]);
        draft.plane(2, "GND", &[]);
        draft.pad(0, "U1.1", "TIDE_SCK", (5.0, 10.0), 0.6);
        draft.pad(3, "U2.1", "TIDE_SCK", (35.0, 10.0), 0.6);
        draft.track(0, "TIDE_SCK", &[(5.0, 10.0), (20.0, 10.0)], 0.2);
        draft.via("TIDE_SCK", (20.0, 10.0), 0.3);
        draft.track(3, "TIDE_SCK", &[(20.0, 10.0), (35.0, 10.0)], 0.2);
        if stitched {
            draft.via("GND", (21.0, 11.0), 0.3);
        }
        draft.via("GND", (5.0, 11.0), 0.3);
        draft.via("GND", (35.0, 11.0), 0.3);
        plan(draft.board(), &review("TIDE_SCK"))
    };
    let planned = build(true);
    let charts = &planned.paths[0].charts;
    let planes: Vec<String> = charts.iter().map(|chart| chart.plane.to_string()).collect();
    assert_eq!(planes, ["L2-GND", "L3-GND"]);
    assert_eq!((charts[0].legs.end, charts[1].legs.start), (charts[1].legs.start, charts[0].legs.end));
    assert!(charts.iter().all(|chart| chart.withheld.is_none()), "{charts:#?}");
    let joint = Point::mm(21.0, 11.0);
    assert!(charts[0].receiver_landing.at.distance(joint) < 1e-9);
    assert!(charts[1].driver_landing.at.distance(joint) < 1e-9);
    assert_eq!(planned.paths[0].entries.len(), 2);
    assert!(build(false).paths[0].charts[0].receiver_landing.at.distance(joint) > 1e-3);
}

#[test]
fn a_pour_beside_the_track_is_stated_with_its_length() {
    let mut draft = four_layers("GND", "V3");
    // 0.4 mm from the track's edge, 3h = 0.6 mm, along 10 mm; and one at 1 mm that does not count.
    draft.fill(0, "GND", rectangle(10.0, 10.5, 20.0, 12.0));
    draft.fill(0, "GND", rectangle(22.0, 11.1, 30.0, 12.0));
    let planned = plan(draft.board(), &review("TIDE_SCK"));
    let found = messages(&planned, "pour-beside");
    assert_eq!(found.len(), 1);
    let text = &found[0].text;
    let over: f64 = text.split("over ").nth(1).unwrap().split(' ').next().unwrap().parse().unwrap();
    // The corners of the pour count within 0.7 mm of the middle line; samples are 0.25 mm apart.
    assert!((over - 11.0).abs() < 0.5, "{text}");
    assert!(text.contains("of 30 mm"), "{text}");
}

#[test]
fn overrides_are_put_in_and_noted() {
    let mut board = four_layers("GND", "V3").board();
    let mut wanted = review("TIDE_SCK");
    wanted.title = "Another title".into();
    wanted.stackup.dielectric_m = vec![Some(0.1e-3), None, Some(0.2e-3)];
    wanted.stackup.copper_m = vec![None];
    wanted.stackup.temperature_c = Some(60.0);
    let notes = ebbmap::plan::apply_review(&mut board, &wanted);
    let texts: Vec<&str> = notes.iter().map(|note| note.text.as_str()).collect();
    assert!(
        texts.iter().any(|t| t.contains("0.1 mm of the review replaces 0.2 mm of the files")),
        "{texts:?}"
    );
    assert!(texts.iter().any(|t| t.contains("`Another title`")), "{texts:?}");
    let bad: Vec<_> = notes.iter().filter(|note| note.code.name == "review-stackup-length").collect();
    assert!(bad.len() == 1 && bad[0].text.contains("must have 4 entries"), "{texts:?}");
    assert_eq!(notes.len(), 3, "equal values are no overrides: {texts:?}");
    assert!((board.stackup.gap_m(0, 1) - 0.1e-3).abs() < 1e-15 && board.stackup.temperature_c == 60.0);
}

#[test]
fn names_of_the_review_are_checked_against_the_board() {
    let board = four_layers("GND", "V3").board();
    let codes = |name: &str| -> Vec<String> {
        let planned = plan(board.clone(), &review(name));
        planned
            .messages
            .iter()
            .map(|message| format!("{} {}", message.code.name, message.hints.join(" ")))
            .collect()
    };
    assert_eq!(codes("TIDE_SKC"), ["net-unknown did you mean `TIDE_SCK`?"]);
    assert!(codes("X_*")[0].starts_with("net-unknown"));
    assert!(codes("GND")[0].starts_with("net-is-reference"));
    assert!(codes("V3")[0].starts_with("net-few-pins"));
    let planned = plan(board.clone(), &review("*"));
    let names: Vec<&str> = planned.paths.iter().map(|net| net.name.as_str()).collect();
    assert_eq!(names, ["LEVEL_OUT", "TIDE_SCK"], "a pattern leaves out reference nets");
    let mut wanted = review("TIDE_SCK");
    wanted.nets[0].driver = Some("U1.3".into());
    let planned = plan(board, &wanted);
    assert!(planned.messages[0].text.contains("it is on net `LEVEL_OUT`"), "{:?}", planned.messages);
}
