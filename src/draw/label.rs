//! Labels of a map in the order of their claims: pins, zones, findings, joints, contours.

use super::callout::{callouts, take_rings};
use super::contour::SHARES;
use super::map::{DrawnMap, MapData, MapLook, leader, placed};
use super::place::Rect;
use super::scene::Group;
use super::text::{Text, shortened};
use super::view::View;
use crate::geom::{Polygon, Ring};
use crate::style::Face;

/// Names of pins, zones and contours.
pub(super) fn labels(drawn: &mut DrawnMap, data: &MapData, view: &View, look: &MapLook) -> Group {
    let style = look.style;
    let size = style.font.label;
    let mut group = Group::new("labels");
    take_rings(&data.callouts, view, &mut drawn.placer);
    for (pin, role) in [(&data.driver, "driver"), (&data.receiver, "receiver")] {
        let Some(pin) = pin.as_ref().filter(|pin| view.window.contains(pin.at)) else { continue };
        let name = shortened(Face::NarrowBold, size, &pin.name, 30.0);
        let text = Text::new(
            0.0,
            0.0,
            size,
            Face::NarrowBold,
            style.color.ink,
            &format!("{} {name}", style.word(role)),
        );
        let spot = view.place(pin.at);
        let Some((rect, line)) = drawn.placer.label(spot, text.width(), 0.95 * size) else { continue };
        group.group(leader(line, style));
        group.text(placed(text, rect, style));
    }
    for (name, outline) in &data.zones {
        let name = shortened(Face::NarrowBold, size, &name.to_uppercase(), 50.0);
        let text = Text::new(0.0, 0.0, size, Face::NarrowBold, style.color.boundary, &name);
        let candidates = zone_boxes(outline, view, text.width(), 0.95 * size);
        if let Some(rect) = drawn.placer.cheapest(candidates) {
            group.text(placed(text, rect, style));
        }
    }
    group.group(callouts(&data.callouts, view, &mut drawn.placer, style));
    group.group(super::joint::names(&data.joints, view, &mut drawn.placer, style));
    for (rank, contour) in drawn.contours.iter().enumerate() {
        let text = format!("{} %", SHARES[rank]);
        let text = Text::new(0.0, 0.0, size, Face::NarrowBold, style.color.ink, &text);
        let (width, height) = (text.width(), 0.95 * size);
        // On the line, or beside it where the line runs too close to the track.
        let shifts = [(0.0, 0.0), (1.0, 0.15), (-1.0, 0.15)];
        let boxes = contour.lines.iter().flat_map(|line| along(line, 3.0)).flat_map(|((x, y), (nx, ny))| {
            shifts.map(|(side, extra)| {
                let (cx, cy) = (x + side * nx * (0.5 * width + 0.8), y + side * ny * (0.5 * height + 0.8));
                ([cx - 0.5 * width, cy - 0.5 * height, cx + 0.5 * width, cy + 0.5 * height], extra)
            })
        });
        let boxes: Vec<(Rect, f64)> = boxes.collect();
        if let Some(rect) = drawn.placer.cheapest(boxes) {
            group.text(placed(text, rect, style));
        }
    }
    group
}

/// Points on a line every `step` mm, each with the normal of the line.
fn along(line: &[(f64, f64)], step: f64) -> Vec<((f64, f64), (f64, f64))> {
    let mut points = Vec::new();
    let mut left = step;
    for pair in line.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let length = libm::hypot(b.0 - a.0, b.1 - a.1);
        let mut at = left;
        while at < length {
            let t = at / length;
            let normal = ((a.1 - b.1) / length, (b.0 - a.0) / length);
            points.push(((a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1)), normal));
            at += step;
        }
        left = at - length;
    }
    points
}

/// Boxes inside a zone, lower ones cheaper.
pub(super) fn zone_boxes(outline: &Ring, view: &View, width: f64, height: f64) -> Vec<(Rect, f64)> {
    let zone = Polygon { outer: outline.clone(), holes: Vec::new() };
    let (right, bottom) = (view.x + view.width(), view.y + view.height());
    let mut boxes = Vec::new();
    let mut y = bottom - height - 1.5;
    while y > view.y + 1.0 {
        let mut x = view.x + 1.5;
        while x + width < right - 1.0 {
            let rect = [x, y, x + width, y + height];
            let corners = [(x, y), (x + width, y), (x, y + height), (x + width, y + height)];
            if corners.iter().all(|&corner| zone.contains(view.back(corner))) {
                boxes.push((rect, 0.008 * (bottom - y)));
            }
            x += 2.0;
        }
        y -= 3.0;
    }
    boxes
}
