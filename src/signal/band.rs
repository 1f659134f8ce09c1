//! Frequency bands: the numbered bands of the Radio Regulations, bands of the user's own, and DC.
//!
//! Model: band N runs from 0.3e N to 3e N Hz (10^N), lower limit exclusive, upper limit inclusive, and is solved at
//! 10^N Hz. A band of one's own is solved at the geometric middle sqrt(from x to).
//! Source: Recommendation ITU-R V.431-8, "Nomenclature of the frequency and wavelength bands used in
//! telecommunications"; Radio Regulations, No. 2.1.

use crate::review::Band;

/// Names of the bands by number, band 4 first.
const NUMBERED: [&str; 7] = ["VLF", "LF", "MF", "HF", "VHF", "UHF", "SHF"];
const FIRST_NUMBER: i32 = 4;
/// Bands of a review that names none.
const DEFAULT: [&str; 4] = ["LF", "MF", "HF", "VHF"];

/// Ten to the power of `number`, the decimal number nearest to it.
fn power_of_ten(number: i32) -> f64 {
    (0..number).fold(1.0, |power, _| power * 10.0)
}

/// The numbered band called `name` (VLF to SHF), solved at 10^N Hz.
///
/// ```
/// let hf = ebbmap::signal::itu_band("HF").unwrap();
/// assert_eq!((hf.from_hz, hf.to_hz, hf.at_hz), (3e6, 30e6, vec![1e7]));
/// ```
pub fn itu_band(name: &str) -> Option<Band> {
    let index = NUMBERED.iter().position(|known| *known == name)?;
    let number = FIRST_NUMBER + index as i32;
    Some(Band {
        name: name.into(),
        from_hz: 3.0 * power_of_ten(number - 1),
        to_hz: 3.0 * power_of_ten(number),
        at_hz: vec![power_of_ten(number)],
        explicit: false,
    })
}

/// Names of the numbered bands from low to high.
pub fn itu_names() -> &'static [&'static str] {
    &NUMBERED
}

/// The band at 0 Hz.
pub fn zero_band() -> Band {
    Band { name: "DC".into(), from_hz: 0.0, to_hz: 0.0, at_hz: vec![0.0], explicit: false }
}

/// A band with limits of its own, solved at sqrt(from x to): at 0 Hz when it starts there.
pub fn own_band(name: &str, from_hz: f64, to_hz: f64) -> Band {
    let middle_hz = (from_hz * to_hz).sqrt();
    Band { name: name.into(), from_hz, to_hz, at_hz: vec![middle_hz], explicit: false }
}

/// LF, MF, HF and VHF.
pub fn default_bands() -> Vec<Band> {
    DEFAULT.iter().filter_map(|name| itu_band(name)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbered_bands_have_the_limits_of_the_radio_regulations() {
        // ITU-R V.431-8, table 1: band number, symbol, lower limit (exclusive), upper limit (inclusive).
        let table = [
            ("VLF", 4, 3e3, 30e3),
            ("LF", 5, 30e3, 300e3),
            ("MF", 6, 300e3, 3e6),
            ("HF", 7, 3e6, 30e6),
            ("VHF", 8, 30e6, 300e6),
            ("UHF", 9, 300e6, 3e9),
            ("SHF", 10, 3e9, 30e9),
        ];
        assert_eq!(table.len(), itu_names().len());
        for (name, number, from_hz, to_hz) in table {
            let band = itu_band(name).unwrap();
            assert_eq!((band.from_hz, band.to_hz), (from_hz, to_hz), "{name}");
            assert_eq!(band.at_hz, [10f64.powi(number)], "{name}");
        }
        assert_eq!(itu_band("hf"), None);
        assert_eq!(
            default_bands().iter().map(|band| band.at_hz[0]).collect::<Vec<_>>(),
            [1e5, 1e6, 1e7, 1e8]
        );
    }

    #[test]
    fn own_bands_are_solved_at_their_geometric_middle() {
        assert_eq!(own_band("switching", 300e3, 3e6).at_hz, [(0.9e12f64).sqrt()]);
        assert_eq!(own_band("slow", 0.0, 1e3).at_hz, [0.0]);
    }
}
