//! What a path is driven with and what it ends in: the user's words as plain numbers in SI units.
//!
//! Levels of pulses are peak to peak, because that is what a data sheet says; levels of tones and tables are rms.
//! Edges are 10-90 % times; a linear edge takes 0.8 of its whole length for them, so its 0-100 % length is the 10-90 %
//! time divided by 0.8.

/// Part of the length of a linear edge that lies between 10 and 90 % of the swing.
pub const PART_OF_LINEAR_EDGE: f64 = 0.8;

/// A voltage at the driver or a current into the path.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Level {
    /// Volts of the driver; the current follows from the [`Load`].
    Volts(f64),
    /// Amperes into the path.
    Amperes(f64),
}

impl Level {
    /// The number without its unit.
    pub fn value(self) -> f64 {
        match self {
            Level::Volts(value) | Level::Amperes(value) => value,
        }
    }
}

/// A periodic trapezoid: a clock, or the current of a switching loop.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Pulse {
    /// Repetition frequency in Hz.
    pub frequency_hz: f64,
    /// Rise time, 10-90 %, in seconds.
    pub rise_s: f64,
    /// Fall time, 90-10 %, in seconds.
    pub fall_s: f64,
    /// Length of the pulse at half its height, divided by the period.
    pub duty: f64,
    /// Height of the pulse, peak to peak; none where only the shape of the spectrum is known.
    pub level: Option<Level>,
}

impl Pulse {
    /// 0-100 % lengths of the rising and the falling edge in seconds.
    pub fn whole_edges_s(&self) -> (f64, f64) {
        (self.rise_s / PART_OF_LINEAR_EDGE, self.fall_s / PART_OF_LINEAR_EDGE)
    }

    /// Whether both edges fit into the pulse and into the pause: otherwise the pulse is no trapezoid.
    pub fn fits(&self) -> bool {
        let (rise_s, fall_s) = self.whole_edges_s();
        let edges = 0.5 * (rise_s + fall_s) * self.frequency_hz;
        let slack = 1e-12;
        edges <= self.duty + slack && self.duty + edges <= 1.0 + slack
    }
}

/// Which bits a data stream carries.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Pattern {
    /// Independent bits, both values equally likely.
    Random,
    /// The endless repetition of a maximum-length sequence of 2^order - 1 bits.
    Prbs {
        /// Length of the shift register, 2 to 31.
        order: u32,
    },
}

/// A stream of bits held for the whole bit time (NRZ), levels 0 and `level`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stream {
    /// Bits per second.
    pub bit_rate_hz: f64,
    /// Rise and fall time, 10-90 %, in seconds.
    pub edge_s: f64,
    /// Bits.
    pub pattern: Pattern,
    /// Difference of the two levels; none where only the shape of the spectrum is known.
    pub level: Option<Level>,
}

impl Stream {
    /// 0-100 % length of an edge in seconds.
    pub fn whole_edge_s(&self) -> f64 {
        self.edge_s / PART_OF_LINEAR_EDGE
    }
}

/// A tone, with its power spread evenly over a bandwidth if it has one.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tone {
    /// Middle frequency in Hz.
    pub frequency_hz: f64,
    /// Bandwidth in Hz; 0 is a single line.
    pub bandwidth_hz: f64,
    /// Level, rms; none where only the shape of the spectrum is known.
    pub level: Option<Level>,
}

/// One line of a table: frequency and current.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TableLine {
    /// Frequency in Hz; 0 is direct current.
    pub frequency_hz: f64,
    /// Current, rms, in amperes.
    pub current_rms_a: f64,
}

/// What a path is driven with. A path without a drive carries 1 A at the frequency of each band.
#[derive(Clone, Debug, PartialEq)]
pub enum Drive {
    /// A clock.
    Clock(Pulse),
    /// The pulsed current of a switching loop or of a supply.
    Ripple(Pulse),
    /// A data stream.
    Data(Stream),
    /// A tone, for example of a sensor.
    Tone(Tone),
    /// A measured or simulated spectrum.
    Spectrum(Vec<TableLine>),
}

impl Drive {
    /// The word for it in the review.
    pub fn kind(&self) -> &'static str {
        match self {
            Drive::Clock(_) => "clock",
            Drive::Ripple(_) => "ripple",
            Drive::Data(_) => "data",
            Drive::Tone(_) => "tone",
            Drive::Spectrum(_) => "spectrum",
        }
    }

    /// The level; of a table, whose lines are currents, none.
    pub fn level(&self) -> Option<Level> {
        match self {
            Drive::Clock(pulse) | Drive::Ripple(pulse) => pulse.level,
            Drive::Data(stream) => stream.level,
            Drive::Tone(tone) => tone.level,
            Drive::Spectrum(_) => None,
        }
    }

    /// Whether currents come out in amperes and not only in shape.
    pub fn is_absolute(&self) -> bool {
        matches!(self, Drive::Spectrum(_)) || self.level().is_some()
    }
}

/// What a driver with a voltage sees: a resistance in series with a resistance and a capacitance side by side.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Load {
    /// Series resistance in ohm: the driver's own and series resistors.
    pub series_ohm: f64,
    /// Terminating resistance in ohm; none leaves it out.
    pub termination_ohm: Option<f64>,
    /// Capacitance in farad of the receiver (and of the track, where the caller adds it).
    pub capacitance_f: f64,
}

/// Where the return current of a driver lands.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum DriverReturn {
    /// On its ground pin.
    #[default]
    Ground,
    /// On its supply pin, through the nearest capacitors.
    Supply,
    /// On both, half each.
    Both,
}

/// How much noise a path bears.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Budget {
    /// Volts, rms.
    Volts(f64),
    /// An ideal converter behind the path.
    Converter {
        /// Resolution in bits.
        bits: u32,
        /// Full-scale range in volts.
        full_scale_v: f64,
        /// Noise allowed, in LSB rms.
        lsb: f64,
    },
}

/// What the user says of the signal of a net, path or pair.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SignalRequest {
    /// Drive; none is 1 A at the frequency of each band.
    pub drive: Option<Drive>,
    /// Load; none leaves the current the same all along the track.
    pub load: Option<Load>,
    /// Where the driver's return lands.
    pub landing: DriverReturn,
    /// Noise that the path bears as a victim.
    pub budget: Option<Budget>,
}
