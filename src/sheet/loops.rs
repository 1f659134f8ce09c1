//! The faster route for sheets without verticals: currents as loops, one unknown on every corner of cells.
//!
//! Given a start that conserves current, gives the currents that also obey the voltage law.
//!
//! Model: i = start + C psi; psi on the (nx + 1) x (ny + 1) corners, jx = psi above - psi below, jy = psi left - psi
//! right. Corners at the two ends of a face that does not conduct are tied together: the outside is zero, a void has
//! one unknown. C^T Z C psi = -C^T (Z start + emf); on corners the kernel is the flux of B_z through a cell, symbol
//! (mu0/2)|k| sinc sinc, so that one Fourier pair does what takes two on branches. Preconditioner: the symbol
//! kh^2 (Zs + s L^) divided on the unpadded torus, residuals of tied corners spread evenly.
//!
//! Source: mesh currents (Kamon, Tsuk and White, IEEE T-MTT 42, 1994) on a lattice; stream function of thin films
//! (Brandt, Phys. Rev. B 64, 2001); both from memory.
//!
//! Holds when: no vertical conducts; any number of sheets, voids and islands.
//!
//! Checked by: `both_routes_agree`, `current_is_conserved_and_power_is_dissipated` in tests/physics.

use super::branches::Branches;
use super::kernel;
use super::operator::{dot, inverse_symbols, mix_sheets, norm, triangle_index};
use super::projector::root;
use crate::math::filter::{Filter, Scratch};
use num_complex::Complex64;

/// Mark of a corner on the outside.
const OUTSIDE: u32 = u32::MAX;

/// Corners, their ties and the kernels on them.
#[derive(Debug)]
pub struct Loops {
    /// Corners in a row.
    width: usize,
    /// Corners in a column.
    height: usize,
    /// Unknown of each corner of each sheet.
    unknown: Vec<u32>,
    /// Corners of each unknown.
    count: Vec<f64>,
    padded: Filter,
    torus: Filter,
    /// For sheets p, q the index p * sheets + q gives the entry of the next two lists.
    pair: Vec<usize>,
    spectra: Vec<Vec<f64>>,
    symbols: Vec<Vec<f64>>,
}

/// Work space of an iteration.
struct Desk {
    corners: Vec<Complex64>,
    out: Vec<Complex64>,
    currents: Vec<Complex64>,
    voltages: Vec<Complex64>,
    scratch: Scratch,
}

/// What the operator at one frequency consists of.
pub struct Law<'a> {
    /// Complex frequency.
    pub s: Complex64,
    /// Sheet impedances.
    pub zs: &'a [Complex64],
    /// What an outermost face has more inductance than others, in H.
    pub edge_h: f64,
}

impl Loops {
    /// Ties corners and prepares kernels: `offsets` are those of each distance for (nx + 2) x (ny + 2) cells.
    pub fn new(
        branches: &Branches,
        cell_m: f64,
        distances_m: &[f64],
        pair: &[usize],
        offsets: &[Vec<f64>],
    ) -> Self {
        let (nx, ny) = (branches.nx, branches.ny);
        let (width, height) = (nx + 1, ny + 1);
        let corners = width * height;
        let mut parent: Vec<u32> = (0..(branches.sheets * corners) as u32).collect();
        let mut tie = |a: usize, b: usize| {
            let (a, b) = (root(&mut parent, a as u32), root(&mut parent, b as u32));
            parent[a.max(b) as usize] = a.min(b);
        };
        for sheet in 0..branches.sheets {
            let first = sheet * corners;
            let (along_x, along_y) = (branches.plane(sheet, 0).start, branches.plane(sheet, 1).start);
            for iy in 0..height {
                for ix in 0..width {
                    let at = first + iy * width + ix;
                    if iy < ny && (ix == nx || !branches.conducts[along_x + iy * nx + ix]) {
                        tie(at, at + width);
                    }
                    if ix < nx && (iy == ny || !branches.conducts[along_y + iy * nx + ix]) {
                        tie(at, at + 1);
                    }
                }
            }
        }
        let mut unknown = vec![OUTSIDE; branches.sheets * corners];
        let mut count = Vec::new();
        for corner in 0..unknown.len() {
            let top = root(&mut parent, corner as u32) as usize;
            // the first corner of a sheet is outside and the lowest of its set
            if top.is_multiple_of(corners) {
                continue;
            }
            if top == corner {
                unknown[corner] = count.len() as u32;
                count.push(0.0);
            }
            unknown[corner] = unknown[top];
            count[unknown[corner] as usize] += 1.0;
        }
        let padded = Filter::padded(width, height);
        let torus = Filter::new(width, height, width, height);
        let (tall, wide) = (height + 1, width + 1);
        let spectra = offsets.iter().map(|table| {
            // the flux kernel is the branch kernel's negative second difference
            let at = |i: usize, j: usize| table[j * wide + i];
            let mut flux = Vec::with_capacity(corners);
            for j in 0..height {
                for i in 0..width {
                    let beside = at(i.abs_diff(1), j) + at(i + 1, j) + at(i, j.abs_diff(1)) + at(i, j + 1);
                    flux.push(4.0 * at(i, j) - beside);
                }
            }
            debug_assert_eq!(table.len(), tall * wide);
            kernel::spectrum(&flux, width, height, cell_m, &padded)
        });
        let spectra = spectra.collect();
        let symbols = distances_m.iter().map(|&z| kernel::symbol(cell_m, z, &torus)).collect();
        Self { width, height, unknown, count, padded, torus, pair: pair.to_vec(), spectra, symbols }
    }

    /// Values on corners as branch currents, C psi.
    fn currents(&self, branches: &Branches, corners: &[Complex64], out: &mut [Complex64]) {
        let (nx, ny, width) = (branches.nx, branches.ny, self.width);
        for (sheet, psi) in corners.chunks_exact(width * self.height).enumerate() {
            let along_x = branches.plane(sheet, 0).start;
            let along_y = branches.plane(sheet, 1).start;
            for iy in 0..ny {
                let (low, high) = psi[iy * width..(iy + 2) * width].split_at(width);
                let row = iy * nx;
                for ix in 0..nx {
                    out[along_x + row + ix] = high[ix] - low[ix];
                    out[along_y + row + ix] = low[ix] - low[ix + 1];
                }
            }
        }
    }

    /// Adds the EMF round every corner, C^T v.
    fn add_emf(&self, branches: &Branches, voltages: &[Complex64], out: &mut [Complex64]) {
        let (nx, ny, width) = (branches.nx, branches.ny, self.width);
        for (sheet, psi) in out.chunks_exact_mut(width * self.height).enumerate() {
            let along_x = branches.plane(sheet, 0).start;
            let along_y = branches.plane(sheet, 1).start;
            for iy in 0..ny {
                let (low, high) = psi[iy * width..(iy + 2) * width].split_at_mut(width);
                let row = iy * nx;
                for ix in 0..nx {
                    let (x, y) = (voltages[along_x + row + ix], voltages[along_y + row + ix]);
                    high[ix] += x;
                    low[ix] += y - x;
                    low[ix + 1] -= y;
                }
            }
        }
    }

    /// Unknowns to corners; `scale` divides by the number of tied corners.
    fn expand(&self, unknowns: &[Complex64], scale: bool, corners: &mut [Complex64]) {
        for (corner, &unknown) in corners.iter_mut().zip(&self.unknown) {
            *corner = match unknown {
                OUTSIDE => Complex64::default(),
                u if scale => unknowns[u as usize] / self.count[u as usize],
                u => unknowns[u as usize],
            };
        }
    }

    /// Sums corners into unknowns.
    fn restrict(&self, corners: &[Complex64], unknowns: &mut [Complex64]) {
        unknowns.fill(Complex64::default());
        for (corner, &unknown) in corners.iter().zip(&self.unknown).filter(|(_, u)| **u != OUTSIDE) {
            unknowns[unknown as usize] += corner;
        }
    }

    /// C^T Z C on unknowns.
    fn apply(
        &self,
        branches: &Branches,
        law: &Law<'_>,
        unknowns: &[Complex64],
        result: &mut [Complex64],
        desk: &mut Desk,
    ) {
        let sheets = branches.sheets;
        let corners = self.width * self.height;
        self.expand(unknowns, false, &mut desk.corners);
        if law.s == Complex64::default() {
            desk.out.fill(Complex64::default());
        } else {
            let from: Vec<&[Complex64]> = desk.corners.chunks_exact(corners).collect();
            let mut to: Vec<&mut [Complex64]> = desk.out.chunks_exact_mut(corners).collect();
            let (px, py) = self.padded.size();
            let half = py / 2 + 1;
            let mut mixed = vec![Complex64::default(); sheets];
            self.padded.apply(&from, &mut to, &mut desk.scratch, |kx, columns| {
                let row = kx.min(px - kx) * half;
                let table = |p: usize, q: usize| &self.spectra[self.pair[p * sheets + q]][row..row + half];
                mix_sheets(table, columns, py, &mut mixed);
                columns.iter_mut().for_each(|value| *value *= law.s);
            });
        }
        self.currents(branches, &desk.corners, &mut desk.currents);
        desk.voltages.fill(Complex64::default());
        for sheet in 0..sheets {
            for direction in 0..2 {
                let range = branches.plane(sheet, direction);
                let (from, to) = (&desk.currents[range.clone()], &mut desk.voltages[range]);
                branches.add_resistive(sheet, direction, law.zs[sheet], from, to);
            }
        }
        branches.add_edges(law.s * law.edge_h, &desk.currents, &mut desk.voltages);
        self.add_emf(branches, &desk.voltages, &mut desk.out);
        self.restrict(&desk.out, result);
    }

    /// Divides by the symbol on the torus.
    fn precondition(
        &self,
        inverse: &[Complex64],
        sheets: usize,
        residual: &[Complex64],
        result: &mut [Complex64],
        desk: &mut Desk,
    ) {
        let corners = self.width * self.height;
        self.expand(residual, true, &mut desk.corners);
        let from: Vec<&[Complex64]> = desk.corners.chunks_exact(corners).collect();
        let mut to: Vec<&mut [Complex64]> = desk.out.chunks_exact_mut(corners).collect();
        let (px, py) = self.torus.size();
        let half = py / 2 + 1;
        let modes = inverse.len() / (sheets * (sheets + 1) / 2);
        let mut mixed = Vec::new();
        self.torus.apply(&from, &mut to, &mut desk.scratch, |kx, columns| {
            let row = kx.min(px - kx) * half;
            let table = |p: usize, q: usize| &inverse[triangle_index(p, q, sheets) * modes + row..][..half];
            mix_sheets(table, columns, py, &mut mixed);
        });
        self.restrict(&desk.out, result);
        result.iter_mut().zip(&self.count).for_each(|(z, count)| *z /= count);
    }

    /// Inverse symbols 1/(kh^2 (Zs + s L^)) on the torus, divided by the number of its points.
    fn inverse(&self, law: &Law<'_>) -> Vec<Complex64> {
        let (px, py) = self.torus.size();
        let mut inverse: Vec<Complex64> = inverse_symbols(law.s, law.zs, &self.pair, &self.symbols, px * py);
        let half = py / 2 + 1;
        let modes = (px / 2 + 1) * half;
        let square = |m: usize, size: usize| {
            let sine = libm::sin(std::f64::consts::PI * m as f64 / size as f64);
            4.0 * sine * sine
        };
        let lowest = square(1, px.max(py).max(2));
        for (at, value) in inverse.iter_mut().enumerate() {
            let mode = at % modes;
            let k2 = square(mode / half, px) + square(mode % half, py);
            *value /= k2.max(lowest);
        }
        inverse
    }

    /// Adds loops to `currents` until the EMF round them, given `voltage` = Z currents + emf of the start, is
    /// `reduction` times what it was. Returns the steps done.
    pub fn iterate(
        &self,
        branches: &Branches,
        law: &Law<'_>,
        voltage: &[Complex64],
        currents: &mut [Complex64],
        reduction: f64,
        most_steps: usize,
    ) -> usize {
        let zero = Complex64::default();
        let (sheets, unknowns) = (branches.sheets, self.count.len());
        let corners = sheets * self.width * self.height;
        let mut desk = Desk {
            corners: vec![zero; corners],
            out: vec![zero; corners],
            currents: vec![zero; branches.faces()],
            voltages: vec![zero; branches.faces()],
            scratch: Scratch::default(),
        };
        let inverse = self.inverse(law);
        let mut residual = vec![zero; unknowns];
        self.add_emf(branches, voltage, &mut desk.out);
        self.restrict(&desk.out, &mut residual);
        residual.iter_mut().for_each(|r| *r = -*r);
        let target = reduction * norm(&residual);
        let mut psi = vec![zero; unknowns];
        let (mut search, mut work) = (vec![zero; unknowns], vec![zero; unknowns]);
        let mut rho = Complex64::new(1.0, 0.0);
        let mut steps = 0;
        while steps < most_steps && norm(&residual) > target {
            self.precondition(&inverse, sheets, &residual, &mut work, &mut desk);
            let next = dot(&residual, &work);
            let beta = if steps == 0 { zero } else { next / rho };
            rho = next;
            search.iter_mut().zip(&work).for_each(|(p, z)| *p = *z + beta * *p);
            self.apply(branches, law, &search, &mut work, &mut desk);
            let alpha = rho / dot(&search, &work);
            if !alpha.is_finite() {
                break;
            }
            psi.iter_mut().zip(&search).for_each(|(x, p)| *x += alpha * p);
            residual.iter_mut().zip(&work).for_each(|(r, q)| *r -= alpha * q);
            steps += 1;
        }
        self.expand(&psi, false, &mut desk.corners);
        self.currents(branches, &desk.corners, &mut desk.currents);
        currents.iter_mut().zip(&desk.currents).for_each(|(i, change)| *i += change);
        steps
    }
}
