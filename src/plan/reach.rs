//! From a place on copper to the nearest sheet: directly, or through the copper of its net and its barrels.
//!
//! The way counts with its resistance and its own inductance, of a track above its plane: L = L'(w/h) l with the
//! microstrip's L' of `spread::microstrip`, h from the place's layer to that of the sheet; and for a barrel from layer
//! to layer (mu0 s/2 pi) ln(D/a) with D = 1 mm, one via's share of the loop of two in a plane pair (physics: image in
//! two perfect planes). It is left out where the place lies on a sheet: there the cells carry the way.

use super::sheets::{Piece, Sheets};
use super::terrain::Terrain;
use super::{End, barrel};
use crate::board::{NetId, Pin};
use crate::geom::Point;
use crate::spread::microstrip::inductance_per_m;
use crate::unit::constants::MU0;
use std::collections::BTreeSet;
use std::f64::consts::PI;

/// Distance of the opposite current that a barrel's share of a loop is reckoned to, in metres.
const OPPOSITE_M: f64 = 1e-3;
/// A way longer than this leads nowhere near, in metres.
const LONGEST_M: f64 = 10e-3;
/// Width of the copper of a way where no pad tells, in metres.
const WIDTH_M: f64 = 0.3e-3;

/// A place on a sheet and the way to it.
#[derive(Clone, Debug, PartialEq)]
pub struct Reached {
    /// The piece.
    pub piece: Piece,
    /// Middle of the circle over which the current enters.
    pub at: Point,
    /// Its radius in metres.
    pub radius_m: f64,
    /// Whether a barrel leads there (else a pad or a spot on the sheet).
    pub through_via: bool,
    /// Length of the way in metres.
    pub length_m: f64,
    /// Resistance of the way in ohm.
    pub resistance_ohm: f64,
    /// Inductance of the way in henry.
    pub inductance_h: f64,
}

impl Reached {
    /// The place as an end of a joint or an entry.
    pub fn end(&self) -> End {
        End::Copper { layer: self.piece.0, area: self.piece.1, at: self.at, radius_m: self.radius_m }
    }
}

/// A way being walked.
#[derive(Clone)]
struct Walk {
    piece: Piece,
    at: Point,
    length_m: f64,
    resistance_ohm: f64,
    inductance_h: f64,
}

/// Looks for sheets.
#[derive(Clone, Copy)]
pub struct Reach<'t, 'b> {
    /// The board.
    pub terrain: &'t Terrain<'b>,
    /// The sheets.
    pub sheets: &'t Sheets,
}

impl Reach<'_, '_> {
    /// From a pin of a part.
    pub fn of_pin(&self, pin: &Pin) -> Option<Reached> {
        let board = self.terrain.board;
        if let Some(hole) = pin.hole {
            // Of the sheets that the barrel touches the one nearest to the part's side.
            let touched = self.sheets_at(hole, pin.net);
            let nearest =
                touched.into_iter().min_by_key(|&(layer, area)| (layer.abs_diff(pin.layer), layer, area));
            if let Some(piece) = nearest {
                let drilled = &board.holes[hole];
                let length_m = board.stackup.gap_m(pin.layer, piece.0);
                return Some(Reached {
                    piece,
                    at: drilled.centre(),
                    radius_m: barrel::radius_m(drilled),
                    through_via: false,
                    length_m,
                    resistance_ohm: barrel::resistance_ohm(self.terrain, drilled, length_m),
                    inductance_h: barrel_inductance_h(length_m, barrel::radius_m(drilled)),
                });
            }
        }
        let area = self.terrain.copper_of_net(pin.layer, pin.at, pin.net?)?;
        let radius_m = (pin.pad.area() / PI).max(0.0).sqrt();
        let width_m = if radius_m > 0.0 { radius_m.min(2.0 * WIDTH_M) } else { WIDTH_M };
        self.of_piece((pin.layer, area), pin.at, radius_m.max(0.5 * WIDTH_M), width_m)
    }

    /// From a spot on a piece of copper; `radius_m` is that of the spot, `width_m` that of the copper leading away.
    pub fn of_piece(&self, piece: Piece, at: Point, radius_m: f64, width_m: f64) -> Option<Reached> {
        if self.sheets.holds(piece) {
            return Some(Reached {
                piece,
                at,
                radius_m,
                through_via: false,
                length_m: 0.0,
                resistance_ohm: 0.0,
                inductance_h: 0.0,
            });
        }
        let board = self.terrain.board;
        let mut open = vec![Walk { piece, at, length_m: 0.0, resistance_ohm: 0.0, inductance_h: 0.0 }];
        let mut seen: BTreeSet<usize> = BTreeSet::new();
        let mut best: Option<Reached> = None;
        // The shortest way first; a board has few barrels on copper that is no sheet.
        while let Some(next) = (0..open.len()).min_by(|&a, &b| open[a].length_m.total_cmp(&open[b].length_m))
        {
            let walk = open.swap_remove(next);
            if walk.length_m > best.as_ref().map_or(LONGEST_M, |found| found.length_m) {
                break;
            }
            for &hole in self.terrain.barrels_of(walk.piece.0, walk.piece.1) {
                let drilled = &board.holes[hole];
                let along_m = drilled.centre().distance(walk.at);
                let down = |piece: Piece| {
                    let depth_m = board.stackup.gap_m(walk.piece.0, piece.0);
                    let height_m = depth_m.max(1e-6);
                    let foil_m = board.stackup.foils[walk.piece.0].thickness_m;
                    let track_ohm = barrel::resistivity_ohm_m(board) * along_m / (width_m * foil_m);
                    Walk {
                        piece,
                        at: drilled.centre(),
                        length_m: walk.length_m + along_m + depth_m,
                        resistance_ohm: walk.resistance_ohm
                            + track_ohm
                            + barrel::resistance_ohm(self.terrain, drilled, depth_m),
                        inductance_h: walk.inductance_h
                            + inductance_per_m(width_m / height_m) * along_m
                            + barrel_inductance_h(depth_m, barrel::radius_m(drilled)),
                    }
                };
                let net = self.terrain.net_of(walk.piece.0, walk.piece.1);
                let nearest = self
                    .sheets_at(hole, net)
                    .into_iter()
                    .min_by_key(|&(layer, area)| (layer.abs_diff(walk.piece.0), layer, area));
                if let Some(piece) = nearest {
                    let there = down(piece);
                    let shorter = best.as_ref().is_none_or(|known| there.length_m < known.length_m);
                    if shorter && there.length_m <= LONGEST_M {
                        best = Some(Reached {
                            piece,
                            at: there.at,
                            radius_m: barrel::radius_m(drilled),
                            through_via: true,
                            length_m: there.length_m,
                            resistance_ohm: there.resistance_ohm,
                            inductance_h: there.inductance_h,
                        });
                    }
                } else if seen.insert(hole) {
                    let others = drilled.contacts.iter().filter(|&&other| {
                        other != walk.piece && self.terrain.net_of(other.0, other.1) == net
                    });
                    open.extend(others.map(|&other| down(other)));
                }
            }
        }
        best
    }

    /// Sheets of `net` that a barrel touches.
    pub fn sheets_at(&self, hole: usize, net: Option<NetId>) -> Vec<Piece> {
        let contacts = self.terrain.board.holes[hole].contacts.iter().copied();
        contacts
            .filter(|&piece| self.sheets.holds(piece) && self.terrain.net_of(piece.0, piece.1) == net)
            .collect()
    }
}

/// One barrel's share of the loop of two in a plane pair, (mu0 s/2 pi) ln(D/a), in henry.
fn barrel_inductance_h(length_m: f64, radius_m: f64) -> f64 {
    MU0 * length_m / (2.0 * PI) * libm::log((OPPOSITE_M / radius_m.max(1e-6)).max(1.0))
}
