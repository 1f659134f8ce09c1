//! Plated holes as joints between sheets: vias, pins and slots.
//!
//! Resistance of a barrel: rho(T) l/(p t), l the distance between the facing sheets, t the plating, p the perimeter
//! of the hole (pi D, of a slot two lengths more). Its inductance is left to the field, which knows what cells carry.

use super::sheets::Sheets;
use super::terrain::Terrain;
use super::{End, Joint, JointKind};
use crate::board::{Board, Hole, NetId, Plating};
use crate::unit::constants::{COPPER_ALPHA_20C, COPPER_SIGMA_20C};
use std::collections::BTreeMap;
use std::f64::consts::PI;

/// Thickness of the plating in barrels in metres: common practice, the mean that class 2 boards must reach.
pub const PLATING_M: f64 = 20e-6;
/// No joint has less than this, in ohm: a branch without any impedance would leave its current undetermined.
pub const LEAST_OHM: f64 = 1e-6;

/// Resistivity of the board's copper in ohm metres.
pub fn resistivity_ohm_m(board: &Board) -> f64 {
    (1.0 + COPPER_ALPHA_20C * (board.stackup.temperature_c - 20.0)) / COPPER_SIGMA_20C
}

/// Perimeter of a hole or slot in metres.
pub fn perimeter_m(hole: &Hole) -> f64 {
    let length_m: f64 = hole.path.windows(2).map(|ends| ends[0].distance(ends[1])).sum();
    PI * hole.diameter_m + 2.0 * length_m
}

/// Radius in metres of the round barrel with the perimeter of a hole or slot.
pub fn radius_m(hole: &Hole) -> f64 {
    perimeter_m(hole) / (2.0 * PI)
}

/// Resistance in ohm of `length_m` of a hole's barrel.
pub fn resistance_ohm(terrain: &Terrain<'_>, hole: &Hole, length_m: f64) -> f64 {
    resistivity_ohm_m(terrain.board) * length_m / (perimeter_m(hole) * terrain.plating_m)
}

/// All barrels between neighbouring sheets that they touch, in the order of the holes.
pub fn joints(terrain: &Terrain<'_>, sheets: &Sheets) -> Vec<Joint> {
    let board = terrain.board;
    let mut pins: BTreeMap<usize, String> = BTreeMap::new();
    for pin in &board.pins {
        if let Some(hole) = pin.hole {
            pins.entry(hole).or_insert_with(|| format!("pin {}", pin.label()));
        }
    }
    let mut joints = Vec::new();
    for (index, hole) in board.holes.iter().enumerate().filter(|(_, hole)| hole.plating == Plating::Plated) {
        let mut by_net: BTreeMap<Option<NetId>, Vec<(usize, usize)>> = BTreeMap::new();
        for &piece in hole.contacts.iter().filter(|&&piece| sheets.holds(piece)) {
            let net = terrain.net_of(piece.0, piece.1);
            if hole.net.is_none() || net == hole.net {
                by_net.entry(net).or_default().push(piece);
            }
        }
        for (_, mut pieces) in by_net {
            pieces.sort_unstable();
            for pair in pieces.windows(2) {
                let length_m = board.stackup.gap_m(pair[0].0, pair[1].0);
                let end = |(layer, area): (usize, usize)| End::Copper {
                    layer,
                    area,
                    at: hole.centre(),
                    radius_m: radius_m(hole),
                };
                joints.push(Joint {
                    kind: JointKind::Barrel,
                    what: pins.get(&index).cloned().unwrap_or_else(|| "via".into()),
                    at: hole.centre(),
                    from: end(pair[0]),
                    to: end(pair[1]),
                    resistance_ohm: resistance_ohm(terrain, hole, length_m).max(LEAST_OHM),
                    inductance_h: 0.0,
                    capacitance_f: None,
                    barrel_radius_m: Some(radius_m(hole)),
                });
            }
        }
    }
    joints
}
