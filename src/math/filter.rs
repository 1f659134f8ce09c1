//! Two-dimensional Fourier filters of several coupled planes, padded or not, without ever holding a full spectrum.
//!
//! Given planes of nx x ny complex values (index iy * nx + ix), gives the planes convolved with kernels whose
//! transforms the caller multiplies in, column by column. Rows are transformed to length px, then blocks of columns
//! are gathered, transformed to length py, handed to the caller, transformed back and scattered; of the padding only
//! the half of the rows that holds data is ever transformed or stored (32 bytes per cell and plane when padded).
//!
//! Model: circular convolution of size px x py; linear when px >= 2 nx - 1 and py >= 2 ny - 1.
//!
//! Not here: the kernels, see `sheet::kernel`.

use num_complex::Complex;
use rustfft::{Fft, FftNum, FftPlanner};
use std::sync::Arc;

/// Columns that are gathered at a time: two cache lines of complex values.
const BLOCK: usize = 8;

/// The smallest product of powers of 2, 3 and 5 not below `at_least`; such lengths transform fastest.
pub fn smooth_size(at_least: usize) -> usize {
    let mut best = at_least.max(1).next_power_of_two();
    let mut fives = 1;
    while fives < best {
        let mut threes = fives;
        while threes < best {
            let twos = threes * at_least.max(1).div_ceil(threes).next_power_of_two();
            best = best.min(twos);
            threes *= 3;
        }
        fives *= 5;
    }
    best
}

/// Plans in double precision.
pub type Filter = FilterOf<f64>;

/// Plans for one size of planes and padding, in single or double precision.
#[derive(Clone)]
pub struct FilterOf<T> {
    nx: usize,
    ny: usize,
    px: usize,
    py: usize,
    rows: [Arc<dyn Fft<T>>; 2],
    columns: [Arc<dyn Fft<T>>; 2],
}

impl<T> std::fmt::Debug for FilterOf<T> {
    fn fmt(&self, out: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(out, "Filter {} x {} padded to {} x {}", self.nx, self.ny, self.px, self.py)
    }
}

/// Buffers of a filter, kept between calls.
#[derive(Debug, Default)]
pub struct Scratch<T = f64> {
    rows: Vec<Complex<T>>,
    columns: Vec<Complex<T>>,
    fft: Vec<Complex<T>>,
}

impl<T: FftNum> FilterOf<T> {
    /// Plans for planes of `nx` x `ny` on a torus of at least `px` x `py`; the lengths used are [`Filter::size`].
    pub fn new(nx: usize, ny: usize, px: usize, py: usize) -> Self {
        let (px, py) = (smooth_size(px.max(nx)), smooth_size(py.max(ny)));
        let mut planner = FftPlanner::new();
        let rows = [planner.plan_fft_forward(px), planner.plan_fft_inverse(px)];
        let columns = [planner.plan_fft_forward(py), planner.plan_fft_inverse(py)];
        Self { nx, ny, px, py, rows, columns }
    }

    /// Plans for a linear convolution of planes of `nx` x `ny`.
    pub fn padded(nx: usize, ny: usize) -> Self {
        Self::new(nx, ny, 2 * nx - 1, 2 * ny - 1)
    }

    /// Lengths (px, py) of the transforms.
    pub fn size(&self) -> (usize, usize) {
        (self.px, self.py)
    }

    /// Transforms `input` planes, lets `multiply` change the spectra and writes the result, not normalised (divide by
    /// px * py), to `output`. `multiply(kx, columns)` gets for each plane in turn the py values at column kx.
    pub fn apply(
        &self,
        input: &[&[Complex<T>]],
        output: &mut [&mut [Complex<T>]],
        scratch: &mut Scratch<T>,
        mut multiply: impl FnMut(usize, &mut [Complex<T>]),
    ) {
        let (nx, ny, px, py) = (self.nx, self.ny, self.px, self.py);
        let (planes, zero) = (input.len(), Complex::new(T::zero(), T::zero()));
        let need = [&self.rows[0], &self.rows[1], &self.columns[0], &self.columns[1]]
            .map(|plan| plan.get_inplace_scratch_len());
        scratch.rows.resize(planes * ny * px, zero);
        scratch.columns.resize(planes * BLOCK * py, zero);
        scratch.fft.resize(need.into_iter().fold(0, usize::max), zero);
        for (plane, rows) in input.iter().zip(scratch.rows.chunks_exact_mut(ny * px)) {
            for (from, to) in plane.chunks_exact(nx).zip(rows.chunks_exact_mut(px)) {
                to[..nx].copy_from_slice(from);
                to[nx..].fill(zero);
            }
            self.rows[0].process_with_scratch(rows, &mut scratch.fft);
        }
        for first in (0..px).step_by(BLOCK) {
            let width = BLOCK.min(px - first);
            // columns are laid out [column][plane][ky], so that one call sees all planes of a column
            for plane in 0..planes {
                let rows = &scratch.rows[plane * ny * px..(plane + 1) * ny * px];
                for column in 0..width {
                    let at = (column * planes + plane) * py;
                    scratch.columns[at + ny..at + py].fill(zero);
                }
                for iy in 0..ny {
                    let from = &rows[iy * px + first..iy * px + first + width];
                    for (column, &value) in from.iter().enumerate() {
                        scratch.columns[(column * planes + plane) * py + iy] = value;
                    }
                }
            }
            let block = &mut scratch.columns[..width * planes * py];
            self.columns[0].process_with_scratch(block, &mut scratch.fft);
            for (column, values) in block.chunks_exact_mut(planes * py).enumerate() {
                multiply(first + column, values);
            }
            self.columns[1].process_with_scratch(block, &mut scratch.fft);
            for plane in 0..planes {
                let rows = &mut scratch.rows[plane * ny * px..(plane + 1) * ny * px];
                for iy in 0..ny {
                    let to = &mut rows[iy * px + first..iy * px + first + width];
                    for (column, value) in to.iter_mut().enumerate() {
                        *value = scratch.columns[(column * planes + plane) * py + iy];
                    }
                }
            }
        }
        for (plane, rows) in output.iter_mut().zip(scratch.rows.chunks_exact_mut(ny * px)) {
            self.rows[1].process_with_scratch(rows, &mut scratch.fft);
            for (to, from) in plane.chunks_exact_mut(nx).zip(rows.chunks_exact(px)) {
                to.copy_from_slice(&from[..nx]);
            }
        }
    }
}

impl<T: FftNum> FilterOf<T> {
    /// Transforms one row of length px in place (forward).
    pub fn transform_in_place(&self, row: &mut [Complex<T>], scratch: &mut Scratch<T>) {
        scratch.fft.resize(self.rows[0].get_inplace_scratch_len(), Complex::new(T::zero(), T::zero()));
        self.rows[0].process_with_scratch(row, &mut scratch.fft);
    }
}
