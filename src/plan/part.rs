//! Parts that join sheets: capacitors, beads, inductors, resistors and links with both pins on sheets, and parts that
//! tie reference nets inside.
//!
//! A part joins by its own when it has two pins on two nets, or on two pieces of one net, and its reference or the
//! review says what it is. A pin reaches a sheet through its own copper and vias; that way is in the joint, see `reach`.

use super::barrel::LEAST_OHM;
use super::entry::{Nodes, inside, way_in_words};
use super::reach::{Reach, Reached};
use super::request::matches;
use super::value::{Class, Values};
use super::{Joint, JointKind};
use crate::board::{NetId, Pin};
use crate::diag::code::plan as code;
use crate::diag::{Diagnostic, nearest};
use crate::review::Review;
use crate::review::joint::{Branch, PartRequest};
use std::collections::{BTreeMap, BTreeSet};

/// Most parts that a message lists.
const LISTED: usize = 8;

/// What parts join.
#[derive(Clone, Debug, Default)]
pub struct Parts {
    /// Joints.
    pub joints: Vec<Joint>,
    /// Parts that tie reference nets inside, with the node of each.
    pub tied: Vec<(String, usize)>,
    /// What was assumed, and what of the review cannot be done.
    pub messages: Vec<Diagnostic>,
}

/// Finds all parts that join sheets, in the order of their references; parts of net ties, named in `ties`, are not
/// among them.
pub fn joints(reach: Reach<'_, '_>, review: &Review, ties: &BTreeSet<&str>, nodes: &mut Nodes) -> Parts {
    let mut shop = Shop {
        reach,
        review,
        found: Parts::default(),
        used: vec![false; review.parts.len()],
        assumed: BTreeMap::new(),
        open: Vec::new(),
    };
    let mut by_part: BTreeMap<&str, Vec<&Pin>> = BTreeMap::new();
    for pin in &reach.terrain.board.pins {
        by_part.entry(&pin.part).or_default().push(pin);
    }
    for (part, pins) in &by_part {
        shop.part(part, pins, ties, nodes);
    }
    shop.unused(&by_part);
    shop.collected();
    shop.found
}

struct Shop<'t, 'b, 'r> {
    reach: Reach<'t, 'b>,
    review: &'r Review,
    found: Parts,
    /// Whether an entry of the review fits any part.
    used: Vec<bool>,
    /// Parts with default values by class.
    assumed: BTreeMap<Class, Vec<String>>,
    /// Resistors of unknown value that are taken as open.
    open: Vec<String>,
}

impl<'r> Shop<'_, '_, 'r> {
    /// The entry of the review for a part: names beat patterns, of others the first counts.
    fn request(
        &mut self,
        part: &str,
        value: Option<&str>,
        nets: &BTreeSet<NetId>,
    ) -> Option<&'r PartRequest> {
        let terrain = self.reach.terrain;
        let fits = |request: &PartRequest| {
            request.reference.as_ref().is_none_or(|pattern| matches(pattern, part))
                && request.value.as_ref().is_none_or(|wanted| value == Some(wanted))
                && request.nets.iter().all(|name| nets.iter().any(|&net| terrain.net_name(Some(net)) == name))
        };
        let all = &self.review.parts;
        let fitting: Vec<usize> = (0..all.len()).filter(|&k| fits(&all[k])).collect();
        fitting.iter().for_each(|&k| self.used[k] = true);
        let exact = fitting.iter().find(|&&k| all[k].reference.as_deref() == Some(part));
        exact.or(fitting.first()).map(|&k| &all[k])
    }

    fn part(&mut self, part: &str, pins: &[&Pin], ties: &BTreeSet<&str>, nodes: &mut Nodes) {
        let board = self.reach.terrain.board;
        let known = board.parts.binary_search_by(|known| known.reference.as_str().cmp(part));
        let value = known.ok().and_then(|at| board.parts[at].value.as_deref());
        let nets: BTreeSet<NetId> = pins.iter().filter_map(|pin| pin.net).collect();
        let request = self.request(part, value, &nets);
        if request.is_some_and(|request| !request.fitted) || ties.contains(part) {
            return;
        }
        if let Some(request) = request.filter(|request| !request.joins.is_empty()) {
            return self.tie_inside(part, pins, request, nodes);
        }
        let branch = request.map_or(Branch::default(), |request| request.branch);
        let class = Class::of(part);
        let asked = branch != Branch::default();
        if !asked && (class == Class::Other || pins.len() != 2) {
            return;
        }
        let Some((a, b)) = two_ends(pins, &nets) else {
            if let Some(request) =
                request.filter(|request| asked && request.reference.as_deref() == Some(part))
            {
                let text = format!(
                    "part `{part}` must have pins on two nets to be a joint between them; it has {} pins on {} nets",
                    pins.len(),
                    nets.len()
                );
                let message = Diagnostic::error(code::PART_NO_JOINT, text);
                self.message(request, "reference", message.hint("name two of its pins in a `[[tie]]`, or the reference nets that it ties inside with `joins`"));
            }
            return;
        };
        let (Some(from), Some(to)) = (self.reach.of_pin(a), self.reach.of_pin(b)) else { return };
        if from.piece == to.piece || (a.net == b.net && class == Class::Capacitor) {
            return;
        }
        let terrain = self.reach.terrain;
        let between_references = terrain.is_reference(a.net) && terrain.is_reference(b.net);
        let Some(values) = class.values(branch, value, between_references) else {
            self.open.push(part.into());
            return;
        };
        if values.assumed {
            self.assumed.entry(class).or_default().push(part.into());
        }
        self.found.joints.push(bridge(part, &from, &to, &values));
    }

    /// A node inside a part and a joint from it to each of the part's pins on the nets that it joins.
    fn tie_inside(&mut self, part: &str, pins: &[&Pin], request: &PartRequest, nodes: &mut Nodes) {
        let terrain = self.reach.terrain;
        for name in &request.joins {
            let has = pins.iter().any(|pin| pin.net.is_some() && terrain.net_name(pin.net) == name);
            // A pattern may fit parts that lack one of the nets.
            if !has && request.reference.as_deref() == Some(part) {
                let text =
                    format!("part `{part}` must have a pin on net `{name}` to join it inside; it has none");
                self.message(request, "joins", Diagnostic::error(code::PART_NO_JOINT, text));
            }
        }
        let mut places: Vec<(&Pin, Reached)> = Vec::new();
        for pin in pins.iter().filter(|pin| {
            pin.net.is_some() && request.joins.iter().any(|name| name == terrain.net_name(pin.net))
        }) {
            if let Some(reached) = self.reach.of_pin(pin)
                && !places.iter().any(|known| known.1.piece == reached.piece && known.1.at == reached.at)
            {
                places.push((pin, reached));
            }
        }
        if places.len() < 2 {
            return;
        }
        let node = nodes.named(&format!("inside of {part}"));
        self.found.tied.push((part.into(), node));
        for (pin, reached) in &places {
            let mut joint = inside(node, way_in_words(pin, reached), reached);
            joint.resistance_ohm += request.branch.resistance_ohm.unwrap_or(0.0);
            joint.inductance_h += request.branch.inductance_h.unwrap_or(0.0);
            joint.capacitance_f = request.branch.capacitance_f;
            self.found.joints.push(joint);
        }
    }

    fn message(&mut self, request: &PartRequest, key: &str, mut message: Diagnostic) {
        message.place.file = Some(self.review.file.clone());
        let mark = request.marks.get(key);
        message.place.line = Some(mark.as_ref().map_or(request.line, |mark| mark.0));
        message.place.span = mark.map(|mark| mark.1);
        self.found.messages.push(message);
    }

    /// Says which entries of the review fit no part.
    fn unused(&mut self, by_part: &BTreeMap<&str, Vec<&Pin>>) {
        for (k, request) in self.review.parts.iter().enumerate() {
            if self.used[k] {
                continue;
            }
            let (key, what) = match (&request.reference, &request.value) {
                (Some(reference), _) => ("reference", format!("reference `{reference}`")),
                (None, Some(value)) => ("value", format!("value `{value}`")),
                (None, None) => ("nets", format!("nets {}", listed(&request.nets))),
            };
            let text =
                format!("entry `part` {k} with {what} must fit a part of the board; it fits none", k = k + 1);
            let mut message = Diagnostic::error(code::PART_UNKNOWN, text);
            if let Some(near) =
                request.reference.as_ref().and_then(|name| nearest(name, by_part.keys().copied()))
            {
                message = message.hint(format!("did you mean `{near}`?"));
            }
            self.message(request, key, message);
        }
    }

    /// One message for all defaults of a class, and one for what is left open.
    fn collected(&mut self) {
        for (class, parts) in &self.assumed {
            let text = format!(
                "{} without a value are taken as {}: {}",
                class.plural(),
                class.defaults(),
                listed(parts)
            );
            let message = Diagnostic::warning(code::PART_VALUE_ASSUMED, text);
            self.found.messages.push(
                message.hint("give values with `[[part]]`, by `reference`, pattern, `value` or `nets`"),
            );
        }
        if !self.open.is_empty() {
            let text = format!("resistors without a value join nothing: {}", listed(&self.open));
            let message = Diagnostic::note(code::PART_OPEN, text);
            self.found
                .messages
                .push(message.hint("give their `resistance` with `[[part]]` if they carry return"));
        }
    }
}

/// Two pins on two nets, or the two pins of a part: the first of each net.
fn two_ends<'p>(pins: &[&'p Pin], nets: &BTreeSet<NetId>) -> Option<(&'p Pin, &'p Pin)> {
    if let [a, b] = pins {
        return (a.net.is_some() && b.net.is_some()).then_some((*a, *b));
    }
    let mut nets = nets.iter();
    let (Some(&first), Some(&second), None) = (nets.next(), nets.next(), nets.next()) else { return None };
    let of = |net: NetId| pins.iter().copied().find(|pin| pin.net == Some(net));
    Some((of(first)?, of(second)?))
}

/// The joint of a part between two places.
fn bridge(part: &str, from: &Reached, to: &Reached, values: &Values) -> Joint {
    Joint {
        kind: JointKind::Part,
        what: part.into(),
        at: (from.at + to.at) * 0.5,
        from: from.end(),
        to: to.end(),
        resistance_ohm: (values.resistance_ohm + from.resistance_ohm + to.resistance_ohm).max(LEAST_OHM),
        inductance_h: values.inductance_h + from.inductance_h + to.inductance_h,
        capacitance_f: values.capacitance_f,
        barrel_radius_m: None,
    }
}

/// Names as a list, the first few.
pub fn listed(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(LISTED).map(|name| format!("`{name}`")).collect();
    let more =
        if names.len() > LISTED { format!(" and {} more", names.len() - LISTED) } else { String::new() };
    format!("{}{more}", shown.join(", "))
}
