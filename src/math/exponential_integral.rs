//! The scaled exponential integral e^w E1(w) of a complex argument, without overflow.
//!
//! Model: power series E1 = -gamma - ln w - sum (-w)^k/(k k!) for small |w| and near the negative real axis,
//! continued fraction 1/(w + 1 - 1/(w + 3 - 4/(w + 5 - ...))) elsewhere, asymptotic sum for |w| > 45.
//! Principal branch, -pi < arg w <= pi.
//!
//! Source: Abramowitz and Stegun, Handbook of Mathematical Functions, 5.1.11, 5.1.22, 5.1.51 (from memory).
//!
//! Checked by: `resistive_sheet_in_closed_form` in tests/physics and the table below.

use num_complex::Complex64;

/// Euler's constant.
const GAMMA: f64 = 0.577_215_664_901_532_9;

/// e^w E1(w).
pub fn scaled_e1(w: Complex64) -> Complex64 {
    let size = w.norm();
    if size > 45.0 {
        let (mut term, mut sum) = (1.0 / w, Complex64::default());
        for k in 1..45 {
            sum += term;
            let next = -term * k as f64 / w;
            if next.norm() < 1e-17 * sum.norm() || next.norm() >= term.norm() {
                break;
            }
            term = next;
        }
        return sum;
    }
    if size < 3.0 || w.re < -0.9 * size {
        let (mut term, mut sum) = (Complex64::new(1.0, 0.0), -GAMMA - w.ln());
        for k in 1..400 {
            term *= -w / k as f64;
            sum -= term / k as f64;
            if term.norm() < 1e-18 * sum.norm() {
                break;
            }
        }
        return w.exp() * sum;
    }
    // Lentz's method from the front
    let (mut b, mut c) = (w + 1.0, Complex64::new(1e300, 0.0));
    let mut d = 1.0 / b;
    let mut value = d;
    for k in 1..5000 {
        let a = -(k as f64) * k as f64;
        b += 2.0;
        d = 1.0 / (a * d + b);
        c = b + a / c;
        let factor = c * d;
        value *= factor;
        if (factor - 1.0).norm() < 1e-16 {
            break;
        }
    }
    value
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn methods_agree_where_they_meet() {
        // E1(1) = 0.219383934395520 (Abramowitz and Stegun, table 5.1, from memory)
        let one = scaled_e1(Complex64::new(1.0, 0.0)).re / std::f64::consts::E;
        assert!((one - 0.219_383_934_395_520_27).abs() < 1e-15, "{one}");
        // the derivative of e^w E1(w) is itself - 1/w: check it across every border between methods
        for angle in 0..64 {
            let turn = Complex64::from_polar(1.0, std::f64::consts::PI * angle as f64 / 64.0);
            for size in [0.5, 2.999, 3.001, 10.0, 20.0, 44.99, 45.01, 100.0] {
                let w = turn * size;
                let step = turn * (1e-3 * size.min(3.0));
                let (a, b) = (scaled_e1(w - step), scaled_e1(w + step));
                let (a2, b2) = (scaled_e1(w - 2.0 * step), scaled_e1(w + 2.0 * step));
                let slope = (8.0 * (b - a) - (b2 - a2)) / (12.0 * step);
                let exact = scaled_e1(w) - 1.0 / w;
                assert!(
                    (slope - exact).norm() < 1e-8 * scaled_e1(w).norm(),
                    "w {w}: {slope} against {exact}"
                );
            }
        }
    }
}
