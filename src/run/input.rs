//! One hash over everything that a set of maps depends on, so that pictures carry a number that says so.

use crate::board::Board;
use crate::geom::{Point, Region, Ring};
use crate::report::sha256_hex;
use crate::review::Review;

/// SHA-256 of the board as understood, the review's text, the cell of the command line, the style's text and the
/// program's version, in hexadecimal. Depends on no path, so the same files elsewhere give the same hash.
pub fn input_hash(board: &Board, review: &Review, review_text: &str, style: &str) -> String {
    let mut bytes = Bytes(Vec::new());
    bytes.text(env!("CARGO_PKG_VERSION"));
    bytes.text(review_text);
    bytes.text(style);
    bytes.number(review.solver.cell_m.unwrap_or(0.0));
    bytes.region(&board.outline);
    for layer in &board.layers {
        bytes.count(layer.areas.len());
        for area in &layer.areas {
            bytes.text(area.net.map_or("", |net| board.net_name(net)));
            bytes.ring(&area.shape.outer);
            bytes.count(area.shape.holes.len());
            area.shape.holes.iter().for_each(|hole| bytes.ring(hole));
        }
    }
    for hole in &board.holes {
        bytes.ring(&hole.path);
        bytes.number(hole.diameter_m);
        bytes.text(&format!("{:?}{:?}", hole.plating, hole.layers));
    }
    for pin in &board.pins {
        bytes.text(&pin.label());
        bytes.text(pin.net.map_or("", |net| board.net_name(net)));
        bytes.point(pin.at);
    }
    bytes.text(&format!("{:?}", board.stackup));
    sha256_hex(&bytes.0)
}

/// A stream of values in which lengths stand before what they count, so that different inputs give different bytes.
struct Bytes(Vec<u8>);

impl Bytes {
    fn count(&mut self, count: usize) {
        self.0.extend_from_slice(&(count as u64).to_le_bytes());
    }

    fn number(&mut self, value: f64) {
        self.0.extend_from_slice(&value.to_le_bytes());
    }

    fn text(&mut self, text: &str) {
        self.count(text.len());
        self.0.extend_from_slice(text.as_bytes());
    }

    fn point(&mut self, point: Point) {
        self.number(point.x);
        self.number(point.y);
    }

    fn ring(&mut self, ring: &Ring) {
        self.count(ring.len());
        ring.iter().for_each(|&point| self.point(point));
    }

    fn region(&mut self, region: &Region) {
        self.count(region.0.len());
        for polygon in &region.0 {
            polygon.rings().for_each(|ring| self.ring(ring));
        }
    }
}
