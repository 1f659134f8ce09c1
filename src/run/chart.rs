//! One chart of a run: solve, draw, write, and keep what the summary needs.

use super::store::{Store, StoreFailure};
use super::watch::Watch;
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::run as code;
use crate::field::{ReturnMap, Workshop};
use crate::figure::{Charted, Figures, chart};
use crate::plan::{ChartPlan, PathPlan, Plan};
use crate::report::{
    ContactCell, ContactRow, Findings, Picture, Subject, Thumbnail, TicketInput, numbers, thumbnail, ticket,
};
use crate::review::{Band, Review};
use crate::style::Style;
use std::sync::{Mutex, PoisonError};

/// Everything that the charts of a run share.
pub struct Charting<'a> {
    pub board: &'a Board,
    pub review: &'a Review,
    pub plan: &'a Plan,
    pub style: &'a Style,
    /// Hash over all inputs.
    pub input_hash: &'a str,
    /// Anchor of the common scale in metres.
    pub scale_height_m: f64,
    /// File stems by net, chart and frequency.
    pub stems: &'a [Vec<Vec<String>>],
    pub workshop: &'a Workshop<'a>,
    /// Whether arrays are written.
    pub numbers: bool,
    pub store: &'a Mutex<Store>,
    pub watch: &'a dyn Watch,
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
    /// The map reduced for the contact sheet.
    pub thumbnail: Thumbnail,
}

/// What a chart leaves for the summary.
pub struct ChartDone {
    /// Index of the net in the plan, and of the chart in the net.
    pub at: (usize, usize),
    /// One entry for each frequency.
    pub maps: Vec<Done>,
    /// What was assumed on the way.
    pub notes: Vec<Diagnostic>,
}

impl Charting<'_> {
    /// Solves, draws and writes all maps of a chart. An error means that a file could not be written.
    pub fn chart(&self, at: (usize, usize)) -> Result<ChartDone, Diagnostic> {
        let net = &self.plan.paths[at.0];
        let plan = &net.charts[at.1];
        let solved = chart(self.workshop, net, plan, &self.plan.bands, &|step| {
            self.watch.mapped(step.net, step.band);
        });
        let mut notes = solved.notes;
        let stems = &self.stems[at.0][at.1];
        let mut maps = Vec::with_capacity(solved.maps.len());
        for ((map, (band, frequency_hz)), stem) in
            solved.maps.into_iter().zip(frequencies(self.plan)).zip(stems)
        {
            let map = match map {
                Ok(charted) => self.draw(net, plan, band, charted, stem, at)?,
                Err(reason) => {
                    self.watch.mapped(&net.name, &self.plan.bands[band].name);
                    Err(reason)
                }
            };
            maps.push(Done { band, frequency_hz, stem: stem.clone(), map });
        }
        notes.dedup();
        Ok(ChartDone { at, maps, notes })
    }

    /// Draws and writes one map. The outer error is a file that cannot be written, the inner one withholds the map.
    fn draw(
        &self,
        net: &PathPlan,
        plan: &ChartPlan,
        band: usize,
        charted: Charted,
        stem: &str,
        at: (usize, usize),
    ) -> Result<Result<Drawn, Diagnostic>, Diagnostic> {
        let Charted { mut map, figures, .. } = charted;
        let picture = match self.picture(net, plan, &self.plan.bands[band], &map, &figures, at) {
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
        let (board, review, height) = (self.board, self.review, self.scale_height_m);
        let thumbnail = thumbnail(board, review, net, plan, &map, &figures, height, self.style);
        (map.jx, map.jy, map.copper) = (Vec::new(), Vec::new(), Vec::new());
        Ok(Ok(Drawn { map, figures, thumbnail }))
    }

    fn picture(
        &self,
        net: &PathPlan,
        chart: &ChartPlan,
        band: &Band,
        map: &ReturnMap,
        figures: &Figures,
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
            scale_height_m: self.scale_height_m,
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
        let mut store = self.store.lock().unwrap_or_else(PoisonError::into_inner);
        store.write(name, bytes).map_err(|failure| cannot_write(&failure))
    }
}

impl ChartDone {
    /// Whether every map was drawn.
    pub fn is_complete(&self) -> bool {
        self.maps.iter().all(|done| done.map.is_ok())
    }

    /// Notes and reasons, each once.
    pub fn messages(&self) -> Vec<Diagnostic> {
        let mut messages = self.notes.clone();
        for reason in self.maps.iter().filter_map(|done| done.map.as_ref().err()) {
            if !messages.contains(reason) {
                messages.push(reason.clone());
            }
        }
        messages
    }

    /// Adds the maps to the findings.
    pub fn add_to(&self, findings: &mut Findings, plan: &Plan) {
        let net = &plan.paths[self.at.0];
        for done in &self.maps {
            let band = &plan.bands[done.band].name;
            let chart = &net.charts[self.at.1];
            let subject = Subject { net, chart, band, frequency_hz: done.frequency_hz };
            match &done.map {
                Ok(drawn) => findings.add_map(subject, &done.stem, &drawn.map, &drawn.figures),
                Err(reason) => findings.add_withheld(subject, reason),
            }
        }
    }

    /// The row of the contact sheet.
    pub fn row<'a>(&self, plan: &'a Plan) -> ContactRow<'a> {
        let cell = |done: &Done| match &done.map {
            Ok(drawn) => {
                let ticket = format!("maps/{}.svg", done.stem);
                ContactCell::Map(Box::new(drawn.thumbnail.clone()), Some(ticket))
            }
            Err(reason) => ContactCell::Withheld(reason.text.clone()),
        };
        let net = &plan.paths[self.at.0];
        ContactRow { net, chart: &net.charts[self.at.1], cells: self.maps.iter().map(cell).collect() }
    }

    /// The entries of the index of numbers.
    pub fn numbers<'a>(&'a self, plan: &'a Plan) -> Vec<numbers::Numbers<'a>> {
        let net = &plan.paths[self.at.0];
        let plane = &net.charts[self.at.1].plane;
        let entry = |done: &'a Done| match &done.map {
            Ok(drawn) => numbers::Numbers::Map { stem: &done.stem, map: &drawn.map },
            Err(reason) => numbers::Numbers::Withheld {
                net: &net.name,
                plane: Some((plane.layer, &plane.net)),
                band: &plan.bands[done.band].name,
                frequency_hz: done.frequency_hz,
                reason: &reason.text,
            },
        };
        self.maps.iter().map(entry).collect()
    }
}

/// All frequencies of a plan's bands: index of the band and Hz.
pub fn frequencies(plan: &Plan) -> Vec<(usize, f64)> {
    let bands = plan.bands.iter().enumerate();
    bands.flat_map(|(index, band)| band.at_hz.iter().map(move |&hz| (index, hz))).collect()
}

/// A failed write as a message.
pub fn cannot_write(failure: &StoreFailure) -> Diagnostic {
    Diagnostic::error(code::CANNOT_WRITE, failure.to_string())
}
