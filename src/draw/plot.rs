//! A small plot of a share against frequency.

use super::path::PathData;
use super::scene::{Group, Shape};
use super::text::{Anchor, Text};
use crate::style::{Face, Style};

/// A point of a plot: frequency in Hz, share as is, share without voids.
pub type SharePoint = (f64, Option<f64>, Option<f64>);

/// The share of the return within 3h against frequency, in a box of `width` x `height` mm with its upper left corner at
/// `(x, y)`. Values at the right end, frequencies below, 0 and 100 % at the left.
pub fn share_plot(
    (x, y, width, height): (f64, f64, f64, f64),
    points: &[SharePoint],
    frequency_words: &[String],
    style: &Style,
) -> Group {
    let mut group = Group::new("plot").labeled("graphics-object", "share within 3h against frequency");
    let color = style.color;
    let size = style.font.tick;
    let mut guides = PathData::new();
    for level in [0.0, 0.5, 1.0] {
        let at = y + height * (1.0 - level);
        guides.line(&[(x, at), (x + width, at)]);
    }
    group.shape(Shape::stroked(guides, color.hair, 0.25));
    // Frequencies are columns of equal width: the sheet's own columns, a decade apart in the named bands.
    let count = points.len();
    let place = |index: usize| {
        if count < 2 { x + 0.5 * width } else { x + width * index as f64 / (count - 1) as f64 }
    };
    let level = |share: f64| y + height * (1.0 - share.clamp(0.0, 1.0));
    let line = |pick: &dyn Fn(&SharePoint) -> Option<f64>| {
        let mut path = PathData::coarse();
        let mut run: Vec<(f64, f64)> = Vec::new();
        for (index, point) in points.iter().enumerate() {
            match pick(point) {
                Some(share) => run.push((place(index), level(share))),
                None => {
                    path.line(&run);
                    run.clear();
                }
            }
        }
        path.line(&run);
        path
    };
    group.shape(Shape::stroked(line(&|point| point.2), color.ink, 0.3).dashed(&[1.4, 0.8]));
    group.shape(Shape::stroked(line(&|point| point.1), color.mark, 0.6));
    let mut dots = PathData::coarse();
    for (index, point) in points.iter().enumerate() {
        if let Some(share) = point.1 {
            dots.circle((place(index), level(share)), 0.7);
        }
    }
    group.shape(Shape::filled(dots, color.mark));
    let text = |share: f64| format!("{:.0}\u{a0}%", share * 100.0);
    let last = |pick: &dyn Fn(&SharePoint) -> Option<f64>| points.iter().rev().find_map(pick);
    let (own, free) = (last(&|point| point.1), last(&|point| point.2));
    let gap = 1.05 * size;
    let mut own_at = own.map(|share| level(share) + 0.35 * size);
    let mut free_at = free.map(|share| level(share) + 0.35 * size);
    if let (Some(a), Some(b)) = (&mut own_at, &mut free_at)
        && (*a - *b).abs() < gap
    {
        let middle = 0.5 * (*a + *b);
        let up = if *b <= *a { -1.0 } else { 1.0 };
        (*b, *a) = (middle + up * 0.5 * gap, middle - up * 0.5 * gap);
    }
    if let (Some(share), Some(at)) = (own, own_at) {
        group.text(Text::new(x + width + 1.6, at, size, Face::NarrowBold, color.mark, &text(share)));
    }
    if let (Some(share), Some(at)) = (free, free_at) {
        group.text(Text::new(x + width + 1.6, at, size, Face::Narrow, color.ink_soft, &text(share)));
    }
    for (index, anchor) in [(0, Anchor::Start), (count.saturating_sub(1), Anchor::End)] {
        if let Some(words) = frequency_words.get(index)
            && (index > 0 || anchor == Anchor::Start)
        {
            let text = Text::new(place(index), y + height + 3.9, size, Face::Narrow, color.ink_soft, words);
            group.text(text.anchored(if count < 2 { Anchor::Middle } else { anchor }));
        }
    }
    group
}
