//! What a map's current is, in words: 1 A at a frequency or a band of a drive, and what was assumed of it.

use super::words::hertz;
use crate::draw::{plain, with_prefix};
use crate::field::ReturnMap;
use crate::plan::PathPlan;

/// Of what the density is, for example `at 10 MHz, per ampere in the net`.
pub(super) fn of_map(map: &ReturnMap, net: &PathPlan) -> String {
    let Some(band) = &map.band_density else {
        return format!("at {}, per ampere in the net", hertz(map.frequency_hz));
    };
    let lines = if band.line_count == 1 { "line".to_owned() } else { format!("{} lines", band.line_count) };
    let current = match band.current_rms_a {
        Some(current) => format!("ampere of its {}", with_prefix(current, "A", 2)),
        None => "ampere in the band".to_owned(),
    };
    format!(
        "in {}, rms over the {lines} of its {}, per {current}",
        plain(&map.band),
        plain(&net.signal.drive)
    )
}

/// What was assumed of current and return, as a sentence; empty where nothing was.
pub(super) fn assumed(net: &PathPlan) -> String {
    let mut words = net.signal.remarks.join("; ");
    if let Some(first) = words.get(..1) {
        words.replace_range(..1, &first.to_uppercase());
        words.push('.');
    }
    words
}
