//! What carries a path's return: which copper is a sheet, what joins it, and where the return enters and leaves.

use super::draft::{Draft, disc, rectangle};
use super::{messages, plan, review};
use ebbmap::board::{Board, NetId, Part, Tie, TieKind};
use ebbmap::geom::Point;
use ebbmap::plan::{Conductors, End, Joint, JointKind, PathPlan, Plan};
use ebbmap::review::joint::{Branch, PartRequest, TieEnd, TieRequest};
use ebbmap::review::{LandingRequest, Marks, Review};

/// A track of 30 mm on `layer` from U1 to U2 on a board of 40 x 30 mm, each part with a ground pin and via.
fn draft(layer: usize) -> Draft {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    for (part, x) in [("U1", 5.0), ("U2", 35.0)] {
        draft.pad(layer, &format!("{part}.1"), "TIDE_SCK", (x, 10.0), 0.6);
        draft.pad(layer, &format!("{part}.2"), "GND", (x, 13.0), 0.6);
        draft.via("GND", (x, 13.0), 0.3);
    }
    draft.track(layer, "TIDE_SCK", &[(5.0, 10.0), (35.0, 10.0)], 0.2);
    draft
}

/// A part with two pins on the top layer, 2 mm apart, each with a via in its pad.
fn two_pins(draft: &mut Draft, part: &str, nets: (&str, &str), (x, y): (f64, f64)) {
    for (number, net, x) in [(1, nets.0, x), (2, nets.1, x + 2.0)] {
        draft.pad(0, &format!("{part}.{number}"), net, (x, y), 0.6);
        draft.via(net, (x, y), 0.3);
    }
}

/// All sheets as `L2-GND`, one entry for each piece.
fn sheets(board: &Board, conductors: &Conductors) -> Vec<String> {
    let mut names = Vec::new();
    for layer in &conductors.layers {
        for &area in &layer.areas {
            let net = board.layers[layer.layer].areas[area].net;
            names.push(format!("L{}-{}", layer.layer + 1, net.map_or("", |net| board.net_name(net))));
        }
    }
    names.sort();
    names
}

fn named<'p>(plan: &'p Plan, what: &str) -> Vec<&'p Joint> {
    plan.conductors.joints.iter().filter(|joint| joint.what == what).collect()
}

fn layers(joint: &Joint) -> (usize, usize) {
    let layer = |end: &End| match end {
        End::Copper { layer, .. } => *layer,
        End::Node(_) => usize::MAX,
    };
    (layer(&joint.from), layer(&joint.to))
}

fn only(plan: &Plan) -> &PathPlan {
    assert_eq!(plan.paths.len(), 1, "{:#?}", plan.messages);
    assert!(plan.paths[0].charts.iter().all(|chart| chart.withheld.is_none()), "{:#?}", plan.paths[0].charts);
    &plan.paths[0]
}

fn part(reference: &str, branch: Branch) -> PartRequest {
    PartRequest { reference: Some(reference.into()), fitted: true, branch, line: 9, ..PartRequest::default() }
}

fn with_part(request: PartRequest) -> Review {
    Review { parts: vec![request], ..review("TIDE_SCK") }
}

#[test]
fn stitched_planes_are_sheets_joined_by_barrels() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    draft.plane(2, "GND", &[]);
    draft.via("GND", (20.0, 20.0), 0.3);
    let board = draft.board();
    let plan = plan(board.clone(), &review("TIDE_SCK"));
    assert_eq!(sheets(&board, &plan.conductors), ["L2-GND", "L3-GND"]);
    assert_eq!(plan.conductors.joints.len(), 3, "{:#?}", plan.conductors.joints);
    for joint in &plan.conductors.joints {
        assert_eq!((joint.kind, layers(joint)), (JointKind::Barrel, (1, 2)));
        // By hand: 1 mm of a tube of 0.3 mm with walls of 20 um, 58 MS/m: 0.9147 mohm.
        assert!((joint.resistance_ohm - 0.9147e-3).abs() < 1e-7, "{}", joint.resistance_ohm);
        assert!((joint.barrel_radius_m.unwrap() - 0.15e-3).abs() < 1e-12 && joint.inductance_h == 0.0);
    }
    let path = only(&plan);
    let ends: Vec<(f64, Option<f64>)> = path
        .entries
        .iter()
        .map(|entry| match entry.end {
            End::Copper { layer: 1, at, .. } => (entry.current, Some((at.x * 1e3).round())),
            _ => (entry.current, None),
        })
        .collect();
    assert_eq!(ends, [(-1.0, Some(5.0)), (1.0, Some(35.0))], "{:#?}", path.entries);
    assert!(path.joints.is_empty() && path.own_areas.is_empty());
}

#[test]
fn a_thicker_plating_conducts_better() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    draft.plane(2, "GND", &[]);
    let mut wanted = review("TIDE_SCK");
    wanted.stackup.plating_m = Some(40e-6);
    let plan = plan(draft.board(), &wanted);
    assert!((plan.conductors.joints[0].resistance_ohm - 0.45735e-3).abs() < 1e-7);
    assert!(messages(&plan, "plating-assumed").is_empty());
}

#[test]
fn pours_beside_the_track_are_sheets_and_pads_are_not() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    // 4 mm2 of ground 0.3 mm beside the track, as much of a supply, the same far away, and a lone pad near it.
    draft.fill(0, "GND", rectangle(10.0, 10.4, 14.0, 11.4));
    draft.via("GND", (12.0, 11.0), 0.3);
    draft.fill(0, "V3", rectangle(20.0, 10.4, 24.0, 11.4));
    draft.fill(0, "GND", rectangle(20.0, 20.0, 24.0, 21.0));
    draft.pad(0, "TP1.1", "GND", (28.0, 10.8), 0.6);
    let board = draft.board();
    let plan = plan(board.clone(), &review("TIDE_SCK"));
    assert_eq!(sheets(&board, &plan.conductors), ["L1-GND", "L1-V3", "L2-GND"]);
    let near = &board.layers[0].areas[plan.conductors.layers[0].areas[0]].shape;
    assert!(near.bounds().max.x < 25e-3, "the pour beside the track");
    let text = &messages(&plan, "pour-beside")[0].text;
    assert!(text.contains("takes a part of the return"), "{text}");
}

#[test]
fn copper_beside_the_track_asks_for_cells_as_small_as_its_gap() {
    let cell = |gap: f64| {
        let mut draft = draft(0);
        draft.plane(1, "GND", &[]);
        draft.fill(0, "GND", rectangle(8.0, 10.1 + gap, 32.0, 12.0 + gap));
        // A large board, so that cells of h are the rule.
        draft.fill(2, "GND", rectangle(1.0, 1.0, 39.0, 29.0));
        only(&plan(draft.board(), &review("TIDE_SCK"))).charts[0].cell_m
    };
    assert!((cell(0.3) - 0.2e-3).abs() < 1e-12, "{}", cell(0.3));
    assert!((cell(0.12) - 0.12e-3).abs() < 1e-12, "{}", cell(0.12));
    assert!((cell(0.06) - 0.1e-3).abs() < 1e-12, "{}", cell(0.06));
}

/// A bottom track over a supply plane on L3, ground on L2, and a capacitor between the two.
fn over_a_supply() -> Draft {
    let mut draft = draft(3);
    draft.plane(1, "GND", &[disc(20.0, 20.0, 0.8)]);
    draft.plane(2, "V3", &[disc(22.0, 20.0, 0.8), disc(5.0, 13.0, 0.8), disc(35.0, 13.0, 0.8)]);
    two_pins(&mut draft, "C14", ("V3", "GND"), (20.0, 20.0));
    draft
}

#[test]
fn a_supply_plane_between_is_a_sheet_and_withholds_nothing() {
    let board = over_a_supply().board();
    let plan = plan(board.clone(), &review("TIDE_SCK"));
    assert_eq!(sheets(&board, &plan.conductors), ["L2-GND", "L3-V3"]);
    let path = only(&plan);
    assert_eq!((path.charts.len(), path.charts[0].plane.to_string().as_str()), (1, "L2-GND"));
    let note = messages(&plan, "plane-not-reference");
    assert!(note.len() == 1 && note[0].severity == ebbmap::diag::Severity::Note, "{note:?}");
    assert!(note[0].text.contains("lies `L3-V3`, 0.2 mm away, over 30 mm"), "{}", note[0].text);
}

#[test]
fn values_of_a_capacitor_come_from_the_review_the_files_or_defaults() {
    let board = over_a_supply().board();
    let joint = |board: &Board, wanted: &Review| {
        let plan = plan(board.clone(), wanted);
        let found = named(&plan, "C14");
        assert_eq!((found.len(), found[0].kind, layers(found[0])), (1, JointKind::Part, (2, 1)), "{found:?}");
        (found[0].clone(), messages(&plan, "part-value-assumed").len())
    };
    let (default, warnings) = joint(&board, &review("TIDE_SCK"));
    assert_eq!((default.capacitance_f, warnings), (Some(100e-9), 1));
    // Its own 20 mohm and 0.5 nH, and the ways down from the top layer to L3 and L2. One barrel's share of a loop of
    // two, (mu0 s/2 pi) ln(D/a), at D = 1 mm: 0.2 nH/mm ln(1/0.15) x (1.235 + 0.2) mm = 0.5445 nH.
    assert!((default.inductance_h - (0.5 + 0.5445) * 1e-9).abs() < 1e-12, "{}", default.inductance_h);
    assert!((default.resistance_ohm - 20e-3 - 0.9147e-3 * 1.435).abs() < 1e-6, "{}", default.resistance_ohm);
    let mut known = board.clone();
    known.parts = vec![Part { reference: "C14".into(), value: Some("10nF/50V".into()) }];
    let (from_file, warnings) = joint(&known, &review("TIDE_SCK"));
    assert_eq!((from_file.capacitance_f, warnings), (Some(10e-9), 0));
    let branch = Branch { capacitance_f: Some(1e-9), inductance_h: Some(1e-9), resistance_ohm: None };
    let by_nets = PartRequest { nets: vec!["GND".into(), "V3".into()], reference: None, ..part("", branch) };
    let by_value = PartRequest { value: Some("10nF/50V".into()), reference: None, ..part("", branch) };
    for request in [part("C14", branch), part("C*", branch), by_nets, by_value] {
        let (own, warnings) = joint(&known, &with_part(request));
        assert_eq!((own.capacitance_f, warnings), (Some(1e-9), 0));
        assert!((own.inductance_h - (1.0 + 0.5445) * 1e-9).abs() < 1e-12, "{}", own.inductance_h);
    }
    // A name beats a pattern before it.
    let other = Branch { capacitance_f: Some(2e-9), ..branch };
    let both = Review { parts: vec![part("C*", other), part("C14", branch)], ..review("TIDE_SCK") };
    assert_eq!(joint(&board, &both).0.capacitance_f, Some(1e-9));
    let absent = PartRequest { fitted: false, ..part("C14", Branch::default()) };
    assert!(named(&plan(board.clone(), &with_part(absent)), "C14").is_empty());
    for (request, hint) in [(part("C15", branch), "did you mean `C14`?"), (part("X*", branch), "")] {
        let wrong = plan(board.clone(), &with_part(request));
        let message = messages(&wrong, "part-unknown")[0];
        assert!(message.place.line == Some(9) && message.hints.join("").contains(hint), "{message:?}");
    }
}

/// A ground plane in two halves under a track that crosses the split.
fn split() -> Draft {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[rectangle(19.5, 0.0, 20.5, 30.0)]);
    draft
}

#[test]
fn a_return_that_cannot_close_names_both_pieces() {
    let plan = plan(split().board(), &review("TIDE_SCK"));
    let reason = plan.paths[0].charts[0].withheld.clone().unwrap();
    assert_eq!(reason.code.name, "return-open");
    for words in
        ["of `L2-GND` of 551.0 mm2 round 10.0, 15.0", "round 30.0, 15.0", "via of U1.2", "via of U2.2"]
    {
        assert!(reason.text.contains(words), "{words}: {}", reason.text);
    }
    assert!(plan.paths[0].entries.is_empty());
}

#[test]
fn parts_ties_and_tracks_bridge_a_split_plane() {
    let bridged = |change: &dyn Fn(&mut Draft), wanted: &Review| {
        let mut draft = split();
        change(&mut draft);
        plan(draft.board(), wanted)
    };
    let plain = review("TIDE_SCK");
    // A link of unknown value between two pieces of ground.
    let plan = bridged(&|draft| two_pins(draft, "R7", ("GND", "GND"), (19.0, 20.0)), &plain);
    only(&plan);
    assert!(named(&plan, "R7")[0].resistance_ohm < 5e-3 && messages(&plan, "part-value-assumed").len() == 1);
    // A track on another layer between two vias, 1 mm2: a sheet only because it bridges.
    let plan = bridged(
        &|draft| {
            draft.track(3, "GND", &[(18.0, 25.0), (22.0, 25.0)], 0.25);
            draft.via("GND", (18.0, 25.0), 0.3);
            draft.via("GND", (22.0, 25.0), 0.3);
        },
        &plain,
    );
    only(&plan);
    assert_eq!(plan.conductors.layers.iter().map(|layer| layer.layer).collect::<Vec<_>>(), [1, 3]);
    // A tie that the review names, and one over a node outside the board.
    let tie = |from: TieEnd, to: TieEnd, capacitance_f: Option<f64>| TieRequest {
        name: "strap".into(),
        from,
        to,
        branch: Branch { resistance_ohm: Some(0.5), inductance_h: None, capacitance_f },
        line: 7,
        marks: Marks::default(),
    };
    let (left, right) = (TieEnd::At(Point::mm(10.0, 20.0)), TieEnd::At(Point::mm(30.0, 20.0)));
    let wanted = Review { ties: vec![tie(left.clone(), right.clone(), None)], ..review("TIDE_SCK") };
    let plan = bridged(&|_| {}, &wanted);
    only(&plan);
    let strap = named(&plan, "strap")[0];
    assert_eq!((strap.kind, strap.resistance_ohm), (JointKind::Tie, 0.5));
    assert!(strap.at.distance(Point::mm(20.0, 20.0)) < 1e-9);
    let chassis = TieEnd::Outside("chassis".into());
    let both = vec![tie(TieEnd::Pin("U1.2".into()), chassis.clone(), None), tie(chassis, right, Some(1e-9))];
    let plan = bridged(&|_| {}, &Review { ties: both, ..review("TIDE_SCK") });
    only(&plan);
    assert_eq!(plan.conductors.nodes, ["chassis"]);
    let note = messages(&plan, "return-through-capacitors");
    assert!(note.len() == 1 && note[0].text.contains("through capacitors only"), "{note:?}");
    // Ends that are nowhere.
    let nowhere = TieEnd::Net { net: "GNDD".into(), at: None };
    let plan = bridged(&|_| {}, &Review { ties: vec![tie(left, nowhere, None)], ..review("TIDE_SCK") });
    let message = messages(&plan, "tie-bad")[0];
    assert!(message.place.line == Some(7) && message.hints[0].contains("did you mean `GND`?"), "{message:?}");
}

#[test]
fn copper_that_ties_two_nets_is_a_joint() {
    let mut draft = draft(0);
    draft.fill(1, "GND", rectangle(0.5, 0.5, 19.5, 29.5));
    draft.fill(1, "AGND", rectangle(20.5, 0.5, 39.5, 29.5));
    let mut board = draft.board();
    let shape = rectangle(19.5, 20.0, 20.5, 20.5);
    let nets: Vec<NetId> = ["AGND", "GND"].map(|name| board.net(name).unwrap()).to_vec();
    let at = Point::mm(20.0, 20.25);
    board.ties = vec![Tie { part: "NT1".into(), kind: TieKind::EtchedCopper, nets, layer: 1, at, shape }];
    let mut wanted = review("TIDE_SCK");
    wanted.reference_nets.push("AGND".into());
    wanted.nets[0].receiver_landing = Some(LandingRequest::At(Point::mm(35.0, 11.0)));
    let plan = plan(board, &wanted);
    only(&plan);
    let tie = named(&plan, "NT1")[0];
    // Two squares of 35 um copper: 2 x 0.4926 mohm.
    assert!(tie.kind == JointKind::Tie && (tie.resistance_ohm - 0.985e-3).abs() < 1e-6, "{tie:?}");
    for (end, x) in [(&tie.from, 20.5), (&tie.to, 19.5)] {
        let End::Copper { at, .. } = end else { panic!("on copper: {tie:?}") };
        assert!(at.distance(Point::mm(x, 20.25)) < 1e-6, "{at:?}");
    }
}

#[test]
fn a_connector_with_five_ground_pins_is_tied_inside() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    for number in 3..7 {
        let at = (5.0, 13.0 + 2.0 * f64::from(number));
        draft.pad(0, &format!("U1.{number}"), "GND", at, 0.6);
        draft.via("GND", at, 0.3);
    }
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    let path = only(&plan);
    assert_eq!(plan.conductors.nodes, ["`GND` pins of U1"]);
    assert_eq!((path.entries[0].end.clone(), path.entries[0].current), (End::Node(0), -1.0));
    assert!(matches!(path.entries[1].end, End::Copper { layer: 1, .. }));
    assert_eq!(path.joints.len(), 5);
    for joint in &path.joints {
        assert_eq!((joint.kind, joint.from.clone()), (JointKind::Inside, End::Node(0)));
        assert!(joint.resistance_ohm < 0.5e-3 && layers(joint).1 == 1, "{joint:?}");
    }
}

#[test]
fn a_part_joins_reference_nets_inside() {
    let mut draft = draft(0);
    draft.fill(1, "GND", rectangle(0.5, 0.5, 19.5, 29.5));
    draft.fill(1, "AGND", rectangle(20.5, 0.5, 39.5, 29.5));
    for (number, net, x) in [(1, "GND", 18.0), (2, "AGND", 22.0), (3, "AGND", 24.0), (4, "V3", 26.0)] {
        draft.pad(0, &format!("U3.{number}"), net, (x, 25.0), 0.6);
        draft.via(net, (x, 25.0), 0.3);
    }
    let mut wanted = review("TIDE_SCK");
    wanted.reference_nets.push("AGND".into());
    wanted.nets[0].receiver_landing = Some(LandingRequest::At(Point::mm(35.0, 11.0)));
    let board = draft.board();
    assert_eq!(
        plan(board.clone(), &wanted).paths[0].charts[0].withheld.as_ref().unwrap().code.name,
        "return-open"
    );
    let joins = vec!["GND".to_owned(), "AGND".to_owned()];
    wanted.parts = vec![PartRequest { joins, ..part("U3", Branch::default()) }];
    let plan = plan(board, &wanted);
    only(&plan);
    assert_eq!(plan.conductors.nodes, ["inside of U3"]);
    let inside: Vec<&Joint> =
        plan.conductors.joints.iter().filter(|joint| joint.kind == JointKind::Inside).collect();
    assert_eq!(inside.len(), 3, "{inside:#?}");
}

#[test]
fn a_layer_change_keeps_one_pair_of_entries() {
    let mut draft = Draft::new(40.0, 30.0, &[0.2, 1.0, 0.2]);
    draft.plane(1, "GND", &[disc(20.0, 10.0, 0.8)]);
    draft.plane(2, "GND", &[disc(20.0, 10.0, 0.8)]);
    draft.pad(0, "U1.1", "TIDE_SCK", (5.0, 10.0), 0.6);
    draft.pad(3, "U2.1", "TIDE_SCK", (35.0, 10.0), 0.6);
    draft.track(0, "TIDE_SCK", &[(5.0, 10.0), (20.0, 10.0)], 0.2);
    draft.via("TIDE_SCK", (20.0, 10.0), 0.3);
    draft.track(3, "TIDE_SCK", &[(20.0, 10.0), (35.0, 10.0)], 0.2);
    for (part, layer, x) in [("U1", 0, 5.0), ("U2", 3, 35.0)] {
        draft.pad(layer, &format!("{part}.2"), "GND", (x, 12.0), 0.6);
        draft.via("GND", (x, 12.0), 0.3);
    }
    let plan = plan(draft.board(), &review("TIDE_SCK"));
    let path = only(&plan);
    assert_eq!(path.charts.len(), 2);
    let ends: Vec<(f64, usize)> = path
        .entries
        .iter()
        .map(|entry| match entry.end {
            End::Copper { layer, .. } => (entry.current, layer),
            End::Node(_) => (entry.current, usize::MAX),
        })
        .collect();
    // Each on the sheet nearest to its part's side.
    assert_eq!(ends, [(-1.0, 1), (1.0, 2)]);
    assert_eq!(plan.conductors.joints.len(), 2, "signal vias join no sheets: {:#?}", plan.conductors.joints);
}

#[test]
fn copper_of_the_path_itself_is_no_sheet_for_it() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    draft.fill(0, "TIDE_SCK", rectangle(15.0, 7.0, 23.0, 12.0));
    for (part, x) in [("U4", 5.0), ("U5", 35.0)] {
        draft.pad(0, &format!("{part}.1"), "LEVEL_OUT", (x, 6.6), 0.4);
        draft.pad(0, &format!("{part}.2"), "GND", (x, 5.0), 0.6);
        draft.via("GND", (x, 5.0), 0.3);
    }
    draft.track(0, "LEVEL_OUT", &[(5.0, 6.6), (35.0, 6.6)], 0.2);
    let board = draft.board();
    let plan = plan(board.clone(), &review("*"));
    assert_eq!(sheets(&board, &plan.conductors), ["L1-TIDE_SCK", "L2-GND"]);
    let own: Vec<(&str, usize)> =
        plan.paths.iter().map(|path| (path.name.as_str(), path.own_areas.len())).collect();
    assert_eq!(own, [("LEVEL_OUT", 0), ("TIDE_SCK", 1)]);
}

#[test]
fn a_path_holds_up_to_a_tenth_of_a_wavelength() {
    let mut draft = draft(0);
    draft.plane(1, "GND", &[]);
    let mut board = draft.board();
    board.stackup.dielectrics.iter_mut().for_each(|sheet| sheet.permittivity = 4.3);
    let mut wanted = review("TIDE_SCK");
    wanted.bands = vec![ebbmap::signal::itu_band("VHF").unwrap(), ebbmap::signal::itu_band("UHF").unwrap()];
    let plan = plan(board, &wanted);
    // c/(10 L sqrt(er)) for the diagonal of 50 mm and er = 4.3, worked out apart: 289.145522 MHz.
    assert!((plan.paths[0].valid_to_hz / 289.145522e6 - 1.0).abs() < 1e-8, "{}", plan.paths[0].valid_to_hz);
    let beyond = messages(&plan, "band-beyond");
    assert!(
        beyond.len() == 1 && beyond[0].text.contains("band UHF at 1 GHz lies above 289 MHz"),
        "{beyond:?}"
    );
}
