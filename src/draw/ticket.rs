//! The ticket map: one net, one plane, one frequency, on one A4 page that says the result in words.

use super::frame::{
    LegendEntry, caution, color_scale, legend, rulers, scale_bar, scale_bar_width, title_strip,
};
use super::joint::{self, JointForm, JointMark};
use super::map::{MapData, MapLook, draw_map};
use super::panel::{Panel, width as panel_width};
use super::scale::DensityScale;
use super::scene::{Group, Scene};
use super::text::{Text, italic, marked_width, wrapped};
use super::view::View;
use crate::geom::{Bounds, Point};
use crate::style::{Face, Style};

/// Everything on a ticket map, in words and data.
#[derive(Clone, Debug)]
pub struct TicketSheet {
    /// The result in one line; may carry marks.
    pub headline: String,
    /// What is drawn; may carry marks.
    pub lead: String,
    /// The map.
    pub map: MapData,
    /// Part of the board that is drawn.
    pub window: Bounds,
    /// Point that the rulers count from.
    pub origin: Point,
    /// Scale of the set.
    pub scale: DensityScale,
    /// Units and symbols explained in plain words, two lines at most; may carry marks.
    pub words: String,
    /// Panels in reading order.
    pub panels: Vec<Panel>,
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
    /// Address of the contact sheet, relative to this picture.
    pub index: Option<String>,
}

const MAP_X: f64 = 17.0;
const MAP_Y: f64 = 28.5;
const GAP: f64 = 9.0;

/// Places that follow from the sheet's size and the style's type.
#[derive(Clone, Copy, Debug)]
struct Grid {
    /// Line pitch relative to the normal type size.
    pitch: f64,
    /// Height of the map.
    map: f64,
    /// First baseline of the plain words, upper edge of the title strip, first baseline of a caution in one line.
    words: f64,
    strip: f64,
    caution: f64,
    /// Distance of lines of the caption.
    caption: f64,
}

fn grid(style: &Style) -> Grid {
    let pitch = style.font.pitch();
    let height = style.ticket.height;
    let caution = height - 5.4;
    let strip = caution - 5.2 * pitch - 11.0 * pitch;
    let words = strip - 7.4 * pitch;
    // Below the map: ruler, caption, color scale, legend.
    let map = words - MAP_Y - 35.5 * pitch;
    Grid { pitch, map, words, strip, caution, caption: 4.4 * pitch }
}

/// Room for the map of a sheet in mm: width and height.
pub fn map_room(style: &Style) -> (f64, f64) {
    (style.ticket.width - style.ticket.margin[0] - MAP_X - GAP - panel_width(style), grid(style).map)
}

/// The scene of a ticket map.
pub fn scene(sheet: &TicketSheet, style: &Style) -> Scene {
    let (width, margin) = (style.ticket.width, style.ticket.margin[0]);
    let grid = grid(style);
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
    let (view, block, room) = placed_view(sheet, right, style);
    let look = MapLook {
        style,
        scale: sheet.scale,
        px_per_mm: style.ticket.px_per_mm(),
        small: false,
        room_right: (block - view.width()).clamp(0.0, 36.0),
    };
    let drawn = draw_map(&sheet.map, &view, &look, &sheet.title);
    scene.group(drawn.group);
    scene.group(rulers(&view, sheet.origin, style));

    let mut y = MAP_Y + view.height() + 3.2 + 7.2 * grid.pitch;
    let mut caption = Group::new("scale-caption");
    for line in caption_lines(sheet, room, style) {
        caption.text(Text::new(MAP_X, y, style.font.label, Face::Narrow, style.color.ink, &line));
        y += grid.caption;
    }
    scene.group(caption);
    y += 2.2 * grid.pitch;
    scene.group(color_scale(MAP_X, y, block - 24.0 * grid.pitch, &sheet.scale, &drawn.contours, style));
    y += 5.2 + 8.2 * grid.pitch;
    let (group, (end, mut last)) = legend(MAP_X, y, room, &entries(&sheet.map), style);
    scene.group(group);
    if end + scale_bar_width(&view, style) > MAP_X + room {
        last += 4.8 * grid.pitch;
    }
    scene.group(scale_bar(&view, MAP_X + room, last - 1.1, style));

    for (panel, (x, y)) in slots(&sheet.panels, block, last + 3.0, right, style) {
        scene.group(panel.draw(x, y, style));
    }
    let mut words = Group::new("words").labeled("group", "in plain words");
    let mut text = sheet.words.clone();
    if scene.texts().iter().any(|text| text.escaped) {
        text.push_str(" \\uXXXX stands for a character that the fonts lack.");
    }
    for (row, line) in
        wrapped(Face::Narrow, style.font.tick, &text, right - margin).iter().take(2).enumerate()
    {
        let y = grid.words + 4.0 * grid.pitch * row as f64;
        words.text(Text::new(margin, y, style.font.tick, Face::Narrow, style.color.ink_soft, line));
    }
    scene.group(words);
    scene.group(title_strip(margin, grid.strip, right - margin, &sheet.fields, style));
    let lines = wrapped(Face::Narrow, style.font.tick, &sheet.caution, right - margin - 6.0).len();
    let first = grid.caution - if lines > 1 { 1.4 * grid.pitch } else { 0.0 };
    scene.group(caution(margin, first, right - margin, &sheet.caution, style));
    scene
}

/// The view of the map, the width of what belongs to it, and the width up to the first column of panels. The map
/// gives way where the caption or the legend needs a second line.
fn placed_view(sheet: &TicketSheet, right: f64, style: &Style) -> (View, f64, f64) {
    let (grid, (room_wide, room_high)) = (grid(style), map_room(style));
    let mut height = room_high;
    loop {
        let view = View::fitted(sheet.window, MAP_X, MAP_Y, room_wide, height);
        let block = view.width().max(110.0 * grid.pitch);
        let first = columns(block, right, style).first().map_or(right, |column| column.0);
        let room = first - 5.0 - MAP_X;
        let captions = caption_lines(sheet, room, style).len().saturating_sub(1) as f64;
        let (_, (end, mut last)) = legend(MAP_X, 0.0, room, &entries(&sheet.map), style);
        if end + scale_bar_width(&view, style) > MAP_X + room {
            last += 4.8 * grid.pitch;
        }
        let most = room_high - captions * grid.caption - last;
        if view.height() <= most + 1e-9 || height < 40.0 {
            return (view, block, room);
        }
        height = most.min(height - 1.0);
    }
}

fn caption_lines(sheet: &TicketSheet, room: f64, style: &Style) -> Vec<String> {
    let anchor = super::number::significant(sheet.scale.anchor(), 3);
    let kind = if sheet.scale.linear { ", linear scale" } else { "" };
    let text = format!(
        "Return current density per ampere in the net{kind}. 0\u{a0}dB is 1/(\u{3c0}{}) = {anchor}\u{a0}A/m per A, the density under a straight thin track over unbroken copper.",
        italic("h")
    );
    wrapped(Face::Narrow, style.font.label, &text, room)
}

fn head(sheet: &TicketSheet, x: f64, width: f64, style: &Style) -> Group {
    let mut group = Group::new("headline");
    if let Some(index) = &sheet.index {
        group.link = Some(index.clone());
    }
    let wanted = marked_width(Face::Bold, style.font.headline, &sheet.headline);
    let size = (style.font.headline * (width / wanted).min(1.0)).max(0.75 * style.font.headline);
    group.text(Text::new(x, 14.6, size, Face::Bold, style.color.ink, &sheet.headline));
    group.text(Text::new(x, 21.2, style.font.lead, Face::Regular, style.color.ink_soft, &sheet.lead));
    group
}

fn entries(map: &MapData) -> Vec<LegendEntry> {
    let mut all = vec![LegendEntry::Track];
    if map.track.iter().any(|leg| !leg.charted) {
        all.push(LegendEntry::OtherTrack);
    }
    all.push(LegendEntry::NoCopper);
    if !map.idle.is_empty() {
        all.push(LegendEntry::IdleCopper);
    }
    if !map.zones.is_empty() {
        all.push(LegendEntry::Boundary);
    }
    if map.driver.is_some() {
        all.push(LegendEntry::Driver);
    }
    if map.receiver.is_some() {
        all.push(LegendEntry::Receiver);
    }
    all.push(LegendEntry::Landing);
    let is_via = |joint: &&JointMark| joint.form == JointForm::Via;
    let carries = |joint: &&JointMark| joint.current >= joint::LEAST;
    if map.joints.iter().filter(is_via).any(|joint| carries(&joint)) {
        all.push(LegendEntry::Via);
    }
    if map.joints.iter().filter(|joint| !is_via(joint)).any(|joint| carries(&joint)) {
        all.push(LegendEntry::Part);
    }
    if map.flow.is_some() {
        all.push(LegendEntry::Flow);
    }
    all
}

/// Upper left corners of the columns right of the map.
fn columns(block: f64, right: f64, style: &Style) -> Vec<(f64, f64)> {
    let wide = panel_width(style);
    let start = MAP_X + block + GAP;
    let count = (((right - start + GAP + 1e-6) / (wide + GAP)).floor() as usize).max(1);
    (0..count).map(|index| (right - wide - (count - 1 - index) as f64 * (wide + GAP), MAP_Y)).collect()
}

/// Panels with their upper left corners: each goes to the column right of the map that is filled least, or, where it
/// does not fit there, under the map. A list of findings that fits nowhere is cut, and its end counted; another panel
/// that fits nowhere is left out.
fn slots(panels: &[Panel], block: f64, bottom: f64, right: f64, style: &Style) -> Vec<(Panel, (f64, f64))> {
    let limit = grid(style).words - 4.0;
    let wide = panel_width(style);
    let mut beside = columns(block, right, style);
    let count = ((block + GAP) / (wide + GAP)).floor() as usize;
    let mut below: Vec<(f64, f64)> = (0..count).map(|n| (MAP_X + n as f64 * (wide + GAP), bottom)).collect();
    let mut places = Vec::new();
    for panel in panels {
        let mut wanted = Some(panel.clone());
        while let Some(panel) = wanted {
            let fits = |column: &&mut (f64, f64)| column.1 + panel.height <= limit;
            let least = beside.iter_mut().filter(fits).min_by(|a, b| a.1.total_cmp(&b.1));
            if let Some(column) = least.or_else(|| below.iter_mut().find(fits)) {
                let at = *column;
                column.1 += panel.height + 4.0;
                places.push((panel, at));
                break;
            }
            wanted = panel.shorter(style);
        }
    }
    places
}
