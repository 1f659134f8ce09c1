//! Paths through parts, with several receivers, closed loops, supply areas, and pairs: legs, currents and entries.

use super::draft::{Draft, rectangle};
use super::{messages, plan};
use ebbmap::geom::Point;
use ebbmap::plan::{End, PathPlan, Plan};
use ebbmap::review::path::{PairRequest, PathRequest, Receiver, Step};
use ebbmap::review::{LandingRequest, NetRequest, Review};

fn review() -> Review {
    Review { file: "review.toml".into(), reference_nets: vec!["GND".into()], ..Review::default() }
}

fn path(driver: &str, through: &[&str], receivers: &[(&str, f64)]) -> Review {
    let step = |text: &&str| match text.split_once(' ') {
        Some((enter, leave)) => Step::Pins { enter: enter.into(), leave: leave.into() },
        None => Step::Part((*text).into()),
    };
    let request = PathRequest {
        name: "TIDE".into(),
        driver: driver.into(),
        through: through.iter().map(step).collect(),
        receivers: receivers.iter().map(|&(pin, share)| Receiver { pin: pin.into(), share }).collect(),
        ..PathRequest::default()
    };
    Review { paths: vec![request], ..review() }
}

/// A board of 40 x 30 mm with a ground plane below the top layer.
fn plain() -> Draft {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    draft.plane(1, "GND", &[]);
    draft
}

/// A ground pin beside a via.
fn ground(draft: &mut Draft, pin: &str, (x, y): (f64, f64)) {
    draft.pad(0, pin, "GND", (x, y), 0.6);
    draft.track(0, "GND", &[(x, y), (x, y + 1.0)], 0.3);
    draft.via("GND", (x, y + 1.0), 0.3);
}

fn only(plan: &Plan) -> &PathPlan {
    assert_eq!(plan.paths.len(), 1, "{:#?}", plan.messages);
    &plan.paths[0]
}

/// Place in mm and current of each entry, from left to right.
fn entries(path: &PathPlan) -> Vec<(f64, f64, f64)> {
    let mut found: Vec<(f64, f64, f64)> = path
        .entries
        .iter()
        .map(|entry| match &entry.end {
            End::Copper { at, .. } => {
                ((at.x * 1e5).round() / 100.0, (at.y * 1e5).round() / 100.0, entry.current)
            }
            End::Node(_) => panic!("an entry on copper"),
        })
        .collect();
    found.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    found
}

/// The same copper from U1.1 to U2.1: as one net, or in three nets with two parts between their pads.
pub fn row(parts: bool) -> Draft {
    let mut draft = plain();
    ground(&mut draft, "U1.2", (5.0, 16.0));
    ground(&mut draft, "U2.2", (35.0, 16.0));
    let names = if parts { ["OUT", "MID", "TIDE"] } else { ["TIDE"; 3] };
    draft.pad(0, "U1.1", names[0], (5.0, 15.0), 0.6);
    draft.pad(0, "U2.1", names[2], (35.0, 15.0), 0.6);
    draft.track(0, names[0], &[(5.0, 15.0), (14.0, 15.0)], 0.2);
    draft.track(0, names[1], &[(16.0, 15.0), (20.0, 12.0), (24.0, 12.0)], 0.2);
    draft.track(0, names[2], &[(26.0, 12.0), (31.0, 15.0), (35.0, 15.0)], 0.2);
    let ends = [(14.0, 15.0), (16.0, 15.0), (24.0, 12.0), (26.0, 12.0)];
    let own = [names[0], names[1], names[1], names[2]];
    for ((pin, at), net) in ["R1.1", "R1.2", "R2.2", "R2.1"].into_iter().zip(ends).zip(own) {
        if parts {
            draft.pad(0, pin, net, at, 0.6);
        }
    }
    if !parts {
        draft.track(0, "TIDE", &ends[..2], 0.6);
        draft.track(0, "TIDE", &ends[2..], 0.6);
    }
    draft
}

#[test]
fn a_path_through_parts_has_the_legs_of_the_same_copper_as_one_net() {
    let through = plan(row(true).board(), &path("U1.1", &["R1", "R2"], &[("U2.1", 1.0)]));
    let mut whole = review();
    whole.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
    let whole = plan(row(false).board(), &whole);
    let (through, whole) = (only(&through), only(&whole));
    assert_eq!(through.track.len(), whole.track.len(), "{:#?} {:#?}", through.track, whole.track);
    for (a, b) in through.track.iter().zip(&whole.track) {
        assert!(a.from.distance(b.from) < 1e-12 && a.to.distance(b.to) < 1e-12, "{a:?} {b:?}");
        assert!((a.width_m - b.width_m).abs() < 1e-12 && a.layer == b.layer && a.current == b.current);
    }
    assert_eq!(entries(through), [(5.0, 17.0, -1.0), (35.0, 17.0, 1.0)]);
    assert_eq!(entries(through), entries(whole));
    assert_eq!(through.charts.len(), 1);
    assert_eq!((through.driver.as_str(), through.receiver.as_str()), ("U1.1", "U2.1"));
}

#[test]
fn branches_carry_the_shares_behind_them() {
    let mut draft = plain();
    draft.pad(0, "U1.1", "TIDE", (5.0, 15.0), 0.6);
    draft.pad(0, "U2.1", "TIDE", (35.0, 15.0), 0.6);
    draft.pad(0, "U3.1", "TIDE", (20.0, 25.0), 0.6);
    for (pin, at) in [("U1.2", (5.0, 16.0)), ("U2.2", (35.0, 16.0)), ("U3.2", (21.0, 25.0))] {
        ground(&mut draft, pin, at);
    }
    draft.track(0, "TIDE", &[(5.0, 15.0), (35.0, 15.0)], 0.2);
    draft.track(0, "TIDE", &[(20.0, 15.0), (20.0, 25.0)], 0.2);
    let plan = plan(draft.board(), &path("U1.1", &[], &[("U3.1", 0.25), ("U2.1", 0.75)]));
    let path = only(&plan);
    let legs: Vec<(f64, f64, f64)> =
        path.track.iter().map(|leg| (leg.from.x * 1e3, leg.to.y * 1e3, leg.current)).collect();
    assert_eq!(legs.len(), 3, "{legs:?}");
    assert_eq!((legs[0].2, legs[1].2, legs[2].2), (1.0, 0.75, 0.25), "{legs:?}");
    assert!(path.track[2].to.distance(Point::mm(20.0, 25.0)) < 1e-9);
    assert_eq!(entries(path), [(5.0, 17.0, -1.0), (21.0, 26.0, 0.25), (35.0, 17.0, 0.75)]);
    assert!(messages(&plan, "track-branch").is_empty() && messages(&plan, "track-further-pins").is_empty());
}

/// Input capacitor, switch and diode of a converter.
fn converter() -> Draft {
    let mut draft = plain();
    draft.pad(0, "C41.1", "VIN", (10.0, 15.0), 0.6);
    ground(&mut draft, "C41.2", (10.0, 18.0));
    draft.pad(0, "Q3.5", "VIN", (15.0, 15.0), 0.6);
    draft.pad(0, "Q3.2", "SW", (18.0, 15.0), 0.6);
    draft.pad(0, "Q3.1", "GATE", (16.0, 13.0), 0.6);
    draft.pad(0, "D2.1", "SW", (22.0, 15.0), 0.6);
    ground(&mut draft, "D2.2", (22.0, 18.0));
    draft.track(0, "VIN", &[(10.0, 15.0), (15.0, 15.0)], 1.0);
    draft.track(0, "SW", &[(18.0, 15.0), (22.0, 15.0)], 1.0);
    draft
}

#[test]
fn a_hot_loop_enters_the_plane_where_it_reaches_ground() {
    let plan = plan(converter().board(), &path("C41.1", &["Q3.5 Q3.2", "D2"], &[("C41.2", 1.0)]));
    let path = only(&plan);
    let length_m: f64 = path.track.iter().map(|leg| leg.from.distance(leg.to)).sum();
    // Two tracks, the switch and the diode.
    assert!((length_m - (5.0 + 3.0 + 4.0 + 3.0) * 1e-3).abs() < 1e-9, "{:?}", path.track);
    assert_eq!(path.charts[0].withheld, None);
    assert_eq!(entries(path), [(10.0, 19.0, -1.0), (22.0, 19.0, 1.0)]);
    let passed = &messages(&plan, "path-through-parts")[0].text;
    assert!(passed.contains("path `TIDE` passes `Q3`, `D2`"), "{passed}");
}

#[test]
fn a_loop_that_closes_at_its_driver_lands_nowhere_else() {
    let plan = plan(converter().board(), &path("C41.1", &["Q3.5 Q3.2", "D2", "C41"], &[("C41.1", 1.0)]));
    let path = only(&plan);
    // The capacitor closes the loop from pad to pad.
    assert!(path.track.last().unwrap().to.distance(path.track[0].from) < 1e-12);
    assert_eq!(entries(path), [(10.0, 19.0, -1.0), (22.0, 19.0, 1.0)]);
    assert_eq!(path.charts.len(), 1);
    assert_eq!(path.charts[0].withheld, None);
}

#[test]
fn the_two_lines_of_a_pair_land_their_difference() {
    let mut draft = plain();
    for (name, y) in [("LINK_P", 15.0), ("LINK_N", 15.4)] {
        draft.track(0, name, &[(5.0, y), (35.0, y)], 0.2);
    }
    for (pin, net, at) in [
        ("U1.1", "LINK_P", (5.0, 15.0)),
        ("U1.3", "LINK_N", (5.0, 15.4)),
        ("U2.1", "LINK_P", (35.0, 15.0)),
        ("U2.3", "LINK_N", (35.0, 15.4)),
    ] {
        draft.pad(0, pin, net, at, 0.2);
    }
    ground(&mut draft, "U1.2", (5.0, 17.0));
    ground(&mut draft, "U1.4", (5.0, 12.0));
    ground(&mut draft, "U2.2", (35.0, 17.0));
    let board = draft.board();
    let pair = |imbalance: f64| {
        let request = PairRequest {
            name: "LINK".into(),
            positive: "LINK_P".into(),
            negative: "LINK_N".into(),
            imbalance,
            ..PairRequest::default()
        };
        Review { pairs: vec![request], ..review() }
    };
    let balanced = plan(board.clone(), &pair(0.0));
    let path = only(&balanced);
    assert_eq!(path.track.iter().map(|leg| leg.current).collect::<Vec<_>>(), [1.0, -1.0]);
    assert!(entries(path).is_empty(), "{:?}", path.entries);
    assert_eq!((path.charts.len(), &path.charts[0].withheld), (1, &None));
    let tilted = plan(board.clone(), &pair(0.1));
    let currents: Vec<f64> = only(&tilted).track.iter().map(|leg| leg.current).collect();
    assert!((currents[0] - 1.05).abs() < 1e-12 && (currents[1] + 0.95).abs() < 1e-12, "{currents:?}");
    // U1 has two ground pins, tied inside; the landing of one of them is named to have a place.
    assert!(only(&tilted).entries.iter().any(|entry| matches!(entry.end, End::Node(_))));
    let mut named = pair(0.1);
    named.nets = vec![NetRequest {
        name: "LINK_P".into(),
        driver_landing: Some(LandingRequest::Pin("U1.4".into())),
        ..NetRequest::default()
    }];
    let named = plan(board.clone(), &named);
    let landed = entries(named.paths.iter().find(|path| path.name == "LINK").unwrap());
    assert!((landed[0].2 + 0.1).abs() < 1e-12 && (landed[1].2 - 0.1).abs() < 1e-12, "{landed:?}");
    let mut unknown = pair(0.0);
    unknown.pairs[0].negative = "LINK_M".into();
    let refused = plan(board, &unknown);
    assert!(
        refused.messages[0].text.contains("negative side `LINK_M` of pair `LINK`"),
        "{:?}",
        refused.messages
    );
}

#[test]
fn a_supply_area_is_entered_at_the_vias_and_leaves_no_legs() {
    let mut draft = plain();
    draft.fill(2, "V3", rectangle(2.0, 2.0, 38.0, 28.0));
    for (part, x) in [("U1", 8.0), ("U2", 32.0)] {
        draft.pad(0, &format!("{part}.1"), "V3", (x, 15.0), 0.6);
        draft.track(0, "V3", &[(x, 15.0), (x, 12.0)], 0.4);
        draft.via("V3", (x, 12.0), 0.3);
        ground(&mut draft, &format!("{part}.2"), (x, 18.0));
    }
    let plan = plan(draft.board(), &path("U1.1", &[], &[("U2.1", 1.0)]));
    let path = only(&plan);
    let length_m: f64 = path.track.iter().map(|leg| leg.from.distance(leg.to)).sum();
    assert!((length_m - 6e-3).abs() < 1e-9, "{:#?}", path.track);
    assert!(messages(&plan, "track-across-area").is_empty());
}

#[test]
fn faults_of_paths_are_told() {
    let board = converter().board();
    let told = |review: &Review| {
        let plan = plan(board.clone(), review);
        assert!(plan.paths.is_empty() && plan.messages.len() == 1, "{:?}", plan.messages);
        let message = &plan.messages[0];
        (message.code.name, format!("{} / {}", message.text, message.hints.join(" / ")))
    };
    let cases = [
        (path("C41.1", &["Q3"], &[("D2.1", 1.0)]), "path-broken", "[\"Q3.1\", \"Q3.2\"]"),
        (path("C41.1", &["Q9"], &[("D2.1", 1.0)]), "path-broken", "no part `Q9`"),
        (path("C41.1", &["D2"], &[("C41.2", 1.0)]), "path-broken", "the second on `SW`"),
        (path("C41.1", &[], &[("D2.1", 1.0)]), "path-broken", "`through`"),
        (path("C41.9", &[], &[("D2.1", 1.0)]), "pin-unknown", "did you mean `C41.1`?"),
    ];
    for (review, code, words) in cases {
        let got = told(&review);
        assert!(got.0 == code && got.1.contains(words), "{code}, {words}: {got:?}");
    }
}
