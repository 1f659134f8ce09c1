//! Lines with fewer points.

use super::Point;
use super::locate::point_segment_distance;

/// Which points of a line stay so that none of the others is farther than `tolerance_m` from what is left (Ramer 1972;
/// Douglas and Peucker 1973). `anchors` are rising indices of points that stay; an index past the last point means the
/// first again, for rings.
pub fn kept(points: &[Point], anchors: &[usize], tolerance_m: f64) -> Vec<bool> {
    let at = |index: usize| points[index % points.len()];
    let mut kept = vec![false; points.len()];
    anchors.iter().for_each(|&anchor| kept[anchor % points.len()] = true);
    let mut open: Vec<(usize, usize)> = anchors.windows(2).map(|pair| (pair[0], pair[1])).collect();
    while let Some((from, to)) = open.pop() {
        let ends = (at(from), at(to));
        let farthest = (from + 1..to)
            .map(|index| (point_segment_distance(points[index], ends), index))
            .max_by(|a, b| a.0.total_cmp(&b.0));
        if let Some((distance, index)) = farthest
            && distance > tolerance_m
        {
            kept[index] = true;
            open.push((from, index));
            open.push((index, to));
        }
    }
    kept
}
