//! What stands round a map: rulers, scale bar, color scale, legend, title strip, caution.

use super::contour::{Contour, SHARES};
use super::density::indexed_png;
use super::joint::{self, JointForm};
use super::map::{LANDING, PIN, contour_ink, landing_shape, pin_shape};
use super::number::coordinate;
use super::path::PathData;
use super::scale::DensityScale;
use super::scene::{Group, Image, Item, Shape};
use super::text::{Anchor, Text, marked_width, shortened, wrapped};
use super::view::View;
use crate::geom::Point;
use crate::style::{Face, Gradient, Style};

/// Rulers left of and below a map, in mm from `origin`.
pub fn rulers(view: &View, origin: Point, style: &Style) -> Group {
    let mut group = Group::new("rulers").labeled("graphics-object", "rulers in millimeters");
    let step = round_step(11.0 / view.scale);
    let minor = step
        / if (step / libm::pow(10.0, libm::floor(libm::log10(step) + 1e-9))).round() == 2.0 {
            4.0
        } else {
            5.0
        };
    let (bottom, size) = (view.y + view.height(), style.font.tick);
    let mut ticks = PathData::coarse();
    let range = |low: f64, high: f64| {
        (libm::ceil(low / minor - 1e-6) as i64)..=(libm::floor(high / minor + 1e-6) as i64)
    };
    let major = |n: i64| n.rem_euclid((step / minor).round() as i64) == 0;
    let number = |n: i64| {
        let text = coordinate(n as f64 * minor);
        text.strip_prefix('-').map_or(text.clone(), |rest| format!("\u{2212}{rest}"))
    };
    let (low, high) = ((view.window.min - origin) * 1e3, (view.window.max - origin) * 1e3);
    for n in range(low.x, high.x) {
        let x = view.x + (n as f64 * minor - low.x) * view.scale;
        ticks.line(&[(x, bottom), (x, bottom + if major(n) { 1.5 } else { 0.8 })]);
        if major(n) {
            let text =
                Text::new(x, bottom + 1.5 + size, size, Face::Narrow, style.color.ink_soft, &number(n));
            group.text(text.anchored(Anchor::Middle));
        }
    }
    for n in range(low.y, high.y) {
        let y = bottom - (n as f64 * minor - low.y) * view.scale;
        ticks.line(&[(view.x, y), (view.x - if major(n) { 1.5 } else { 0.8 }, y)]);
        if major(n) {
            let text = Text::new(
                view.x - 2.2,
                y + 0.35 * size,
                size,
                Face::Narrow,
                style.color.ink_soft,
                &number(n),
            );
            group.text(text.anchored(Anchor::End));
        }
    }
    group.shape(Shape::stroked(ticks, style.color.rule, 0.2));
    group
}

/// The smallest of 1, 2, 5, 10, ... that is at least `least`.
pub fn round_step(least: f64) -> f64 {
    let decade = libm::pow(10.0, libm::floor(libm::log10(least)));
    [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|factor| factor * decade)
        .find(|step| *step >= least * 0.999)
        .unwrap_or(10.0 * decade)
}

/// A bar that shows a round length of the board, right-aligned at `right`, and the scale in figures.
pub fn scale_bar(view: &View, right: f64, y: f64, style: &Style) -> Group {
    let step = round_step(9.0 / view.scale);
    let width = step * view.scale;
    let mut group = Group::new("scale-bar");
    let x = right - width;
    let mut path = PathData::new();
    path.line(&[(x, y), (right, y)]);
    for part in [0.0, 0.5, 1.0] {
        path.line(&[(x + part * width, y - 0.9), (x + part * width, y + 0.9)]);
    }
    group.shape(Shape::stroked(path, style.color.ink, 0.45));
    let text = format!("{}, {} mm", view.scale_text(), coordinate(step));
    let text = Text::new(x - 2.0, y + 1.1, style.font.tick, Face::Narrow, style.color.ink, &text);
    group.text(text.anchored(Anchor::End));
    group
}

/// Room that a scale bar takes in mm.
pub fn scale_bar_width(view: &View, style: &Style) -> f64 {
    let step = round_step(9.0 / view.scale);
    let text = format!("{}, {} mm", view.scale_text(), coordinate(step));
    step * view.scale + 2.0 + marked_width(Face::Narrow, style.font.tick, &text)
}

/// The color scale from `x` to `x + width` at `y`, 5.2 mm high: densities above, dB below, contours inside. The pointed
/// end at the right is the color of what lies above the scale.
pub fn color_scale(
    x: f64,
    y: f64,
    width: f64,
    scale: &DensityScale,
    contours: &[Contour],
    style: &Style,
) -> Group {
    const HEIGHT: f64 = 5.2;
    let ends = [scale.low_db(), scale.high_db()].map(|level| coordinate((level * 10.0).round() / 10.0));
    let kind = if scale.linear {
        "linear color scale from 0".to_owned()
    } else {
        format!("color scale from {} dB", ends[0])
    };
    let label = format!("{kind} to {} dB", ends[1]);
    let mut group = Group::new("color-scale").labeled("graphics-object", label.clone());
    let indices: Vec<u8> = (0..Gradient::LEVELS as u8).collect();
    let palette =
        style.density.gradient.colors().iter().flat_map(|color| [color.0, color.1, color.2]).collect();
    let png = indexed_png(Gradient::LEVELS as u32, 1, &indices, palette);
    group.items.push(Item::Image(Image { x, y, width, height: HEIGHT, png, label }));
    let mut point = PathData::new();
    point.ring(&[(x + width, y - 0.5), (x + width + 4.2, y + 0.5 * HEIGHT), (x + width, y + HEIGHT + 0.5)]);
    group.shape(Shape::filled(point, style.color.over).outlined(style.color.ink, 0.25));
    let mut frame = PathData::new();
    frame.rect(x, y, width, HEIGHT);
    group.shape(Shape::stroked(frame, style.color.ink, 0.25));
    let size = style.font.tick;
    let mut ticks = PathData::new();
    let mut number = |group: &mut Group, at: f64, below: bool, text: &str| {
        let (from, to, base) = if below {
            (y + HEIGHT, y + HEIGHT + 1.2, y + HEIGHT + 1.1 + size)
        } else {
            (y, y - 1.2, y - 1.9)
        };
        ticks.line(&[(at, from), (at, to)]);
        let text = Text::new(at, base, size, Face::Narrow, style.color.ink, text);
        group.text(text.anchored(Anchor::Middle));
    };
    let mut last = f64::NEG_INFINITY;
    for value in scale.ticks(width < 70.0) {
        let at = x + scale.place(scale.level_db(value)) * width;
        let text = super::number::grouped(&coordinate(value));
        let half = 0.5 * marked_width(Face::Narrow, size, &text);
        if at - half > last + 1.2 {
            number(&mut group, at, false, &text);
            last = at + half;
        }
    }
    for (at, text) in level_ticks(scale, (x, width), size) {
        number(&mut group, at, true, &text);
    }
    group.shape(Shape::stroked(ticks, style.color.ink, 0.25));
    for (row, unit) in [(y - 1.9, "A/m per A"), (y + HEIGHT + 1.1 + size, "dB")] {
        // Clear of a number at the very end of the scale.
        let at = if row < y { (x + width + 1.8).max(last + 1.6) } else { x + width + 5.2 };
        group.text(Text::new(at, row, size, Face::Narrow, style.color.ink, unit));
    }
    contour_marks(&mut group, (x, y, width, HEIGHT), scale, contours, style);
    group
}

/// Levels below the color scale every 10 dB (20 dB where it is short) as far as they have room, from the left. The
/// lowest of a logarithmic scale also stands for all that lies below it.
fn level_ticks(scale: &DensityScale, (x, width): (f64, f64), size: f64) -> Vec<(f64, String)> {
    let least = if width < 70.0 { 20.0 } else { 10.0 };
    let step = if scale.range_db > 90.0 { 20.0_f64.max(least) } else { least };
    let first = libm::ceil(scale.low_db() / step - 1e-6) as i64;
    let last = libm::floor(scale.high_db() / step + 1e-6) as i64;
    let mut all: Vec<(f64, String)> = Vec::new();
    let mut limit = f64::INFINITY;
    for n in (first..=last).rev() {
        let level = n as f64 * step;
        let lowest = !scale.linear && n == first && level - scale.low_db() < 0.5;
        let sign = if lowest { "\u{2264}\u{a0}" } else { "" };
        let text = format!("{sign}{}", coordinate(level).replace('-', "\u{2212}"));
        let at = x + scale.place(level) * width;
        let half = 0.5 * marked_width(Face::Narrow, size, &text);
        if at + half < limit {
            limit = at - half - 1.2;
            all.push((at, text));
        }
    }
    all.reverse();
    all
}

fn contour_marks(
    group: &mut Group,
    (x, y, width, height): (f64, f64, f64, f64),
    scale: &DensityScale,
    contours: &[Contour],
    style: &Style,
) {
    let shown = |contour: &&Contour| !contour.lines.is_empty();
    let mut limit = x + width;
    for (rank, contour) in contours.iter().enumerate().filter(|(_, contour)| shown(contour)) {
        let level = scale.level_db(contour.density);
        if !(scale.low_db()..=scale.high_db()).contains(&level) {
            continue;
        }
        let at = x + scale.place(level) * width;
        let ink = contour_ink(style, scale, contour.density);
        let mut path = PathData::new();
        path.line(&[(at, y), (at, y + height)]);
        let line = Shape::stroked(path, ink, style.line.contour[rank]).dashed(&style.line.contour_dash[rank]);
        group.shape(line);
        let name = format!("{} %", SHARES[rank]);
        // The name stands to the right of its line where there is room before the next line, else to the left.
        let wide = marked_width(Face::NarrowBold, style.font.tick, &name) + 1.6;
        let at_right = at + wide < limit;
        let start = if at_right { at + 0.9 } else { at - wide + 0.7 };
        if start < x {
            continue;
        }
        let middle = scale.place(level) + if at_right { 0.5 } else { -0.5 } * wide / width;
        let ink = style.density.gradient.at(middle).ink_of(style.color.on_dark, style.color.on_light);
        group.text(Text::new(start, y + 0.5 * height + 1.2, style.font.tick, Face::NarrowBold, ink, &name));
        limit = if at_right { at } else { start };
    }
}

/// An entry of a legend.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum LegendEntry {
    /// The track that this plane carries.
    Track,
    /// Track over another plane.
    OtherTrack,
    /// What is not copper.
    NoCopper,
    /// Copper of the plane's net that was not solved.
    IdleCopper,
    /// Partition boundary.
    Boundary,
    /// Driving pin.
    Driver,
    /// Receiving pin.
    Receiver,
    /// Where the return enters or leaves the plane.
    Landing,
    /// The 80 % contour.
    Contour80,
    /// Direction of the return.
    Flow,
    /// A via that carries a tenth of the return.
    Via,
    /// A part or tie that does.
    Part,
}

impl LegendEntry {
    /// Its words in English, the key of a style's own.
    pub fn words(self) -> &'static str {
        match self {
            Self::Track => "track",
            Self::OtherTrack => "track, other plane",
            Self::NoCopper => "no copper",
            Self::IdleCopper => "copper without return",
            Self::Boundary => "partition boundary",
            Self::Driver => "driver",
            Self::Receiver => "receiver",
            Self::Landing => "landing of the return",
            Self::Contour80 => "encloses 80 % of density",
            Self::Flow => "direction of the return",
            Self::Via => "via, 10 % of the return",
            Self::Part => "part, 10 % of the return",
        }
    }
}

/// A legend from `x`, broken into rows of at most `width` mm, first baseline at `y`; gives the right end of the last row
/// and its baseline too.
pub fn legend(x: f64, y: f64, width: f64, entries: &[LegendEntry], style: &Style) -> (Group, (f64, f64)) {
    let mut group = Group::new("legend").labeled("group", "legend");
    let size = style.font.tick;
    let (mut at, mut row) = (x, y);
    for &entry in entries {
        let words = style.word(entry.words());
        let sample = match entry {
            LegendEntry::Driver
            | LegendEntry::Receiver
            | LegendEntry::Landing
            | LegendEntry::Via
            | LegendEntry::Part => 2.4,
            LegendEntry::Flow => 3.0,
            LegendEntry::Boundary => 10.0,
            _ => 6.5,
        };
        let wide = sample + 1.2 + marked_width(Face::Narrow, size, words);
        if at > x && at + wide > x + width {
            at = x;
            row += 4.8 * style.font.pitch();
        }
        legend_sample(&mut group, entry, (at, row - 0.35 * size), sample, style);
        group.text(Text::new(at + sample + 1.2, row, size, Face::Narrow, style.color.ink, words));
        at += wide + 4.0;
    }
    (group, (at, row))
}

fn legend_sample(group: &mut Group, entry: LegendEntry, (x, y): (f64, f64), width: f64, style: &Style) {
    let mut line = PathData::new();
    line.line(&[(x, y), (x + width, y)]);
    let mut area = PathData::new();
    area.rect(x, y - 1.2, width, 2.4);
    let middle = (x + 0.5 * width, y);
    match entry {
        LegendEntry::Track => {
            group.shape(Shape::stroked(line.clone(), style.color.track_case, style.line.track_case));
            group.shape(Shape::stroked(line, style.color.track, style.line.track));
        }
        LegendEntry::OtherTrack => {
            group.shape(Shape::stroked(line, style.color.track_case, 0.4).dashed(&[1.2, 0.8]));
        }
        LegendEntry::NoCopper => {
            group.shape(
                Shape::filled(area, style.color.page).outlined(style.color.void_edge, style.line.void_edge),
            );
        }
        LegendEntry::IdleCopper => {
            group.shape(
                Shape::filled(area, style.color.hair).outlined(style.color.rule, style.line.void_edge),
            );
        }
        LegendEntry::Boundary => {
            let shape = Shape::stroked(line, style.color.boundary, style.line.boundary);
            group.shape(shape.dashed(&style.line.boundary_dash));
        }
        LegendEntry::Driver | LegendEntry::Receiver => {
            for shape in pin_shape(middle, entry == LegendEntry::Driver, style, PIN) {
                group.shape(shape);
            }
        }
        LegendEntry::Landing => {
            for shape in landing_shape(middle, style, LANDING) {
                group.shape(shape);
            }
        }
        LegendEntry::Flow => {
            let (tip, neck) = ((x + width, y), (x + width - 1.1, y));
            let (mut shaft, mut head) = (PathData::new(), PathData::new());
            shaft.line(&[(x, y), neck]);
            head.ring(&[tip, (neck.0, y - 0.42), (neck.0, y + 0.42)]);
            group.shape(Shape::stroked(shaft, style.color.ink, 0.2));
            group.shape(Shape::filled(head, style.color.ink));
        }
        LegendEntry::Via | LegendEntry::Part => {
            let form = if entry == LegendEntry::Via { JointForm::Via } else { JointForm::Part };
            for shape in joint::mark(form, middle, joint::radius(0.1), style) {
                group.shape(shape);
            }
        }
        LegendEntry::Contour80 => {
            group.shape(Shape::stroked(line, style.color.ink, style.line.contour[1]));
        }
    }
}

/// A strip of fields (name, value) from `x` to `x + width`, 11 mm high, with rules above and below.
pub fn title_strip(x: f64, y: f64, width: f64, fields: &[(&str, String)], style: &Style) -> Group {
    let mut group = Group::new("title-strip").labeled("group", "title strip");
    let mut rules = PathData::new();
    let height = 11.0 * style.font.pitch();
    rules.line(&[(x, y), (x + width, y)]).line(&[(x, y + height), (x + width, y + height)]);
    group.shape(Shape::stroked(rules, style.color.ink, 0.35));
    fields_row(&mut group, (x, y, width, height), 0.0, fields, style);
    group
}

/// One row of fields (name over value) in a box (x, y, width, height). Fields get the width they need; where that is too
/// much, the widest values are cut in their middle. The first field is indented by `indent` mm.
pub fn fields_row(
    group: &mut Group,
    (x, y, width, height): (f64, f64, f64, f64),
    indent: f64,
    fields: &[(&str, String)],
    style: &Style,
) {
    const PAD: f64 = 1.6;
    const LEAST: f64 = 12.0;
    let color = style.color;
    let size = style.font.label;
    let needs: Vec<f64> = fields
        .iter()
        .map(|(name, value)| {
            let value = marked_width(Face::Narrow, size, value);
            2.0 * PAD + value.max(marked_width(Face::Narrow, style.font.field, style.word(name)))
        })
        .collect();
    let widths = shared_widths(&needs, width, LEAST);
    let mut left = x;
    let mut bars = PathData::new();
    for (index, ((name, value), wide)) in fields.iter().zip(&widths).enumerate() {
        let start = if index == 0 { left + indent } else { left + PAD };
        if index > 0 {
            bars.line(&[(left, y + 1.0), (left, y + height - 1.0)]);
        }
        let room = left + wide - start - 0.6;
        let name = shortened(Face::Narrow, style.font.field, style.word(name), room);
        group.text(Text::new(
            start,
            y + 0.36 * height,
            style.font.field,
            Face::Narrow,
            color.ink_soft,
            &name,
        ));
        let value = fitted(Face::Narrow, size, value, room);
        group.text(Text::new(start, y + 0.79 * height, size, Face::Narrow, color.ink, &value));
        left += wide;
    }
    group.shape(Shape::stroked(bars, color.rule, style.line.rule));
}

/// Marked text if it fits, else its plain form cut in the middle.
fn fitted(face: Face, size: f64, text: &str, width: f64) -> String {
    if marked_width(face, size, text) <= width { text.to_owned() } else { shortened(face, size, text, width) }
}

/// Widths that add up to `total`: each gets what it needs; if that is too much, the largest are cut to one common width,
/// if too little, the rest is spread evenly.
pub fn shared_widths(needs: &[f64], total: f64, least: f64) -> Vec<f64> {
    let sum: f64 = needs.iter().sum();
    if sum <= total {
        let extra = (total - sum) / needs.len().max(1) as f64;
        return needs.iter().map(|need| need + extra).collect();
    }
    let mut sorted = needs.to_vec();
    sorted.sort_by(f64::total_cmp);
    let (mut left, mut count) = (total, needs.len());
    let mut cap = least;
    for need in sorted {
        cap = left / count as f64;
        if need > cap {
            break;
        }
        left -= need;
        count -= 1;
    }
    needs.iter().map(|need| need.min(cap)).collect()
}

/// A caution with its sign, first baseline at `y`, lines of at most `width` mm.
pub fn caution(x: f64, y: f64, width: f64, text: &str, style: &Style) -> Group {
    let mut group = Group::new("caution").labeled("note", "caution");
    let color = style.color;
    let mut sign = PathData::new();
    sign.ring(&[(x + 0.2, y + 0.6), (x + 2.1, y - 2.9), (x + 4.0, y + 0.6)]);
    group.shape(Shape::stroked(sign, color.ink, 0.4).rounded());
    let mut mark = PathData::new();
    mark.line(&[(x + 2.1, y - 1.6), (x + 2.1, y - 0.55)]).line(&[(x + 2.1, y - 0.02), (x + 2.1, y + 0.02)]);
    group.shape(Shape::stroked(mark, color.ink, 0.45).rounded());
    for (row, line) in wrapped(Face::Narrow, style.font.tick, text, width - 6.0).into_iter().enumerate() {
        group.text(Text::new(
            x + 5.6,
            y + 4.0 * style.font.pitch() * row as f64,
            style.font.tick,
            Face::Narrow,
            color.ink,
            &line,
        ));
    }
    group
}
