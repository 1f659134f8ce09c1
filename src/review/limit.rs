//! What a path may add to its return without voids before it is a finding, and findings that the user bears.

use super::Marks;

/// Limits of one path, or of all: a figure above its limit fails, one above [`Limits::warn_at`] of it warns. All act
/// on the excess over the same path without voids or on noise, never on an absolute share.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Limits {
    /// Extra loop inductance caused by voids, or by a return that has no via near a layer change, in henry.
    pub extra_inductance_h: f64,
    /// Extra path of the return caused by voids, in metres.
    pub extra_path_m: f64,
    /// Drop of the share within 3h at the worst place, against the same place without voids (0 to 1).
    pub share_drop: f64,
    /// Density at the edge of the plane, mean within h of it, in units of 1/(pi h).
    pub edge_density: f64,
    /// Share of the return over a partition boundary, more than without voids (0 to 1).
    pub stray: f64,
    /// Part of a limit from which on a figure warns.
    pub warn_at: f64,
}

impl Default for Limits {
    /// Common practice where a review says nothing: 1 nH is about what a via adds, which a careful layout spends on
    /// purpose only; a return 2h inside a plane's edge shows there with about half of 1/(pi h).
    fn default() -> Self {
        Self {
            extra_inductance_h: 1e-9,
            extra_path_m: 5e-3,
            share_drop: 0.5,
            edge_density: 0.5,
            stray: 0.1,
            warn_at: 0.5,
        }
    }
}

/// One `[[limits.path]]`: limits that differ for some paths.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct PathLimits {
    /// Name or pattern with `*` of the paths.
    pub name: String,
    /// The limits, those of all paths where the entry gives none.
    pub limits: Limits,
    /// Line of the entry in the review, from 1.
    pub line: u32,
}

/// `[limits]` with its exceptions.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct LimitRequest {
    /// For all paths.
    pub all: Limits,
    /// Exceptions in the order of the file; the last that matches counts.
    pub paths: Vec<PathLimits>,
}

/// One `[[waiver]]`: findings that are known and borne.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Waiver {
    /// Code of the findings.
    pub code: String,
    /// Name or pattern with `*` of their paths.
    pub path: String,
    /// Why they are borne.
    pub reason: String,
    /// Revision of the board with which the waiver ends.
    pub expires: String,
    /// Line of the entry in the review, from 1.
    pub line: u32,
    /// Where its keys stand in the file.
    pub marks: Marks,
}
