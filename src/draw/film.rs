//! Parts of a film strip: frames of one map at several frequencies, and the density along a cut through all of them.

use super::path::PathData;
use super::scene::{Group, Shape};
use super::set::CellMap;
use super::text::{Anchor, Text, marked_width, shortened};
use crate::style::{Face, Gradient, Rgb, Style};

/// A frame: what stands above and below it, and the map.
#[derive(Clone, Debug)]
pub struct Frame {
    /// Frequency.
    pub head: String,
    /// Figure.
    pub foot: String,
    /// The map, drawn in its own size.
    pub map: CellMap,
}

/// Frames side by side from `(x, y)`, the upper left corner of the first head; each `step` mm from the last.
pub fn frames((x, y, step): (f64, f64, f64), frames: &[Frame], style: &Style) -> Group {
    let mut group = Group::new("frames");
    let size = style.font.value;
    for (index, frame) in frames.iter().enumerate() {
        let left = x + step * index as f64;
        let mut one = Group::new("frame").labeled("graphics-object", frame.head.clone());
        let head = shortened(Face::Bold, size, &frame.head, step - 2.0);
        one.text(Text::new(left, y + size, size, Face::Bold, style.color.ink, &head));
        let top = y + 1.4 * size;
        one.group(frame.map.group.clone().shifted(left, top - (super::set::CELL.1 - frame.map.height)));
        let base = top + frame.map.height + 1.2 + style.font.label;
        one.text(Text::new(left, base, style.font.label, Face::Narrow, style.color.ink_soft, &frame.foot));
        group.group(one);
    }
    group
}

/// A curve of a cut: its name, and points (place in mm, density in A/m per A) in rising order.
#[derive(Clone, Debug, PartialEq)]
pub struct Curve {
    /// Name, as a frequency.
    pub name: String,
    /// Points.
    pub points: Vec<(f64, f64)>,
    /// Whether it is a closed form, drawn dotted in ink.
    pub closed_form: bool,
}

/// Color of curve `index` of `count`.
fn tint(gradient: &Gradient, index: usize, count: usize) -> Rgb {
    gradient.at(if count < 2 { 1.0 } else { index as f64 / (count - 1) as f64 })
}

/// Densities along a cut in a box (x, y, width, height), logarithmic over `range`; each curve is named at its right end,
/// names kept apart.
pub fn cut_plot(
    (x, y, width, height): (f64, f64, f64, f64),
    range: (f64, f64),
    curves: &[Curve],
    style: &Style,
) -> Group {
    let mut group = Group::new("cut").labeled("graphics-object", "density along the cut");
    let size = style.font.tick;
    let all = || curves.iter().flat_map(|curve| curve.points.iter());
    let (low, high) = all().fold((f64::INFINITY, f64::NEG_INFINITY), |(a, b), p| (a.min(p.0), b.max(p.0)));
    if low >= high || range.0 <= 0.0 || range.0 >= range.1 {
        return group;
    }
    let names =
        curves.iter().map(|curve| marked_width(Face::NarrowBold, size, &curve.name)).fold(0.0, f64::max);
    let wide = width - names - 3.0;
    let across = |value: f64| x + wide * (value - low) / (high - low);
    let decades = libm::log10(range.1 / range.0);
    let up = |value: f64| y + height * (1.0 - libm::log10(value / range.0) / decades);
    let mut guides = PathData::new();
    let first = libm::ceil(libm::log10(range.0) - 1e-9) as i32;
    let last = libm::floor(libm::log10(range.1) + 1e-9) as i32;
    for decade in first..=last {
        let value = libm::pow(10.0, f64::from(decade));
        guides.line(&[(x, up(value)), (x + wide, up(value))]);
        let words = super::number::coordinate(value);
        let text =
            Text::new(x - 1.4, up(value) + 0.35 * size, size, Face::Narrow, style.color.ink_soft, &words);
        group.text(text.anchored(Anchor::End));
    }
    group.shape(Shape::stroked(guides, style.color.hair, 0.25));
    let step = super::frame::round_step((high - low) / 6.0);
    for n in libm::ceil(low / step) as i64..=libm::floor(high / step) as i64 {
        let value = n as f64 * step;
        let words = super::number::coordinate(value).replace('-', "\u{2212}");
        let text = Text::new(
            across(value),
            y + height + 1.0 + size,
            size,
            Face::Narrow,
            style.color.ink_soft,
            &words,
        );
        group.text(text.anchored(Anchor::Middle));
    }
    let solved = curves.iter().filter(|curve| !curve.closed_form).count();
    let mut ends: Vec<(f64, usize, Rgb)> = Vec::new();
    let mut rank = 0;
    for (index, curve) in curves.iter().enumerate() {
        let ink = if curve.closed_form { style.color.ink } else { tint(&style.series, rank, solved) };
        rank += usize::from(!curve.closed_form);
        let mut path = PathData::coarse();
        let mut run: Vec<(f64, f64)> = Vec::new();
        for &(place, value) in &curve.points {
            if value >= range.0 && value <= range.1 {
                run.push((across(place), up(value)));
            } else {
                path.line(&super::contour::simplified(&std::mem::take(&mut run), 0.03));
            }
        }
        if let Some(end) = run.last() {
            ends.push((end.1, index, if curve.closed_form { style.color.ink } else { ink }));
        }
        path.line(&super::contour::simplified(&run, 0.03));
        let (line, dash): (f64, &[f64]) = if curve.closed_form { (0.35, &[0.4, 0.9]) } else { (0.6, &[]) };
        group.shape(Shape::stroked(path, ink, line).dashed(dash));
    }
    ends.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut limit = y;
    for (at, index, _) in ends {
        let base = (at + 0.35 * size).max(limit + size);
        limit = base;
        let name = &curves[index].name;
        group.text(Text::new(x + wide + 1.6, base, size, Face::NarrowBold, style.color.ink, name));
    }
    let mut axes = PathData::new();
    axes.line(&[(x, y), (x, y + height), (x + wide, y + height)]);
    group.shape(Shape::stroked(axes, style.color.rule, 0.25));
    group
}
