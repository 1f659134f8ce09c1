//! Fourier lines of a periodic trapezoid with unequal edges.
//!
//! Given a pulse of unit height, gives the complex Fourier coefficient of its line n: f(t) = sum_n c_n exp(j 2 pi n t/T).
//!
//! Model: the pulse starts to rise at t = 0, rises within r T, is d T long at half height, falls within q T:
//! c_n = -j/(2 pi n) exp(-j pi n (d + r)) [S(pi n r) exp(j pi n d) - S(pi n q) exp(-j pi n d)], S(u) = sin(u)/u,
//! c_0 = d. The rms value of the line at n/T is sqrt(2) |c_n|, that at 0 Hz |c_0|.
//!
//! Source: C. Paul, Introduction to Electromagnetic Compatibility, 2006, section 3.1 (from memory); checked against
//! direct integration of the pulse.
//!
//! Checked by: `trapezoid_lines_match_published_values`, `trapezoid_lines_match_direct_integration`.

use crate::review::drive::Pulse;
use num_complex::Complex64;
use std::f64::consts::PI;

/// sin(pi x), exactly 0 at whole numbers and accurate for large x.
pub fn sin_pi(x: f64) -> f64 {
    let y = x - 2.0 * libm::round(0.5 * x);
    let y = if y.abs() > 0.5 { y.signum() - y } else { y };
    libm::sin(PI * y)
}

/// cos(pi x), exactly 0 at odd halves.
pub fn cos_pi(x: f64) -> f64 {
    let y = (x - 2.0 * libm::round(0.5 * x)).abs();
    sin_pi(0.5 - y)
}

/// sin(pi x)/(pi x).
pub fn sinc(x: f64) -> f64 {
    if x.abs() < 1e-9 { 1.0 } else { sin_pi(x) / (PI * x) }
}

/// Coefficient c_n of `pulse` at unit height, n >= 0.
pub fn coefficient(pulse: &Pulse, n: u64) -> Complex64 {
    if n == 0 {
        return Complex64::new(pulse.duty, 0.0);
    }
    let n = n as f64;
    let (rise_s, fall_s) = pulse.whole_edges_s();
    let (rise, fall) = (rise_s * pulse.frequency_hz, fall_s * pulse.frequency_hz);
    let (edge_up, edge_down) = (sinc(n * rise), sinc(n * fall));
    let (sin, cos) = (sin_pi(n * pulse.duty), cos_pi(n * pulse.duty));
    let bracket = Complex64::new((edge_up - edge_down) * cos, (edge_up + edge_down) * sin);
    let turn = n * (pulse.duty + rise);
    let shift = Complex64::new(cos_pi(turn), -sin_pi(turn));
    Complex64::new(0.0, -0.5 / (PI * n)) * shift * bracket
}
