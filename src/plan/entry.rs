//! Where a path's return enters and leaves the sheets: the reference pins of its parts, vias, or what the review names.
//!
//! A part with several reference pins has them tied together inside: a node outside the board from which one joint
//! leads to each, so that the return divides by the solution. A way that lies outside the sheets (pad to via) is in
//! the joint; with a single pin it is left out, since all of the current takes it.

use super::barrel;
use super::course::Course;
use super::reach::{Reach, Reached};
use super::route::{Port, PortPlace};
use super::{End, Joint, JointKind};
use crate::board::{Pin, Plating};
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
/// Radius of a spot of copper that the review names, in metres.
const SPOT_M: f64 = 0.15e-3;
/// Resistance inside a part from one reference pin to the tie, in ohm: small beside a barrel's.
pub const INSIDE_OHM: f64 = 0.1e-3;

/// Names of the nodes outside the board's copper.
#[derive(Clone, Debug, Default)]
pub struct Nodes(pub Vec<String>);

impl Nodes {
    /// The node of a name.
    pub fn named(&mut self, name: &str) -> usize {
        if let Some(known) = self.0.iter().position(|known| known == name) {
            return known;
        }
        self.0.push(name.into());
        self.0.len() - 1
    }
}

/// An end of a path on the sheets.
#[derive(Clone, Debug)]
pub struct Landed {
    /// Where the current enters.
    pub end: End,
    /// What it is in words.
    pub what: String,
    /// Joints of the part's pins.
    pub joints: Vec<Joint>,
    /// What was assumed, in words.
    pub assumed: Option<String>,
}

/// Looks for the ends of paths.
pub struct Finder<'t, 'b> {
    /// The way to the sheets.
    pub reach: Reach<'t, 'b>,
    /// Parts whose reference pins are tied inside, with the node of each: see `[[part]]` with `joins`.
    pub tied: &'t [(String, usize)],
}

impl Finder<'_, '_> {
    /// Where a port of a path lies on the sheets; `plane` is the plane nearest to the track there. An error comes with
    /// the key of the review that can mend it.
    pub fn land(
        &self,
        course: &Course<'_>,
        port: &Port,
        plane: &PlaneId,
        nodes: &mut Nodes,
    ) -> Result<Landed, (&'static str, Diagnostic)> {
        let pins = &self.reach.terrain.board.pins;
        let (pin, request, key) = match port.place {
            PortPlace::Driver(pin) => (pin, course.driver_landing, "driver_landing"),
            PortPlace::Receiver(pin) => (pin, course.receiver_landing, "receiver_landing"),
            PortPlace::Pin(pin) => {
                let label = pins[pin.0 as usize].label();
                return self.named_pin(&label, "through").map_err(|message| ("through", message));
            }
            PortPlace::Area { layer, area, at, radius_m } => {
                let end = End::Copper { layer, area, at, radius_m };
                let what =
                    format!("way into `L{}-{}`", layer + 1, self.reach.terrain.net_name_of(layer, area));
                return Ok(Landed { end, what, joints: Vec::new(), assumed: None });
            }
        };
        let landed = match request {
            Some(LandingRequest::Pin(label)) => self.named_pin(label, key),
            Some(LandingRequest::At(point)) => self.named_point(*point, plane, key),
            None => self.own_pins(&pins[pin.0 as usize], plane, key, nodes),
        };
        landed.map_err(|message| (key, message))
    }

    fn own_pins(
        &self,
        signal: &Pin,
        plane: &PlaneId,
        key: &str,
        nodes: &mut Nodes,
    ) -> Result<Landed, Diagnostic> {
        if let Some((part, node)) = self.tied.iter().find(|tied| tied.0 == signal.part) {
            let what = format!("inside of {part}");
            return Ok(Landed { end: End::Node(*node), what, joints: Vec::new(), assumed: None });
        }
        let terrain = self.reach.terrain;
        let of_part = |pin: &&Pin| pin.part == signal.part && terrain.is_reference(pin.net);
        let mut pins: Vec<(&Pin, Reached)> = Vec::new();
        for pin in terrain.board.pins.iter().filter(of_part) {
            pins.extend(self.reach.of_pin(pin).map(|reached| (pin, reached)));
        }
        pins.sort_by(|a, b| a.0.at.distance(signal.at).total_cmp(&b.0.at.distance(signal.at)));
        // Pins of the net of the nearest plane, or of that of the nearest pin.
        let of_plane = pins.iter().find(|pin| terrain.net_name(pin.0.net) == plane.net);
        if let Some(net) = of_plane.or(pins.first()).map(|pin| pin.0.net) {
            pins.retain(|pin| pin.0.net == net);
            return Ok(tied_inside(signal, terrain.net_name(net), &pins, nodes));
        }
        let nearest = self.nearest_via(signal.at);
        if let Some((reached, distance)) = nearest.as_ref().filter(|found| found.1 <= REACH_M) {
            let assumed = format!(
                "part `{}` has no reference pin that leads to a plane; the via {} from `{}` is taken",
                signal.part,
                length_text(*distance),
                signal.label()
            );
            let what = format!("via {} from {}", length_text(*distance), signal.label());
            return Ok(Landed { end: reached.end(), what, joints: Vec::new(), assumed: Some(assumed) });
        }
        let farther = match nearest {
            Some((_, distance)) => format!("the nearest via is {} away", length_text(distance)),
            None => "the board has no via of a reference net".into(),
        };
        let text = format!(
            "return of pin `{}` must reach a reference plane: part `{}` has no reference pin that leads to one, and \
             {farther}",
            signal.label(),
            signal.part
        );
        let hint = format!("name the pin or point where the return reaches the plane with `{key}`");
        Err(Diagnostic::warning(code::LANDING_NONE, text)
            .on_board(Some(signal.layer + 1), signal.at)
            .hint(hint))
    }

    fn named_pin(&self, label: &str, key: &str) -> Result<Landed, Diagnostic> {
        let terrain = self.reach.terrain;
        let bad = |why: String| {
            let text =
                format!("{key} `{label}` must be a pin that leads to copper that carries return; {why}");
            Err(Diagnostic::error(code::LANDING_BAD, text))
        };
        let Some(pin) = terrain.board.pins.iter().find(|pin| pin.label() == label) else {
            return bad("the board has no such pin".into());
        };
        match self.reach.of_pin(pin) {
            Some(reached) => Ok(Landed {
                end: reached.end(),
                what: way_in_words(pin, &reached),
                joints: vec![],
                assumed: None,
            }),
            None => bad(format!(
                "it is on net `{}`, and no via of its copper reaches a plane",
                terrain.net_name(pin.net)
            )),
        }
    }

    fn named_point(&self, point: Point, plane: &PlaneId, key: &str) -> Result<Landed, Diagnostic> {
        let terrain = self.reach.terrain;
        let landed = |reached: &Reached, what: &str, assumed: Option<String>| Landed {
            end: reached.end(),
            what: what.into(),
            joints: Vec::new(),
            assumed,
        };
        let nearest = self.nearest_via(point);
        if let Some((reached, distance)) = &nearest
            && *distance <= AT_VIA_M + reached.radius_m
        {
            return Ok(landed(reached, "via named in the review", None));
        }
        // The plane of the chart first, then other reference copper from the top.
        let layers = std::iter::once(plane.layer).chain(0..terrain.board.layers.len());
        for layer in layers {
            let here = terrain.copper_at(layer, point).into_iter();
            let mut here = here.filter(|&area| terrain.is_reference(terrain.net_of(layer, area)));
            if let Some(reached) = here.find_map(|area| {
                self.reach
                    .sheets
                    .holds((layer, area))
                    .then(|| self.reach.of_piece((layer, area), point, SPOT_M, SPOT_M))?
            }) {
                return Ok(landed(&reached, "point named in the review", None));
            }
        }
        match nearest.filter(|found| found.1 <= REACH_M) {
            Some((reached, distance)) => {
                let away = length_text(distance);
                let assumed =
                    format!("the point of `{key}` is not on reference copper; the via {away} away is taken");
                Ok(landed(&reached, "via near the point of the review", Some(assumed)))
            }
            None => {
                let text = format!("{key} must be a point on reference copper or near a via of it");
                Err(Diagnostic::error(code::LANDING_BAD, text).on_board(Some(plane.layer + 1), point))
            }
        }
    }

    /// The barrel of a reference net that is nearest to a point and touches a sheet: the topmost one.
    fn nearest_via(&self, point: Point) -> Option<(Reached, f64)> {
        let terrain = self.reach.terrain;
        let mut best: Option<(Reached, f64)> = None;
        for (index, hole) in terrain.board.holes.iter().enumerate() {
            let distance = hole.centre().distance(point);
            if hole.plating != Plating::Plated || best.as_ref().is_some_and(|known| known.1 <= distance) {
                continue;
            }
            let sheets = terrain.reference_nets().find_map(|net| {
                let sheets = self.reach.sheets_at(index, Some(net));
                sheets.into_iter().min()
            });
            if let Some(piece) = sheets {
                let reached = Reached {
                    piece,
                    at: hole.centre(),
                    radius_m: barrel::radius_m(hole),
                    through_via: true,
                    length_m: 0.0,
                    resistance_ohm: 0.0,
                    inductance_h: 0.0,
                };
                best = Some((reached, distance));
            }
        }
        best
    }
}

/// What leads a pin to its sheet, in words.
pub fn way_in_words(pin: &Pin, reached: &Reached) -> String {
    if reached.through_via {
        format!("via of {}", pin.label())
    } else if pin.hole.is_some() {
        format!("pin {}", pin.label())
    } else {
        format!("pad of {}", pin.label())
    }
}

/// The reference pins of a part as one end: the place itself, or a node that joins several.
fn tied_inside(signal: &Pin, net: &str, pins: &[(&Pin, Reached)], nodes: &mut Nodes) -> Landed {
    let mut places: Vec<&(&Pin, Reached)> = Vec::new();
    for pin in pins {
        if !places.iter().any(|known| known.1.piece == pin.1.piece && known.1.at == pin.1.at) {
            places.push(pin);
        }
    }
    if let [(pin, reached)] = places[..] {
        return Landed {
            end: reached.end(),
            what: way_in_words(pin, reached),
            joints: Vec::new(),
            assumed: None,
        };
    }
    let what = format!("`{net}` pins of {}", signal.part);
    let node = nodes.named(&what);
    let joint = |(pin, reached): &&(&Pin, Reached)| inside(node, way_in_words(pin, reached), reached);
    Landed { end: End::Node(node), what, joints: places.iter().map(joint).collect(), assumed: None }
}

/// The joint from a node inside a part to a place on a sheet.
pub fn inside(node: usize, what: String, reached: &Reached) -> Joint {
    Joint {
        kind: JointKind::Inside,
        what,
        at: reached.at,
        from: End::Node(node),
        to: reached.end(),
        resistance_ohm: INSIDE_OHM + reached.resistance_ohm,
        inductance_h: reached.inductance_h,
        capacitance_f: None,
        barrel_radius_m: None,
    }
}
