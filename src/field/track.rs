//! Resistance and partial inductance of the track itself, which together with the sheet's part make the loop.
//!
//! Model: straight legs of uniform width; the current's spread over the cross-section enters by its geometric mean
//! distance g from itself, so L = (mu0/4 pi) sum over pairs (t_i . t_j) int int ds ds' / sqrt(r^2 + g^2).
//! g = 0.2235 (w + t) for current spread evenly over a rectangle, g = w/4 for a thin strip with edge-crowded current
//! (Grover 1946, from memory; w/4 is the conformal radius of a strip). Resistance is that of the foil for the total
//! current of both faces over the width; the crowding of the current at the edges is not in it.
//! Range: legs much longer than wide in total; vertical pieces at pins and vias are left out.
//! Checked by: `wire_over_its_length`, `a_divided_leg_has_the_same_inductance`, and
//! `loop_inductance_of_a_strip_over_a_plane` in tests/field.rs.

use crate::geom::Point;
use crate::unit::constants::MU0;

/// A straight piece of track.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Run {
    /// Start.
    pub from: Point,
    /// End.
    pub to: Point,
    /// Height in metres on a common axis.
    pub z_m: f64,
    /// Geometric mean distance of its cross-section from itself in metres.
    pub gmd_m: f64,
    /// Current from start to end in A per A.
    pub current: f64,
}

/// Geometric mean distance from itself of a rectangle `width_m` by `thickness_m` with even current, in metres:
/// 0.2235 (w + t), within 0.2 % for all shapes.
pub fn gmd_even(width_m: f64, thickness_m: f64) -> f64 {
    0.2235 * (width_m + thickness_m)
}

/// Geometric mean distance from itself of a thin strip with the density of an isolated strip,
/// 1/sqrt(1 - (2x/w)^2): w/4.
pub fn gmd_edge(width_m: f64) -> f64 {
    0.25 * width_m
}

/// Partial inductance in henry of the path that `runs` make, seen by a current of 1 A.
pub fn partial_inductance_h(runs: &[Run]) -> f64 {
    let mut sum = 0.0;
    for (i, a) in runs.iter().enumerate() {
        sum += a.current * a.current * own(a);
        for b in &runs[i + 1..] {
            sum += 2.0 * a.current * b.current * mutual(a, b);
        }
    }
    MU0 / (4.0 * std::f64::consts::PI) * sum
}

/// Mutual inductance in henry of two paths, each seen by a current of 1 A.
pub fn mutual_inductance_h(one: &[Run], other: &[Run]) -> f64 {
    let pairs = one.iter().flat_map(|a| other.iter().map(move |b| a.current * b.current * mutual(a, b)));
    MU0 / (4.0 * std::f64::consts::PI) * pairs.sum::<f64>()
}

/// int int ds ds' / sqrt((s - s')^2 + g^2) over one leg, in metres.
fn own(run: &Run) -> f64 {
    let (length, g) = (run.from.distance(run.to), run.gmd_m);
    if length == 0.0 {
        return 0.0;
    }
    2.0 * (length * libm::asinh(length / g) - libm::hypot(length, g) + g)
}

/// (t_a . t_b) int int ds ds' / sqrt(r^2 + g^2) over two legs, in metres.
fn mutual(a: &Run, b: &Run) -> f64 {
    let (la, lb) = (a.from.distance(a.to), b.from.distance(b.to));
    if la == 0.0 || lb == 0.0 {
        return 0.0;
    }
    let ta = (a.to - a.from) * (1.0 / la);
    let tb = (b.to - b.from) * (1.0 / lb);
    let cosine = ta.dot(tb);
    if cosine.abs() < 1e-12 {
        return 0.0;
    }
    let dz = a.z_m - b.z_m;
    let away2 = dz * dz + 0.5 * (a.gmd_m * a.gmd_m + b.gmd_m * b.gmd_m);
    let inner = |s: f64| {
        let offset = a.from + ta * s - b.from;
        let p = offset.dot(tb);
        let across = offset.cross(tb);
        let r = (across * across + away2).sqrt();
        libm::asinh((lb - p) / r) + libm::asinh(p / r)
    };
    let distance = |s: f64| {
        let offset = a.from + ta * s - b.from;
        let p = offset.dot(tb);
        let beyond = (p - lb).max(-p).max(0.0);
        let across = offset.cross(tb);
        (across * across + beyond * beyond + away2).sqrt()
    };
    cosine * integrate(&inner, &distance, 0.0, la)
}

/// Integral of `f` from a to b on panels no longer than `distance` from their middle.
fn integrate(f: &dyn Fn(f64) -> f64, distance: &dyn Fn(f64) -> f64, a: f64, b: f64) -> f64 {
    const NODES: [(f64, f64); 4] = [
        (0.183_434_642_495_649_8, 0.362_683_783_378_362),
        (0.525_532_409_916_329, 0.313_706_645_877_887_3),
        (0.796_666_477_413_626_7, 0.222_381_034_453_374_5),
        (0.960_289_856_497_536_3, 0.101_228_536_290_376_3),
    ];
    let (middle, half) = (0.5 * (a + b), 0.5 * (b - a));
    if 2.0 * half > distance(middle) && half > 1e-9 {
        return integrate(f, distance, a, middle) + integrate(f, distance, middle, b);
    }
    NODES.iter().map(|(x, w)| w * half * (f(middle - half * x) + f(middle + half * x))).sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn run(from: (f64, f64), to: (f64, f64), gmd_m: f64) -> Run {
        Run { from: Point::mm(from.0, from.1), to: Point::mm(to.0, to.1), z_m: 0.0, gmd_m, current: 1.0 }
    }

    #[test]
    fn wire_over_its_length() {
        // Rectangular loop of round wire, external inductance by the sum of partial inductances (Grover 1946):
        // 30 x 1 mm, radius 0.1 mm: 28.1049488 nH; 100 x 100 mm, radius 0.5 mm: 362.343862 nH.
        for (a, b, radius_m, nanohenry) in
            [(30.0, 1.0, 0.1e-3, 28.1049488), (100.0, 100.0, 0.5e-3, 362.343862)]
        {
            let corners = [(0.0, 0.0), (a, 0.0), (a, b), (0.0, b), (0.0, 0.0)];
            let runs: Vec<Run> = corners.windows(2).map(|c| run(c[0], c[1], radius_m)).collect();
            let found = partial_inductance_h(&runs) * 1e9;
            // The mutual parts take g off the distance between opposite sides, hence not exact.
            assert!((found / nanohenry - 1.0).abs() < 2e-2 * radius_m / 0.1e-3, "{found} nH");
        }
    }

    #[test]
    fn a_divided_leg_has_the_same_inductance() {
        let whole = partial_inductance_h(&[run((0.0, 0.0), (30.0, 40.0), 5e-5)]);
        let at = |i: usize| (30.0 * i as f64 / 17.0, 40.0 * i as f64 / 17.0);
        let parts: Vec<Run> = (0..17).map(|i| run(at(i), at(i + 1), 5e-5)).collect();
        let error = (partial_inductance_h(&parts) / whole - 1.0).abs();
        assert!(error < 1e-7, "{error:e}");
    }
}
