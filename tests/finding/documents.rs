//! The documents of findings: text, spreadsheet and marks, read back.

use ebbmap::board::CopperKind;
use ebbmap::diag::code::finding as code;
use ebbmap::field::PlaneId;
use ebbmap::finding::{Cause, Excess, Finding, Grade, Measured, Number, Remedy, Spot, number};
use ebbmap::geom::Point;
use ebbmap::read::gerber::read_image;
use ebbmap::read::log::Log;
use ebbmap::report::{Outlined, SheetInput, csv, listing, marks, sheet};

/// A failure with a remedy.
pub fn finding(path: &str) -> Finding {
    let place = Spot { at: Point::mm(67.2, 63.5), layer: 1 };
    Finding {
        number: Number { path: 4, of_path: 1 },
        code: code::DETOUR,
        grade: Grade::Fail,
        path: path.into(),
        plane: Some(PlaneId { layer: 1, net: "GND".into() }),
        band: Some("HF".into()),
        frequency_hz: Some(1e7),
        place,
        excess: Excess { what: Measured::ExtraInductance, value: 1.2e-9, error: 1e-10, limit: Some(1e-9) },
        sentence: format!(
            "`{path}` crosses void `L2-void-67.2-63.5`, which adds 1.2 nH to its loop at 10 MHz"
        ),
        cause: Cause::Void("L2-void-67.2-63.5".into()),
        cause_text: "the plane has no copper under the track there".into(),
        remedy: Some(Remedy {
            action: "fill void `L2-void-67.2-63.5` of plane `L2-GND` with its copper".into(),
            place,
            copper: vec![],
            before: 1.2e-9,
            after: 0.1e-9,
            error: 2e-11,
            tried: vec![],
        }),
        waived: None,
    }
}

#[test]
fn findings_are_numbered_by_path_and_weight() {
    let with = |path: usize, grade, value| {
        let mut finding = finding("A");
        finding.number = Number { path, of_path: 0 };
        finding.grade = grade;
        finding.excess.value = value;
        finding
    };
    let mut all = [
        with(2, Grade::Warn, 0.8e-9),
        with(1, Grade::Note, 0.0),
        with(1, Grade::Fail, 2e-9),
        with(1, Grade::Fail, 3e-9),
    ];
    number(&mut all);
    let numbers: Vec<(String, f64)> = all.iter().map(|f| (f.number.to_string(), f.excess.value)).collect();
    let want = [("1.1", 3e-9), ("1.2", 2e-9), ("1.3", 0.0), ("2.1", 0.8e-9)];
    assert_eq!(numbers, want.map(|(number, value)| (number.to_owned(), value)));
}

#[test]
fn marks_are_read_back_as_they_were_meant() {
    let finding = finding("TIDE_SCK");
    let square = [(60.0, 60.0), (70.0, 60.0), (70.0, 65.0), (60.0, 60.0)].map(|(x, y)| Point::mm(x, y));
    let lines = vec![square.to_vec()];
    let text = String::from_utf8(marks(&[Outlined { finding: &finding, lines: &lines }])).unwrap();
    assert!(text.contains("%TF.FileFunction,Other,"), "{text}");
    let mut log = Log::new("findings.gbr");
    let image = read_image(&text, &mut log);
    assert_eq!(log.finish(), [], "{text}");
    let draws: Vec<(&Vec<Point>, f64)> = image
        .objects
        .iter()
        .map(|object| match &object.kind {
            CopperKind::Draw { path, width_m } => (path, *width_m),
            other => panic!("only draws are written; got {other:?}"),
        })
        .collect();
    // a ring of 1.5 mm round the place
    let centre = finding.place.at;
    let ring =
        draws.iter().filter(|(path, _)| path.iter().all(|at| (at.distance(centre) - 1.5e-3).abs() < 2e-6));
    assert!(ring.count() >= 1, "no ring round the finding");
    let contour: Vec<&Point> =
        draws.iter().filter(|(_, width)| *width == 0.05e-3).flat_map(|(path, _)| *path).collect();
    assert!(square.iter().all(|corner| contour.iter().any(|at| at.distance(*corner) < 1e-9)), "{contour:?}");
}

#[test]
fn texts_hold_place_figure_cause_and_remedy() {
    let (one, mut two) = (finding("TIDE_SCK"), finding("LEVEL*IN"));
    two.number.path = 5;
    two.waived = Some(ebbmap::finding::Waived { reason: "known".into(), expires: "C".into() });
    let findings = [&one, &two];
    let input = SheetInput {
        title: "Saltmarsh tide gauge",
        revision: "A",
        origin: Point::mm(60.0, 60.0),
        findings: &findings,
        paths: &["TIDE_SCK", "LEVEL*IN"],
        missing: &[],
        picture: &|_| Some("maps/a (1).svg".into()),
        contact: None,
        noise: &[],
    };
    let text = String::from_utf8(sheet(&input)).unwrap();
    for wanted in [
        "# Return current: Saltmarsh tide gauge",
        "2 paths charted: 1 above the limit, 0 near it, 0 notes, 1 waived.",
        "### 4.1 `TIDE_SCK` crosses void",
        "- Place: x 7.20 mm, y 3.50 mm on L2, band HF at 10 MHz",
        "- Figure: extra loop inductance 1.2 nH, error 100 pH, limit 1 nH",
        "computed gain 1.1 nH of 1.2 nH (91.7 %, error 20 pH)",
        "](maps/a%20%281%29.svg)",
        "## Waived",
        "licensed practitioner",
    ] {
        assert!(text.contains(wanted), "`{wanted}` is missing in\n{text}");
    }
    let plain = listing(&input);
    assert!(plain.starts_with("fail   4.1   [return-detour] `TIDE_SCK`"), "{plain}");
    assert!(plain.contains("waived 5.1"), "{plain}");
    let table = String::from_utf8(csv(&findings, input.origin)).unwrap();
    let rows: Vec<&str> = table.split("\r\n").collect();
    assert_eq!(rows.len(), 4);
    assert!(rows[0].starts_with("number,severity,code,path"));
    assert!(
        rows[1].starts_with(
            "4.1,fail,return-detour,TIDE_SCK,L2-GND,HF,10000000.0,L2,7.2,3.5,extra_inductance,H,1.2e-9,"
        ),
        "{}",
        rows[1]
    );
}
