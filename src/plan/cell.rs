//! The size of the cells, and what a solve with them takes.
//!
//! With the band-limited kernel cells of h give the density within 2 %, of h/2 within 1 %. So cells of h/2 are taken
//! while the plane stays small, larger ones up to h on large planes, and more than h only where memory would run out.
//! Voids near the track that are small ask for smaller cells, down to h/4.

use super::Void;
use super::void::mean_width_m;
use crate::geom::locate::point_segment_distance;
use crate::geom::{Bounds, Point};
use crate::plan::TrackLeg;

/// Cells of a plane up to which h/2 is taken.
const EASY_CELLS: f64 = 250e3;
/// Cells of a plane that memory allows.
const MOST_CELLS: f64 = 1.4e6;
/// Cells that the width of a void near the track should have.
const ACROSS_VOID: f64 = 3.0;
/// Heights from the track within which voids count.
const NEAR_HEIGHTS: f64 = 5.0;

/// A chosen cell and whether memory made it larger than h.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct CellChoice {
    /// Side of a cell in metres.
    pub cell_m: f64,
    /// Whether it is larger than h because of memory.
    pub enlarged: bool,
}

/// Chooses the cell for a plane of the given box.
pub fn choose(plane: Bounds, height_m: f64, legs: &[TrackLeg], voids: &[Void]) -> CellChoice {
    let area = (plane.width() * plane.height()).max(1e-12);
    let cells_of = |cell_m: f64| area / (cell_m * cell_m);
    let smallest_void =
        voids.iter().filter(|void| near(void, legs, NEAR_HEIGHTS * height_m)).map(mean_width_m);
    let by_void = smallest_void.fold(f64::INFINITY, f64::min) / ACROSS_VOID;
    let wanted = (0.5 * height_m).min(by_void).max(0.25 * height_m);
    let easy = (area / EASY_CELLS).sqrt();
    let cell_m = rounded(wanted.max(easy.min(height_m)));
    if cells_of(cell_m) <= MOST_CELLS {
        return CellChoice { cell_m, enlarged: false };
    }
    let mut cell_m = rounded((area / MOST_CELLS).sqrt());
    while cells_of(cell_m) > MOST_CELLS {
        cell_m = rounded(cell_m * 1.3);
    }
    CellChoice { cell_m, enlarged: cell_m > height_m }
}

fn near(void: &Void, legs: &[TrackLeg], reach_m: f64) -> bool {
    let bounds = void.shape.bounds().grown(reach_m);
    legs.iter().any(|leg| {
        bounds.meets(Bounds::of([leg.from, leg.to]))
            && void
                .shape
                .outer
                .iter()
                .any(|&corner| point_segment_distance(corner, (leg.from, leg.to)) <= reach_m)
    })
}

/// The next size below in a series of round numbers of micrometres.
fn rounded(cell_m: f64) -> f64 {
    const SERIES: [f64; 11] = [1.0, 1.2, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0];
    let micrometres = cell_m * 1e6 * (1.0 + 1e-9);
    let mut decade = 1.0;
    while decade * 10.0 <= micrometres {
        decade *= 10.0;
    }
    while decade > micrometres && decade > 1e-3 {
        decade /= 10.0;
    }
    let step = SERIES.iter().rev().find(|&&step| step * decade <= micrometres).copied().unwrap_or(1.0);
    step * decade / 1e6
}

/// Number of unknown branch currents and memory in bytes that a plane with `copper_m2` of copper in a box takes.
///
/// Two branches for each copper cell. Memory: the sparse factor holds about 4.3 log2(n) - 14 numbers for each of n
/// cells with nested dissection (measured at 2^18 and 2^20 cells), half as much again while it is made, and some
/// fifty numbers for each cell of the box for the transforms and the vectors of the iteration.
pub fn cost(plane: Bounds, copper_m2: f64, cell_m: f64) -> (usize, usize) {
    let cell_m2 = cell_m * cell_m;
    let copper_cells = (copper_m2 / cell_m2).max(1.0);
    let box_cells = (plane.width() * plane.height() / cell_m2).max(1.0);
    let factor = (4.3 * libm::log2(copper_cells) - 14.0).max(10.0) * copper_cells;
    let bytes = 8.0 * (1.5 * factor + 50.0 * box_cells);
    ((2.0 * copper_cells) as usize, bytes as usize)
}

/// Length-weighted mean over legs.
pub fn mean(legs: &[TrackLeg], value: impl Fn(&TrackLeg) -> f64) -> f64 {
    let length = |leg: &TrackLeg| Point::distance(leg.from, leg.to);
    let total: f64 = legs.iter().map(length).sum();
    legs.iter().map(|leg| length(leg) * value(leg)).sum::<f64>() / total.max(1e-12)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plane(width_mm: f64, height_mm: f64) -> Bounds {
        Bounds { min: Point::default(), max: Point::mm(width_mm, height_mm) }
    }

    #[test]
    fn round_numbers_below() {
        for (metres, round) in
            [(0.2e-3, 0.2e-3), (0.199e-3, 0.15e-3), (0.25e-3, 0.25e-3), (99e-6, 80e-6), (1e-3, 1e-3)]
        {
            assert!((rounded(metres) - round).abs() < 1e-12, "{metres}: {}", rounded(metres));
        }
    }

    #[test]
    fn cells_follow_the_height_and_the_size_of_the_plane() {
        let choice = |bounds, height_m: f64| choose(bounds, height_m, &[], &[]);
        assert!((choice(plane(40.0, 30.0), 0.2e-3).cell_m - 0.1e-3).abs() < 1e-12);
        let large = choice(plane(100.0, 100.0), 0.2e-3);
        assert!(!large.enlarged && large.cell_m > 0.14e-3 && large.cell_m <= 0.2e-3, "{large:?}");
        let huge = choice(plane(300.0, 300.0), 0.1e-3);
        assert!(huge.enlarged && huge.cell_m > 0.2e-3, "{huge:?}");
    }
}
