//! Physical constants in SI units.
//!
//! Source: CODATA 2018 for the speed of light and the electric constant. The magnetic constant is taken as
//! 4 pi 1e-7 H/m, as all published formulas used here do; the 2018 value differs by 5e-10 relative.

/// Magnetic constant in H/m.
pub const MU0: f64 = 4e-7 * std::f64::consts::PI;
/// Speed of light in vacuum in m/s (exact).
pub const C0: f64 = 299_792_458.0;
/// Electric constant in F/m, consistent with [`MU0`] and [`C0`].
pub const EPS0: f64 = 1.0 / (MU0 * C0 * C0);
/// Conductivity of annealed copper at 20 degC in S/m (100 % IACS, IEC 60028).
pub const COPPER_SIGMA_20C: f64 = 58.0e6;
/// Temperature coefficient of copper's resistivity at 20 degC in 1/K (IEC 60028).
pub const COPPER_ALPHA_20C: f64 = 0.00393;
