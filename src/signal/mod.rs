//! Bands and spectra: at which frequencies a signal is looked at.

mod band;

pub use band::{default_bands, itu_band, itu_names, own_band, zero_band};
