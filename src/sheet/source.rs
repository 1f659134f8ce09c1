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
use crate::geom::{Grid, Point};
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

/// Interpolation nodes in each direction of a block.
const NODES: usize = 8;
/// Sides in cells of the blocks, coarse to fine.
const SIDES: [usize; 4] = [64, 32, 16, 8];

/// A strip seen from one sheet.
struct Seen {
    axis: Filament,
    /// All filaments of the profile.
    near: Vec<Filament>,
    /// Two filaments with the second moment of the profile.
    far: Vec<Filament>,
    width: f64,
}

impl Seen {
    fn new(strip: &SourceStrip, sheet_z_m: f64, cell_m: f64) -> Option<Self> {
        let distance = (strip.z_m - sheet_z_m).abs();
        let axis = cut(strip, distance, &[(0.0, 1.0)]).first().copied()?;
        let near = cut(strip, distance, &filaments(strip, distance.max(cell_m / 2.0)));
        let far = cut(strip, distance, &filaments(strip, f64::INFINITY));
        Some(Self { axis, near, far, width: strip.width_m })
    }

    /// Distance of a point of the sheet from the strip's axis.
    fn distance(&self, at: Point) -> f64 {
        let offset = at - self.axis.from;
        let a = offset.dot(self.axis.along);
        let beyond = (a - self.axis.length).max(-a).max(0.0);
        let across = offset.cross(self.axis.along);
        libm::sqrt(across * across + beyond * beyond + self.axis.height_squared)
    }

    /// Integral of the potential along its own direction over points at `middle` + x `towards`.
    fn integral(&self, middle: Point, towards: Point, reach: f64, gauss: &[(f64, f64)]) -> f64 {
        let set = if reach > 10.0 * self.width { &self.far } else { &self.near };
        let at = |x: f64| set.iter().map(|f| f.potential(middle + towards * x)).sum::<f64>();
        gauss.iter().map(|&(x, w)| w * at(x)).sum()
    }
}

/// What the recursion over blocks needs.
struct Blocks<'a> {
    grid: &'a Grid,
    seen: Vec<Seen>,
    /// Gauss points on a dual edge, in metres: 2, 3 and 8.
    gauss: [Vec<(f64, f64)>; 3],
    /// For each side of blocks the nodes in cells from the block's corner, and each cell's weights on them.
    tables: Vec<([f64; NODES], Vec<[f64; NODES]>)>,
}

const TOWARDS: [Point; 2] = [Point::new(1.0, 0.0), Point::new(0.0, 1.0)];

impl Blocks<'_> {
    /// Adds the strips `which` to the block of cells at (x0, y0).
    fn fill(&self, level: usize, x0: usize, y0: usize, which: &[usize], planes: &mut [&mut [f64]; 2]) {
        let (grid, side) = (self.grid, SIDES[level]);
        let (nx, d) = (grid.nx, grid.cell_m);
        let (x1, y1) = ((x0 + side).min(nx), (y0 + side).min(grid.ny));
        let half = side as f64 / 2.0;
        let centre = grid.origin + Point::new(x0 as f64 + half, y0 as f64 + half) * d;
        // eight Chebyshev nodes are good to 1e-7 from 2.3 sides on
        let is_far = |index: &usize| self.seen[*index].distance(centre) > 2.3 * side as f64 * d;
        let (far, near): (Vec<usize>, Vec<usize>) = which.iter().partition(|index| is_far(index));
        if !far.is_empty() {
            self.interpolate(level, (x0, y0), (x1, y1), &far, planes);
        }
        if near.is_empty() {
            return;
        }
        if level + 1 < SIDES.len() {
            let finer = SIDES[level + 1];
            for y in (y0..y1).step_by(finer) {
                for x in (x0..x1).step_by(finer) {
                    self.fill(level + 1, x, y, &near, planes);
                }
            }
            return;
        }
        for iy in y0..y1 {
            for ix in x0..x1 {
                let cell = grid.centre(ix, iy);
                for index in &near {
                    let strip = &self.seen[*index];
                    let reach = strip.distance(cell);
                    let gauss = match reach / d {
                        r if r > 12.0 => &self.gauss[0],
                        r if r > 6.0 => &self.gauss[1],
                        _ => &self.gauss[2],
                    };
                    for (direction, exists) in [ix > 0, iy > 0].into_iter().enumerate() {
                        let cosine = strip.axis.along.dot(TOWARDS[direction]);
                        if exists && cosine != 0.0 {
                            let middle = cell - TOWARDS[direction] * (d / 2.0);
                            planes[direction][iy * nx + ix] +=
                                cosine * strip.integral(middle, TOWARDS[direction], reach, gauss);
                        }
                    }
                }
            }
        }
    }

    /// Adds far strips by interpolation between nodes.
    fn interpolate(
        &self,
        level: usize,
        (x0, y0): (usize, usize),
        (x1, y1): (usize, usize),
        far: &[usize],
        planes: &mut [&mut [f64]; 2],
    ) {
        let (nx, d) = (self.grid.nx, self.grid.cell_m);
        let corner = self.grid.origin + Point::new(x0 as f64, y0 as f64) * d;
        let (nodes, weights) = &self.tables[level];
        let mut values = [[[0.0; NODES]; NODES]; 2];
        for (row, &y) in nodes.iter().enumerate() {
            for (column, &x) in nodes.iter().enumerate() {
                let at = corner + Point::new(x, y) * d;
                for index in far {
                    let strip = &self.seen[*index];
                    let reach = strip.distance(at);
                    for (direction, towards) in TOWARDS.into_iter().enumerate() {
                        let cosine = strip.axis.along.dot(towards);
                        if cosine != 0.0 {
                            let middle = at - towards * (d / 2.0);
                            values[direction][row][column] +=
                                cosine * strip.integral(middle, towards, reach, &self.gauss[0]);
                        }
                    }
                }
            }
        }
        for (plane, values) in planes.iter_mut().zip(&values) {
            for iy in y0..y1 {
                let down = &weights[iy - y0];
                let mut row = [0.0; NODES];
                for (w, line) in down.iter().zip(values) {
                    row.iter_mut().zip(line).for_each(|(sum, value)| *sum += w * value);
                }
                for ix in x0..x1 {
                    let across = &weights[ix - x0];
                    plane[iy * nx + ix] += row.iter().zip(across).map(|(value, w)| value * w).sum::<f64>();
                }
            }
        }
    }
}

/// Chebyshev nodes on a block of `side` cells, and for each cell middle the weights of polynomial interpolation.
fn interpolation(side: usize) -> ([f64; NODES], Vec<[f64; NODES]>) {
    let half = side as f64 / 2.0;
    let mut nodes = [0.0; NODES];
    for (node, (x, _)) in nodes.iter_mut().zip(chebyshev(NODES)) {
        *node = half * (1.0 + x);
    }
    let weights = |cell: usize| {
        let x = cell as f64 + 0.5;
        let mut weights = [1.0; NODES];
        for (i, weight) in weights.iter_mut().enumerate() {
            for j in (0..NODES).filter(|j| *j != i) {
                *weight *= (x - nodes[j]) / (nodes[i] - nodes[j]);
            }
        }
        weights
    };
    (nodes, (0..side).map(weights).collect())
}

/// Integral of the vector potential of `strips` along every dual edge in V s, in the order of a vector of branch
/// currents without the verticals.
pub fn flux(problem: &Problem, strips: &[SourceStrip]) -> Vec<f64> {
    let grid = &problem.grid;
    let (nx, ny, d) = (grid.nx, grid.ny, grid.cell_m);
    let cells = nx * ny;
    let mut out = vec![0.0; 2 * problem.sheets.len() * cells];
    let gauss = [2, 3, 8].map(|n| legendre(n).into_iter().map(|(x, w)| (x * d / 2.0, w * d / 2.0)).collect());
    let mut blocks = Blocks { grid, seen: Vec::new(), gauss, tables: SIDES.map(interpolation).to_vec() };
    for (sheet, planes) in problem.sheets.iter().zip(out.chunks_exact_mut(2 * cells)) {
        blocks.seen = strips.iter().filter_map(|strip| Seen::new(strip, sheet.z_m, d)).collect();
        let which: Vec<usize> = (0..blocks.seen.len()).collect();
        let (along_x, along_y) = planes.split_at_mut(cells);
        let mut planes = [along_x, along_y];
        for y in (0..ny).step_by(SIDES[0]) {
            for x in (0..nx).step_by(SIDES[0]) {
                blocks.fill(0, x, y, &which, &mut planes);
            }
        }
        // the first column and row have no face to the left and below
        (0..ny).for_each(|iy| planes[0][iy * nx] = 0.0);
        planes[1][..nx].fill(0.0);
    }
    out
}
