//! Looks as plain data: colors, line widths, lettering, page sizes, and the rules that a style must keep.
//!
//! Lengths are millimeters on the sheet. Nothing here reads a file; `read::style` does.

mod check;
mod color;
mod face;
mod gradient;
mod label;
pub mod oklab;
pub mod vision;

pub use check::{Fault, check};
pub use color::{Lab, Rgb};
pub use face::{Face, font_license};
pub use gradient::{Gradient, gradient_names};
pub use label::LABELS;

/// One complete look.
#[derive(Clone, Debug, PartialEq)]
pub struct Style {
    /// Name of the style.
    pub name: String,
    /// Lettering.
    pub font: Lettering,
    /// Colors.
    pub color: Colors,
    /// Line widths and dashes.
    pub line: Lines,
    /// Color scale of a density.
    pub density: DensityLook,
    /// Color scale of a signed change.
    pub change: ChangeLook,
    /// Two-way color scale of two nets.
    pub pair: PairLook,
    /// Colors of lines in plots.
    pub series: Gradient,
    /// Sheet of a single map.
    pub ticket: Sheet,
    /// Sheet of a set of maps.
    pub set: Sheet,
    /// Rules kept by [`check`].
    pub rules: Rules,
    /// Words in place of the program's own: from one of [`LABELS`] to what is drawn, sorted.
    pub labels: Vec<(String, String)>,
}

impl Style {
    /// What is drawn for a word of the program.
    pub fn word<'a>(&'a self, english: &'a str) -> &'a str {
        let found = self.labels.iter().find(|(known, _)| known == english);
        found.map_or(english, |(_, own)| own)
    }
}

/// Type sizes in mm (size of the em square, cap height 0.698 of it) and the family name for other viewers.
#[derive(Clone, Debug, PartialEq)]
pub struct Lettering {
    /// Generic family for viewers that cannot use the embedded fonts.
    pub fallback: String,
    /// Headline.
    pub headline: f64,
    /// Line under the headline.
    pub lead: f64,
    /// Text and headings in columns.
    pub body: f64,
    /// Value of a key figure.
    pub value: f64,
    /// Numbers at scales, notes.
    pub tick: f64,
    /// Labels on the map.
    pub label: f64,
    /// Names of fields in the title strip.
    pub field: f64,
}

impl Lettering {
    /// Distance of lines relative to the normal type size, for places that follow the type.
    pub fn pitch(&self) -> f64 {
        self.tick.max(self.label * 3.3 / 3.4).max(self.body * 3.3 / 3.6) / 3.3
    }

    /// The same with no size above `factor` times the normal one, for sheets whose cells leave no more room.
    pub fn at_most(&self, factor: f64) -> Self {
        Self {
            fallback: self.fallback.clone(),
            headline: self.headline.min(6.6 * factor),
            lead: self.lead.min(3.8 * factor),
            body: self.body.min(3.6 * factor),
            value: self.value.min(5.0 * factor),
            tick: self.tick.min(3.3 * factor),
            label: self.label.min(3.4 * factor),
            field: self.field.min(3.0 * factor),
        }
    }
}

/// Colors by what they are for.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Colors {
    /// Page, voids and halos.
    pub page: Rgb,
    /// Ground of side panels.
    pub panel: Rgb,
    /// Main ink.
    pub ink: Rgb,
    /// Ink of secondary text.
    pub ink_soft: Rgb,
    /// Rules and axes.
    pub rule: Rgb,
    /// Decorative grounds and guides.
    pub hair: Rgb,
    /// Bars, findings, what is said about the net.
    pub mark: Rgb,
    /// Number in a disc of the color `mark`.
    pub mark_text: Rgb,
    /// Edge of the plane.
    pub plane_edge: Rgb,
    /// Edge of a void.
    pub void_edge: Rgb,
    /// Partition boundary.
    pub boundary: Rgb,
    /// Outline of a part.
    pub part: Rgb,
    /// Core of the track.
    pub track: Rgb,
    /// Casing of the track.
    pub track_case: Rgb,
    /// Contour ink where the map is dark.
    pub on_dark: Rgb,
    /// Contour ink where the map is light.
    pub on_light: Rgb,
    /// Density above the top of the scale.
    pub over: Rgb,
    /// A figure that moved the wrong way.
    pub worse: Rgb,
    /// A figure that moved the right way.
    pub better: Rgb,
}

/// Line widths in mm and dash patterns in mm; an empty pattern is a continuous line.
#[derive(Clone, Debug, PartialEq)]
pub struct Lines {
    /// Edge of the plane.
    pub plane_edge: f64,
    /// Edge of a void.
    pub void_edge: f64,
    /// Partition boundary.
    pub boundary: f64,
    /// Core of the track.
    pub track: f64,
    /// Casing of the track, core included.
    pub track_case: f64,
    /// Contours that enclose 50, 80 and 95 %.
    pub contour: [f64; 3],
    /// Outline of a part.
    pub part: f64,
    /// Leader of a label.
    pub leader: f64,
    /// Frame of a drawing sheet.
    pub frame: f64,
    /// Rules between panels.
    pub rule: f64,
    /// Dashes of the three contours.
    pub contour_dash: [Vec<f64>; 3],
    /// Dashes of the partition boundary.
    pub boundary_dash: Vec<f64>,
}

/// Color scale of a density.
#[derive(Clone, Debug, PartialEq)]
pub struct DensityLook {
    /// Colors from the lowest to the highest density.
    pub gradient: Gradient,
    /// Range below 0 dB in dB, positive.
    pub range_db: f64,
}

/// Color scale of a signed change.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ChangeLook {
    /// Less current, strongest first.
    pub low: [Rgb; 3],
    /// No change.
    pub zero: Rgb,
    /// More current, strongest last.
    pub high: [Rgb; 3],
    /// Level of |change| in dB below which the zero color is drawn.
    pub dead_db: f64,
}

/// Two-way color scale of two nets: hue says which, lightness how much both.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PairLook {
    /// Hue of the first net in degrees of OKLCh.
    pub hue_a: f64,
    /// Hue of the second net.
    pub hue_b: f64,
    /// Lightness in OKLab at the bottom and the top of the scale.
    pub light: [f64; 2],
    /// Levels in dB at the bottom and the top.
    pub range_db: [f64; 2],
    /// Chroma in OKLCh where one net alone flows; 0 for printers without color.
    pub chroma: f64,
}

/// A sheet of paper and its size in pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sheet {
    /// Width in mm.
    pub width: f64,
    /// Height in mm.
    pub height: f64,
    /// Width of the PNG in pixels.
    pub px: u32,
    /// Margins in mm: left, top, right, bottom.
    pub margin: [f64; 4],
}

impl Sheet {
    /// Pixels per millimeter of the PNG.
    pub fn px_per_mm(&self) -> f64 {
        f64::from(self.px) / self.width
    }
}

/// Limits that the colors and sizes of a style must keep.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Rules {
    /// Contrast of text on page and panel (WCAG 2 ratio).
    pub text_min: f64,
    /// Contrast of graphic objects.
    pub mark_min: f64,
    /// Smallest type size in mm, names of fields excepted.
    pub text_size_min: f64,
}
