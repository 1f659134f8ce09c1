//! The board as its fabrication data describe it: outline, copper, holes, nets, pins, ties and stackup.
//!
//! Plain data in metres, in the coordinates of the files. Nothing here reads a file or knows a solver.
//! Layers are indexed from 0 at the top inside the program; texts and files count from 1 (`L2` is index 1).

mod copper;
mod hole;
mod net;
mod stackup;

pub use copper::{CopperArea, CopperKind, CopperLayer, CopperObject, LayerRole, ObjectFunction};
pub use hole::{Hole, Plating};
pub use net::{Net, NetId, Part, Pin, PinId, Tie, TieKind};
pub use stackup::{Dielectric, Foil, Origin, Stackup};

use crate::geom::Region;

/// Everything that is known of one board.
#[derive(Clone, Debug, Default)]
pub struct Board {
    /// Title from the job file, or empty.
    pub title: String,
    /// Revision from the job file, or empty.
    pub revision: String,
    /// The board's area inside its outline, cut-outs as holes.
    pub outline: Region,
    /// Copper layers from the top to the bottom.
    pub layers: Vec<CopperLayer>,
    /// Thickness and permittivity of what lies between and in the copper.
    pub stackup: Stackup,
    /// Nets, sorted by name; [`NetId`] is the index.
    pub nets: Vec<Net>,
    /// Drilled and routed holes and slots.
    pub holes: Vec<Hole>,
    /// Pins of parts, sorted by part and number; [`PinId`] is the index.
    pub pins: Vec<Pin>,
    /// Parts, sorted by reference.
    pub parts: Vec<Part>,
    /// Places where two nets are joined by copper on purpose.
    pub ties: Vec<Tie>,
}

impl Board {
    /// The net called `name`.
    pub fn net(&self, name: &str) -> Option<NetId> {
        let found = self.nets.binary_search_by(|net| net.name.as_str().cmp(name));
        found.ok().map(|index| NetId(index as u32))
    }

    /// Name of a net.
    pub fn net_name(&self, net: NetId) -> &str {
        &self.nets[net.0 as usize].name
    }
}
