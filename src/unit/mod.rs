//! Physical constants and quantities with units: the only place where text becomes a number in SI units.

pub mod constants;
mod quantity;

pub use quantity::{Dimension, QuantityError, length_text, parse_quantity, quantity_text};
