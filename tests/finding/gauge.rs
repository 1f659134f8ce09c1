//! The planted faults of the tide gauge are found with their cause at their place, and the clean revision is clean.
//! Coarse cells (0.4 mm, twice the height); minutes of work, so `cargo test --release --test finding -- --ignored`.

use ebbmap::draw::ScaleChoice;
use ebbmap::run::{Order, Outcome, Unwatched, draw};
use serde_json::Value;
use std::path::Path;

fn run(review: &str, only: &[&str]) -> (Outcome, Vec<Value>) {
    let review = Path::new(env!("CARGO_MANIFEST_DIR")).join("samples/tide-gauge").join(review);
    let out = tempfile::tempdir().unwrap();
    let only: Vec<String> = only.iter().map(|name| (*name).to_owned()).collect();
    let order = Order {
        review: &review,
        out: Some(out.path()),
        pictures: false,
        only: &only,
        cell_m: Some(0.4e-3),
        numbers: false,
        jobs: 0,
        style: "paper",
        scale: ScaleChoice::OfStyle,
    };
    let outcome = draw(&order, &Unwatched).unwrap();
    println!("{}", outcome.listing);
    let text = std::fs::read(out.path().join("findings.json")).unwrap();
    let document: Value = serde_json::from_slice(&text).unwrap();
    (outcome, document["findings"].as_array().unwrap().clone())
}

/// Distance in mm from the place of a finding to a straight stretch.
fn away_mm(finding: &Value, from: (f64, f64), to: (f64, f64)) -> f64 {
    let at = |key: &str| finding["place"][key].as_f64().unwrap();
    let (x, y) = (at("x_mm") - from.0, at("y_mm") - from.1);
    let (dx, dy) = (to.0 - from.0, to.1 - from.1);
    let square = dx * dx + dy * dy;
    let part = if square > 0.0 { ((x * dx + y * dy) / square).clamp(0.0, 1.0) } else { 0.0 };
    (x - part * dx).hypot(y - part * dy)
}

/// A fault: path, code, kind of cause, stretch on which it lies.
type Fault<'a> = (&'a str, &'a str, &'a str, (f64, f64), (f64, f64));

/// The planted faults as FAULTS.md lists them.
const FAULTS: &[Fault] = &[
    ("MEM_SCK", "return-detour", "void", (67.2, 63.5), (67.2, 63.5)),
    ("RTC_SCL", "return-detour", "void", (76.0, 46.46), (76.0, 51.54)),
    ("RTC_INT", "return-detour", "void", (76.0, 46.46), (76.0, 51.54)),
    ("BUS_TX", "return-via", "layer-change", (69.6, 55.3), (69.6, 55.3)),
    ("SYNC", "plane-edge", "edge", (73.0, 79.1), (90.6, 79.1)),
    ("ADC_SCK", "return-detour", "void", (38.0, 49.0), (38.0, 55.0)),
];

#[test]
#[ignore = "some minutes"]
fn planted_faults_are_found_at_their_places() {
    let (outcome, findings) = run("review.toml", &[]);
    assert!(outcome.exceeded);
    for &(path, code, cause, from, to) in FAULTS {
        let found =
            findings.iter().find(|f| f["path"] == path && f["code"] == code && f["severity"] != "note");
        let Some(found) = found else { panic!("{path}: no `{code}`") };
        assert_eq!(found["cause"]["kind"], cause, "{path}");
        let away = away_mm(found, from, to);
        assert!(away < 1.0, "{path}: {away} mm off");
    }
}

#[test]
#[ignore = "some minutes"]
fn the_clean_revision_has_notes_alone() {
    let (outcome, findings) = run("review-clean.toml", &[]);
    assert!(!outcome.exceeded);
    for finding in &findings {
        assert_eq!(finding["severity"], "note", "{finding}");
    }
}
