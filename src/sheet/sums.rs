//! Weighted sums of squared currents over many frequencies, without forming the solution at each.
//!
//! Given a family, operating points f_n and weights w_n, gives sum_n w_n |i(f_n)|^2 of every face and vertical in A^2
//! and sum_n w_n |K(f_n)|^2 of every cell in A^2/m^2, K being the mean of a cell's two face currents over its width.
//!
//! Model: i(f) = V y(f) with real V, so that sum_n w_n |(V y_n)_b|^2 = v_b^T C v_b with C = Re sum_n w_n y_n y_n^*, a small
//! positive matrix. C = U diag(c) U^T; the columns of V U sqrt(c) are formed once each and their squares summed.
//!
//! Source: derived here.
//!
//! Holds when: as the family; weights are not negative.
//!
//! Checked by: `sums_over_lines` in tests/physics.

use super::family::Family;
use super::system::OperatingPoint;
use faer::{Mat, Side};

/// Weighted sums of squares.
#[derive(Clone, Debug)]
pub struct Sums {
    /// For each sheet and vertical face A^2, in the layout of [`super::Solution::jx`].
    pub jx: Vec<Vec<f64>>,
    /// The same of horizontal faces, see [`super::Solution::jy`].
    pub jy: Vec<Vec<f64>>,
    /// For each sheet and cell A^2/m^2.
    pub density: Vec<Vec<f64>>,
    /// For each vertical A^2.
    pub verticals: Vec<f64>,
    /// For each gap A^2 of its whole displacement current.
    pub displacement: Vec<f64>,
}

impl Family<'_> {
    /// Sum over `lines`, operating points with their weights, of squared currents and densities.
    pub fn sums(&self, lines: &[(OperatingPoint, f64)]) -> Sums {
        let branches = &self.system.branches;
        let (nx, ny, sheets) = (branches.nx, branches.ny, branches.sheets);
        let rows = self.len() + 1;
        let mut gram = Mat::<f64>::zeros(rows, rows);
        for (point, weight) in lines {
            let y = self.coefficients(point);
            for a in 0..rows {
                for b in 0..rows {
                    gram[(a, b)] += weight * (y[a] * y[b].conj()).re;
                }
            }
        }
        let mut sums = Sums {
            jx: vec![vec![0.0; (nx + 1) * ny]; sheets],
            jy: vec![vec![0.0; nx * (ny + 1)]; sheets],
            density: vec![vec![0.0; nx * ny]; sheets],
            verticals: vec![0.0; branches.ends.len()],
            displacement: vec![0.0; branches.gap_cells.len()],
        };
        // a matrix of finite numbers has its eigenvalues; without them the sums stay zero only if it has not
        let Ok(parts) = gram.self_adjoint_eigen(Side::Lower) else { return sums };
        let most = parts.S().column_vector().iter().fold(0.0, |m: f64, &c| m.max(c));
        let per_area = 1.0 / (self.system.problem.grid.cell_m * self.system.problem.grid.cell_m);
        let mut currents = vec![0.0; branches.len()];
        for part in 0..rows {
            let value = parts.S().column_vector()[part];
            // rounding alone makes some vanish or fall below zero
            if value <= 1e-18 * most {
                continue;
            }
            currents.fill(0.0);
            let root = libm::sqrt(value);
            for (row, vector) in self.vectors.iter().enumerate() {
                let factor = root * parts.U()[(row, part)];
                currents.iter_mut().zip(vector).for_each(|(i, v)| *i += factor * v);
            }
            for sheet in 0..sheets {
                let along_x = &currents[branches.plane(sheet, 0)];
                let along_y = &currents[branches.plane(sheet, 1)];
                let density = &mut sums.density[sheet];
                for iy in 0..ny {
                    for ix in 0..nx {
                        let at = iy * nx + ix;
                        let (x, y) = (along_x[at], along_y[at]);
                        sums.jx[sheet][iy * (nx + 1) + ix] += x * x;
                        sums.jy[sheet][at] += y * y;
                        let right = if ix + 1 < nx { along_x[at + 1] } else { 0.0 };
                        let above = if iy + 1 < ny { along_y[at + nx] } else { 0.0 };
                        let (kx, ky) = (0.5 * (x + right), 0.5 * (y + above));
                        density[at] += per_area * (kx * kx + ky * ky);
                    }
                }
            }
            let verticals = &currents[branches.faces()..branches.first_gap()];
            sums.verticals.iter_mut().zip(verticals).for_each(|(sum, i)| *sum += i * i);
            let mut first = branches.first_gap();
            for (sum, cells) in sums.displacement.iter_mut().zip(&branches.gap_cells) {
                let through: f64 = currents[first..first + cells.len()].iter().sum();
                *sum += through * through;
                first += cells.len();
            }
        }
        sums
    }
}
