//! Paths through parts, with several receivers, closed loops, supply areas, and pairs: legs, currents and entries.

use super::draft::{Draft, ground, plain, rectangle, row};
use super::{messages, plan};
use ebbmap::geom::Point;
use ebbmap::plan::{End, PathPlan, Plan};
use ebbmap::review::drive::DriverReturn;
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
    // The lines, and the two parts that close them.
    assert_eq!(path.track.iter().map(|leg| leg.current).collect::<Vec<_>>(), [1.0, -1.0, 1.0, 1.0]);
    let round: Vec<Point> = [0, 2].into_iter().map(|leg| path.track[leg].to).collect();
    assert!(round[1].distance(path.track[1].to) < 1e-12 && round[0].distance(path.track[2].from) < 1e-12);
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

#[test]
fn an_open_line_draws_its_current_along_the_way() {
    let mut wanted = review();
    let load = ebbmap::review::drive::Load { capacitance_f: 2e-12, ..Default::default() };
    wanted.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
    wanted.nets[0].signal.load = Some(load);
    let plan = plan(row(false).board(), &wanted);
    let path = only(&plan);
    let currents: Vec<f64> = path.track.iter().map(|leg| leg.current).collect();
    assert!((currents[0] - 1.0).abs() < 1e-12 && currents.windows(2).all(|pair| pair[1] <= pair[0] + 1e-12));
    assert!(currents.windows(2).all(|pair| pair[0] - pair[1] < 0.0101), "{currents:?}");
    // What is left at the end charges the load; all that leaves the track enters the planes.
    let last = currents[currents.len() - 1];
    assert!(last > 0.2 && last < 0.6, "{last}");
    let sum: f64 = path.entries.iter().map(|entry| entry.current).sum();
    assert!(sum.abs() < 1e-9, "{sum}");
    let landed = path.entries.iter().map(|entry| entry.current).fold(0.0, f64::max);
    assert!((landed - last).abs() < 1e-9, "{landed} {last}");
    // With a termination the current is the same all along.
    wanted.nets[0].signal.load.as_mut().unwrap().termination_ohm = Some(50.0);
    let even = self::plan(row(false).board(), &wanted);
    assert!(only(&even).track.iter().all(|leg| leg.current == 1.0));
    assert!(only(&even).signal.remarks.contains(&"same current all along the track".to_owned()));
}

#[test]
fn a_return_by_way_of_the_supply_passes_the_nearest_capacitor() {
    let mut draft = row(false);
    // Supply pin of the driver and two capacitors, the nearer one 4 mm away.
    draft.pad(0, "U1.8", "V3", (5.0, 12.0), 0.6);
    draft.track(0, "V3", &[(5.0, 12.0), (5.0, 4.0)], 0.3);
    for (part, y) in [("C1", 8.0), ("C2", 4.0)] {
        draft.pad(0, &format!("{part}.1"), "V3", (5.0, y), 0.6);
        draft.pad(0, &format!("{part}.2"), "GND", (7.0, y), 0.6);
        draft.track(0, "GND", &[(7.0, y), (8.0, y)], 0.3);
        draft.via("GND", (8.0, y), 0.3);
    }
    let board = draft.board();
    for (landing, at_supply) in [(DriverReturn::Supply, 1.0), (DriverReturn::Both, 0.5)] {
        let mut wanted = review();
        wanted.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
        wanted.nets[0].signal.landing = landing;
        let plan = plan(board.clone(), &wanted);
        let path = only(&plan);
        let found = entries(path);
        assert!(found.contains(&(8.0, 8.0, -at_supply)), "{landing:?}: {found:?}");
        assert_eq!(found.iter().any(|entry| (entry.0, entry.1) == (5.0, 17.0)), at_supply < 1.0, "{found:?}");
        let fed: Vec<f64> = path.track.iter().map(|leg| leg.current).collect();
        assert!((fed[fed.len() - 1] - at_supply).abs() < 1e-12, "{fed:?}");
        let said = path.signal.remarks.join("; ");
        assert!(said.contains("lands on its supply pin U1.8 through C1"), "{said}");
    }
    let mut wanted = review();
    wanted.nets = vec![NetRequest { name: "TIDE".into(), ..NetRequest::default() }];
    wanted.nets[0].signal.landing = DriverReturn::Supply;
    let refused = plan(row(false).board(), &wanted);
    assert_eq!(messages(&refused, "supply-unknown").len(), 1, "{:?}", refused.messages);
}
