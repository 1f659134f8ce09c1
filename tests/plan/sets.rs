//! Plans on real fabrication sets, where they lie beside the repository: nothing is known of them but that a plan must
//! hold together.

use super::review;
use ebbmap::board::{Board, NetId};
use ebbmap::plan::{Plan, build};
use ebbmap::review::NetRequest;
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
            for landing in [&chart.driver_landing, &chart.receiver_landing] {
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
        assert_eq!(format!("{plan:?}"), format!("{:?}", build(&board, &wanted)), "plans repeat");
    }
}
