//! The sample boards: what the generator writes is what is committed, and it is a board that could be made.
//!
//! The checks read the committed files with the project's reader; none of them uses what the generator knows.

mod faults;
mod making;

#[allow(dead_code)]
#[path = "../../samples/tide-gauge/generate.rs"]
mod generate;

use ebbmap::board::{Board, CopperKind, NetId, ObjectFunction};
use ebbmap::geom::Point;
use ebbmap::read::read_board;
use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};
use std::sync::LazyLock;

fn samples() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("samples/tide-gauge")
}

fn read(folder: &str) -> Board {
    let path = samples().join(folder).join("fab");
    let (board, messages) = read_board(&path).unwrap_or_else(|messages| panic!("{folder}: {messages:?}"));
    let told: Vec<String> = messages.iter().map(|message| message.text.clone()).collect();
    assert!(told.is_empty(), "{folder} must read without a message; got {told:?}");
    board
}

static SMALL: LazyLock<Board> = LazyLock::new(|| read("small"));
static A: LazyLock<Board> = LazyLock::new(|| read("a"));
static B: LazyLock<Board> = LazyLock::new(|| read("b"));
static CLEAN: LazyLock<Board> = LazyLock::new(|| read("clean"));

/// All boards by folder.
fn boards() -> [(&'static str, &'static Board); 4] {
    [("small", &SMALL), ("a", &A), ("b", &B), ("clean", &CLEAN)]
}

fn net(board: &Board, name: &str) -> NetId {
    board.net(name).unwrap_or_else(|| panic!("no net {name}"))
}

/// Legs of the tracks of a net on a layer, with their width in metres.
fn legs(board: &Board, name: &str, layer: usize) -> Vec<(Point, Point, f64)> {
    let wanted = net(board, name);
    let mut found = Vec::new();
    for object in &board.layers[layer].objects {
        if let CopperKind::Draw { path, width_m } = &object.kind
            && object.net == Some(wanted)
            && object.function == ObjectFunction::Track
        {
            found.extend(path.windows(2).map(|ends| (ends[0], ends[1], *width_m)));
        }
    }
    assert!(!found.is_empty(), "{name} has no track on L{}", layer + 1);
    found
}

#[test]
fn the_committed_files_are_what_the_generator_writes() {
    let written = generate::files();
    let mut expected = BTreeSet::new();
    for (path, text) in &written {
        let file = samples().join(path);
        let committed = fs::read_to_string(&file).unwrap_or_else(|error| panic!("{path}: {error}"));
        assert!(committed == *text, "{path} differs from what the generator writes");
        expected.insert(file);
    }
    for folder in ["small", "a", "b", "clean"] {
        for entry in fs::read_dir(samples().join(folder).join("fab")).unwrap() {
            let path = entry.unwrap().path();
            assert!(expected.contains(&path), "{} is not written by the generator", path.display());
        }
    }
    assert_eq!(expected.len(), 4 * 12);
}

#[test]
fn the_tide_gauge_is_as_large_as_promised() {
    for board in [&*A, &*B, &*CLEAN] {
        let size = board.outline.bounds();
        let near = |value: f64, mm: f64| (value * 1e3 - mm).abs() < 1e-6;
        assert!(near(size.width(), 100.0) && near(size.height(), 80.0));
        assert_eq!(board.layers.len(), 4);
        let vias = board.holes.iter().filter(|hole| hole.via).count();
        assert!(board.parts.len() >= 40 && board.nets.len() >= 70 && vias >= 250);
        let valued = board.parts.iter().filter(|part| part.value.is_some()).count();
        assert_eq!(valued, board.parts.len(), "every part has a value");
    }
    // Flat pins of the supply's clamp: 1.0 x 1.8 mm.
    for board in [&*A, &*B, &*CLEAN] {
        let slots: Vec<_> = board.holes.iter().filter(|hole| hole.path.len() > 1).collect();
        assert_eq!(slots.len(), 2);
        for slot in slots {
            let long_mm = (slot.path[0].distance(slot.path[1]) + slot.diameter_m) * 1e3;
            assert!((long_mm - 1.8).abs() < 1e-6 && (slot.diameter_m - 1.0e-3).abs() < 1e-9);
            assert!(slot.plating == ebbmap::board::Plating::Plated && !slot.via);
            let name = board.net_name(slot.net.expect("a slot has the net of its pin"));
            assert!(["VIN", "GND"].contains(&name), "{name}");
        }
    }
    assert_eq!(A.nets, CLEAN.nets);
    assert_eq!(A.parts, B.parts);
}

#[test]
fn the_set_is_of_moderate_size() {
    let mut bytes = 0;
    let mut open = vec![samples()];
    while let Some(folder) = open.pop() {
        for entry in fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                open.push(path);
            } else {
                bytes += fs::metadata(path).unwrap().len();
            }
        }
    }
    assert!(bytes < 6_000_000, "the samples take {bytes} bytes");
}
