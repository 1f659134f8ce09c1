//! The operations of a Gerber file: move, draw, flash, and the contours of regions.

use super::Object;
use super::aperture::{ApertureKind, swept};
use super::interpret::{Interpolation, MOST_OBJECTS, State, moved};
use crate::board::CopperKind;
use crate::diag::code::read as code;
use crate::geom::boolean::{Filling, fill, union};
use crate::geom::stroke::arc;
use crate::geom::{Point, Region};

/// An arc's ends may lie at distances from its centre that differ by this part of the radius ...
const RADIUS_TOLERANCE: f64 = 0.05;
/// ... or by this many metres.
const RADIUS_TOLERANCE_M: f64 = 20e-6;

/// Coordinates of one operation in metres.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Operands {
    x: Option<f64>,
    y: Option<f64>,
    i: Option<f64>,
    j: Option<f64>,
}

impl Operands {
    pub fn set(&mut self, letter: char, metres: f64) {
        match letter {
            'X' => self.x = Some(metres),
            'Y' => self.y = Some(metres),
            'I' => self.i = Some(metres),
            _ => self.j = Some(metres),
        }
    }

    pub fn any(&self) -> bool {
        [self.x, self.y, self.i, self.j].iter().any(Option::is_some)
    }
}

impl State<'_> {
    /// Obeys `D01`, `D02` or `D03`.
    pub fn operate(&mut self, operation: u32, operands: &Operands, line: u32) {
        let from = self.position;
        let to = Point::new(operands.x.unwrap_or(from.x), operands.y.unwrap_or(from.y));
        self.position = to;
        match operation {
            1 => {
                let Some(path) = self.path(from, to, operands, line) else { return };
                if let Some(region) = &mut self.region {
                    match region.contours.last_mut() {
                        Some(contour) => contour.extend(&path[1..]),
                        None => region.contours.push(path),
                    }
                } else {
                    self.draw(path, line);
                }
            }
            2 => {
                if let Some(region) = &mut self.region {
                    region.contours.push(vec![to]);
                }
            }
            _ if self.region.is_some() => self.error(line, "a flash (`D03`) must not stand inside a region"),
            _ => self.flash(to, line),
        }
    }

    /// Points from `from` to `to` in the current interpolation.
    fn path(&mut self, from: Point, to: Point, operands: &Operands, line: u32) -> Option<Vec<Point>> {
        let clockwise = match self.interpolation {
            Interpolation::Linear => return Some(vec![from, to]),
            Interpolation::Clockwise => true,
            Interpolation::CounterClockwise => false,
        };
        let offset = Point::new(operands.i.unwrap_or(0.0), operands.j.unwrap_or(0.0));
        let mismatch = |centre: Point| (from.distance(centre) - to.distance(centre)).abs();
        let single = match self.single_quadrant {
            Some(single) => single,
            None => {
                self.error(line, "an arc must follow `G75` (or `G74`), which says how its centre is given");
                return None;
            }
        };
        let centre = if !single {
            from + offset
        } else {
            if from == to {
                return Some(vec![from, to]);
            }
            // The signs of the offset are left out: the centre is the one that makes an arc of at most 90 degrees.
            let signs = [(1.0, 1.0), (-1.0, 1.0), (1.0, -1.0), (-1.0, -1.0)];
            let centres = signs.map(|(x, y)| from + Point::new(x * offset.x.abs(), y * offset.y.abs()));
            let short = centres.into_iter().filter(|&centre| {
                let (a, b) = (from - centre, to - centre);
                let turn = if clockwise { -a.cross(b) } else { a.cross(b) };
                turn >= 0.0 && a.dot(b) >= -1e-6 * a.length() * b.length()
            });
            match short.min_by(|a, b| mismatch(*a).total_cmp(&mismatch(*b))) {
                Some(centre) => centre,
                None => {
                    self.error(line, "a single-quadrant arc (`G74`) must turn by at most 90 degrees");
                    return None;
                }
            }
        };
        let radius_m = from.distance(centre).max(to.distance(centre));
        if radius_m == 0.0 {
            return Some(vec![from, to]);
        }
        if mismatch(centre) > (RADIUS_TOLERANCE * radius_m).max(RADIUS_TOLERANCE_M) {
            let text = format!(
                "an arc must have both ends at the same distance from its centre; got {:.4} mm and {:.4} mm",
                from.distance(centre) * 1e3,
                to.distance(centre) * 1e3
            );
            self.error(line, text);
            return None;
        }
        Some(arc(from, to, centre, clockwise))
    }

    fn draw(&mut self, mut path: Vec<Point>, line: u32) {
        let Some(aperture) = self.current.and_then(|code| self.apertures.get(&code)) else {
            self.error(line, "a draw needs an aperture, and none that is defined is selected");
            return;
        };
        let function = aperture.function.clone();
        path.dedup();
        let kind = match &aperture.kind {
            ApertureKind::Circle { diameter_m, .. } => {
                CopperKind::Draw { path, width_m: diameter_m * self.transform.scale }
            }
            ApertureKind::Shape(pen) => {
                let pen = self.transform.region(pen, Point::default());
                let code = self.current.unwrap_or_default();
                if !self.pens_reported.contains(&code) {
                    self.pens_reported.push(code);
                    let text =
                        format!("draws with aperture `D{code}`, which is not round, are taken as areas");
                    self.log.note(line, code::GERBER_PEN, text);
                }
                let pieces: Vec<Region> = match path[..] {
                    [dot] => vec![swept(&pen, dot, dot)],
                    _ => path.windows(2).map(|ends| swept(&pen, ends[0], ends[1])).collect(),
                };
                CopperKind::Fill { shape: union(&pieces) }
            }
            ApertureKind::Block(_) => {
                self.error(line, "a draw must not use a block aperture");
                return;
            }
        };
        self.push(Object { kind, dark: self.dark, tags: self.attributes.object.clone(), function, line });
    }

    fn flash(&mut self, at: Point, line: u32) {
        let Some(aperture) = self.current.and_then(|code| self.apertures.get(&code)) else {
            self.error(line, "a flash needs an aperture, and none that is defined is selected");
            return;
        };
        let function = aperture.function.clone();
        let shape = match &aperture.kind {
            ApertureKind::Circle { shape, .. } | ApertureKind::Shape(shape) => {
                self.transform.region(shape, at)
            }
            ApertureKind::Block(objects) => {
                let (objects, transform, dark) = (objects.clone(), self.transform, self.dark);
                for object in objects.iter() {
                    self.push(moved(object, &transform, at, dark, line));
                    if self.n_objects > MOST_OBJECTS {
                        break;
                    }
                }
                return;
            }
        };
        let kind = CopperKind::Flash { at, shape };
        self.push(Object { kind, dark: self.dark, tags: self.attributes.object.clone(), function, line });
    }

    /// Closes a region statement: each contour is filled on its own, the whole is one object.
    pub fn end_region(&mut self, line: u32) {
        let Some(region) = self.region.take() else {
            self.error(line, "`G37` must end a region that was begun with `G36`");
            return;
        };
        let mut shapes = Vec::new();
        for mut contour in region.contours {
            contour.dedup();
            let open = contour.first() != contour.last();
            if contour.len() > 1 && !open {
                contour.pop();
            }
            if contour.len() < 3 {
                continue;
            }
            if open {
                let text = "a contour must end where it began; the gap is closed by a straight line";
                self.log.warning(region.line, code::GERBER_CONTOUR, text);
            }
            shapes.push(fill([&contour], Filling::NonZero));
        }
        let shape = match shapes.len() {
            0 => return,
            1 => shapes.remove(0),
            _ => union(&shapes),
        };
        // The attributes that hold at `G36` hold for the region, as attribute commands inside it are not allowed.
        let (tags, function) = (self.attributes.object.clone(), self.attributes.function.clone());
        let kind = CopperKind::Fill { shape };
        self.push(Object { kind, dark: self.dark, tags, function, line: region.line });
    }
}
