//! Heights of the sheets: where in the stack the current of each copper layer lies.
//!
//! Model: foils are sheets; the distance of two layers next to each other is the dielectric between their faces plus
//! a part of each foil, half of it at low frequency (mid-copper) and nothing at high (the facing surfaces), common to
//! all foils. So the distance of layers that face each other is right at both ends, and that of layers with foils
//! between them is too small at high frequency by those foils.
//! The part goes in steps of a quarter, so that frequencies share what is prepared for them; track over plane is at
//! the exact height of [`super::Source::height_m`], which differs from the stack's by less than an eighth of a foil.
//! Checked by: `heights_follow_the_frequency`.

use crate::board::Stackup;

/// Steps of the part of a foil's half that counts.
const STEPS: f64 = 4.0;

/// Heights of all copper layers on a common axis, upwards.
#[derive(Clone, Debug, PartialEq)]
pub struct Stack {
    z_m: Vec<f64>,
}

impl Stack {
    /// The stack with `part` (0 to 1, rounded to quarters) of the half of each foil.
    pub fn new(stackup: &Stackup, part: f64) -> Self {
        let part = libm::round(part.clamp(0.0, 1.0) * STEPS) / STEPS;
        let mut z_m = vec![0.0];
        for (foils, between) in stackup.foils.windows(2).zip(&stackup.dielectrics) {
            let copper = 0.5 * part * (foils[0].thickness_m + foils[1].thickness_m);
            let above = z_m[z_m.len() - 1];
            z_m.push(above - between.thickness_m - copper);
        }
        Self { z_m }
    }

    /// Height of a layer (index from 0) in metres.
    pub fn z_m(&self, layer: usize) -> f64 {
        self.z_m[layer]
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::board::{Dielectric, Foil, Origin};

    #[test]
    fn heights_follow_the_frequency() {
        let origin = Origin::Review;
        let dielectric =
            |thickness_m| Dielectric { thickness_m, origin, permittivity: 4.2, permittivity_origin: origin };
        let stackup = Stackup {
            foils: [40e-6, 20e-6, 40e-6].map(|thickness_m| Foil { thickness_m, origin }).into(),
            dielectrics: vec![dielectric(0.2e-3), dielectric(1e-3)],
            temperature_c: 20.0,
        };
        for (part, first, second) in
            [(1.0, 0.23e-3, 1.03e-3), (0.02, 0.2e-3, 1e-3), (0.3, 0.2075e-3, 1.0075e-3)]
        {
            let stack = Stack::new(&stackup, part);
            assert!((stack.z_m(0) - stack.z_m(1) - first).abs() < 1e-12, "{stack:?}");
            assert!((stack.z_m(1) - stack.z_m(2) - second).abs() < 1e-12, "{stack:?}");
        }
    }
}
