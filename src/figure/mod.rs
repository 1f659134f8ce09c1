//! The figures of a map: the numbers a reviewer reads beside the picture, each with its formula and its error.

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
    /// Share of the return within 3h of the track, length-weighted mean over the stations (0 to 1).
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
    /// Loop inductance in henry.
    pub loop_inductance_h: Option<Figure>,
}
