//! Copper areas with clearances and thermal reliefs, as contours with cut-ins.

use super::design::{Design, N_LAYERS, Pour, Shape, VIA_PAD, Xy, length};
use super::fabrication::{RELIEF_GAP, SPOKE};
use ebbmap::geom::boolean::{Filling, difference, fill, intersection, union, union_with};
use ebbmap::geom::{Point, Polygon, Region, Ring};
use std::f64::consts::PI;

/// Narrowest copper that an area keeps.
const THINNEST: f64 = 0.2;
/// Corners of a whole circle.
const CORNERS: usize = 24;

/// A length rounded to hundredths of a millimetre.
pub fn tenth(value: f64) -> f64 {
    (value * 100.0).round() / 100.0
}

fn point(at: Xy) -> Point {
    Point::mm(at.0, at.1)
}

/// A line with round ends as a polygon that goes round the exact shape, so that clearances hold.
fn capsule(a: Xy, b: Xy, radius: f64) -> Ring {
    let r = radius / libm::cos(PI / CORNERS as f64);
    let start = if a == b { 0.0 } else { libm::atan2(b.1 - a.1, b.0 - a.0) - 0.5 * PI };
    let half = CORNERS / 2;
    let mut ring = Vec::new();
    for (end, turn) in [(b, 0), (a, half)] {
        for k in 0..half {
            let angle = start + PI * (2.0 * (turn + k) as f64 + 1.0) / CORNERS as f64;
            ring.push(point((end.0 + r * libm::cos(angle), end.1 + r * libm::sin(angle))));
        }
    }
    ring
}

fn rectangle(at: Xy, w: f64, h: f64) -> Ring {
    let (x, y) = (0.5 * w, 0.5 * h);
    [(-x, -y), (x, -y), (x, y), (-x, y)].map(|(dx, dy)| point((at.0 + dx, at.1 + dy))).to_vec()
}

/// Rings that together cover a pad grown by `gap`.
fn pad_rings(shape: Shape, at: Xy, gap: f64) -> Vec<Ring> {
    match shape {
        Shape::Round(d) => vec![capsule(at, at, 0.5 * d + gap)],
        Shape::Oval(w, h) => {
            let r = 0.5 * w.min(h);
            let (x, y) = (0.5 * w - r, 0.5 * h - r);
            vec![capsule((at.0 - x, at.1 - y), (at.0 + x, at.1 + y), r + gap)]
        }
        Shape::Rect(w, h) | Shape::Rounded(w, h, _) if gap == 0.0 => vec![rectangle(at, w, h)],
        Shape::Rect(w, h) | Shape::Rounded(w, h, _) => {
            let (x, y) = (0.5 * w, 0.5 * h);
            let corner = [(-x, -y), (x, -y), (x, y), (-x, y)].map(|(dx, dy)| (at.0 + dx, at.1 + dy));
            let mut rings = vec![rectangle(at, w, h)];
            rings.extend((0..4).map(|k| capsule(corner[k], corner[(k + 1) % 4], gap)));
            rings
        }
    }
}

/// Grows (or shrinks) a region with coarse round corners.
fn offset(region: &Region, distance: f64) -> Region {
    let mut rims = Vec::new();
    for ring in region.0.iter().flat_map(Polygon::rings) {
        for (index, from) in ring.iter().enumerate() {
            let to = ring[(index + 1) % ring.len()];
            let (a, b) = ((from.x * 1e3, from.y * 1e3), (to.x * 1e3, to.y * 1e3));
            rims.push(capsule(a, b, distance.abs()));
        }
    }
    if distance > 0.0 { union_with([region], &rims) } else { difference(region, &union_with([], &rims)) }
}

/// Bars between round clearances that leave copper thinner than a fabricator etches between them.
fn joined(rounds: &[(Xy, f64)]) -> Vec<Ring> {
    let mut bars = Vec::new();
    for (k, (a, r)) in rounds.iter().enumerate() {
        for (b, s) in &rounds[..k] {
            let apart = length(a.0 - b.0, a.1 - b.1) - r - s;
            if apart < THINNEST {
                bars.push(capsule(*a, *b, 0.7 * r.min(*s)));
            }
        }
    }
    bars
}

/// The copper of an area.
fn region(design: &Design, pour: &Pour) -> Region {
    let outline: Ring = pour.outline.iter().map(|&at| point(at)).collect();
    let mut rounds: Vec<(Xy, f64)> = Vec::new();
    let limits = fill([&outline], Filling::NonZero);
    let (mut foreign, mut rings_of_relief, mut spokes, mut anchors) =
        (Vec::new(), Vec::new(), Vec::new(), Vec::new());
    for track in design.tracks.iter().filter(|track| track.layer == pour.layer && track.net != pour.net) {
        let legs = track.path.windows(2);
        let quiet = design.quiet.0.contains(&track.net);
        let gap = if quiet { design.quiet.1 } else { pour.clearance };
        foreign.extend(legs.map(|leg| capsule(leg[0], leg[1], 0.5 * track.width + gap)));
    }
    for (net, layer, corners) in &design.drops {
        if *layer == pour.layer && *net != pour.net {
            let n = corners.len();
            foreign.push(corners.iter().map(|&at| point(at)).collect());
            foreign.extend((0..n).map(|k| capsule(corners[k], corners[(k + 1) % n], pour.clearance)));
        }
    }
    for pad in design.parts.iter().flat_map(|part| &part.pads) {
        if pad.drill.is_none() && pour.layer != 0 {
            continue;
        }
        if pad.net != pour.net {
            foreign.extend(pad_rings(pad.shape, pad.at, pour.clearance));
            let (w, h) = pad.shape.size();
            rounds.push((pad.at, 0.5 * w.min(h) + pour.clearance));
            continue;
        }
        anchors.push(pad.at);
        let (w, h) = pad.shape.size();
        if pour.relief {
            rings_of_relief.extend(pad_rings(pad.shape, pad.at, RELIEF_GAP));
            let reach = 2.0 * RELIEF_GAP + 0.4;
            spokes.push(rectangle(pad.at, w + reach, SPOKE.min(h)));
            spokes.push(rectangle(pad.at, SPOKE.min(w), h + reach));
        }
    }
    for via in &design.vias {
        if via.net == pour.net {
            anchors.push(via.at);
        } else {
            foreign.push(capsule(via.at, via.at, 0.5 * VIA_PAD + pour.clearance));
            rounds.push((via.at, 0.5 * VIA_PAD + pour.clearance));
        }
    }
    foreign.extend(design.holes.iter().map(|hole| capsule(hole.at, hole.at, 0.5 * hole.diameter + 0.3)));
    for cut in design.cuts.iter().filter(|cut| cut.layer == pour.layer) {
        foreign.extend(cut.path.windows(2).map(|leg| capsule(leg[0], leg[1], 0.5 * cut.width)));
    }
    for other in design.pours.iter().filter(|other| other.layer == pour.layer && other.rank > pour.rank) {
        let n = other.outline.len();
        foreign.push(other.outline.iter().map(|&at| point(at)).collect());
        let side = |k: usize| capsule(other.outline[k], other.outline[(k + 1) % n], pour.clearance);
        foreign.extend((0..n).map(side));
    }
    for tie in design.ties.iter().filter(|tie| tie.layer == pour.layer) {
        foreign.push(tie.corners.iter().map(|&at| point(at)).collect());
        let side = |k: usize| capsule(tie.corners[k], tie.corners[(k + 1) % 4], pour.clearance);
        foreign.extend((0..4).map(side));
    }
    let inner = pour.layer != 0 && pour.layer + 1 < N_LAYERS;
    if inner {
        foreign.extend(joined(&rounds));
    }
    let free = difference(&limits, &union_with([], &foreign));
    let relieved = if rings_of_relief.is_empty() {
        free.clone()
    } else {
        let rings = union_with([], &rings_of_relief);
        union([&difference(&free, &rings), &intersection(&free, &union_with([], &spokes))])
    };
    let anchored = |polygon: &Polygon| anchors.iter().any(|&at| polygon.contains(point(at)));
    if inner {
        return Region(relieved.0.into_iter().filter(anchored).collect());
    }
    // What is thinner than a fabricator etches goes: shrink, then grow back.
    let opened = offset(&offset(&relieved, -0.5 * THINNEST), 0.5 * THINNEST);
    let opened = intersection(&opened, &relieved);
    Region(opened.0.into_iter().filter(anchored).collect())
}

/// The contours of an area: one for each piece, holes joined to the rim by cut-ins of no width.
pub fn contours(design: &Design, pour: &Pour) -> Vec<Vec<Xy>> {
    let millimetres = |ring: &Ring| -> Vec<Xy> {
        ring.iter().map(|p| ((p.x * 1e9).round() * 1e-6, (p.y * 1e9).round() * 1e-6)).collect()
    };
    let polygons = region(design, pour).0;
    polygons
        .iter()
        .map(|polygon| keyhole(millimetres(&polygon.outer), polygon.holes.iter().map(millimetres).collect()))
        .collect()
}

/// Joins holes to the rim, each by a horizontal cut-in from its leftmost corner to what lies left of it.
fn keyhole(mut rim: Vec<Xy>, mut holes: Vec<Vec<Xy>>) -> Vec<Xy> {
    for hole in &mut holes {
        let leftmost = (0..hole.len())
            .min_by(|&a, &b| hole[a].partial_cmp(&hole[b]).unwrap_or(std::cmp::Ordering::Equal));
        hole.rotate_left(leftmost.unwrap_or(0));
    }
    holes.sort_by(|a, b| a[0].partial_cmp(&b[0]).unwrap_or(std::cmp::Ordering::Equal));
    for hole in holes {
        let from = hole[0];
        let mut best: Option<(f64, usize)> = None;
        for index in 0..rim.len() {
            let (a, b) = (rim[index], rim[(index + 1) % rim.len()]);
            if (a.1 > from.1) == (b.1 > from.1) {
                continue;
            }
            let x = a.0 + (b.0 - a.0) * (from.1 - a.1) / (b.1 - a.1);
            if x <= from.0 && best.is_none_or(|(found, _)| x > found) {
                best = Some((x, index));
            }
        }
        let Some((x, index)) = best else { panic!("a hole lies outside its area") };
        let touch = ((x * 1e6).round() * 1e-6, from.1);
        let mut detour = vec![touch];
        detour.extend(&hole);
        detour.push(from);
        detour.push(touch);
        rim.splice(index + 1..index + 1, detour);
    }
    rim
}
