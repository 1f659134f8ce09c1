//! Fast answers to where a point or a line lies among many polygons.

use super::{Bounds, Point, Polygon};

/// Most bands of a locator.
const MOST_BANDS: usize = 8192;

/// An edge of a polygon, its lower end first.
#[derive(Clone, Copy, Debug)]
struct Edge {
    polygon: u32,
    low: Point,
    high: Point,
}

/// Polygons prepared for many questions; they are known by their index in the slice given.
///
/// Edges are sorted into horizontal bands. Bands are as narrow as they can be without storing more than a few
/// entries for each edge.
pub struct Locator {
    bounds: Bounds,
    band_m: f64,
    /// Where the edges of each band begin in `edges`; one more entry than bands.
    starts: Vec<usize>,
    edges: Vec<Edge>,
}

impl Locator {
    /// Prepares `polygons`.
    pub fn new<'a>(polygons: impl IntoIterator<Item = &'a Polygon>) -> Self {
        let mut all = Vec::new();
        let mut bounds = Bounds::EMPTY;
        for (index, polygon) in polygons.into_iter().enumerate() {
            bounds = bounds.union(polygon.bounds());
            for ring in polygon.rings() {
                let mut previous = ring.last().copied().unwrap_or_default();
                for &point in ring {
                    let (low, high) =
                        if previous.y <= point.y { (previous, point) } else { (point, previous) };
                    all.push(Edge { polygon: index as u32, low, high });
                    previous = point;
                }
            }
        }
        let height_m = if bounds.is_empty() { 0.0 } else { bounds.height() };
        // An edge of height y lies in about 1 + y / band entries.
        let climbed_m: f64 = all.iter().map(|edge| edge.high.y - edge.low.y).sum();
        let n_bands =
            if climbed_m > 0.0 { (4.0 * all.len() as f64 * height_m / climbed_m) as usize } else { 1 };
        let n_bands = n_bands.clamp(1, MOST_BANDS);
        let band_m = (height_m / n_bands as f64).max(1e-9);
        let mut this = Self { bounds, band_m, starts: vec![0; n_bands + 1], edges: Vec::new() };
        for edge in &all {
            for band in this.band(edge.low.y)..=this.band(edge.high.y) {
                this.starts[band + 1] += 1;
            }
        }
        for band in 0..n_bands {
            this.starts[band + 1] += this.starts[band];
        }
        let mut next = this.starts.clone();
        let nothing = Edge { polygon: 0, low: Point::default(), high: Point::default() };
        this.edges = vec![nothing; this.starts[n_bands]];
        for edge in &all {
            let (first, last) = (this.band(edge.low.y), this.band(edge.high.y));
            for slot in &mut next[first..=last] {
                this.edges[*slot] = *edge;
                *slot += 1;
            }
        }
        this
    }

    fn band(&self, y: f64) -> usize {
        let band = ((y - self.bounds.min.y) / self.band_m).max(0.0) as usize;
        band.min(self.starts.len() - 2)
    }

    fn edges_of(&self, band: usize) -> &[Edge] {
        &self.edges[self.starts[band]..self.starts[band + 1]]
    }

    /// The polygons that `point` lies on (rims by the even-odd rule), by index.
    pub fn containing(&self, point: Point) -> Vec<usize> {
        if !self.bounds.contains(point) {
            return Vec::new();
        }
        let mut crossed = Vec::new();
        for edge in self.edges_of(self.band(point.y)) {
            let (low, high) = (edge.low, edge.high);
            if low.y <= point.y && point.y < high.y {
                let x = low.x + (point.y - low.y) / (high.y - low.y) * (high.x - low.x);
                if x > point.x {
                    crossed.push(edge.polygon);
                }
            }
        }
        crossed.sort_unstable();
        let runs = crossed.chunk_by(|a, b| a == b).filter(|run| run.len() % 2 == 1);
        runs.map(|run| run[0] as usize).collect()
    }

    /// The polygons with a rim closer than `distance_m` to the line along `path` (one point or more), by index.
    pub fn rims_near(&self, path: &[Point], distance_m: f64) -> Vec<usize> {
        let mut found = Vec::new();
        let mut look = |from: Point, to: Point| {
            let reach = Bounds::of([from, to]).grown(distance_m);
            if !reach.meets(self.bounds) {
                return;
            }
            for band in self.band(reach.min.y)..=self.band(reach.max.y) {
                for edge in self.edges_of(band) {
                    let (left, right) = (edge.low.x.min(edge.high.x), edge.low.x.max(edge.high.x));
                    let apart = left > reach.max.x
                        || right < reach.min.x
                        || edge.low.y > reach.max.y
                        || edge.high.y < reach.min.y;
                    if !apart
                        && !found.contains(&(edge.polygon as usize))
                        && segment_distance((from, to), (edge.low, edge.high)) <= distance_m
                    {
                        found.push(edge.polygon as usize);
                    }
                }
            }
        };
        match path {
            [] => {}
            [dot] => look(*dot, *dot),
            _ => path.windows(2).for_each(|ends| look(ends[0], ends[1])),
        }
        found.sort_unstable();
        found
    }

    /// The polygons that come within `distance_m` of the line along `path`, by index.
    pub fn touching(&self, path: &[Point], distance_m: f64) -> Vec<usize> {
        let mut found = self.rims_near(path, distance_m);
        if let Some(&first) = path.first() {
            found.extend(self.containing(first));
        }
        found.sort_unstable();
        found.dedup();
        found
    }
}

/// Distance from `point` to the straight line between `ends` in metres.
pub fn point_segment_distance(point: Point, ends: (Point, Point)) -> f64 {
    let along = ends.1 - ends.0;
    let square = along.dot(along);
    let part = if square > 0.0 { ((point - ends.0).dot(along) / square).clamp(0.0, 1.0) } else { 0.0 };
    point.distance(ends.0 + along * part)
}

/// Distance between two straight lines in metres, zero where they cross.
pub fn segment_distance(a: (Point, Point), b: (Point, Point)) -> f64 {
    let side = |line: (Point, Point), point: Point| (line.1 - line.0).cross(point - line.0);
    let apart = |line: (Point, Point), ends: (Point, Point)| side(line, ends.0) * side(line, ends.1) < 0.0;
    if apart(a, b) && apart(b, a) {
        return 0.0;
    }
    let near = [
        point_segment_distance(a.0, b),
        point_segment_distance(a.1, b),
        point_segment_distance(b.0, a),
        point_segment_distance(b.1, a),
    ];
    near.into_iter().fold(f64::INFINITY, f64::min)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn frame(x: f64, side: f64, hole: f64) -> Polygon {
        let ring = |inset: f64| {
            let (low, high) = (inset, side - inset);
            vec![
                Point::new(x + low, low),
                Point::new(x + high, low),
                Point::new(x + high, high),
                Point::new(x + low, high),
            ]
        };
        let mut inner = ring(0.5 * (side - hole));
        inner.reverse();
        Polygon { outer: ring(0.0), holes: vec![inner] }
    }

    #[test]
    fn finds_what_a_slow_search_finds() {
        let polygons: Vec<_> = (0..20).map(|i| frame(i as f64 * 0.9, 1.0, 0.4)).collect();
        let locator = Locator::new(&polygons);
        for i in 0..400 {
            let point = Point::new(i as f64 * 0.0473 + 0.001, (i * 37 % 101) as f64 * 0.0103);
            let slow: Vec<_> = (0..polygons.len()).filter(|&k| polygons[k].contains(point)).collect();
            assert_eq!(locator.containing(point), slow, "at {point:?}");
        }
    }

    #[test]
    fn nearness_counts_the_distance_to_the_rim() {
        let locator = Locator::new(&[frame(0.0, 1.0, 0.4)]);
        let middle = [Point::new(0.5, 0.5)];
        assert!(locator.touching(&middle, 0.19).is_empty());
        assert_eq!(locator.touching(&middle, 0.21), [0]);
        assert_eq!(locator.touching(&[Point::new(0.15, 0.15)], 0.01), [0]);
        let crossing = [Point::new(-1.0, 0.5), Point::new(2.0, 0.5)];
        assert_eq!(locator.touching(&crossing, 0.0), [0]);
    }
}
