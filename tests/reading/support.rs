//! Sets of small files in temporary folders, and short questions to boards.

use ebbmap::board::{Board, CopperKind, NetId};
use ebbmap::diag::Diagnostic;
use ebbmap::read::read_board;
use std::path::{Path, PathBuf};
use tempfile::TempDir;

/// A file of `tests/data/reading`.
pub fn data(name: &str) -> String {
    let path = data_folder().join(name);
    std::fs::read_to_string(&path).unwrap_or_else(|error| panic!("{}: {error}", path.display()))
}

pub fn data_folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/reading")
}

/// A folder with the given files.
pub fn folder(files: &[(&str, &str)]) -> TempDir {
    let folder = TempDir::new().unwrap();
    for (name, text) in files {
        std::fs::write(folder.path().join(name), text).unwrap();
    }
    folder
}

/// Reads a set that must be usable.
pub fn board(files: &[(&str, &str)]) -> (Board, Vec<Diagnostic>) {
    let folder = folder(files);
    read_board(folder.path()).unwrap_or_else(|messages| panic!("{messages:#?}"))
}

/// Reads one copper file of `tests/data/reading` as a board of one layer.
pub fn layer(name: &str) -> Board {
    board(&[("copper-1.gbr", &data(name))]).0
}

/// The messages of a set that must be refused.
pub fn refused(files: &[(&str, &str)]) -> Vec<Diagnostic> {
    let folder = folder(files);
    match read_board(folder.path()) {
        Ok(_) => panic!("the set must be refused: {files:?}"),
        Err(messages) => messages,
    }
}

/// Area in square millimetres and number of holes of a net's copper on a layer.
pub fn net_area(board: &Board, layer: usize, net: &str) -> (f64, usize) {
    let id: Option<NetId> = Some(board.net(net).unwrap_or_else(|| panic!("no net `{net}`")));
    let areas = board.layers[layer].areas.iter().filter(|area| area.net == id);
    areas.fold((0.0, 0), |sum, area| (sum.0 + area.shape.area() * 1e6, sum.1 + area.shape.holes.len()))
}

/// Length in millimetres of the tracks of a net.
pub fn track_length(board: &Board, net: &str) -> f64 {
    let id = board.net(net);
    let mut length = 0.0;
    for object in board.layers.iter().flat_map(|layer| &layer.objects) {
        if let CopperKind::Draw { path, .. } = &object.kind
            && object.function == ebbmap::board::ObjectFunction::Track
            && object.net == id
        {
            length += path.windows(2).map(|ends| ends[0].distance(ends[1])).sum::<f64>() * 1e3;
        }
    }
    length
}

/// A copper file of layer L`index` with `body` between header and end. Aperture 10 is a circle of 0.2 mm, 11 one of
/// 1 mm.
pub fn copper(index: usize, body: &str) -> String {
    let side = if index == 1 { "Top" } else { "Inr" };
    format!(
        "%TF.FileFunction,Copper,L{index},{side}*%\n%FSLAX46Y46*%\n%MOMM*%\nG75*\nG01*\n%ADD10C,0.2*%\n\
         %ADD11C,1*%\n%LPD*%\n{body}\nM02*\n"
    )
}

/// A filled rectangle of a net.
pub fn rectangle(net: &str, x0: i64, y0: i64, x1: i64, y1: i64) -> String {
    let [x0, y0, x1, y1] = [x0, y0, x1, y1].map(|mm| mm * 1_000_000);
    format!(
        "%TO.N,{net}*%\nG36*\nX{x0}Y{y0}D02*\nX{x1}Y{y0}D01*\nX{x1}Y{y1}D01*\nX{x0}Y{y1}D01*\nX{x0}Y{y0}D01*\nG37*\n%TD*%\n"
    )
}

/// A rectangular profile from the origin.
pub fn profile(width: i64, height: i64) -> String {
    let [width, height] = [width, height].map(|mm| mm * 1_000_000);
    format!(
        "%TF.FileFunction,Profile,NP*%\n%FSLAX46Y46*%\n%MOMM*%\n%ADD10C,0.05*%\nD10*\nG01*\nX0Y0D02*\nX{width}Y0D01*\n\
         X{width}Y{height}D01*\nX0Y{height}D01*\nX0Y0D01*\nM02*\n"
    )
}

/// Whether a message with this code is among `messages`.
pub fn has(messages: &[Diagnostic], code: ebbmap::diag::Code) -> bool {
    messages.iter().any(|message| message.code == code)
}

#[track_caller]
pub fn assert_close(value: f64, expected: f64, tolerance: f64) {
    assert!((value - expected).abs() <= tolerance, "{value} against {expected}, tolerance {tolerance}");
}
