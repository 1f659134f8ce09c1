//! Where the return leaves and enters a plane: pins of the parts, vias, or what the review names.

use super::Landing;
use super::terrain::{Terrain, Via};
use crate::board::{Pin, PinId};
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::field::PlaneId;
use crate::geom::Point;
use crate::review::LandingRequest;
use crate::unit::length_text;

/// How far a via may lie from a pin without a reference pin, in metres.
const REACH_M: f64 = 3e-3;
/// A point of the review nearer to a via's barrel than this means the via, in metres.
const AT_VIA_M: f64 = 0.5e-3;

/// A landing and the piece of the plane's copper that it lies on.
#[derive(Clone, Debug)]
pub struct Landed {
    /// The landing.
    pub landing: Landing,
    /// Index of the area on the plane's layer.
    pub area: usize,
    /// What was assumed, in words.
    pub assumed: Option<String>,
}

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

    /// The plane.
    pub fn plane(&self) -> &PlaneId {
        self.plane
    }

    /// The landing at a signal's pin; `key` is the key of the review that would name it.
    pub fn at_pin(
        &self,
        signal: PinId,
        request: Option<&LandingRequest>,
        key: &str,
    ) -> Result<Landed, Diagnostic> {
        let signal = &self.terrain.board.pins[signal.0 as usize];
        match request {
            Some(LandingRequest::Pin(label)) => self.named_pin(label, key),
            Some(LandingRequest::At(point)) => self.named_point(*point, key),
            None => self.own_pin(signal, key),
        }
    }

    fn own_pin(&self, signal: &Pin, key: &str) -> Result<Landed, Diagnostic> {
        let board = self.terrain.board;
        let of_plane =
            |pin: &&Pin| pin.part == signal.part && self.terrain.net_name(pin.net) == self.plane.net;
        let mut own: Vec<&Pin> = board.pins.iter().filter(of_plane).collect();
        own.sort_by(|a, b| a.at.distance(signal.at).total_cmp(&b.at.distance(signal.at)));
        if let Some(landed) = own.iter().find_map(|pin| self.through_pin(pin)) {
            return Ok(landed);
        }
        let nearest = self.nearest_via(signal.at);
        if let Some((via, distance)) = nearest.filter(|found| found.1 <= REACH_M) {
            let assumed = format!(
                "part `{}` has no `{}` pin that leads to `{}`; the via {} from `{}` is taken",
                signal.part,
                self.plane.net,
                self.plane,
                length_text(distance),
                signal.label()
            );
            let what = format!("via {} from {}", length_text(distance), signal.label());
            return Ok(Landed { assumed: Some(assumed), ..self.at_via(via, what) });
        }
        let farther = match nearest {
            Some((_, distance)) => format!("the nearest via is {} away", length_text(distance)),
            None => "the plane has no via at all".into(),
        };
        let text = format!(
            "return of pin `{}` must reach plane `{}`: part `{}` has no `{}` pin that leads to it, and {farther}",
            signal.label(),
            self.plane,
            signal.part,
            self.plane.net
        );
        let hint = format!("name the pin or point where the return reaches the plane with `{key}`");
        Err(Diagnostic::warning(code::LANDING_NONE, text)
            .on_board(Some(signal.layer + 1), signal.at)
            .hint(hint))
    }

    fn named_pin(&self, label: &str, key: &str) -> Result<Landed, Diagnostic> {
        let bad = |why: String| {
            let text = format!("{key} `{label}` must be a pin that leads to plane `{}`; {why}", self.plane);
            Err(Diagnostic::error(code::LANDING_BAD, text))
        };
        let Some(pin) = self.terrain.board.pins.iter().find(|pin| pin.label() == label) else {
            return bad("the board has no such pin".into());
        };
        if self.terrain.net_name(pin.net) != self.plane.net {
            return bad(format!("it is on net `{}`", self.terrain.net_name(pin.net)));
        }
        match self.through_pin(pin) {
            Some(landed) => Ok(landed),
            None => bad("no via of its copper reaches the plane".into()),
        }
    }

    fn named_point(&self, point: Point, key: &str) -> Result<Landed, Diagnostic> {
        let nearest = self.nearest_via(point);
        if let Some((via, distance)) = nearest
            && distance <= AT_VIA_M + 0.5 * self.terrain.board.holes[via.hole].diameter_m
        {
            return Ok(self.at_via(via, "via named in the review".into()));
        }
        if let Some(area) = self.area_at(point) {
            const RADIUS_M: f64 = 0.15e-3;
            let landing = Landing { at: point, radius_m: RADIUS_M, what: "point named in the review".into() };
            return Ok(Landed { landing, area, assumed: None });
        }
        match nearest.filter(|found| found.1 <= REACH_M) {
            Some((via, distance)) => {
                let assumed = format!(
                    "the point of `{key}` is not on plane `{}`; the via {} away is taken",
                    self.plane,
                    length_text(distance)
                );
                Ok(Landed {
                    assumed: Some(assumed),
                    ..self.at_via(via, "via near the point of the review".into())
                })
            }
            None => {
                let text = format!("{key} must be a point on plane `{}` or near a via of it", self.plane);
                Err(Diagnostic::error(code::LANDING_BAD, text).on_board(Some(self.plane.layer + 1), point))
            }
        }
    }

    /// From a pin of the plane's net down to the plane: its own barrel, its pad, or the nearest via of its copper.
    fn through_pin(&self, pin: &Pin) -> Option<Landed> {
        let board = self.terrain.board;
        if let Some(hole) = pin.hole
            && let Some(&via) = self.vias.iter().find(|via| via.hole == hole)
        {
            return Some(self.at_via(via, format!("pin {}", pin.label())));
        }
        if pin.layer == self.plane.layer {
            let area = self.area_at(pin.at)?;
            let radius_m = (pin.pad.area() / std::f64::consts::PI).max(0.0).sqrt();
            let landing = Landing { at: pin.at, radius_m, what: format!("pad of {}", pin.label()) };
            return Some(Landed { landing, area, assumed: None });
        }
        let own = self.terrain.copper_of_net(pin.layer, pin.at, pin.net?)?;
        let distance = |via: &&Via| board.holes[via.hole].centre().distance(pin.at);
        let joined =
            self.vias.iter().filter(|via| board.holes[via.hole].contacts.contains(&(pin.layer, own)));
        let via = joined.min_by(|a, b| distance(a).total_cmp(&distance(b)))?;
        Some(self.at_via(*via, format!("via of {}", pin.label())))
    }

    fn area_at(&self, point: Point) -> Option<usize> {
        let layer = self.plane.layer;
        let found = self.terrain.copper_at(layer, point);
        found
            .into_iter()
            .find(|&area| self.terrain.net_name(self.terrain.net_of(layer, area)) == self.plane.net)
    }

    fn at_via(&self, via: Via, what: String) -> Landed {
        let hole = &self.terrain.board.holes[via.hole];
        let landing = Landing { at: hole.centre(), radius_m: 0.5 * hole.diameter_m, what };
        Landed { landing, area: via.area, assumed: None }
    }

    fn nearest_via(&self, point: Point) -> Option<(Via, f64)> {
        let distance = |via: &Via| self.terrain.board.holes[via.hole].centre().distance(point);
        let found = self.vias.iter().map(|&via| (via, distance(&via)));
        found.min_by(|a, b| a.1.total_cmp(&b.1))
    }

    /// The via nearest to `point` that also reaches the plane of `other`: landings on both.
    pub fn joint(&self, other: &Landings<'_, '_>, point: Point) -> Option<(Landed, Landed)> {
        let board = self.terrain.board;
        let distance = |via: &Via| board.holes[via.hole].centre().distance(point);
        let both = self.vias.iter().filter_map(|&via| {
            let there = other.vias.iter().find(|there| there.hole == via.hole)?;
            Some((via, *there))
        });
        let (here, there) = both.min_by(|a, b| distance(&a.0).total_cmp(&distance(&b.0)))?;
        let what = format!("via {} from the layer change", length_text(distance(&here)));
        Some((self.at_via(here, what.clone()), other.at_via(there, what)))
    }
}
