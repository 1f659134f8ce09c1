//! What a drive puts into the branches: the magnetic flux of its strips along every dual edge, and its landings.
//!
//! Given source strips, gives for each face the integral in V s of their vector potential along the line between the
//! two cell centres; multiplied by s it is the EMF, at every frequency the same vector.
//!
//! Model: a strip is a set of parallel filaments (Legendre nodes for the uniform, Chebyshev nodes with equal weights
//! for the edge-crowded profile); a filament of length l has A = (mu0 I/4 pi) ln[(r1 + r2 + l)/(r1 + r2 - l)] along
//! itself, r1 and r2 being the distances to its ends; the line integral is a Gauss sum, 8 points near the strip, fewer
//! far from it. Far from the strip the potential is evaluated on Chebyshev nodes of blocks of cells and interpolated.
//!
//! Source: Grover, Inductance Calculations, 1946, chapter 5 (from memory); the potential of a straight filament is
//! elementary.
//!
//! Checked by: `source_flux_against_plain_quadrature` in tests/physics.

use super::{Problem, SourceStrip, StripProfile};
use crate::geom::Point;
use crate::math::quadrature::{chebyshev, legendre};
use crate::unit::constants::MU0;
use std::f64::consts::PI;

/// Filaments of a strip as offsets in units of half the width, and their shares (sum 1).
pub fn filaments(strip: &SourceStrip, distance_m: f64) -> Vec<(f64, f64)> {
    if strip.width_m == 0.0 {
        return vec![(0.0, 1.0)];
    }
    let ratio = (strip.width_m / distance_m).min(40.0);
    let count = 2 + (2.0 * ratio).ceil() as usize;
    match strip.profile {
        StripProfile::Uniform => legendre(count).into_iter().map(|(x, w)| (x, w / 2.0)).collect(),
        StripProfile::Edge => chebyshev(count),
    }
}

/// A straight filament ready for evaluation.
#[derive(Clone, Copy)]
struct Filament {
    from: Point,
    along: Point,
    length: f64,
    height_squared: f64,
    /// mu0 I / 4 pi.
    strength: f64,
}

impl Filament {
    /// Vector potential along the filament in V s/m.
    fn potential(&self, at: Point) -> f64 {
        let offset = at - self.from;
        let (a, across) = (offset.dot(self.along), offset.cross(self.along));
        let rho = across * across + self.height_squared;
        let to_end = a - self.length;
        let sum = libm::sqrt(rho + a * a) + libm::sqrt(rho + to_end * to_end);
        self.strength * libm::log1p(2.0 * self.length / (sum - self.length))
    }
}

/// `offsets` as filaments of `strip` seen from a sheet `distance_m` away in height.
fn cut(strip: &SourceStrip, distance_m: f64, offsets: &[(f64, f64)]) -> Vec<Filament> {
    let whole = strip.to - strip.from;
    let length = whole.length();
    if length == 0.0 {
        return Vec::new();
    }
    let along = whole * (1.0 / length);
    let across = Point::new(-along.y, along.x);
    offsets
        .iter()
        .map(|&(offset, share)| Filament {
            from: strip.from + across * (offset * strip.width_m / 2.0),
            along,
            length,
            height_squared: distance_m * distance_m,
            strength: MU0 / (4.0 * PI) * strip.current_a * share,
        })
        .collect()
}

/// Integral of the vector potential of `strips` along every dual edge in V s, in the order of a vector of branch
/// currents without the verticals.
pub fn flux(problem: &Problem, strips: &[SourceStrip]) -> Vec<f64> {
    let grid = &problem.grid;
    let (nx, ny, d) = (grid.nx, grid.ny, grid.cell_m);
    let cells = nx * ny;
    let mut out = vec![0.0; 2 * problem.sheets.len() * cells];
    let gauss: Vec<Vec<(f64, f64)>> = [1, 2, 3, 8]
        .iter()
        .map(|&n| legendre(n).into_iter().map(|(x, w)| (x * d / 2.0, w * d / 2.0)).collect())
        .collect();
    for (sheet, planes) in problem.sheets.iter().zip(out.chunks_exact_mut(2 * cells)) {
        let (along_x, along_y) = planes.split_at_mut(cells);
        for strip in strips {
            let distance = (strip.z_m - sheet.z_m).abs();
            let near = cut(strip, distance, &filaments(strip, distance.max(d / 2.0)));
            // two filaments with the second moment of the profile
            let far = cut(strip, distance, &filaments(strip, f64::INFINITY));
            let Some(axis) = cut(strip, distance, &[(0.0, 1.0)]).first().copied() else { continue };
            for iy in 0..ny {
                for ix in 0..nx {
                    let centre = grid.centre(ix, iy);
                    let offset = centre - axis.from;
                    let a = offset.dot(axis.along);
                    let beyond = (a - axis.length).max(-a).max(0.0);
                    let across = offset.cross(axis.along);
                    let reach = libm::sqrt(across * across + beyond * beyond + axis.height_squared);
                    let order = match reach / d {
                        r if r > 40.0 => 0,
                        r if r > 10.0 => 1,
                        r if r > 5.0 => 2,
                        _ => 3,
                    };
                    let set = if reach > 10.0 * strip.width_m { &far } else { &near };
                    let integral = |middle: Point, towards: Point| -> f64 {
                        let points = gauss[order].iter().map(|&(x, w)| (middle + towards * x, w));
                        points.map(|(at, w)| w * set.iter().map(|f| f.potential(at)).sum::<f64>()).sum()
                    };
                    let at = iy * nx + ix;
                    if axis.along.x != 0.0 && ix > 0 {
                        let middle = centre - Point::new(d / 2.0, 0.0);
                        along_x[at] += axis.along.x * integral(middle, Point::new(1.0, 0.0));
                    }
                    if axis.along.y != 0.0 && iy > 0 {
                        let middle = centre - Point::new(0.0, d / 2.0);
                        along_y[at] += axis.along.y * integral(middle, Point::new(0.0, 1.0));
                    }
                }
            }
        }
    }
    out
}
