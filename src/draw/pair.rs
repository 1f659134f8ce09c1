//! The pair map: where the returns of two nets share copper. Hue says which net is stronger, lightness how much both.
//!
//! In OKLCh: s = mean of the two levels in dB over the style's range (0 to 1), r = level of B less level of A over 40 dB
//! (-1 to 1); lightness runs with s alone, hue is that of A for r < 0 and of B for r > 0, chroma grows with |r|^0.75.
//! So places of equal product are equally light whoever sees them or however it is printed, and equal shares are gray.
//! Directions are not shown: the sign of what is shared stands in the figures. Checked by:
//! `equal_products_are_equally_light_for_everybody`, `one_net_alone_keeps_its_hue_for_everybody`.

use super::density::{Density, Raster, rgb_png};
use super::path::PathData;
use super::scale::DensityScale;
use super::scene::{Group, Image, Item, Shape};
use super::text::{Anchor, Text, shortened};
use super::view::View;
use crate::style::{Face, PairLook, Rgb, Style, oklab};

/// Ratio in dB at which the stronger net has its full color.
const RATIO_DB: f64 = 40.0;
/// Pixels per mm of the image: fields are smooth.
const PX_PER_MM: f64 = 3.0;
/// Densities in A/m per A whose product lines are drawn, root of the product: solid thick, solid, dashed.
pub const LINES: [f64; 3] = [80.0, 25.0, 8.0];

/// Color of two levels in dB.
pub fn color(look: &PairLook, level_a: f64, level_b: f64) -> Rgb {
    let [low, high] = look.range_db;
    let s = ((0.5 * (level_a + level_b) - low) / (high - low)).clamp(0.0, 1.0);
    let r = ((level_b - level_a) / RATIO_DB).clamp(-1.0, 1.0);
    let light = look.light[0] + (look.light[1] - look.light[0]) * s;
    let hue = if r < 0.0 { look.hue_a } else { look.hue_b };
    oklab::from_oklch(light, look.chroma * libm::pow(r.abs(), 0.75), hue)
}

/// Ink of a net in text and lines: its hue, as light or dark as the page asks.
pub fn ink(style: &Style, first: bool) -> Rgb {
    let hue = if first { style.pair.hue_a } else { style.pair.hue_b };
    let dark_page = style.color.page.lab().l < 50.0;
    oklab::from_oklch(if dark_page { 0.78 } else { 0.46 }, style.pair.chroma, hue)
}

/// The image of two densities in `view`.
pub fn heat(
    (a, b): (&Density, &Density),
    view: &View,
    scale: &DensityScale,
    style: &Style,
    label: &str,
) -> Group {
    let pixels = |mm: f64| ((mm * PX_PER_MM).round() as usize).max(1);
    let (nx, ny) = (pixels(view.width()), pixels(view.height()));
    let (first, second) = (a.raster(view, nx, ny, scale), b.raster(view, nx, ny, scale));
    let colors = first.level_db.iter().zip(&second.level_db).map(|(&a, &b)| color(&style.pair, a, b));
    let bytes: Vec<u8> = colors.flat_map(|color| [color.0, color.1, color.2]).collect();
    let mut group = Group::new("density");
    group.items.push(Item::Image(Image::filling(view, rgb_png(nx as u32, ny as u32, &bytes), label)));
    group
}

/// Level in dB of the root of the product on a raster, for the product lines.
pub fn product((a, b): (&Raster, &Raster)) -> Vec<f64> {
    a.level_db.iter().zip(&b.level_db).map(|(a, b)| 0.5 * (a + b)).collect()
}

/// Part of the density of `a` on the copper where `b` is at least `level_b`: int |K_a| dA there over int |K_a| dA. Both
/// on one grid; none where they are not, or where nothing flows.
pub fn overlap(a: &Density, b: &Density, level_b: f64) -> Option<f64> {
    if a.grid != b.grid {
        return None;
    }
    let (mut inside, mut all) = (0.0, 0.0);
    for index in (0..a.grid.len()).filter(|&index| a.copper[index]) {
        all += a.values[index];
        if b.copper[index] && b.values[index] >= level_b {
            inside += a.values[index];
        }
    }
    (all > 0.0).then(|| inside / all)
}

/// How to read the colors: across, which net is stronger; up, how much both. In a box of `width` x `height` mm.
pub fn key(
    (x, y, width, height): (f64, f64, f64, f64),
    names: (&str, &str),
    scale: &DensityScale,
    style: &Style,
) -> Group {
    const STEPS: (usize, usize) = (80, 60);
    let mut group = Group::new("pair-key").labeled("graphics-object", "two-way color key");
    let size = style.font.tick;
    let left = x + 10.0;
    let wide = width - 10.0;
    let [low, high] = style.pair.range_db;
    let mut bytes = Vec::with_capacity(3 * STEPS.0 * STEPS.1);
    for row in 0..STEPS.1 {
        let mean = high + (low - high) * (row as f64 + 0.5) / STEPS.1 as f64;
        for column in 0..STEPS.0 {
            let ratio = RATIO_DB * (2.0 * (column as f64 + 0.5) / STEPS.0 as f64 - 1.0);
            let color = color(&style.pair, mean - 0.5 * ratio, mean + 0.5 * ratio);
            bytes.extend([color.0, color.1, color.2]);
        }
    }
    let png = rgb_png(STEPS.0 as u32, STEPS.1 as u32, &bytes);
    let label = format!("colors from {} to {}", names.0, names.1);
    group.items.push(Item::Image(Image { x: left, y, width: wide, height, png, label }));
    let mut frame = PathData::new();
    frame.rect(left, y, wide, height);
    group.shape(Shape::stroked(frame, style.color.ink, 0.25));
    for (rank, density) in LINES.iter().enumerate() {
        let level = scale.level_db(*density);
        if !(low..=high).contains(&level) {
            continue;
        }
        let at = y + height * (high - level) / (high - low);
        line(&mut group, &[vec![(left, at), (left + wide, at)]], rank, style);
        let text = Text::new(
            left - 1.4,
            at + 0.35 * size,
            size,
            Face::Narrow,
            style.color.ink,
            &super::number::coordinate(*density),
        );
        group.text(text.anchored(Anchor::End));
    }
    let base = y + height + 1.0 + size;
    for (part, words, anchor) in [
        (0.0, "100\u{a0}\u{d7}", Anchor::Start),
        (0.5, "equal", Anchor::Middle),
        (1.0, "100\u{a0}\u{d7}", Anchor::End),
    ] {
        let text = Text::new(left + part * wide, base, size, Face::Narrow, style.color.ink, words);
        group.text(text.anchored(anchor));
    }
    for (first, at, anchor) in [(true, x, Anchor::Start), (false, x + width, Anchor::End)] {
        let name = if first { names.0 } else { names.1 };
        let name = shortened(Face::NarrowBold, size, name, 0.5 * width - 1.0 - 13.0);
        let words = format!("{name} stronger");
        let text = Text::new(at, base + 4.2, size, Face::NarrowBold, ink(style, first), &words);
        group.text(text.anchored(anchor));
    }
    group
}

/// A product line: halo and ink, its dashes by rank.
pub fn line(group: &mut Group, lines: &[Vec<(f64, f64)>], rank: usize, style: &Style) {
    let mut path = PathData::coarse();
    lines.iter().for_each(|points| {
        path.line(points);
    });
    let width = [0.5, 0.3, 0.3][rank.min(2)];
    let dash: &[f64] = if rank == 2 { &[1.6, 0.8] } else { &[] };
    group.shape(Shape::stroked(path.clone(), style.color.page, width + super::map::HALO));
    group.shape(Shape::stroked(path, style.color.ink, width).dashed(dash));
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::style::vision::Vision;

    fn styles() -> Vec<Style> {
        ["paper", "screen", "mono"]
            .iter()
            .map(|name| crate::read::style::built_in(name).expect("a style"))
            .collect()
    }

    /// Along a line of equal product lightness L* must not tell anything: within 3 for usual sight and 12 for any other.
    #[test]
    fn equal_products_are_equally_light_for_everybody() {
        for style in styles() {
            for mean in [-45.0, -35.0, -25.0, -15.0] {
                for vision in Vision::ALL {
                    let lights = (-8..=8)
                        .map(|n| f64::from(n) * 2.5)
                        .map(|half| vision.sees(color(&style.pair, mean - half, mean + half)).lab().l);
                    let (low, high) = lights.fold((200.0_f64, -1.0_f64), |(a, b), l| (a.min(l), b.max(l)));
                    let least = if vision == Vision::Normal { 3.5 } else { 12.0 };
                    assert!(high - low <= least, "{} {vision:?} {mean}: {:.1}", style.name, high - low);
                }
            }
        }
    }

    /// A alone and B alone stay apart in every vision (in styles with color), and differ from equal shares.
    #[test]
    fn one_net_alone_keeps_its_hue_for_everybody() {
        for style in styles().iter().filter(|style| style.pair.chroma > 0.0) {
            for vision in Vision::ALL {
                let seen = |a: f64, b: f64| vision.sees(color(&style.pair, a, b));
                let (only_a, only_b, both) = (seen(-10.0, -50.0), seen(-50.0, -10.0), seen(-30.0, -30.0));
                assert!(only_a.difference(only_b) > 30.0, "{} {vision:?}", style.name);
                assert!(only_a.difference(both) > 12.0 && only_b.difference(both) > 12.0, "{}", style.name);
            }
        }
    }

    #[test]
    fn inks_of_the_nets_can_be_read() {
        for style in styles() {
            for first in [true, false] {
                let contrast = ink(&style, first).contrast(style.color.page);
                assert!(contrast >= 4.5, "{}: {contrast:.1}", style.name);
            }
        }
    }
}
