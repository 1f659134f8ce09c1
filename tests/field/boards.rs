//! Real fabrication sets, where they lie beside the repository: planes on cells and the way from plan to map.

use crate::scene::band;
use ebbmap::board::Board;
use ebbmap::field::{Copper, Mask, PlaneId, Workshop};
use ebbmap::figure::chart;
use ebbmap::geom::{Grid, Polygon, Region};
use ebbmap::plan::{PathPlan, Plan, apply_review, build};
use ebbmap::read::read_board;
use ebbmap::review::{Model, NetRequest, Review};
use std::path::PathBuf;

/// Folders of fabrication sets beside the repository, sorted; none where there are none.
fn sets() -> Vec<PathBuf> {
    let beside = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../../shared/boards");
    let near = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../shared/boards");
    let folder = if near.is_dir() { near } else { beside };
    let Ok(entries) = std::fs::read_dir(folder) else { return Vec::new() };
    let is_set =
        |path: &PathBuf| path.file_name().is_some_and(|name| name.to_string_lossy().starts_with("x2-"));
    let mut sets: Vec<PathBuf> = entries.map(|entry| entry.unwrap().path()).filter(is_set).collect();
    sets.sort();
    sets
}

/// The largest plane: net and layer with the most copper in one piece.
fn largest_plane(board: &Board) -> PlaneId {
    let mut best = (0.0, PlaneId { layer: 0, net: String::new() });
    for (layer, copper) in board.layers.iter().enumerate() {
        for area in &copper.areas {
            if let Some(net) = area.net
                && area.shape.area() > best.0
            {
                best = (area.shape.area(), PlaneId { layer, net: board.net_name(net).into() });
            }
        }
    }
    best.1
}

#[test]
fn islands_of_real_planes_are_kept() {
    for set in sets() {
        let Ok((board, _)) = read_board(&set) else { continue };
        let plane = largest_plane(&board);
        let areas = board.layers[plane.layer].areas.iter();
        let areas: Vec<&Polygon> = areas
            .filter(|area| area.net.is_some_and(|net| board.net_name(net) == plane.net))
            .map(|area| &area.shape)
            .collect();
        let bounds = board.outline.bounds();
        for cell_m in [0.1e-3, 0.2e-3, 0.4e-3] {
            let cells = |metres: f64| (metres / cell_m).ceil() as usize;
            let (nx, ny) = (cells(bounds.width()), cells(bounds.height()));
            let grid = Grid { origin: bounds.min, cell_m, nx, ny };
            let groups: Vec<Vec<&Polygon>> = areas.iter().map(|&area| vec![area]).collect();
            let started = std::time::Instant::now();
            let copper = Copper { groups: &groups, outline: None, holes: &Region::default() };
            let mask = match Mask::new(&copper, &grid) {
                Ok(mask) => mask,
                Err(place) => {
                    eprintln!("{plane} {nx} x {ny}: too coarse at {:?}", place.at);
                    assert!(cell_m > 0.15e-3, "a plane must fit on cells of 0.1 mm");
                    continue;
                }
            };
            eprintln!(
                "{plane} {nx} x {ny}: {:.2} s, {} areas, {} islands, {} crumbs, {} neck cells, {} cut faces",
                started.elapsed().as_secs_f64(),
                areas.len(),
                mask.islands,
                mask.crumbs,
                mask.neck_cells,
                mask.cut_x.len() + mask.cut_y.len()
            );
            assert!(mask.islands <= areas.len());
            // Every area of some cells has one island, its own.
            let mut taken = std::collections::BTreeMap::new();
            for (index, area) in areas.iter().enumerate() {
                let b = area.bounds();
                let mut islands = std::collections::BTreeSet::new();
                for sample in 0..4000 {
                    let part = |i: usize, of: usize| (i % of) as f64 / of as f64;
                    let x = b.min.x + b.width() * part(sample * 37, 4000);
                    let y = b.min.y + b.height() * part(sample * 1361, 4000);
                    let Some((ix, iy)) = grid.cell_at(ebbmap::geom::Point::new(x, y)) else { continue };
                    let island = mask.island[grid.index(ix, iy)];
                    if mask.copper[grid.index(ix, iy)] && area.contains(grid.centre(ix, iy)) {
                        islands.insert(island);
                    }
                }
                assert!(islands.len() <= 1, "{plane}: area {index} has islands {islands:?}");
                for island in islands {
                    let before = taken.insert(island, index);
                    assert_eq!(before, None, "{plane}: areas {before:?} and {index} share an island");
                }
            }
        }
    }
}

/// A review of the nets with two pins that lie farthest apart, six at most, over the net of the largest plane.
fn planned(board: &mut Board) -> Plan {
    let reference = largest_plane(board).net;
    let mut spans: Vec<(f64, String)> = Vec::new();
    for (index, net) in board.nets.iter().enumerate() {
        let id = ebbmap::board::NetId(index as u32);
        let pins: Vec<_> = board.pins.iter().filter(|pin| pin.net == Some(id)).collect();
        if let ([a, b], true) = (&pins[..], net.name != reference) {
            spans.push((-a.at.distance(b.at), net.name.clone()));
        }
    }
    spans.sort_by(|a, b| a.0.total_cmp(&b.0).then_with(|| a.1.cmp(&b.1)));
    spans.truncate(6);
    let request = |(_, name): (f64, String)| NetRequest { name, ..NetRequest::default() };
    let review = Review {
        reference_nets: vec![reference],
        nets: spans.into_iter().map(request).collect(),
        bands: vec![band(1e7)],
        ..Review::default()
    };
    apply_review(board, &review);
    build(board, &review)
}

#[test]
fn nets_of_real_boards_are_charted() {
    for set in sets() {
        let Ok((mut board, _)) = read_board(&set) else { continue };
        let plan = planned(&mut board);
        let charts = plan.paths.iter().flat_map(|net| net.charts.iter().map(move |chart| (net, chart)));
        let length = |net: &ebbmap::plan::PathPlan| -> f64 {
            net.track.iter().map(|leg| leg.from.distance(leg.to)).sum()
        };
        let ready: Vec<_> = charts.filter(|(_, chart)| chart.withheld.is_none()).collect();
        eprintln!("{} nets planned, {} charts ready", plan.paths.len(), ready.len());
        plan.messages.iter().for_each(|message| eprintln!("plan: {}", message.text));
        // The longest track that is not withheld, on cells that keep the test short.
        let Some(&(net, planned)) = ready.iter().max_by(|a, b| length(a.0).total_cmp(&length(b.0))) else {
            continue;
        };
        let mut planned = planned.clone();
        planned.cell_m = planned.cell_m.max(0.25e-3);
        let alone = PathPlan { charts: vec![planned.clone()], ..net.clone() };
        let alone = Plan { paths: vec![alone], ..Plan::default() };
        let workshop = Workshop::new(&board, &alone, Model::Sheet);
        let started = std::time::Instant::now();
        let bench = workshop.bench(&alone.paths[0]);
        bench.notes().iter().for_each(|note| eprintln!("{}", note.text));
        let band = &plan.bands[0];
        for charted in chart(&bench, &alone.paths[0], band, band.at_hz[0]).planes {
            match charted {
                Ok(charted) => {
                    let map = &charted.map;
                    let figures = &charted.figures;
                    eprintln!(
                        "{} of {:.1} mm over {}: h {:.3} mm, {} cells of {:.2} mm, {:.1} s; share {:?}, extra path {:?}",
                        net.name,
                        length(net) * 1e3,
                        map.plane,
                        planned.height_m * 1e3,
                        map.grid.len(),
                        map.grid.cell_m * 1e3,
                        started.elapsed().as_secs_f64(),
                        figures.share_3h,
                        figures.extra_path_m.and_then(|path| path.value),
                    );
                    let (nx, ny) = (map.grid.nx, map.grid.ny);
                    let injected: f64 = (0..map.grid.len())
                        .map(|cell| {
                            let (x, y) = (cell % nx, cell / nx);
                            let left = y * (nx + 1) + x;
                            let out = map.jx[left + 1] - map.jx[left] + map.jy[cell + nx] - map.jy[cell];
                            out.norm()
                        })
                        .sum();
                    assert!(ny > 0 && (injected - 2.0).abs() < 1e-6, "1 A in, 1 A out; got {injected}");
                    assert!(figures.contour_levels.windows(2).all(|pair| pair[0] >= pair[1]));
                }
                Err(reason) => eprintln!("withheld: {}", reason.text),
            }
        }
    }
}
