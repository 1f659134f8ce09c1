//! The page of one copper layer as understood: its copper with what is said of it, on one A4 page.

use super::copper::{CopperData, CopperUse, copper_colors, draw_copper, tie_shape};
use super::frame::{caution, rulers, scale_bar, title_strip};
use super::map::{LANDING, PIN, landing_shape, pin_shape};
use super::panel::{Panel, width as panel_width};
use super::path::PathData;
use super::scene::{Group, Scene, Shape};
use super::text::{Text, marked_width, wrapped};
use super::view::View;
use crate::geom::{Bounds, Point};
use crate::style::{Face, Style};

/// Everything on the page of a layer.
#[derive(Clone, Debug)]
pub struct LayerSheet {
    /// What the layer is, in one line; may carry marks.
    pub headline: String,
    /// What is drawn.
    pub lead: String,
    /// The copper.
    pub copper: CopperData,
    /// Part of the board that is drawn.
    pub window: Bounds,
    /// Point that the rulers count from.
    pub origin: Point,
    /// Facts beside the picture.
    pub panels: Vec<Panel>,
    /// Fields of the title strip.
    pub fields: Vec<(&'static str, String)>,
    /// Caution.
    pub caution: String,
    /// Title of the file.
    pub title: String,
    /// The layer in sentences.
    pub description: String,
    /// Picture number.
    pub number: String,
    /// Machine-readable facts.
    pub facts: Vec<(String, String)>,
}

const MAP_X: f64 = 17.0;
const MAP_Y: f64 = 28.5;
const GAP: f64 = 9.0;
/// Distance of the legend's rows in mm at normal type size.
const ROW: f64 = 4.8;

/// The scene of a layer's page.
pub fn scene(sheet: &LayerSheet, style: &Style) -> Scene {
    let (width, margin) = (style.ticket.width, style.ticket.margin[0]);
    let right = width - margin;
    let mut scene = Scene {
        title: sheet.title.clone(),
        description: sheet.description.clone(),
        caution: sheet.caution.clone(),
        number: sheet.number.clone(),
        facts: sheet.facts.clone(),
        ..Scene::blank((width, style.ticket.height), style.ticket.px, style)
    };
    scene.group(head(sheet, margin, right - margin, style));
    let pitch = style.font.pitch();
    let foot = style.ticket.height - 5.4;
    let strip = foot - 16.2 * pitch;
    let column = right - panel_width(style);
    // Below the map: rulers and scale bar.
    let room = strip - 3.0 - 9.4 * pitch - MAP_Y;
    let view = View::fitted(sheet.window, MAP_X, MAP_Y, column - GAP - MAP_X, room);
    scene.group(draw_copper(&sheet.copper, &view, style, &sheet.title));
    scene.group(rulers(&view, sheet.origin, style));
    scene.group(scale_bar(
        &view,
        MAP_X + view.width().max(60.0),
        MAP_Y + view.height() + 3.2 + 6.2 * pitch,
        style,
    ));
    let (legend, rows) = legend(&entries(&sheet.copper), panel_width(style), style);
    let limit = strip - 4.0 - ROW * pitch * rows as f64;
    let mut y = MAP_Y;
    for panel in &sheet.panels {
        if y + panel.height > limit {
            break;
        }
        scene.group(panel.draw(column, y, style));
        y += panel.height + 4.0;
    }
    scene.group(legend.shifted(column, y + 3.0 * pitch));
    scene.group(title_strip(margin, strip, right - margin, &sheet.fields, style));
    let lines = wrapped(Face::Narrow, style.font.tick, &sheet.caution, right - margin - 6.0).len();
    let first = foot - if lines > 1 { 1.4 * pitch } else { 0.0 };
    scene.group(caution(margin, first, right - margin, &sheet.caution, style));
    scene
}

fn head(sheet: &LayerSheet, x: f64, width: f64, style: &Style) -> Group {
    let mut group = Group::new("headline");
    let wanted = marked_width(Face::Bold, style.font.headline, &sheet.headline);
    let size = (style.font.headline * (width / wanted).min(1.0)).max(0.6 * style.font.headline);
    group.text(Text::new(x, 14.6, size, Face::Bold, style.color.ink, &sheet.headline));
    group.text(Text::new(x, 21.2, style.font.lead, Face::Regular, style.color.ink_soft, &sheet.lead));
    group
}

/// What the legend explains.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Entry {
    Copper(CopperUse),
    Void,
    Plated,
    Bare,
    Landing,
    Driver,
    Receiver,
    Tie,
    Zone,
}

impl Entry {
    fn words(self) -> &'static str {
        match self {
            Self::Copper(CopperUse::Reference) => "reference net",
            Self::Copper(CopperUse::Supply) => "other net with areas (supply)",
            Self::Copper(CopperUse::Charted) => "charted net",
            Self::Copper(CopperUse::Other) => "other net",
            Self::Copper(CopperUse::NoNet) => "copper without net",
            Self::Void => "void of a charted plane",
            Self::Plated => "plated hole",
            Self::Bare => "hole without barrel",
            Self::Landing => "landing of a return",
            Self::Driver => "driver",
            Self::Receiver => "receiver",
            Self::Tie => "tie of nets",
            Self::Zone => "partition boundary",
        }
    }
}

/// The entries of what is really there.
fn entries(data: &CopperData) -> Vec<Entry> {
    let kinds =
        [CopperUse::Reference, CopperUse::Supply, CopperUse::Charted, CopperUse::Other, CopperUse::NoNet];
    let has = |what: &CopperUse| data.copper.iter().any(|(kind, _)| kind == what);
    let mut all: Vec<Entry> = kinds.into_iter().filter(has).map(Entry::Copper).collect();
    let more = [
        (!data.voids.is_empty(), Entry::Void),
        (data.holes.iter().any(|hole| hole.plated), Entry::Plated),
        (data.holes.iter().any(|hole| !hole.plated), Entry::Bare),
        (!data.landings.is_empty(), Entry::Landing),
        (data.pins.iter().any(|pin| pin.1), Entry::Driver),
        (data.pins.iter().any(|pin| !pin.1), Entry::Receiver),
        (!data.ties.is_empty(), Entry::Tie),
        (!data.zones.is_empty(), Entry::Zone),
    ];
    all.extend(more.into_iter().filter(|(shown, _)| *shown).map(|(_, entry)| entry));
    all
}

/// The legend from (0, 0) on, broken into rows of at most `width` mm, and the number of its rows.
fn legend(entries: &[Entry], width: f64, style: &Style) -> (Group, usize) {
    let mut group = Group::new("legend").labeled("group", "legend");
    let size = style.font.tick;
    let (mut x, mut row) = (0.0, 0);
    for &entry in entries {
        let sample = match entry {
            Entry::Copper(_) => 6.5,
            Entry::Zone => 10.0,
            _ => 3.0,
        };
        let wide = sample + 1.2 + marked_width(Face::Narrow, size, entry.words());
        if x > 0.0 && x + wide > width {
            (x, row) = (0.0, row + 1);
        }
        let y = ROW * style.font.pitch() * row as f64;
        sample_of(&mut group, entry, (x, y - 0.35 * size), sample, style);
        group.text(Text::new(x + sample + 1.2, y, size, Face::Narrow, style.color.ink, entry.words()));
        x += wide + 4.0;
    }
    (group, row + 1)
}

fn sample_of(group: &mut Group, entry: Entry, (x, y): (f64, f64), width: f64, style: &Style) {
    let middle = (x + 0.5 * width, y);
    let color = style.color;
    match entry {
        Entry::Copper(what) => {
            let (fill, rim) = copper_colors(what, style);
            let mut area = PathData::new();
            area.rect(x, y - 1.2, width, 2.4);
            let mut shape = Shape::filled(area, fill).outlined(rim, 0.2);
            if what == CopperUse::NoNet {
                shape = shape.dashed(&[0.8, 0.6]);
            }
            group.shape(shape);
            if what == CopperUse::Supply {
                let mut lines = PathData::new();
                for start in [0.2, 1.9, 3.6] {
                    lines.line(&[(x + start, y + 1.2), (x + start + 2.4, y - 1.2)]);
                }
                group.shape(Shape::stroked(lines, rim, 0.13));
            }
        }
        Entry::Void => {
            let mut area = PathData::new();
            area.circle(middle, 1.2);
            group.shape(Shape::filled(area, color.page).outlined(color.mark, 0.35));
        }
        Entry::Plated | Entry::Bare => {
            let mut circle = PathData::new();
            circle.circle(middle, 1.1);
            group.shape(Shape::filled(circle, color.page).outlined(color.ink, 0.18));
            if entry == Entry::Bare {
                let mut cross = PathData::new();
                cross.line(&[(middle.0 - 0.75, y - 0.75), (middle.0 + 0.75, y + 0.75)]);
                cross.line(&[(middle.0 - 0.75, y + 0.75), (middle.0 + 0.75, y - 0.75)]);
                group.shape(Shape::stroked(cross, color.ink, 0.18));
            }
        }
        Entry::Landing => {
            landing_shape(middle, style, LANDING).into_iter().for_each(|shape| group.shape(shape));
        }
        Entry::Driver | Entry::Receiver => {
            let shapes = pin_shape(middle, entry == Entry::Driver, style, PIN);
            shapes.into_iter().for_each(|shape| group.shape(shape));
        }
        Entry::Tie => tie_shape(middle, style).into_iter().for_each(|shape| group.shape(shape)),
        Entry::Zone => {
            let mut line = PathData::new();
            line.line(&[(x, y), (x + width, y)]);
            let line = Shape::stroked(line, color.boundary, style.line.boundary);
            group.shape(line.dashed(&style.line.boundary_dash));
        }
    }
}
