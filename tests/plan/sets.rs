//! Plans on real fabrication sets, where they lie beside the repository: nothing is known of them but that a plan must
//! hold together.

use super::review;
use ebbmap::board::{Board, NetId};
use ebbmap::geom::locate::Locator;
use ebbmap::plan::{End, Plan, build};
use ebbmap::review::NetRequest;
use std::collections::BTreeSet;
use std::path::{Path, PathBuf};

/// Nets planned on each board.
const NETS: usize = 25;

fn folders() -> Vec<PathBuf> {
    let boards = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/boards");
    let Ok(entries) = std::fs::read_dir(boards) else { return Vec::new() };
    let all = entries.map(|entry| entry.unwrap().path());
    let name = |path: &PathBuf| path.file_name().unwrap().to_string_lossy().into_owned();
    let mut found: Vec<PathBuf> = all.filter(|path| name(path).starts_with("x2-")).collect();
    found.sort();
    found
}

/// The net with the largest single piece of copper.
fn largest_net(board: &Board) -> NetId {
    let areas = board.layers.iter().flat_map(|layer| &layer.areas);
    let named = areas.filter_map(|area| area.net.map(|net| (area.shape.area(), net)));
    named.max_by(|a, b| a.0.total_cmp(&b.0)).unwrap().1
}

/// Every net of the board with two pins or more, first pin to last, evenly picked.
fn requests(board: &Board, reference: NetId) -> Vec<NetRequest> {
    let mut all = Vec::new();
    for (index, net) in board.nets.iter().enumerate() {
        let id = NetId(index as u32);
        let pins: Vec<String> =
            board.pins.iter().filter(|pin| pin.net == Some(id)).map(|pin| pin.label()).collect();
        if let (Some(first), Some(last)) = (pins.first(), pins.last())
            && id != reference
            && first != last
        {
            all.push(NetRequest {
                name: net.name.clone(),
                driver: Some(first.clone()),
                receiver: Some(last.clone()),
                ..NetRequest::default()
            });
        }
    }
    let step = all.len().div_ceil(NETS).max(1);
    all.into_iter().step_by(step).collect()
}

fn check(board: &Board, plan: &Plan, wanted: usize) {
    let explained = plan.messages.iter().filter(|m| m.severity == ebbmap::diag::Severity::Error).count();
    assert!(
        plan.paths.len() + explained >= wanted,
        "{} nets of {wanted}, {explained} errors",
        plan.paths.len()
    );
    for net in &plan.paths {
        assert!(!net.charts.is_empty() && net.charts[0].legs.start == 0, "{}", net.name);
        assert_eq!(net.charts.last().unwrap().legs.end, net.track.len(), "{}", net.name);
        for pair in net.track.windows(2) {
            let (from, to) = (pair[0].to, pair[1].from);
            // Where the way runs in a large area of its own net there are no legs.
            let in_area = || {
                let areas = board.layers.iter().flat_map(|layer| &layer.areas);
                let mut own =
                    areas.filter(|area| area.net == board.net(&net.name) && area.shape.area() > 1e-4);
                own.any(|area| area.shape.contains(from) && area.shape.contains(to))
            };
            let step = from.distance(to);
            assert!(step < 1e-7 || in_area(), "{}: the way jumps by {step} m", net.name);
        }
        for leg in &net.track {
            let middle = (leg.from + leg.to) * 0.5;
            let own = board.layers[leg.layer].areas.iter().filter(|a| a.net == board.net(&net.name));
            let on_copper = own.into_iter().any(|area| area.shape.contains(middle));
            // Across a pour a straight line may leave it; its width then is that of the narrowest draw.
            let length = leg.from.distance(leg.to);
            assert!(on_copper || length > 0.2e-3, "{}: {leg:?} is not on copper", net.name);
            assert!(leg.width_m > 0.0 && leg.width_m < 0.1, "{}: {leg:?}", net.name);
        }
        for pair in net.charts.windows(2) {
            assert_eq!(pair[0].legs.end, pair[1].legs.start, "{}", net.name);
            assert!(pair[0].plane != pair[1].plane, "{}", net.name);
        }
        for chart in net.charts.iter().filter(|chart| chart.withheld.is_none()) {
            assert!(chart.height_m > 0.0 && chart.cell_m > 0.0 && chart.unknowns > 0, "{}", net.name);
            let areas = board.layers[chart.plane.layer].areas.iter();
            let of_plane: Vec<_> = areas.filter(|area| area.net == board.net(&chart.plane.net)).collect();
            let landings = [&chart.driver_landing, &chart.receiver_landing];
            // Where no via is near, the picture shows the place on the track itself.
            for landing in landings.into_iter().filter(|landing| landing.what != "track") {
                let reach = landing.radius_m + 1e-6;
                let near = ebbmap::geom::locate::Locator::new(of_plane.iter().map(|area| &area.shape));
                assert!(!near.touching(&[landing.at], reach).is_empty(), "{}: {landing:?}", net.name);
            }
            for void in &chart.voids {
                assert!(void.shape.area() > 0.0, "{}: {}", net.name, void.id);
            }
        }
    }
}

/// Ends of joints and entries lie on copper of their area, areas are sheets, currents sum to zero, values are sound.
fn check_conductors(board: &Board, plan: &Plan) {
    let sheets: BTreeSet<(usize, usize)> = plan
        .conductors
        .layers
        .iter()
        .flat_map(|layer| layer.areas.iter().map(|&area| (layer.layer, area)))
        .collect();
    let on_copper = |end: &End, what: &str| match *end {
        End::Copper { layer, area, at, radius_m } => {
            assert!(sheets.contains(&(layer, area)), "{what}: L{} {area} is no sheet", layer + 1);
            let shape = &board.layers[layer].areas[area].shape;
            let near = Locator::new([shape]).touching(&[at], radius_m + 2e-6);
            assert!(!near.is_empty() && radius_m > 0.0, "{what}: off copper at {at:?}, L{}", layer + 1);
        }
        End::Node(node) => assert!(node < plan.conductors.nodes.len(), "{what}"),
    };
    let own = plan.paths.iter().flat_map(|path| &path.joints);
    for joint in plan.conductors.joints.iter().chain(own) {
        on_copper(&joint.from, &joint.what);
        on_copper(&joint.to, &joint.what);
        assert!(joint.resistance_ohm > 0.0 && joint.inductance_h >= 0.0, "{joint:?}");
        assert!(joint.capacitance_f.is_none_or(|farad| farad > 0.0), "{joint:?}");
        assert!(joint.from != joint.to, "{joint:?}");
    }
    for path in &plan.paths {
        path.entries.iter().for_each(|entry| on_copper(&entry.end, &entry.what));
        let sum: f64 = path.entries.iter().map(|entry| entry.current).sum();
        assert!(sum.abs() < 1e-9, "{}: {sum}", path.name);
        assert!(path.valid_to_hz > 1e6, "{}", path.name);
        assert!(path.own_areas.iter().all(|piece| sheets.contains(piece)), "{}", path.name);
        for chart in &path.charts {
            let reason = chart.withheld.as_ref().map(|message| message.code.name);
            let known = [None, Some("plane-none"), Some("landing-none"), Some("return-open")];
            assert!(known.contains(&reason), "{}: {reason:?}", path.name);
        }
    }
}

#[test]
fn all_ground_of_the_sample_is_one_conductor() {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("samples/tide-gauge");
    let file = ebbmap::read::read_review(&folder.join("review.toml"));
    let wanted = file.review.unwrap();
    let (mut board, _) = ebbmap::read::read_board(&wanted.files).unwrap();
    ebbmap::plan::apply_review(&mut board, &wanted);
    let plan = build(&board, &wanted);
    check_conductors(&board, &plan);
    assert_eq!(plan.paths.len(), wanted.nets.len(), "{:#?}", plan.messages);
    for path in &plan.paths {
        assert!(path.charts.iter().all(|chart| chart.withheld.is_none()), "{path:#?}");
        assert!(path.entries.len() >= 2, "{path:#?}");
    }
    // Every piece of ground of 25 mm2 or more hangs together through joints that conduct.
    let ground = board.net("GND");
    let large = |layer: usize, area: usize| {
        let area = &board.layers[layer].areas[area];
        area.net == ground && area.shape.area() >= 25e-6
    };
    let all: BTreeSet<(usize, usize)> = (0..board.layers.len())
        .flat_map(|layer| (0..board.layers[layer].areas.len()).map(move |area| (layer, area)))
        .filter(|&(layer, area)| large(layer, area))
        .collect();
    let mut reached: BTreeSet<(usize, usize)> = all.iter().take(1).copied().collect();
    loop {
        let before = reached.len();
        for joint in plan.conductors.joints.iter().filter(|joint| joint.capacitance_f.is_none()) {
            if let (End::Copper { layer: a, area: x, .. }, End::Copper { layer: b, area: y, .. }) =
                (&joint.from, &joint.to)
                && (reached.contains(&(*a, *x)) || reached.contains(&(*b, *y)))
            {
                reached.extend([(*a, *x), (*b, *y)]);
            }
        }
        if reached.len() == before {
            break;
        }
    }
    assert!(all.len() > 1 && all.is_subset(&reached), "{all:?} of {reached:?}");
}

#[test]
fn plans_of_real_sets_hold_together() {
    for folder in folders() {
        let (board, _) = ebbmap::read::read_board(&folder).unwrap();
        let reference = largest_net(&board);
        let mut wanted = review("");
        wanted.reference_nets = vec![board.net_name(reference).into()];
        wanted.nets = requests(&board, reference);
        let plan = build(&board, &wanted);
        check(&board, &plan, wanted.nets.len());
        check_conductors(&board, &plan);
        assert_eq!(format!("{plan:?}"), format!("{:?}", build(&board, &wanted)), "plans repeat");
    }
}
