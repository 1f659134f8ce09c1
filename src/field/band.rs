//! The map of a whole band: maps at the lines of a drive, joined by power.
//!
//! Given the maps of 1 A at each line and the lines' rms currents I_k, with the weights w_k = I_k^2 / sum I_k^2:
//!
//! | quantity | formula | unit |
//! |---|---|---|
//! | rms density | sqrt(sum w_k abs(K_k)^2), a cell's value | A/m per A of band current |
//! | mean field | sum w_k K_k, face currents; shares of the return and directions are those of this field | A per A |
//! | loop R, L | sum w_k R_k, sum w_k L_k: P = R I^2 and W = L I^2/2 of the band | ohm, H |
//! | joint | sqrt(sum w_k abs(c_k)^2), phase of sum w_k c_k | A per A |
//!
//! Lines of different frequency do not interfere on average, so powers add. With the band's current in amperes all of it
//! becomes absolute. Frequency, height and sheet impedance told with the map are those at the strongest line.
//! Source: Parseval; the definition of a mean weighted by power. Range: any set of lines.
//! Checked by: `a_band_map_is_the_power_sum_of_its_lines` in tests/field.

use super::workshop::{Bench, PlaneMaps, Solved};
use super::{JointCurrent, ReturnMap};
use crate::diag::Diagnostic;
use crate::review::Band;
use crate::signal::spectrum::BandSpectrum;
use num_complex::Complex64;

/// What a map of a whole band holds beside the mean field.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct BandDensity {
    /// Rms density of the cells in A/m per A of band current, `grid.len()` values.
    pub rms: Vec<f64>,
    /// Current of the band in amperes, rms; none where only the shape of the spectrum is known.
    pub current_rms_a: Option<f64>,
    /// Lines of the drive (or points of its density) in the band.
    pub line_count: u64,
    /// Frequencies in Hz that were solved and stand for them, with their part of the band's power.
    pub solved: Vec<(f64, f64)>,
}

impl Bench<'_, '_> {
    /// Solves a band of a drive: the map of each frequency that stands for its lines, joined by power. None where no
    /// line lies in the band. `is_absolute` says that the spectrum's currents are amperes and not only in proportion.
    pub fn solve_band(&self, band: &Band, spectrum: &BandSpectrum, is_absolute: bool) -> Option<Solved> {
        let power: f64 = spectrum.points.iter().map(|line| line.current_rms_a * line.current_rms_a).sum();
        let strongest = spectrum.points.iter().max_by(|a, b| a.current_rms_a.total_cmp(&b.current_rms_a))?;
        let weights: Vec<(f64, f64)> = spectrum
            .points
            .iter()
            .map(|line| (line.frequency_hz, line.current_rms_a * line.current_rms_a / power))
            .collect();
        let shape = BandDensity {
            rms: Vec::new(),
            current_rms_a: is_absolute.then_some(spectrum.current_rms_a),
            line_count: spectrum.line_count,
            solved: weights.clone(),
        };
        let mut planes: Vec<Result<Sums, Diagnostic>> = Vec::new();
        let mut joints: Vec<(JointCurrent, f64)> = Vec::new();
        for (index, &(frequency_hz, weight)) in weights.iter().enumerate() {
            let solved = self.solve(band, frequency_hz);
            let told = frequency_hz == strongest.frequency_hz;
            for (at, maps) in solved.planes.into_iter().enumerate() {
                match (planes.get_mut(at), maps) {
                    (None, maps) => planes.push(maps.map(|maps| Sums::new(maps, weight))),
                    (Some(Ok(sums)), Ok(maps)) => sums.add(maps, weight, told),
                    (Some(slot), Err(reason)) if slot.is_ok() => *slot = Err(reason),
                    _ => {}
                }
            }
            debug_assert!(index == 0 || !planes.is_empty());
            for joint in solved.joints {
                let same = |known: &&mut (JointCurrent, f64)| {
                    (&known.0.what, known.0.kind, known.0.at, known.0.layers)
                        == (&joint.what, joint.kind, joint.at, joint.layers)
                };
                let (mean, square) = (joint.current * weight, weight * joint.current.norm_sqr());
                match joints.iter_mut().find(same) {
                    Some(known) => {
                        known.0.current += mean;
                        known.1 += square;
                    }
                    None => joints.push((JointCurrent { current: mean, ..joint }, square)),
                }
            }
        }
        let rms = |(joint, square): (JointCurrent, f64)| {
            let size = joint.current.norm();
            let unit = if size > 0.0 { joint.current / size } else { Complex64::new(1.0, 0.0) };
            JointCurrent { current: unit * square.sqrt(), ..joint }
        };
        Some(Solved {
            planes: planes.into_iter().map(|sums| Ok(sums?.finish(&shape))).collect(),
            joints: joints.into_iter().map(rms).collect(),
        })
    }
}

/// Sums of the maps of one plane.
struct Sums {
    map: Sum,
    without_voids: Sum,
    coarse: Option<(Sum, Sum)>,
    /// Mean resistance in ohm and inductance in henry of what each void adds.
    void_parts: Option<Vec<(f64, f64)>>,
    /// Mean part of the return that is left out.
    left_out: f64,
}

impl Sums {
    fn new(maps: PlaneMaps, weight: f64) -> Self {
        let sum = |map| Sum::new(map, weight);
        Self {
            void_parts: parts(&maps, weight),
            left_out: weight * maps.left_out,
            map: sum(maps.map),
            without_voids: sum(maps.without_voids),
            coarse: maps.coarse.map(|(map, without)| (sum(map), sum(without))),
        }
    }

    fn add(&mut self, maps: PlaneMaps, weight: f64, told: bool) {
        self.void_parts = self.void_parts.take().zip(parts(&maps, weight)).map(|(sums, own)| {
            sums.iter().zip(&own).map(|(sum, own)| (sum.0 + own.0, sum.1 + own.1)).collect()
        });
        self.left_out += weight * maps.left_out;
        self.map.add(&maps.map, weight, told);
        self.without_voids.add(&maps.without_voids, weight, told);
        self.coarse = match (self.coarse.take(), maps.coarse) {
            (Some((mut map, mut without)), Some(coarse)) => {
                map.add(&coarse.0, weight, told);
                without.add(&coarse.1, weight, told);
                Some((map, without))
            }
            _ => None,
        };
    }

    fn finish(self, shape: &BandDensity) -> PlaneMaps {
        let omega = std::f64::consts::TAU * self.map.mean.frequency_hz;
        let impedance = |&(ohm, henry): &(f64, f64)| Complex64::new(ohm, omega * henry);
        PlaneMaps {
            void_parts: self.void_parts.map(|parts| parts.iter().map(impedance).collect()),
            left_out: self.left_out,
            map: self.map.finish(shape),
            without_voids: self.without_voids.finish(shape),
            coarse: self.coarse.map(|(map, without)| (map.finish(shape), without.finish(shape))),
        }
    }
}

/// The mean field so far, with the sum of squares of the cells' densities and the mean loop.
struct Sum {
    mean: ReturnMap,
    squares: Vec<f64>,
    /// Mean resistance in ohm and inductance in henry.
    means: Option<(f64, f64)>,
}

impl Sum {
    fn new(mut map: ReturnMap, weight: f64) -> Self {
        let squares = weighted_squares(&map, weight);
        let means = loop_of(&map).map(|(ohm, henry)| (weight * ohm, weight * henry));
        map.jx.iter_mut().chain(&mut map.jy).for_each(|current| *current *= weight);
        Self { mean: map, squares, means }
    }

    /// Adds a map; where `told`, its frequency, height and impedance are told with the band.
    fn add(&mut self, map: &ReturnMap, weight: f64, told: bool) {
        let mean = &mut self.mean;
        mean.jx.iter_mut().zip(&map.jx).for_each(|(sum, current)| *sum += weight * current);
        mean.jy.iter_mut().zip(&map.jy).for_each(|(sum, current)| *sum += weight * current);
        let squares = weighted_squares(map, weight);
        self.squares.iter_mut().zip(&squares).for_each(|(sum, square)| *sum += square);
        self.means = self
            .means
            .zip(loop_of(map))
            .map(|((ohm, henry), own)| (ohm + weight * own.0, henry + weight * own.1));
        if told {
            (mean.frequency_hz, mean.height_m, mean.zs_ohm) = (map.frequency_hz, map.height_m, map.zs_ohm);
        }
        mean.residual = mean.residual.zip(map.residual).map(|(a, b)| a.max(b));
    }

    fn finish(self, shape: &BandDensity) -> ReturnMap {
        let mut map = self.mean;
        let omega = std::f64::consts::TAU * map.frequency_hz;
        map.loop_impedance_ohm = self.means.map(|(ohm, henry)| Complex64::new(ohm, omega * henry));
        let rms = self.squares.into_iter().map(f64::sqrt).collect();
        map.band_density = Some(BandDensity { rms, ..shape.clone() });
        map
    }
}

fn weighted_squares(map: &ReturnMap, weight: f64) -> Vec<f64> {
    let nx = map.grid.nx;
    let square = |cell: usize| {
        let (kx, ky) = map.density(cell % nx, cell / nx);
        weight * (kx.norm_sqr() + ky.norm_sqr())
    };
    (0..map.grid.len()).map(square).collect()
}

/// What each void adds to the loop's resistance and inductance, weighted.
fn parts(maps: &PlaneMaps, weight: f64) -> Option<Vec<(f64, f64)>> {
    let omega = std::f64::consts::TAU * maps.map.frequency_hz;
    let henry = |ohm: f64| if omega > 0.0 { ohm / omega } else { 0.0 };
    let part = |z: &Complex64| (weight * z.re, weight * henry(z.im));
    maps.void_parts.as_ref().map(|parts| parts.iter().map(part).collect())
}

/// Loop resistance in ohm and inductance in henry; the latter 0 at DC.
fn loop_of(map: &ReturnMap) -> Option<(f64, f64)> {
    let omega = std::f64::consts::TAU * map.frequency_hz;
    map.loop_impedance_ohm.map(|z| (z.re, if omega > 0.0 { z.im / omega } else { 0.0 }))
}
