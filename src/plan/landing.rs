//! Where the return of a chart enters and leaves its plane, for pictures and figures: pins of the parts, vias, or what
//! the review names. What is solved is in the path's entries.

use super::Landing;
use super::terrain::{Terrain, Via};
use crate::board::{Pin, PinId};
use crate::field::PlaneId;
use crate::geom::Point;
use crate::review::LandingRequest;
use crate::unit::length_text;

/// How far a via may lie from a pin without a reference pin, in metres.
const REACH_M: f64 = 3e-3;
/// A point of the review nearer to a via's barrel than this means the via, in metres.
const AT_VIA_M: f64 = 0.5e-3;
/// Radius of a spot that the review names, in metres.
const SPOT_M: f64 = 0.15e-3;

/// Landings of one plane.
pub struct Landings<'t, 'b> {
    terrain: &'t Terrain<'b>,
    plane: &'t PlaneId,
    vias: Vec<Via>,
}

impl<'t, 'b> Landings<'t, 'b> {
    /// Prepares a plane.
    pub fn new(terrain: &'t Terrain<'b>, plane: &'t PlaneId) -> Self {
        Self { terrain, plane, vias: terrain.vias_to(plane) }
    }

    /// The landing at a signal's pin.
    pub fn at_pin(&self, signal: PinId, request: Option<&LandingRequest>) -> Option<Landing> {
        let board = self.terrain.board;
        let signal = &board.pins[signal.0 as usize];
        match request {
            Some(LandingRequest::Pin(label)) => {
                self.through_pin(board.pins.iter().find(|pin| pin.label() == *label)?)
            }
            Some(LandingRequest::At(point)) => self.named_point(*point),
            None => self.own_pin(signal),
        }
    }

    fn own_pin(&self, signal: &Pin) -> Option<Landing> {
        let of_plane =
            |pin: &&Pin| pin.part == signal.part && self.terrain.net_name(pin.net) == self.plane.net;
        let mut own: Vec<&Pin> = self.terrain.board.pins.iter().filter(of_plane).collect();
        own.sort_by(|a, b| a.at.distance(signal.at).total_cmp(&b.at.distance(signal.at)));
        own.iter().find_map(|pin| self.through_pin(pin)).or_else(|| {
            let (via, distance) = self.nearest_via(signal.at).filter(|found| found.1 <= REACH_M)?;
            Some(self.at_via(via, format!("via {} from {}", length_text(distance), signal.label())))
        })
    }

    fn named_point(&self, point: Point) -> Option<Landing> {
        let nearest = self.nearest_via(point);
        if let Some((via, distance)) = nearest
            && distance <= AT_VIA_M + 0.5 * self.terrain.board.holes[via.hole].diameter_m
        {
            return Some(self.at_via(via, "via named in the review".into()));
        }
        if self.on_plane(point) {
            let what = "point named in the review".into();
            return Some(Landing { at: point, radius_m: SPOT_M, what });
        }
        let (via, _) = nearest.filter(|found| found.1 <= REACH_M)?;
        Some(self.at_via(via, "via near the point of the review".into()))
    }

    /// From a pin of the plane's net down to the plane: its own barrel, its pad, or the nearest via of its copper.
    fn through_pin(&self, pin: &Pin) -> Option<Landing> {
        let board = self.terrain.board;
        if let Some(hole) = pin.hole
            && let Some(&via) = self.vias.iter().find(|via| via.hole == hole)
        {
            return Some(self.at_via(via, format!("pin {}", pin.label())));
        }
        if pin.layer == self.plane.layer {
            let radius_m = (pin.pad.area() / std::f64::consts::PI).max(0.0).sqrt();
            let landing = Landing { at: pin.at, radius_m, what: format!("pad of {}", pin.label()) };
            return self.on_plane(pin.at).then_some(landing);
        }
        let own = self.terrain.copper_of_net(pin.layer, pin.at, pin.net?)?;
        let distance = |via: &&Via| board.holes[via.hole].centre().distance(pin.at);
        let joined =
            self.vias.iter().filter(|via| board.holes[via.hole].contacts.contains(&(pin.layer, own)));
        let via = joined.min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
        Some(self.at_via(*via, format!("via of {}", pin.label())))
    }

    fn on_plane(&self, point: Point) -> bool {
        let layer = self.plane.layer;
        let mut found = self.terrain.copper_at(layer, point).into_iter();
        found.any(|area| self.terrain.net_name(self.terrain.net_of(layer, area)) == self.plane.net)
    }

    fn at_via(&self, via: Via, what: String) -> Landing {
        let hole = &self.terrain.board.holes[via.hole];
        Landing { at: hole.centre(), radius_m: 0.5 * hole.diameter_m, what }
    }

    fn nearest_via(&self, point: Point) -> Option<(Via, f64)> {
        let distance = |via: &Via| self.terrain.board.holes[via.hole].centre().distance(point);
        let found = self.vias.iter().map(|&via| (via, distance(&via)));
        found.min_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// The via nearest to `point` that also reaches the plane of `other`.
    pub fn joint(&self, other: &Landings<'_, '_>, point: Point) -> Option<Landing> {
        let board = self.terrain.board;
        let distance = |via: &Via| board.holes[via.hole].centre().distance(point);
        let both = self.vias.iter().filter(|via| other.vias.iter().any(|there| there.hole == via.hole));
        let via = both.min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
        Some(self.at_via(*via, format!("via {} from the change of plane", length_text(distance(via)))))
    }
}
