//! Which copper is a sheet: the pieces that carry a part of some charted path's return.
//!
//! Counted as large is a piece of at least 25 mm2, or 1 % of the board where that is less. Sheets are
//! 1. every large piece of a reference net, on any layer;
//! 2. on the track's own layer, and above and below it up to the first reference copper that covers the track, what
//!    comes within half the track's width plus three heights of a charted track: large pieces and pours of any net or
//!    of none, pours and through-connected tracks (two barrels at least) of a reference net;
//! 3. large pieces of other nets, or of none, that face a sheet over a large area with no large piece between;
//! 4. smaller reference copper whose barrels join sheets that nothing else joins.
//!
//! Lone pads and tracks of other nets are no sheets; neither is, for its own path, copper of the nets of a path.

use super::terrain::{AREA_WIDTH_M, Terrain, mean_width_m};
use super::{ConductorLayer, TrackLeg};
use crate::board::{Board, NetId};
use crate::geom::{Bounds, Point};
use std::collections::{BTreeMap, BTreeSet};

/// Pieces from this size on are large, in square metres, ...
const LARGE_M2: f64 = 25e-6;
/// ... and from this part of the board on.
const LARGE_PART: f64 = 0.01;
/// Smaller pours of other nets count near a track from this size on, in square metres.
const SMALL_POUR_M2: f64 = 1e-6;
/// How far beside a track copper counts, in heights from the track's edge.
const NEAR_HEIGHTS: f64 = 3.0;
/// Points at which it is looked up what faces what.
const SAMPLES: f64 = 20e3;

/// A piece of copper: layer, and index in the layer's areas.
pub type Piece = (usize, usize);

/// The track of a path, for the choice of sheets.
pub struct Tracked {
    /// Nets of the path.
    pub nets: Vec<NetId>,
    /// Legs, each with its height over its plane in metres.
    pub legs: Vec<(TrackLeg, f64)>,
    /// Areas of the path's own nets in which its current is solved for.
    pub areas: Vec<Piece>,
}

/// The chosen pieces.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Sheets {
    chosen: BTreeSet<Piece>,
}

impl Sheets {
    /// Whether a piece is a sheet.
    pub fn holds(&self, piece: Piece) -> bool {
        self.chosen.contains(&piece)
    }

    /// All pieces in order.
    pub fn pieces(&self) -> impl Iterator<Item = Piece> + '_ {
        self.chosen.iter().copied()
    }

    /// The pieces by layer.
    pub fn layers(&self) -> Vec<ConductorLayer> {
        let mut layers: Vec<ConductorLayer> = Vec::new();
        for &(layer, area) in &self.chosen {
            match layers.last_mut() {
                Some(last) if last.layer == layer => last.areas.push(area),
                _ => layers.push(ConductorLayer { layer, areas: vec![area] }),
            }
        }
        layers
    }

    /// Chooses the sheets for all paths of a plan.
    pub fn choose(terrain: &Terrain<'_>, tracks: &[Tracked]) -> Self {
        let choice = Choice::new(terrain);
        let mut sheets = Self::default();
        for &piece in choice.large.iter().filter(|&&piece| choice.is_reference(piece)) {
            sheets.chosen.insert(piece);
        }
        for track in tracks {
            sheets.chosen.extend(track.areas.iter().copied());
            for (leg, height_m) in &track.legs {
                choice.near(&track.nets, leg, *height_m, &mut sheets.chosen);
            }
        }
        choice.facing(&mut sheets.chosen);
        choice.bridges(&mut sheets.chosen);
        sheets
    }
}

/// Area inside the outline, or of the box of all copper where there is none, in square metres.
fn board_m2(board: &Board) -> f64 {
    if !board.outline.0.is_empty() {
        return board.outline.area();
    }
    let bounds = copper_bounds(board);
    if bounds.is_empty() { 0.0 } else { bounds.width() * bounds.height() }
}

fn copper_bounds(board: &Board) -> Bounds {
    let areas = board.layers.iter().flat_map(|layer| &layer.areas);
    areas.fold(Bounds::EMPTY, |all, area| all.union(area.shape.bounds()))
}

struct Choice<'t, 'b> {
    terrain: &'t Terrain<'b>,
    large_m2: f64,
    large: BTreeSet<Piece>,
}

impl<'t, 'b> Choice<'t, 'b> {
    fn new(terrain: &'t Terrain<'b>) -> Self {
        let board = terrain.board;
        let large_m2 = LARGE_M2.min(LARGE_PART * board_m2(board));
        let mut large = BTreeSet::new();
        for (layer, copper) in board.layers.iter().enumerate() {
            for (index, area) in copper.areas.iter().enumerate() {
                let wide = || terrain.is_area(layer, index) && mean_width_m(&area.shape) >= AREA_WIDTH_M;
                if area.shape.area() >= large_m2 && (terrain.is_reference(area.net) || wide()) {
                    large.insert((layer, index));
                }
            }
        }
        Self { terrain, large_m2, large }
    }

    fn is_reference(&self, (layer, index): Piece) -> bool {
        self.terrain.is_reference(self.terrain.net_of(layer, index))
    }

    /// Whether a piece near a track is a sheet.
    fn counts_near(&self, piece: Piece) -> bool {
        let (layer, index) = piece;
        if self.large.contains(&piece) {
            return true;
        }
        if self.is_reference(piece) {
            return self.terrain.is_poured(layer, index) || self.terrain.barrels_of(layer, index).len() > 1;
        }
        let shape = &self.terrain.board.layers[layer].areas[index].shape;
        self.terrain.is_poured(layer, index)
            && shape.area() >= SMALL_POUR_M2
            && mean_width_m(shape) >= AREA_WIDTH_M
    }

    /// Adds what lies beside a leg, and above and below it up to the reference copper that covers it.
    fn near(&self, own: &[NetId], leg: &TrackLeg, height_m: f64, chosen: &mut BTreeSet<Piece>) {
        let reach_m = 0.5 * leg.width_m + NEAR_HEIGHTS * height_m;
        let stations = [leg.from, (leg.from + leg.to) * 0.5, leg.to];
        let mut covered = |layer: usize| {
            let mut found = self.terrain.copper_near(layer, &[leg.from, leg.to], reach_m);
            found.retain(|&index| {
                let net = self.terrain.net_of(layer, index);
                !net.is_some_and(|net| own.contains(&net)) && self.counts_near((layer, index))
            });
            chosen.extend(found.iter().map(|&index| (layer, index)));
            stations.iter().all(|&at| {
                let here = self.terrain.copper_at(layer, at);
                here.iter().any(|index| found.contains(index) && self.is_reference((layer, *index)))
            })
        };
        covered(leg.layer);
        // `any` stops at the first layer that covers the leg.
        let _ = (0..leg.layer).rev().any(&mut covered);
        let _ = (leg.layer + 1..self.terrain.board.layers.len()).any(&mut covered);
    }

    /// Adds large pieces that face a sheet.
    fn facing(&self, chosen: &mut BTreeSet<Piece>) {
        let overlaps = self.overlaps();
        loop {
            let faces = |&(&(a, b), &overlap): &(&(Piece, Piece), &f64)| {
                overlap >= self.large_m2 && chosen.contains(&a) != chosen.contains(&b)
            };
            let added: Vec<Piece> =
                overlaps.iter().filter(faces).flat_map(|(pair, _)| [pair.0, pair.1]).collect();
            if added.is_empty() {
                return;
            }
            chosen.extend(added);
        }
    }

    /// Over which area large pieces face each other with no large piece between, in square metres.
    fn overlaps(&self) -> BTreeMap<(Piece, Piece), f64> {
        let mut overlaps = BTreeMap::new();
        let bounds = copper_bounds(self.terrain.board);
        if bounds.is_empty() {
            return overlaps;
        }
        let step_m = (bounds.width() * bounds.height() / SAMPLES).sqrt().max(1e-6);
        let count = |length_m: f64| (length_m / step_m).ceil().max(1.0) as usize;
        let (nx, ny) = (count(bounds.width()), count(bounds.height()));
        let (dx, dy) = (bounds.width() / nx as f64, bounds.height() / ny as f64);
        for iy in 0..ny {
            for ix in 0..nx {
                let at = bounds.min + Point::new((ix as f64 + 0.5) * dx, (iy as f64 + 0.5) * dy);
                let mut above: Option<Piece> = None;
                for layer in 0..self.terrain.board.layers.len() {
                    let here = self.terrain.copper_at(layer, at).into_iter().map(|index| (layer, index));
                    let Some(piece) = here.into_iter().find(|piece| self.large.contains(piece)) else {
                        continue;
                    };
                    if let Some(above) = above {
                        *overlaps.entry((above, piece)).or_default() += dx * dy;
                    }
                    above = Some(piece);
                }
            }
        }
        overlaps
    }

    /// Adds reference copper whose barrels join sheets that nothing else joins.
    fn bridges(&self, chosen: &mut BTreeSet<Piece>) {
        let board = self.terrain.board;
        loop {
            let mut groups = Groups::default();
            for hole in &board.holes {
                let touched: Vec<Piece> =
                    hole.contacts.iter().copied().filter(|p| chosen.contains(p)).collect();
                for pair in touched.windows(2) {
                    let net = |piece: Piece| self.terrain.net_of(piece.0, piece.1);
                    if hole.plating == crate::board::Plating::Plated && net(pair[0]) == net(pair[1]) {
                        groups.join(pair[0], pair[1]);
                    }
                }
            }
            let mut added = Vec::new();
            for (layer, copper) in board.layers.iter().enumerate() {
                for index in 0..copper.areas.len() {
                    let piece = (layer, index);
                    if chosen.contains(&piece) || !self.is_reference(piece) {
                        continue;
                    }
                    let holes = self.terrain.barrels_of(layer, index).iter();
                    let touched = holes.flat_map(|&hole| &board.holes[hole].contacts);
                    let joined: BTreeSet<Piece> =
                        touched.filter(|p| chosen.contains(p)).map(|&p| groups.root(p)).collect();
                    if joined.len() > 1 {
                        added.push(piece);
                        let mut joined = joined.into_iter();
                        if let Some(first) = joined.next() {
                            joined.for_each(|other| groups.join(first, other));
                        }
                    }
                }
            }
            if added.is_empty() {
                return;
            }
            chosen.extend(added);
        }
    }
}

/// Sets of things that are joined.
#[derive(Clone, Debug)]
pub struct Groups<T> {
    parent: BTreeMap<T, T>,
}

impl<T> Default for Groups<T> {
    fn default() -> Self {
        Self { parent: BTreeMap::new() }
    }
}

impl<T: Ord + Copy> Groups<T> {
    /// The smallest member of the set of `item`.
    pub fn root(&self, item: T) -> T {
        let mut at = item;
        while let Some(&parent) = self.parent.get(&at) {
            at = parent;
        }
        at
    }

    /// Joins two sets.
    pub fn join(&mut self, a: T, b: T) {
        let (a, b) = (self.root(a), self.root(b));
        if a != b {
            self.parent.insert(a.max(b), a.min(b));
        }
    }
}
