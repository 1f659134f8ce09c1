//! Reads a fabrication set into a board: the one entry point of this room for board files.

use super::copper::{CopperFile, build};
use super::drill::{DrillFile, DrillHole, read_drill, tool_function};
use super::gerber::{Image, read_image};
use super::holes::{DrillSet, add_holes};
use super::log::Log;
use super::outline::outline;
use super::set::{Selection, file_attribute, select};
use super::source::{Source, open_set};
use super::stackup::stackup;
use super::ties::find_ties;
use crate::board::{Board, CopperKind, Plating};
use crate::diag::code::read as code;
use crate::diag::{Diagnostic, Severity};
use crate::geom::{Bounds, Polygon, Region};
use rayon::prelude::*;
use std::collections::BTreeMap;
use std::path::Path;

/// Reads the folder or ZIP archive at `path`.
///
/// All files are read to their end. Gives the board with warnings and notes, or all messages when at least one of them
/// is an error: nothing of a set with errors is used.
pub fn read_board(path: &Path) -> Result<(Board, Vec<Diagnostic>), Vec<Diagnostic>> {
    let mut messages = Vec::new();
    let sources = open_set(path, &mut messages);
    let selection = if has_error(&messages) { Selection::default() } else { select(sources, &mut messages) };
    if has_error(&messages) && selection.copper.is_empty() {
        return Err(messages);
    }
    read_selection(selection, messages)
}

fn has_error(messages: &[Diagnostic]) -> bool {
    messages.iter().any(|message| message.severity == Severity::Error)
}

fn image(source: &Source) -> (Image, Log) {
    let mut log = Log::new(source.name.clone());
    let image = read_image(&source.text, &mut log);
    (image, log)
}

fn read_selection(
    selection: Selection,
    mut messages: Vec<Diagnostic>,
) -> Result<(Board, Vec<Diagnostic>), Vec<Diagnostic>> {
    let copper: Vec<(Image, Log)> = selection.copper.par_iter().map(|(_, source)| image(source)).collect();
    let mut files = Vec::new();
    for ((image, mut log), (_, source)) in copper.into_iter().zip(&selection.copper) {
        if file_attribute(&source.text, "FilePolarity")
            .is_some_and(|fields| fields.first() == Some(&"Negative"))
        {
            let text = "a copper layer in negative polarity is not supported: export it as a positive";
            log.error(0, code::GERBER_NEGATIVE, text);
        }
        messages.extend(log.finish());
        files.push(CopperFile { file: source.name.clone(), image });
    }
    let mut board = Board::default();
    if let Some(source) = &selection.profile {
        let (image, mut log) = image(source);
        board.outline = outline(&image.objects, &mut log);
        messages.extend(log.finish());
    }
    let drills: Vec<DrillSet> =
        selection.drills.iter().map(|(source, is_gerber)| drill(source, *is_gerber, &mut messages)).collect();
    let values = part_values(&selection.components, &mut messages);
    if has_error(&messages) {
        return Err(messages);
    }
    let set = build(files, &values, &mut messages);
    (board.layers, board.nets, board.pins, board.parts) = (set.layers, set.nets, set.pins, set.parts);
    if board.nets.is_empty() {
        let text = "the copper must say its nets (`TO.N` attributes); got none";
        let hint = "export Gerber X2 with net attributes: a return current is that of a net";
        messages.push(Diagnostic::error(code::SET_NETS, text).hint(hint));
        return Err(messages);
    }
    if let Some((job, _)) = &selection.job {
        (board.title, board.revision) = (job.title.clone(), job.revision.clone());
    }
    board.stackup = stackup(board.layers.len(), selection.job.as_ref(), &mut messages);
    if board.outline.0.is_empty() {
        board.outline = outline_of_copper(&board, selection.profile.as_ref(), &mut messages);
    }
    if drills.is_empty() {
        let text = "the set has no drill file: layers are not joined by any hole";
        messages.push(Diagnostic::warning(code::DRILL_MISSING, text));
    }
    add_holes(&mut board, &drills, &mut messages);
    board.ties = find_ties(&board, &mut messages);
    if has_error(&messages) { Err(messages) } else { Ok((board, messages)) }
}

/// The box round all copper, where no profile closes.
fn outline_of_copper(board: &Board, profile: Option<&Source>, messages: &mut Vec<Diagnostic>) -> Region {
    let bounds = board.layers.iter().fold(Bounds::EMPTY, |all, layer| all.union(layer.copper.bounds()));
    let why = if profile.is_some() { "the profile has no closed line" } else { "the set has no profile" };
    let text = format!("{why}; the board is taken to be the box round its copper");
    let mut message = Diagnostic::warning(code::OUTLINE_MISSING, text);
    message.place.file = profile.map(|source| source.name.clone());
    messages.push(message);
    if bounds.is_empty() {
        return Region::default();
    }
    let corner = |x, y| crate::geom::Point::new(x, y);
    let (min, max) = (bounds.min, bounds.max);
    let outer = vec![corner(min.x, min.y), corner(max.x, min.y), corner(max.x, max.y), corner(min.x, max.y)];
    Region(vec![Polygon { outer, holes: Vec::new() }])
}

/// Values of parts from component layers.
fn part_values(sources: &[Source], messages: &mut Vec<Diagnostic>) -> BTreeMap<String, String> {
    let mut values = BTreeMap::new();
    for source in sources {
        let (image, log) = image(source);
        // A component layer adds only values: what is wrong in it must not stop the board.
        if log.has_error() {
            let text = "the component layer cannot be read without errors; part values are left out";
            let mut message = Diagnostic::warning(code::FILE_IGNORED, text);
            message.place.file = Some(source.name.clone());
            messages.push(message);
            continue;
        }
        for object in image.objects {
            if let (Some(part), Some(value)) = (&object.tags.part, &object.tags.value) {
                values.entry(part.clone()).or_insert_with(|| value.clone());
            }
        }
    }
    values
}

fn drill(source: &Source, is_gerber: bool, messages: &mut Vec<Diagnostic>) -> DrillSet {
    let mut log = Log::new(source.name.clone());
    let file = if is_gerber {
        gerber_drill(read_image(&source.text, &mut log), &mut log)
    } else {
        read_drill(&source.text, &mut log)
    };
    messages.extend(log.finish());
    let function = file.file.get("FileFunction").map(|(fields, _)| fields.as_slice()).unwrap_or_default();
    let plating = match function.first().map(String::as_str) {
        Some("Plated") => Some(Plating::Plated),
        Some("NonPlated") => Some(Plating::NonPlated),
        _ => None,
    };
    let layer = |index: usize| function.get(index)?.parse::<usize>().ok()?.checked_sub(1);
    let span = layer(1).zip(layer(2));
    DrillSet { file: source.name.clone(), plating, span, holes: file.holes }
}

/// Holes of a drill file in Gerber format: flashes are holes, draws are slots.
fn gerber_drill(image: Image, log: &mut Log) -> DrillFile {
    let mut holes = Vec::new();
    for object in image.objects.into_iter().filter(|object| object.dark) {
        let (plating, via) = object.function.as_deref().map_or((None, None), tool_function);
        let line = object.line;
        match object.kind {
            CopperKind::Draw { path, width_m } if width_m > 0.0 => {
                holes.push(DrillHole { path, diameter_m: width_m, plating, via, line });
            }
            CopperKind::Flash { at, shape } => {
                let bounds = shape.bounds();
                let diameter_m = bounds.width().min(bounds.height());
                if diameter_m > 0.0 {
                    // An oblong flash is a slot along its longer side.
                    let reach = (crate::geom::Point::new(bounds.width(), bounds.height())
                        + crate::geom::Point::new(-diameter_m, -diameter_m))
                        * 0.5;
                    let path = if reach.length() > 1e-9 { vec![at - reach, at + reach] } else { vec![at] };
                    holes.push(DrillHole { path, diameter_m, plating, via, line });
                }
            }
            CopperKind::Draw { .. } => {}
            CopperKind::Fill { .. } => {
                log.warning(
                    line,
                    code::DRILL_SYNTAX,
                    "a region in a drill file is not a hole; it is left out",
                );
            }
        }
    }
    DrillFile { file: image.file, holes }
}
