//! `findings.csv`: one line for each finding, for a spreadsheet.
//!
//! Format: RFC 4180, lines end with CR LF, the first line names the columns; numbers with a point, SI units but for
//! coordinates, which are in millimetres from the review's origin.

use super::finding::millimetres;
use crate::finding::Finding;
use crate::geom::Point;

/// Names of the columns.
pub const COLUMNS: [&str; 22] = [
    "number",
    "severity",
    "code",
    "path",
    "plane",
    "band",
    "frequency_hz",
    "layer",
    "x_mm",
    "y_mm",
    "figure",
    "unit",
    "value",
    "error",
    "limit",
    "text",
    "cause",
    "cause_name",
    "remedy",
    "remedy_gain",
    "waived_reason",
    "waived_until",
];

/// The file; places count from `origin`.
pub fn csv(findings: &[&Finding], origin: Point) -> Vec<u8> {
    let mut text = COLUMNS.join(",");
    text += "\r\n";
    for finding in findings {
        let (x_mm, y_mm) = millimetres(finding.place.at, origin);
        let number = |value: Option<f64>| value.map(|value| format!("{value:?}")).unwrap_or_default();
        let words = |value: Option<&str>| value.unwrap_or_default().to_owned();
        let plane = finding.plane.as_ref().map(ToString::to_string);
        let cells = [
            finding.number.to_string(),
            finding.grade.name().to_owned(),
            finding.code.name.to_owned(),
            finding.path.clone(),
            plane.unwrap_or_default(),
            words(finding.band.as_deref()),
            number(finding.frequency_hz),
            format!("L{}", finding.place.layer + 1),
            number(Some(x_mm)),
            number(Some(y_mm)),
            finding.excess.what.name().to_owned(),
            finding.excess.what.unit().to_owned(),
            number(Some(finding.excess.value)),
            number(Some(finding.excess.error)),
            number(finding.excess.limit),
            finding.sentence.clone(),
            finding.cause.kind().to_owned(),
            words(finding.cause.name()),
            words(finding.remedy.as_ref().map(|remedy| remedy.action.as_str())),
            number(finding.remedy.as_ref().map(crate::finding::Remedy::gain)),
            words(finding.waived.as_ref().map(|waived| waived.reason.as_str())),
            words(finding.waived.as_ref().map(|waived| waived.expires.as_str())),
        ];
        text += &cells.map(|cell| quoted(&cell)).join(",");
        text += "\r\n";
    }
    text.into_bytes()
}

/// A field in quotes where it needs them. A text that a spreadsheet would take for a formula gets a quote mark first.
fn quoted(cell: &str) -> String {
    let formula = cell.starts_with(['=', '+', '-', '@']) && cell.parse::<f64>().is_err();
    let cell = if formula { format!("'{cell}") } else { cell.to_owned() };
    if cell.contains([',', '"', '\r', '\n']) { format!("\"{}\"", cell.replace('"', "\"\"")) } else { cell }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn fields_are_quoted_as_the_format_asks() {
        assert_eq!(quoted("a,b"), "\"a,b\"");
        assert_eq!(quoted("say \"no\""), "\"say \"\"no\"\"\"");
        assert_eq!(quoted("-3.5"), "-3.5");
        assert_eq!(quoted("=SUM(A1)"), "'=SUM(A1)");
        assert_eq!(quoted("+3V3"), "'+3V3");
    }
}
