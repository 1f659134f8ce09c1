//! Aperture macros: their statements and the shapes of their primitives.

use super::expression::Expression;
use super::number::{turn, turned};
use crate::geom::boolean::{Filling, difference, fill, union};
use crate::geom::stroke::circle;
use crate::geom::{Point, Region, Ring};
use std::collections::BTreeMap;

/// An aperture macro.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Macro {
    statements: Vec<(Statement, u32)>,
}

#[derive(Clone, Debug, PartialEq)]
enum Statement {
    Set(u32, Expression),
    Primitive(u32, Vec<Expression>),
}

impl Macro {
    /// Adds one statement; an error is a sentence about it.
    pub fn push(&mut self, text: &str, line: u32) -> Result<(), String> {
        let text = text.trim();
        if text.starts_with('0') {
            return Ok(()); // A comment.
        }
        let statement = if let Some(rest) = text.strip_prefix('$') {
            let (index, value) =
                rest.split_once('=').ok_or_else(|| format!("`{text}` must set a variable"))?;
            let index =
                index.trim().parse().map_err(|_| format!("`${index}` must be a variable like `$1`"))?;
            Statement::Set(index, Expression::parse(value)?)
        } else {
            let mut fields = text.split(',');
            let code = fields.next().unwrap_or_default().trim();
            let wrong =
                || format!("macro statement `{}` must start with a primitive's number", excerpt(text));
            let code = code.parse().map_err(|_| wrong())?;
            let mut values: Vec<_> = fields.map(Expression::parse).collect::<Result<_, _>>()?;
            if code == 2 {
                return Self::checked(20, values).map(|statement| self.statements.push((statement, line)));
            }
            // Some exporters leave out a rotation of zero.
            if code == 1 && values.len() == 5 && values[4] == Expression::Number(0.0) {
                values.pop();
            }
            Self::checked(code, values)?
        };
        self.statements.push((statement, line));
        Ok(())
    }

    fn checked(code: u32, values: Vec<Expression>) -> Result<Statement, String> {
        let allowed: &[usize] = match code {
            1 => &[4, 5],
            20 => &[7],
            21 | 22 => &[6],
            4 => &[],
            5 => &[6],
            6 => &[9],
            7 => &[6],
            _ => return Err(format!("macro primitive {code} is not known")),
        };
        if code != 4 && !allowed.contains(&values.len()) {
            let wanted = allowed.last().copied().unwrap_or_default();
            return Err(format!("macro primitive {code} must have {wanted} values; got {}", values.len()));
        }
        Ok(Statement::Primitive(code, values))
    }

    /// The shape for the given parameters; lengths are multiplied by `unit_m`.
    pub fn shape(&self, parameters: &[f64], unit_m: f64) -> Result<Region, String> {
        let mut variables: BTreeMap<u32, f64> =
            parameters.iter().enumerate().map(|(index, &value)| (index as u32 + 1, value)).collect();
        let mut shape = Region::default();
        for (statement, line) in &self.statements {
            match statement {
                Statement::Set(index, value) => {
                    let value = value.value(&variables);
                    variables.insert(*index, value);
                }
                Statement::Primitive(code, values) => {
                    let values: Vec<f64> = values.iter().map(|value| value.value(&variables)).collect();
                    if values.iter().any(|value| !value.is_finite() || value.abs() > 1e5) {
                        return Err(format!("a value in the macro's line {line} is not a usable number"));
                    }
                    let (dark, part) = primitive(*code, &values, unit_m)
                        .map_err(|text| format!("{text} (macro, line {line})"))?;
                    shape = if dark { union([&shape, &part]) } else { difference(&shape, &part) };
                }
            }
        }
        Ok(shape)
    }
}

fn excerpt(text: &str) -> String {
    super::words::excerpt(text)
}

/// Shape of one primitive and whether it adds to the macro's shape. Numbers of values were checked when reading.
fn primitive(code: u32, v: &[f64], unit_m: f64) -> Result<(bool, Region), String> {
    let one = |ring: Ring| fill([&ring], Filling::NonZero);
    let at = |x: f64, y: f64| Point::new(x, y) * unit_m;
    let spin = |rings: Vec<Ring>, degrees: f64| -> Region {
        let by = turn(degrees);
        let rings: Vec<Ring> =
            rings.into_iter().map(|ring| ring.into_iter().map(|p| turned(p, by)).collect()).collect();
        fill(&rings, Filling::NonZero)
    };
    let exposure = |value: f64| match value {
        1.0 => Ok(true),
        0.0 => Ok(false),
        _ => Err(format!("exposure must be 0 or 1; got {value}")),
    };
    let size = |value: f64| {
        if value < 0.0 {
            Err(format!("a size must not be negative; got {value}"))
        } else {
            Ok(value * unit_m)
        }
    };
    let rectangle = |centre: Point, width_m: f64, height_m: f64| -> Ring {
        let (x, y) = (0.5 * width_m, 0.5 * height_m);
        [(-x, -y), (x, -y), (x, y), (-x, y)].map(|(dx, dy)| centre + Point::new(dx, dy)).to_vec()
    };
    match code {
        1 => {
            let by = turn(v.get(4).copied().unwrap_or(0.0));
            Ok((exposure(v[0])?, one(circle(turned(at(v[2], v[3]), by), size(v[1])?))))
        }
        20 => {
            let (start, end, width_m) = (at(v[2], v[3]), at(v[4], v[5]), size(v[1])?);
            let length = start.distance(end);
            if length == 0.0 {
                return Ok((exposure(v[0])?, Region::default()));
            }
            let along = (end - start) * (0.5 * width_m / length);
            let left = Point::new(-along.y, along.x);
            let ring = vec![start - left, end - left, end + left, start + left];
            Ok((exposure(v[0])?, spin(vec![ring], v[6])))
        }
        21 | 22 => {
            let (width_m, height_m) = (size(v[1])?, size(v[2])?);
            let corner =
                if code == 22 { Point::new(0.5 * width_m, 0.5 * height_m) } else { Point::default() };
            let ring = rectangle(at(v[3], v[4]) + corner, width_m, height_m);
            Ok((exposure(v[0])?, spin(vec![ring], v[5])))
        }
        4 => {
            let n = v.get(1).copied().unwrap_or(-1.0);
            if !(n.fract() == 0.0 && (1.0..=50_000.0).contains(&n)) {
                return Err("macro primitive 4 must state its number of corners".to_owned());
            }
            let n = n as usize;
            if v.len() != 2 * n + 5 && v.len() != 2 * n + 4 {
                return Err(format!("macro primitive 4 must have {} values; got {}", 2 * n + 5, v.len()));
            }
            let ring = (0..=n).map(|index| at(v[2 + 2 * index], v[3 + 2 * index])).collect();
            Ok((exposure(v[0])?, spin(vec![ring], v.get(2 * n + 4).copied().unwrap_or(0.0))))
        }
        5 => {
            let ring = regular_polygon(v[1], size(v[4])?, 0.0)?;
            let centre = at(v[2], v[3]);
            let ring = ring.into_iter().map(|p| p + centre).collect();
            Ok((exposure(v[0])?, spin(vec![ring], v[5])))
        }
        6 => {
            // Moire: centre, outer diameter, ring width, gap, number of rings, hair width, hair length, rotation.
            let centre = at(v[0], v[1]);
            let mut shape = Region::default();
            let (mut outer_m, ring_m, gap_m) = (size(v[2])?, size(v[3])?, size(v[4])?);
            for _ in 0..v[5].clamp(0.0, 100.0) as usize {
                if outer_m <= 0.0 || ring_m <= 0.0 {
                    break;
                }
                let inner_m = outer_m - 2.0 * ring_m;
                let mut ring = one(circle(centre, outer_m));
                if inner_m > 0.0 {
                    ring = difference(&ring, &one(circle(centre, inner_m)));
                }
                shape = union([&shape, &ring]);
                outer_m = inner_m - 2.0 * gap_m;
            }
            let (width_m, length_m) = (size(v[6])?, size(v[7])?);
            for (w, h) in [(length_m, width_m), (width_m, length_m)] {
                shape = union([&shape, &one(rectangle(centre, w, h))]);
            }
            Ok((true, turned_region(&shape, v[8])))
        }
        _ => {
            // Thermal: centre, outer and inner diameter, gap, rotation.
            let centre = at(v[0], v[1]);
            let (outer_m, inner_m, gap_m) = (size(v[2])?, size(v[3])?, size(v[4])?);
            let mut shape = one(circle(centre, outer_m));
            if inner_m > 0.0 {
                shape = difference(&shape, &one(circle(centre, inner_m)));
            }
            for (w, h) in [(2.0 * outer_m, gap_m), (gap_m, 2.0 * outer_m)] {
                shape = difference(&shape, &one(rectangle(centre, w, h)));
            }
            Ok((true, turned_region(&shape, v[5])))
        }
    }
}

/// A region turned counter-clockwise round the origin.
fn turned_region(region: &Region, degrees: f64) -> Region {
    let by = turn(degrees);
    let rings: Vec<Ring> =
        region.0.iter().flat_map(|p| p.rings()).map(|r| r.iter().map(|&p| turned(p, by)).collect()).collect();
    fill(&rings, Filling::NonZero)
}

/// Corners of a regular polygon round the origin, the first one at `degrees`.
pub fn regular_polygon(n: f64, diameter_m: f64, degrees: f64) -> Result<Ring, String> {
    if !(n.fract() == 0.0 && (3.0..=12.0).contains(&n)) {
        return Err(format!("a polygon must have 3 to 12 corners; got {n}"));
    }
    let corner = |index: usize| {
        let (cos, sin) = turn(degrees + 360.0 * index as f64 / n);
        Point::new(cos, sin) * (0.5 * diameter_m)
    };
    Ok((0..n as usize).map(corner).collect())
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::f64::consts::PI;

    fn area_mm2(statements: &[&str], parameters: &[f64]) -> f64 {
        let mut shape = Macro::default();
        for text in statements {
            shape.push(text, 1).unwrap();
        }
        shape.shape(parameters, 1e-3).unwrap().area() * 1e6
    }

    #[test]
    fn primitives_have_the_areas_of_elementary_geometry() {
        let circle = PI;
        let cases: [(&[&str], f64); 8] = [
            (&["1,1,2,5,5"], circle),
            (&["1,1,2,5,5,30", "1,0,1,5x0.866025404-2.5,5x0.866025404+2.5"], 0.75 * circle),
            (&["20,1,0.5,0,0,3,4,30"], 2.5),
            (&["21,1,2,3,1,1,17", "0 a comment, 1,2"], 6.0),
            (&["22,1,2,3,1,1,0"], 6.0),
            (&["4,1,3,0,0,4,0,0,3,0,0,45"], 6.0),
            (&["5,1,4,0,0,2,0"], 2.0),
            (&["$3=$1x2", "21,1,$3,$2,0,0,0"], 12.0),
        ];
        for (statements, exact) in cases {
            let area = area_mm2(statements, &[2.0, 3.0]);
            assert!((area - exact).abs() < 6e-3 * exact.min(1.0), "{statements:?}: {area} against {exact}");
        }
        // A ring of diameters 4 and 2 less four gaps of width 0.2; a gap's end sections are arcs.
        let side = |r: f64| (r * r - 0.01f64).sqrt();
        let strip = |r: f64| 0.1 * side(r) + r * r * (0.1 / r).asin();
        let exact = PI * 4.0 - PI - 4.0 * (strip(2.0) - strip(1.0));
        assert!((area_mm2(&["7,1,1,4,2,0.2,45"], &[]) - exact).abs() < 0.01);
    }

    #[test]
    fn wrong_primitives_are_errors() {
        let mut shape = Macro::default();
        for bad in ["9,1", "1,1", "20,1,1,1", "x", "$a=1", "$1", "21,1,2,3,1,1,(", ""] {
            assert!(shape.push(bad, 1).is_err(), "{bad}");
        }
        for bad in ["1,2,1,0,0", "1,1,-1,0,0", "4,1,9,0,0,1,1,0,0,0", "5,1,2.5,0,0,1,0", "1,1,1/0,0,0"] {
            let mut shape = Macro::default();
            shape.push(bad, 1).unwrap();
            assert!(shape.shape(&[], 1e-3).is_err(), "{bad}");
        }
    }
}
