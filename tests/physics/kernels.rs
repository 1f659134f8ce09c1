//! The band-limited kernel: far field, convergence to the closed form of patches, and the operator by FFT.
use crate::patches::patch;
use crate::support::close;
use ebbmap::math::filter::{Filter, Scratch};
use ebbmap::sheet::kernel;
use num_complex::Complex64;
use std::f64::consts::PI;

/// Sum over a smooth bump of current (a Gaussian of `width` cells) of kernel times current at offset (i, j).
fn smoothed(kernel: impl Fn(i64, i64) -> f64, i: i64, j: i64, width: f64) -> f64 {
    let reach = (6.0 * width) as i64;
    let mut sum = 0.0;
    for b in -reach..=reach {
        for a in -reach..=reach {
            let weight = (-((a * a + b * b) as f64) / (2.0 * width * width)).exp();
            sum += weight * kernel(i + a, j + b) / (2.0 * PI * width * width);
        }
    }
    sum
}

#[test]
fn kernel_far_field_and_convergence() {
    // far away the kernel must be that of a point: no constant, no periodic images
    let n = 200;
    for z in [0.0, 1.0, 3.7] {
        let table = kernel::offsets(n, n, z);
        let at = |i: i64, j: i64| table[j.unsigned_abs() as usize * n + i.unsigned_abs() as usize];
        for (i, j) in [(150, 20), (100, 100), (20, 160)] {
            let r = ((i * i + j * j) as f64 + z * z).sqrt();
            let got = smoothed(at, i, j, 2.0);
            // a Gaussian source widens 1/r by the factor 1 + s^2/2r^2
            close(&format!("far field {i} {j} {z}"), got * r, 1.0 + 2.0 / (r * r), 2e-5);
        }
    }
}

#[test]
fn band_and_patch_kernels_approach() {
    // a smooth current of fixed size on finer and finer cells: both kernels tend to the same field, the patches with
    // errors of second order; the band-limited one resolves the bump from the start
    let exact = |width: f64| (PI / 2.0).sqrt() / width;
    let mut before = None;
    for width in [2.0, 4.0, 8.0] {
        let n = (12.0 * width) as usize + 2;
        let table = kernel::offsets(n, n, 0.0);
        let band =
            smoothed(|i, j| table[j.unsigned_abs() as usize * n + i.unsigned_abs() as usize], 0, 0, width);
        let patches = smoothed(|i, j| patch(i as f64, j as f64, 0.0), 0, 0, width);
        let gap = (band / patches - 1.0).abs();
        println!(
            "width {width}: band {:.3e}, patch {:.3e} off, gap {gap:.3e}",
            band / exact(width) - 1.0,
            patches / exact(width) - 1.0
        );
        if let Some(last) = before {
            let order = f64::log2(last / gap);
            println!("order {order:.3}");
            assert!((order - 2.0).abs() < 0.1, "order {order}");
        }
        before = Some(gap);
    }
    assert!(before.unwrap() < 3e-3);
}

#[test]
fn fast_operator_is_the_sum() {
    let (nx, ny, d) = (37, 23, 0.2e-3);
    let filter = Filter::padded(nx, ny);
    let (px, py) = filter.size();
    let tables: Vec<Vec<f64>> = [0.0, 0.8].iter().map(|&z| kernel::offsets(nx, ny, z)).collect();
    let spectra: Vec<Vec<f64>> = tables.iter().map(|t| kernel::spectrum(t, nx, ny, d, &filter)).collect();
    // two sheets of currents that repeat nowhere
    let value = |i: usize| Complex64::new((1.7 * i as f64).sin(), (0.3 * (i * i % 1009) as f64).cos());
    let input: Vec<Vec<Complex64>> =
        (0..2).map(|s| (0..nx * ny).map(|i| value(i + 5000 * s)).collect()).collect();
    let mut output = vec![vec![Complex64::default(); nx * ny]; 2];
    let from: Vec<&[Complex64]> = input.iter().map(Vec::as_slice).collect();
    let mut to: Vec<&mut [Complex64]> = output.iter_mut().map(Vec::as_mut_slice).collect();
    // scratch full of other data must not matter
    let mut scratch = Scratch::default();
    for _ in 0..2 {
        filter.apply(&from, &mut to, &mut scratch, |kx, columns| {
            let row = kx.min(px - kx) * (py / 2 + 1);
            for ky in 0..py {
                let (own, other) = (spectra[0][row + ky.min(py - ky)], spectra[1][row + ky.min(py - ky)]);
                let (a, b) = (columns[ky], columns[py + ky]);
                columns[ky] = a * own + b * other;
                columns[py + ky] = a * other + b * own;
            }
        });
    }
    let scale = 1e-7 * d;
    let mut worst: f64 = 0.0;
    for sheet in 0..2 {
        for at in (0..nx * ny).step_by(7) {
            let (ix, iy) = (at % nx, at / nx);
            let mut sum = Complex64::default();
            for source in 0..2 {
                let table = &tables[usize::from(source != sheet)];
                for from in 0..nx * ny {
                    let (dx, dy) = (ix.abs_diff(from % nx), iy.abs_diff(from / nx));
                    sum += input[source][from] * table[dy * nx + dx] * scale;
                }
            }
            worst = worst.max((sum - output[sheet][at]).norm() / scale);
        }
    }
    println!("largest difference {worst:.1e} in units of the kernel");
    assert!(worst < 1e-11);
}
