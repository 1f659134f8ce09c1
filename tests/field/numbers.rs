//! The numbers files: readable as NPZ, the same bytes each time, index complete.

use crate::scene::{Scene, solved_path};
use ebbmap::geom::Point;
use ebbmap::report::numbers::{self, Numbers};
use ebbmap::review::Model;
use std::io::Read;

#[test]
fn a_map_survives_the_file() {
    let scene = Scene { width: 12.0, height: 7.0, track: vec![(1.0, 3.0), (11.0, 3.0)], ..Scene::default() };
    let charted = solved_path(&scene.board(), &scene.plan(), Model::Spread, 1e7);
    let map = &charted.planes[0].as_ref().unwrap().map;
    let bytes = numbers::npz(map).unwrap();
    assert_eq!(bytes, numbers::npz(map).unwrap());
    let mut archive = zip::ZipArchive::new(std::io::Cursor::new(bytes)).unwrap();
    let mut member = |name: &str| {
        let mut bytes = Vec::new();
        archive.by_name(name).unwrap().read_to_end(&mut bytes).unwrap();
        bytes
    };
    // Format: https://numpy.org/doc/stable/reference/generated/numpy.lib.format.html, version 1.0.
    let kx = member("kx.npy");
    let length = u16::from_le_bytes([kx[8], kx[9]]) as usize;
    assert_eq!((&kx[..8], (10 + length) % 64), (&b"\x93NUMPY\x01\x00"[..], 0));
    let header = std::str::from_utf8(&kx[10..10 + length]).unwrap();
    assert!(header.starts_with("{'descr': '<c16', 'fortran_order': False, 'shape': (35, 60), }"), "{header}");
    assert!(header.ends_with('\n'));
    let at = 10 + length + 16 * (15 * 60 + 30);
    let re = f64::from_le_bytes(kx[at..at + 8].try_into().unwrap());
    assert_eq!(re, map.density(30, 15).0.re);
    assert_eq!(member("copper.npy").len() - member("copper.npy").len() / 64 * 64, (35 * 60) % 64);

    let withheld = Numbers::Withheld {
        net: "TIDE_CLK",
        plane: Some((1, "GND")),
        band: "VHF",
        frequency_hz: 1e8,
        reason: "landings apart",
    };
    let entries = [Numbers::Map { stem: "TIDE_CLK--L2-GND--HF", map }, withheld];
    let index: serde_json::Value =
        serde_json::from_str(&numbers::index(&entries, Point::mm(1.0, 2.0))).unwrap();
    assert_eq!(index["schema"], 1);
    assert_eq!(index["time_factor"], "exp(+jwt)");
    let first = &index["maps"][0];
    assert_eq!(first["file"], "TIDE_CLK--L2-GND--HF.npz");
    assert_eq!(first["plane"]["net"], "GND");
    assert_eq!(first["origin_m"][0], -1e-3);
    assert!(first["zs_ohm"].is_null() && first["model"] == "spread");
    assert!(index["maps"][1]["file"].is_null());
    assert_eq!(index["maps"][1]["reason"], "landings apart");
}
