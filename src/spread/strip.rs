//! Return of a filament or a uniform strip in an endless perfect plane.
//!
//! Given h (height, m), w (width, m), x (distance from the middle, m); gives -K/I in 1/m and the share within |x| < X.
//!
//! Model: filament -K/I = (1/(pi h)) / (1 + (x/h)^2); strip: its mean over the width,
//! (1/(pi w)) [atan((x + w/2)/h) - atan((x - w/2)/h)]; share (2/(pi w)) [G(X + w/2) - G(X - w/2)],
//! G(u) = u atan(u/h) - (h/2) ln(1 + u^2/h^2).
//!
//! Source: image current; C. L. Holloway and E. F. Kuester, Closed-form expressions for the current density on the
//! ground plane of a microstrip line, IEEE T-MTT 43(5), 1995; H. W. Ott, Electromagnetic Compatibility Engineering,
//! 2009 (percentages, from memory).
//!
//! Holds when: the plane reaches many h beyond the track (2/(pi n) of the return lies outside n h), its resistance does
//! not matter (f well above Zs/(pi mu0 h)), h is short against the wavelength.
//!
//! Checked by: `strip_over_a_plane` in tests/physics.

use std::f64::consts::PI;

/// Density of the return in 1/m at `x_m`.
///
/// ```
/// // a 0.35 mm track 0.2 mm over its plane: 1.31 A/mm per A under the middle
/// let k = ebbmap::spread::strip::density(0.0, 0.35e-3, 0.2e-3);
/// assert!((k - 1307.5).abs() < 0.1, "{k}");
/// ```
pub fn density(x_m: f64, width_m: f64, height_m: f64) -> f64 {
    let (x, w) = (x_m / height_m, width_m / height_m);
    if w < 1e-6 {
        return 1.0 / (PI * height_m * (1.0 + x * x));
    }
    (libm::atan(x + w / 2.0) - libm::atan(x - w / 2.0)) / (PI * w * height_m)
}

/// Share of the return within `reach_m` on either side of the middle.
///
/// ```
/// // within three heights of a thin track: 79.5 %
/// let share = ebbmap::spread::strip::share_within(0.6e-3, 0.0, 0.2e-3);
/// assert!((share - 0.795167).abs() < 1e-6);
/// ```
pub fn share_within(reach_m: f64, width_m: f64, height_m: f64) -> f64 {
    let (x, w) = (reach_m / height_m, width_m / height_m);
    if w < 1e-6 {
        return 2.0 / PI * libm::atan(x);
    }
    let g = |u: f64| u * libm::atan(u) - 0.5 * libm::log1p(u * u);
    2.0 / (PI * w) * (g(x + w / 2.0) - g(x - w / 2.0))
}
