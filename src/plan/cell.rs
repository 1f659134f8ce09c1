//! The size of the cells, and what a solve with them takes.
//!
//! With the band-limited kernel cells of h give the density within 2 %, of h/2 within 1 %. All sheets of a path share
//! one grid, so cells of h are taken (the smallest h of the path), h/2 only while that stays small, and more than h only
//! where memory would run out. Voids near the track that are narrower than a cell, and copper beside the track that is
//! nearer than a cell, ask for smaller cells, down to h/2.

use super::Void;
use super::void::mean_width_m;
use crate::geom::locate::point_segment_distance;
use crate::geom::{Bounds, Point};
use crate::plan::TrackLeg;

/// Cells of all sheets up to which h/2 is taken.
const EASY_CELLS: f64 = 60e3;
/// Cells of all sheets that memory allows.
const MOST_CELLS: f64 = 2.4e6;
/// Cells that the mean width of a void near the track should have.
const ACROSS_VOID: f64 = 1.0;
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

/// Chooses the cell for `sheets` sheets in a box over which a track runs at `height_m`; `finest_m` is what voids and
/// copper beside the track ask for.
pub fn choose(bounds: Bounds, sheets: usize, height_m: f64, finest_m: f64) -> CellChoice {
    let area = (bounds.width() * bounds.height()).max(1e-12) * sheets.max(1) as f64;
    let cells_of = |cell_m: f64| area / (cell_m * cell_m);
    let easy = cells_of(0.5 * height_m) <= EASY_CELLS;
    let wanted = if easy { 0.5 * height_m } else { finest_m.clamp(0.5 * height_m, height_m) };
    let cell_m = rounded(wanted);
    if cells_of(cell_m) <= MOST_CELLS {
        return CellChoice { cell_m, enlarged: false };
    }
    let mut cell_m = rounded((area / MOST_CELLS).sqrt());
    while cells_of(cell_m) > MOST_CELLS {
        // more than the largest ratio of neighbours in the series, so that each round takes the next size
        cell_m = rounded(cell_m * 1.35);
    }
    CellChoice { cell_m, enlarged: cell_m > height_m }
}

/// The cell that the narrowest void near a track asks for, in metres; infinite where there is none.
pub fn by_voids(height_m: f64, legs: &[TrackLeg], voids: &[Void]) -> f64 {
    let near = voids.iter().filter(|void| near(void, legs, NEAR_HEIGHTS * height_m));
    near.map(mean_width_m).fold(f64::INFINITY, f64::min) / ACROSS_VOID
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

/// Number of unknown branch currents and memory in bytes that `sheets` sheets with `copper_m2` of copper in a box take.
///
/// Two branches for each copper cell. Memory: the sparse factor holds about 4.3 log2(n) - 14 numbers for each of n
/// cells with nested dissection (measured at 2^18 and 2^20 cells), half as much again while it is made, and some
/// fifty numbers for each cell of the box for the transforms and the vectors of the iteration.
pub fn cost(bounds: Bounds, sheets: usize, copper_m2: f64, cell_m: f64) -> (usize, usize) {
    let cell_m2 = cell_m * cell_m;
    let copper_cells = (copper_m2 / cell_m2).max(1.0);
    let box_cells = (bounds.width() * bounds.height() * sheets as f64 / cell_m2).max(1.0);
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
    fn cells_follow_the_height_the_board_and_what_is_near() {
        let choice = |bounds, sheets, finest_m| choose(bounds, sheets, 0.2e-3, finest_m);
        let near = |got: f64, want: f64| assert!((got - want).abs() < 1e-12, "{got} for {want}");
        near(choice(plane(20.0, 15.0), 1, f64::INFINITY).cell_m, 0.1e-3);
        near(choice(plane(100.0, 80.0), 4, f64::INFINITY).cell_m, 0.2e-3);
        near(choice(plane(100.0, 80.0), 4, 0.15e-3).cell_m, 0.15e-3);
        near(choice(plane(50.0, 40.0), 4, 0.01e-3).cell_m, 0.1e-3);
        // 3.2 million cells of 0.1 mm are more than memory allows
        near(choice(plane(100.0, 80.0), 4, 0.01e-3).cell_m, 0.12e-3);
        let huge = choice(plane(300.0, 300.0), 2, f64::INFINITY);
        assert!(huge.enlarged && huge.cell_m > 0.2e-3, "{huge:?}");
        for side_mm in 100..2000 {
            let sheets = 1 + side_mm % 6;
            let large = choice(plane(side_mm as f64, 200.0), sheets, f64::INFINITY);
            let cells = 0.2 * 1e-3 * side_mm as f64 * sheets as f64 / (large.cell_m * large.cell_m);
            assert!(cells <= 2.4e6, "{side_mm}: {large:?}");
        }
    }
}
