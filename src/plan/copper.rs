//! The copper of one net as pieces that a way can be found through: straight draws, pads, barrels and pours.

use super::terrain::{Terrain, inner_point};
use crate::board::{CopperKind, NetId, ObjectFunction, PinId, Plating};
use crate::geom::{Bounds, Point, Polygon, Region, boolean, stroke};
use std::borrow::Cow;
use std::collections::BTreeMap;

/// A straight piece of a draw.
#[derive(Clone, Copy, Debug)]
pub struct Segment {
    /// Layer index from 0.
    pub layer: usize,
    /// Start.
    pub from: Point,
    /// End; equal to the start for a dot.
    pub to: Point,
    /// Pen diameter in metres.
    pub width_m: f64,
}

impl Segment {
    /// The box of its copper.
    pub fn bounds(&self) -> Bounds {
        Bounds::of([self.from, self.to]).grown(0.5 * self.width_m)
    }
}

/// A pad, or a barrel where it passes a layer.
#[derive(Clone, Debug)]
pub struct Pad<'b> {
    /// Layer index from 0.
    pub layer: usize,
    /// Middle.
    pub at: Point,
    /// Copper, or the hole's circle.
    pub shape: Cow<'b, Region>,
    /// Box of the shape.
    pub bounds: Bounds,
    /// Pin whose pad it is.
    pub pin: Option<PinId>,
}

/// A pour of the net: filled copper of one connected piece.
#[derive(Clone, Debug)]
pub struct Pour<'b> {
    /// Layer index from 0.
    pub layer: usize,
    /// What was filled.
    pub shapes: Vec<Cow<'b, Region>>,
    /// Box of the shapes.
    pub bounds: Bounds,
}

/// All copper of a net.
#[derive(Clone, Debug, Default)]
pub struct NetCopper<'b> {
    /// Draws.
    pub segments: Vec<Segment>,
    /// Pads and barrels.
    pub pads: Vec<Pad<'b>>,
    /// Pours.
    pub pours: Vec<Pour<'b>>,
    /// For each barrel the indices in `pads` of its passages, from the top.
    pub barrels: Vec<Vec<usize>>,
}

impl<'b> NetCopper<'b> {
    /// Collects the copper of `net`.
    pub fn of(terrain: &Terrain<'b>, net: NetId) -> Self {
        let mut copper = Self::default();
        for layer in 0..terrain.board.layers.len() {
            copper.add_layer(terrain, net, layer);
        }
        copper.add_pins(terrain, net);
        copper.add_barrels(terrain, net);
        copper
    }

    fn add_layer(&mut self, terrain: &Terrain<'b>, net: NetId, layer: usize) {
        let mut pours: BTreeMap<usize, Vec<Cow<'b, Region>>> = BTreeMap::new();
        let mut strokes = Vec::new();
        let objects = terrain.board.layers[layer].objects.iter();
        for object in objects.filter(|object| object.dark && object.net == Some(net)) {
            match (&object.kind, object.function) {
                (_, ObjectFunction::Other) => {}
                (CopperKind::Draw { path, width_m }, ObjectFunction::AreaStroke) => {
                    strokes.push((path, *width_m));
                }
                (CopperKind::Draw { path, width_m }, ObjectFunction::Pad | ObjectFunction::ViaPad) => {
                    let shape = stroke::stroke(path, *width_m);
                    let at = shape.bounds().centre();
                    self.add_pad(layer, at, Cow::Owned(shape), object.pin);
                }
                (CopperKind::Draw { path, width_m }, _) => {
                    let segment = |from, to| Segment { layer, from, to, width_m: *width_m };
                    match path[..] {
                        [dot] => self.segments.push(segment(dot, dot)),
                        _ => self.segments.extend(path.windows(2).map(|ends| segment(ends[0], ends[1]))),
                    }
                }
                (CopperKind::Flash { at, shape }, _) => {
                    self.add_pad(layer, *at, Cow::Borrowed(shape), object.pin);
                }
                (CopperKind::Fill { shape }, ObjectFunction::Area | ObjectFunction::Track) => {
                    let found = inner_point(shape).and_then(|point| terrain.copper_of_net(layer, point, net));
                    if let Some(area) = found {
                        pours.entry(area).or_default().push(Cow::Borrowed(shape));
                    }
                }
                (CopperKind::Fill { shape }, _) => {
                    let at = shape.bounds().centre();
                    let at = if shape.contains(at) { Some(at) } else { inner_point(shape) };
                    if let Some(at) = at {
                        self.add_pad(layer, at, Cow::Borrowed(shape), object.pin);
                    }
                }
            }
        }
        // Strokes beside a filled area only widen it by half a pen; without one they are the area.
        let mut rings: BTreeMap<usize, Vec<Vec<Point>>> = BTreeMap::new();
        for (path, width_m) in strokes {
            let area = path.first().and_then(|&point| terrain.copper_of_net(layer, point, net));
            if let Some(area) = area.filter(|area| !pours.contains_key(area)) {
                rings.entry(area).or_default().extend(stroke::capsules(path, width_m));
            }
        }
        for (area, rings) in rings {
            pours.insert(area, vec![Cow::Owned(boolean::union_with([], &rings))]);
        }
        for (_, shapes) in pours {
            self.add_pours(layer, shapes);
        }
    }

    /// Adds the fills of one connected piece of copper. Fills that do not touch each other, such as teardrops at the
    /// two ends of a track, are pours of their own: no current crosses from one to the other but through the track.
    fn add_pours(&mut self, layer: usize, shapes: Vec<Cow<'b, Region>>) {
        let mut add = |shapes: Vec<Cow<'b, Region>>| {
            let bounds = shapes.iter().fold(Bounds::EMPTY, |all, shape| all.union(shape.bounds()));
            self.pours.push(Pour { layer, shapes, bounds });
        };
        let united = boolean::union(shapes.iter().map(|shape| shape.as_ref()));
        if united.0.len() < 2 {
            return add(shapes);
        }
        for polygon in united.0 {
            add(vec![Cow::Owned(Region(vec![polygon]))]);
        }
    }

    fn add_pad(&mut self, layer: usize, at: Point, shape: Cow<'b, Region>, pin: Option<PinId>) {
        let bounds = shape.bounds();
        self.pads.push(Pad { layer, at, shape, bounds, pin });
    }

    /// Pads of pins that no object of the image names.
    fn add_pins(&mut self, terrain: &Terrain<'b>, net: NetId) {
        for (index, pin) in terrain.board.pins.iter().enumerate() {
            let id = PinId(index as u32);
            if pin.net == Some(net) && !self.pads.iter().any(|pad| pad.pin == Some(id)) {
                self.add_pad(pin.layer, pin.at, Cow::Borrowed(&pin.pad), Some(id));
            }
        }
    }

    fn add_barrels(&mut self, terrain: &Terrain<'b>, net: NetId) {
        for hole in &terrain.board.holes {
            let touches =
                || hole.contacts.iter().any(|&(layer, area)| terrain.net_of(layer, area) == Some(net));
            if hole.plating != Plating::Plated || !(hole.net == Some(net) || touches()) {
                continue;
            }
            let circles: Vec<Polygon> = stroke::capsules(&hole.path, hole.diameter_m)
                .into_iter()
                .map(|outer| Polygon { outer, holes: Vec::new() })
                .collect();
            let mut passages = Vec::new();
            let last = hole.layers.1.min(terrain.board.layers.len().saturating_sub(1));
            for layer in hole.layers.0..=last {
                passages.push(self.pads.len());
                self.add_pad(layer, hole.centre(), Cow::Owned(Region(circles.clone())), None);
            }
            self.barrels.push(passages);
        }
    }
}
