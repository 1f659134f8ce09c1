//! From maps to figures.

use super::station::{self, Station};
use super::{Figure, Figures, level, section};
use crate::field::ReturnMap;
use crate::geom::Point;
use crate::plan::TrackLeg;
use crate::unit::constants::MU0;

/// Least relative error that is stated, for cells up to the height and for larger ones (up to twice the height): the
/// change from cells of 2d to d may be small by chance, for example when the edge of a void falls on a line of both.
/// Checked by: `straight_track_matches_the_sheet_formula` and `figures_at_a_slot_lie_within_their_error` in
/// tests/field.
pub const LEAST_ERROR: [f64; 2] = [0.02, 0.06];
/// Shares of the return for half-widths and contours.
const PARTS: [f64; 3] = [0.5, 0.8, 0.95];
/// Steps of a section profile per height, as far as 4h; 3h is a multiple of the step.
const STEPS_PER_HEIGHT: usize = 8;
/// Growth of the distances of a section profile beyond.
const GROWTH: f64 = 1.02;

/// Maps of one net, plane and frequency.
#[derive(Clone, Copy, Debug)]
pub struct Maps<'a> {
    /// The map itself.
    pub map: &'a ReturnMap,
    /// The same with all voids filled.
    pub without_voids: Option<&'a ReturnMap>,
    /// Both on cells of 2d.
    pub coarse: Option<(&'a ReturnMap, Option<&'a ReturnMap>)>,
    /// Part of the return that the solve left out.
    pub left_out: f64,
}

/// The track that the map belongs to.
#[derive(Clone, Copy, Debug)]
pub struct Track<'a> {
    /// Legs that the plane serves.
    pub legs: &'a [TrackLeg],
    /// Where the return enters and leaves the plane.
    pub landings: &'a [Point],
    /// Thickness of the dielectric between track and plane in metres, h.
    pub height_m: f64,
}

/// All figures of one map.
pub fn figures(maps: &Maps, track: &Track) -> Figures {
    let stations = station::along(track.legs, maps.map.grid.cell_m);
    let stations = station::regular(&stations, track.legs, track.landings, track.height_m);
    let all = |map: &ReturnMap| Raw::of(map, &stations, track.height_m);
    let here = all(maps.map);
    let filled = maps.without_voids.map(all);
    let coarse = maps.coarse.map(|(map, filled)| (all(map), filled.map(all)));
    let least = LEAST_ERROR[usize::from(maps.map.grid.cell_m > 1.001 * track.height_m)] + maps.left_out;
    let figure = |pick: &dyn Fn(&Raw) -> Option<f64>, slow: f64| {
        let value = pick(&here);
        let change =
            value.zip(coarse.as_ref().and_then(|(map, _)| pick(map))).map_or(0.0, |(a, b)| (a - b).abs());
        let error = (slow * change).max(least * value.unwrap_or(0.0).abs());
        Figure { value, without_voids: filled.as_ref().and_then(pick), error }
    };
    // The error of a difference is measured by the size of what it is a difference of.
    let extra = |pick: &dyn Fn(&Raw) -> Option<f64>, size: Option<f64>, slow: f64| -> Option<Figure> {
        let of = |map: &Raw, filled: Option<&Raw>| Some(pick(map)? - pick(filled?)?);
        let value = of(&here, filled.as_ref())?;
        let second = coarse.as_ref().and_then(|(map, filled)| of(map, filled.as_ref()));
        let change = second.map_or(0.0, |second| (value - second).abs());
        let error = (slow * change).max(least * size.unwrap_or(value).abs());
        Some(Figure { value: Some(value), without_voids: Some(0.0), error })
    };
    let slow = halvings_left(maps.map);
    let present = |figure: Figure| figure.value.is_some().then_some(figure);
    Figures {
        share_3h: figure(&|raw| raw.share_3h, 1.0),
        worst_share_3h: here.worst,
        half_width_m: std::array::from_fn(|i| figure(&|raw| raw.half_width_m[i], 1.0)),
        contour_levels: level::levels(maps.map, PARTS),
        extra_path_m: extra(&|raw| Some(raw.path_m), None, 1.0),
        loop_resistance_ohm: present(figure(&|raw| raw.resistance_ohm, slow)),
        loop_inductance_h: present(figure(&|raw| raw.inductance_h, 1.0)),
        extra_loop_resistance_ohm: extra(&|raw| raw.resistance_ohm, here.resistance_ohm, slow),
        extra_loop_inductance_h: extra(&|raw| raw.inductance_h, here.inductance_h, 1.0),
    }
}

/// How often the cell must be halved until it is as small as 1/|lam|, lam = j w mu0/(2 Zs), at least once. Towards
/// an edge |K|^2 rises as 1/distance down to that length, so the resistance grows by about as much with each halving.
fn halvings_left(map: &ReturnMap) -> f64 {
    let Some(zs) = map.zs_ohm else { return 1.0 };
    let decay = std::f64::consts::PI * map.frequency_hz * MU0 / zs.norm();
    libm::log2((map.grid.cell_m * decay).max(1e-300)).max(1.0)
}

/// Figures of one map alone.
struct Raw {
    share_3h: Option<f64>,
    worst: Option<(f64, Point)>,
    half_width_m: [Option<f64>; 3],
    path_m: f64,
    resistance_ohm: Option<f64>,
    inductance_h: Option<f64>,
}

impl Raw {
    fn of(map: &ReturnMap, stations: &[Station], height_m: f64) -> Self {
        let profile = Profile::of(map, stations, height_m);
        let omega = std::f64::consts::TAU * map.frequency_hz;
        Self {
            share_3h: profile.as_ref().map(|profile| profile.mean[3 * STEPS_PER_HEIGHT]),
            worst: profile.as_ref().map(|profile| profile.worst),
            half_width_m: PARTS.map(|part| profile.as_ref().and_then(|profile| profile.half_width_m(part))),
            path_m: level::in_phase_path_m(map),
            resistance_ohm: map.loop_impedance_ohm.map(|z| z.re),
            inductance_h: map.loop_impedance_ohm.filter(|_| omega > 0.0).map(|z| z.im / omega),
        }
    }
}

/// The mean share over the stations against the distance from the track.
struct Profile {
    within_m: Vec<f64>,
    mean: Vec<f64>,
    worst: (f64, Point),
}

impl Profile {
    fn of(map: &ReturnMap, stations: &[Station], height_m: f64) -> Option<Self> {
        let bounds = map.grid.bounds();
        let reach = libm::hypot(bounds.width(), bounds.height());
        let near = (0..=4 * STEPS_PER_HEIGHT).map(|i| height_m * i as f64 / STEPS_PER_HEIGHT as f64);
        let mut within_m: Vec<f64> = near.collect();
        let mut next = 4.0 * height_m * GROWTH;
        while next < reach * GROWTH {
            within_m.push(next);
            next *= GROWTH;
        }
        let mut mean = vec![0.0; within_m.len()];
        let mut worst: Option<(f64, Point)> = None;
        for station in stations {
            let mut shares = section::shares(map, station.at, station.along, &within_m);
            // The share of a branch is that of its own current.
            shares.iter_mut().for_each(|share| *share /= station.current);
            let near = shares[3 * STEPS_PER_HEIGHT];
            if worst.is_none_or(|(least, _)| near < least) {
                worst = Some((near, station.at));
            }
            mean.iter_mut().zip(&shares).for_each(|(mean, share)| *mean += share);
        }
        mean.iter_mut().for_each(|mean| *mean /= stations.len().max(1) as f64);
        worst.map(|worst| Self { within_m, mean, worst })
    }

    /// The smallest distance within which the mean share reaches `part`, linear between steps.
    fn half_width_m(&self, part: f64) -> Option<f64> {
        let after = self.mean.iter().position(|&share| share >= part)?;
        let (before, share) = (self.mean[after.checked_sub(1)?], self.mean[after]);
        let (near, far) = (self.within_m[after - 1], self.within_m[after]);
        Some(far - (far - near) * (share - part) / (share - before))
    }
}
