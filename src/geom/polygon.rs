//! Polygons with holes and regions made of them.

use super::{Bounds, Point};

/// A closed line; the last point joins the first and is not repeated.
pub type Ring = Vec<Point>;

/// One connected area with holes. The outer ring runs counter-clockwise, holes run clockwise; rings do not cross.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Polygon {
    /// Outer rim, counter-clockwise.
    pub outer: Ring,
    /// Rims of the holes, clockwise.
    pub holes: Vec<Ring>,
}

/// A set of disjoint polygons.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Region(pub Vec<Polygon>);

/// Signed area of a ring in square metres, positive when it runs counter-clockwise.
pub fn ring_area(ring: &[Point]) -> f64 {
    let Some(&origin) = ring.first() else { return 0.0 };
    let twice: f64 = ring.windows(2).map(|w| (w[0] - origin).cross(w[1] - origin)).sum();
    0.5 * twice
}

/// Whether `point` lies inside `ring` (even-odd rule).
fn ring_contains(ring: &[Point], point: Point) -> bool {
    let mut inside = false;
    let mut previous = match ring.last() {
        Some(&last) => last,
        None => return false,
    };
    for &current in ring {
        if (current.y > point.y) != (previous.y > point.y) {
            let t = (point.y - current.y) / (previous.y - current.y);
            if point.x < current.x + t * (previous.x - current.x) {
                inside = !inside;
            }
        }
        previous = current;
    }
    inside
}

impl Polygon {
    /// Area in square metres, holes taken off.
    pub fn area(&self) -> f64 {
        ring_area(&self.outer) + self.holes.iter().map(|hole| ring_area(hole)).sum::<f64>()
    }

    /// The smallest box round the outer rim.
    pub fn bounds(&self) -> Bounds {
        Bounds::of(self.outer.iter().copied())
    }

    /// Whether `point` lies on the area, not in a hole.
    pub fn contains(&self, point: Point) -> bool {
        ring_contains(&self.outer, point) && !self.holes.iter().any(|hole| ring_contains(hole, point))
    }

    /// All rims, the outer one first.
    pub fn rings(&self) -> impl Iterator<Item = &Ring> {
        std::iter::once(&self.outer).chain(&self.holes)
    }
}

impl Region {
    /// Area in square metres.
    pub fn area(&self) -> f64 {
        self.0.iter().map(Polygon::area).sum()
    }

    /// The smallest box round everything.
    pub fn bounds(&self) -> Bounds {
        self.0.iter().fold(Bounds::EMPTY, |all, polygon| all.union(polygon.bounds()))
    }

    /// Whether `point` lies on one of the polygons.
    pub fn contains(&self, point: Point) -> bool {
        self.0.iter().any(|polygon| polygon.contains(point))
    }
}
