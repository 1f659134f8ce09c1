//! The pictures of a run as one PDF: contact sheets first, then the maps that were drawn.

use super::chart::PathDone;
use crate::diag::Diagnostic;
use crate::diag::code::run as code;
use crate::draw::pdf::{PdfPage, document};
use crate::report::Picture;
use std::path::Path;

/// The document; the maps are read back from `folder`, where this run wrote them. Empty where no picture was drawn.
pub fn review_pdf(
    folder: Option<&Path>,
    title: &str,
    sheets: &[Picture],
    done: &[PathDone],
) -> Result<Vec<u8>, Diagnostic> {
    let (Some(folder), false) = (folder, sheets.is_empty()) else { return Ok(Vec::new()) };
    let mut maps: Vec<(&str, String)> = Vec::new();
    for stem in done.iter().flat_map(PathDone::drawn) {
        let path = folder.join(format!("maps/{stem}.svg"));
        let text = std::fs::read_to_string(&path).map_err(|error| {
            Diagnostic::error(code::CANNOT_WRITE, format!("cannot read back `{}`: {error}", path.display()))
        })?;
        maps.push((stem, text));
    }
    let names: Vec<String> = (1..=sheets.len()).map(|index| format!("Contact sheet {index}")).collect();
    let first = names.iter().zip(sheets).map(|(title, sheet)| PdfPage { title, svg: &sheet.svg });
    let pages: Vec<PdfPage> = first.chain(maps.iter().map(|(title, svg)| PdfPage { title, svg })).collect();
    document(title, &pages).map_err(|fault| Diagnostic::error(code::CANNOT_RENDER, fault.0))
}
