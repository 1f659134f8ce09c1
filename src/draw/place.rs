//! Places labels and callouts on a map: the cheapest free place near a spot, the same for the same input.
//!
//! The map is a raster of 0.5 mm cells with a cost (how much a place matters) and a block (hot copper and tracks, which
//! no leader may cross). In this order:
//! 1. Rings round the spots of findings are taken first ([`Placer::take`]), so that nothing covers them.
//! 2. A label is a box near its spot: candidates lie on circles, 16 directions each; cost = mean cost under the box +
//!    0.11 for each mm of distance. A box that lies apart needs a leader, so the way must be free.
//! 3. A callout is a disc with words beside it and a leader to the ring: candidates lie on circles of 6 to 60 mm round
//!    the spot (every 2 mm), 48 directions, words right or left; cost = cost under the box + 0.11 for each mm of leader
//!    + 0.55 x mean cost along it + 0.15 where its direction is no multiple of 45 degrees.
//!
//! Refused is whatever leaves the area, touches a taken box or an earlier leader, or whose leader crosses a block, a
//! taken box or another leader (or comes nearer than 1.2 mm). Ties: cost rounded to 1e-4, then distance, direction,
//! side. Where nothing is left for a callout, its disc touches the ring without words; where even that is taken, the
//! number stands in the list alone. Checked by: `labels_never_overlap_and_stay_inside`,
//! `callouts_on_two_hundred_boards_cross_nothing`, `a_crowded_callout_falls_back`.

use super::contour::from_segment;
use super::density::Raster;

/// Side of a cost cell in mm.
const STEP: f64 = 0.5;
/// Distances of candidates from the spot in mm, edge of the box to the spot.
const RADII: [f64; 13] = [2.0, 2.8, 3.6, 5.0, 7.0, 9.0, 12.0, 16.0, 20.0, 26.0, 34.0, 44.0, 60.0];
/// Directions of candidates.
const DIRECTIONS: usize = 16;
/// Cost of a millimeter between spot and box.
const COST_PER_MM: f64 = 0.11;

/// Directions of callouts.
const CALLOUT_DIRECTIONS: usize = 48;
/// Nearest and farthest callout in mm from its spot, and the step between.
const CALLOUT_RADII: [f64; 3] = [6.0, 60.0, 2.0];
/// Least distance between two leaders in mm.
const LEADERS_APART: f64 = 1.2;

/// An upright box on the sheet: left, top, right, bottom in mm.
pub type Rect = [f64; 4];

/// A straight line on the sheet in mm.
pub type Line = ((f64, f64), (f64, f64));

/// Where a callout went.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    /// Middle of the disc in mm.
    pub disc: (f64, f64),
    /// Box round disc and words.
    pub rect: Rect,
    /// From the ring to the disc; none where the disc touches the ring.
    pub leader: Option<Line>,
    /// Side of the words: right or left of the disc; none for a disc without words.
    pub words_right: Option<bool>,
}

/// What a callout needs.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Wanted {
    /// Middle of its ring in mm.
    pub spot: (f64, f64),
    /// Radius of the ring.
    pub ring: f64,
    /// Half the width and half the height of the disc.
    pub disc: (f64, f64),
    /// Width of the words, gap to the disc included; 0 for none.
    pub words: f64,
}

/// Finds places for labels.
#[derive(Clone, Debug)]
pub struct Placer {
    area: Rect,
    nx: usize,
    ny: usize,
    cost: Vec<f64>,
    blocked: Vec<bool>,
    taken: Vec<Rect>,
    leaders: Vec<Line>,
}

impl Placer {
    /// A placer for the box `area` of the sheet, nothing in it.
    pub fn new(area: Rect) -> Self {
        let nx = (((area[2] - area[0]) / STEP).ceil() as usize).max(1);
        let ny = (((area[3] - area[1]) / STEP).ceil() as usize).max(1);
        Self {
            area,
            nx,
            ny,
            cost: vec![0.0; nx * ny],
            blocked: vec![false; nx * ny],
            taken: Vec::new(),
            leaders: Vec::new(),
        }
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

    /// Keeps leaders off places of at least `from_db`. The raster covers the left `width` mm of the area.
    pub fn block_density(&mut self, raster: &Raster, width: f64, from_db: f64) {
        let columns = ((width / STEP) as usize).clamp(1, self.nx);
        for iy in 0..self.ny {
            for ix in 0..columns {
                let jx = (ix * raster.nx / columns).min(raster.nx - 1);
                let jy = (iy * raster.ny / self.ny).min(raster.ny - 1);
                self.blocked[iy * self.nx + ix] |= raster.level_db[jy * raster.nx + jx] >= from_db;
            }
        }
    }

    /// Keeps leaders farther than `reach` mm from a line.
    pub fn block_line(&mut self, points: &[(f64, f64)], reach: f64) {
        for pair in points.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            let rect =
                [a.0.min(b.0) - reach, a.1.min(b.1) - reach, a.0.max(b.0) + reach, a.1.max(b.1) + reach];
            self.each_index(rect, |placer, index, at| {
                placer.blocked[index] |= from_segment(at, a, b) <= reach;
            });
        }
    }

    /// Lets everything within `reach` mm of a line cost `cost` more.
    pub fn add_line(&mut self, points: &[(f64, f64)], reach: f64, cost: f64) {
        for pair in points.windows(2) {
            let (a, b) = (pair[0], pair[1]);
            let rect =
                [a.0.min(b.0) - reach, a.1.min(b.1) - reach, a.0.max(b.0) + reach, a.1.max(b.1) + reach];
            self.each(rect, |cell, at| {
                if from_segment(at, a, b) <= reach {
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
        self.each_index(rect, |placer, index, at| change(&mut placer.cost[index], at));
    }

    fn each_index(&mut self, rect: Rect, mut change: impl FnMut(&mut Self, usize, (f64, f64))) {
        let index =
            |value: f64, low: f64, count: usize| (((value - low) / STEP).max(0.0) as usize).min(count);
        let (x0, x1) = (index(rect[0], self.area[0], self.nx), index(rect[2] + STEP, self.area[0], self.nx));
        let (y0, y1) = (index(rect[1], self.area[1], self.ny), index(rect[3] + STEP, self.area[1], self.ny));
        for iy in y0..y1 {
            for ix in x0..x1 {
                let at = (self.area[0] + (ix as f64 + 0.5) * STEP, self.area[1] + (iy as f64 + 0.5) * STEP);
                change(self, iy * self.nx + ix, at);
            }
        }
    }

    /// Whether something of this box is taken, or a leader runs through it.
    pub fn is_taken(&self, rect: Rect) -> bool {
        self.taken.iter().any(|taken| meet(taken, &rect))
            || self.leaders.iter().any(|&line| crosses(line, rect))
    }

    /// Mean cost along a line; none where it may not run. `own` is a taken box that the line may touch: that round its
    /// spot.
    fn way(&self, line: Line, own: Option<Rect>) -> Option<f64> {
        let (a, b) = line;
        let length = libm::hypot(b.0 - a.0, b.1 - a.1);
        let steps = ((length / (0.5 * STEP)) as usize).max(1);
        let mut sum = 0.0;
        for step in 0..=steps {
            let t = step as f64 / steps as f64;
            let (x, y) = (a.0 + t * (b.0 - a.0), a.1 + t * (b.1 - a.1));
            if x < self.area[0] || y < self.area[1] || x > self.area[2] || y > self.area[3] {
                return None;
            }
            let ix = (((x - self.area[0]) / STEP) as usize).min(self.nx - 1);
            let iy = (((y - self.area[1]) / STEP) as usize).min(self.ny - 1);
            if self.blocked[iy * self.nx + ix] {
                return None;
            }
            sum += self.cost[iy * self.nx + ix];
        }
        let taken = self.taken.iter().any(|&rect| own != Some(rect) && crosses(line, rect));
        let near = self.leaders.iter().any(|&other| apart(line, other) < LEADERS_APART);
        (!taken && !near).then_some(sum / (steps + 1) as f64)
    }

    /// The best place of a callout, taken from then on; its ring should have been taken before all callouts, see
    /// [`ring_box`]. None where everything is taken.
    pub fn callout(&mut self, wanted: &Wanted) -> Option<Place> {
        let mut best: Option<(i64, Place)> = None;
        let own = Some(ring_box(wanted.spot, wanted.ring));
        let sides: &[bool] = if wanted.words > 0.0 { &[true, false] } else { &[true] };
        let [nearest, farthest, step] = CALLOUT_RADII;
        let mut radius = nearest.max(wanted.ring + wanted.disc.0.max(wanted.disc.1) + 1.0);
        while radius <= farthest {
            for direction in 0..CALLOUT_DIRECTIONS {
                let (ux, uy) = unit(direction, CALLOUT_DIRECTIONS);
                let disc = (wanted.spot.0 + ux * radius, wanted.spot.1 + uy * radius);
                let leader = (
                    (wanted.spot.0 + ux * wanted.ring, wanted.spot.1 + uy * wanted.ring),
                    (disc.0 - ux * wanted.disc.1, disc.1 - uy * wanted.disc.1),
                );
                let odd = if direction % (CALLOUT_DIRECTIONS / 8) == 0 { 0.0 } else { 0.15 };
                let mut way: Option<Option<f64>> = None;
                for &right in sides {
                    let rect = callout_box(disc, wanted, right);
                    let Some(cost) = self.cost_of(rect) else { continue };
                    let Some(along) = *way.get_or_insert_with(|| self.way(leader, own)) else { break };
                    let cost = cost + COST_PER_MM * (radius - wanted.ring) + 0.55 * along + odd;
                    let key = (cost * 1e4).round() as i64;
                    if best.as_ref().is_none_or(|(known, _)| key < *known) {
                        let words_right = (wanted.words > 0.0).then_some(right);
                        best = Some((key, Place { disc, rect, leader: Some(leader), words_right }));
                    }
                }
            }
            radius += step;
        }
        let place = best.map(|(_, place)| place).or_else(|| self.touching(wanted))?;
        self.take(grown(place.rect, 0.6));
        self.leaders.extend(place.leader);
        Some(place)
    }

    /// A disc without words that touches its ring.
    fn touching(&self, wanted: &Wanted) -> Option<Place> {
        let own = ring_box(wanted.spot, wanted.ring);
        let mut best: Option<(i64, Place)> = None;
        for direction in 0..CALLOUT_DIRECTIONS {
            let (ux, uy) = unit(direction, CALLOUT_DIRECTIONS);
            let far = wanted.ring + libm::hypot(wanted.disc.0 * ux, wanted.disc.1 * uy);
            let disc = (wanted.spot.0 + ux * far, wanted.spot.1 + uy * far);
            let rect = callout_box(disc, &Wanted { words: 0.0, ..*wanted }, true);
            let others = self.taken.iter().any(|taken| *taken != own && meet(taken, &rect))
                || self.leaders.iter().any(|&line| crosses(line, rect));
            let Some(cost) = self.mean_cost(rect).filter(|_| !others) else { continue };
            let key = (cost * 1e4).round() as i64;
            if best.as_ref().is_none_or(|(known, _)| key < *known) {
                best = Some((key, Place { disc, rect, leader: None, words_right: None }));
            }
        }
        best.map(|(_, place)| place)
    }

    /// Mean cost under a box, none where it leaves the area or touches a taken box or a leader.
    fn cost_of(&self, rect: Rect) -> Option<f64> {
        if self.is_taken(rect) { None } else { self.mean_cost(rect) }
    }

    /// Mean cost under a box, none where it leaves the area.
    fn mean_cost(&self, rect: Rect) -> Option<f64> {
        let inside = rect[0] >= self.area[0] + 0.4
            && rect[1] >= self.area[1] + 0.4
            && rect[2] <= self.area[2] - 0.4
            && rect[3] <= self.area[3] - 0.4;
        if !inside {
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

    /// The best box of `width` x `height` mm for a label at `spot`, and its leader where it lies apart; both are taken
    /// from then on. None when nothing near is free.
    pub fn label(&mut self, spot: (f64, f64), width: f64, height: f64) -> Option<(Rect, Option<Line>)> {
        let mut best: Option<(i64, Rect, Option<Line>)> = None;
        for &radius in &RADII {
            for direction in 0..DIRECTIONS {
                // Starts to the right and goes round, so that equal costs put the label to the right.
                let (ux, uy) = unit(direction, DIRECTIONS);
                let (x, y) = (spot.0 + ux * radius, spot.1 + uy * radius);
                let left = x + 0.5 * (ux.clamp(-0.71, 0.71) / 0.71 - 1.0) * width;
                let top = y + 0.5 * (uy.clamp(-0.71, 0.71) / 0.71 - 1.0) * height;
                let rect = [left, top, left + width, top + height];
                let Some(cost) = self.cost_of(rect) else { continue };
                let key = ((cost + COST_PER_MM * radius) * 1e4).round() as i64;
                if best.is_none_or(|(known, ..)| key < known) {
                    let leader = label_leader(spot, rect);
                    if leader.is_none_or(|line| self.way(line, None).is_some()) {
                        best = Some((key, rect, leader));
                    }
                }
            }
        }
        let (_, rect, leader) = best?;
        self.take(grown(rect, 0.6));
        self.leaders.extend(leader);
        Some((rect, leader))
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

/// The box that a ring takes.
pub fn ring_box(spot: (f64, f64), ring: f64) -> Rect {
    [spot.0 - ring, spot.1 - ring, spot.0 + ring, spot.1 + ring]
}

/// From a spot to a box that lies apart from it, 1.6 mm off the spot.
fn label_leader(spot: (f64, f64), rect: Rect) -> Option<Line> {
    let end = (spot.0.clamp(rect[0], rect[2]), spot.1.clamp(rect[1], rect[3]));
    let length = libm::hypot(end.0 - spot.0, end.1 - spot.1);
    let t = 1.6 / length;
    (length >= 4.5).then_some(((spot.0 + t * (end.0 - spot.0), spot.1 + t * (end.1 - spot.1)), end))
}

fn unit(direction: usize, of: usize) -> (f64, f64) {
    let angle = direction as f64 * 2.0 * std::f64::consts::PI / of as f64;
    (libm::cos(angle), libm::sin(angle))
}

fn callout_box(disc: (f64, f64), wanted: &Wanted, right: bool) -> Rect {
    let (w, h) = wanted.disc;
    let (left, right) = if right { (0.0, wanted.words) } else { (wanted.words, 0.0) };
    [disc.0 - w - left, disc.1 - h, disc.0 + w + right, disc.1 + h]
}

/// Whether a line runs through a box (Liang and Barsky 1984).
pub fn crosses((a, b): Line, rect: Rect) -> bool {
    let (dx, dy) = (b.0 - a.0, b.1 - a.1);
    let (mut from, mut to) = (0.0_f64, 1.0_f64);
    for (p, q) in [(-dx, a.0 - rect[0]), (dx, rect[2] - a.0), (-dy, a.1 - rect[1]), (dy, rect[3] - a.1)] {
        if p == 0.0 {
            if q < 0.0 {
                return false;
            }
        } else if p < 0.0 {
            from = from.max(q / p);
        } else {
            to = to.min(q / p);
        }
    }
    from < to
}

/// Distance between two lines in mm, 0 where they cross.
fn apart(a: Line, b: Line) -> f64 {
    let side = |(p, q): Line, r: (f64, f64)| (q.0 - p.0) * (r.1 - p.1) - (q.1 - p.1) * (r.0 - p.0);
    let cross = side(a, b.0) * side(a, b.1) < 0.0 && side(b, a.0) * side(b, a.1) < 0.0;
    if cross {
        return 0.0;
    }
    let ends = [from_segment(a.0, b.0, b.1), from_segment(a.1, b.0, b.1)];
    let others = [from_segment(b.0, a.0, a.1), from_segment(b.1, a.0, a.1)];
    ends.into_iter().chain(others).fold(f64::INFINITY, f64::min)
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

    /// Numbers from 0 to 1, the same each time (Knuth's multiplier for 64 bits).
    fn random(seed: &mut u64) -> f64 {
        *seed = seed.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (*seed >> 33) as f64 / f64::from(u32::MAX >> 1)
    }

    #[test]
    fn labels_never_overlap_and_stay_inside() {
        let area = [10.0, 20.0, 110.0, 90.0];
        let mut seed = 7_u64;
        for _ in 0..50 {
            let mut placer = Placer::new(area);
            let mut placed: Vec<Rect> = Vec::new();
            for _ in 0..12 {
                let spot = (10.0 + 100.0 * random(&mut seed), 20.0 + 70.0 * random(&mut seed));
                let width = 8.0 + 20.0 * random(&mut seed);
                placed.extend(placer.label(spot, width, 4.0).map(|(rect, _)| rect));
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
        let (rect, _) = placer.label((50.0, 30.0), 20.0, 4.0).expect("there is room");
        assert!(rect[2] <= 50.0, "{rect:?}");
    }

    /// Boards with a random track of five legs and findings on it: no box meets another or a leader, no leader meets a
    /// leader, a ring of another finding, the track or hot copper, nothing leaves the board.
    #[test]
    fn callouts_on_two_hundred_boards_cross_nothing() {
        let mut seed = 11_u64;
        let (mut all, mut with_leader) = (0, 0);
        for board in 0..200 {
            let area = [0.0, 0.0, 60.0 + 140.0 * random(&mut seed), 40.0 + 77.0 * random(&mut seed)];
            let mut point = || (area[2] * random(&mut seed), area[3] * random(&mut seed));
            let track: Vec<(f64, f64)> = (0..6).map(|_| point()).collect();
            let hot: Vec<(f64, f64)> = (0..3).map(|_| point()).collect();
            let mut placer = Placer::new(area);
            placer.add_line(&track, 1.0, 6.0);
            placer.block_line(&track, 1.0);
            hot.iter().for_each(|&(x, y)| placer.block_line(&[(x, y), (x, y)], 4.0));
            let count = 1 + (4.0 * random(&mut seed)) as usize;
            let spots: Vec<(f64, f64)> = (0..count.min(4)).map(|n| track[n + 1]).collect();
            spots.iter().for_each(|&spot| placer.take(ring_box(spot, 3.5)));
            let mut places: Vec<(usize, Place)> = Vec::new();
            for (index, &spot) in spots.iter().enumerate() {
                let words = 10.0 + 35.0 * random(&mut seed);
                let wanted = Wanted { spot, ring: 3.5, disc: (2.4, 2.4), words };
                places.extend(placer.callout(&wanted).map(|place| (index, place)));
            }
            all += places.len();
            for (at, (index, place)) in places.iter().enumerate() {
                let rect = place.rect;
                assert!(rect[0] >= 0.0 && rect[1] >= 0.0 && rect[2] <= area[2] && rect[3] <= area[3]);
                for (_, other) in &places[..at] {
                    assert!(!meet(&rect, &other.rect), "board {board}: boxes");
                    let lines = (place.leader, other.leader);
                    assert!(!lines.0.is_some_and(|line| crosses(line, other.rect)), "board {board}");
                    assert!(!lines.1.is_some_and(|line| crosses(line, rect)), "board {board}");
                    if let (Some(a), Some(b)) = lines {
                        assert!(apart(a, b) >= LEADERS_APART, "board {board}: leaders");
                    }
                }
                let Some(line) = place.leader else { continue };
                with_leader += 1;
                for leg in track.windows(2) {
                    assert!(apart(line, (leg[0], leg[1])) > 0.5, "board {board}: track");
                }
                assert!(hot.iter().all(|&at| from_segment(at, line.0, line.1) > 3.5), "board {board}: hot");
                let rings = spots.iter().enumerate().filter(|(other, _)| other != index);
                for (_, &spot) in rings.filter(|&(_, &spot)| spot != spots[*index]) {
                    assert!(!crosses(line, ring_box(spot, 3.4)), "board {board}: ring");
                }
            }
        }
        // The fallback is rare: a check that no callout was refused wholesale.
        assert!(all >= 400 && with_leader * 10 >= all * 8, "{with_leader} of {all}");
    }

    #[test]
    fn a_crowded_callout_falls_back() {
        let wanted = Wanted { spot: (30.0, 20.0), ring: 3.5, disc: (2.4, 2.4), words: 20.0 };
        let mut placer = Placer::new([0.0, 0.0, 60.0, 40.0]);
        placer.take(ring_box(wanted.spot, wanted.ring));
        placer.block_line(&[(30.0, 20.0), (30.0, 20.0)], 7.0);
        let place = placer.callout(&wanted).expect("beside the ring");
        assert_eq!((place.leader, place.words_right), (None, None));
        placer.take([0.0, 0.0, 60.0, 40.0]);
        assert_eq!(placer.callout(&wanted), None);
    }
}
