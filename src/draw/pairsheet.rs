//! The sheet of a pair map: two nets on one plane, the key of the colors, each net alone, what they share in figures.

use super::contour::level_lines;
use super::frame::{caution, rulers, scale_bar, title_strip};
use super::map::{HALO, MapData, MapLook, draw_map, landing_shape, pin_shape, placed};
use super::pair::{self, LINES};
use super::panel::heading;
use super::path::PathData;
use super::scale::DensityScale;
use super::scene::{Group, Scene, Shape};
use super::text::{Text, marked_width, shortened, wrapped};
use super::view::View;
use crate::geom::{Bounds, Point};
use crate::style::{Face, Style};

/// A net of the pair.
#[derive(Clone, Debug)]
pub struct PairNet {
    /// Its name.
    pub name: String,
    /// Its map.
    pub map: MapData,
}

/// A figure under the map: value, and two lines of what it is.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PairFigure {
    /// Value with unit.
    pub value: String,
    /// What it is and which way is good.
    pub lines: [String; 2],
}

/// Everything on the sheet.
#[derive(Clone, Debug)]
pub struct PairSheet {
    /// The result in one line.
    pub headline: String,
    /// What is drawn.
    pub lead: String,
    /// The aggressor.
    pub a: PairNet,
    /// The victim.
    pub b: PairNet,
    /// Part of the board that is drawn.
    pub window: Bounds,
    /// Point that the rulers count from.
    pub origin: Point,
    /// Scale of the set.
    pub scale: DensityScale,
    /// Figures, at most four.
    pub figures: Vec<PairFigure>,
    /// Units and symbols in plain words, two lines at most.
    pub words: String,
    /// Fields of the title strip.
    pub fields: Vec<(&'static str, String)>,
    /// Caution.
    pub caution: String,
    /// Title of the file.
    pub title: String,
    /// The result in sentences.
    pub description: String,
    /// Picture number.
    pub number: String,
    /// Machine-readable facts.
    pub facts: Vec<(String, String)>,
}

const MAP_X: f64 = 17.0;
const MAP_Y: f64 = 28.5;
const SIDE: f64 = 64.5;

/// The scene of a pair map. Type is at most of the normal size: the sheet holds three maps.
pub fn scene(sheet: &PairSheet, style: &Style) -> Scene {
    let style = &Style { font: style.font.at_most(1.0), ..style.clone() };
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
    let mut head = Group::new("headline");
    let wanted = marked_width(Face::Bold, style.font.headline, &sheet.headline);
    let size = (style.font.headline * ((right - margin) / wanted).min(1.0)).max(0.7 * style.font.headline);
    head.text(Text::new(margin, 14.6, size, Face::Bold, style.color.ink, &sheet.headline));
    head.text(Text::new(margin, 21.2, style.font.lead, Face::Regular, style.color.ink_soft, &sheet.lead));
    scene.group(head);
    let caution_y = style.ticket.height - 5.4;
    let strip = caution_y - 16.2;
    let words_y = strip - 7.4;
    let room = (right - SIDE - 9.0 - MAP_X, words_y - MAP_Y - 38.0);
    let view = View::fitted(sheet.window, MAP_X, MAP_Y, room.0, room.1);
    scene.group(map(sheet, &view, style));
    scene.group(rulers(&view, sheet.origin, style));
    scene.group(figures(sheet, (MAP_X, MAP_Y + view.height() + 8.0, room.0), style));
    let legend_y = MAP_Y + view.height() + 32.0;
    scene.group(lines_legend(sheet, (MAP_X, legend_y), style));
    scene.group(scale_bar(&view, MAP_X + room.0, legend_y - 1.1, style));
    scene.group(side(sheet, right - SIDE, words_y - 4.0, style));
    let mut words = Group::new("words").labeled("group", "in plain words");
    let rows = wrapped(Face::Narrow, style.font.tick, &sheet.words, right - margin);
    for (row, line) in rows.iter().take(2).enumerate() {
        let y = words_y + 4.0 * row as f64;
        words.text(Text::new(margin, y, style.font.tick, Face::Narrow, style.color.ink_soft, line));
    }
    scene.group(words);
    scene.group(title_strip(margin, strip, right - margin, &sheet.fields, style));
    let lines = wrapped(Face::Narrow, style.font.tick, &sheet.caution, right - margin - 6.0).len();
    let first = caution_y - if lines > 1 { 1.4 } else { 0.0 };
    scene.group(caution(margin, first, right - margin, &sheet.caution, style));
    scene
}

fn map(sheet: &PairSheet, view: &View, style: &Style) -> Group {
    let (a, b) = (&sheet.a.map.density, &sheet.b.map.density);
    let label = format!("shared copper of {} and {}", sheet.a.name, sheet.b.name);
    let mut group = Group::new("map").labeled("graphics-object", label.clone());
    let look = MapLook { style, scale: sheet.scale, px_per_mm: 1.0, small: true, room_right: 0.0 };
    group.group(pair::heat((a, b), view, &sheet.scale, style, &label));
    let mut lines = Group::new("product-lines").clipped(view.x, view.y, view.width(), view.height());
    let nx = (2.0 * view.width()) as usize;
    let ny = (2.0 * view.height()) as usize;
    let rasters = (a.raster(view, nx, ny, &sheet.scale), b.raster(view, nx, ny, &sheet.scale));
    let product = pair::product((&rasters.0, &rasters.1));
    for (rank, density) in LINES.iter().enumerate() {
        let level = sheet.scale.level_db(*density);
        let found = level_lines((nx, ny, &product), view, level, |at| a.is_copper(view.back(at)));
        pair::line(&mut lines, &found, rank, style);
    }
    group.group(lines);
    // Voids, edges and zones as on every map, then the two tracks in the inks of their nets.
    group.group(super::map::cover(&sheet.a.map, view, &look));
    let mut names = Group::new("nets");
    let mut placer = super::map::placer(&sheet.a.map, view, &look);
    let mut pins = Group::new("pins");
    for (first, net) in [(true, &sheet.a), (false, &sheet.b)] {
        let ink = pair::ink(style, first);
        let mut path = PathData::coarse();
        let mut longest = (0.0, (view.x, view.y));
        for leg in net.map.track.iter().filter(|leg| leg.charted) {
            let (from, to) = (view.place(leg.from), view.place(leg.to));
            path.line(&[from, to]);
            placer.add_line(&[from, to], 1.0, 6.0);
            let length = libm::hypot(to.0 - from.0, to.1 - from.1);
            if length > longest.0 {
                longest = (length, (0.5 * (from.0 + to.0), 0.5 * (from.1 + to.1)));
            }
        }
        let case = style.line.track_case;
        pins.shape(Shape::stroked(path.clone(), style.color.page, case + HALO).rounded());
        pins.shape(Shape::stroked(path.clone(), style.color.track_case, case).rounded());
        pins.shape(Shape::stroked(path, ink, style.line.track).rounded());
        let own = Style { color: crate::style::Colors { track: ink, ..style.color }, ..style.clone() };
        for &at in net.map.landings.iter().filter(|&&at| view.window.contains(at)) {
            landing_shape(view.place(at), &own, super::map::LANDING).into_iter().for_each(|s| pins.shape(s));
        }
        for (pin, filled) in [(&net.map.driver, true), (&net.map.receiver, false)] {
            let Some(pin) = pin.as_ref().filter(|pin| view.window.contains(pin.at)) else { continue };
            pin_shape(view.place(pin.at), filled, &own, super::map::PIN)
                .into_iter()
                .for_each(|s| pins.shape(s));
            let name = shortened(Face::Narrow, style.font.label, &pin.name, 24.0);
            let text = Text::new(0.0, 0.0, style.font.label, Face::Narrow, style.color.ink, &name);
            if let Some((rect, _)) = placer.label(view.place(pin.at), text.width(), 0.95 * style.font.label) {
                names.text(placed(text, rect, style));
            }
        }
        let name = shortened(Face::NarrowBold, style.font.label, &net.name, 40.0);
        let text = Text::new(0.0, 0.0, style.font.label, Face::NarrowBold, ink, &name);
        if let Some((rect, _)) = placer.label(longest.1, text.width(), 0.95 * style.font.label) {
            names.text(placed(text, rect, style));
        }
    }
    group.group(Group {
        items: pins.items,
        ..Group::new("tracks").clipped(view.x - 2.0, view.y - 2.0, view.width() + 4.0, view.height() + 4.0)
    });
    group.group(names);
    group
}

/// Figures side by side: value over two lines.
fn figures(sheet: &PairSheet, (x, y, width): (f64, f64, f64), style: &Style) -> Group {
    let mut group = Group::new("key-figures").labeled("group", "key figures");
    let pitch = width / sheet.figures.len().clamp(1, 4) as f64;
    for (index, figure) in sheet.figures.iter().take(4).enumerate() {
        let left = x + pitch * index as f64;
        let size = 1.2 * style.font.value;
        let value = shortened(Face::Bold, size, &figure.value, pitch - 3.0);
        group.text(Text::new(left, y + 6.0, size, Face::Bold, style.color.ink, &value));
        for (row, line) in figure.lines.iter().enumerate() {
            let line = shortened(Face::Narrow, style.font.label, line, pitch - 2.0);
            let base = y + 11.0 + 4.4 * row as f64;
            group.text(Text::new(left, base, style.font.label, Face::Narrow, style.color.ink_soft, &line));
        }
    }
    group
}

/// What the lines of the map are.
fn lines_legend(sheet: &PairSheet, (x, y): (f64, f64), style: &Style) -> Group {
    let mut group = Group::new("legend").labeled("group", "legend");
    let size = style.font.tick;
    let mut left = x;
    for (rank, density) in LINES.iter().enumerate() {
        if sheet.scale.level_db(*density) > style.pair.range_db[1] {
            continue;
        }
        pair::line(&mut group, &[vec![(left, y - 0.35 * size), (left + 8.0, y - 0.35 * size)]], rank, style);
        let words = super::number::coordinate(*density);
        group.text(Text::new(left + 9.4, y, size, Face::Narrow, style.color.ink, &words));
        left += 12.0 + marked_width(Face::Narrow, size, &words);
    }
    let words = "A/m per A: root of the product of both densities";
    group.text(Text::new(left, y, size, Face::Narrow, style.color.ink, words));
    group
}

/// Key of the colors, then each net alone.
fn side(sheet: &PairSheet, x: f64, bottom: f64, style: &Style) -> Group {
    let mut group = Group::new("side");
    heading(&mut group, (x, MAP_Y, SIDE), "How to read the colors", style);
    let names = (sheet.a.name.as_str(), sheet.b.name.as_str());
    group.group(pair::key((x, MAP_Y + 7.0, SIDE, 30.0), names, &sheet.scale, style));
    let note = "Up: both, A/m per A; the farther from the page's color, the more is shared.";
    for (row, line) in wrapped(Face::Narrow, style.font.tick, note, SIDE).iter().take(2).enumerate() {
        let y = MAP_Y + 50.0 + 4.0 * row as f64;
        group.text(Text::new(x, y, style.font.tick, Face::Narrow, style.color.ink_soft, line));
    }
    let top = MAP_Y + 58.0;
    let each = 0.5 * (bottom - top);
    for (index, net) in [&sheet.a, &sheet.b].into_iter().enumerate() {
        let y = top + each * index as f64;
        let name = shortened(Face::Bold, style.font.body, &net.name, SIDE - 12.0);
        heading(&mut group, (x, y, SIDE), &format!("{name} alone"), style);
        let mut view = View::filling(sheet.window, x, y + 6.4, SIDE, (each - 9.0).max(12.0));
        view = View { x, ..view };
        let look = MapLook { style, scale: sheet.scale, px_per_mm: 4.0, small: true, room_right: 0.0 };
        group.group(draw_map(&net.map, &view, &look, &format!("{} alone", net.name)).group);
    }
    group
}
