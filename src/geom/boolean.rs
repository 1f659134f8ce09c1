//! Set operations on regions: union, difference, intersection, offset. The only file that names the polygon crate.
//!
//! All operations round coordinates to a grid of one nanometre, which holds the numbers of usual fabrication files
//! exactly; the same input gives the same output, point for point, whatever the number of threads.

use super::{Point, Polygon, Region, Ring};
use i_overlay::core::fill_rule::FillRule;
use i_overlay::core::overlay::{IntOverlayOptions, Overlay, ShapeType};
use i_overlay::core::overlay_rule::OverlayRule;
use i_overlay::i_float::int::point::IntPoint;
use i_overlay::i_shape::int::shape::IntShapes;

/// Step of the grid on which set operations work, in metres.
pub const GRID_M: f64 = 1e-9;

/// Grid steps in a metre. Dividing by it gives the number nearest to the decimal, as readers of files get it.
const PER_M: f64 = 1e9;

/// How a ring that touches or crosses itself or others is filled.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Filling {
    /// Everything that a ring goes round, in either direction. Slits of zero width vanish.
    NonZero,
    /// What an odd number of rings goes round: rings inside rings are holes.
    EvenOdd,
}

/// Fills raw rings of any direction. With [`Filling::NonZero`] rings that run against each other cancel where they
/// overlap: fill each on its own and unite the results where that is not meant.
pub fn fill<'a>(rings: impl IntoIterator<Item = &'a Ring>, filling: Filling) -> Region {
    let rule = match filling {
        Filling::NonZero => FillRule::NonZero,
        Filling::EvenOdd => FillRule::EvenOdd,
    };
    let mut overlay = Overlay::new_custom(64, options(), Default::default());
    for ring in rings {
        overlay.add_path_iter(ring.iter().map(|&point| to_grid(point)), ShapeType::Subject);
    }
    from_grid(overlay.overlay(OverlayRule::Subject, rule))
}

/// The area that any of `regions` covers.
pub fn union<'a>(regions: impl IntoIterator<Item = &'a Region>) -> Region {
    union_with(regions, &[])
}

/// The area that any of `regions` or of the simple counter-clockwise `rings` covers.
pub fn union_with<'a>(regions: impl IntoIterator<Item = &'a Region>, rings: &[Ring]) -> Region {
    let mut overlay = Overlay::new_custom(64, options(), Default::default());
    for region in regions {
        add(&mut overlay, region, ShapeType::Subject);
    }
    for ring in rings {
        overlay.add_path_iter(ring.iter().map(|&point| to_grid(point)), ShapeType::Subject);
    }
    from_grid(overlay.overlay(OverlayRule::Subject, FillRule::NonZero))
}

/// `a` without what `b` covers.
pub fn difference(a: &Region, b: &Region) -> Region {
    combine(a, b, OverlayRule::Difference)
}

/// What both `a` and `b` cover.
pub fn intersection(a: &Region, b: &Region) -> Region {
    combine(a, b, OverlayRule::Intersect)
}

/// The region grown by `distance_m` (shrunk where negative): all points within that distance, corners rounded.
pub fn offset(region: &Region, distance_m: f64) -> Region {
    if region.0.is_empty() || distance_m.abs() < GRID_M {
        return region.clone();
    }
    let mut rims = Vec::new();
    for ring in region.0.iter().flat_map(Polygon::rings) {
        for (index, &from) in ring.iter().enumerate() {
            let to = ring[(index + 1) % ring.len()];
            rims.push(super::stroke::capsule(from, to, 2.0 * distance_m.abs()));
        }
    }
    if distance_m > 0.0 { union_with([region], &rims) } else { difference(region, &union_with([], &rims)) }
}

fn combine(a: &Region, b: &Region, rule: OverlayRule) -> Region {
    let mut overlay = Overlay::new_custom(64, options(), Default::default());
    add(&mut overlay, a, ShapeType::Subject);
    add(&mut overlay, b, ShapeType::Clip);
    from_grid(overlay.overlay(rule, FillRule::NonZero))
}

fn options() -> IntOverlayOptions {
    IntOverlayOptions { ogc: true, ..IntOverlayOptions::default() }
}

fn add(overlay: &mut Overlay, region: &Region, kind: ShapeType) {
    for ring in region.0.iter().flat_map(Polygon::rings) {
        overlay.add_path_iter(ring.iter().map(|&point| to_grid(point)), kind);
    }
}

/// Nearest grid point; what lies beyond 2 m is moved to the rim of the grid, readers refuse such coordinates.
fn to_grid(point: Point) -> IntPoint {
    IntPoint::new((point.x * PER_M).round() as i32, (point.y * PER_M).round() as i32)
}

fn from_grid(shapes: IntShapes) -> Region {
    let ring = |points: Vec<IntPoint>| -> Ring {
        points.into_iter().map(|p| Point::new(f64::from(p.x) / PER_M, f64::from(p.y) / PER_M)).collect()
    };
    let polygon = |contours: Vec<Vec<IntPoint>>| {
        let mut rings = contours.into_iter().map(ring);
        let outer = rings.next().unwrap_or_default();
        Polygon { outer, holes: rings.collect() }
    };
    Region(shapes.into_iter().map(polygon).filter(|polygon| polygon.outer.len() > 2).collect())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(x: f64, y: f64, side: f64) -> Ring {
        let at = |dx: f64, dy: f64| Point::mm(x + dx * side, y + dy * side);
        vec![at(0.0, 0.0), at(1.0, 0.0), at(1.0, 1.0), at(0.0, 1.0)]
    }

    fn region(ring: Ring) -> Region {
        fill([&ring], Filling::NonZero)
    }

    fn area_mm2(region: &Region) -> f64 {
        region.area() * 1e6
    }

    #[test]
    fn set_operations_give_the_areas_of_elementary_geometry() {
        let (a, b) = (region(square(0.0, 0.0, 10.0)), region(square(6.0, 6.0, 10.0)));
        assert!((area_mm2(&union([&a, &b])) - 184.0).abs() < 1e-9);
        assert!((area_mm2(&intersection(&a, &b)) - 16.0).abs() < 1e-9);
        assert!((area_mm2(&difference(&a, &b)) - 84.0).abs() < 1e-9);
        let frame = difference(&a, &region(square(3.0, 3.0, 2.0)));
        assert_eq!((frame.0.len(), frame.0[0].holes.len()), (1, 1));
        assert!((area_mm2(&frame) - 96.0).abs() < 1e-9);
    }

    #[test]
    fn a_keyhole_becomes_a_hole_without_a_slit() {
        let p = |x: f64, y: f64| Point::mm(x, y);
        let rim = [p(0.0, 0.0), p(10.0, 0.0), p(10.0, 10.0), p(0.0, 10.0), p(0.0, 5.0)];
        let cut = [p(4.0, 5.0), p(4.0, 6.0), p(6.0, 6.0), p(6.0, 4.0), p(4.0, 4.0), p(4.0, 5.0), p(0.0, 5.0)];
        let ring: Ring = rim.into_iter().chain(cut).collect();
        for ring in [ring.clone(), ring.into_iter().rev().collect()] {
            let plane = region(ring);
            assert_eq!((plane.0.len(), plane.0[0].holes.len()), (1, 1));
            assert!((area_mm2(&plane) - 96.0).abs() < 1e-9);
            assert!(plane.contains(p(2.0, 5.0 + 1e-5)) && !plane.contains(p(5.0, 5.0)));
        }
    }

    #[test]
    fn nested_rings_alternate_under_the_even_odd_rule() {
        let rings = [square(0.0, 0.0, 10.0), square(2.0, 2.0, 6.0), square(4.0, 4.0, 2.0)];
        assert!((area_mm2(&fill(&rings, Filling::EvenOdd)) - (100.0 - 36.0 + 4.0)).abs() < 1e-9);
    }

    #[test]
    fn offset_follows_the_formula_of_steiner() {
        // A convex shape of area A and perimeter P grown by r has area A + P r + pi r^2 (Steiner's formula).
        let grown = offset(&region(square(0.0, 0.0, 10.0)), 1e-3);
        let expected = 100.0 + 40.0 + std::f64::consts::PI;
        assert!((area_mm2(&grown) - expected).abs() < 4e-3, "{}", area_mm2(&grown));
        let shrunk = offset(&region(square(0.0, 0.0, 10.0)), -1e-3);
        assert!((area_mm2(&shrunk) - 64.0).abs() < 1e-6, "{}", area_mm2(&shrunk));
        assert!(offset(&region(square(0.0, 0.0, 10.0)), -6e-3).0.is_empty());
    }
}
