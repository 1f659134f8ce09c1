//! `ebbmap draw` and `ebbmap check`: resolve what was typed and run a whole review.

use super::args::{CheckArguments, DrawArguments};
use super::progress::Progress;
use super::{Console, Exit};
use crate::draw::ScaleChoice;
use crate::report::FINDINGS_SCHEMA;
use crate::run::{self, Ending, Order, Unusable};
use crate::unit::{Dimension, parse_quantity};

/// Draws the maps of a review.
pub fn draw(typed: &DrawArguments, console: &mut Console) -> Exit {
    let Some(cell_m) = cell(typed.cell.as_deref(), console) else { return Exit::Unusable };
    let scale = match typed.scale.as_deref().map_or(Ok(ScaleChoice::OfStyle), ScaleChoice::parse) {
        Ok(scale) => scale,
        Err(error) => {
            console.remark(&format!("error: `--scale`: {error}\n"));
            return Exit::Unusable;
        }
    };
    let order = Order {
        review: &typed.review,
        out: Some(&typed.out),
        pictures: true,
        only: &typed.only,
        cell_m,
        numbers: typed.numbers,
        jobs: typed.jobs,
        style: &typed.style,
        scale,
    };
    run(&order, typed.limits, false, console)
}

/// Judges a review without drawing it, or prints the schema of the findings.
pub fn check(typed: &CheckArguments, console: &mut Console) -> Exit {
    if typed.schema {
        console.result(FINDINGS_SCHEMA);
        return Exit::Complete;
    }
    // the parser asks for a review unless the schema is wanted
    let Some(review) = typed.review.as_deref() else { return Exit::Unusable };
    let Some(cell_m) = cell(typed.cell.as_deref(), console) else { return Exit::Unusable };
    let order = Order {
        review,
        out: typed.out.as_deref(),
        pictures: false,
        only: &typed.only,
        cell_m,
        numbers: false,
        jobs: typed.jobs,
        style: "paper",
        scale: ScaleChoice::OfStyle,
    };
    run(&order, true, true, console)
}

/// Runs an order; a limit that is exceeded counts if `limits` says so, the findings are printed if `list` does.
fn run(order: &Order, limits: bool, list: bool, console: &mut Console) -> Exit {
    let progress = Progress::new(console.is_terminal(), console.ink());
    let ended = run::draw(order, &progress);
    progress.finish();
    match ended {
        Ok(outcome) => {
            if list {
                console.result(&outcome.listing);
            }
            match outcome.ending {
                Ending::Incomplete => Exit::Incomplete,
                Ending::Complete if limits && outcome.exceeded => Exit::Exceeded,
                Ending::Complete => Exit::Complete,
            }
        }
        Err(Unusable) => Exit::Unusable,
    }
}

/// The cell that was typed; none after an error.
fn cell(typed: Option<&str>, console: &mut Console) -> Option<Option<f64>> {
    match typed.map(|text| parse_quantity(text, Dimension::Length)).transpose() {
        Ok(Some(cell_m)) if cell_m <= 0.0 => {
            console.remark("error: `--cell` must be a length above zero\n");
            None
        }
        Ok(cell_m) => Some(cell_m),
        Err(error) => {
            console.remark(&format!("error: `--cell` {error}\n"));
            None
        }
    }
}
