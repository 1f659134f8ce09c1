//! `run::draw`: everything that `ebbmap draw` does, without a terminal.

use super::name::{MapName, file_stems};
use super::select::chosen;
use super::store::{Store, StoreFailure};
use super::watch::Watch;
use crate::board::Board;
use crate::diag::code::run as code;
use crate::diag::{Diagnostic, Severity};
use crate::field::Workshop;
use crate::figure::{ChartResult, chart};
use crate::plan::{ChartPlan, NetPlan, Plan};
use crate::report::{Findings, Subject, numbers};
use crate::review::{Band, Review};
use rayon::prelude::*;
use std::path::Path;
use std::sync::Mutex;

/// What to draw and where.
#[derive(Clone, Copy, Debug)]
pub struct Order<'a> {
    /// The review file.
    pub review: &'a Path,
    /// Folder for the outputs.
    pub out: &'a Path,
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
}

/// How a run ended that wrote its outputs.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// Everything asked for was drawn.
    Complete,
    /// Something was skipped or withheld; a message named each.
    Incomplete,
}

/// Draws a review. Messages go to `watch` as they arise; after an error nothing more is written.
pub fn draw(order: &Order, watch: &dyn Watch) -> Result<Ending, Vec<Diagnostic>> {
    let pool = rayon::ThreadPoolBuilder::new().num_threads(order.jobs).build();
    match pool {
        Ok(pool) => pool.install(|| draw_here(order, watch)),
        // Threads could not be started; the calling thread can still do all.
        Err(_) => draw_here(order, watch),
    }
}
