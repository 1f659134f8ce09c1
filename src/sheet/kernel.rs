//! The band-limited magnetic kernel of branch currents, in real space and as spectra for the Fourier filters.
//!
//! Given the cell d, the distance z of two sheets and the size of the grid, gives the mutual inductance L(i, j) in H
//! of two parallel branches i, j cells apart, and symbols for preconditioning.
//!
//! Model: the EMF round a mesh is the flux of B_z through a d x d square, so that on branch currents the kernel has the
//! symbol, k in radians per cell,
//!   L^(k) = (mu0 d / 2 |k|) S(k) e^{-|k| z/d},  S = |k|^2 sinc(kx/2) sinc(ky/2) / kh^2,
//!   kh^2 = 4 sin^2(kx/2) + 4 sin^2(ky/2),  |kx|, |ky| <= pi,
//! exact for every current that the grid can carry. Real space: the smooth part c1/sqrt(r^2 + Z1^2) +
//! c2/sqrt(r^2 + Z2^2), whose transform vanishes at the rim of the band and agrees with that of L at k = 0 up to
//! second order in k, is taken off and added in closed form; the rest decays fast and is summed on a periodic grid of
//! at least four times the board. So the far field is mu0/(4 pi r) without any constant.
//!
//! Source: flux form of the partial-element method (Ruehli, IBM J. Res. Dev. 16, 1972; Heeb and Ruehli, IEEE T-CAS 39,
//! 1992, from memory) with sinc interpolation; derived here and checked against the closed form of square patches.
//!
//! Holds when: currents vary slowly over a cell; fields of point-like sources (landings) are band-limited.
//!
//! Checked by: `kernel_far_field_and_convergence` and `band_and_patch_kernels_approach` in tests/physics.

use crate::math::filter::{Filter, Scratch, smooth_size};
use crate::unit::constants::MU0;
use num_complex::Complex64;
use std::f64::consts::PI;

/// sin(u)/u.
fn sinc(u: f64) -> f64 {
    if u.abs() < 1e-8 { 1.0 } else { libm::sin(u) / u }
}

/// Wave numbers in radians per cell of index `m` on a torus of `size` cells, for 0 <= m <= size/2, with sinc(k/2)
/// and 4 sin^2(k/2).
fn axis(size: usize) -> Vec<(f64, f64, f64)> {
    (0..=size / 2)
        .map(|m| {
            let k = 2.0 * PI * m as f64 / size as f64;
            let sine = libm::sin(k / 2.0);
            (k, sinc(k / 2.0), 4.0 * sine * sine)
        })
        .collect()
}

/// The kernel for all offsets 0 <= i < nx, 0 <= j < ny (index j * nx + i) in units of mu0 d / 4 pi; `z` in cells.
pub fn offsets(nx: usize, ny: usize, z: f64) -> Vec<f64> {
    // the reference must vanish at the rim of the band: e^{-12 pi} = 4e-17
    let (near, far) = (12.0 + z, 24.0 + 2.0 * z);
    let c_near = (far * far - z * z) / (far * far - near * near);
    let c_far = 1.0 - c_near;
    let size = |n: usize| smooth_size((4 * n).max(1024));
    let (mx, my) = (size(nx), size(ny));
    let (kx, ky) = (axis(mx), axis(my));
    // 2 pi / |k| (S e^{-kz} - c1 e^{-k Z1} - c2 e^{-k Z2}), 2 pi being the transform of 1/r
    let rest = |a: usize, b: usize| {
        let ((kx, sx, hx), (ky, sy, hy)) = (kx[a], ky[b]);
        let k = libm::sqrt(kx * kx + ky * ky);
        if k == 0.0 {
            return 2.0 * PI * (c_near * near + c_far * far - z);
        }
        let band = k * k * sx * sy / (hx + hy) * if z > 0.0 { libm::exp(-k * z) } else { 1.0 };
        let smooth =
            if k * near < 40.0 { c_near * libm::exp(-k * near) + c_far * libm::exp(-k * far) } else { 0.0 };
        2.0 * PI / k * (band - smooth)
    };
    // the spectrum is even in kx and ky: transform rows of kx for each ky >= 0, two rows as one complex row
    let transform = |size: usize| Filter::new(size, 1, size, 1);
    let (row, column) = (transform(mx), transform(my));
    let mut scratch = Scratch::default();
    let rows = my / 2 + 1;
    let mut half = vec![0.0; rows * nx];
    let mut buffer = vec![Complex64::default(); mx];
    for pair in 0..rows.div_ceil(2) {
        let (one, two) = (2 * pair, (2 * pair + 1).min(rows - 1));
        for a in 0..=mx / 2 {
            buffer[a] = Complex64::new(rest(a, one), rest(a, two));
            buffer[(mx - a) % mx] = buffer[a];
        }
        row.transform_in_place(&mut buffer, &mut scratch);
        for i in 0..nx {
            half[one * nx + i] = buffer[i].re;
            half[two * nx + i] = buffer[i].im;
        }
    }
    let mut kernel = vec![0.0; nx * ny];
    let mut buffer = vec![Complex64::default(); my];
    for pair in 0..nx.div_ceil(2) {
        let (one, two) = (2 * pair, (2 * pair + 1).min(nx - 1));
        for b in 0..rows {
            buffer[b] = Complex64::new(half[b * nx + one], half[b * nx + two]);
            buffer[(my - b) % my] = buffer[b];
        }
        column.transform_in_place(&mut buffer, &mut scratch);
        for j in 0..ny {
            kernel[j * nx + one] = buffer[j].re;
            kernel[j * nx + two] = buffer[j].im;
        }
    }
    let scale = 1.0 / (mx as f64 * my as f64);
    for j in 0..ny {
        for i in 0..nx {
            let square = (i * i + j * j) as f64;
            let smooth = c_near / libm::sqrt(square + near * near) + c_far / libm::sqrt(square + far * far);
            let value = &mut kernel[j * nx + i];
            *value = *value * scale + smooth;
        }
    }
    kernel
}

/// Quarter of the real spectrum of `kernel` (from [`offsets`]) on the torus of `filter`, in H and divided by the
/// number of points, index kx * (py/2 + 1) + ky.
pub fn spectrum(kernel: &[f64], nx: usize, ny: usize, cell_m: f64, filter: &Filter) -> Vec<f64> {
    let (px, py) = filter.size();
    let scale = MU0 * cell_m / (4.0 * PI) / (px as f64 * py as f64);
    let (hx, hy) = (px / 2 + 1, py / 2 + 1);
    let (row, column) = (Filter::new(px, 1, px, 1), Filter::new(py, 1, py, 1));
    let mut scratch = Scratch::default();
    let mut half = vec![0.0; ny * hx];
    let mut buffer = vec![Complex64::default(); px];
    for pair in 0..ny.div_ceil(2) {
        let (one, two) = (2 * pair, (2 * pair + 1).min(ny - 1));
        buffer.fill(Complex64::default());
        for i in 0..nx {
            buffer[i] = Complex64::new(kernel[one * nx + i], kernel[two * nx + i]);
            buffer[(px - i) % px] = buffer[i];
        }
        row.transform_in_place(&mut buffer, &mut scratch);
        for a in 0..hx {
            half[one * hx + a] = buffer[a].re;
            half[two * hx + a] = buffer[a].im;
        }
    }
    let mut quarter = vec![0.0; hx * hy];
    let mut buffer = vec![Complex64::default(); py];
    for pair in 0..hx.div_ceil(2) {
        let (one, two) = (2 * pair, (2 * pair + 1).min(hx - 1));
        buffer.fill(Complex64::default());
        for j in 0..ny {
            buffer[j] = Complex64::new(half[j * hx + one], half[j * hx + two]);
            buffer[(py - j) % py] = buffer[j];
        }
        column.transform_in_place(&mut buffer, &mut scratch);
        for b in 0..hy {
            quarter[one * hy + b] = buffer[b].re * scale;
            quarter[two * hy + b] = buffer[b].im * scale;
        }
    }
    quarter
}

/// Quarter of the symbol L^(k) in H on the torus of `filter` (index as in [`spectrum`], not divided by anything),
/// with the value of the smallest wave number at k = 0.
pub fn symbol(cell_m: f64, z_m: f64, filter: &Filter) -> Vec<f64> {
    let (px, py) = filter.size();
    let (kx, ky) = (axis(px), axis(py));
    let lowest = 2.0 * PI / px.max(py) as f64;
    let mut quarter = Vec::with_capacity(kx.len() * ky.len());
    for &(kx, sx, hx) in &kx {
        for &(ky, sy, hy) in &ky {
            let k = libm::sqrt(kx * kx + ky * ky);
            let shape = if k == 0.0 { 1.0 / lowest } else { k * sx * sy / (hx + hy) };
            quarter.push(MU0 * cell_m / 2.0 * shape * libm::exp(-k.max(lowest) * z_m / cell_m));
        }
    }
    quarter
}
