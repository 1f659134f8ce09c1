//! From the voltage of a driver to the current into its path.
//!
//! Given a load (series resistance, then termination and capacitance side by side), gives its impedance in ohm and the
//! current of a line of voltage. The line of track between them is short against the wavelength; its capacitance is
//! added to the load's by the caller.
//!
//! Model: Z = Rs + 1/(1/Rt + jwC). With a capacitance alone I = jwC V.

use crate::review::drive::Load;
use num_complex::Complex64;
use std::f64::consts::TAU;

/// Admittance in siemens that the driver sees at `frequency_hz`; none if the load is a short circuit.
pub fn admittance(load: &Load, frequency_hz: f64) -> Option<Complex64> {
    let shunt = Complex64::new(
        load.termination_ohm.map_or(0.0, |ohm| 1.0 / ohm),
        TAU * frequency_hz * load.capacitance_f,
    );
    // Y = y / (1 + y Rs) needs no division by an open circuit
    let admittance = shunt / (1.0 + shunt * load.series_ohm);
    admittance.is_finite().then_some(admittance)
}

/// Whether a voltage drives any current through the load at all.
pub fn is_closed(load: &Load) -> bool {
    load.termination_ohm.is_some() || load.capacitance_f > 0.0
}

/// Current phasor in amperes of a line with voltage phasor `line_voltage_v` (both rms) into `load_ohm`.
pub fn current_of(line_voltage_v: Complex64, load_ohm: Complex64) -> Complex64 {
    line_voltage_v / load_ohm
}
