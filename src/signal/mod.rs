//! Bands and spectra: at which frequencies a signal is looked at.
