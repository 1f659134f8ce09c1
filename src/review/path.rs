//! Paths through pins and parts, and pairs of them: the user's words as plain data.

use super::drive::SignalRequest;
use super::{LandingRequest, Marks};

/// One `[[path]]`: an ordered way from a driver through parts to one or several receivers.
#[derive(Clone, Debug, Default)]
pub struct PathRequest {
    /// Name, for maps and findings.
    pub name: String,
    /// Pin that drives, as `U5.19`.
    pub driver: String,
    /// Parts that the current passes, in its order.
    pub through: Vec<Step>,
    /// Where it ends; the shares sum to 1. The driver's own pin closes a loop.
    pub receivers: Vec<Receiver>,
    /// Plane to chart, as `L2-GND`.
    pub plane: Option<String>,
    /// Where the return reaches the plane at the driver.
    pub driver_landing: Option<LandingRequest>,
    /// The same at the receiver, where there is one.
    pub receiver_landing: Option<LandingRequest>,
    /// Drive, load, landing of the driver, budget.
    pub signal: SignalRequest,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}

/// A part that the current passes.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Step {
    /// A part with two pins, as `R12`.
    Part(String),
    /// Two pins of a part with more: where the current enters and where it leaves.
    Pins {
        /// Pin of entry, as `Q1.5`.
        enter: String,
        /// Pin of exit, as `Q1.2`.
        leave: String,
    },
}

/// A pin where a part of the current ends.
#[derive(Clone, Debug, PartialEq)]
pub struct Receiver {
    /// The pin, as `U7.2`.
    pub pin: String,
    /// Its part of the current.
    pub share: f64,
}

/// One `[[pair]]`: two nets or paths that carry +I and -I.
#[derive(Clone, Debug, Default)]
pub struct PairRequest {
    /// Name, for maps and findings.
    pub name: String,
    /// Net or path that carries +I.
    pub positive: String,
    /// Net or path that carries -I.
    pub negative: String,
    /// (I+ - I-)/I, where I+ and I- are the magnitudes and I their mean: 0 is a balanced pair.
    pub imbalance: f64,
    /// Drive, load, landing of the driver, budget.
    pub signal: SignalRequest,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}
