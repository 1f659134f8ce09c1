//! One path of a run: solve, draw, write, and keep what the summary needs.

use super::store::{Store, StoreFailure};
use super::watch::Watch;
use crate::board::Board;
use crate::diag::code::run as code;
use crate::diag::{Diagnostic, Severity};
use crate::draw::DensityScale;
use crate::field::{Bench, Couplings, JointCurrent, LoopCurve, PlaneId, ReturnMap};
use crate::figure::{Charted, ChartedPath, Effects, Figures, chart_band, outline};
use crate::finding::noise::{Noise, of_others};
use crate::finding::{self, Finding, Judged, MapEvidence, PlaneEvidence, Trials};
use crate::geom::{Point, Region};
use crate::plan::{ChartPlan, PathPlan, Plan};
use crate::report::{
    ContactCell, ContactRow, Findings, Outlined, Picture, Subject, Thumbnail, TicketInput, numbers,
    thumbnail, ticket,
};
use crate::review::{Band, Review};
use crate::style::Style;
use std::sync::{Mutex, PoisonError};

/// Everything that the paths of a run share.
pub struct Charting<'a, 's> {
    pub board: &'a Board,
    pub review: &'a Review,
    pub plan: &'a Plan,
    pub style: &'a Style,
    /// Hash over all inputs.
    pub input_hash: &'a str,
    /// The common scale.
    pub scale: DensityScale,
    /// Every path of the plan, made ready.
    pub benches: &'a [Bench<'a, 'a>],
    /// File stems by path, chart of its bench and frequency.
    pub stems: &'a [Vec<Vec<String>>],
    /// Transfer impedances between all paths, and the noise that they make.
    pub couplings: &'a [Couplings],
    pub noise: &'a [Noise],
    /// Whether pictures are drawn.
    pub pictures: bool,
    /// Whether arrays are written.
    pub numbers: bool,
    pub store: &'s Mutex<Option<Store>>,
    pub watch: &'a dyn Watch,
}

/// What a picture shows of a path beside a map.
struct Beside<'s> {
    joints: &'s [JointCurrent],
    findings: &'s [Finding],
}

/// A map that was drawn, or why not.
pub struct Done {
    /// Band index and frequency in Hz.
    pub band: usize,
    pub frequency_hz: f64,
    /// File stem.
    pub stem: String,
    /// The map, or the reason for none.
    pub map: Result<Drawn, Diagnostic>,
}

/// What is kept of a map that was drawn.
pub struct Drawn {
    /// The map without its cells, which would fill the memory.
    pub map: ReturnMap,
    /// Its figures.
    pub figures: Figures,
    /// What voids, edges and boundaries do.
    pub effects: Effects,
    /// The map reduced for the contact sheet; none where no pictures are drawn.
    pub thumbnail: Option<Thumbnail>,
}

/// What a path leaves for the summary.
pub struct PathDone<'a> {
    net: &'a PathPlan,
    /// What is charted, with one entry for each frequency.
    rows: Vec<(&'a ChartPlan, Vec<Done>)>,
    /// What joints carry, for each frequency.
    joints: Vec<Vec<JointCurrent>>,
    /// Its findings, numbered.
    pub findings: Vec<Finding>,
    /// For each finding the lines of the 80 % contour of its map.
    outlines: Vec<Vec<Vec<Point>>>,
    /// Of each plane the part inside the 80 % contour at the highest frequency.
    pub crowded: Vec<(PlaneId, Region)>,
    /// What was assumed on the way.
    notes: Vec<Diagnostic>,
    /// The loop against frequency.
    curve: Option<LoopCurve>,
}

impl<'a> Charting<'a, '_> {
    /// Solves a path in all bands, judges it, draws and writes its maps. An error means that a file could not be
    /// written.
    pub fn path(&self, index: usize) -> Result<PathDone<'a>, Diagnostic> {
        let (net, bench) = (&self.plan.paths[index], &self.benches[index]);
        let each = frequencies(self.plan);
        let mut solved: Vec<ChartedPath> = Vec::with_capacity(each.len());
        for &(band, hz) in &each {
            let (index, band) = (band, &self.plan.bands[band]);
            let mut charted = chart_band(bench, net, (index, band), hz, &self.review.zones);
            charted.planes.iter_mut().flatten().for_each(|plane| forget(&mut plane.without_voids));
            charted.planes.iter().for_each(|_| self.watch.mapped(&net.name, &band.name));
            solved.push(charted);
        }
        let judged = self.judge(index, &solved);
        let outlines = judged.findings.iter().map(|finding| outline(bench, &solved, finding)).collect();
        let crowded = crowded(bench, &solved);
        let mut rows: Vec<(&ChartPlan, Vec<Done>)> =
            bench.charts().iter().map(|chart| (chart, Vec::new())).collect();
        let mut joints = Vec::with_capacity(each.len());
        for (at, ((band, frequency_hz), charted)) in each.into_iter().zip(solved).enumerate() {
            let beside = Beside { joints: &charted.joints, findings: &judged.findings };
            for (row, map) in charted.planes.into_iter().enumerate() {
                let stem = &self.stems[index][row][at];
                let (plan, done) = &mut rows[row];
                let map = match map {
                    Ok(map) => self.draw((net, plan), band, map, &beside, stem, (index, row))?,
                    Err(reason) => Err(reason),
                };
                done.push(Done { band, frequency_hz, stem: stem.clone(), map });
            }
            joints.push(charted.joints);
        }
        let mut notes = bench.notes();
        notes.extend(judged.messages);
        notes.dedup();
        Ok(PathDone {
            net,
            rows,
            joints,
            findings: judged.findings,
            outlines,
            crowded,
            notes,
            curve: bench.loop_curve(),
        })
    }

    /// The findings of a path, from its maps in all bands.
    fn judge(&self, index: usize, solved: &[ChartedPath]) -> Judged {
        let (net, bench) = (&self.plan.paths[index], &self.benches[index]);
        let of_chart = |(row, chart): (usize, &'a ChartPlan)| PlaneEvidence {
            number: index + 1,
            path: net,
            chart,
            maps: solved
                .iter()
                .filter_map(|charted| charted.planes[row].as_ref().ok())
                .map(|charted| MapEvidence {
                    band: charted.band.clone(),
                    frequency_hz: charted.frequency_hz,
                    figures: charted.figures.clone(),
                    effects: charted.effects.clone(),
                })
                .collect(),
        };
        let evidence: Vec<PlaneEvidence> = bench.charts().iter().enumerate().map(of_chart).collect();
        let others = of_others(index, self.couplings, self.noise, self.plan, self.review);
        let trials = Trials {
            board: self.board,
            plan: self.plan,
            review: self.review,
            path: index,
            charts: bench.charts(),
        };
        finding::of_path(&evidence, others, &trials)
    }

    /// Draws and writes one map. The outer error is a file that cannot be written, the inner one withholds the map.
    fn draw(
        &self,
        (net, plan): (&PathPlan, &ChartPlan),
        band: usize,
        charted: Charted,
        beside: &Beside,
        stem: &str,
        at: (usize, usize),
    ) -> Result<Result<Drawn, Diagnostic>, Diagnostic> {
        let Charted { mut map, figures, effects, .. } = charted;
        if !self.pictures {
            forget(&mut map);
            return Ok(Ok(Drawn { map, figures, effects, thumbnail: None }));
        }
        let picture = match self.picture(net, plan, &self.plan.bands[band], (&map, &figures, beside), at) {
            Ok(picture) => picture,
            Err(reason) => return Ok(Err(reason)),
        };
        self.write(&format!("maps/{stem}.svg"), picture.svg.as_bytes())?;
        self.write(&format!("maps/{stem}.png"), &picture.png)?;
        if self.numbers {
            let bytes = numbers::npz(&map).map_err(|error| {
                Diagnostic::error(code::CANNOT_WRITE, format!("cannot pack the numbers of `{stem}`: {error}"))
            })?;
            self.write(&format!("numbers/{}", numbers::file_name(stem)), &bytes)?;
        }
        let (board, review, scale) = (self.board, self.review, self.scale);
        let thumbnail = thumbnail(board, review, net, plan, &map, &figures, scale, self.style);
        forget(&mut map);
        Ok(Ok(Drawn { map, figures, effects, thumbnail: Some(thumbnail) }))
    }

    fn picture(
        &self,
        net: &PathPlan,
        chart: &ChartPlan,
        band: &Band,
        (map, figures, beside): (&ReturnMap, &Figures, &Beside),
        at: (usize, usize),
    ) -> Result<Picture, Diagnostic> {
        let input = TicketInput {
            board: self.board,
            review: self.review,
            net,
            chart,
            band,
            map,
            figures,
            scale: self.scale,
            findings: Some(beside.findings),
            joints: beside.joints,
            style: self.style,
            input_hash: self.input_hash,
            sheet: self.sheet_number(at, band, map.frequency_hz),
            index: Some("../contact-sheet-1.svg"),
        };
        ticket(&input).map_err(|fault| {
            let text =
                format!("map of net `{}` in band `{}` cannot be rendered: {}", net.name, band.name, fault.0);
            Diagnostic::error(code::CANNOT_RENDER, text)
        })
    }

    /// Number of a map among all of the review, from 1, and how many there are, whatever is drawn.
    fn sheet_number(&self, at: (usize, usize), band: &Band, frequency_hz: f64) -> (usize, usize) {
        let each = frequencies(self.plan);
        let of = |(index, hz): (usize, f64)| self.plan.bands[index].name == band.name && hz == frequency_hz;
        let within = each.iter().position(|&frequency| of(frequency)).unwrap_or(0);
        let mut charts = self
            .stems
            .iter()
            .enumerate()
            .flat_map(|(net, of_net)| (0..of_net.len()).map(move |chart| (net, chart)));
        let before = charts.clone().position(|other| other == at).unwrap_or(0);
        (before * each.len() + within + 1, charts.by_ref().count() * each.len())
    }

    fn write(&self, name: &str, bytes: &[u8]) -> Result<(), Diagnostic> {
        match self.store.lock().unwrap_or_else(PoisonError::into_inner).as_mut() {
            Some(store) => store.write(name, bytes).map_err(|failure| cannot_write(&failure)),
            None => Ok(()),
        }
    }
}

impl<'a> PathDone<'a> {
    /// Whether every map was drawn, except where the drive has nothing to draw.
    pub fn is_complete(&self) -> bool {
        let is_done =
            |done: &Done| done.map.as_ref().err().is_none_or(|reason| reason.severity == Severity::Note);
        self.rows.iter().flat_map(|(_, maps)| maps).all(is_done)
    }

    /// Name of the path.
    pub fn name(&self) -> &str {
        &self.net.name
    }

    /// The findings with the contours of their maps.
    pub fn outlined(&self) -> impl Iterator<Item = Outlined<'_>> {
        let both = self.findings.iter().zip(&self.outlines);
        both.map(|(finding, lines)| Outlined { finding, lines })
    }

    /// Why maps are missing.
    pub fn withheld(&self) -> impl Iterator<Item = &Diagnostic> {
        self.rows.iter().flat_map(|(_, maps)| maps).filter_map(|done| done.map.as_ref().err())
    }

    /// File stem of the map of a finding on this path.
    pub fn stem_of(&self, finding: &Finding, plan: &Plan) -> Option<&str> {
        let (plane, band) = (finding.plane.as_ref()?, finding.band.as_ref()?);
        let row =
            self.rows.iter().find(|(chart, _)| finding.path == self.net.name && chart.plane == *plane)?;
        let of_band = |done: &&Done| {
            plan.bands[done.band].name == *band && Some(done.frequency_hz) == finding.frequency_hz
        };
        row.1.iter().find(of_band).filter(|done| done.map.is_ok()).map(|done| done.stem.as_str())
    }

    /// Notes and reasons, each once.
    pub fn messages(&self) -> Vec<Diagnostic> {
        let mut messages = self.notes.clone();
        for reason in self.rows.iter().flat_map(|(_, maps)| maps).filter_map(|done| done.map.as_ref().err()) {
            if !messages.contains(reason) {
                messages.push(reason.clone());
            }
        }
        messages
    }

    /// File stems of the maps that were drawn.
    #[cfg(feature = "pdf")]
    pub fn drawn(&self) -> impl Iterator<Item = &str> {
        let all = self.rows.iter().flat_map(|(_, maps)| maps);
        all.filter(|done| done.map.is_ok()).map(|done| done.stem.as_str())
    }

    /// Adds findings, maps and joints to the document.
    pub fn add_to(&self, findings: &mut Findings, plan: &Plan) {
        self.findings.iter().for_each(|finding| findings.add_finding(finding));
        if let Some(curve) = &self.curve {
            findings.add_loop(&self.net.name, curve);
        }
        for &(chart, ref maps) in &self.rows {
            for done in maps {
                let band = &plan.bands[done.band].name;
                let subject = Subject { net: self.net, chart, band, frequency_hz: done.frequency_hz };
                match &done.map {
                    Ok(drawn) => {
                        let stem = drawn.thumbnail.is_some().then_some(done.stem.as_str());
                        findings.add_map(subject, stem, &drawn.map, &drawn.figures, &drawn.effects);
                    }
                    Err(reason) => findings.add_withheld(subject, reason),
                }
            }
        }
        for (joints, (band, hz)) in self.joints.iter().zip(frequencies(plan)) {
            findings.add_joints(&self.net.name, &plan.bands[band].name, hz, joints);
        }
    }

    /// The rows of the contact sheet.
    pub fn contact<'s>(&'s self) -> Vec<ContactRow<'s>> {
        let cell = |done: &Done| match &done.map {
            Ok(Drawn { thumbnail: Some(thumbnail), .. }) => {
                let ticket = format!("maps/{}.svg", done.stem);
                ContactCell::Map(Box::new(thumbnail.clone()), Some(ticket))
            }
            Ok(_) => ContactCell::Withheld(String::new()),
            Err(reason) => ContactCell::Withheld(reason.text.clone()),
        };
        let row = |(chart, maps): &'s (&'a ChartPlan, Vec<Done>)| ContactRow {
            net: self.net,
            chart,
            cells: maps.iter().map(cell).collect(),
            findings: &self.findings,
        };
        self.rows.iter().map(row).collect()
    }

    /// The entries of the index of numbers.
    pub fn numbers<'s>(&'s self, plan: &'s Plan) -> Vec<numbers::Numbers<'s>> {
        let entry = |chart: &'s ChartPlan, done: &'s Done| match &done.map {
            Ok(drawn) => numbers::Numbers::Map { stem: &done.stem, map: &drawn.map },
            Err(reason) => numbers::Numbers::Withheld {
                net: &self.net.name,
                plane: Some((chart.plane.layer, &chart.plane.net)),
                band: &plan.bands[done.band].name,
                frequency_hz: done.frequency_hz,
                reason: &reason.text,
            },
        };
        let rows = self.rows.iter();
        rows.flat_map(|(chart, maps)| maps.iter().map(move |done| entry(chart, done))).collect()
    }
}

/// All frequencies of a plan's bands: index of the band and Hz.
pub fn frequencies(plan: &Plan) -> Vec<(usize, f64)> {
    let bands = plan.bands.iter().enumerate();
    bands.flat_map(|(index, band)| band.at_hz.iter().map(move |&hz| (index, hz))).collect()
}

/// Lines of the 80 % contour of the map of a finding; none where it belongs to no map.
fn outline(bench: &Bench, solved: &[ChartedPath], finding: &Finding) -> Vec<Vec<Point>> {
    let of_plane = |chart: &ChartPlan| Some(&chart.plane) == finding.plane.as_ref();
    let Some(row) = bench.charts().iter().position(of_plane) else { return Vec::new() };
    let mut maps = solved.iter().filter_map(|charted| charted.planes[row].as_ref().ok());
    let of_band = |charted: &&Charted| {
        Some(&charted.band) == finding.band.as_ref() && Some(charted.frequency_hz) == finding.frequency_hz
    };
    let found = maps.find(of_band);
    found.map_or_else(Vec::new, |found| outline::lines(&found.map, found.figures.contour_levels[1]))
}

/// Of each plane the part inside the 80 % contour at the highest frequency that was solved.
fn crowded(bench: &Bench, solved: &[ChartedPath]) -> Vec<(PlaneId, Region)> {
    let mut found = Vec::new();
    for (row, chart) in bench.charts().iter().enumerate() {
        let maps = solved.iter().filter_map(|charted| charted.planes[row].as_ref().ok());
        if let Some(highest) = maps.max_by(|a, b| a.frequency_hz.total_cmp(&b.frequency_hz)) {
            let level = highest.figures.contour_levels[1];
            found.push((chart.plane.clone(), outline::region(&highest.map, level)));
        }
    }
    found
}

/// Leaves a map without its cells, which would fill the memory.
fn forget(map: &mut ReturnMap) {
    (map.jx, map.jy, map.copper) = (Vec::new(), Vec::new(), Vec::new());
}

/// A failed write as a message.
pub fn cannot_write(failure: &StoreFailure) -> Diagnostic {
    Diagnostic::error(code::CANNOT_WRITE, failure.to_string())
}
