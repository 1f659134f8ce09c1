//! Reads drill and rout files (Excellon and XNC) to holes and slots.
//!
//! Sources: the XNC format specification (revision 2021.11) for the commands in use today; zero rules and default
//! formats of older files as is common practice.

mod interpret;
mod number;

pub use interpret::read_drill;

use super::gerber::FileTags;
use crate::board::Plating;
use crate::geom::Point;

/// A hole or slot as a drill file gives it.
#[derive(Clone, Debug, PartialEq)]
pub struct DrillHole {
    /// Centre, or the centre line of a slot.
    pub path: Vec<Point>,
    /// Tool diameter in metres.
    pub diameter_m: f64,
    /// Plating where the file says it for the tool or the hole.
    pub plating: Option<Plating>,
    /// Whether it is a via, where the file says so.
    pub via: Option<bool>,
    /// Line in the file, from 1.
    pub line: u32,
}

/// A drill file as read.
#[derive(Clone, Debug, Default)]
pub struct DrillFile {
    /// Its file attributes.
    pub file: FileTags,
    /// Its holes in order.
    pub holes: Vec<DrillHole>,
}

/// Whether a text looks like a drill file.
pub fn is_drill(text: &str) -> bool {
    let significant = text.lines().map(str::trim).find(|line| !line.is_empty() && !line.starts_with(';'));
    let Some(line) = significant else { return false };
    let tool = line.strip_prefix('T').is_some_and(|rest| {
        let after = rest.trim_start_matches(|c: char| c.is_ascii_digit());
        after.len() < rest.len() && (after.is_empty() || after.starts_with('C'))
    });
    !line.contains('*') && (line == "M48" || line == "M71" || line == "M72" || tool)
}

/// Plating and use of a tool from its function attribute, for example `Plated,PTH,ViaDrill`.
pub fn tool_function(function: &str) -> (Option<Plating>, Option<bool>) {
    let has = |name: &str| function.split(',').any(|field| field == name);
    let plating = if has("Plated") {
        Some(Plating::Plated)
    } else if has("NonPlated") {
        Some(Plating::NonPlated)
    } else {
        None
    };
    let via = if has("ViaDrill") {
        Some(true)
    } else if ["ComponentDrill", "MechanicalDrill", "CastellatedDrill", "Slot", "CutOut", "Cavity"]
        .iter()
        .any(|n| has(n))
    {
        Some(false)
    } else {
        None
    };
    (plating, via)
}
