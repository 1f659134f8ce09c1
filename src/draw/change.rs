//! Parts of a before/after sheet: the signed change of density, its scale, and a table of figures with dumbbells.
//!
//! S = sign(dK) max(0, R + 20 lg(|dK|/K0))/R with dK = after - before and R the range of the scale, so that a change
//! below the scale's lower end is exactly the color of none. Lines at +-25 A/m per A: solid for more, dashed for less.
//! Colors run in OKLab through the style's stops. Checked by: `no_change_is_the_zero_color_and_signs_are_symmetric`.

use super::contour::level_lines;
use super::density::{Density, rgb_png};
use super::path::PathData;
use super::scale::DensityScale;
use super::scene::{Group, Image, Item, Shape};
use super::text::{Anchor, Text, marked_width, shortened};
use super::view::View;
use crate::style::{ChangeLook, Face, Gradient, Rgb, Style};

/// Change in A/m per A at which lines are drawn.
pub const LINE: f64 = 25.0;
const PX_PER_MM: f64 = 3.0;

/// Place of a change on the scale: -1 to 1, 0 for none.
pub fn place(scale: &DensityScale, change: f64) -> f64 {
    let level = scale.level_db(change.abs()) - scale.high_db();
    let size = ((scale.range_db + level) / scale.range_db).clamp(0.0, 1.0);
    if change < 0.0 { -size } else { size }
}

/// The style's colors from less to more.
pub fn gradient(look: &ChangeLook) -> Option<Gradient> {
    let [a, b, c] = look.low;
    let [d, e, f] = look.high;
    Gradient::through(&[a, b, c, look.zero, d, e, f])
}

fn color(gradient: &Gradient, zero: Rgb, place: f64) -> Rgb {
    if place == 0.0 { zero } else { gradient.at(0.5 + 0.5 * place) }
}

/// The change from `before` to `after` in `view`, with its lines. Voids of either are to be covered by the caller.
pub fn map(
    (before, after): (&Density, &Density),
    view: &View,
    scale: &DensityScale,
    style: &Style,
    label: &str,
) -> Group {
    let mut group = Group::new("change").labeled("graphics-object", label);
    let Some(gradient) = gradient(&style.change) else { return group };
    let pixels = |mm: f64| ((mm * PX_PER_MM).round() as usize).max(2);
    let (nx, ny) = (pixels(view.width()), pixels(view.height()));
    let (a, b) = (before.raster(view, nx, ny, scale), after.raster(view, nx, ny, scale));
    let changes: Vec<f64> =
        a.level_db.iter().zip(&b.level_db).map(|(&a, &b)| scale.density(b) - scale.density(a)).collect();
    let bytes: Vec<u8> = changes
        .iter()
        .map(|&change| color(&gradient, style.change.zero, place(scale, change)))
        .flat_map(|color| [color.0, color.1, color.2])
        .collect();
    group.items.push(Item::Image(Image::filling(view, rgb_png(nx as u32, ny as u32, &bytes), label)));
    let mut lines = Group::new("change-lines").clipped(view.x, view.y, view.width(), view.height());
    for (level, dash) in [(LINE, &[] as &[f64]), (-LINE, &[1.6, 0.8])] {
        let shown = |at| before.is_copper(view.back(at)) && after.is_copper(view.back(at));
        let mut path = PathData::coarse();
        for points in level_lines((nx, ny, &changes), view, level, shown) {
            path.line(&points);
        }
        lines.shape(Shape::stroked(path, style.color.ink, style.line.contour[1]).dashed(dash));
    }
    group.group(lines);
    group
}

/// The signed scale from `x` to `x + width` at `y`, 4.4 mm high, with words for both sides.
pub fn scale_bar(x: f64, y: f64, width: f64, scale: &DensityScale, style: &Style) -> Group {
    const HEIGHT: f64 = 4.4;
    let mut group = Group::new("change-scale").labeled("graphics-object", "scale of the signed change");
    let Some(gradient) = gradient(&style.change) else { return group };
    let bytes: Vec<u8> = gradient.colors().iter().flat_map(|color| [color.0, color.1, color.2]).collect();
    let png = rgb_png(Gradient::LEVELS as u32, 1, &bytes);
    group.items.push(Item::Image(Image { x, y, width, height: HEIGHT, png, label: "scale".to_owned() }));
    let mut frame = PathData::new();
    frame.rect(x, y, width, HEIGHT);
    group.shape(Shape::stroked(frame, style.color.ink, 0.25));
    let (size, middle) = (style.font.tick, x + 0.5 * width);
    let at = |change: f64| middle + 0.5 * width * place(scale, change);
    let mut ticks = PathData::new();
    let mut number = |group: &mut Group, x: f64, words: &str| {
        ticks.line(&[(x, y - 1.2), (x, y)]);
        let text = Text::new(x, y - 1.9, size, Face::Narrow, style.color.ink, words);
        group.text(text.anchored(Anchor::Middle));
    };
    number(&mut group, middle, "0");
    let mut limit = middle + 0.5 * marked_width(Face::Narrow, size, "0") + 1.6;
    for value in scale.ticks(false) {
        let text = super::number::grouped(&super::number::coordinate(value));
        let half = 0.5 * marked_width(Face::Narrow, size, &format!("+{text}"));
        if at(value) - half > limit {
            number(&mut group, at(value), &format!("+{text}"));
            number(&mut group, at(-value), &format!("\u{2212}{text}"));
            limit = at(value) + half + 1.2;
        }
    }
    group.shape(Shape::stroked(ticks, style.color.ink, 0.25));
    for (change, dash) in [(LINE, &[] as &[f64]), (-LINE, &[0.8, 0.4])] {
        let mut path = PathData::new();
        path.line(&[(at(change), y), (at(change), y + HEIGHT)]);
        group.shape(Shape::stroked(path, style.color.ink, 0.35).dashed(dash));
    }
    let base = y + HEIGHT + 1.0 + size;
    for (x, words, anchor) in
        [(x, "less current than before", Anchor::Start), (x + width, "more current than before", Anchor::End)]
    {
        let text = Text::new(x, base, size, Face::NarrowBold, style.color.ink, style.word(words));
        group.text(text.anchored(anchor));
    }
    group.text(Text::new(x + width + 2.0, y - 1.9, size, Face::Narrow, style.color.ink, "A/m per A"));
    group
}

/// A row of the table.
#[derive(Clone, Debug, PartialEq)]
pub struct ChangeRow {
    /// The figure.
    pub name: String,
    /// Value before, after and their difference, as rounded so that they agree.
    pub values: [String; 3],
    /// Places of before and after on the row's own bar, 0 to 1.
    pub places: [f64; 2],
    /// Whether it moved the right way; none where it did not move.
    pub better: Option<bool>,
}

/// Table of figures: before, after, change in words, and a dumbbell (open before, filled after) at the right.
pub fn table(x: f64, y: f64, width: f64, rows: &[ChangeRow], style: &Style) -> Group {
    const PITCH: f64 = 4.6;
    let mut group = Group::new("change-table").labeled("group", "figures before and after");
    let (size, color) = (style.font.label, style.color);
    let columns = [0.40, 0.53, 0.66, 0.69, 0.80].map(|part| x + part * width);
    let heads =
        [(style.word("before"), columns[0]), (style.word("after"), columns[1]), ("change", columns[2])];
    group.text(Text::new(x, y, size, Face::NarrowBold, color.ink, style.word("Key figures")));
    for (words, at) in heads {
        group.text(Text::new(at, y, size, Face::NarrowBold, color.ink, words).anchored(Anchor::End));
    }
    let key = "open: before, filled: after";
    let key = Text::new(x + width, y, style.font.tick, Face::Narrow, color.ink_soft, key);
    group.text(key.anchored(Anchor::End));
    let mut rule = PathData::new();
    rule.line(&[(x, y + 1.4), (x + width, y + 1.4)]);
    group.shape(Shape::stroked(rule, color.rule, style.line.rule));
    for (index, row) in rows.iter().enumerate() {
        let base = y + 1.6 + PITCH * (index + 1) as f64;
        let name = shortened(Face::Narrow, size, &row.name, columns[0] - x - 16.0);
        group.text(Text::new(x, base, size, Face::Narrow, color.ink, &name));
        let (word, ink) = match row.better {
            Some(true) => ("better", color.better),
            Some(false) => ("worse", color.worse),
            None => ("same", color.ink_soft),
        };
        let faces = [(Face::Narrow, color.ink), (Face::NarrowBold, color.ink), (Face::NarrowBold, ink)];
        for ((value, (face, ink)), at) in row.values.iter().zip(faces).zip(columns) {
            group.text(Text::new(at, base, size, face, ink, value).anchored(Anchor::End));
        }
        group.text(Text::new(columns[3], base, size, Face::Narrow, ink, word));
        let at = |place: f64| columns[4] + 1.2 + (x + width - columns[4] - 2.4) * place.clamp(0.0, 1.0);
        let line = base - 0.35 * size;
        let (mut guide, mut bar) = (PathData::new(), PathData::new());
        guide.line(&[(columns[4], line), (x + width, line)]);
        bar.line(&[(at(row.places[0]), line), (at(row.places[1]), line)]);
        group.shape(Shape::stroked(guide, color.hair, 0.25));
        group.shape(Shape::stroked(bar, ink, 0.6));
        for (place, fill) in row.places.iter().zip([color.page, ink]) {
            let mut dot = PathData::new();
            dot.circle((at(*place), line), 0.95);
            group.shape(Shape::filled(dot, fill).outlined(ink, 0.45));
        }
    }
    group
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_change_is_the_zero_color_and_signs_are_symmetric() {
        let scale = DensityScale::new(0.4e-3, 60.0);
        assert_eq!(place(&scale, 0.0), 0.0);
        assert_eq!(place(&scale, 0.5 * scale.density(-60.0)), 0.0);
        assert!((place(&scale, scale.anchor()) - 1.0).abs() < 1e-12);
        assert!((place(&scale, -scale.density(-30.0)) + 0.5).abs() < 1e-12);
        for name in ["paper", "screen", "mono"] {
            let style = crate::read::style::built_in(name).expect("a style");
            let gradient = gradient(&style.change).expect("seven stops");
            assert_eq!(color(&gradient, style.change.zero, 0.0), style.change.zero);
            for place in [0.2, 0.5, 0.9] {
                let (more, less) = (gradient.at(0.5 + 0.5 * place), gradient.at(0.5 - 0.5 * place));
                assert!((more.lab().l - less.lab().l).abs() < 7.0, "{name} {place}");
            }
        }
    }

    /// In styles with color, more and less of one size stay apart for everybody.
    #[test]
    fn signs_stay_apart_for_everybody() {
        for name in ["paper", "screen", "large"] {
            let style = crate::read::style::built_in(name).expect("a style");
            let gradient = gradient(&style.change).expect("seven stops");
            for vision in crate::style::vision::Vision::ALL {
                let seen = |place: f64| vision.sees(gradient.at(0.5 + 0.5 * place));
                assert!(seen(0.6).difference(seen(-0.6)) > 30.0, "{name} {vision:?}");
            }
        }
    }
}
