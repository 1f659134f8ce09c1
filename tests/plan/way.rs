//! The way of a signal through its copper, with lengths known from the drawing.

use super::draft::{Draft, disc, rectangle};
use super::{messages, plan, review};
use ebbmap::geom::Point;
use ebbmap::plan::{PathPlan, Plan};

fn length_mm(net: &PathPlan) -> f64 {
    net.track.iter().map(|leg| leg.from.distance(leg.to)).sum::<f64>() * 1e3
}

/// A board of 40 x 30 mm with a ground plane below the top layer and two parts with ground pins beside their vias.
fn two_parts() -> Draft {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    draft.plane(1, "GND", &[]);
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "TIDE_SCK", (x, 15.0), 0.6);
        draft.pad(0, &format!("{part}.2"), "GND", (x, 16.0), 0.6);
        draft.track(0, "GND", &[(x, 16.0), (x, 17.0)], 0.3);
        draft.via("GND", (x, 17.0), 0.3);
    }
    draft
}

fn net(plan: &Plan) -> &PathPlan {
    assert_eq!(plan.paths.len(), 1, "{:#?}", plan.messages);
    &plan.paths[0]
}

#[test]
fn a_bent_track_has_the_length_of_its_drawing() {
    let mut draft = two_parts();
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (5.0, 10.0), (35.0, 10.0), (35.0, 15.0)], 0.2);
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    let net = net(&plan);
    assert_eq!((net.driver.as_str(), net.receiver.as_str()), ("U1.1", "U2.1"));
    assert!((length_mm(net) - 40.0).abs() < 1e-9, "{}", length_mm(net));
    assert_eq!(net.track.len(), 3);
    assert!(net.track.iter().all(|leg| leg.layer == 0 && (leg.width_m - 0.2e-3).abs() < 1e-12));
    let chart = &net.charts[0];
    assert_eq!((chart.plane.to_string().as_str(), chart.legs.clone()), ("L2-GND", 0..3));
    assert!((chart.height_m - 0.2e-3).abs() < 1e-12 && (chart.width_m - 0.2e-3).abs() < 1e-12);
    assert_eq!(chart.withheld, None);
    assert_eq!(chart.driver_landing.what, "via of U1.2");
    assert!(chart.driver_landing.at.distance(Point::mm(5.0, 17.0)) < 1e-9);
    assert!((chart.driver_landing.radius_m - 0.15e-3).abs() < 1e-12);
    assert!(chart.receiver_landing.at.distance(Point::mm(35.0, 17.0)) < 1e-9);
    assert!(chart.cell_m > 0.0 && chart.unknowns > 10_000 && chart.memory_bytes > 1_000_000);
}

#[test]
fn pens_that_overlap_are_joined_and_bends_make_no_loops() {
    let mut draft = two_parts();
    // Two draws side by side that only touch with their pens, one that ends on the middle of another, a dot, an arc
    // of short chords, and a wide draw that swallows the end of a narrow one.
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (12.0, 15.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(11.7, 15.15), (20.0, 15.15)], 0.2);
    draft.track(0, "TIDE_SCK", &[(20.0, 15.15)], 0.4);
    draft.track(0, "TIDE_SCK", &[(20.0, 15.15), (25.0, 15.15)], 0.2);
    let arc = (0..=40).map(|k| {
        let angle = std::f64::consts::PI * (1.0 - k as f64 / 40.0);
        (26.0 + angle.cos(), 15.15 + angle.sin())
    });
    draft.track(0, "TIDE_SCK", &arc.collect::<Vec<_>>(), 0.2);
    draft.track(0, "TIDE_SCK", &[(27.0, 15.15), (30.0, 15.15), (30.0, 15.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(30.2, 15.0), (33.0, 15.0)], 0.6);
    draft.track(0, "TIDE_SCK", &[(33.2, 15.0), (35.0, 15.0)], 0.2);
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    let net = net(&plan);
    // 5 to 25 with the step of 0.15, the half circle of radius 1 as chords, then 27 to 35 with the step back.
    let expected = 20.0 + 0.15 + std::f64::consts::PI + 8.0 + 0.15;
    assert!((length_mm(net) - expected).abs() < 0.16, "{} against {expected}", length_mm(net));
    assert!(net.track.windows(2).all(|pair| pair[0].to.distance(pair[1].from) < 1e-8), "{:#?}", net.track);
    assert!(messages(&plan, "track-loop").is_empty(), "{:?}", messages(&plan, "track-loop"));
    assert!(messages(&plan, "track-branch").is_empty(), "{:?}", messages(&plan, "track-branch"));
}

#[test]
fn pens_that_miss_each_other_are_named_with_the_gap() {
    let mut draft = two_parts();
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (20.0, 15.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(20.25, 15.0), (35.0, 15.0)], 0.2);
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    assert!(plan.paths.is_empty());
    let open = messages(&plan, "track-open");
    assert_eq!(open.len(), 1, "{:?}", plan.messages);
    let place = open[0].place.at.unwrap();
    assert!(place.distance(Point::mm(20.0, 15.0)) < 1e-9);
    assert!(open[0].hints[0].contains("0.25 mm"), "{:?}", open[0].hints);
}

#[test]
fn branches_loops_and_further_pins_are_stated() {
    let mut draft = two_parts();
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (35.0, 15.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(10.0, 15.0), (10.0, 18.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(15.0, 15.0), (15.0, 20.0), (25.0, 20.0), (25.0, 15.0)], 0.2);
    draft.track(0, "TIDE_SCK", &[(30.0, 15.0), (30.0, 22.0)], 0.2);
    draft.pad(0, "U3.7", "TIDE_SCK", (30.0, 22.0), 0.5);
    let mut wanted = review("TIDE_SCK");
    let board = draft.board();
    let plain = plan(board.clone(), &wanted);
    assert!(plain.paths.is_empty());
    let needed = messages(&plain, "net-pins-needed");
    assert!(needed[0].hints[0].contains("`U1.1`, `U2.1`, `U3.7`"), "{:?}", needed[0].hints);
    wanted.nets[0].driver = Some("U1.1".into());
    wanted.nets[0].receiver = Some("U2.1".into());
    let plan = plan(board, &wanted);
    assert!((length_mm(net(&plan)) - 30.0).abs() < 1e-9);
    let text = |code| messages(&plan, code).iter().map(|message| message.text.clone()).collect::<String>();
    assert!(text("track-branch").contains("3 mm at 10.00, 15.00"), "{}", text("track-branch"));
    assert!(text("track-loop").contains("20 mm from 15.00, 15.00 to 25.00, 15.00"), "{}", text("track-loop"));
    assert!(text("track-further-pins").contains("`U3.7` 7 mm off the way"), "{}", text("track-further-pins"));
}

#[test]
fn a_way_through_vias_changes_layer_and_keeps_one_chart_over_one_plane() {
    // Down to the third layer and back: both sides of the same plane.
    let mut draft = two_parts();
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (15.0, 15.0)], 0.2);
    draft.via("TIDE_SCK", (15.0, 15.0), 0.3);
    draft.track(2, "TIDE_SCK", &[(15.0, 15.0), (25.0, 15.0)], 0.2);
    draft.via("TIDE_SCK", (25.0, 15.0), 0.3);
    draft.track(0, "TIDE_SCK", &[(25.0, 15.0), (35.0, 15.0)], 0.2);
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    let net = net(&plan);
    assert!((length_mm(net) - 30.0).abs() < 1e-9);
    let layers: Vec<usize> = net.track.iter().map(|leg| leg.layer).collect();
    assert!(layers.contains(&2) && layers[0] == 0, "{layers:?}");
    assert_eq!(net.charts.len(), 1);
    // A third of the length at the thickness below, two thirds at that above.
    assert!(
        (net.charts[0].height_m - (2.0 * 0.2 + 1.0) / 3.0 * 1e-3).abs() < 1e-9,
        "{}",
        net.charts[0].height_m
    );
}

#[test]
fn a_way_across_a_pour_is_straight_and_stated() {
    let mut draft = two_parts();
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (15.0, 15.0)], 0.2);
    draft.fill(0, "TIDE_SCK", rectangle(14.0, 13.0, 26.0, 17.0));
    draft.track(0, "TIDE_SCK", &[(25.0, 15.0), (35.0, 15.0)], 0.2);
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    assert!((length_mm(net(&plan)) - 30.0).abs() < 1e-9);
    let across = net(&plan).track.iter().find(|leg| (leg.width_m - 4e-3).abs() < 1e-9);
    assert!(across.is_some(), "the pour is 4 mm wide: {:?}", net(&plan).track);
    assert!(messages(&plan, "track-across-area")[0].text.contains("10 mm"));
}

#[test]
fn antipads_and_slots_are_voids_with_stable_names() {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    // A slot, two antipads with a web of 0.2 mm (h is 0.2 mm), one farther away.
    let voids = [
        rectangle(18.0, 10.0, 19.0, 20.0),
        disc(10.0, 10.0, 1.0),
        disc(11.2, 10.0, 1.0),
        disc(13.0, 10.0, 1.0),
    ];
    draft.plane(1, "GND", &voids);
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "TIDE_SCK", (x, 15.0), 0.6);
        draft.via("GND", (x, 16.0), 0.3);
    }
    draft.hole((30.0, 25.0), 2.0, ebbmap::board::Plating::NonPlated, "");
    draft.track(0, "TIDE_SCK", &[(5.0, 15.0), (35.0, 15.0)], 0.2);
    let mut wanted = review("TIDE_SCK");
    wanted.origin = Point::mm(10.0, 0.0);
    let plan = plan(draft.board(), &wanted);
    let chart = &net(&plan).charts[0];
    let found: Vec<(&str, f64)> = chart.voids.iter().map(|v| (v.id.as_str(), v.shape.area() * 1e6)).collect();
    let ids: Vec<&str> = found.iter().map(|void| void.0).collect();
    assert_eq!(
        ids,
        ["L2-void-0.6-10.0", "L2-void-3.0-10.0", "L2-void-8.5-15.0", "L2-void-20.0-25.0"],
        "{found:?}"
    );
    let quarter_pi = std::f64::consts::FRAC_PI_4;
    assert!((found[1].1 - quarter_pi).abs() < 5e-3 && (found[2].1 - 10.0).abs() < 1e-6, "{found:?}");
    assert!((found[3].1 - 4.0 * quarter_pi).abs() < 5e-3, "{found:?}");
    assert!(found[0].1 > 2.0 * quarter_pi + 0.05 && found[0].1 < 2.0 * quarter_pi + 0.5, "{found:?}");
}
