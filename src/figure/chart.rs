//! A path from the plan to maps and figures: what a run calls for each path and frequency.

use super::Figures;
use super::compute::{Maps, Track, figures};
use super::effect::{self, Effects};
use crate::diag::Diagnostic;
use crate::diag::code::field as code;
use crate::field::{Bench, JointCurrent, PlaneMaps, ReturnMap, Solved};
use crate::plan::{ChartPlan, PathPlan};
use crate::review::{Band, Zone};

/// A solved map with its figures.
#[derive(Clone, Debug)]
pub struct Charted {
    /// Name of the band.
    pub band: String,
    /// Frequency in Hz.
    pub frequency_hz: f64,
    /// The map.
    pub map: ReturnMap,
    /// The same with all voids filled.
    pub without_voids: ReturnMap,
    /// Its figures; those that need a stretch of the track over the plane have no value where there is none.
    pub figures: Figures,
    /// What voids, edges and boundaries do to its return.
    pub effects: Effects,
}

/// Maps and figures of one path at one frequency.
#[derive(Clone, Debug)]
pub struct ChartedPath {
    /// One entry for each chart of the bench, in its order: a map, or why there is none.
    pub planes: Vec<Result<Charted, Diagnostic>>,
    /// What joints carry.
    pub joints: Vec<JointCurrent>,
}

/// Solves `path`, which is on `bench`, in a band: over all lines of the path's drive there, or for 1 A at
/// `frequency_hz` where it has no drive or the band has frequencies of its own.
pub fn chart_band(
    bench: &Bench,
    path: &PathPlan,
    band: (usize, &Band),
    frequency_hz: f64,
    zones: &[Zone],
) -> ChartedPath {
    let Some(spectrum) = path.signal.spectrum(band) else {
        return chart_in_zones(bench, path, band.1, frequency_hz, zones);
    };
    match bench.solve_band(band.1, spectrum, path.signal.is_absolute) {
        Some(solved) => of_path(solved, bench, path, (band.1, frequency_hz), zones),
        None => {
            let text = format!(
                "no line of the drive of `{}` ({}) lies in band `{}`",
                path.name, path.signal.drive, band.1.name
            );
            let silent = Diagnostic::note(code::BAND_SILENT, text);
            let planes =
                bench.charts().iter().map(|chart| Err(chart.withheld.clone().unwrap_or(silent.clone())));
            ChartedPath { planes: planes.collect(), joints: Vec::new() }
        }
    }
}

/// Solves `path`, which is on `bench`, for 1 A at one frequency of a band.
pub fn chart(bench: &Bench, path: &PathPlan, band: &Band, frequency_hz: f64) -> ChartedPath {
    chart_in_zones(bench, path, band, frequency_hz, &[])
}

/// The same on a board with zones, over whose boundaries the return may stray.
pub fn chart_in_zones(
    bench: &Bench,
    path: &PathPlan,
    band: &Band,
    frequency_hz: f64,
    zones: &[Zone],
) -> ChartedPath {
    of_path(bench.solve(band, frequency_hz), bench, path, (band, frequency_hz), zones)
}

fn of_path(
    solved: Solved,
    bench: &Bench,
    path: &PathPlan,
    (band, frequency_hz): (&Band, f64),
    zones: &[Zone],
) -> ChartedPath {
    let planes = solved.planes.into_iter().zip(bench.charts());
    let planes = planes.map(|(maps, chart)| Ok(charted(maps?, path, chart, band, frequency_hz, zones)));
    ChartedPath { planes: planes.collect(), joints: solved.joints }
}

fn charted(
    solved: PlaneMaps,
    path: &PathPlan,
    chart: &ChartPlan,
    band: &Band,
    frequency_hz: f64,
    zones: &[Zone],
) -> Charted {
    let landings = [&chart.driver_landing, &chart.receiver_landing];
    let landings: Vec<_> = landings.into_iter().filter(|l| l.radius_m > 0.0).map(|l| l.at).collect();
    let track =
        Track { legs: &path.track[chart.legs.clone()], landings: &landings, height_m: chart.height_m };
    let maps = Maps {
        map: &solved.map,
        without_voids: Some(&solved.without_voids),
        coarse: solved.coarse.as_ref().map(|(map, filled)| (map, Some(filled))),
        left_out: solved.left_out,
    };
    let figures = figures(&maps, &track);
    let effects = effect::of(&maps, &track, &chart.voids, zones, solved.void_parts.as_deref());
    Charted {
        band: band.name.clone(),
        frequency_hz,
        map: solved.map,
        without_voids: solved.without_voids,
        figures,
        effects,
    }
}
