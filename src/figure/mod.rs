//! The figures of a map: the numbers a reviewer reads beside the picture, each with its formula and its error.
//!
//! | symbol | meaning | unit |
//! |---|---|---|
//! | K, K0 | density of the plane's current per ampere of net current, with voids and with all voids filled | A/m per A |
//! | F_X(s) = -Re int K t dx over abs(x) <= X | share of the return within X of the track at station s ([`section`]) | 1 |
//! | share within 3h = mean of F_3h(s) | over the regular stations ([`station`]), weighted by length | 1 |
//! | half-width of p = smallest X whose mean F_X >= p | none where the plane ends before | m |
//! | level of p | int abs(K) dA over the cells above the level is p of that over all cells ([`level`]) | A/m per A |
//! | extra path = int (abs(Re K) - abs(Re K0)) dA | how much longer voids make the return | m |
//! | extra loop R, L = R(Z) - R(Z0), L(Z) - L(Z0) | Z = R + j w L, loop of track and plane | ohm, H |
//!
//! Effects of voids, edges and zone boundaries, on which findings rest, are in [`effect`].
//!
//! The error of a figure is its change from cells of 2d to cells of d, times the halvings of the cell that the
//! resistance still needs, and at least the bound in [`compute::LEAST_ERROR`].

pub mod chart;
pub mod compute;
pub mod edge;
pub mod effect;
pub mod level;
pub mod outline;
pub mod section;
pub mod station;
pub mod stray;
pub mod void;

pub use chart::{Charted, ChartedPath, chart, chart_band, chart_in_zones};
pub use effect::{Effects, Placed, away_m, own_voids};
pub use stray::Stray;
pub use void::{VoidEffect, VoidEnd};

use crate::geom::Point;

/// A figure with the same figure without voids and its numerical error.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Figure {
    /// Value; none when it does not exist, for example a half-width beyond the plane.
    pub value: Option<f64>,
    /// The same on the plane with all voids filled.
    pub without_voids: Option<f64>,
    /// Numerical error, absolute, in the unit of the value.
    pub error: f64,
}

/// The figures of one map.
#[derive(Clone, Debug)]
pub struct Figures {
    /// Share of the return within 3h of the track, length-weighted mean over the stations (0 to 1); no value for a
    /// track without a straight stretch longer than 10h.
    pub share_3h: Figure,
    /// The smallest such share at a station and its place.
    pub worst_share_3h: Option<(f64, Point)>,
    /// Half-widths in metres that hold 50, 80 and 95 % of the return.
    pub half_width_m: [Figure; 3],
    /// Densities in A/m per A whose contours enclose 50, 80 and 95 % of the integral of |K|.
    pub contour_levels: [f64; 3],
    /// Extra path caused by voids in metres, see `decisions` in DEVELOPERS.md.
    pub extra_path_m: Option<Figure>,
    /// Loop resistance in ohm.
    pub loop_resistance_ohm: Option<Figure>,
    /// Loop inductance in henry; none at DC.
    pub loop_inductance_h: Option<Figure>,
    /// Loop resistance with voids less that without, in ohm.
    pub extra_loop_resistance_ohm: Option<Figure>,
    /// Loop inductance with voids less that without, in henry; none at DC.
    pub extra_loop_inductance_h: Option<Figure>,
}
