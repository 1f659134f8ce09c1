//! Joints as verticals between patches of cells, and entries as injections.
//!
//! An end lies on the cells of its area under the barrel's or pad's circle. An end on a layer that is left out of the
//! problem becomes a node of its own, so that a barrel still leads through. A joint with an end outside the cells (off
//! the window, or on copper too small for them) is left out.
//! A barrel has what the cells between its sheets do not carry already, see [`barrel::missing_inductance_h`].
//! Checked by: `stitching_vias_share_alike` in tests/field.

use super::lay::Lay;
use super::source::{Spot, spot_cells};
use super::stack::Stack;
use super::stage::StagedSheet;
use crate::geom::Grid;
use crate::plan::{End, Joint};
use crate::sheet::{Injection, Patch, Vertical, barrel};
use std::collections::BTreeMap;

/// Joints on the cells of a stage.
#[derive(Clone, Debug, PartialEq)]
pub struct Wiring {
    /// What joins patches.
    pub verticals: Vec<Vertical>,
    /// Index of the joint that each vertical stands for.
    pub joints: Vec<usize>,
    nodes: BTreeMap<NodeKey, usize>,
}

/// Entries on the cells of a stage.
#[derive(Clone, Debug, PartialEq)]
pub struct Entered {
    /// One for each entry.
    pub injections: Vec<Injection>,
    /// Sheet and island of each entry that lies on a sheet.
    pub islands: Vec<(usize, u32)>,
}

/// What makes a node outside the board's copper: one of the plan's, or a barrel on a layer that is left out.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
enum NodeKey {
    Plan(usize),
    Through(usize, usize, u64, u64),
}

enum Place {
    /// Sheet, cells and island.
    Cells(usize, Vec<(usize, f64)>, u32),
    Node(NodeKey),
}

impl Wiring {
    /// Wires the joints of `lay` to `sheets` on `grid`.
    pub fn new(lay: &Lay, sheets: &[StagedSheet], grid: &Grid, stack: &Stack) -> Self {
        let mut wiring = Self { verticals: Vec::new(), joints: Vec::new(), nodes: BTreeMap::new() };
        for (index, joint) in lay.joints.iter().enumerate() {
            let ends = (place_of(lay, sheets, &joint.from), place_of(lay, sheets, &joint.to));
            let (Some(from), Some(to)) = ends else { continue };
            let (from, to) = (wiring.patch(from), wiring.patch(to));
            let barrel_h = barrel_inductance_h(joint, &from, &to, grid, stack);
            wiring.verticals.push(Vertical {
                resistance_ohm: joint.resistance_ohm,
                inductance_h: joint.inductance_h + barrel_h,
                capacitance_f: joint.capacitance_f,
                from,
                to,
            });
            wiring.joints.push(index);
        }
        wiring
    }

    /// The entries of `lay` on the same sheets, or the index of the first that finds no copper.
    pub fn enter(&self, lay: &Lay, sheets: &[StagedSheet]) -> Result<Entered, usize> {
        let mut entered = Entered { injections: Vec::new(), islands: Vec::new() };
        for (index, entry) in lay.entries.iter().enumerate() {
            let patch = match place_of(lay, sheets, &entry.end).ok_or(index)? {
                Place::Cells(sheet, cells, island) => {
                    entered.islands.push((sheet, island));
                    Patch { sheet, cells }
                }
                Place::Node(key) => Patch::outside(*self.nodes.get(&key).ok_or(index)?),
            };
            entered.injections.push(Injection { patch, current_a: entry.current });
        }
        Ok(entered)
    }

    fn patch(&mut self, place: Place) -> Patch {
        match place {
            Place::Cells(sheet, cells, _) => Patch { sheet, cells },
            Place::Node(key) => {
                let next = self.nodes.len();
                Patch::outside(*self.nodes.entry(key).or_insert(next))
            }
        }
    }
}

/// Where an end lies, if anywhere.
fn place_of(lay: &Lay, sheets: &[StagedSheet], end: &End) -> Option<Place> {
    let (layer, area, at, radius_m) = match *end {
        End::Node(node) => return Some(Place::Node(NodeKey::Plan(node))),
        End::Copper { layer, area, at, radius_m } => (layer, area, at, radius_m),
    };
    let Some(index) = sheets.iter().position(|sheet| sheet.layer == layer) else {
        let left_out = lay.layers.iter().any(|known| known.layer == layer && known.areas.contains(&area));
        let key = NodeKey::Through(layer, area, at.x.to_bits(), at.y.to_bits());
        return left_out.then_some(Place::Node(key));
    };
    let group = sheets[index].group_of(area)?;
    let (cells, island) = spot_cells(&sheets[index].mask, &Spot { at, radius_m, group })?;
    Some(Place::Cells(index, cells, island))
}

/// Inductance in henry of a joint's barrel beyond what the cells carry; none for other joints.
fn barrel_inductance_h(joint: &Joint, from: &Patch, to: &Patch, grid: &Grid, stack: &Stack) -> f64 {
    let Some(radius_m) = joint.barrel_radius_m.filter(|&radius_m| radius_m > 0.0) else { return 0.0 };
    let (End::Copper { layer: a, .. }, End::Copper { layer: b, .. }) = (&joint.from, &joint.to) else {
        return 0.0;
    };
    let gap_m = (stack.z_m(*a) - stack.z_m(*b)).abs();
    let Some(patch) = [from, to].into_iter().find(|patch| patch.sheet != Patch::OUTSIDE) else { return 0.0 };
    if gap_m <= 0.0 {
        return 0.0;
    }
    let offset = |&(cell, weight): &(usize, f64)| ((cell % grid.nx) as f64, (cell / grid.nx) as f64, weight);
    let weights: Vec<(f64, f64, f64)> = patch.cells.iter().map(offset).collect();
    let (x, y) = weights.iter().fold((0.0, 0.0), |(x, y), w| (x + w.0 * w.2, y + w.1 * w.2));
    let weights: Vec<(f64, f64, f64)> = weights.into_iter().map(|w| (w.0 - x, w.1 - y, w.2)).collect();
    barrel::missing_inductance_h(grid.cell_m, gap_m, radius_m, &weights)
}
