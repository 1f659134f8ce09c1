//! The board prepared for the plan's questions: what copper lies at a point, which of it is an area, what is reference.

use crate::board::{Board, CopperKind, NetId, ObjectFunction, Plating};
use crate::field::PlaneId;
use crate::geom::locate::Locator;
use crate::geom::{Point, Polygon, Region};
use std::collections::BTreeMap;

/// Copper without any pour in it counts as an area from this size on, in square metres, ...
const AREA_M2: f64 = 4e-6;
/// ... if it is this wide on average (twice its area over the length of its rims), in metres.
pub const AREA_WIDTH_M: f64 = 0.4e-3;

/// An area from this size on is solved as a sheet where a signal runs in it, in square metres.
const SHEET_M2: f64 = 100e-6;

/// A board with its copper prepared.
pub struct Terrain<'b> {
    /// The board.
    pub board: &'b Board,
    /// Thickness of the copper in barrels in metres.
    pub plating_m: f64,
    layers: Vec<Layer>,
    reference: Vec<bool>,
    /// Plated holes that touch each piece of copper of their net, by layer and index.
    barrels: BTreeMap<(usize, usize), Vec<usize>>,
}

struct Layer {
    locator: Locator,
    /// Whether an object of the image fills or outlines the piece as an area.
    poured: Vec<bool>,
    /// Whether each piece of copper is an area (a plane or a pour, with whatever hangs on it) and not just tracks.
    is_area: Vec<bool>,
    /// Copper of reference nets.
    reference: Locator,
}

/// A plated hole that reaches a plane.
#[derive(Clone, Copy, Debug)]
pub struct Via {
    /// Index of the hole.
    pub hole: usize,
}

impl<'b> Terrain<'b> {
    /// Prepares `board`; `reference` are the names of its reference nets.
    pub fn new(board: &'b Board, reference: &[String]) -> Self {
        let is_reference = |net: &crate::board::Net| reference.contains(&net.name);
        let reference: Vec<bool> = board.nets.iter().map(is_reference).collect();
        let layers = (0..board.layers.len()).map(|layer| Layer::new(board, layer, &reference)).collect();
        let mut barrels: BTreeMap<(usize, usize), Vec<usize>> = BTreeMap::new();
        for (hole, drilled) in board.holes.iter().enumerate() {
            for &(layer, piece) in drilled.contacts.iter().filter(|_| drilled.plating == Plating::Plated) {
                if drilled.net.is_none() || board.layers[layer].areas[piece].net == drilled.net {
                    barrels.entry((layer, piece)).or_default().push(hole);
                }
            }
        }
        Self { board, plating_m: super::barrel::PLATING_M, layers, reference, barrels }
    }

    /// Plated holes that touch a piece of copper of their net, rising.
    pub fn barrels_of(&self, layer: usize, index: usize) -> &[usize] {
        self.barrels.get(&(layer, index)).map_or(&[], Vec::as_slice)
    }

    /// Pieces of copper of a layer within `distance_m` of a line, by index.
    pub fn copper_near(&self, layer: usize, path: &[Point], distance_m: f64) -> Vec<usize> {
        self.layers[layer].locator.touching(path, distance_m)
    }

    /// Whether a piece of copper is an area: a plane or a pour, with whatever hangs on it, and not just tracks.
    pub fn is_area(&self, layer: usize, index: usize) -> bool {
        self.layers[layer].is_area[index]
    }

    /// Whether an object of the image fills or outlines a piece of copper as an area.
    pub fn is_poured(&self, layer: usize, index: usize) -> bool {
        self.layers[layer].poured[index]
    }

    /// Whether a net is a reference net.
    pub fn is_reference(&self, net: Option<NetId>) -> bool {
        net.is_some_and(|net| self.reference.get(net.0 as usize) == Some(&true))
    }

    /// The reference nets.
    pub fn reference_nets(&self) -> impl Iterator<Item = NetId> + '_ {
        let all = self.reference.iter().enumerate();
        all.filter(|(_, is)| **is).map(|(index, _)| NetId(index as u32))
    }

    /// Pieces of copper of a layer at a point, by index.
    pub fn copper_at(&self, layer: usize, point: Point) -> Vec<usize> {
        self.layers[layer].locator.containing(point)
    }

    /// Whether copper of a reference net comes within `distance_m` of a line on its layer.
    pub fn reference_near(&self, layer: usize, path: &[Point], distance_m: f64) -> bool {
        !self.layers[layer].reference.touching(path, distance_m).is_empty()
    }

    /// The area of a layer at a point, by index.
    pub fn area_at(&self, layer: usize, point: Point) -> Option<usize> {
        self.copper_at(layer, point).into_iter().find(|&index| self.layers[layer].is_area[index])
    }

    /// Whether a piece of copper is an area so large that the current in it is solved for, not guessed.
    pub fn is_sheet(&self, layer: usize, index: usize) -> bool {
        self.layers[layer].is_area[index] && self.board.layers[layer].areas[index].shape.area() >= SHEET_M2
    }

    /// Net of a piece of copper.
    pub fn net_of(&self, layer: usize, index: usize) -> Option<NetId> {
        self.board.layers[layer].areas[index].net
    }

    /// The piece of copper of `net` at a point of a layer.
    pub fn copper_of_net(&self, layer: usize, point: Point, net: NetId) -> Option<usize> {
        self.copper_at(layer, point).into_iter().find(|&index| self.net_of(layer, index) == Some(net))
    }

    /// Name of a net in texts.
    pub fn net_name(&self, net: Option<NetId>) -> &str {
        net.map_or("(no net)", |net| self.board.net_name(net))
    }

    /// Name of the net of a piece of copper in texts.
    pub fn net_name_of(&self, layer: usize, index: usize) -> &str {
        self.net_name(self.net_of(layer, index))
    }

    /// Plated holes that touch an area of the plane, in the order of the board. A pad of the plane's net that stands
    /// alone on the layer is no way into the plane.
    pub fn vias_to(&self, plane: &PlaneId) -> Vec<Via> {
        let mut vias = Vec::new();
        for (hole, drilled) in self.board.holes.iter().enumerate() {
            if drilled.plating != Plating::Plated {
                continue;
            }
            let touches = drilled.contacts.iter().any(|(layer, area)| {
                *layer == plane.layer
                    && self.layers[*layer].is_area[*area]
                    && self.net_name(self.net_of(*layer, *area)) == plane.net
            });
            if touches {
                vias.push(Via { hole });
            }
        }
        vias
    }
}

impl Layer {
    fn new(board: &Board, layer: usize, reference: &[bool]) -> Self {
        let copper = &board.layers[layer];
        let locator = Locator::new(copper.areas.iter().map(|area| &area.shape));
        let mut poured = vec![false; copper.areas.len()];
        for object in copper.objects.iter().filter(|object| object.dark) {
            let inside = match &object.kind {
                CopperKind::Fill { shape } if object.function == ObjectFunction::Area => inner_point(shape),
                CopperKind::Draw { path, .. } if object.function == ObjectFunction::AreaStroke => {
                    path.first().copied()
                }
                _ => None,
            };
            let Some(point) = inside else { continue };
            for index in locator.containing(point) {
                poured[index] |= copper.areas[index].net == object.net;
            }
        }
        let is_area = copper.areas.iter().zip(&poured).map(|(area, &poured)| poured || wide(&area.shape));
        let is_area = is_area.collect();
        let of_reference =
            copper.areas.iter().filter(|area| area.net.is_some_and(|net| reference[net.0 as usize]));
        let reference = Locator::new(of_reference.map(|area| &area.shape));
        Self { locator, poured, is_area, reference }
    }
}

fn wide(shape: &Polygon) -> bool {
    shape.area() >= AREA_M2 && mean_width_m(shape) >= AREA_WIDTH_M
}

/// Width of a shape on average: twice its area over the length of its rims, in metres.
pub fn mean_width_m(shape: &Polygon) -> f64 {
    2.0 * shape.area() / shape.rings().map(|ring| rim_length_m(ring)).sum::<f64>().max(1e-12)
}

/// Length of a ring in metres.
pub fn rim_length_m(ring: &[Point]) -> f64 {
    (0..ring.len()).map(|i| ring[i].distance(ring[(i + 1) % ring.len()])).sum()
}

/// A point inside a region, near a rim.
pub fn inner_point(shape: &Region) -> Option<Point> {
    const STEP_M: f64 = 5e-6;
    for polygon in &shape.0 {
        let ring = &polygon.outer;
        for i in 0..ring.len() {
            let (from, to) = (ring[i], ring[(i + 1) % ring.len()]);
            let length = from.distance(to);
            if length < STEP_M {
                continue;
            }
            let along = (to - from) * (STEP_M / length);
            let point = (from + to) * 0.5 + Point::new(-along.y, along.x);
            if polygon.contains(point) {
                return Some(point);
            }
        }
    }
    None
}
