//! Stations along a track, and which of them lie on a straight run away from its ends.

use crate::geom::Point;
use crate::plan::TrackLeg;

/// A place on the track.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Station {
    /// The place.
    pub at: Point,
    /// Unit vector along the track, towards the receiver.
    pub along: Point,
    /// Distance from the driver's end along the track in metres.
    pub way_m: f64,
    /// Current of the track there in A per A of the driver's current.
    pub current: f64,
}

/// A leg with less current than this, in A per A, has no stations: its own return drowns in that of the others.
const LEAST_CURRENT: f64 = 0.1;
/// Ends of legs nearer than this are one place, in metres.
const SAME_M: f64 = 1e-7;

/// A turn of more than this within the margin makes a station's section meet other stretches of the track.
const STRAIGHT_COS: f64 = 0.965_925_826_289_068_3;
/// Margin to landings, ends and bends in heights.
const MARGIN_HEIGHTS: f64 = 5.0;
/// Most stations of one track.
const MOST: f64 = 1000.0;

/// Stations at the middles of equal stretches of the track, at most half a `cell_m` long unless the track is very
/// long, so that a mean over them is weighted by length.
pub fn along(legs: &[TrackLeg], cell_m: f64) -> Vec<Station> {
    let total: f64 = legs.iter().map(length).sum();
    if total <= 0.0 {
        return Vec::new();
    }
    let count = (total / (0.5 * cell_m)).ceil().clamp(1.0, MOST) as usize;
    let step = total / count as f64;
    let mut stations = Vec::with_capacity(count);
    let mut leg_start = 0.0;
    for leg in legs {
        let leg_end = leg_start + length(leg);
        while stations.len() < count {
            let way_m = (stations.len() as f64 + 0.5) * step;
            if way_m > leg_end {
                break;
            }
            let part = (way_m - leg_start) / length(leg);
            let along = (leg.to - leg.from) * (1.0 / length(leg));
            let at = leg.from + (leg.to - leg.from) * part;
            stations.push(Station { at, along, way_m, current: leg.current });
        }
        leg_start = leg_end;
    }
    stations
}

/// The stations of legs that carry a tenth of the driver's current at least, farther than 5h from both ends of the track, from the landings, from places where the way jumps or branches, and from bends: the track within 5h to either side of
/// a station turns by no more than 15 degrees from its direction there. Of a pair there are none, since the section of
/// one line meets the return of the other.
pub fn regular(stations: &[Station], legs: &[TrackLeg], landings: &[Point], height_m: f64) -> Vec<Station> {
    if legs.iter().any(|leg| leg.current > 0.0) && legs.iter().any(|leg| leg.current < 0.0) {
        return Vec::new();
    }
    let margin = MARGIN_HEIGHTS * height_m;
    let total: f64 = legs.iter().map(length).sum();
    let mut spans = Vec::with_capacity(legs.len());
    // Ways at which the next leg starts elsewhere, and the places where such legs start.
    let (mut jumps, mut starts) = (Vec::new(), landings.to_vec());
    let mut start = 0.0;
    let mut before: Option<Point> = None;
    for leg in legs {
        if before.is_some_and(|end| end.distance(leg.from) > SAME_M) {
            jumps.push(start);
            starts.push(leg.from);
        }
        before = Some(leg.to);
        let end = start + length(leg);
        if end > start {
            spans.push((start, end, (leg.to - leg.from) * (1.0 / (end - start))));
        }
        start = end;
    }
    let fits = |station: &Station| {
        let (from, to) = (station.way_m - margin, station.way_m + margin);
        from >= 0.0
            && to <= total
            && station.current.abs() >= LEAST_CURRENT
            && jumps.iter().all(|jump| (jump - station.way_m).abs() > margin)
            && starts.iter().all(|start| start.distance(station.at) > margin)
            && spans
                .iter()
                .filter(|(start, end, _)| *end > from && *start < to)
                .all(|(_, _, along)| along.dot(station.along) >= STRAIGHT_COS)
    };
    stations.iter().copied().filter(fits).collect()
}

/// Length of a leg in metres.
pub fn length(leg: &TrackLeg) -> f64 {
    leg.from.distance(leg.to)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn leg(from: (f64, f64), to: (f64, f64)) -> TrackLeg {
        TrackLeg {
            from: Point::mm(from.0, from.1),
            to: Point::mm(to.0, to.1),
            layer: 0,
            width_m: 1e-4,
            current: 1.0,
        }
    }

    #[test]
    fn stations_stay_away_from_ends_bends_and_landings() {
        let legs = [leg((0.0, 0.0), (20.0, 0.0)), leg((20.0, 0.0), (20.0, 10.0))];
        let stations = along(&legs, 0.2e-3);
        assert_eq!(stations.len(), 300);
        let kept = regular(&stations, &legs, &[Point::mm(0.0, 1.2)], 0.2e-3);
        let ways: Vec<f64> = kept.iter().map(|s| s.way_m * 1e3).collect();
        assert!(ways.iter().all(|&w| w > 1.0 && !(19.0..=21.0).contains(&w) && w < 29.0));
        assert_eq!(ways.len(), 300 - 10 - 20 - 10);
    }

    #[test]
    fn branches_have_stations_of_their_own_and_pairs_none() {
        // A way of 20 mm that carries 1 and then 0.75 A, and a branch of 10 mm with 0.25 A from its middle.
        let with = |leg: TrackLeg, current| TrackLeg { current, ..leg };
        let legs = [
            leg((0.0, 0.0), (10.0, 0.0)),
            with(leg((10.0, 0.0), (20.0, 0.0)), 0.75),
            with(leg((10.0, 0.0), (10.0, 10.0)), 0.25),
        ];
        let kept = regular(&along(&legs, 0.2e-3), &legs, &[], 0.2e-3);
        let currents = |current: f64| kept.iter().filter(|station| station.current == current).count();
        // 1 mm is left out at each end and around the branch.
        assert_eq!((currents(1.0), currents(0.75), currents(0.25)), (80, 80, 80));
        let pair = [legs[0], with(leg((0.0, 0.4), (10.0, 0.4)), -1.0)];
        assert!(regular(&along(&pair, 0.2e-3), &pair, &[], 0.2e-3).is_empty());
    }

    #[test]
    fn a_gentle_arc_counts_as_straight() {
        let point = |i: usize| {
            let angle = i as f64 * 0.02;
            (20.0 * libm::cos(angle), 20.0 * libm::sin(angle))
        };
        let legs: Vec<TrackLeg> = (0..50).map(|i| leg(point(i), point(i + 1))).collect();
        let stations = along(&legs, 0.2e-3);
        let kept = regular(&stations, &legs, &[], 0.2e-3);
        assert!(kept.len() * 10 > stations.len() * 8);
    }
}
