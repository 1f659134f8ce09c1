//! An endless strip plane under endless filaments: a one-dimensional integral equation, solved densely.
//!
//! Zs K(x) - j w (mu0/2 pi) [int K(x') ln|x - x'| dx' + sum_n I_n ln r_n] = E, int K dx = -I: constant pieces,
//! collocation in their middles, graded towards the edges and the filament; the integral of the logarithm is exact.
use faer::Mat;
use faer::prelude::Solve;
use num_complex::Complex64;
use std::f64::consts::PI;

const MU0: f64 = 4e-7 * PI;

/// Return -K/I in 1/m, averaged over the given intervals.
pub fn density(
    half_width_m: f64,
    filaments: &[(f64, f64, f64)],
    zs: Complex64,
    frequency_hz: f64,
    intervals: &[(f64, f64)],
) -> Vec<Complex64> {
    // pieces: equal in the variable of x = a sin(t) near the edges, refined round the filament at x0
    let x0 = filaments.iter().map(|f| f.0).sum::<f64>() / filaments.len() as f64;
    let h = filaments[0].1;
    let mut cuts = vec![-half_width_m];
    let mut x = -half_width_m;
    while x < half_width_m {
        let to_edge = half_width_m - x.abs();
        let step = (0.03 * h + 0.025 * (x - x0).abs())
            .min(0.01 * half_width_m + 0.1 * to_edge)
            .min(0.02 * half_width_m);
        let step = step.min((0.08 * to_edge).max(2e-4 * half_width_m));
        x += step;
        if half_width_m - x < 1.5e-4 * half_width_m {
            x = half_width_m;
        }
        cuts.push(x);
    }
    let n = cuts.len() - 1;
    let middle = |i: usize| 0.5 * (cuts[i] + cuts[i + 1]);
    let log = |u: f64| if u == 0.0 { 0.0 } else { u * u.abs().ln() - u };
    let factor = Complex64::new(0.0, frequency_hz * MU0);
    let matrix = Mat::<Complex64>::from_fn(n + 1, n + 1, |i, j| match (i, j) {
        (i, j) if i < n && j < n => {
            let integral = log(cuts[j + 1] - middle(i)) - log(cuts[j] - middle(i));
            -factor * integral + if i == j { zs } else { Complex64::default() }
        }
        (i, _) if i < n => Complex64::new(-1.0, 0.0),
        (_, j) if j < n => Complex64::new((cuts[j + 1] - cuts[j]) * 1e-3, 0.0),
        _ => Complex64::default(),
    });
    let rhs = Mat::<Complex64>::from_fn(n + 1, 1, |i, _| {
        if i == n {
            return Complex64::new(-1e-3 * filaments.iter().map(|f| f.2).sum::<f64>(), 0.0);
        }
        factor * filaments.iter().map(|&(x0, h, part)| part * (middle(i) - x0).hypot(h).ln()).sum::<f64>()
    });
    let solution = matrix.partial_piv_lu().solve(&rhs);
    intervals
        .iter()
        .map(|&(from, to)| {
            let over = |i: usize| (cuts[i + 1].min(to) - cuts[i].max(from)).max(0.0);
            -(0..n).map(|i| solution[(i, 0)] * over(i)).sum::<Complex64>() / (to - from)
        })
        .collect()
}

#[test]
fn integral_equation_meets_the_closed_forms() {
    // perfect strip: conformal map; wide resistive strip: endless sheet
    let h = 0.3e-3;
    let cells: Vec<(f64, f64)> = (-8..8).map(|i| (0.1e-3 * i as f64, 0.1e-3 * (i + 1) as f64)).collect();
    let got = density(2.5 * h, &[(0.5 * h, h, 1.0)], Complex64::new(1e-9, 0.0), 1e9, &cells[1..15]);
    for (k, &(from, to)) in got.iter().zip(&cells[1..15]) {
        let mean = (0..50)
            .map(|i| {
                ebbmap::spread::edge::strip_density(
                    from + (to - from) * (i as f64 + 0.5) / 50.0,
                    0.5 * h,
                    h,
                    2.5 * h,
                )
            })
            .sum::<f64>()
            / 50.0;
        crate::support::close(&format!("perfect strip at {from}"), k.re, mean, 3e-3);
    }
    let zs = Complex64::new(0.5e-3, 0.0);
    let got = density(1000.0 * h, &[(0.0, h, 1.0)], zs, 1e6, &cells);
    let lambda = ebbmap::spread::resistive::lambda(1e6, zs);
    for (k, &(from, to)) in got.iter().zip(&cells) {
        let exact = ebbmap::spread::resistive::cell_mean(0.5 * (from + to), to - from, h, lambda);
        crate::support::close_complex(&format!("wide strip at {from}"), *k, exact.re, exact.im, 3e-3);
    }
}
