//! Physical constants and quantities with units: the only place where text becomes a number in SI units.

pub mod constants;
