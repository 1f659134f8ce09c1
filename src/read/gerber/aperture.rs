//! Apertures: their definitions, their shapes, and what drawing with them covers.

use super::Object;
use super::macros::{Macro, regular_polygon};
use super::number::{decimal, turned};
use crate::geom::boolean::{Filling, difference, fill};
use crate::geom::stroke::{capsule, circle};
use crate::geom::{Point, Polygon, Region, Ring};
use std::collections::BTreeMap;
use std::sync::Arc;

/// An aperture.
#[derive(Clone, Debug)]
pub struct Aperture {
    /// What it looks like.
    pub kind: ApertureKind,
    /// Its function attribute.
    pub function: Option<Arc<str>>,
}

/// What an aperture looks like.
#[derive(Clone, Debug)]
pub enum ApertureKind {
    /// A circle: the pen of draws. The shape has the hole, if any.
    Circle {
        /// Diameter in metres.
        diameter_m: f64,
        /// Its shape round the origin.
        shape: Region,
    },
    /// Any other shape round the origin.
    Shape(Region),
    /// A block of objects.
    Block(Arc<Vec<Object>>),
}

/// Reads what follows `AD`, for example `D10C,0.5`. Gives the code and the aperture's look.
pub fn parse_definition(
    text: &str,
    macros: &BTreeMap<String, Macro>,
    unit_m: f64,
) -> Result<(u32, ApertureKind), String> {
    let wrong = || format!("aperture definition `{}` must read like `D10C,0.5`", super::words::excerpt(text));
    let rest = text.trim().strip_prefix('D').ok_or_else(wrong)?;
    let n_digits = rest.bytes().take_while(u8::is_ascii_digit).count();
    let code: u32 = rest[..n_digits].parse().map_err(|_| wrong())?;
    if code < 10 {
        return Err(format!("aperture `D{code}` must have a number from 10 on"));
    }
    let (name, list) = match rest[n_digits..].split_once(',') {
        Some((name, list)) => (name.trim(), list),
        None => (rest[n_digits..].trim(), ""),
    };
    if name.is_empty() {
        return Err(wrong());
    }
    let mut values = Vec::new();
    for field in list.split(['X', 'x']).filter(|_| !list.trim().is_empty()) {
        let value = decimal(field).filter(|value| value.abs() < 1e5);
        let text =
            || format!("size `{}` of aperture `D{code}` must be a number", super::words::excerpt(field));
        values.push(value.ok_or_else(text)?);
    }
    let kind = standard(name, &values, unit_m).or_else(|| {
        let shape = macros.get(name)?.shape(&values, unit_m);
        Some(shape.map(ApertureKind::Shape))
    });
    match kind {
        Some(Ok(kind)) => Ok((code, kind)),
        Some(Err(text)) => Err(format!("aperture `D{code}`: {text}")),
        None => Err(format!("aperture `D{code}` uses macro `{name}`, which is not defined before it")),
    }
}

/// The standard apertures; none when `name` is not one of them.
fn standard(name: &str, v: &[f64], unit_m: f64) -> Option<Result<ApertureKind, String>> {
    let (least, most) = match name {
        "C" => (1, 3),
        "R" | "O" => (2, 4),
        "P" => (2, 5),
        _ => return None,
    };
    if !(least..=most).contains(&v.len()) {
        return Some(Err(format!("`{name}` must have {least} to {most} values; got {}", v.len())));
    }
    if v.iter().enumerate().any(|(index, &value)| value < 0.0 && !(name == "P" && index == 2)) {
        return Some(Err("a size must not be negative".to_owned()));
    }
    let one = |ring: Ring| fill([&ring], Filling::NonZero);
    let size = |index: usize| v[index] * unit_m;
    let (shape, first_hole) = match name {
        "C" => (one(circle(Point::default(), size(0))), 1),
        "R" => {
            let (x, y) = (0.5 * size(0), 0.5 * size(1));
            (one([(-x, -y), (x, -y), (x, y), (-x, y)].map(|(x, y)| Point::new(x, y)).to_vec()), 2)
        }
        "O" => {
            let (width_m, height_m) = (size(0), size(1));
            let reach =
                Point::new((0.5 * (width_m - height_m)).max(0.0), (0.5 * (height_m - width_m)).max(0.0));
            (one(capsule(reach * -1.0, reach, width_m.min(height_m))), 2)
        }
        _ => match regular_polygon(v[1], size(0), v.get(2).copied().unwrap_or(0.0)) {
            Ok(ring) => (one(ring), 3),
            Err(text) => return Some(Err(text)),
        },
    };
    let shape = match v.get(first_hole..) {
        Some([diameter]) if *diameter > 0.0 => {
            difference(&shape, &one(circle(Point::default(), diameter * unit_m)))
        }
        // A rectangular hole, withdrawn from the format long ago.
        Some([width, height]) if *width > 0.0 && *height > 0.0 => {
            let (x, y) = (0.5 * width * unit_m, 0.5 * height * unit_m);
            difference(
                &shape,
                &one([(-x, -y), (x, -y), (x, y), (-x, y)].map(|(x, y)| Point::new(x, y)).to_vec()),
            )
        }
        _ => shape,
    };
    Some(Ok(match name {
        "C" => ApertureKind::Circle { diameter_m: size(0), shape },
        _ => ApertureKind::Shape(shape),
    }))
}

/// Mirroring, turning and scaling of apertures (`LM`, `LR`, `LS`).
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Transform {
    /// Mirror left and right.
    pub mirror_x: bool,
    /// Mirror up and down.
    pub mirror_y: bool,
    /// Cosine and sine of the counter-clockwise turn.
    pub turn: (f64, f64),
    /// Scale factor.
    pub scale: f64,
}

impl Transform {
    /// Leaves everything as it is.
    pub const NONE: Self = Self { mirror_x: false, mirror_y: false, turn: (1.0, 0.0), scale: 1.0 };

    /// A point after mirroring, scaling and turning round the origin.
    pub fn point(&self, p: Point) -> Point {
        let x = if self.mirror_x { -p.x } else { p.x };
        let y = if self.mirror_y { -p.y } else { p.y };
        turned(Point::new(x, y) * self.scale, self.turn)
    }

    /// A region after the same, moved to `at`.
    pub fn region(&self, region: &Region, at: Point) -> Region {
        let flipped = self.mirror_x != self.mirror_y;
        let ring = |ring: &Ring| -> Ring {
            let mut ring: Ring = ring.iter().map(|&p| self.point(p) + at).collect();
            if flipped {
                ring.reverse();
            }
            ring
        };
        let polygon = |polygon: &Polygon| Polygon {
            outer: ring(&polygon.outer),
            holes: polygon.holes.iter().map(ring).collect(),
        };
        Region(region.0.iter().map(polygon).collect())
    }
}

/// What a straight line drawn with a pen that is not round covers. Exact for convex pens; holes and notches of the
/// pen are filled.
pub fn swept(pen: &Region, from: Point, to: Point) -> Region {
    let corners = pen.0.iter().flat_map(|polygon| polygon.outer.iter());
    let mut points: Vec<Point> = corners.flat_map(|&p| [p + from, p + to]).collect();
    points.sort_by(|a, b| a.x.total_cmp(&b.x).then(a.y.total_cmp(&b.y)));
    points.dedup();
    if points.len() < 3 {
        return Region::default();
    }
    let half = |points: &mut dyn Iterator<Item = Point>| {
        let mut hull: Vec<Point> = Vec::new();
        for p in points {
            while let [.., a, b] = hull[..] {
                if (b - a).cross(p - b) > 0.0 {
                    break;
                }
                hull.pop();
            }
            hull.push(p);
        }
        hull.pop();
        hull
    };
    let mut hull = half(&mut points.iter().copied());
    hull.extend(half(&mut points.iter().rev().copied()));
    fill([&hull], Filling::NonZero)
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    fn area_mm2(text: &str) -> f64 {
        match parse_definition(text, &BTreeMap::new(), 1e-3).unwrap().1 {
            ApertureKind::Circle { shape, .. } | ApertureKind::Shape(shape) => shape.area() * 1e6,
            ApertureKind::Block(_) => f64::NAN,
        }
    }

    #[test]
    fn standard_apertures_have_the_areas_of_elementary_geometry() {
        let hexagon = 1.5 * 3f64.sqrt();
        let cases = [
            ("D10C,2", PI),
            ("D10C,2X1", 0.75 * PI),
            ("D11R,2X3", 6.0),
            ("D12O,4X2", 4.0 + PI),
            ("D12O,2X4", 4.0 + PI),
            ("D12O,2X2", PI),
            ("D13P,2X6X15.5", hexagon),
            ("D13P,2X6X-15X1", hexagon - 0.25 * PI),
        ];
        for (text, exact) in cases {
            assert!((area_mm2(text) - exact).abs() < 4e-3, "{text}: {} against {exact}", area_mm2(text));
        }
    }

    #[test]
    fn wrong_definitions_are_errors() {
        for bad in
            ["", "D9C,1", "D10", "D10C", "D10C,NaN", "D10C,-1", "D10C,1e3", "D10R,1", "D10P,1X2", "D10OVAL"]
        {
            assert!(parse_definition(bad, &BTreeMap::new(), 1e-3).is_err(), "{bad}");
        }
    }

    #[test]
    fn a_square_pen_sweeps_a_hexagon() {
        let ApertureKind::Shape(pen) = parse_definition("D10R,2X2", &BTreeMap::new(), 1e-3).unwrap().1 else {
            panic!("a rectangle is a shape")
        };
        let area = swept(&pen, Point::default(), Point::mm(3.0, 4.0)).area() * 1e6;
        // A square of side s moved by (a, b) covers s^2 + s (a + b).
        assert!((area - (4.0 + 2.0 * 7.0)).abs() < 1e-9, "{area}");
    }
}
