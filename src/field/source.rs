//! What drives the sheets: the track as source strips at their heights, and ends of joints as patches of cells.
//!
//! Height: the current lies at mid-copper at low frequency and at the facing surface at high; see
//! [`Foil::current_depth_m`], which is applied to plane and track alike. Each leg has the exact height over the plane
//! that charts it; its distance to other sheets follows from the stack.
//! Profile: even across the width below f = 2 Rs/(pi mu0 w), where the skin depth is sqrt(w t/2) and half the width
//! is the decay length 2 Rs/(w mu0) of the track's own foil; edge-crowded above.

use super::foil::Foil;
use super::mask::{Mask, NO_ISLAND};
use super::stack::Stack;
use super::track::{Run, gmd_edge, gmd_even};
use crate::board::Board;
use crate::geom::{Grid, Point, Polygon, Region, raster};
use crate::plan::TrackLeg;
use crate::sheet::{SourceStrip, StripProfile};
use crate::unit::constants::MU0;
use std::f64::consts::PI;

/// Legs of a track, ready to be asked for a frequency.
#[derive(Clone, Debug)]
pub struct Source<'a> {
    board: &'a Board,
    legs: &'a [TrackLeg],
    /// Layer of the plane that each leg's height counts from.
    plane_layer: Vec<usize>,
}

impl<'a> Source<'a> {
    /// The legs over planes on the layers `plane_layer` (indices from 0), one for each leg.
    pub fn new(board: &'a Board, plane_layer: &[usize], legs: &'a [TrackLeg]) -> Self {
        Self { board, legs, plane_layer: plane_layer.to_vec() }
    }

    /// Foil of a layer at the board's temperature.
    pub fn foil(&self, layer: usize) -> Foil {
        Foil::new(self.board.stackup.foils[layer].thickness_m, self.board.stackup.temperature_c)
    }

    /// Height of a leg's current over the current of the plane on `layer` in metres.
    pub fn height_m(&self, leg: &TrackLeg, layer: usize, frequency_hz: f64) -> f64 {
        let gap_m = self.board.stackup.gap_m(leg.layer, layer);
        let depth_m = |layer| self.foil(layer).current_depth_m(frequency_hz, gap_m);
        gap_m + depth_m(leg.layer) + depth_m(layer)
    }

    /// Length-weighted mean of [`Self::height_m`] over the legs `which` in metres; over all where those have no length.
    pub fn mean_height_m(&self, layer: usize, frequency_hz: f64, which: std::ops::Range<usize>) -> f64 {
        let some = self.legs[which.clone()].iter().any(|leg| leg.from != leg.to);
        let legs = if some { &self.legs[which] } else { self.legs };
        mean(legs, |leg| self.height_m(leg, layer, frequency_hz))
    }

    /// Length-weighted mean width in metres.
    pub fn mean_width_m(&self) -> f64 {
        mean(self.legs, |leg| leg.width_m)
    }

    /// Part of the half of a foil that counts in the heights of the stack, see [`Stack`].
    pub fn stack_part(&self, frequency_hz: f64) -> f64 {
        let Some((leg, &layer)) = self.legs.iter().zip(&self.plane_layer).find(|(leg, _)| leg.from != leg.to)
        else {
            return 1.0;
        };
        let gap_m = self.board.stackup.gap_m(leg.layer, layer);
        let half_m = 0.5 * self.board.stackup.foils[layer].thickness_m;
        if half_m > 0.0 { self.foil(layer).current_depth_m(frequency_hz, gap_m) / half_m } else { 1.0 }
    }

    /// Height of a leg's current on the axis of the stack in metres.
    fn z_m(&self, leg: usize, stack: &Stack, frequency_hz: f64) -> f64 {
        let (own, plane) = (self.legs[leg].layer, self.plane_layer[leg]);
        let height_m = self.height_m(&self.legs[leg], plane, frequency_hz);
        match own.cmp(&plane) {
            std::cmp::Ordering::Less => stack.z_m(plane) + height_m,
            std::cmp::Ordering::Equal => stack.z_m(plane),
            std::cmp::Ordering::Greater => stack.z_m(plane) - height_m,
        }
    }

    /// Frequency in Hz above which the current of a leg crowds at its edges.
    pub fn crowding_hz(&self, leg: &TrackLeg) -> f64 {
        2.0 * self.foil(leg.layer).resistance_ohm() / (PI * MU0 * leg.width_m)
    }

    fn profile(&self, leg: &TrackLeg, frequency_hz: f64) -> StripProfile {
        if frequency_hz > self.crowding_hz(leg) { StripProfile::Edge } else { StripProfile::Uniform }
    }

    fn legs(&self) -> impl Iterator<Item = (usize, &TrackLeg)> {
        self.legs.iter().enumerate().filter(|(_, leg)| leg.from != leg.to && leg.current != 0.0)
    }

    /// Source strips on the axis of the stack.
    pub fn strips(&self, stack: &Stack, frequency_hz: f64) -> Vec<SourceStrip> {
        let strip = |(index, leg): (usize, &TrackLeg)| SourceStrip {
            from: leg.from,
            to: leg.to,
            z_m: self.z_m(index, stack, frequency_hz),
            width_m: leg.width_m,
            profile: self.profile(leg, frequency_hz),
            current_a: leg.current,
        };
        self.legs().map(strip).collect()
    }

    /// The legs as the track's own inductance sees them.
    pub fn runs(&self, stack: &Stack, frequency_hz: f64) -> Vec<Run> {
        let run = |(index, leg): (usize, &TrackLeg)| Run {
            from: leg.from,
            to: leg.to,
            z_m: self.z_m(index, stack, frequency_hz),
            gmd_m: match self.profile(leg, frequency_hz) {
                StripProfile::Uniform => {
                    gmd_even(leg.width_m, self.board.stackup.foils[leg.layer].thickness_m)
                }
                StripProfile::Edge => gmd_edge(leg.width_m),
            },
            current: leg.current,
        };
        self.legs().map(run).collect()
    }

    /// Resistance of the track in ohm.
    pub fn resistance_ohm(&self, frequency_hz: f64) -> f64 {
        let leg = |leg: &TrackLeg| {
            let squares = leg.from.distance(leg.to) / leg.width_m;
            leg.current * leg.current * squares * self.foil(leg.layer).zs_ohm(frequency_hz).re
        };
        self.legs.iter().map(leg).sum()
    }
}

/// Length-weighted mean over legs.
fn mean(legs: &[TrackLeg], value: impl Fn(&TrackLeg) -> f64) -> f64 {
    let length = |leg: &TrackLeg| leg.from.distance(leg.to);
    let total: f64 = legs.iter().map(length).sum();
    legs.iter().map(|leg| length(leg) * value(leg)).sum::<f64>() / total
}

/// A disc as a polygon of 64 corners with the disc's area.
pub fn disc(centre: Point, radius_m: f64) -> Polygon {
    const CORNERS: usize = 64;
    let step = 2.0 * PI / CORNERS as f64;
    let radius_m = radius_m * (step / libm::sin(step)).sqrt();
    let corner = |i: usize| {
        let angle = (i as f64 + 0.5) * step;
        centre + Point::new(libm::cos(angle), libm::sin(angle)) * radius_m
    };
    Polygon { outer: (0..CORNERS).map(corner).collect(), holes: Vec::new() }
}

/// A circle on one area of a mask.
#[derive(Clone, Copy, Debug)]
pub struct Spot {
    /// Middle.
    pub at: Point,
    /// Radius in metres.
    pub radius_m: f64,
    /// The area's group on the mask; none takes any.
    pub group: Option<u32>,
}

/// Cells of one island under a circle with weights by area that sum to 1, and the island; none where the circle and
/// the two cells round it hold no copper of the area.
pub fn spot_cells(mask: &Mask, spot: &Spot) -> Option<(Vec<(usize, f64)>, u32)> {
    let stands = |cell: usize| mask.copper[cell] && spot.group.is_none_or(|group| mask.group[cell] == group);
    let cells = covered_cells(&mask.grid, spot);
    let copper: Vec<(usize, f64)> = cells.into_iter().filter(|&(cell, _)| stands(cell)).collect();
    if copper.is_empty() {
        let cell = nearest_cell(&mask.grid, spot, stands)?;
        return Some((vec![(cell, 1.0)], mask.island[cell]));
    }
    // The island that holds most of the circle, of equal ones the first.
    let mut best = (0.0, NO_ISLAND);
    for &(cell, _) in &copper {
        let island = mask.island[cell];
        let part: f64 = copper.iter().filter(|(c, _)| mask.island[*c] == island).map(|(_, w)| w).sum();
        if part > best.0 {
            best = (part, island);
        }
    }
    let own = copper.into_iter().filter(|(cell, _)| mask.island[*cell] == best.1);
    Some((own.map(|(cell, weight)| (cell, weight / best.0)).collect(), best.1))
}

/// Columns and rows of the cells that a box meets, clipped to the grid.
fn span(grid: &Grid, bounds: crate::geom::Bounds) -> [std::ops::Range<usize>; 2] {
    let index = |metres: f64, limit: usize| (metres / grid.cell_m).clamp(0.0, limit as f64);
    let range =
        |low: f64, high: f64, limit| index(low, limit).floor() as usize..index(high, limit).ceil() as usize;
    let (min, max) = (bounds.min - grid.origin, bounds.max - grid.origin);
    [range(min.x, max.x, grid.nx), range(min.y, max.y, grid.ny)]
}

/// Cells under the circle with the area that it covers of each, in cells.
fn covered_cells(grid: &Grid, spot: &Spot) -> Vec<(usize, f64)> {
    let circle = disc(spot.at, spot.radius_m.max(1e-6));
    let [columns, rows] = span(grid, circle.bounds());
    if columns.is_empty() || rows.is_empty() {
        return Vec::new();
    }
    let part = Grid {
        origin: grid.origin + Point::new(columns.start as f64, rows.start as f64) * grid.cell_m,
        cell_m: grid.cell_m,
        nx: columns.len(),
        ny: rows.len(),
    };
    let covered = raster::coverage(&Region(vec![circle]), &part);
    let cell = |at: usize| grid.index(columns.start + at % part.nx, rows.start + at / part.nx);
    covered.iter().enumerate().filter(|(_, part)| **part > 0.0).map(|(at, part)| (cell(at), *part)).collect()
}

/// The cell for which `stands` holds that is nearest to a spot on the grid, no farther than its radius and two cells.
fn nearest_cell(grid: &Grid, spot: &Spot, stands: impl Fn(usize) -> bool) -> Option<usize> {
    grid.cell_at(spot.at)?;
    let reach = spot.radius_m + 2.0 * grid.cell_m;
    let [columns, rows] = span(grid, crate::geom::Bounds::of([spot.at]).grown(reach));
    let cells = rows.flat_map(|iy| columns.clone().map(move |ix| (ix, iy)));
    let distances = cells
        .filter(|&(ix, iy)| stands(grid.index(ix, iy)))
        .map(|(ix, iy)| (grid.centre(ix, iy).distance(spot.at), grid.index(ix, iy)));
    let nearest = distances.min_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)))?;
    (nearest.0 <= reach).then_some(nearest.1)
}
