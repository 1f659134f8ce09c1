//! Places labels on a map: cheapest free box near its spot, the same for the same input.
//!
//! A cost raster (0.5 mm) says how much each place of the map matters; a label may not touch another box or the rim.
//! Candidates lie on circles round the spot, 16 directions each. Cost = mean cost under the box + 0.11 for each mm of
//! distance; ties are broken by distance, then direction. Checked by: `labels_never_overlap_and_stay_inside`.

use super::density::Raster;

/// Side of a cost cell in mm.
const STEP: f64 = 0.5;
/// Distances of candidates from the spot in mm, edge of the box to the spot.
const RADII: [f64; 13] = [2.0, 2.8, 3.6, 5.0, 7.0, 9.0, 12.0, 16.0, 20.0, 26.0, 34.0, 44.0, 60.0];
/// Directions of candidates.
const DIRECTIONS: usize = 16;
/// Cost of a millimeter between spot and box.
const COST_PER_MM: f64 = 0.11;

/// An upright box on the sheet: left, top, right, bottom in mm.
pub type Rect = [f64; 4];

/// Finds places for labels.
#[derive(Clone, Debug)]
pub struct Placer {
    area: Rect,
    nx: usize,
    ny: usize,
    cost: Vec<f64>,
    taken: Vec<Rect>,
}

impl Placer {
    /// A placer for the box `area` of the sheet, nothing in it.
    pub fn new(area: Rect) -> Self {
        let nx = (((area[2] - area[0]) / STEP).ceil() as usize).max(1);
        let ny = (((area[3] - area[1]) / STEP).ceil() as usize).max(1);
        Self { area, nx, ny, cost: vec![0.0; nx * ny], taken: Vec::new() }
    }

    /// Lets dense places cost up to 1: (level + 45 dB)/45 dB, squared. The raster covers the left `width` mm of the area.
    pub fn add_density(&mut self, raster: &Raster, width: f64) {
        let columns = ((width / STEP) as usize).clamp(1, self.nx);
        for iy in 0..self.ny {
            for ix in 0..columns {
                let jx = (ix * raster.nx / columns).min(raster.nx - 1);
                let jy = (iy * raster.ny / self.ny).min(raster.ny - 1);
                let u = ((raster.level_db[jy * raster.nx + jx] + 45.0) / 45.0).clamp(0.0, 1.0);
                self.cost[iy * self.nx + ix] += u * u;
            }
        }
    }

    /// Lets everything within `reach` mm of a line cost `cost` more.
    pub fn add_line(&mut self, points: &[(f64, f64)], reach: f64, cost: f64) {
        for pair in points.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            let rect =
                [a.0.min(b.0) - reach, a.1.min(b.1) - reach, a.0.max(b.0) + reach, a.1.max(b.1) + reach];
            self.each(rect, |cell, at| {
                if super::contour::from_segment(at, a, b) <= reach {
                    *cell += cost;
                }
            });
        }
    }

    /// Lets a box cost `cost` more.
    pub fn add_box(&mut self, rect: Rect, cost: f64) {
        self.each(rect, |cell, _| *cell += cost);
    }

    /// Keeps later labels out of a box.
    pub fn take(&mut self, rect: Rect) {
        self.taken.push(rect);
    }

    fn each(&mut self, rect: Rect, mut change: impl FnMut(&mut f64, (f64, f64))) {
        let index =
            |value: f64, low: f64, count: usize| (((value - low) / STEP).max(0.0) as usize).min(count);
        let (x0, x1) = (index(rect[0], self.area[0], self.nx), index(rect[2] + STEP, self.area[0], self.nx));
        let (y0, y1) = (index(rect[1], self.area[1], self.ny), index(rect[3] + STEP, self.area[1], self.ny));
        for iy in y0..y1 {
            for ix in x0..x1 {
                let at = (self.area[0] + (ix as f64 + 0.5) * STEP, self.area[1] + (iy as f64 + 0.5) * STEP);
                change(&mut self.cost[iy * self.nx + ix], at);
            }
        }
    }

    /// Mean cost under a box, none where it leaves the area or touches a taken box.
    fn cost_of(&self, rect: Rect) -> Option<f64> {
        let inside = rect[0] >= self.area[0] + 0.4
            && rect[1] >= self.area[1] + 0.4
            && rect[2] <= self.area[2] - 0.4
            && rect[3] <= self.area[3] - 0.4;
        if !inside || self.taken.iter().any(|taken| meet(taken, &rect)) {
            return None;
        }
        let index = |value: f64, low: f64, count: usize| (((value - low) / STEP) as usize).min(count - 1);
        let (x0, x1) = (index(rect[0], self.area[0], self.nx), index(rect[2], self.area[0], self.nx));
        let (y0, y1) = (index(rect[1], self.area[1], self.ny), index(rect[3], self.area[1], self.ny));
        let mut sum = 0.0;
        for iy in y0..=y1 {
            sum += self.cost[iy * self.nx + x0..=iy * self.nx + x1].iter().sum::<f64>();
        }
        Some(sum / ((x1 - x0 + 1) * (y1 - y0 + 1)) as f64)
    }

    /// The best box of `width` x `height` mm for a label at `spot`; it is taken from then on. None when nothing near is
    /// free.
    pub fn label(&mut self, spot: (f64, f64), width: f64, height: f64) -> Option<Rect> {
        let mut best: Option<(i64, usize, usize, Rect)> = None;
        for (rank, &radius) in RADII.iter().enumerate() {
            for direction in 0..DIRECTIONS {
                // Starts to the right and goes round, so that equal costs put the label to the right.
                let angle = direction as f64 * 2.0 * std::f64::consts::PI / DIRECTIONS as f64;
                let (ux, uy) = (libm::cos(angle), libm::sin(angle));
                let (x, y) = (spot.0 + ux * radius, spot.1 + uy * radius);
                let left = x + 0.5 * (ux.clamp(-0.71, 0.71) / 0.71 - 1.0) * width;
                let top = y + 0.5 * (uy.clamp(-0.71, 0.71) / 0.71 - 1.0) * height;
                let rect = [left, top, left + width, top + height];
                let Some(cost) = self.cost_of(rect) else { continue };
                let key = ((cost + COST_PER_MM * radius) * 1e4).round() as i64;
                if best.is_none_or(|(known, ..)| key < known) {
                    best = Some((key, rank, direction, rect));
                }
            }
        }
        let (_, _, _, rect) = best?;
        self.take(grown(rect, 0.6));
        Some(rect)
    }

    /// The cheapest of the given boxes, earlier ones first among equals; it is taken from then on.
    pub fn cheapest(&mut self, candidates: impl IntoIterator<Item = (Rect, f64)>) -> Option<Rect> {
        let mut best: Option<(i64, Rect)> = None;
        for (rect, extra) in candidates {
            let Some(cost) = self.cost_of(rect) else { continue };
            let key = ((cost + extra) * 1e4).round() as i64;
            if best.is_none_or(|(known, _)| key < known) {
                best = Some((key, rect));
            }
        }
        let (_, rect) = best?;
        self.take(grown(rect, 0.6));
        Some(rect)
    }
}

fn meet(a: &Rect, b: &Rect) -> bool {
    a[0] < b[2] && b[0] < a[2] && a[1] < b[3] && b[1] < a[3]
}

/// `rect` grown by `by` mm on all sides.
pub fn grown(rect: Rect, by: f64) -> Rect {
    [rect[0] - by, rect[1] - by, rect[2] + by, rect[3] + by]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_never_overlap_and_stay_inside() {
        let area = [10.0, 20.0, 110.0, 90.0];
        let mut seed = 7_u64;
        let mut random = || {
            seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
            (seed >> 33) as f64 / f64::from(u32::MAX >> 1)
        };
        for _ in 0..50 {
            let mut placer = Placer::new(area);
            let mut placed: Vec<Rect> = Vec::new();
            for _ in 0..12 {
                let spot = (10.0 + 100.0 * random(), 20.0 + 70.0 * random());
                placed.extend(placer.label(spot, 8.0 + 20.0 * random(), 4.0));
            }
            assert!(placed.len() > 8, "{}", placed.len());
            for (index, a) in placed.iter().enumerate() {
                assert!(a[0] >= area[0] && a[1] >= area[1] && a[2] <= area[2] && a[3] <= area[3]);
                assert!(placed[..index].iter().all(|b| !meet(a, b)));
            }
        }
    }

    #[test]
    fn a_label_avoids_what_costs() {
        let mut placer = Placer::new([0.0, 0.0, 100.0, 60.0]);
        placer.add_box([50.0, 0.0, 100.0, 60.0], 2.0);
        let rect = placer.label((50.0, 30.0), 20.0, 4.0).expect("there is room");
        assert!(rect[2] <= 50.0, "{rect:?}");
    }
}
