//! `ebbmap draw`: resolves what was typed and runs a whole review.

use super::args::DrawArguments;
use super::progress::Progress;
use super::{Console, Exit};
use crate::draw::ScaleChoice;
use crate::run::{self, Ending, Order, Unusable};
use crate::unit::{Dimension, parse_quantity};

/// Draws the maps of a review.
pub fn draw(typed: &DrawArguments, console: &mut Console) -> Exit {
    let cell_m = match typed.cell.as_deref().map(|text| parse_quantity(text, Dimension::Length)).transpose() {
        Ok(Some(cell_m)) if cell_m <= 0.0 => {
            console.remark("error: `--cell` must be a length above zero\n");
            return Exit::Unusable;
        }
        Ok(cell_m) => cell_m,
        Err(error) => {
            console.remark(&format!("error: `--cell` {error}\n"));
            return Exit::Unusable;
        }
    };
    let scale = match typed.scale.as_deref().map_or(Ok(ScaleChoice::OfStyle), ScaleChoice::parse) {
        Ok(scale) => scale,
        Err(error) => {
            console.remark(&format!("error: `--scale`: {error}\n"));
            return Exit::Unusable;
        }
    };
    let order = Order {
        review: &typed.review,
        out: &typed.out,
        only: &typed.only,
        cell_m,
        numbers: typed.numbers,
        jobs: typed.jobs,
        style: &typed.style,
        scale,
    };
    let progress = Progress::new(console.is_terminal(), console.ink());
    let ended = run::draw(&order, &progress);
    progress.finish();
    match ended {
        Ok(Ending::Complete) => Exit::Complete,
        Ok(Ending::Incomplete) => Exit::Incomplete,
        Err(Unusable) => Exit::Unusable,
    }
}
