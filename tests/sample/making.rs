//! What a fabricator asks of a board: clearances, connections, rings round holes, copper off the edge.

use super::{boards, samples};
use ebbmap::board::{Board, Plating};
use ebbmap::geom::locate::{Locator, segment_distance};
use ebbmap::geom::{Point, Ring};
use std::collections::{BTreeMap, BTreeSet};

/// Least distance between copper of different nets in metres, less a rounding of the files and of chords (common
/// practice: 0.15 mm is a standard process).
const CLEARANCE_M: f64 = 0.149e-3;
/// Least ring of copper round a plated hole in metres (common practice).
const RING_M: f64 = 0.1e-3;

fn closed(ring: &Ring) -> Ring {
    ring.iter().chain(ring.first()).copied().collect()
}

/// Pairs of areas of different nets that are too near: layer, names, place in mm.
fn too_near(board: &Board, distance_m: f64) -> Vec<String> {
    let mut found = Vec::new();
    for (layer, copper) in board.layers.iter().enumerate() {
        let locator = Locator::new(copper.areas.iter().map(|area| &area.shape));
        for (index, area) in copper.areas.iter().enumerate() {
            for ring in area.shape.rings() {
                for leg in closed(ring).windows(2) {
                    for other in locator.rims_near(leg, distance_m) {
                        let same =
                            other == index || (area.net.is_some() && area.net == copper.areas[other].net);
                        // Copper without a net ties nets together on purpose.
                        let tie = area.net.is_none() || copper.areas[other].net.is_none();
                        let tie = tie
                            && board
                                .ties
                                .iter()
                                .any(|tie| tie.layer == layer && tie.at.distance(leg[0]) < 1e-3);
                        if !same && !tie {
                            let name =
                                |net: Option<_>| net.map_or("(none)", |net| board.net_name(net)).to_owned();
                            let (x, y) = (leg[0].x * 1e3, leg[0].y * 1e3);
                            let other = name(copper.areas[other].net);
                            found.push(format!(
                                "L{} {} - {other} at {x:.2}, {y:.2}",
                                layer + 1,
                                name(area.net)
                            ));
                        }
                    }
                }
            }
        }
    }
    // One place for each pair is enough.
    found.sort();
    found.dedup_by_key(|text| text.split(" at ").next().map(str::to_owned));
    found
}

#[test]
fn no_two_nets_come_too_near() {
    let mut all = Vec::new();
    for (name, board) in boards() {
        let found = too_near(board, CLEARANCE_M);
        all.extend(found.iter().map(|place| format!("{name} {place}")));
        // The search does find what is nearer than a larger distance.
        assert!(!too_near(board, 0.25e-3).is_empty(), "{name}: the search finds nothing at all");
    }
    assert!(all.is_empty(), "{} places, first {:?}", all.len(), &all[..all.len().min(20)]);
}

#[test]
fn every_net_is_connected() {
    for (name, board) in boards() {
        // Groups of areas, joined by barrels.
        let mut group: BTreeMap<(usize, usize), usize> = BTreeMap::new();
        for (layer, copper) in board.layers.iter().enumerate() {
            for index in 0..copper.areas.len() {
                group.insert((layer, index), group.len());
            }
        }
        for hole in board.holes.iter().filter(|hole| hole.plating == Plating::Plated) {
            for pair in hole.contacts.windows(2) {
                let (a, b) = (group[&pair[0]], group[&pair[1]]);
                group.values_mut().filter(|value| **value == b).for_each(|value| *value = a);
            }
        }
        let mut groups: BTreeMap<u32, BTreeSet<usize>> = BTreeMap::new();
        for (&(layer, index), &value) in &group {
            if let Some(net) = board.layers[layer].areas[index].net {
                groups.entry(net.0).or_default().insert(value);
            }
        }
        let apart: Vec<_> = groups
            .iter()
            .filter(|(_, groups)| groups.len() > 1)
            .map(|(net, groups)| (&board.nets[*net as usize].name, groups.len()))
            .collect();
        assert!(apart.is_empty(), "{name}: nets in several pieces: {apart:?}");
        assert!(groups.len() >= 20);
        // Every pin of a net lies on copper of that net.
        for pin in board.pins.iter().filter(|pin| pin.net.is_some()) {
            let on = board.layers[pin.layer]
                .areas
                .iter()
                .any(|area| area.net == pin.net && area.shape.contains(pin.at));
            // The middle of a pad with a hole is copper too: the reader composes before drilling.
            assert!(on, "{name}: {} is not on copper of its net", pin.label());
        }
    }
}

#[test]
fn plated_holes_have_rings_and_do_not_touch() {
    for (name, board) in boards() {
        for (index, hole) in board.holes.iter().enumerate() {
            let at = hole.centre();
            for other in &board.holes[..index] {
                let wall = at.distance(other.centre()) - 0.5 * (hole.diameter_m + other.diameter_m);
                assert!(wall > 0.25e-3, "{name}: holes {:.3} mm apart at {at:?}", wall * 1e3);
            }
            if hole.plating == Plating::NonPlated {
                continue;
            }
            let net = hole.net;
            assert!(net.is_some() || !hole.via, "{name}: via without net at {at:?}");
            for layer in [0, board.layers.len() - 1] {
                for k in 0..16 {
                    let angle = std::f64::consts::TAU * f64::from(k) / 16.0;
                    let radius_m = 0.5 * hole.diameter_m + RING_M;
                    let rim = at + Point::new(libm::cos(angle), libm::sin(angle)) * radius_m;
                    let areas = &board.layers[layer].areas;
                    let on = areas.iter().any(|area| area.net == net && area.shape.contains(rim));
                    assert!(on, "{name}: ring too narrow on L{} at {at:?}", layer + 1);
                }
            }
        }
    }
}

#[test]
fn copper_stays_off_the_edge_and_off_bare_holes() {
    for (name, board) in boards() {
        let mut edges = Vec::new();
        for ring in board.outline.0.iter().flat_map(|polygon| polygon.rings()) {
            edges.extend(closed(ring).windows(2).map(|ends| (ends[0], ends[1])));
        }
        for (layer, copper) in board.layers.iter().enumerate() {
            let locator = Locator::new(copper.areas.iter().map(|area| &area.shape));
            for edge in &edges {
                assert!(
                    locator.rims_near(&[edge.0, edge.1], 0.199e-3).is_empty(),
                    "{name}: L{} at the edge",
                    layer + 1
                );
            }
            for hole in board.holes.iter().filter(|hole| hole.plating == Plating::NonPlated) {
                let reach = 0.5 * hole.diameter_m + 0.199e-3;
                assert!(
                    locator.rims_near(&[hole.centre()], reach).is_empty(),
                    "{name}: copper at a bare hole"
                );
            }
        }
    }
    // A segment that crosses another has no distance: the measure used above.
    let p = Point::mm;
    assert_eq!(segment_distance((p(0.0, 0.0), p(2.0, 2.0)), (p(0.0, 2.0), p(2.0, 0.0))), 0.0);
}

#[test]
fn parts_do_not_stand_in_each_other() {
    // Outlines of the parts from the legend: a box for each.
    for (name, _) in boards() {
        let folder = samples().join(name).join("fab");
        let file = std::fs::read_dir(folder).unwrap().map(|entry| entry.unwrap().path());
        let file = file.into_iter().find(|path| path.to_string_lossy().ends_with("legend-top.gbr")).unwrap();
        let text = std::fs::read_to_string(file).unwrap();
        let mut boxes: Vec<(String, [f64; 4])> = Vec::new();
        for line in text.lines() {
            if let Some(part) = line.strip_prefix("%TO.C,") {
                boxes
                    .push((part.trim_end_matches("*%").to_owned(), [f64::MAX, f64::MAX, f64::MIN, f64::MIN]));
            }
            let Some((x, rest)) = line.strip_prefix('X').and_then(|rest| rest.split_once('Y')) else {
                continue;
            };
            let y = rest.split('D').next().unwrap();
            let (x, y) = (x.parse::<f64>().unwrap() * 1e-6, y.parse::<f64>().unwrap() * 1e-6);
            let edge = &mut boxes.last_mut().unwrap().1;
            *edge = [edge[0].min(x), edge[1].min(y), edge[2].max(x), edge[3].max(y)];
        }
        assert!(boxes.len() > 10);
        for (index, (a, first)) in boxes.iter().enumerate() {
            for (b, second) in &boxes[..index] {
                let apart = (0..2).any(|k| first[k] >= second[k + 2] || second[k] >= first[k + 2]);
                assert!(apart, "{name}: {a} and {b} overlap: {first:?} {second:?}");
            }
        }
    }
}
