//! What drives the plane: the track as source strips at their heights, and the landings as patches of cells.
//!
//! Height: the current lies at mid-copper at low frequency and at the facing surface at high; see
//! [`Foil::current_depth_m`], which is applied to plane and track alike.
//! Profile: even across the width below f = 2 Rs/(pi mu0 w), where the skin depth is sqrt(w t/2) and half the width
//! is the decay length 2 Rs/(w mu0) of the track's own foil; edge-crowded above.

use super::foil::Foil;
use super::mask::{Mask, NO_ISLAND};
use super::track::{Run, gmd_edge, gmd_even};
use crate::board::Board;
use crate::geom::{Grid, Point, Polygon, Region, raster};
use crate::plan::{Landing, TrackLeg};
use crate::sheet::{Patch, SourceStrip, StripProfile};
use crate::unit::constants::MU0;
use std::f64::consts::PI;

/// Legs of a track over one plane, ready to be asked for a frequency.
#[derive(Clone, Debug)]
pub struct Source<'a> {
    board: &'a Board,
    plane_layer: usize,
    legs: &'a [TrackLeg],
}

impl<'a> Source<'a> {
    /// The legs over the plane on layer `plane_layer` (index from 0).
    pub fn new(board: &'a Board, plane_layer: usize, legs: &'a [TrackLeg]) -> Self {
        Self { board, plane_layer, legs }
    }

    /// Foil of a layer at the board's temperature.
    pub fn foil(&self, layer: usize) -> Foil {
        Foil::new(self.board.stackup.foils[layer].thickness_m, self.board.stackup.temperature_c)
    }

    /// Height of a leg's current over the plane's current in metres.
    pub fn height_m(&self, leg: &TrackLeg, frequency_hz: f64) -> f64 {
        let gap_m = self.board.stackup.gap_m(leg.layer, self.plane_layer);
        let depth_m = |layer| self.foil(layer).current_depth_m(frequency_hz, gap_m);
        gap_m + depth_m(leg.layer) + depth_m(self.plane_layer)
    }

    /// Length-weighted mean of [`Self::height_m`] in metres.
    pub fn mean_height_m(&self, frequency_hz: f64) -> f64 {
        self.mean(|leg| self.height_m(leg, frequency_hz))
    }

    /// Length-weighted mean width in metres.
    pub fn mean_width_m(&self) -> f64 {
        self.mean(|leg| leg.width_m)
    }

    fn mean(&self, value: impl Fn(&TrackLeg) -> f64) -> f64 {
        let length = |leg: &TrackLeg| leg.from.distance(leg.to);
        let total: f64 = self.legs.iter().map(length).sum();
        self.legs.iter().map(|leg| length(leg) * value(leg)).sum::<f64>() / total
    }

    /// Frequency in Hz above which the current of a leg crowds at its edges.
    pub fn crowding_hz(&self, leg: &TrackLeg) -> f64 {
        2.0 * self.foil(leg.layer).resistance_ohm() / (PI * MU0 * leg.width_m)
    }

    fn profile(&self, leg: &TrackLeg, frequency_hz: f64) -> StripProfile {
        if frequency_hz > self.crowding_hz(leg) { StripProfile::Edge } else { StripProfile::Uniform }
    }

    /// Source strips, plane at z = 0.
    pub fn strips(&self, frequency_hz: f64) -> Vec<SourceStrip> {
        let strip = |leg: &TrackLeg| SourceStrip {
            from: leg.from,
            to: leg.to,
            z_m: self.height_m(leg, frequency_hz),
            width_m: leg.width_m,
            profile: self.profile(leg, frequency_hz),
            current_a: 1.0,
        };
        self.legs.iter().filter(|leg| leg.from != leg.to).map(strip).collect()
    }

    /// The legs as the track's own inductance sees them.
    pub fn runs(&self, frequency_hz: f64) -> Vec<Run> {
        let run = |leg: &TrackLeg| Run {
            from: leg.from,
            to: leg.to,
            z_m: self.height_m(leg, frequency_hz),
            gmd_m: match self.profile(leg, frequency_hz) {
                StripProfile::Uniform => {
                    gmd_even(leg.width_m, self.board.stackup.foils[leg.layer].thickness_m)
                }
                StripProfile::Edge => gmd_edge(leg.width_m),
            },
        };
        self.legs.iter().filter(|leg| leg.from != leg.to).map(run).collect()
    }

    /// Resistance of the track in ohm.
    pub fn resistance_ohm(&self, frequency_hz: f64) -> f64 {
        let leg = |leg: &TrackLeg| {
            leg.from.distance(leg.to) / leg.width_m * self.foil(leg.layer).zs_ohm(frequency_hz).re
        };
        self.legs.iter().map(leg).sum()
    }
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

/// Cells of one island under the circle of a landing, weighted by area, and the island; none where the circle and
/// the two cells round it hold no copper.
pub fn landing_patch(mask: &Mask, landing: &Landing) -> Option<(Patch, u32)> {
    let cells = covered_cells(&mask.grid, landing);
    let copper: Vec<(usize, f64)> = cells.into_iter().filter(|&(cell, _)| mask.copper[cell]).collect();
    let (island, patch) = if copper.is_empty() {
        let cell = nearest_copper(mask, landing)?;
        (mask.island[cell], vec![(cell, 1.0)])
    } else {
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
        (best.1, own.map(|(cell, weight)| (cell, weight / best.0)).collect())
    };
    Some((Patch { sheet: 0, cells: patch }, island))
}

/// Cells under the circle with the area that it covers of each, in cells.
fn covered_cells(grid: &Grid, landing: &Landing) -> Vec<(usize, f64)> {
    let circle = disc(landing.at, landing.radius_m.max(1e-6));
    let bounds = circle.bounds();
    let index =
        |metres: f64, limit: usize| (metres / grid.cell_m).floor().clamp(0.0, limit as f64 - 1.0) as usize;
    let (x0, x1) =
        (index(bounds.min.x - grid.origin.x, grid.nx), index(bounds.max.x - grid.origin.x, grid.nx));
    let (y0, y1) =
        (index(bounds.min.y - grid.origin.y, grid.ny), index(bounds.max.y - grid.origin.y, grid.ny));
    let part = Grid {
        origin: grid.origin + Point::new(x0 as f64, y0 as f64) * grid.cell_m,
        cell_m: grid.cell_m,
        nx: x1 - x0 + 1,
        ny: y1 - y0 + 1,
    };
    let covered = raster::coverage(&Region(vec![circle]), &part);
    let cell = |at: usize| grid.index(x0 + at % part.nx, y0 + at / part.nx);
    covered.iter().enumerate().filter(|(_, part)| **part > 0.0).map(|(at, part)| (cell(at), *part)).collect()
}

/// The copper cell nearest to a landing, no farther than its radius and two cells.
fn nearest_copper(mask: &Mask, landing: &Landing) -> Option<usize> {
    let grid = &mask.grid;
    let reach = landing.radius_m + 2.0 * grid.cell_m;
    let copper = (0..grid.len()).filter(|&cell| mask.copper[cell]);
    let distance = |cell: usize| grid.centre(cell % grid.nx, cell / grid.nx).distance(landing.at);
    let nearest = copper.map(|cell| (distance(cell), cell)).min_by(|a, b| a.0.total_cmp(&b.0))?;
    (nearest.0 <= reach).then_some(nearest.1)
}
