//! What the copper looks like inside each cell: its connected pieces, and which pieces touch across cell faces.
//!
//! Cells are divided into `k` by `k` subcells of about 25 um, fine enough for any slot or neck that can be made.
//! A subcell is copper when at least half of it is, and belongs to the group (island) that covers most of it.
//! Subcells of one group that touch inside a cell make a piece; pieces of one group whose subcells touch across a
//! face are in contact. Connectivity of pieces is that of the drawn copper, however coarse the cells are.

use crate::geom::raster::Raster;
use crate::geom::{Bounds, Grid, Point, Polygon, Region};

/// Side that a subcell should have at most, in metres, as long as a cell holds no more than 16 by 16.
const SUBCELL_M: f64 = 25e-6;
/// Rows of cells that are rasterized together.
const BAND_ROWS: usize = 16;
const NO_GROUP: u32 = u32::MAX;
/// No piece.
pub const NONE: u32 = u32::MAX;

/// The copper of a sheet before it is put on cells.
#[derive(Clone, Copy, Debug)]
pub struct Copper<'a> {
    /// Connected areas that must stay apart, each as polygons that do not overlap.
    pub groups: &'a [Vec<&'a Polygon>],
    /// Nothing outside of this conducts; none for no limit.
    pub outline: Option<&'a Region>,
    /// Drilled holes and slots that cut the copper; must not overlap each other.
    pub holes: &'a Region,
}

/// Pieces of copper in the cells of a grid.
#[derive(Clone, Debug)]
pub struct Pieces {
    /// Covered part of each cell.
    pub coverage: Vec<f64>,
    /// Cell of each piece.
    pub cell: Vec<u32>,
    /// Group of each piece.
    pub group: Vec<u32>,
    /// Area of each piece in cells.
    pub area: Vec<f32>,
    /// Index of the first piece of each cell, and at the end the number of pieces.
    pub first: Vec<u32>,
    /// Pieces in contact across a face, smaller cell index first.
    pub contacts: Vec<(u32, u32)>,
}

impl Pieces {
    /// Finds the pieces of `copper` on `grid`.
    pub fn find(copper: &Copper, grid: &Grid) -> Self {
        let k = ((grid.cell_m / SUBCELL_M).ceil() as usize).clamp(4, 16);
        let mut pieces = Self {
            coverage: Vec::with_capacity(grid.len()),
            cell: Vec::new(),
            group: Vec::new(),
            area: Vec::new(),
            first: vec![0],
            contacts: Vec::new(),
        };
        let bounds: Vec<Vec<Bounds>> = copper
            .groups
            .iter()
            .map(|group| group.iter().map(|polygon| polygon.bounds()).collect())
            .collect();
        let mut below = vec![NONE; grid.nx * k];
        let mut row = 0;
        while row < grid.ny {
            let rows = BAND_ROWS.min(grid.ny - row);
            let band = Grid {
                origin: grid.origin + Point::new(0.0, row as f64 * grid.cell_m),
                cell_m: grid.cell_m / k as f64,
                nx: grid.nx * k,
                ny: rows * k,
            };
            let fine = Band::draw(copper, &bounds, band);
            for iy in 0..rows {
                pieces.add_row(&fine, k, iy, (row + iy) * grid.nx, &mut below);
            }
            row += rows;
        }
        pieces
    }

    /// Pieces of one cell.
    pub fn of_cell(&self, cell: usize) -> std::ops::Range<u32> {
        self.first[cell]..self.first[cell + 1]
    }

    /// Number of pieces.
    pub fn len(&self) -> usize {
        self.cell.len()
    }

    /// Adds row `iy` of the band; `below` holds the pieces along the upper rim of the row before and receives those
    /// of this one.
    fn add_row(&mut self, fine: &Band, k: usize, iy: usize, first_cell: usize, below: &mut [u32]) {
        let width = fine.grid.nx;
        let mut piece = vec![NONE; k * k];
        let mut group = vec![NO_GROUP; k * k];
        let mut left = vec![NONE; k];
        let mut stack = Vec::with_capacity(k * k);
        for ix in 0..width / k {
            let corner = iy * k * width + ix * k;
            for r in 0..k {
                group[r * k..][..k].copy_from_slice(&fine.group[corner + r * width..][..k]);
            }
            let sum: f64 = (0..k).map(|r| fine.part[corner + r * width..][..k].iter().sum::<f64>()).sum();
            self.coverage.push(sum / (k * k) as f64);
            let cell = (first_cell + ix) as u32;
            if group[0] != NO_GROUP && group.iter().all(|&other| other == group[0]) {
                piece.fill(self.push(cell, group[0], 1.0));
            } else {
                piece.fill(NONE);
                for start in 0..k * k {
                    if piece[start] != NONE || group[start] == NO_GROUP {
                        continue;
                    }
                    let id = self.push(cell, group[start], 0.0);
                    let mut count = 0;
                    piece[start] = id;
                    stack.push(start);
                    while let Some(at) = stack.pop() {
                        count += 1;
                        let (x, y) = (at % k, at / k);
                        let mut visit = |next: usize| {
                            if piece[next] == NONE && group[next] == group[start] {
                                piece[next] = id;
                                stack.push(next);
                            }
                        };
                        if x > 0 {
                            visit(at - 1);
                        }
                        if x + 1 < k {
                            visit(at + 1);
                        }
                        if y > 0 {
                            visit(at - k);
                        }
                        if y + 1 < k {
                            visit(at + k);
                        }
                    }
                    self.area[id as usize] = count as f32 / (k * k) as f32;
                }
            }
            let face = self.contacts.len();
            for r in 0..k {
                self.touch(face, left[r], piece[r * k]);
                left[r] = piece[r * k + k - 1];
            }
            let face = self.contacts.len();
            for c in 0..k {
                self.touch(face, below[ix * k + c], piece[c]);
                below[ix * k + c] = piece[(k - 1) * k + c];
            }
            self.first.push(self.cell.len() as u32);
        }
    }

    fn push(&mut self, cell: u32, group: u32, area: f32) -> u32 {
        self.cell.push(cell);
        self.group.push(group);
        self.area.push(area);
        self.cell.len() as u32 - 1
    }

    /// Notes a contact once for each face; contacts of this face start at `face`.
    fn touch(&mut self, face: usize, a: u32, b: u32) {
        let both = a != NONE && b != NONE;
        if both
            && self.group[a as usize] == self.group[b as usize]
            && !self.contacts[face..].contains(&(a, b))
        {
            self.contacts.push((a, b));
        }
    }
}

/// Subcells of some rows of cells.
struct Band {
    grid: Grid,
    /// Covered part of each subcell.
    part: Vec<f64>,
    /// Group of each subcell that is copper.
    group: Vec<u32>,
}

impl Band {
    fn draw(copper: &Copper, bounds: &[Vec<Bounds>], grid: Grid) -> Self {
        let mut band = Self { grid, part: vec![0.0; grid.len()], group: vec![NO_GROUP; grid.len()] };
        let mut best = vec![0.0f32; grid.len()];
        for (number, (group, boxes)) in copper.groups.iter().zip(bounds).enumerate() {
            let inside = group.iter().zip(boxes).filter(|(_, b)| b.meets(grid.bounds()));
            let polygons: Vec<&Polygon> = inside.map(|(&polygon, _)| polygon).collect();
            visit_covered(&polygons, &grid, |at, covered| {
                band.part[at] += covered;
                if covered as f32 > best[at] {
                    best[at] = covered as f32;
                    band.group[at] = number as u32;
                }
            });
        }
        if let Some(outline) = copper.outline {
            let mut raster = Raster::new(grid);
            outline.0.iter().for_each(|polygon| raster.add(polygon));
            band.part.iter_mut().zip(raster.finish()).for_each(|(part, inside)| *part = part.min(inside));
        }
        let holes: Vec<&Polygon> =
            copper.holes.0.iter().filter(|hole| hole.bounds().meets(grid.bounds())).collect();
        visit_covered(&holes, &grid, |at, covered| {
            band.part[at] = band.part[at].min(1.0 - covered);
        });
        for (group, part) in band.group.iter_mut().zip(&mut band.part) {
            *part = part.clamp(0.0, 1.0);
            if *part < 0.5 {
                *group = NO_GROUP;
            }
        }
        band
    }
}

/// Calls `visit(index, covered part)` for the cells of `grid` that `polygons` cover, working on their box only.
fn visit_covered(polygons: &[&Polygon], grid: &Grid, mut visit: impl FnMut(usize, f64)) {
    let bounds = polygons.iter().fold(Bounds::EMPTY, |all, polygon| all.union(polygon.bounds()));
    if bounds.is_empty() {
        return;
    }
    let cells = |metres: f64, limit: usize| (metres / grid.cell_m).clamp(0.0, limit as f64);
    let x0 = cells(bounds.min.x - grid.origin.x, grid.nx).floor() as usize;
    let x1 = cells(bounds.max.x - grid.origin.x, grid.nx).ceil() as usize;
    let y0 = cells(bounds.min.y - grid.origin.y, grid.ny).floor() as usize;
    let y1 = cells(bounds.max.y - grid.origin.y, grid.ny).ceil() as usize;
    if x0 >= x1 || y0 >= y1 {
        return;
    }
    let part = Grid {
        origin: grid.origin + Point::new(x0 as f64, y0 as f64) * grid.cell_m,
        cell_m: grid.cell_m,
        nx: x1 - x0,
        ny: y1 - y0,
    };
    let mut raster = Raster::new(part);
    polygons.iter().for_each(|polygon| raster.add(polygon));
    for (at, covered) in raster.finish().into_iter().enumerate() {
        if covered > 0.0 {
            visit((at / part.nx + y0) * grid.nx + at % part.nx + x0, covered);
        }
    }
}
