//! `findings.gbr`: a Gerber file with a numbered ring at every finding and the 80 % contours, to lay over the board.
//!
//! Format: Gerber layer format with X2 attributes (Ucamco, specification of 2022 and later); file function `Other`,
//! coordinates those of the board's files, millimetres with six decimals. Every object carries the user attribute
//! `Finding` with the number.

use crate::finding::Finding;
use crate::geom::Point;
use std::fmt::Write as _;

/// Radius of a ring in millimetres.
const RING_MM: f64 = 1.5;
/// Height of a digit in millimetres.
const DIGIT_MM: f64 = 1.2;
/// Pens of rings and digits, and of contours, in millimetres.
const PENS_MM: [f64; 2] = [0.15, 0.05];

/// Closed lines that belong to a finding, in metres.
#[derive(Clone, Debug)]
pub struct Outlined<'a> {
    /// The finding.
    pub finding: &'a Finding,
    /// Lines of the 80 % contour of its map.
    pub lines: &'a [Vec<Point>],
}

/// The file.
pub fn marks(findings: &[Outlined]) -> Vec<u8> {
    let mut text = String::from(
        "%TF.FileFunction,Other,findings of the return-current review*%\n%TF.Part,Other,findings*%\n\
         %FSLAX46Y46*%\n%MOMM*%\n%TA.AperFunction,Other,mark*%\n",
    );
    // Writing to a string cannot fail.
    let _ = writeln!(text, "%ADD10C,{:.6}*%\n%TA.AperFunction,Other,contour*%", PENS_MM[0]);
    let _ = writeln!(text, "%ADD11C,{:.6}*%\n%TD*%\n%LPD*%\nG75*", PENS_MM[1]);
    for Outlined { finding, lines } in findings {
        let _ = writeln!(text, "%TOFinding,{},{}*%", finding.number, finding.code.name);
        text += "D10*\n";
        ring(&mut text, finding.place.at);
        number(&mut text, finding.place.at, &finding.number.to_string());
        if !lines.is_empty() {
            text += "D11*\nG01*\n";
        }
        for line in *lines {
            for (index, &point) in line.iter().enumerate() {
                operation(&mut text, point, if index == 0 { "D02" } else { "D01" });
            }
        }
        text += "%TD*%\n";
    }
    text += "M02*\n";
    text.into_bytes()
}

fn nanometres(metres: f64) -> i64 {
    (metres * 1e9).round() as i64
}

fn operation(text: &mut String, at: Point, code: &str) {
    let _ = writeln!(text, "X{}Y{}{code}*", nanometres(at.x), nanometres(at.y));
}

/// A full circle.
fn ring(text: &mut String, centre: Point) {
    let start = centre + Point::mm(RING_MM, 0.0);
    operation(text, start, "D02");
    text.push_str("G03*\n");
    let (x, y) = (nanometres(start.x), nanometres(start.y));
    let _ = writeln!(text, "X{x}Y{y}I{}J0D01*\nG01*", -nanometres(RING_MM * 1e-3));
}

/// Digits of strokes to the right of the ring.
fn number(text: &mut String, centre: Point, digits: &str) {
    let mut left = centre + Point::mm(RING_MM + 0.4, -0.5 * DIGIT_MM);
    for digit in digits.chars() {
        let (width, strokes) = strokes(digit);
        for stroke in strokes {
            for (index, &(x, y)) in stroke.iter().enumerate() {
                let at = left + Point::mm(x * 0.5 * DIGIT_MM, y * 0.5 * DIGIT_MM);
                operation(text, at, if index == 0 { "D02" } else { "D01" });
            }
        }
        left = left + Point::mm((width + 0.5) * 0.5 * DIGIT_MM, 0.0);
    }
}

/// Width and strokes of a digit, in half heights.
fn strokes(digit: char) -> (f64, &'static [&'static [(f64, f64)]]) {
    match digit {
        '0' => (1.0, &[&[(0.0, 0.0), (1.0, 0.0), (1.0, 2.0), (0.0, 2.0), (0.0, 0.0)]]),
        '1' => (1.0, &[&[(0.2, 1.6), (0.6, 2.0), (0.6, 0.0)]]),
        '2' => (1.0, &[&[(0.0, 2.0), (1.0, 2.0), (1.0, 1.0), (0.0, 1.0), (0.0, 0.0), (1.0, 0.0)]]),
        '3' => (1.0, &[&[(0.0, 2.0), (1.0, 2.0), (1.0, 0.0), (0.0, 0.0)], &[(0.2, 1.0), (1.0, 1.0)]]),
        '4' => (1.0, &[&[(0.0, 2.0), (0.0, 1.0), (1.0, 1.0)], &[(1.0, 2.0), (1.0, 0.0)]]),
        '5' => (1.0, &[&[(1.0, 2.0), (0.0, 2.0), (0.0, 1.0), (1.0, 1.0), (1.0, 0.0), (0.0, 0.0)]]),
        '6' => (1.0, &[&[(1.0, 2.0), (0.0, 2.0), (0.0, 0.0), (1.0, 0.0), (1.0, 1.0), (0.0, 1.0)]]),
        '7' => (1.0, &[&[(0.0, 2.0), (1.0, 2.0), (0.4, 0.0)]]),
        '8' => {
            (1.0, &[&[(0.0, 0.0), (1.0, 0.0), (1.0, 2.0), (0.0, 2.0), (0.0, 0.0)], &[(0.0, 1.0), (1.0, 1.0)]])
        }
        '9' => (1.0, &[&[(1.0, 1.0), (0.0, 1.0), (0.0, 2.0), (1.0, 2.0), (1.0, 0.0), (0.0, 0.0)]]),
        _ => (0.2, &[&[(0.0, 0.0), (0.2, 0.0), (0.2, 0.2), (0.0, 0.2), (0.0, 0.0)]]),
    }
}
