//! What the signal of a path is beyond its way: the spectrum of its drive by band, and what is assumed of it, in words.

use super::course::Course;
use super::route::{self, Way};
use super::terrain::Terrain;
use super::{line, supply};
use crate::diag::Diagnostic;
use crate::diag::code::plan as code;
use crate::geom::Point;
use crate::review::Band;
use crate::review::drive::{Budget, Drive, DriverReturn, Level, Load, Pulse};
use crate::signal::load::admittance;
use crate::signal::spectrum::{BandSpectrum, Limits, band_spectrum};
use crate::unit::quantity_text;
use num_complex::Complex64;

/// Error to which a few frequencies stand for all lines of a band.
const CONDENSED: f64 = 1e-4;

/// The signal of a path.
#[derive(Clone, Debug, Default)]
pub struct SignalPlan {
    /// The drive in words, for example `clock of 8 MHz, edges 2 ns, 10 mA`; empty without one.
    pub drive: String,
    /// For each band of the plan what the drive holds in it; empty without a drive: then maps are of 1 A at each
    /// frequency of a band. A band with frequencies of its own (`at`) is solved at those whatever the drive.
    pub spectra: Vec<BandSpectrum>,
    /// Whether the currents of the spectra are amperes; otherwise only their proportions are known.
    pub is_absolute: bool,
    /// What was assumed of current and return, one sentence each, for plan and pictures.
    pub remarks: Vec<String>,
    /// Noise that the path bears as a victim.
    pub budget: Option<Budget>,
}

/// The way of a course with its currents, and its signal.
pub fn signal(
    terrain: &Terrain<'_>,
    course: &Course<'_>,
    bands: &[Band],
    origin: Point,
) -> Result<(Way, SignalPlan), Diagnostic> {
    let own = course.own_nets(terrain);
    let (mut way, mut capacitance_f) = (Way::default(), 0.0);
    let mut remarks = Vec::new();
    let open = course.signal.load.filter(|load| load.termination_ohm.is_none() && load.capacitance_f > 0.0);
    for one in &course.lines {
        let find = |line| route::find(terrain, &course.who, line, origin);
        let mut found = find(one).map_err(|message| course.in_review("name", message))?;
        let track_f = line::capacitance_f(terrain, &own, &found.legs);
        // Of a pair each line has half of the voltage, and the same charge.
        capacitance_f += track_f / (course.lines.len() * course.lines.len()) as f64;
        if let Some(load) = open {
            line::fall(terrain, &own, &mut found, load.capacitance_f);
            let own = quantity_text(1e-14 * (track_f * 1e14).round(), "F");
            remarks.push(format!(
                "current falls along the track, which is open: {} of the receiver, {own} of the track",
                quantity_text(load.capacitance_f, "F")
            ));
        }
        if !found.closed {
            remarks.extend(land_driver(terrain, course, &mut found, one.current, origin)?);
        }
        way.join(found);
    }
    if let [positive, negative] = &course.lines[..] {
        way.close_pair(terrain, positive, negative);
    }
    if open.is_none() {
        remarks.push("same current all along the track".into());
    }
    remarks.dedup();
    Ok((way, SignalPlan { remarks, ..SignalPlan::new(course, bands, capacitance_f) }))
}

/// Where the driver's return leaves the planes, with what is said of it.
fn land_driver(
    terrain: &Terrain<'_>,
    course: &Course<'_>,
    way: &mut Way,
    current: f64,
    origin: Point,
) -> Result<Option<String>, Diagnostic> {
    let part = match course.signal.landing {
        DriverReturn::Ground => return Ok(Some("return of the driver lands on its ground".into())),
        DriverReturn::Supply => 1.0,
        DriverReturn::Both => 0.5,
    };
    let driver = course.lines[0].driver;
    let Some(feed) = supply::feed(terrain, driver, part * current) else {
        let label = terrain.board.pins[driver.0 as usize].label();
        let text = format!(
            "driver `{label}` of {} must have a supply pin with a capacitor to a reference net; none was found",
            course.who
        );
        let message = Diagnostic::error(code::SUPPLY_UNKNOWN, text);
        return Err(course
            .at_key("landing", message)
            .hint("take `landing = \"ground\"`, or name the place with `driver_landing`"));
    };
    let fed = route::find(terrain, &course.who, &feed.line, origin)
        .map_err(|message| course.in_review("landing", message))?;
    way.feed(fed);
    let pin = terrain.board.pins[feed.pin.0 as usize].label();
    let half = if part < 1.0 { "half of the return of the driver" } else { "return of the driver" };
    Ok(Some(format!("{half} lands on its supply pin {pin} through {}", feed.capacitor)))
}

impl SignalPlan {
    /// The signal of a course whose line has `capacitance_f` against the planes.
    pub fn new(course: &Course<'_>, bands: &[Band], capacitance_f: f64) -> Self {
        let signal = course.signal;
        let Some(drive) = &signal.drive else {
            return Self { budget: signal.budget, ..Self::default() };
        };
        // A voltage drives the load with the line's own capacitance beside it.
        let load = signal.load.map(|load| Load { capacitance_f: load.capacitance_f + capacitance_f, ..load });
        let flow = |frequency_hz: f64| {
            load.and_then(|load| admittance(&load, frequency_hz)).unwrap_or(Complex64::new(1.0, 0.0))
        };
        let spectrum = |band: &Band| band_spectrum(drive, Limits::from(band), &flow, CONDENSED);
        Self {
            drive: in_words(drive),
            spectra: bands.iter().map(spectrum).collect(),
            is_absolute: drive.is_absolute(),
            remarks: Vec::new(),
            budget: signal.budget,
        }
    }

    /// The spectrum that charts a band, given with its index in the plan: none where the band is solved for 1 A.
    pub fn spectrum(&self, (index, band): (usize, &Band)) -> Option<&BandSpectrum> {
        if band.explicit { None } else { self.spectra.get(index) }
    }
}

/// A drive in words.
pub fn in_words(drive: &Drive) -> String {
    let level = match drive.level() {
        Some(Level::Volts(volts)) => format!(", {}", quantity_text(volts, "V")),
        Some(Level::Amperes(amperes)) => format!(", {}", quantity_text(amperes, "A")),
        None => String::new(),
    };
    let pulse = |kind: &str, pulse: &Pulse| {
        let (rise, fall) = (quantity_text(pulse.rise_s, "s"), quantity_text(pulse.fall_s, "s"));
        let edges = if rise == fall { format!("edges {rise}") } else { format!("edges {rise} and {fall}") };
        format!("{kind} of {}, {edges}{level}", quantity_text(pulse.frequency_hz, "Hz"))
    };
    match drive {
        Drive::Clock(clock) => pulse("clock", clock),
        Drive::Ripple(ripple) => pulse("ripple", ripple),
        Drive::Data(stream) => {
            let (rate, edge) =
                (quantity_text(stream.bit_rate_hz, "bit/s"), quantity_text(stream.edge_s, "s"));
            format!("data at {rate}, edges {edge}{level}")
        }
        Drive::Tone(tone) if tone.bandwidth_hz > 0.0 => {
            let (middle, width) =
                (quantity_text(tone.frequency_hz, "Hz"), quantity_text(tone.bandwidth_hz, "Hz"));
            format!("tone of {middle}, {width} wide{level}")
        }
        Drive::Tone(tone) => format!("tone of {}{level}", quantity_text(tone.frequency_hz, "Hz")),
        Drive::Spectrum(lines) => format!("spectrum of {} lines", lines.len()),
    }
}
