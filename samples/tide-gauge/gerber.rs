//! Writes Gerber X2 layers: apertures, attributes of objects, flashes, draws, regions, polarity.

use super::design::{Shape, Xy};
use std::fmt::Write;

/// Aperture macros that the writer uses: a rectangle with rounded corners and a thermal relief.
const MACROS: &str = "%AMROUNDED*\n0 Rectangle with rounded corners: width, height, radius*\n\
21,1,$1,$2-2x$3,0,0,0*\n21,1,$1-2x$3,$2,0,0,0*\n1,1,2x$3,$1/2-$3,$2/2-$3*\n1,1,2x$3,$3-$1/2,$2/2-$3*\n\
1,1,2x$3,$3-$1/2,$3-$2/2*\n1,1,2x$3,$1/2-$3,$3-$2/2*%\n\
%AMRELIEF*\n0 Ring with four gaps: outer diameter, inner diameter, gap*\n7,0,0,$1,$2,$3,0*%\n";

/// A coordinate in the file's integer format, nanometres.
fn number(mm: f64) -> i64 {
    (mm * 1e6).round() as i64
}

/// A length in an aperture definition.
fn length(mm: f64) -> String {
    format!("{:.6}", (mm * 1e6).round() / 1e6)
}

/// The objects of one layer as they are written.
#[derive(Default)]
pub struct Sheet {
    apertures: Vec<(String, String)>,
    body: String,
    aperture: usize,
    tags: [String; 3],
    clear: bool,
}

impl Sheet {
    /// Sets net, pin and part of what follows; empty for none.
    pub fn tag(&mut self, net: &str, pin: &str, part: &str) {
        for (index, (name, value)) in [("N", net), ("P", pin), ("C", part)].into_iter().enumerate() {
            if self.tags[index] == value {
                continue;
            }
            if value.is_empty() {
                self.body.push_str(&format!("%TD.{name}*%\n"));
            } else {
                self.body.push_str(&format!("%TO.{name},{value}*%\n"));
            }
            self.tags[index] = value.to_owned();
        }
    }

    /// Adds an attribute of the object that follows, as written in the file.
    pub fn attribute(&mut self, text: &str) {
        let _ = writeln!(self.body, "%{text}*%");
    }

    /// Whether what follows takes copper away.
    pub fn polarity(&mut self, clear: bool) {
        if self.clear != clear {
            self.clear = clear;
            self.body.push_str(if clear { "%LPC*%\n" } else { "%LPD*%\n" });
        }
    }

    fn select(&mut self, definition: String, function: &str) {
        let wanted = (definition, function.to_owned());
        let index = self.apertures.iter().position(|entry| *entry == wanted).unwrap_or_else(|| {
            self.apertures.push(wanted);
            self.apertures.len() - 1
        });
        if self.aperture != index + 1 {
            self.aperture = index + 1;
            let _ = writeln!(self.body, "D{}*", index + 10);
        }
    }

    fn pad_definition(shape: Shape, grow: f64) -> String {
        let g = 2.0 * grow;
        match shape {
            Shape::Round(d) => format!("C,{}", length(d + g)),
            Shape::Rect(w, h) if grow == 0.0 => format!("R,{}X{}", length(w), length(h)),
            Shape::Rect(w, h) => format!("ROUNDED,{}X{}X{}", length(w + g), length(h + g), length(grow)),
            Shape::Rounded(w, h, r) => {
                format!("ROUNDED,{}X{}X{}", length(w + g), length(h + g), length(r + grow))
            }
            Shape::Oval(w, h) => format!("O,{}X{}", length(w + g), length(h + g)),
        }
    }

    /// Flashes a pad, grown on all sides by `grow`.
    pub fn flash(&mut self, shape: Shape, grow: f64, at: Xy, function: &str) {
        self.select(Self::pad_definition(shape, grow), function);
        let _ = writeln!(self.body, "X{}Y{}D03*", number(at.0), number(at.1));
    }

    /// Flashes a ring with four gaps.
    pub fn relief(&mut self, outer: f64, inner: f64, gap: f64, at: Xy) {
        self.select(format!("RELIEF,{}X{}X{}", length(outer), length(inner), length(gap)), "");
        let _ = writeln!(self.body, "X{}Y{}D03*", number(at.0), number(at.1));
    }

    /// Draws a line with a round pen.
    pub fn draw(&mut self, path: &[Xy], width: f64, function: &str) {
        self.select(format!("C,{}", length(width)), function);
        for (index, at) in path.iter().enumerate() {
            let code = if index == 0 { "D02" } else { "D01" };
            let _ = writeln!(self.body, "X{}Y{}{code}*", number(at.0), number(at.1));
        }
    }

    /// Draws or fills a rectangle whose corners are rounded, counter-clockwise.
    fn rounded_box(&mut self, low: Xy, high: Xy, r: f64) {
        let at = |x: f64, y: f64| format!("X{}Y{}", number(x), number(y));
        let mut text = format!("{}D02*\n", at(low.0 + r, low.1));
        let sides = [
            ((high.0 - r, low.1), (high.0, low.1 + r), (0.0, r)),
            ((high.0, high.1 - r), (high.0 - r, high.1), (-r, 0.0)),
            ((low.0 + r, high.1), (low.0, high.1 - r), (0.0, -r)),
            ((low.0, low.1 + r), (low.0 + r, low.1), (r, 0.0)),
        ];
        for (line, arc, centre) in sides {
            let _ = writeln!(text, "G01*\n{}D01*", at(line.0, line.1));
            let (i, j) = (number(centre.0), number(centre.1));
            let _ = writeln!(text, "G03*\n{}I{i}J{j}D01*", at(arc.0, arc.1));
        }
        text.push_str("G01*\n");
        self.body.push_str(&text);
    }

    /// Draws the outline of the board.
    pub fn profile(&mut self, size: Xy, corner: f64) {
        self.select(format!("C,{}", length(0.1)), "Profile");
        self.rounded_box((0.0, 0.0), size, corner);
    }

    /// Fills a rectangle with rounded corners.
    pub fn fill_box(&mut self, low: Xy, high: Xy, corner: f64) {
        self.attribute("TA.AperFunction,Conductor");
        self.body.push_str("G36*\n");
        self.rounded_box(low, high, corner);
        self.body.push_str("G37*\n");
        self.attribute("TD.AperFunction");
    }

    /// Fills contours, each on its own, in one region statement.
    pub fn fill(&mut self, contours: &[Vec<Xy>]) {
        self.fill_as("Conductor", contours);
    }

    /// Fills contours of a stated function.
    pub fn fill_as(&mut self, function: &str, contours: &[Vec<Xy>]) {
        self.attribute(&format!("TA.AperFunction,{function}"));
        self.body.push_str("G36*\n");
        for contour in contours {
            for (index, at) in contour.iter().chain(contour.first()).enumerate() {
                let code = if index == 0 { "D02" } else { "D01" };
                let _ = writeln!(self.body, "X{}Y{}{code}*", number(at.0), number(at.1));
            }
        }
        self.body.push_str("G37*\n");
        self.attribute("TD.AperFunction");
    }

    /// The whole file: header with `attributes` (without the percent signs), apertures, objects.
    pub fn finish(self, attributes: &[String]) -> String {
        let mut text = String::new();
        for attribute in attributes {
            let _ = writeln!(text, "%{attribute}*%");
        }
        text.push_str("%FSLAX46Y46*%\n%MOMM*%\n");
        let uses = |name: &str| self.apertures.iter().any(|(definition, _)| definition.starts_with(name));
        if uses("ROUNDED") || uses("RELIEF") {
            text.push_str(MACROS);
        }
        for (index, (definition, function)) in self.apertures.iter().enumerate() {
            if function.is_empty() {
                let _ = writeln!(text, "%ADD{}{definition}*%", index + 10);
            } else {
                let _ = writeln!(text, "%TA.AperFunction,{function}*%\n%ADD{}{definition}*%", index + 10);
                text.push_str("%TD.AperFunction*%\n");
            }
        }
        text.push_str("G75*\nG01*\n%LPD*%\n");
        text.push_str(&self.body);
        text.push_str("M02*\n");
        text
    }
}
