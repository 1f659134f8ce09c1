//! Voids of a plane: what is missing of it inside the outline.
//!
//! The plane's pull-back from the outline is taken off first: it is the distance that nine tenths of the outline keep
//! from the plane's copper. Voids with webs narrower than 2h between them count as one, webs included.

use super::Void;
use crate::board::{Board, Plating};
use crate::field::PlaneId;
use crate::geom::locate::{Locator, point_segment_distance};
use crate::geom::polygon::ring_area;
use crate::geom::{Bounds, Point, Polygon, Region, Ring, boolean, simplify, stroke};
use std::collections::BTreeMap;

/// No pull-back is wider than this, in metres.
const WIDEST_PULL_BACK_M: f64 = 2e-3;
/// Smaller voids are left out, in square metres.
const SMALLEST_M2: f64 = 1e-9;
/// Slivers along the pull-back narrower than this are no voids, in metres.
const SLIVER_M: f64 = 0.1e-3;

/// The copper of a plane on its layer.
pub fn plane_copper(board: &Board, plane: &PlaneId) -> Region {
    let areas = board.layers[plane.layer].areas.iter();
    let of_plane = areas.filter(|area| area.net.is_some_and(|net| board.net_name(net) == plane.net));
    Region(of_plane.map(|area| area.shape.clone()).collect())
}

/// Voids before any are joined: disjoint polygons.
pub fn missing(board: &Board, plane: &PlaneId) -> Region {
    let copper = plane_copper(board, plane);
    let outline = if board.outline.0.is_empty() { filled(&copper) } else { board.outline.clone() };
    let pull_back_m = pull_back(&outline, &copper);
    let inside = boolean::offset(&outline, -pull_back_m);
    let mut drilled = Vec::new();
    for hole in &board.holes {
        let (first, last) = hole.layers;
        if hole.plating == Plating::NonPlated && (first..=last).contains(&plane.layer) {
            drilled.extend(stroke::capsules(&hole.path, hole.diameter_m));
        }
    }
    let open = boolean::difference(&inside, &copper);
    let open = if drilled.is_empty() {
        open
    } else {
        let drilled = boolean::intersection(&boolean::union_with([], &drilled), &inside);
        boolean::union([&open, &drilled])
    };
    let rim = Locator::new(&inside.0);
    let mut kept = Vec::new();
    for polygon in open.0 {
        if polygon.area() < SMALLEST_M2 {
            continue;
        }
        let at_rim = polygon.outer.iter().any(|&point| !rim.rims_near(&[point], 1e-6).is_empty());
        if !at_rim {
            kept.push(polygon);
            continue;
        }
        let whole = Region(vec![polygon]);
        let coarse = Region(vec![simplified(&whole.0[0], 0.02 * SLIVER_M)]);
        let core = boolean::offset(&coarse, -0.5 * SLIVER_M);
        let opened = boolean::intersection(&boolean::offset(&core, 0.5 * SLIVER_M), &whole);
        kept.extend(opened.0.into_iter().filter(|polygon| polygon.area() >= SMALLEST_M2));
    }
    Region(kept)
}

fn filled(copper: &Region) -> Region {
    boolean::union_with([], &copper.0.iter().map(|polygon| polygon.outer.clone()).collect::<Vec<Ring>>())
}

/// Distance that the plane keeps from the outline, in metres.
fn pull_back(outline: &Region, copper: &Region) -> f64 {
    const STEP_M: f64 = 1e-3;
    let reach = WIDEST_PULL_BACK_M;
    // Only rims that come near the outline matter.
    let near = |side: &(Point, Point)| {
        let bounds = Bounds::of([side.0, side.1]).grown(reach);
        outline.0.iter().flat_map(Polygon::rings).any(|ring| {
            (0..ring.len()).any(|i| bounds.meets(Bounds::of([ring[i], ring[(i + 1) % ring.len()]])))
        })
    };
    let sides = copper.0.iter().flat_map(|polygon| {
        let ring = &polygon.outer;
        (0..ring.len()).map(move |i| (ring[i], ring[(i + 1) % ring.len()]))
    });
    let sides: Vec<(Point, Point)> = sides.filter(near).collect();
    let mut distances = Vec::new();
    for ring in outline.0.iter().flat_map(Polygon::rings) {
        for i in 0..ring.len() {
            let (from, to) = (ring[i], ring[(i + 1) % ring.len()]);
            let n = (from.distance(to) / STEP_M).ceil() as usize;
            for k in 0..n {
                let at = from + (to - from) * ((k as f64 + 0.5) / n as f64);
                let distance = sides.iter().map(|&side| point_segment_distance(at, side));
                let distance = distance.fold(f64::INFINITY, f64::min);
                if distance <= reach {
                    distances.push(distance);
                }
            }
        }
    }
    distances.sort_by(f64::total_cmp);
    // One micrometre more, so that a rim that follows the outline leaves no slivers of rounding.
    distances.get(distances.len() * 9 / 10).map_or(0.0, |distance| distance + 1e-6)
}

/// Joins voids whose webs are narrower than 2h, and names them by layer and centre.
pub fn voids(missing: &Region, plane: &PlaneId, height_m: f64, origin: Point) -> Vec<Void> {
    let found = super::web::joined(missing, 2.0 * height_m);
    let mut named: Vec<(Point, Polygon)> = found.into_iter().map(|shape| (centroid(&shape), shape)).collect();
    named.sort_by(|a, b| a.0.y.total_cmp(&b.0.y).then(a.0.x.total_cmp(&b.0.x)));
    let mut uses: BTreeMap<String, usize> = BTreeMap::new();
    let name = |(centre, shape): (Point, Polygon)| {
        let at = (centre - origin) * 1e3;
        let tenths = |value: f64| (value * 10.0).round() / 10.0 + 0.0;
        let id = format!("L{}-void-{:.1}-{:.1}", plane.layer + 1, tenths(at.x), tenths(at.y));
        let count = uses.entry(id.clone()).or_default();
        *count += 1;
        Void { id: if *count > 1 { format!("{id}-{count}") } else { id }, shape }
    };
    named.into_iter().map(name).collect()
}

/// A polygon with fewer corners, none farther than `tolerance_m` from where it was.
pub fn simplified(polygon: &Polygon, tolerance_m: f64) -> Polygon {
    let outer = simplified_ring(&polygon.outer, tolerance_m);
    let holes = polygon.holes.iter().map(|ring| simplified_ring(ring, tolerance_m));
    Polygon { outer, holes: holes.filter(|ring| ring.len() > 2).collect() }
}

fn simplified_ring(ring: &[Point], tolerance_m: f64) -> Ring {
    if ring.len() < 8 {
        return ring.to_vec();
    }
    let kept = simplify::kept(ring, &[0, ring.len() / 2, ring.len()], tolerance_m);
    let simple: Ring = ring.iter().zip(kept).filter(|(_, kept)| *kept).map(|(&point, _)| point).collect();
    if simple.len() > 2 { simple } else { ring.to_vec() }
}

/// Centre of the area inside a polygon's outer rim.
fn centroid(polygon: &Polygon) -> Point {
    let ring = &polygon.outer;
    let Some(&origin) = ring.first() else { return Point::default() };
    let mut sum = Point::default();
    for pair in ring.windows(2) {
        let (a, b) = (pair[0] - origin, pair[1] - origin);
        sum = sum + (a + b) * (a.cross(b) / 6.0);
    }
    let area = ring_area(ring);
    if area.abs() > 0.0 { origin + sum * (1.0 / area) } else { polygon.bounds().centre() }
}

/// Width of a void: twice its area over the length of its rims, in metres.
pub fn mean_width_m(void: &Void) -> f64 {
    super::terrain::mean_width_m(&void.shape)
}
