//! Areas, holes and counts of real boards against independent counts, where a folder with boards is at hand: beside
//! the repository or named by `EBBMAP_REAL_BOARDS`. The counts come from the text that lies beside the boards.

use ebbmap::board::{Board, CopperKind, Plating};
use ebbmap::read::read_board;
use std::path::PathBuf;

fn boards() -> Option<PathBuf> {
    let named = std::env::var_os("EBBMAP_REAL_BOARDS").map(PathBuf::from);
    let beside = PathBuf::from(concat!(env!("CARGO_MANIFEST_DIR"), "/../shared/boards"));
    named.or(Some(beside)).filter(|path| path.is_dir())
}

/// The boards with fabrication data that this room reads: name of the folder and what was read.
fn read_all(root: &std::path::Path) -> Vec<(String, Board)> {
    let mut folders: Vec<PathBuf> =
        std::fs::read_dir(root).unwrap().map(|entry| entry.unwrap().path()).collect();
    folders.sort();
    let mut read = Vec::new();
    for folder in folders {
        let name = folder.file_name().unwrap().to_string_lossy().into_owned();
        let archive = std::fs::read_dir(&folder).ok().and_then(|mut entries| {
            entries.find_map(|entry| {
                Some(entry.ok()?.path()).filter(|path| path.extension().is_some_and(|e| e == "zip"))
            })
        });
        let path = if name.starts_with("x2-") { Some(folder) } else { archive };
        if let Some(path) = path {
            let (board, _) = read_board(&path).unwrap_or_else(|messages| panic!("{name}: {messages:#?}"));
            read.push((name, board));
        }
    }
    read
}

/// Areas of all filled regions: square millimetres and holes.
fn regions(board: &Board) -> Vec<(f64, usize)> {
    let objects = board.layers.iter().flat_map(|layer| &layer.objects);
    let shapes = objects.filter_map(|object| match &object.kind {
        CopperKind::Fill { shape } => Some(&shape.0),
        _ => None,
    });
    shapes.flatten().map(|polygon| (polygon.area() * 1e6, polygon.holes.len())).collect()
}

/// The number before `word` in `text`.
fn number_before(text: &str, word: &str) -> Option<f64> {
    let head = text[..text.find(word)?].trim_end();
    let start = head.rfind(|c: char| !(c.is_ascii_digit() || c == '.')).map_or(0, |at| at + 1);
    head[start..].parse().ok()
}

#[test]
fn areas_holes_and_counts_agree_with_independent_ones() {
    let Some(root) = boards() else { return };
    let Ok(counts) = std::fs::read_to_string(root.join("SOURCES.md")) else { return };
    let read = read_all(&root);
    assert!(!read.is_empty(), "no board in {}", root.display());
    let mut n_checked = 0;
    for (name, board) in &read {
        let row = counts.lines().find(|line| line.starts_with(&format!("| {name} |"))).unwrap_or_default();
        let regions = regions(board);
        // `<area> mm2, <n> holes`, as often as it stands there.
        for (at, _) in row.match_indices(" mm2, ") {
            let start = row[..at].rfind(' ').unwrap() + 1;
            let area: f64 = row[start..at].parse().unwrap();
            let holes = number_before(&row[at + 6..], " holes").unwrap() as usize;
            let found = regions.iter().find(|(found, n)| (found - area).abs() < 1e-3 * area && *n == holes);
            assert!(found.is_some(), "{name}: no region of {area} mm2 with {holes} holes");
            n_checked += 1;
        }
        if let Some(nets) = number_before(row, " nets") {
            assert_eq!(board.nets.len(), nets as usize, "{name}");
            n_checked += 1;
        }
        if let Some(layers) = number_before(row, " layers") {
            assert_eq!(board.layers.len(), layers as usize, "{name}");
            n_checked += 1;
        }
        if let Some(ties) = number_before(row, " net ties drawn") {
            assert_eq!(board.ties.len(), ties as usize, "{name}");
            n_checked += 1;
        }
    }
    assert!(n_checked >= 12, "only {n_checked} counts were checked");
}

#[test]
fn every_board_hangs_together() {
    let Some(root) = boards() else { return };
    for (name, board) in read_all(&root) {
        for (index, layer) in board.layers.iter().enumerate() {
            // Copper by net covers what the image covers: sums differ by overlaps of different nets and by the cuts of
            // holes without a barrel only.
            let sum: f64 = layer.areas.iter().map(|area| area.shape.area()).sum();
            let cut: f64 = board.holes.iter().filter(|hole| hole.plating == Plating::NonPlated).fold(
                0.0,
                |sum, hole| {
                    let length: f64 = hole.path.windows(2).map(|ends| ends[0].distance(ends[1])).sum();
                    sum + (length + hole.diameter_m) * hole.diameter_m
                },
            );
            let whole = layer.copper.area();
            assert!(
                sum > whole * (1.0 - 1e-9) - cut && sum < 1.002 * whole,
                "{name} L{}: {sum} against {whole}",
                index + 1
            );
        }
        // A barrel has the net that all of its contacts with a net have.
        let mut n_joined = 0;
        for hole in board.holes.iter().filter(|hole| hole.plating == Plating::Plated) {
            let mut nets: Vec<_> = hole
                .contacts
                .iter()
                .filter_map(|&(layer, area)| board.layers[layer].areas[area].net)
                .collect();
            nets.sort_unstable();
            nets.dedup();
            assert_eq!(hole.net, nets.first().copied().filter(|_| nets.len() == 1), "{name}");
            n_joined += usize::from(hole.net.is_some());
        }
        let with_net = board.pins.iter().filter(|pin| pin.net.is_some()).count();
        assert!(n_joined > 0 && with_net > 0, "{name}: {n_joined} barrels, {with_net} pins with a net");
    }
}
