//! How a color looks to people with a color-vision deficiency, and how far apart the levels of a map stay for them.
//!
//! Source: G. M. Machado, M. M. Oliveira, L. A. F. Fernandes, A physiologically-based model for simulation of color
//! vision deficiency, IEEE TVCG 15:6, 2009, matrices for severity 1.0 on linear RGB (from memory; each row sums to 1,
//! which the test checks, so grays stay gray).

use super::{Gradient, Rgb};

/// A way of seeing color.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Vision {
    /// Usual.
    Normal,
    /// Without the receptor for long waves (red).
    Protan,
    /// Without that for middle waves (green).
    Deutan,
    /// Without that for short waves (blue).
    Tritan,
}

impl Vision {
    /// All.
    pub const ALL: [Self; 4] = [Self::Normal, Self::Protan, Self::Deutan, Self::Tritan];

    fn matrix(self) -> [[f64; 3]; 3] {
        match self {
            Self::Normal => [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]],
            Self::Protan => [
                [0.152_286, 1.052_583, -0.204_868],
                [0.114_503, 0.786_281, 0.099_216],
                [-0.003_882, -0.048_116, 1.051_998],
            ],
            Self::Deutan => [
                [0.367_322, 0.860_646, -0.227_968],
                [0.280_085, 0.672_501, 0.047_413],
                [-0.011_820, 0.042_940, 0.968_881],
            ],
            Self::Tritan => [
                [1.255_528, -0.076_749, -0.178_779],
                [-0.078_411, 0.930_809, 0.147_602],
                [0.004_733, 0.691_367, 0.303_900],
            ],
        }
    }

    /// The color that looks to everybody as `color` looks to these people.
    pub fn sees(self, color: Rgb) -> Rgb {
        let linear = color.linear();
        Rgb::from_linear(self.matrix().map(|row| row.iter().zip(linear).map(|(m, c)| m * c).sum()))
    }
}

/// The smallest CIE 1976 difference between colors of a map one `parts`-th of its range apart, in the worst vision.
pub fn least_step(gradient: &Gradient, parts: usize) -> f64 {
    let apart = Gradient::LEVELS.div_ceil(parts);
    let mut least = f64::INFINITY;
    for vision in Vision::ALL {
        let seen: Vec<Rgb> = gradient.colors().iter().map(|&color| vision.sees(color)).collect();
        for (a, b) in seen.iter().zip(&seen[apart..]) {
            least = least.min(a.difference(*b));
        }
    }
    least
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn grays_stay_gray_and_red_and_green_come_closer() {
        for vision in Vision::ALL {
            for row in vision.matrix() {
                assert!((row.iter().sum::<f64>() - 1.0).abs() < 2e-6, "{vision:?}");
            }
            let gray = Rgb(128, 128, 128);
            assert!(vision.sees(gray).difference(gray) < 1.0, "{vision:?}");
        }
        let (red, green) = (Rgb(200, 60, 40), Rgb(80, 130, 40));
        let deutan = |color| Vision::Deutan.sees(color);
        assert!(deutan(red).difference(deutan(green)) < 0.5 * red.difference(green));
    }

    /// Maps recommended for this purpose keep neighbors 10 dB of 60 dB apart; one that turns does not for all.
    #[test]
    fn known_maps_keep_their_steps_apart() {
        for (name, least) in [("MAGMA", 10.0), ("INFERNO", 10.0), ("VIRIDIS", 10.0), ("CIVIDIS", 9.0)] {
            let Some(map) = Gradient::named(name, false, [0.02, 0.98]) else { panic!("{name}") };
            let got = least_step(&map, 6);
            assert!(got >= least, "{name}: {got:.1}");
        }
    }
}
