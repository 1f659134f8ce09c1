//! From the board in meters to the sheet in millimeters.

use crate::geom::{Bounds, Point};

/// A window of the board placed on the sheet.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct View {
    /// The window in meters.
    pub window: Bounds,
    /// Left edge on the sheet in mm.
    pub x: f64,
    /// Upper edge on the sheet in mm.
    pub y: f64,
    /// Millimeters on the sheet for each millimeter of the board.
    pub scale: f64,
    /// Whether the board is turned clockwise by 90 degrees.
    pub turned: bool,
}

impl View {
    /// The largest upright view of `window` with a round scale that fits a box of `width` x `height` mm, its upper left
    /// corner at `(x, y)`.
    pub fn fitted(window: Bounds, x: f64, y: f64, width: f64, height: f64) -> Self {
        let room = (width / (window.width() * 1e3)).min(height / (window.height() * 1e3));
        Self { window, x, y, scale: round_scale(room), turned: false }
    }

    /// The largest view of `window` that fits the box, whatever its scale, turned if it is taller than wide while the
    /// box is wider than tall. It is centered in the box.
    pub fn filling(window: Bounds, x: f64, y: f64, width: f64, height: f64) -> Self {
        let turned = window.height() > window.width() * 1.05 && width > height;
        let (w, h) =
            if turned { (window.height(), window.width()) } else { (window.width(), window.height()) };
        let scale = (width / (w * 1e3)).min(height / (h * 1e3));
        let (dx, dy) = (0.5 * (width - w * 1e3 * scale), 0.5 * (height - h * 1e3 * scale));
        Self { window, x: x + dx, y: y + dy, scale, turned }
    }

    /// Width on the sheet in mm.
    pub fn width(&self) -> f64 {
        let meters = if self.turned { self.window.height() } else { self.window.width() };
        meters * 1e3 * self.scale
    }

    /// Height on the sheet in mm.
    pub fn height(&self) -> f64 {
        let meters = if self.turned { self.window.width() } else { self.window.height() };
        meters * 1e3 * self.scale
    }

    /// A length in meters on the sheet in mm.
    pub fn length(&self, meters: f64) -> f64 {
        meters * 1e3 * self.scale
    }

    /// A point of the board on the sheet.
    pub fn place(&self, point: Point) -> (f64, f64) {
        let by = 1e3 * self.scale;
        if self.turned {
            (self.x + (point.y - self.window.min.y) * by, self.y + (point.x - self.window.min.x) * by)
        } else {
            (self.x + (point.x - self.window.min.x) * by, self.y + (self.window.max.y - point.y) * by)
        }
    }

    /// A point of the sheet on the board.
    pub fn back(&self, (x, y): (f64, f64)) -> Point {
        let by = 1e-3 / self.scale;
        let (dx, dy) = ((x - self.x) * by, (y - self.y) * by);
        if self.turned {
            Point::new(self.window.min.x + dy, self.window.min.y + dx)
        } else {
            Point::new(self.window.min.x + dx, self.window.max.y - dy)
        }
    }

    /// The scale as drawings state it, for example `2.5 : 1`.
    pub fn scale_text(&self) -> String {
        let short = |value: f64| super::number::coordinate((value * 100.0).round() / 100.0);
        if self.scale >= 0.999 {
            format!("{} : 1", short(self.scale))
        } else {
            format!("1 : {}", short(1.0 / self.scale))
        }
    }
}

/// The largest round scale that is at most `room`: n : 1 or 1 : n.
fn round_scale(room: f64) -> f64 {
    const STEPS: [f64; 19] =
        [1.0, 1.1, 1.25, 1.4, 1.5, 1.75, 2.0, 2.25, 2.5, 2.75, 3.0, 3.5, 4.0, 4.5, 5.0, 6.0, 7.0, 8.0, 9.0];
    let mut best = 0.0;
    for decade in 0..=3 {
        for step in STEPS {
            let n = step * libm::pow(10.0, f64::from(decade));
            for scale in [n, 1.0 / n] {
                if scale <= room * (1.0 + 1e-9) && scale > best {
                    best = scale;
                }
            }
        }
    }
    if best > 0.0 { best } else { room }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn scales_are_round() {
        let cases = [
            (2.6, 2.5),
            (2.9, 2.75),
            (2.5, 2.5),
            (3.9, 3.5),
            (1.2, 1.1),
            (0.9, 0.8),
            (0.5, 0.5),
            (0.7, 2.0 / 3.0),
            (12.0, 11.0),
        ];
        for (room, scale) in cases {
            assert!((round_scale(room) - scale).abs() < 1e-9, "{room}: {}", round_scale(room));
        }
    }

    #[test]
    fn points_go_there_and_back() {
        let window = Bounds { min: Point::mm(10.0, 20.0), max: Point::mm(30.0, 80.0) };
        for view in
            [View::fitted(window, 15.0, 28.5, 200.0, 125.0), View::filling(window, 5.0, 5.0, 57.8, 36.1)]
        {
            let point = Point::mm(12.0, 70.0);
            assert!(view.back(view.place(point)).distance(point) < 1e-12);
            assert!(view.height() <= 125.0 && view.width() <= 200.0);
        }
        let turned = View::filling(window, 0.0, 0.0, 57.8, 36.1);
        assert!(turned.turned && turned.height() <= 36.1 && turned.width() <= 57.8 + 1e-9);
        assert!(turned.place(Point::mm(10.0, 80.0)).0 > turned.place(Point::mm(10.0, 20.0)).0);
    }
}
