//! Reviews: what a full one means, and that a bad one is told everything at once, at the right places.

use ebbmap::diag::{Diagnostic, Ink, Severity, render};
use ebbmap::geom::Point;
use ebbmap::read::{ReviewFile, parse_review};
use ebbmap::review::{LandingRequest, Model};
use std::path::Path;

fn read(name: &str) -> ReviewFile {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/review").join(name);
    ebbmap::read::read_review(&path)
}

fn parse(text: &str) -> ReviewFile {
    parse_review(text, "review.toml", Path::new("boards/tide"))
}

#[test]
fn every_key_arrives_in_si_units() {
    let file = read("full.toml");
    assert_eq!(file.messages, []);
    let review = file.review.unwrap();
    assert!(review.files.ends_with("tests/data/review/fab"), "{:?}", review.files);
    assert_eq!((review.title.as_str(), review.revision.as_str()), ("Saltmarsh tide gauge", "A"));
    assert_eq!(review.origin, Point::new(0.01, -0.02));
    assert_eq!(review.stackup.copper_m, [Some(35e-6), None, Some(17.5e-6), Some(35e-6)]);
    let dielectric: Vec<f64> = review.stackup.dielectric_m.iter().map(|value| value.unwrap()).collect();
    let want = [203.2e-6, 1e-3, 2e-4];
    assert!(dielectric.iter().zip(want).all(|(got, want)| (got - want).abs() < 1e-18), "{dielectric:?}");
    assert_eq!(review.stackup.permittivity, [Some(4.2), None, Some(4.0)]);
    assert_eq!(review.stackup.temperature_c, Some(45.0));
    assert_eq!(review.reference_nets, ["GND", "AGND"]);
    let net = &review.nets[0];
    assert_eq!(net.driver.as_deref(), Some("U5.19"));
    assert_eq!(net.plane.as_deref(), Some("L2-GND"));
    assert_eq!(net.driver_landing, Some(LandingRequest::Pin("U5.20".into())));
    let LandingRequest::At(at) = net.receiver_landing.clone().unwrap() else { panic!("a point was given") };
    assert!(at.distance(Point::mm(13.0, -16.0)) < 1e-12, "{at:?}");
    assert_eq!((review.nets[1].name.as_str(), review.nets[1].line), ("LEVEL_*", 21));
    let zone = &review.zones[0].outline;
    assert!(ebbmap::geom::polygon::ring_area(zone) > 0.0, "outlines run counter-clockwise");
    assert!(zone.iter().any(|corner| corner.distance(Point::mm(50.0, 60.0)) < 1e-12), "{zone:?}");
    let names: Vec<&str> = review.bands.iter().map(|band| band.name.as_str()).collect();
    assert_eq!(names, ["HF", "switching", "DC"]);
    assert_eq!((review.bands[1].at_hz.as_slice(), review.bands[1].explicit), ([1e6, 2e6].as_slice(), true));
    assert_eq!(review.bands[2].at_hz, [0.0]);
    assert_eq!((review.solver.model, review.solver.cell_m), (Model::Spread, Some(1e-4)));
}

#[test]
fn without_bands_four_are_charted() {
    let text =
        "schema = 1\nboard.files = 'fab.zip'\nreference.nets = ['GND']\nnet = [{ name = 'TIDE_SCK' }]\n";
    let review = parse(text).review.unwrap();
    assert_eq!(review.bands.iter().map(|b| b.name.as_str()).collect::<Vec<_>>(), ["LF", "MF", "HF", "VHF"]);
    assert_eq!(review.files, Path::new("boards/tide/fab.zip"));
    assert_eq!(review.solver.model, Model::Sheet);
}

/// Line, column and code of each message.
fn places(file: &ReviewFile) -> Vec<(u32, usize, &'static str)> {
    let place = |message: &Diagnostic| {
        let span = message.place.span.clone().unwrap();
        let start = file.text[..span.start].rfind('\n').map_or(0, |at| at + 1);
        (message.place.line.unwrap(), span.start - start + 1, message.code.name)
    };
    file.messages.iter().map(place).collect()
}

#[test]
fn all_faults_of_a_review_are_listed_at_their_places() {
    let file = read("faults.toml");
    assert!(file.review.is_none());
    assert!(file.messages.iter().all(|message| message.severity == Severity::Error));
    let want = [
        (1, 10, "review-bad-value"),
        (2, 1, "review-unknown-key"),
        (3, 2, "review-missing-key"),
        (4, 1, "review-unknown-key"),
        (5, 10, "review-bad-value"),
        (7, 11, "review-bad-value"),
        (7, 17, "review-bad-value"),
        (7, 24, "review-wrong-type"),
        (8, 17, "review-bad-value"),
        (8, 22, "review-wrong-type"),
        (10, 16, "review-duplicate"),
        (13, 10, "review-bad-value"),
        (14, 9, "review-bad-value"),
        (16, 8, "review-duplicate"),
        (17, 1, "review-missing-key"),
        (21, 11, "review-bad-value"),
        (23, 8, "review-bad-value"),
        (25, 8, "review-bad-value"),
        (28, 8, "review-bad-value"),
        (33, 7, "review-bad-value"),
        (33, 17, "review-bad-value"),
        (35, 9, "review-bad-value"),
        (36, 8, "review-bad-value"),
    ];
    assert_eq!(places(&file), want);
    let hints: Vec<&str> = file.messages.iter().flat_map(|m| &m.hints).map(String::as_str).collect();
    assert!(hints.contains(&"did you mean `files`?"), "{hints:?}");
    let text = render(&file.messages[3], Some(&file.text), Ink::Plain);
    assert!(text.contains("faults.toml:4:1") && text.contains("fils = \"fab\""), "{text}");
}

#[test]
fn broken_syntax_is_shown_with_what_else_is_wrong() {
    let file = parse("schema = 1\n[board]\nfiles = \"fab\nbord = 1\n[solver]\ncel = \"1mm\"\n[reference\n");
    assert!(file.review.is_none());
    let codes: Vec<&str> = file.messages.iter().map(|message| message.code.name).collect();
    assert!(
        codes.contains(&"review-syntax") && codes.contains(&"review-unknown-key"),
        "{:#?}",
        file.messages
    );
}

#[test]
fn an_unreadable_review_is_named() {
    let file = ebbmap::read::read_review(Path::new("no/such/review.toml"));
    assert_eq!(file.messages[0].code.name, "review-unreadable");
    assert!(file.messages[0].text.contains("no/such/review.toml"));
}
