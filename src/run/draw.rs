//! A whole review: everything that `ebbmap draw` does, without a terminal.

use super::chart::{Charting, PathDone, cannot_write, frequencies};
use super::documents::Documents;
use super::input::input_hash;
use super::name::{MapName, file_stems};
use super::select::chosen;
use super::store::{MANIFEST, Store};
use super::watch::Watch;
use crate::board::{Board, Origin, Stackup};
use crate::diag::code::{plan as plan_code, read as read_code, run as code};
use crate::diag::{Diagnostic, Severity};
use crate::draw::{DensityScale, ScaleChoice};
use crate::field::{Bench, Workshop};
use crate::finding::noise::noise;
use crate::finding::{Finding, waiver_messages};
use crate::plan::{Plan, apply_review, build};
use crate::read::review::{ReviewFile, read_review};
use crate::read::{read_board, style};
use crate::report::numbers;
use crate::review::{Band, Review};
use crate::style::Style;
use crate::unit::quantity_text;
use rayon::prelude::*;
use std::path::Path;
use std::sync::{Mutex, PoisonError};

/// What to draw and where.
#[derive(Clone, Copy, Debug)]
pub struct Order<'a> {
    /// The review file.
    pub review: &'a Path,
    /// Folder for the outputs; none writes nothing.
    pub out: Option<&'a Path>,
    /// Whether pictures are drawn; without them a run does everything else.
    pub pictures: bool,
    /// Nets to draw, patterns allowed; empty draws all.
    pub only: &'a [String],
    /// Side of a cell in metres, beats the review's.
    pub cell_m: Option<f64>,
    /// Whether the densities are written as arrays.
    pub numbers: bool,
    /// Threads; 0 takes one per core.
    pub jobs: usize,
    /// Name of a style, or the path of a style file.
    pub style: &'a str,
    /// Ends of the common scale.
    pub scale: ScaleChoice,
}

/// How a run ended that wrote its outputs, and what it found.
#[derive(Clone, Debug)]
pub struct Outcome {
    /// How it ended.
    pub ending: Ending,
    /// Whether a finding is above its limit and not waived.
    pub exceeded: bool,
    /// The findings as text.
    pub listing: String,
}

/// How complete a run is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// Everything asked for was drawn.
    Complete,
    /// Something was skipped or withheld; a message named each.
    Incomplete,
}

/// The input cannot be used or the output not be written. The messages went to the watcher.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Unusable;

/// Everything that was read and decided before a solve.
pub struct Prepared {
    /// The review file; its text is the source of messages about it.
    pub file: ReviewFile,
    /// The review, with what the command line changed.
    pub review: Review,
    /// The board, with the review's values in it.
    pub board: Board,
    /// The plan of all nets of the review.
    pub plan: Plan,
    /// All messages so far, already told to the watcher.
    pub messages: Vec<Diagnostic>,
}

impl Prepared {
    /// Whether every net of the review will be drawn, as far as can be known before a solve.
    pub fn is_complete(&self) -> bool {
        let charts = self.plan.paths.iter().flat_map(|net| &net.charts);
        !self.plan.messages.iter().any(is_skip) && charts.into_iter().all(|chart| chart.withheld.is_none())
    }
}

/// Reads a review and its board and plans the maps. Messages go to `watch` as they arise.
pub fn prepare(path: &Path, cell_m: Option<f64>, watch: &dyn Watch) -> Result<Prepared, Unusable> {
    let mut file = read_review(path);
    let mut told = Told { watch, name: file.name.clone(), text: file.text.clone(), messages: Vec::new() };
    told.all(std::mem::take(&mut file.messages));
    let Some(mut review) = file.review.take() else { return Err(Unusable) };
    review.solver.cell_m = cell_m.or(review.solver.cell_m);
    let (mut board, messages) = match read_board(&review.files) {
        Ok(read) => read,
        Err(messages) => {
            told.all(messages);
            return Err(Unusable);
        }
    };
    let overrides = apply_review(&mut board, &review);
    told.all(messages.into_iter().filter(|message| !is_answered(message, &board.stackup)));
    told.all(overrides);
    told.usable()?;
    let plan = build(&board, &review);
    told.all(plan.messages.iter().cloned());
    told.usable()?;
    if plan.paths.is_empty() {
        return Err(Unusable);
    }
    Ok(Prepared { file, review, board, plan, messages: told.messages })
}

/// Draws a review. Nothing is written unless the input can be used and the folder can be written.
pub fn draw(order: &Order, watch: &dyn Watch) -> Result<Outcome, Unusable> {
    // The style costs nothing to read and is the user's, so it is refused before the board is read.
    let style = chosen_style(order.style).map_err(|messages| tell(watch, &messages))?;
    let mut prepared = prepare(order.review, order.cell_m, watch)?;
    let chosen = chosen(&prepared.plan, order.only).map_err(|messages| tell(watch, &messages))?;
    let store = order.out.map(|out| Store::open(out, MANIFEST)).transpose();
    let store = store.map_err(|failure| tell(watch, &[cannot_write(&failure)]))?;
    match rayon::ThreadPoolBuilder::new().num_threads(order.jobs).build() {
        Ok(pool) => pool.install(|| draw_plan(order, watch, &mut prepared, &chosen, &style, store)),
        // Where threads cannot be started the calling thread does all.
        Err(_) => draw_plan(order, watch, &mut prepared, &chosen, &style, store),
    }
}

fn draw_plan(
    order: &Order,
    watch: &dyn Watch,
    prepared: &mut Prepared,
    chosen: &[bool],
    style: &(Style, String),
    store: Option<Store>,
) -> Result<Outcome, Unusable> {
    let Prepared { file, review, board, plan, messages } = prepared;
    let store = Mutex::new(store);
    let workshop = Workshop::new(board, plan, review.solver.model);
    // All paths of the review, whatever is drawn: what is charted of each decides the names and numbers of all maps.
    let benches: Vec<Bench> = plan.paths.par_iter().map(|path| workshop.bench(path)).collect();
    let paths: Vec<usize> = (0..plan.paths.len()).filter(|&path| chosen[path]).collect();
    // Coupling counts all paths of the review, whatever is drawn: any of them may disturb one that is.
    let at_hz: Vec<f64> = frequencies(plan).into_iter().map(|(_, hz)| hz).collect();
    let couplings = workshop.couplings(chosen, &at_hz).unwrap_or_else(|reason| {
        watch.message(&reason, None);
        messages.push(reason);
        Vec::new()
    });
    let noise = noise(&couplings, plan, review);
    let charting = Charting {
        board,
        review,
        plan,
        style: &style.0,
        input_hash: &input_hash(board, review, &file.text, &style.1),
        scale: DensityScale::chosen(scale_height_m(plan), style.0.density.range_db, order.scale),
        benches: &benches,
        stems: &stems(plan, &benches),
        couplings: &couplings,
        noise: &noise,
        pictures: order.pictures,
        numbers: order.numbers,
        store: &store,
        watch,
    };
    let rows: usize = paths.iter().map(|&path| benches[path].charts().len()).sum();
    watch.planned(rows * frequencies(plan).len());
    let done: Result<Vec<PathDone>, Diagnostic> = paths.par_iter().map(|&path| charting.path(path)).collect();
    let done = done.map_err(|failure| tell(watch, &[failure]))?;
    for message in done.iter().flat_map(PathDone::messages) {
        // Nets of one plane share what its cells leave out: said once.
        if messages.contains(&message) {
            continue;
        }
        watch.message(&message, None);
        messages.push(message);
    }
    let found: Vec<&Finding> = done.iter().flat_map(|done| &done.findings).collect();
    if order.only.is_empty() {
        let all: Vec<Finding> = found.iter().map(|&finding| finding.clone()).collect();
        for message in waiver_messages(&all, review, &board.revision) {
            watch.message(&message, None);
            messages.push(message);
        }
    }
    let documents = Documents {
        board,
        review,
        plan,
        messages,
        done: &done,
        couplings: &couplings,
        noise: &noise,
        pictures: order.pictures,
    };
    let sheets = if order.pictures { documents.contact(&charting) } else { Ok(Vec::new()) };
    let sheets = sheets.map_err(|fault| tell(watch, &[fault]))?;
    #[cfg(feature = "pdf")]
    let pdf = super::pdf::review_pdf(order.out, &review.title, &sheets, &done);
    #[cfg(feature = "pdf")]
    let pdf = pdf.map_err(|fault| tell(watch, &[fault]))?;
    let store = store.into_inner().unwrap_or_else(PoisonError::into_inner);
    if let Some(mut store) = store {
        let rest = || {
            for (sheet, index) in sheets.iter().zip(1..) {
                store.write(&format!("contact-sheet-{index}.svg"), sheet.svg.as_bytes())?;
                store.write(&format!("contact-sheet-{index}.png"), &sheet.png)?;
            }
            #[cfg(feature = "pdf")]
            if order.pictures {
                store.write("review.pdf", &pdf)?;
            }
            for (name, bytes) in documents.files() {
                store.write(name, &bytes)?;
            }
            if order.numbers {
                let entries: Vec<numbers::Numbers> =
                    done.iter().flat_map(|done| done.numbers(plan)).collect();
                store.write("numbers/index.json", numbers::index(&entries, review.origin).as_bytes())?;
            }
            store.finish()
        };
        rest().map_err(|failure| tell(watch, &[cannot_write(&failure)]))?;
    }
    let skipped = plan.messages.iter().any(is_skip);
    let complete = !skipped && done.iter().all(PathDone::is_complete);
    Ok(Outcome {
        ending: if complete { Ending::Complete } else { Ending::Incomplete },
        exceeded: found.iter().any(|finding| finding.is_exceeded()),
        listing: documents.listing(),
    })
}

/// The smallest height of all charts that can be drawn: the anchor of the common scale depends on inputs only.
fn scale_height_m(plan: &Plan) -> f64 {
    let charts = plan.paths.iter().flat_map(|net| &net.charts);
    let heights = |with_withheld: bool| {
        let kept = charts.clone().filter(move |chart| with_withheld || chart.withheld.is_none());
        kept.map(|chart| chart.height_m).filter(|&height| height > 0.0).min_by(f64::total_cmp)
    };
    // a set in which everything is withheld draws nothing, so any anchor will do
    heights(false).or_else(|| heights(true)).unwrap_or(1e-3)
}

/// File stems by path, chart of its bench and frequency, for all maps of the review.
fn stems(plan: &Plan, benches: &[Bench]) -> Vec<Vec<Vec<String>>> {
    let each = frequencies(plan);
    let mut names = Vec::new();
    for (net, bench) in plan.paths.iter().zip(benches) {
        for chart in bench.charts() {
            names.extend(each.iter().map(|&(band, hz)| MapName {
                net: net.name.clone(),
                plane: chart.plane.to_string(),
                band: band_part(&plan.bands[band], hz),
            }));
        }
    }
    let mut stems = file_stems(&names).into_iter();
    let of_chart = |stems: &mut std::vec::IntoIter<String>| stems.by_ref().take(each.len()).collect();
    benches.iter().map(|bench| bench.charts().iter().map(|_| of_chart(&mut stems)).collect()).collect()
}

/// The band in a file name: with the frequency where the band is solved at several.
fn band_part(band: &Band, frequency_hz: f64) -> String {
    if band.at_hz.len() < 2 {
        return band.name.clone();
    }
    format!("{}@{}", band.name, quantity_text(frequency_hz, "Hz").replace(' ', ""))
}

/// Whether a message about an assumed stackup is answered by the review, which gives all values.
fn is_answered(message: &Diagnostic, stackup: &Stackup) -> bool {
    let about = [read_code::STACKUP_ASSUMED, read_code::STACKUP_DEFAULT].contains(&message.code);
    let foils = stackup.foils.iter().map(|foil| foil.origin);
    let sheets = stackup.dielectrics.iter().flat_map(|sheet| [sheet.origin, sheet.permittivity_origin]);
    about && foils.chain(sheets).all(|origin| origin == Origin::Review)
}

/// Whether a message of the plan says that a net has no map at all while the others go on. What a review names and the
/// board does not have is no such case: it is a slip to mend before minutes of work.
pub(super) fn is_skip(message: &Diagnostic) -> bool {
    let skips = [plan_code::TRACK_OPEN, plan_code::NET_FEW_PINS, plan_code::PINS_NEEDED];
    message.severity == Severity::Error && skips.contains(&message.code)
}

/// A style by name, or from a file, with the text that names or makes it.
pub(super) fn chosen_style(name: &str) -> Result<(Style, String), Vec<Diagnostic>> {
    let path = Path::new(name);
    if path.extension().is_none_or(|extension| extension != "toml") {
        return Ok((style::built_in(name)?, name.to_owned()));
    }
    let text = std::fs::read_to_string(path).map_err(|error| {
        vec![Diagnostic::error(code::STYLE_UNREADABLE, format!("cannot read the style `{name}`: {error}"))]
    })?;
    let file = path.file_name().map(|file| file.to_string_lossy().into_owned()).unwrap_or_default();
    Ok((style::load(&text, &file)?, text))
}

pub(super) fn tell(watch: &dyn Watch, messages: &[Diagnostic]) -> Unusable {
    messages.iter().for_each(|message| watch.message(message, None));
    Unusable
}

/// Messages that were told, and the review's text for those that show a line of it.
struct Told<'a> {
    watch: &'a dyn Watch,
    name: String,
    text: String,
    messages: Vec<Diagnostic>,
}

impl Told<'_> {
    fn all(&mut self, messages: impl IntoIterator<Item = Diagnostic>) {
        for message in messages {
            let in_review = message.place.file.as_deref() == Some(self.name.as_str());
            self.watch.message(&message, in_review.then_some(self.text.as_str()));
            self.messages.push(message);
        }
    }

    /// Whether the run can go on: an error that is not the skip of one net ends it.
    fn usable(&self) -> Result<(), Unusable> {
        let ends =
            self.messages.iter().any(|message| message.severity == Severity::Error && !is_skip(message));
        if ends { Err(Unusable) } else { Ok(()) }
    }
}
