//! Gauss-Legendre and Gauss-Chebyshev nodes and weights on the interval from -1 to 1.
//!
//! Model: Legendre nodes are the roots of P_n, found by Newton's method from the usual cosine estimate; Chebyshev
//! nodes are cos((2 i - 1) pi / 2 n) with equal weights, exact for polynomials times 1/sqrt(1 - x^2).
//!
//! Source: Abramowitz and Stegun, Handbook of Mathematical Functions, 25.4.29 and 25.4.38 (from memory; the nodes
//! are checked by integrating polynomials exactly).

use std::f64::consts::PI;

/// `count` Legendre nodes and weights on [-1, 1]; the weights sum to 2.
pub fn legendre(count: usize) -> Vec<(f64, f64)> {
    let n = count as f64;
    let mut nodes: Vec<(f64, f64)> = (0..count)
        .map(|i| {
            let mut x = libm::cos(PI * (i as f64 + 0.75) / (n + 0.5));
            let mut slope = 1.0;
            for _ in 0..20 {
                let (value, derivative) = legendre_polynomial(count, x);
                slope = derivative;
                let step = value / derivative;
                x -= step;
                if step.abs() < 1e-16 {
                    break;
                }
            }
            (x, 2.0 / ((1.0 - x * x) * slope * slope))
        })
        .collect();
    nodes.reverse();
    nodes
}

/// Value and derivative of the Legendre polynomial of degree `degree` at `x`.
fn legendre_polynomial(degree: usize, x: f64) -> (f64, f64) {
    let (mut before, mut here) = (1.0, x);
    if degree == 0 {
        return (1.0, 0.0);
    }
    for k in 2..=degree {
        let k = k as f64;
        (before, here) = (here, ((2.0 * k - 1.0) * x * here - (k - 1.0) * before) / k);
    }
    (here, degree as f64 * (x * here - before) / (x * x - 1.0))
}

/// `count` Chebyshev nodes on [-1, 1] in rising order with equal weights that sum to 1: the quadrature of a
/// density (1/pi)/sqrt(1 - x^2).
pub fn chebyshev(count: usize) -> Vec<(f64, f64)> {
    let n = count as f64;
    (0..count).rev().map(|i| (libm::cos(PI * (i as f64 + 0.5) / n), 1.0 / n)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nodes_integrate_polynomials_exactly() {
        for n in 1..24 {
            for degree in 0..2 * n {
                let exact = if degree % 2 == 0 { 2.0 / (degree as f64 + 1.0) } else { 0.0 };
                let sum: f64 = legendre(n).iter().map(|(x, w)| w * x.powi(degree as i32)).sum();
                assert!((sum - exact).abs() < 2e-14, "n {n} degree {degree}: {sum} against {exact}");
            }
            // mean of x^2 under the edge-crowded density is 1/2, of x^4 3/8
            if n >= 3 {
                let second: f64 = chebyshev(n).iter().map(|(x, w)| w * x * x).sum();
                let fourth: f64 = chebyshev(n).iter().map(|(x, w)| w * x.powi(4)).sum();
                assert!((second - 0.5).abs() < 1e-14 && (fourth - 0.375).abs() < 1e-14);
            }
        }
    }
}
