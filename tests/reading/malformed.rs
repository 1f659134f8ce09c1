//! Every malformed case is an error, or a stated leniency, with its line.

use crate::support::{board, copper, data, has, rectangle, refused};
use ebbmap::diag::code::read as code;
use ebbmap::diag::{Code, Diagnostic, Severity};

/// The first error must have this code and line.
#[track_caller]
fn assert_error(messages: &[Diagnostic], code: Code, line: u32, what: &str) {
    let first = messages.iter().find(|message| message.severity == Severity::Error);
    let found = first.map(|message| (message.code, message.place.line));
    assert_eq!(found, Some((code, Some(line))), "{what}: {messages:#?}");
}

/// Line of the body that [`copper`] is given.
const BODY: u32 = 9;

#[test]
fn wrong_commands_are_errors_with_their_line() {
    let cases = [
        "G*",
        "G99*",
        "D*",
        "D99*",
        "D05*",
        "M99*",
        "Q1*",
        "d10*",
        "XYD01*",
        "X1.5Y0D02*",
        "X12A4Y0D02*",
        "X--1D02*",
        "X99999999999D02*",
        "D10*X0Y0D03",
        "X0Y0D01*",
        "X0Y0D03*",
        "G37*",
        "G91*",
        "%T%",
        "%*G*%",
        "%LPX*%",
        "%XX*%",
        "%ADD9C,1*%",
        "%ADD12C*%",
        "%ADD12C,-1*%",
        "%ADD12C,NaN*%",
        "%ADD12C,1e3*%",
        "%ADD12Q,1*%",
        "%ADD12P,1X2*%",
        "%AM*1,1,1,0,0*%",
        "%AMX*9,1*%",
        "%AMX*1,1*%",
        "%AMX*$1=(*%",
        "%IPNEG*%",
        "%MIA1B0*%",
        "%OFA1B0*%",
        "%SFA2B1*%",
        "%IR90*%",
        "%LS0*%",
        "%LRx*%",
        "%LMQ*%",
        "%SRX0Y1I1J1*%",
        "%SRXAY1*%",
        "%AB*%",
        "%ABD9*%",
        "%FSLIX46Y46*%",
        "%FSAX46Y46*%",
        "%FSLAX24Y24*%",
        "%MOIN*%",
        "%MOXX*%",
        "D10*X0Y0D02*G02X1000000Y0I3000000J0D01*",
        "G36*G36*",
        "G36*X0Y0D03*",
        "\u{3a9}*",
        "G0\u{3a9}*",
        "%\u{3a9}*%",
        "X\u{3a9}D01*",
        "%AMX*4,1,3,0,0*%%ADD12X*%",
        "%AMX*1,1,1/0,0,0*%%ADD12X*%",
        "%ADD12NOSUCH*%",
    ];
    for case in cases {
        let messages = refused(&[("copper-1.gbr", &copper(1, &format!("{case}\n%TO.N,GND*%")))]);
        assert_error(&messages, code::GERBER_SYNTAX, BODY, case);
    }
}

#[test]
fn single_quadrant_arcs_that_fit_no_centre_are_errors() {
    let case = "G74*D10*X0Y0D02*\nG03X1000000Y0I2240000J0D01*";
    let messages = refused(&[("copper-1.gbr", &copper(1, case))]);
    assert_error(&messages, code::GERBER_SYNTAX, BODY + 1, case);
}

#[test]
fn missing_headers_and_ends_are_errors() {
    let whole = copper(1, &rectangle("GND", 0, 0, 10, 10));
    let no_format = whole.replace("%FSLAX46Y46*%\n", "");
    assert_error(&refused(&[("a.gbr", &no_format)]), code::GERBER_SYNTAX, BODY + 1, "format");
    let no_unit = whole.replace("%MOMM*%\n", "");
    assert_error(&refused(&[("a.gbr", &no_unit)]), code::GERBER_SYNTAX, 5, "unit");
    let cut = &whole[..whole.find("M02").unwrap()];
    assert_error(&refused(&[("a.gbr", cut)]), code::GERBER_CUT_OFF, 17, "end");
    let open_region = whole.replace("G37*\n", "");
    assert_error(&refused(&[("a.gbr", &open_region)]), code::GERBER_SYNTAX, 10, "region");
    let open_percent = whole.replace("%TD*%", "%TD*");
    assert_error(&refused(&[("a.gbr", &open_percent)]), code::GERBER_SYNTAX, 17, "percent");
    let arc_without_mode = whole.replace("G75*\n", "").replace("G37*", "G02X5000000Y0I1000000J0D01*\nG37*");
    assert_error(&refused(&[("a.gbr", &arc_without_mode)]), code::GERBER_SYNTAX, 15, "mode");
    let no_layer = whole.replace("Copper,L1,Top", "Copper,Top");
    assert!(has(&refused(&[("a.gbr", &no_layer)]), code::SET_FUNCTION));
}

#[test]
fn lenient_cases_are_told() {
    let open = rectangle("GND", 0, 0, 10, 10).replace("X0Y0D01*\nG37", "G37");
    let (read, messages) = board(&[("a.gbr", &copper(1, &open))]);
    assert!((read.layers[0].copper.area() * 1e6 - 100.0).abs() < 1e-9);
    assert!(messages.iter().any(|m| m.code == code::GERBER_CONTOUR && m.place.line == Some(BODY + 1)));
    for (extra, code, line) in [
        ("%TO.P,U1*%", code::GERBER_ATTRIBUTE, BODY),
        ("G04 no star", code::GERBER_SYNTAX, BODY),
        ("M02*\nX0Y0D03*", code::GERBER_SYNTAX, BODY + 10),
    ] {
        let body = rectangle("GND", 0, 0, 10, 10);
        let body =
            if extra.starts_with("M02") { format!("{body}{extra}") } else { format!("{extra}\n{body}") };
        let (_, messages) = board(&[("a.gbr", &copper(1, &body))]);
        let found = messages.iter().find(|m| m.code == code).map(|m| (m.severity, m.place.line));
        assert_eq!(found, Some((Severity::Warning, Some(line))), "{extra}: {messages:?}");
    }
}

#[test]
fn latin_text_and_lone_carriage_returns_are_read() {
    let text = data("polarity.gbr").replace('\n', "\r");
    let folder = tempfile::TempDir::new().unwrap();
    let mut bytes = text.into_bytes();
    bytes.splice(4..4, *b"25 \xb5m ");
    std::fs::write(folder.path().join("copper-1.gbr"), bytes).unwrap();
    let (board, _) = ebbmap::read::read_board(folder.path()).unwrap();
    assert_eq!(board.layers[0].objects[2].line, 28);
}

#[test]
fn wrong_drill_lines_are_errors_with_their_line() {
    let whole = copper(1, &rectangle("GND", 0, 0, 10, 10));
    let drill = |body: &str| format!("M48\nMETRIC\nT1C0.3\n%\n{body}\nM30\n");
    let cases = [
        "X1.0Y1.0",
        "T9",
        "T1\u{3a9}",
        "X",
        "X1e3",
        "G91",
        "M25",
        "R3X1.0",
        "T1C99",
        "T1C-1",
        "T1CX",
        "G85",
        "%%",
        "hello",
        "INCH",
        "METRIC,XX",
        "FMAT,1",
        "T",
        "X12345Y1",
        "X1.0.0",
        "X99999.0",
    ];
    for case in cases {
        let messages = refused(&[("a.gbr", &whole), ("a.drl", &drill(case))]);
        assert_error(&messages, code::DRILL_SYNTAX, 5, case);
    }
    for case in ["T1\nX1.0Y1.0\nG03X2.0Y1.0A0.1", "T1\nR99999X1", "T1\nX1.0Y1.0\nR2Z1.0", "T1\nX1.0Y1.0\nX12"]
    {
        let messages = refused(&[("a.gbr", &whole), ("a.drl", &drill(case))]);
        let line = 4 + case.lines().count() as u32;
        // The arc needs rout mode to be an arc at all.
        assert_error(&messages, code::DRILL_SYNTAX, line, case);
    }
    let cut = "M48\nMETRIC\nT1C0.3\n%\nT1\nX1.0Y1.0\n";
    assert_error(&refused(&[("a.gbr", &whole), ("a.drl", cut)]), code::DRILL_CUT_OFF, 6, "end");
}
