//! What was understood of a board, as text for people and as JSON for scripts.
//!
//! Coordinates and lengths are in millimetres as in the files, thicknesses of the stackup in metres.

use super::layer::{PLANE_M2, PLANE_PART};
use crate::board::{Board, CopperKind, CopperLayer, LayerRole, ObjectFunction, Origin, Plating, TieKind};
use crate::diag::Diagnostic;
use crate::geom::Polygon;
use serde::Serialize;
use std::collections::BTreeMap;
use std::fmt::Write as _;

/// Version of the document.
const SCHEMA: u32 = 1;
/// Nets listed in the text; the JSON has all.
const NETS_SHOWN: usize = 24;

/// What was understood of a board.
#[derive(Clone, Debug, Serialize)]
pub struct Look {
    schema: u32,
    title: String,
    revision: String,
    outline: OutlineEntry,
    layers: Vec<LayerEntry>,
    stackup: Vec<SheetEntry>,
    holes: HolesEntry,
    nets: Vec<NetEntry>,
    parts: Vec<PartEntry>,
    ties: Vec<TieEntry>,
    warnings: Vec<WarningEntry>,
}

#[derive(Clone, Debug, Serialize)]
struct OutlineEntry {
    min_mm: [f64; 2],
    max_mm: [f64; 2],
    area_mm2: f64,
    cutouts: usize,
}

#[derive(Clone, Debug, Serialize)]
struct LayerEntry {
    name: String,
    index: usize,
    role: &'static str,
    copper_area_mm2: f64,
    largest_region: Option<RegionEntry>,
    planes: Vec<PlaneEntry>,
    objects: ObjectsEntry,
}

#[derive(Clone, Debug, Serialize)]
struct RegionEntry {
    area_mm2: f64,
    holes: usize,
}

#[derive(Clone, Debug, Serialize)]
struct PlaneEntry {
    net: Option<String>,
    area_mm2: f64,
    islands: usize,
    holes: usize,
}

/// Numbers of image objects by geometry.
#[derive(Clone, Debug, Default, Serialize)]
struct ObjectsEntry {
    draws: usize,
    flashes: usize,
    regions: usize,
    clear: usize,
}

#[derive(Clone, Debug, Serialize)]
struct SheetEntry {
    kind: &'static str,
    name: String,
    thickness_m: f64,
    permittivity: Option<f64>,
    source: &'static str,
    permittivity_source: Option<&'static str>,
}

#[derive(Clone, Debug, Default, Serialize)]
struct HolesEntry {
    plated: usize,
    vias: usize,
    non_plated: usize,
    slots: usize,
}

#[derive(Clone, Debug, Serialize)]
struct NetEntry {
    name: String,
    pins: Vec<String>,
    track_length_mm: f64,
}

#[derive(Clone, Debug, Serialize)]
struct PartEntry {
    reference: String,
    value: Option<String>,
}

#[derive(Clone, Debug, Serialize)]
struct TieEntry {
    part: String,
    kind: &'static str,
    nets: Vec<String>,
    layer: String,
    x_mm: f64,
    y_mm: f64,
    area_mm2: f64,
}

#[derive(Clone, Debug, Serialize)]
struct WarningEntry {
    severity: &'static str,
    code: &'static str,
    text: String,
    file: Option<String>,
    line: Option<u32>,
    layer: Option<String>,
    x_mm: Option<f64>,
    y_mm: Option<f64>,
}

/// Metres to millimetres, on whole picometres, so that sums in metres do not show as long decimals.
fn mm(metres: f64) -> f64 {
    (metres * 1e12).round() * 1e-9 + 0.0
}

/// Square metres to square millimetres, six decimals.
fn mm2(square_metres: f64) -> f64 {
    (square_metres * 1e12).round() / 1e6
}

/// `L1` for index 0.
fn layer_name(index: usize) -> String {
    format!("L{}", index + 1)
}

fn origin_name(origin: Origin) -> &'static str {
    match origin {
        Origin::File => "file",
        Origin::Review => "review",
        Origin::Assumed => "assumed",
    }
}

impl Look {
    /// Describes `board` and the messages of its reading.
    pub fn new(board: &Board, messages: &[Diagnostic]) -> Self {
        let bounds = board.outline.bounds();
        let outline = OutlineEntry {
            min_mm: [mm(bounds.min.x), mm(bounds.min.y)],
            max_mm: [mm(bounds.max.x), mm(bounds.max.y)],
            area_mm2: mm2(board.outline.area()),
            cutouts: board.outline.0.iter().map(|polygon| polygon.holes.len()).sum(),
        };
        let least_m2 = PLANE_M2.min(PLANE_PART * board.outline.area());
        let layers =
            board.layers.iter().enumerate().map(|(index, layer)| layer_entry(board, index, layer, least_m2));
        Self {
            schema: SCHEMA,
            title: board.title.clone(),
            revision: board.revision.clone(),
            outline,
            layers: layers.collect(),
            stackup: stackup_entries(board),
            holes: holes_entry(board),
            nets: net_entries(board),
            parts: board
                .parts
                .iter()
                .map(|part| PartEntry { reference: part.reference.clone(), value: part.value.clone() })
                .collect(),
            ties: tie_entries(board),
            warnings: messages.iter().map(warning_entry).collect(),
        }
    }

    /// The account as text, line by line. Messages are not part of it.
    pub fn text(&self) -> String {
        let mut out = String::new();
        // Writing to a string cannot fail.
        let _ = self.write_text(&mut out);
        out
    }

    fn write_text(&self, out: &mut String) -> std::fmt::Result {
        let title = if self.title.is_empty() { "(no title)" } else { &self.title };
        let revision =
            if self.revision.is_empty() { String::new() } else { format!(", revision {}", self.revision) };
        writeln!(out, "Board    {title}{revision}")?;
        let ([x0, y0], [x1, y1]) = (self.outline.min_mm, self.outline.max_mm);
        let cutouts = counted(self.outline.cutouts, "cut-out", "cut-outs");
        writeln!(
            out,
            "Outline  {:.3} x {:.3} mm, from ({x0:.3}, {y0:.3}) to ({x1:.3}, {y1:.3}) mm, {:.3} mm2, {cutouts}",
            x1 - x0,
            y1 - y0,
            self.outline.area_mm2
        )?;
        let holes = &self.holes;
        writeln!(
            out,
            "Holes    {} plated ({}), {} not plated; {}",
            holes.plated,
            counted(holes.vias, "via", "vias"),
            holes.non_plated,
            counted(holes.slots, "slot among them", "slots among them")
        )?;
        let n_pins: usize = self.nets.iter().map(|net| net.pins.len()).sum();
        writeln!(
            out,
            "Nets     {} with {}; {}; {}",
            self.nets.len(),
            counted(n_pins, "pin", "pins"),
            counted(self.parts.len(), "part", "parts"),
            counted(self.ties.len(), "tie", "ties")
        )?;
        writeln!(
            out,
            "\nLayers   copper before drilling; planes are connected pieces of 25 mm2 or 1 % of the board and more"
        )?;
        for layer in &self.layers {
            writeln!(out, "  {:<4}{:<8}{:>12.3} mm2", layer.name, layer.role, layer.copper_area_mm2)?;
            for plane in &layer.planes {
                writeln!(
                    out,
                    "      plane {:<20} {:>12.3} mm2  {}, {}",
                    plane.net.as_deref().unwrap_or("(no net)"),
                    plane.area_mm2,
                    counted(plane.islands, "island", "islands"),
                    counted(plane.holes, "hole", "holes")
                )?;
            }
        }
        writeln!(out, "\nStackup  from the top")?;
        for sheet in &self.stackup {
            write!(
                out,
                "  {:<8}{:<12}{:>10.1} um  {}",
                sheet.name,
                sheet.kind,
                sheet.thickness_m * 1e6,
                sheet.source
            )?;
            match (sheet.permittivity, sheet.permittivity_source) {
                (Some(value), Some(source)) => writeln!(out, "; permittivity {value}, {source}")?,
                _ => writeln!(out)?,
            }
        }
        if !self.ties.is_empty() {
            writeln!(out, "\nTies     nets joined by copper on purpose; they stay separate nets")?;
            for tie in &self.ties {
                let part = if tie.part.is_empty() { "(no part)" } else { &tie.part };
                writeln!(
                    out,
                    "  {part:<10}{:<4} ({:.3}, {:.3}) mm  {}: {}",
                    tie.layer,
                    tie.x_mm,
                    tie.y_mm,
                    tie.kind.replace('-', " "),
                    tie.nets.join(" - ")
                )?;
            }
        }
        writeln!(out, "\nNets     by length of track, fill and outline strokes left out")?;
        let mut longest: Vec<&NetEntry> = self.nets.iter().filter(|net| net.track_length_mm > 0.0).collect();
        longest.sort_by(|a, b| b.track_length_mm.total_cmp(&a.track_length_mm).then(a.name.cmp(&b.name)));
        for net in longest.iter().take(NETS_SHOWN) {
            let mut pins = net.pins.iter().take(6).cloned().collect::<Vec<_>>().join(" ");
            if net.pins.len() > 6 {
                let _ = write!(pins, " and {} more", net.pins.len() - 6);
            }
            writeln!(out, "  {:<28}{:>10.3} mm  {pins}", net.name, net.track_length_mm)?;
        }
        if self.nets.len() > longest.len().min(NETS_SHOWN) {
            let more = self.nets.len() - longest.len().min(NETS_SHOWN);
            writeln!(out, "  ... and {more} more; `--json` lists all")?;
        }
        Ok(())
    }
}

/// `1 hole`, `2 holes`.
fn counted(n: usize, one: &str, many: &str) -> String {
    format!("{n} {}", if n == 1 { one } else { many })
}

fn layer_entry(board: &Board, index: usize, layer: &CopperLayer, least_m2: f64) -> LayerEntry {
    let mut objects = ObjectsEntry::default();
    let mut largest: Option<&Polygon> = None;
    for object in &layer.objects {
        objects.clear += usize::from(!object.dark);
        match &object.kind {
            CopperKind::Draw { .. } => objects.draws += 1,
            CopperKind::Flash { .. } => objects.flashes += 1,
            CopperKind::Fill { shape } => {
                objects.regions += 1;
                for polygon in shape.0.iter().filter(|_| object.dark) {
                    if largest.is_none_or(|least| polygon.area() > least.area()) {
                        largest = Some(polygon);
                    }
                }
            }
        }
    }
    let mut planes: BTreeMap<_, PlaneEntry> = BTreeMap::new();
    for area in &layer.areas {
        let area_m2 = area.shape.area();
        if area_m2 >= least_m2 {
            let plane = planes.entry(area.net).or_insert_with(|| PlaneEntry {
                net: area.net.map(|net| board.net_name(net).to_owned()),
                area_mm2: 0.0,
                islands: 0,
                holes: 0,
            });
            plane.area_mm2 += area_m2 * 1e6;
            plane.islands += 1;
            plane.holes += area.shape.holes.len();
        }
    }
    let mut planes: Vec<PlaneEntry> = planes.into_values().collect();
    for plane in &mut planes {
        plane.area_mm2 = mm2(plane.area_mm2 * 1e-6);
    }
    planes.sort_by(|a, b| b.area_mm2.total_cmp(&a.area_mm2).then_with(|| a.net.cmp(&b.net)));
    LayerEntry {
        name: layer_name(index),
        index: index + 1,
        role: match layer.role {
            LayerRole::Top => "top",
            LayerRole::Inner => "inner",
            LayerRole::Bottom => "bottom",
        },
        copper_area_mm2: mm2(layer.copper.area()),
        largest_region: largest.map(|p| RegionEntry { area_mm2: mm2(p.area()), holes: p.holes.len() }),
        planes,
        objects,
    }
}

fn stackup_entries(board: &Board) -> Vec<SheetEntry> {
    let thickness = |metres: f64| (metres * 1e12).round() / 1e12;
    let mut entries = Vec::new();
    for (index, foil) in board.stackup.foils.iter().enumerate() {
        entries.push(SheetEntry {
            kind: "copper",
            name: layer_name(index),
            thickness_m: thickness(foil.thickness_m),
            permittivity: None,
            source: origin_name(foil.origin),
            permittivity_source: None,
        });
        if let Some(sheet) = board.stackup.dielectrics.get(index) {
            entries.push(SheetEntry {
                kind: "dielectric",
                name: format!("{}-{}", layer_name(index), layer_name(index + 1)),
                thickness_m: thickness(sheet.thickness_m),
                permittivity: Some(sheet.permittivity),
                source: origin_name(sheet.origin),
                permittivity_source: Some(origin_name(sheet.permittivity_origin)),
            });
        }
    }
    entries
}

fn holes_entry(board: &Board) -> HolesEntry {
    let mut entry = HolesEntry::default();
    for hole in &board.holes {
        match hole.plating {
            Plating::Plated => entry.plated += 1,
            Plating::NonPlated => entry.non_plated += 1,
        }
        entry.vias += usize::from(hole.via);
        entry.slots += usize::from(hole.path.len() > 1);
    }
    entry
}

fn net_entries(board: &Board) -> Vec<NetEntry> {
    let mut entries: Vec<NetEntry> = board
        .nets
        .iter()
        .map(|net| NetEntry { name: net.name.clone(), pins: Vec::new(), track_length_mm: 0.0 })
        .collect();
    for pin in &board.pins {
        if let Some(net) = pin.net {
            entries[net.0 as usize].pins.push(pin.label());
        }
    }
    for object in board.layers.iter().flat_map(|layer| &layer.objects) {
        if let (Some(net), CopperKind::Draw { path, .. }) = (object.net, &object.kind)
            && object.function == ObjectFunction::Track
        {
            let length: f64 = path.windows(2).map(|ends| ends[0].distance(ends[1])).sum();
            entries[net.0 as usize].track_length_mm += length * 1e3;
        }
    }
    for entry in &mut entries {
        entry.track_length_mm = mm(entry.track_length_mm * 1e-3);
    }
    entries
}

fn tie_entries(board: &Board) -> Vec<TieEntry> {
    let entry = |tie: &crate::board::Tie| TieEntry {
        part: tie.part.clone(),
        kind: match tie.kind {
            TieKind::EtchedCopper => "etched-copper",
            TieKind::AbuttingPads => "abutting-pads",
        },
        nets: tie.nets.iter().map(|&net| board.net_name(net).to_owned()).collect(),
        layer: layer_name(tie.layer),
        x_mm: mm(tie.at.x),
        y_mm: mm(tie.at.y),
        area_mm2: mm2(tie.shape.area()),
    };
    board.ties.iter().map(entry).collect()
}

fn warning_entry(message: &Diagnostic) -> WarningEntry {
    WarningEntry {
        severity: message.severity.name(),
        code: message.code.name,
        text: message.text.clone(),
        file: message.place.file.clone(),
        line: message.place.line,
        layer: message.place.layer.map(|layer| format!("L{layer}")),
        x_mm: message.place.at.map(|at| mm(at.x)),
        y_mm: message.place.at.map(|at| mm(at.y)),
    }
}
