//! Bands and spectra: at which frequencies a signal is looked at, and with which current.

mod band;
pub mod combine;
pub mod converter;
pub mod load;
pub mod spectrum;

pub use band::{default_bands, itu_band, itu_names, own_band, zero_band};
