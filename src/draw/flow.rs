//! Direction of the return on a map: sparse small arrows along the in-phase current.
//!
//! An arrow stands on a hexagonal grid where the mean in-phase current of the cells under it is at least 0.4 of their
//! mean density, so that it is left out where directions differ or the current is out of phase. It keeps off the
//! track, labels, edges, hot copper and the lowest 6 dB of the scale. Checked by:
//! `arrows_point_along_the_current_and_keep_off_the_track`.

use super::callout::around;
use super::contour::from_segment;
use super::density::Density;
use super::map::MapLook;
use super::path::PathData;
use super::place::{Line, Placer};
use super::scene::{Group, Shape};
use super::view::View;
use crate::field::ReturnMap;
use crate::geom::{Grid, Point};
use crate::style::Rgb;

/// Distance between arrows in mm on the sheet.
const PITCH: f64 = 9.0;
/// Length of an arrow in mm.
const LENGTH: f64 = 3.0;
/// Length and half width of its head in mm.
const HEAD: (f64, f64) = (1.1, 0.42);
/// Width of its line in mm.
const WIDTH: f64 = 0.2;
/// Least part of the mean density that flows one way in phase.
const LEAST_PART: f64 = 0.4;
/// Distance from the track in mm.
const FROM_TRACK: f64 = 2.6;
/// Levels in dB above the scale's lower end, and below its upper end, between which arrows stand.
const LEVELS: (f64, f64) = (6.0, 12.0);

/// In-phase current of a plane, coarse enough to be kept.
#[derive(Clone, Debug)]
pub struct Flow {
    grid: Grid,
    in_phase: Vec<[f32; 2]>,
}

impl Flow {
    /// The in-phase part of a map's density.
    pub fn of(map: &ReturnMap) -> Self {
        let grid = map.grid;
        let mut in_phase = Vec::with_capacity(grid.len());
        for iy in 0..grid.ny {
            for ix in 0..grid.nx {
                let (kx, ky) = map.density(ix, iy);
                in_phase.push([kx.re as f32, ky.re as f32]);
            }
        }
        Self { grid, in_phase }
    }

    /// Mean in-phase current and mean density of the copper cells within `reach_m` of a point, in A/m per A.
    fn mean(&self, density: &Density, at: Point, reach_m: f64) -> Option<(Point, f64)> {
        let range = |value: f64, origin: f64, count: usize| {
            let low = ((value - reach_m - origin) / self.grid.cell_m).max(0.0) as usize;
            let high = ((value + reach_m - origin) / self.grid.cell_m).max(0.0) as usize;
            low.min(count)..(high + 1).min(count)
        };
        let (mut sum, mut size, mut count) = (Point::default(), 0.0, 0_usize);
        let columns = range(at.x, self.grid.origin.x, self.grid.nx);
        for iy in range(at.y, self.grid.origin.y, self.grid.ny) {
            for ix in columns.clone() {
                let index = self.grid.index(ix, iy);
                if density.copper[index] {
                    let [kx, ky] = self.in_phase[index];
                    sum = sum + Point::new(f64::from(kx), f64::from(ky));
                    size += density.values[index];
                    count += 1;
                }
            }
        }
        (count > 0).then(|| (sum * (1.0 / count as f64), size / count as f64))
    }
}

/// Arrows for `flow`; `tracks` are lines of the sheet to keep off.
pub fn arrows(
    (flow, density): (&Flow, &Density),
    view: &View,
    look: &MapLook,
    tracks: &[Line],
    placer: &Placer,
) -> Group {
    let mut paths: Vec<(Rgb, PathData, PathData)> = Vec::new();
    let (right, bottom) = (view.x + view.width(), view.y + view.height());
    let row_pitch = PITCH * 0.866;
    let mut row = 0;
    let mut y = view.y + 0.5 * PITCH;
    while y < bottom - 0.4 * PITCH {
        let mut x = view.x + if row % 2 == 0 { 0.5 } else { 1.0 } * PITCH;
        while x < right - 0.4 * PITCH {
            let near = tracks.iter().any(|&(a, b)| from_segment((x, y), a, b) < FROM_TRACK);
            if !near
                && !placer.is_taken(around((x, y), 0.6 * LENGTH))
                && let Some((line, ink)) = arrow((flow, density), (x, y), view, look)
            {
                add(&mut paths, line, ink);
            }
            x += PITCH;
        }
        y += row_pitch;
        row += 1;
    }
    let mut group = Group::new("flow").labeled("graphics-object", "direction of the in-phase return");
    for (ink, shafts, heads) in paths {
        group.shape(Shape::stroked(shafts, ink, WIDTH));
        group.shape(Shape::filled(heads, ink));
    }
    group
}

/// The arrow at a point of the sheet, tail first, and its ink.
fn arrow(
    (flow, density): (&Flow, &Density),
    (x, y): (f64, f64),
    view: &View,
    look: &MapLook,
) -> Option<(Line, Rgb)> {
    let at = view.back((x, y));
    let reach_m = (0.4 * LENGTH * 1e-3 / view.scale).max(flow.grid.cell_m);
    let (mean, size) = flow.mean(density, at, reach_m)?;
    let level = look.scale.level_db(size);
    let shown = level >= look.scale.low_db() + LEVELS.0 && level <= look.scale.high_db() - LEVELS.1;
    if !shown || mean.length() < LEAST_PART * size {
        return None;
    }
    let ahead = view.place(at + mean * (1e-3 / mean.length()));
    let (ux, uy) = (ahead.0 - x, ahead.1 - y);
    let length = libm::hypot(ux, uy);
    let (ux, uy) = (0.5 * LENGTH * ux / length, 0.5 * LENGTH * uy / length);
    let line = ((x - ux, y - uy), (x + ux, y + uy));
    let clear =
        [-1.4, -0.7, 0.0, 0.7, 1.4].iter().all(|t| density.is_copper(view.back((x + t * ux, y + t * uy))));
    clear.then(|| (line, super::map::contour_ink(look.style, &look.scale, size)))
}

fn add(paths: &mut Vec<(Rgb, PathData, PathData)>, (tail, tip): Line, ink: Rgb) {
    let known = paths.iter().position(|(color, ..)| *color == ink);
    let index = known.unwrap_or_else(|| {
        paths.push((ink, PathData::coarse(), PathData::coarse()));
        paths.len() - 1
    });
    let (ux, uy) = ((tip.0 - tail.0) / LENGTH, (tip.1 - tail.1) / LENGTH);
    let neck = (tip.0 - HEAD.0 * ux, tip.1 - HEAD.0 * uy);
    let side = |sign: f64| (neck.0 - sign * HEAD.1 * uy, neck.1 + sign * HEAD.1 * ux);
    let (_, shafts, heads) = &mut paths[index];
    shafts.line(&[tail, neck]);
    heads.ring(&[tip, side(1.0), side(-1.0)]);
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::draw::DensityScale;

    #[test]
    fn arrows_point_along_the_current_and_keep_off_the_track() {
        let style = crate::read::style::built_in("paper").expect("a style");
        let grid = Grid { origin: Point::mm(0.0, 0.0), cell_m: 0.5e-3, nx: 120, ny: 80 };
        let density = Density::new(grid, vec![true; grid.len()], vec![20.0; grid.len()]);
        let view = View::filling(grid.bounds(), 0.0, 0.0, 120.0, 80.0);
        let scale = DensityScale::new(0.2e-3, 60.0);
        let look = MapLook { style: &style, scale, px_per_mm: 1.0, small: false, room_right: 0.0 };
        let placer = Placer::new([0.0, 0.0, 120.0, 80.0]);
        // Down on the board is down on the sheet.
        let flow = Flow { grid, in_phase: vec![[0.0, -20.0]; grid.len()] };
        let track = [((0.0, 40.0), (120.0, 40.0))];
        let (line, _) = arrow((&flow, &density), (60.0, 20.0), &view, &look).expect("an arrow");
        assert!((line.1.1 - line.0.1 - LENGTH).abs() < 1e-9 && (line.1.0 - line.0.0).abs() < 1e-9);
        let group = arrows((&flow, &density), &view, &look, &track, &placer);
        assert_eq!(group.items.len(), 2, "one ink: shafts and heads");
        // Out of phase: nothing flows with the track's current, and nothing is drawn.
        let flow = Flow { grid, in_phase: vec![[0.0, -2.0]; grid.len()] };
        assert!(arrows((&flow, &density), &view, &look, &track, &placer).items.is_empty());
    }
}
