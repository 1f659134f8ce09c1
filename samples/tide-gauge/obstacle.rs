//! Distances between the copper objects of a design: what a track or via must keep away from.

use super::design::{Design, N_LAYERS, Shape, VIA_PAD, Xy, length};

/// Distance that copper of different nets keeps.
pub const CLEARANCE: f64 = 0.17;
/// Distance between copper and the board's edge.
pub const EDGE: f64 = 0.5;
/// Half the width kept free on both sides of the centre line of a slot in a plane.
const SLOT_ROOM: f64 = 0.9;

/// A shape for distances.
#[derive(Clone, Copy, Debug)]
pub enum Body {
    /// A line with round ends: ends and radius.
    Bar(Xy, Xy, f64),
    /// A rectangle: centre and half sizes.
    Block(Xy, f64, f64),
}

fn point_segment(p: Xy, a: Xy, b: Xy) -> f64 {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let length2 = dx * dx + dy * dy;
    let t =
        if length2 > 0.0 { (((p.0 - a.0) * dx + (p.1 - a.1) * dy) / length2).clamp(0.0, 1.0) } else { 0.0 };
    length(p.0 - a.0 - t * dx, p.1 - a.1 - t * dy)
}

fn segments(a: (Xy, Xy), b: (Xy, Xy)) -> f64 {
    let side = |p: Xy, q: Xy, r: Xy| (q.0 - p.0) * (r.1 - p.1) - (q.1 - p.1) * (r.0 - p.0);
    let apart = |s: (Xy, Xy), t: (Xy, Xy)| side(s.0, s.1, t.0) * side(s.0, s.1, t.1) < 0.0;
    if apart(a, b) && apart(b, a) {
        return 0.0;
    }
    let ends = [
        point_segment(a.0, b.0, b.1),
        point_segment(a.1, b.0, b.1),
        point_segment(b.0, a.0, a.1),
        point_segment(b.1, a.0, a.1),
    ];
    ends.into_iter().fold(f64::MAX, f64::min)
}

impl Body {
    /// Distance from a point to the rim; negative or zero inside.
    pub fn distance_to_point(&self, p: Xy) -> f64 {
        match *self {
            Body::Bar(a, b, r) => point_segment(p, a, b) - r,
            Body::Block(c, w, h) => {
                let (dx, dy) = ((p.0 - c.0).abs() - w, (p.1 - c.1).abs() - h);
                if dx <= 0.0 && dy <= 0.0 { dx.max(dy) } else { length(dx.max(0.0), dy.max(0.0)) }
            }
        }
    }

    /// Distance to a line with round ends.
    pub fn distance_to_bar(&self, a: Xy, b: Xy, radius: f64) -> f64 {
        match *self {
            Body::Bar(c, d, r) => segments((a, b), (c, d)) - r - radius,
            Body::Block(c, w, h) => {
                if self.distance_to_point(a) <= 0.0 || self.distance_to_point(b) <= 0.0 {
                    return -radius;
                }
                let corner = [(-w, -h), (w, -h), (w, h), (-w, h)].map(|(x, y)| (c.0 + x, c.1 + y));
                let sides = (0..4).map(|k| segments((a, b), (corner[k], corner[(k + 1) % 4])));
                sides.fold(f64::MAX, f64::min) - radius
            }
        }
    }

    /// The box round the body.
    pub fn limits(&self) -> (Xy, Xy) {
        match *self {
            Body::Bar(a, b, r) => {
                ((a.0.min(b.0) - r, a.1.min(b.1) - r), (a.0.max(b.0) + r, a.1.max(b.1) + r))
            }
            Body::Block(c, w, h) => ((c.0 - w, c.1 - h), (c.0 + w, c.1 + h)),
        }
    }
}

/// A copper object, or an area to keep out of.
#[derive(Clone, Debug)]
pub struct Obstacle {
    /// Its net; empty for none.
    pub net: String,
    /// The layers that it occupies.
    pub layers: [bool; N_LAYERS],
    /// Its shape.
    pub body: Body,
    /// Index of the track or via that it is, when that may be moved.
    pub movable: bool,
    /// Whether it is a pad of a part.
    pub pad: bool,
    /// Whether it is a hole with a barrel.
    pub barrel: bool,
}

/// The body of a pad.
pub fn pad_body(shape: Shape, at: Xy) -> Body {
    match shape {
        Shape::Round(d) => Body::Bar(at, at, 0.5 * d),
        Shape::Rect(w, h) | Shape::Rounded(w, h, _) => Body::Block(at, 0.5 * w, 0.5 * h),
        Shape::Oval(w, h) => {
            let r = 0.5 * w.min(h);
            let (x, y) = (0.5 * w - r, 0.5 * h - r);
            Body::Bar((at.0 - x, at.1 - y), (at.0 + x, at.1 + y), r)
        }
    }
}

/// Everything on the board. Tracks from `n_tracks` and vias from `n_vias` on may be moved.
pub fn obstacles(design: &Design, n_tracks: usize, n_vias: usize) -> Vec<Obstacle> {
    const ALL: [bool; N_LAYERS] = [true; N_LAYERS];
    let only = |layer: usize| std::array::from_fn(|index| index == layer);
    let mut found = Vec::new();
    for pad in design.parts.iter().flat_map(|part| &part.pads) {
        let barrel = pad.drill.is_some();
        let layers = if barrel { ALL } else { only(0) };
        let body = pad_body(pad.shape, pad.at);
        found.push(Obstacle { net: pad.net.clone(), layers, body, movable: false, pad: true, barrel });
    }
    for (index, track) in design.tracks.iter().enumerate() {
        for leg in track.path.windows(2) {
            let body = Body::Bar(leg[0], leg[1], 0.5 * track.width);
            let movable = index >= n_tracks;
            let layers = only(track.layer);
            found.push(Obstacle { net: track.net.clone(), layers, body, movable, pad: false, barrel: false });
        }
    }
    for (index, via) in design.vias.iter().enumerate() {
        let body = Body::Bar(via.at, via.at, 0.5 * VIA_PAD);
        let movable = index >= n_vias;
        found.push(Obstacle { net: via.net.clone(), layers: ALL, body, movable, pad: false, barrel: true });
    }
    for tie in &design.ties {
        let (low, high) =
            tie.corners.iter().fold(((f64::MAX, f64::MAX), (f64::MIN, f64::MIN)), |(l, h), p| {
                ((l.0.min(p.0), l.1.min(p.1)), (h.0.max(p.0), h.1.max(p.1)))
            });
        let middle = (0.5 * (low.0 + high.0), 0.5 * (low.1 + high.1));
        let body = Body::Block(middle, 0.5 * (high.0 - low.0), 0.5 * (high.1 - low.1));
        let (net, layers) = (String::new(), only(tie.layer));
        found.push(Obstacle { net, layers, body, movable: false, pad: false, barrel: false });
    }
    let mut keep_out = |body: Body| {
        let net = String::new();
        found.push(Obstacle { net, layers: ALL, body, movable: false, pad: false, barrel: false });
    };
    for hole in &design.holes {
        keep_out(Body::Bar(hole.at, hole.at, 0.5 * hole.diameter + 0.2));
    }
    for leg in design.cuts.iter().flat_map(|cut| cut.path.windows(2)) {
        keep_out(Body::Bar(leg[0], leg[1], SLOT_ROOM));
    }
    found
}

/// Whether a point lies inside an outline, at least `margin` off it in the four main directions.
pub fn contains(outline: &[Xy], at: Xy, margin: f64) -> bool {
    let inside = |at: Xy| {
        let mut odd = false;
        for k in 0..outline.len() {
            let (a, b) = (outline[k], outline[(k + 1) % outline.len()]);
            if (a.1 > at.1) != (b.1 > at.1) && at.0 < a.0 + (b.0 - a.0) * (at.1 - a.1) / (b.1 - a.1) {
                odd = !odd;
            }
        }
        odd
    };
    [(0.0, 0.0), (margin, 0.0), (-margin, 0.0), (0.0, margin), (0.0, -margin)]
        .into_iter()
        .all(|(dx, dy)| inside((at.0 + dx, at.1 + dy)))
}
