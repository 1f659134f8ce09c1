//! What voids, edges and boundaries do to the return of a track over one plane: the figures that findings rest on.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | share drop = F0_3h(s) - F_3h(s) | largest over the regular stations away from antipads of its own pins; F0 without voids | 1 |
//! | edge density | largest over the regular stations, see [`super::edge`] | 1 |
//! | stray | for each zone, see [`super::stray`] | 1 |
//! | parts of Z - Z0 by void | see [`super::void`] | ohm |

use super::compute::{LEAST_ERROR, Maps, Track};
use super::edge;
use super::station::{self, Station};
use super::stray::{Stray, strays};
use super::void::{VoidEffect, effects};
use super::{Figure, section};
use crate::field::ReturnMap;
use crate::geom::locate::point_segment_distance;
use crate::geom::{Point, Polygon};
use crate::plan::{TrackLeg, Void};
use crate::review::Zone;
use num_complex::Complex64;

/// Stations keep this distance from antipads of the path's own pins and vias, in heights.
const OWN_MARGIN_HEIGHTS: f64 = 5.0;

/// A figure that is worst at one place of the track.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Placed {
    /// The figure.
    pub figure: Figure,
    /// The place on the track.
    pub at: Point,
    /// Distance to what causes it in metres, where there is one.
    pub distance_m: Option<f64>,
}

/// Effects on one map.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Effects {
    /// Largest drop of the share within 3h against the same station without voids.
    pub share_drop: Option<Placed>,
    /// Largest density at the plane's edge, in units of 1/(pi h).
    pub edge_density: Option<Placed>,
    /// Voids that matter, worst first.
    pub voids: Vec<VoidEffect>,
    /// Strays over the boundaries of the zones, in their order.
    pub strays: Vec<Stray>,
}

/// The effects on a map. `parts` divide Z - Z0 among `voids`, with the rest behind them.
pub fn of(
    maps: &Maps,
    track: &Track,
    voids: &[Void],
    zones: &[Zone],
    parts: Option<&[Complex64]>,
) -> Effects {
    let least = LEAST_ERROR[usize::from(maps.map.grid.cell_m > 1.001 * track.height_m)];
    let all = station::along(track.legs, maps.map.grid.cell_m);
    let own = own_voids(track.legs, voids);
    let mut stations = station::regular(&all, track.legs, track.landings, track.height_m);
    stations.retain(|station| {
        own.iter().all(|&index| away_m(&voids[index].shape, station.at) > OWN_MARGIN_HEIGHTS * track.height_m)
    });
    let filled = maps.without_voids;
    let (coarse, coarse_filled) = (maps.coarse.map(|pair| pair.0), maps.coarse.and_then(|pair| pair.1));
    Effects {
        share_drop: filled.and_then(|filled| {
            share_drop(maps.map, filled, coarse.zip(coarse_filled), &stations, track.height_m, least)
        }),
        edge_density: filled.and_then(|filled| {
            edge_density(maps.map, filled, coarse.zip(coarse_filled), &stations, track.height_m, least)
        }),
        voids: effects(maps.map, track.legs, voids, parts),
        strays: strays(maps.map, filled, coarse, track.legs, zones, least),
    }
}

/// Indices of the voids that an end of the legs lies in: antipads of the path's own pins and vias, which it needs.
pub fn own_voids(legs: &[TrackLeg], voids: &[Void]) -> Vec<usize> {
    let (Some(first), Some(last)) = (legs.first(), legs.last()) else { return Vec::new() };
    let holds = |at: Point| move |void: &Void| void.shape.bounds().contains(at) && void.shape.contains(at);
    let own = |void: &Void| holds(first.from)(void) || holds(last.to)(void);
    (0..voids.len()).filter(|&index| own(&voids[index])).collect()
}

/// Distance from a place to a shape in metres, zero inside.
pub fn away_m(shape: &Polygon, at: Point) -> f64 {
    if shape.contains(at) {
        return 0.0;
    }
    let sides = shape.rings().flat_map(|ring| (0..ring.len()).map(|i| (ring[i], ring[(i + 1) % ring.len()])));
    sides.map(|side| point_segment_distance(at, side)).fold(f64::INFINITY, f64::min)
}

fn share_drop(
    map: &ReturnMap,
    filled: &ReturnMap,
    coarse: Option<(&ReturnMap, &ReturnMap)>,
    stations: &[Station],
    height_m: f64,
    least: f64,
) -> Option<Placed> {
    let share = |map: &ReturnMap, station: &Station| {
        section::shares(map, station.at, station.along, &[3.0 * height_m])[0]
    };
    let drop =
        |map: &ReturnMap, filled: &ReturnMap, station: &Station| share(filled, station) - share(map, station);
    let drops: Vec<f64> = stations.iter().map(|station| drop(map, filled, station)).collect();
    let station = &stations[edge::middle_of_run(&drops)?];
    let worst = drops.iter().copied().fold(f64::MIN, f64::max);
    let change = coarse.map_or(0.0, |(map, filled)| (drop(map, filled, station) - worst).abs());
    let error = change.max(least * share(filled, station).abs());
    let figure = Figure { value: Some(worst), without_voids: Some(0.0), error };
    Some(Placed { figure, at: station.at, distance_m: None })
}

fn edge_density(
    map: &ReturnMap,
    filled: &ReturnMap,
    coarse: Option<(&ReturnMap, &ReturnMap)>,
    stations: &[Station],
    height_m: f64,
    least: f64,
) -> Option<Placed> {
    let beside: Vec<Option<edge::AtEdge>> =
        stations.iter().map(|station| edge::beside(map, filled, station, height_m)).collect();
    let densities: Vec<f64> = beside.iter().map(|at| at.map_or(0.0, |at| at.density)).collect();
    let worst = edge::middle_of_run(&densities)?;
    let at = beside[worst]?;
    let station = &stations[worst];
    let again = |map, filled| edge::beside(map, filled, station, height_m).map(|at| at.density);
    let without = again(filled, filled);
    let change = coarse.and_then(|(map, filled)| again(map, filled)).map_or(0.0, |d| (d - at.density).abs());
    let figure = Figure {
        value: Some(at.density),
        without_voids: without,
        error: change.max(least * at.density.abs()),
    };
    Some(Placed { figure, at: station.at, distance_m: Some(at.distance_m) })
}
