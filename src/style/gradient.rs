//! Color gradients by name, turned over and clipped.

use super::Rgb;

/// The gradients that styles may name, sorted.
const NAMED: [(&str, colorous::Gradient); 15] = [
    ("BLUES", colorous::BLUES),
    ("CIVIDIS", colorous::CIVIDIS),
    ("CUBEHELIX", colorous::CUBEHELIX),
    ("GREENS", colorous::GREENS),
    ("GREYS", colorous::GREYS),
    ("INFERNO", colorous::INFERNO),
    ("MAGMA", colorous::MAGMA),
    ("ORANGES", colorous::ORANGES),
    ("PLASMA", colorous::PLASMA),
    ("PURPLES", colorous::PURPLES),
    ("REDS", colorous::REDS),
    ("TURBO", colorous::TURBO),
    ("VIRIDIS", colorous::VIRIDIS),
    ("YELLOW_GREEN_BLUE", colorous::YELLOW_GREEN_BLUE),
    ("YELLOW_ORANGE_BROWN", colorous::YELLOW_ORANGE_BROWN),
];

/// The names that [`Gradient::named`] knows, sorted.
pub fn gradient_names() -> impl Iterator<Item = &'static str> {
    NAMED.iter().map(|(name, _)| *name)
}

/// A gradient from a low to a high value.
#[derive(Clone, Debug, PartialEq)]
pub struct Gradient {
    name: &'static str,
    turn_over: bool,
    clip: [f64; 2],
    colors: Vec<Rgb>,
}

impl Gradient {
    /// Number of colors from the lowest to the highest value.
    pub const LEVELS: usize = 255;

    /// The gradient `name`, turned over or not, of which the part `clip` (0 to 1, after turning over) is used.
    pub fn named(name: &str, turn_over: bool, clip: [f64; 2]) -> Option<Self> {
        let &(name, gradient) = NAMED.iter().find(|(known, _)| *known == name)?;
        let color = |level: usize| {
            let u = clip[0] + (clip[1] - clip[0]) * level as f64 / (Self::LEVELS - 1) as f64;
            let color = gradient.eval_continuous(if turn_over { 1.0 - u } else { u });
            Rgb(color.r, color.g, color.b)
        };
        Some(Self { name, turn_over, clip, colors: (0..Self::LEVELS).map(color).collect() })
    }

    /// A gradient through `stops` at equal distances, lowest value first, interpolated in OKLab; at least two stops.
    pub fn through(stops: &[Rgb]) -> Option<Self> {
        let labs: Vec<super::oklab::Oklab> = stops.iter().map(|&stop| super::oklab::to_oklab(stop)).collect();
        let last = labs.len().checked_sub(1).filter(|&last| last > 0)?;
        let color = |level: usize| {
            let u = level as f64 / (Self::LEVELS - 1) as f64 * last as f64;
            let (from, t) = ((u as usize).min(last - 1), u - (u as usize).min(last - 1) as f64);
            let mix = |part: usize| labs[from][part] * (1.0 - t) + labs[from + 1][part] * t;
            super::oklab::from_oklab([mix(0), mix(1), mix(2)])
        };
        let colors = (0..Self::LEVELS).map(color).collect();
        Some(Self { name: "stops", turn_over: false, clip: [0.0, 1.0], colors })
    }

    /// The same in `count` steps of one color each, that of their middle.
    pub fn stepped(mut self, count: usize) -> Self {
        let smooth = self.colors.clone();
        for (level, color) in self.colors.iter_mut().enumerate() {
            let step = (level * count / Self::LEVELS).min(count - 1);
            *color = smooth[(2 * step + 1) * Self::LEVELS / (2 * count)];
        }
        self
    }

    /// Name of the gradient.
    pub fn name(&self) -> &'static str {
        self.name
    }

    /// Color at `u` from 0 to 1; values outside take the nearest end.
    pub fn at(&self, u: f64) -> Rgb {
        self.colors[Self::level(u)]
    }

    /// Level of `u`: 0 to [`Self::LEVELS`] - 1.
    pub fn level(u: f64) -> usize {
        (u.clamp(0.0, 1.0) * (Self::LEVELS - 1) as f64).round() as usize
    }

    /// All colors, lowest value first.
    pub fn colors(&self) -> &[Rgb] {
        &self.colors
    }
}
