//! File names of maps: safe on every file system, the same for the same set of maps.

use crate::report::sha256_hex;
use std::collections::BTreeMap;

/// Longest stem before a hash is added, in characters.
const LONGEST: usize = 60;

/// What names a map.
#[derive(Clone, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct MapName {
    /// Name of the net.
    pub net: String,
    /// Plane as `L2-GND`.
    pub plane: String,
    /// Name of the band, with the frequency where the band has several: `HF@10MHz`.
    pub band: String,
}

impl MapName {
    /// The stem as it would be if every character were allowed.
    fn plain(&self) -> String {
        format!("{}--{}--{}", self.net, self.plane, self.band)
    }
}

/// Stems `<net>--<plane>--<band>` for a whole set of maps, in the order given. Letters, digits and `_ + . @ -` are
/// kept, everything else becomes `_`, the stem is cut at 60 characters. `~` and 6 hex digits of the SHA-256 of the plain stem are
/// added when anything was changed, or when two stems differ by the case of letters at most. The second of two equal
/// plain stems (a net that comes back to a plane) counts as `<stem>#2` there.
pub fn file_stems(maps: &[MapName]) -> Vec<String> {
    let plain: Vec<String> = maps.iter().map(MapName::plain).collect();
    let safe: Vec<String> = plain.iter().map(|stem| sanitize(stem)).collect();
    let mut uses = BTreeMap::new();
    for stem in &safe {
        *uses.entry(stem.to_lowercase()).or_insert(0_usize) += 1;
    }
    let mut before = BTreeMap::new();
    let named = plain.iter().zip(&safe).map(|(plain, safe)| {
        let times = before.entry(plain).or_insert(0_usize);
        *times += 1;
        if plain == safe && uses[&safe.to_lowercase()] == 1 {
            return safe.clone();
        }
        let hashed = if *times == 1 { plain.clone() } else { format!("{plain}#{times}") };
        format!("{safe}~{}", &sha256_hex(hashed.as_bytes())[..6])
    });
    named.collect()
}

fn sanitize(stem: &str) -> String {
    let keep = |c: char| c.is_ascii_alphanumeric() || "_+.@-".contains(c);
    let safe: String = stem.chars().take(LONGEST).map(|c| if keep(c) { c } else { '_' }).collect();
    // a leading dot would hide the file, a leading hyphen would look like an option to other programs
    match safe.chars().next() {
        Some('.' | '-') => format!("_{}", &safe[1..]),
        _ => safe,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn stems(nets: &[&str]) -> Vec<String> {
        let name = |net: &&str| MapName { net: net.to_string(), plane: "L2-GND".into(), band: "HF".into() };
        file_stems(&nets.iter().map(name).collect::<Vec<_>>())
    }

    #[test]
    fn plain_names_stay() {
        assert_eq!(stems(&["TIDE_SCK", "A+"]), ["TIDE_SCK--L2-GND--HF", "A+--L2-GND--HF"]);
    }

    #[test]
    fn changed_and_colliding_names_get_a_hash() {
        let got = stems(&["/GAUGE/SCK", "Sck", "SCK", "µP", "../x"]);
        assert!(got[0].starts_with("_GAUGE_SCK--L2-GND--HF~"), "{got:?}");
        assert!(got[1].starts_with("Sck--L2-GND--HF~") && got[2].starts_with("SCK--L2-GND--HF~"), "{got:?}");
        assert_ne!(got[1].to_lowercase(), got[2].to_lowercase());
        assert!(got[3].starts_with("_P--"), "{got:?}");
        assert!(got[4].starts_with("_._x--"), "{got:?}");
        for stem in &got {
            assert_eq!(stem.split_once('~').unwrap().1.len(), 6, "{got:?}");
        }
    }

    #[test]
    fn a_net_that_comes_back_to_a_plane_has_two_names() {
        let got = stems(&["SCK", "SCK"]);
        assert_ne!(got[0], got[1]);
    }

    #[test]
    fn long_names_are_cut_and_stay_apart() {
        let long = "N".repeat(80);
        let got = stems(&[&format!("{long}1"), &format!("{long}2")]);
        assert_ne!(got[0], got[1]);
        assert_eq!(got[0].len(), 60 + 7);
    }
}
