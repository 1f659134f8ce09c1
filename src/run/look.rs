//! The pictures of a board's layers as understood, written into a folder.

use super::chart::cannot_write;
use super::draw::{Unusable, chosen_style, tell};
use super::input::input_hash;
use super::store::{LAYERS, Store};
use super::watch::Watch;
use crate::board::Board;
use crate::diag::Diagnostic;
use crate::diag::code::run as code;
use crate::plan::Plan;
use crate::report::{LayerInput, layers};
use crate::review::Review;
use std::path::Path;

/// What to draw of a board and where.
#[derive(Clone, Copy, Debug)]
pub struct LayerOrder<'a> {
    /// Board.
    pub board: &'a Board,
    /// Review, its text, and the plan, where there is a review.
    pub review: Option<(&'a Review, &'a str, &'a Plan)>,
    /// Folder for the pictures.
    pub out: &'a Path,
    /// Name of a style, or the path of a style file.
    pub style: &'a str,
}

/// Writes one picture for each copper layer, `layer-1` at the top, as SVG and PNG. Gives the names written.
pub fn draw_layers(order: &LayerOrder, watch: &dyn Watch) -> Result<Vec<String>, Unusable> {
    let (style, style_text) = chosen_style(order.style).map_err(|messages| tell(watch, &messages))?;
    let nothing = Review::default();
    let (review, text) = order.review.map_or((&nothing, ""), |(review, text, _)| (review, text));
    let hash = input_hash(order.board, review, text, &style_text);
    let pictures = layers(&LayerInput {
        board: order.board,
        plan: order.review.map(|(review, _, plan)| (review, plan)),
        style: &style,
        input_hash: &hash,
    });
    let pictures = pictures.map_err(|fault| {
        let text = format!("picture of a layer cannot be rendered: {}", fault.0);
        tell(watch, &[Diagnostic::error(code::CANNOT_RENDER, text)])
    })?;
    let write = || {
        let mut store = Store::open(order.out, LAYERS)?;
        for (picture, index) in pictures.iter().zip(1..) {
            store.write(&format!("layer-{index}.svg"), picture.svg.as_bytes())?;
            store.write(&format!("layer-{index}.png"), &picture.png)?;
        }
        store.finish()
    };
    write().map_err(|failure| tell(watch, &[cannot_write(&failure)]))
}
