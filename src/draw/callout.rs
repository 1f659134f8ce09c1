//! Callouts of findings on a map: an open ring round the place, a leader, a numbered disc in quiet copper, few words.

use super::map::HALO;
use super::path::PathData;
use super::place::{Placer, Rect, Wanted, ring_box};
use super::scene::{Group, Shape};
use super::text::{Anchor, Text, marked_width, shortened};
use super::view::View;
use crate::geom::Point;
use crate::style::{Face, Style};

/// Radius of the ring round a place in mm: open, so that the place stays visible.
pub const RING: f64 = 3.5;
/// Line width of the ring in mm.
const RING_LINE: f64 = 0.42;
/// Longest words of a callout in mm.
const WORDS: f64 = 46.0;
/// Between disc and words in mm.
const GAP: f64 = 1.2;

/// A finding on the map.
#[derive(Clone, Debug, PartialEq)]
pub struct Callout {
    /// Number in the set, the same on every sheet.
    pub number: String,
    /// Its place.
    pub at: Point,
    /// What it is, in few words.
    pub words: String,
}

/// Half the width and half the height of a disc with `number` in it, in mm; long numbers make it a pill.
pub fn disc_size(number: &str, style: &Style) -> (f64, f64) {
    let half = 0.68 * style.font.body;
    let wide = 0.5 * marked_width(Face::NarrowBold, style.font.body, number) + 0.9;
    (half.max(wide), half)
}

/// A numbered disc with its middle at `at`.
pub fn disc(group: &mut Group, at: (f64, f64), number: &str, style: &Style) {
    let (w, h) = disc_size(number, style);
    let pill = |grow: f64| {
        let mut path = PathData::new();
        path.pill((at.0 - w - grow, at.1 - h - grow), 2.0 * (w + grow), 2.0 * (h + grow));
        path
    };
    group.shape(Shape::filled(pill(0.5 * HALO), style.color.page));
    group.shape(Shape::filled(pill(0.0), style.color.mark));
    let size = style.font.body;
    let text = Text::new(at.0, at.1 + 0.35 * size, size, Face::NarrowBold, style.color.mark_text, number);
    group.text(text.anchored(Anchor::Middle));
}

/// Takes the rings of all callouts, so that nothing placed later covers them.
pub fn take_rings(callouts: &[Callout], view: &View, placer: &mut Placer) {
    for callout in callouts.iter().filter(|callout| view.window.contains(callout.at)) {
        placer.take(ring_box(view.place(callout.at), RING));
    }
}

/// Draws the callouts whose place lies in the view; those that find no room stand in the list alone.
pub fn callouts(callouts: &[Callout], view: &View, placer: &mut Placer, style: &Style) -> Group {
    let mut group = Group::new("findings");
    let size = style.font.label;
    let (mut rings, mut leaders) = (PathData::coarse(), PathData::coarse());
    let mut marks = Vec::new();
    for callout in callouts.iter().filter(|callout| view.window.contains(callout.at)) {
        let spot = view.place(callout.at);
        rings.circle(spot, RING);
        let words = shortened(Face::NarrowBold, size, &callout.words, WORDS * style.font.pitch());
        let width = marked_width(Face::NarrowBold, size, &words);
        let words_width = if words.is_empty() { 0.0 } else { GAP + width };
        let wanted = Wanted { spot, ring: RING, disc: disc_size(&callout.number, style), words: words_width };
        let Some(place) = placer.callout(&wanted) else { continue };
        if let Some((from, to)) = place.leader {
            leaders.line(&[from, to]);
        }
        let label = format!("finding {}: {}", callout.number, callout.words);
        let mut mark = Group::new("finding").labeled("graphics-symbol", label);
        mark.id = format!("mark-{}", callout.number);
        disc(&mut mark, place.disc, &callout.number, style);
        if let Some(right) = place.words_right {
            let x = if right { place.disc.0 + wanted.disc.0 + GAP } else { place.rect[0] };
            let text =
                Text::new(x, place.disc.1 + 0.35 * size, size, Face::NarrowBold, style.color.ink, &words);
            mark.text(text.with_halo(style.color.page));
        }
        marks.push(mark);
    }
    let width = style.line.leader.max(0.35);
    for (path, width) in [(&rings, RING_LINE), (&leaders, width)] {
        group.shape(Shape::stroked(path.clone(), style.color.page, width + HALO));
    }
    group.shape(Shape::stroked(rings, style.color.mark, RING_LINE));
    group.shape(Shape::stroked(leaders, style.color.mark, width));
    marks.into_iter().for_each(|mark| group.group(mark));
    group
}

/// A box round a point, for tests of what is free.
pub fn around(at: (f64, f64), half: f64) -> Rect {
    [at.0 - half, at.1 - half, at.0 + half, at.1 + half]
}
