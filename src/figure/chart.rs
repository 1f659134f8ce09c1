//! A chart from the plan to maps and figures: what a run calls for each net and plane.

use super::Figures;
use super::compute::{Maps, Track, figures};
use crate::diag::Diagnostic;
use crate::field::{Progress, ReturnMap, Solved, Workshop};
use crate::plan::{ChartPlan, PathPlan};
use crate::review::Band;

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
    /// Its figures.
    pub figures: Figures,
}

/// Maps and figures of one net on one plane.
#[derive(Clone, Debug)]
pub struct ChartResult {
    /// One entry for each frequency of each band, in their order: a map, or why there is none.
    pub maps: Vec<Result<Charted, Diagnostic>>,
    /// What was assumed on the way.
    pub notes: Vec<Diagnostic>,
}

/// Solves `chart` of `net` at all frequencies of `bands`. Calls `progress` after each frequency.
pub fn chart(
    workshop: &Workshop,
    net: &PathPlan,
    chart: &ChartPlan,
    bands: &[Band],
    progress: &(dyn Fn(Progress) + Sync),
) -> ChartResult {
    let total = bands.iter().map(|band| band.at_hz.len()).sum();
    let asked = bands.iter().flat_map(|band| band.at_hz.iter().map(move |&hertz| (band, hertz)));
    let bench = match workshop.bench(net, chart) {
        Ok(bench) => bench,
        Err(reason) => {
            return ChartResult { maps: asked.map(|_| Err(reason.clone())).collect(), notes: Vec::new() };
        }
    };
    let legs = &net.track[chart.legs.clone()];
    let landings = [chart.driver_landing.at, chart.receiver_landing.at];
    let mut maps = Vec::with_capacity(total);
    for (band, hertz) in asked {
        let solved = bench.solve(band, hertz);
        maps.push(solved.map(|solved| {
            let track = Track { legs, landings: &landings, height_m: chart.height_m };
            charted(solved, band, hertz, &track)
        }));
        progress(Progress { net: &net.name, band: &band.name, done: maps.len(), total });
    }
    ChartResult { maps, notes: bench.notes }
}

fn charted(solved: Solved, band: &Band, frequency_hz: f64, track: &Track) -> Charted {
    let maps = Maps {
        map: &solved.map,
        without_voids: Some(&solved.without_voids),
        coarse: solved.coarse.as_ref().map(|(map, filled)| (map, Some(filled))),
    };
    let figures = figures(&maps, track);
    Charted {
        band: band.name.clone(),
        frequency_hz,
        map: solved.map,
        without_voids: solved.without_voids,
        figures,
    }
}
