//! Return of a filament or a uniform strip between two endless perfect planes that are bonded at their ends.
//!
//! Given the distances h1, h2 (m) to the planes, b = h1 + h2; gives -K/I of the plane at h1 in 1/m and shares.
//!
//! Model: -K1/I = (1/2b) sin(pi h1/b) / (cosh(pi x/b) - cos(pi h1/b)), share of plane 1 = h2/b, within |x| < X
//! (2/pi) atan[cot(pi h1/2b) tanh(pi X/2b)]; strip: mean over the width. Exchange h1 and h2 for the other plane.
//!
//! Source: sum of the image series (S. B. Cohn 1954 for strips, Ott 2009, from memory), checked by quadrature.
//!
//! Holds when: both planes share one potential gradient; a plane that is not bonded carries no net current.
//!
//! Checked by: `stripline_between_planes` in tests/physics.

use std::f64::consts::PI;

/// Density on the plane at `near_m` in 1/m; `far_m` is the distance to the other plane.
pub fn density(x_m: f64, near_m: f64, far_m: f64) -> f64 {
    let b = near_m + far_m;
    let angle = PI * near_m / b;
    // cosh - cos without cancellation
    let (sinh, sin) = (libm::sinh(PI * x_m / (2.0 * b)), libm::sin(angle / 2.0));
    libm::sin(angle) / (4.0 * b * (sinh * sinh + sin * sin))
}

/// Share of the whole return on the plane at `near_m` within `reach_m` on either side.
pub fn share_within(reach_m: f64, near_m: f64, far_m: f64) -> f64 {
    let b = near_m + far_m;
    2.0 / PI * libm::atan(libm::tanh(PI * reach_m / (2.0 * b)) / libm::tan(PI * near_m / (2.0 * b)))
}

/// Density in 1/m under a uniform strip of `width_m`.
pub fn strip_density(x_m: f64, width_m: f64, near_m: f64, far_m: f64) -> f64 {
    let half = width_m / 2.0;
    (share_within(x_m + half, near_m, far_m) - share_within(x_m - half, near_m, far_m)) / (2.0 * width_m)
}

/// Share of the plane at `near_m`.
pub fn share(near_m: f64, far_m: f64) -> f64 {
    far_m / (near_m + far_m)
}
