//! Path data of SVG, built from points in millimeters.

use super::number::push_coordinate;

/// The `d` attribute of a path.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PathData {
    text: String,
    decimals: u32,
}

impl PathData {
    /// An empty path with coordinates to 1 um.
    pub fn new() -> Self {
        Self { text: String::new(), decimals: 3 }
    }

    /// An empty path with coordinates to 10 um, a twentieth of a pixel: for shapes with many points.
    pub fn coarse() -> Self {
        Self { text: String::new(), decimals: 2 }
    }

    fn pair(&mut self, command: char, (x, y): (f64, f64)) {
        self.text.push(command);
        push_coordinate(&mut self.text, x, self.decimals);
        self.text.push(' ');
        push_coordinate(&mut self.text, y, self.decimals);
    }

    /// Starts a new line.
    pub fn move_to(&mut self, point: (f64, f64)) -> &mut Self {
        self.pair('M', point);
        self
    }

    /// Goes straight on.
    pub fn line_to(&mut self, point: (f64, f64)) -> &mut Self {
        self.pair('L', point);
        self
    }

    /// Closes the line.
    pub fn close(&mut self) -> &mut Self {
        self.text.push('Z');
        self
    }

    /// An open line through `points`.
    pub fn line(&mut self, points: &[(f64, f64)]) -> &mut Self {
        for (index, &point) in points.iter().enumerate() {
            self.pair(if index == 0 { 'M' } else { 'L' }, point);
        }
        self
    }

    /// A closed line through `points`.
    pub fn ring(&mut self, points: &[(f64, f64)]) -> &mut Self {
        if !points.is_empty() {
            self.line(points).close();
        }
        self
    }

    /// An upright box.
    pub fn rect(&mut self, x: f64, y: f64, width: f64, height: f64) -> &mut Self {
        self.ring(&[(x, y), (x + width, y), (x + width, y + height), (x, y + height)])
    }

    /// A circle.
    pub fn circle(&mut self, (x, y): (f64, f64), radius: f64) -> &mut Self {
        let mut arc = String::from("a");
        push_coordinate(&mut arc, radius, self.decimals);
        arc.push(' ');
        push_coordinate(&mut arc, radius, self.decimals);
        let half = |out: &mut String, step: f64, decimals: u32| {
            out.push_str(&arc);
            out.push_str(" 0 1 0 ");
            push_coordinate(out, step, decimals);
            out.push_str(" 0");
        };
        self.pair('M', (x - radius, y));
        let decimals = self.decimals;
        half(&mut self.text, 2.0 * radius, decimals);
        half(&mut self.text, -2.0 * radius, decimals);
        self.text.push('Z');
        self
    }

    /// A box with its upper left corner at `(x, y)` whose left and right ends are half circles; a circle when square.
    pub fn pill(&mut self, (x, y): (f64, f64), width: f64, height: f64) -> &mut Self {
        let radius = 0.5 * height;
        let straight = (width - height).max(0.0);
        let mut arc = String::from("a");
        push_coordinate(&mut arc, radius, self.decimals);
        arc.push(' ');
        push_coordinate(&mut arc, radius, self.decimals);
        arc.push_str(" 0 0 1 0 ");
        self.pair('M', (x + radius, y));
        for (line, turn) in [(straight, height), (-straight, -height)] {
            self.text.push('h');
            push_coordinate(&mut self.text, line, self.decimals);
            self.text.push_str(&arc);
            push_coordinate(&mut self.text, turn, self.decimals);
        }
        self.text.push('Z');
        self
    }

    /// Whether nothing was drawn.
    pub fn is_empty(&self) -> bool {
        self.text.is_empty()
    }

    /// The attribute's text.
    pub fn as_str(&self) -> &str {
        &self.text
    }
}
