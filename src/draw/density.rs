//! The density of a map made ready for drawing: voids filled for interpolation, resampled to pixels, colored.
//!
//! Enlarging is bilinear in dB, so colors are never mixed; shrinking is the area mean of the density itself, so shares
//! stay right. Cells without copper take the value of the nearest copper before, and voids are painted over after.

use super::scale::DensityScale;
use super::view::View;
use crate::field::ReturnMap;
use crate::geom::{Grid, Point};
use crate::style::{Gradient, Rgb};

/// Density on cells.
#[derive(Clone, Debug)]
pub struct Density {
    /// Cells.
    pub grid: Grid,
    /// Whether a cell is copper.
    pub copper: Vec<bool>,
    /// |K| in A/m per A; of the nearest copper where there is none.
    pub values: Vec<f64>,
}

/// Values on pixels, rows from the top of the sheet.
#[derive(Clone, Debug)]
pub struct Raster {
    /// Columns.
    pub nx: usize,
    /// Rows.
    pub ny: usize,
    /// Levels in dB.
    pub level_db: Vec<f64>,
}

impl Density {
    /// The magnitude of a map's density.
    pub fn of(map: &ReturnMap) -> Self {
        let grid = map.grid;
        let mut values = Vec::with_capacity(grid.len());
        for iy in 0..grid.ny {
            for ix in 0..grid.nx {
                values.push(map.magnitude(ix, iy));
            }
        }
        Self::new(grid, map.copper.clone(), values)
    }

    /// Density from values on cells; those of cells without copper are replaced.
    pub fn new(grid: Grid, copper: Vec<bool>, mut values: Vec<f64>) -> Self {
        fill_from_nearest(&grid, &copper, &mut values);
        Self { grid, copper, values }
    }

    /// Whether there is copper at a point.
    pub fn is_copper(&self, point: Point) -> bool {
        self.grid.cell_at(point).is_some_and(|(ix, iy)| self.copper[self.grid.index(ix, iy)])
    }

    /// Density at a point, that of the nearest cell outside the grid.
    pub fn at(&self, point: Point) -> f64 {
        let at = (point - self.grid.origin) * (1.0 / self.grid.cell_m);
        let ix = (at.x.max(0.0) as usize).min(self.grid.nx - 1);
        let iy = (at.y.max(0.0) as usize).min(self.grid.ny - 1);
        self.values[self.grid.index(ix, iy)]
    }

    /// The view in `nx` x `ny` pixels.
    pub fn raster(&self, view: &View, nx: usize, ny: usize, scale: &DensityScale) -> Raster {
        let (step_x, step_y) = (view.width() / nx as f64, view.height() / ny as f64);
        let pixel_m = (step_x.max(step_y)) * 1e-3 / view.scale;
        let mut level_db = Vec::with_capacity(nx * ny);
        if pixel_m < self.grid.cell_m {
            let levels: Vec<f64> = self.values.iter().map(|&value| scale.level_db(value)).collect();
            for iy in 0..ny {
                for ix in 0..nx {
                    let at = (view.x + (ix as f64 + 0.5) * step_x, view.y + (iy as f64 + 0.5) * step_y);
                    level_db.push(self.bilinear(&levels, view.back(at)));
                }
            }
        } else {
            for iy in 0..ny {
                for ix in 0..nx {
                    let (left, top) = (view.x + ix as f64 * step_x, view.y + iy as f64 * step_y);
                    let (a, b) = (view.back((left, top)), view.back((left + step_x, top + step_y)));
                    level_db.push(scale.level_db(self.mean(a, b)));
                }
            }
        }
        Raster { nx, ny, level_db }
    }

    fn bilinear(&self, levels: &[f64], point: Point) -> f64 {
        let grid = &self.grid;
        let at = (point - grid.origin) * (1.0 / grid.cell_m) - Point::new(0.5, 0.5);
        let x = at.x.clamp(0.0, (grid.nx - 1) as f64);
        let y = at.y.clamp(0.0, (grid.ny - 1) as f64);
        let (ix, iy) = (x as usize, y as usize);
        let (jx, jy) = ((ix + 1).min(grid.nx - 1), (iy + 1).min(grid.ny - 1));
        let (fx, fy) = (x - ix as f64, y - iy as f64);
        let low = levels[grid.index(ix, iy)] * (1.0 - fx) + levels[grid.index(jx, iy)] * fx;
        let high = levels[grid.index(ix, jy)] * (1.0 - fx) + levels[grid.index(jx, jy)] * fx;
        low * (1.0 - fy) + high * fy
    }

    /// Mean over the box between two corners.
    fn mean(&self, a: Point, b: Point) -> f64 {
        let grid = &self.grid;
        let range = |low: f64, high: f64, origin: f64, count: usize| {
            let (low, high) = if low < high { (low, high) } else { (high, low) };
            let from = ((low - origin) / grid.cell_m).clamp(0.0, count as f64);
            let to = ((high - origin) / grid.cell_m).clamp(0.0, count as f64);
            if to - from < 1e-9 {
                let nearest = (from as usize).min(count - 1) as f64;
                (nearest, nearest + 1.0)
            } else {
                (from, to)
            }
        };
        let (x0, x1) = range(a.x, b.x, grid.origin.x, grid.nx);
        let (y0, y1) = range(a.y, b.y, grid.origin.y, grid.ny);
        let (mut sum, mut area) = (0.0, 0.0);
        for iy in y0 as usize..(y1.ceil() as usize).min(grid.ny) {
            let high = ((iy + 1) as f64).min(y1) - (iy as f64).max(y0);
            for ix in x0 as usize..(x1.ceil() as usize).min(grid.nx) {
                let part = high * (((ix + 1) as f64).min(x1) - (ix as f64).max(x0));
                sum += part * self.values[grid.index(ix, iy)];
                area += part;
            }
        }
        if area > 0.0 { sum / area } else { 0.0 }
    }
}

/// Gives cells without copper the value of the nearest copper cell (breadth first over the eight neighbors, in a
/// fixed order); all stay as they are where there is no copper at all.
fn fill_from_nearest(grid: &Grid, copper: &[bool], values: &mut [f64]) {
    let mut known: Vec<bool> = copper.to_vec();
    let rim = |known: &[bool], index: usize| neighbors(grid, index).any(|n| !known[n]);
    let mut front: Vec<usize> =
        (0..grid.len()).filter(|&index| copper[index] && rim(&known, index)).collect();
    while !front.is_empty() {
        let mut next = Vec::new();
        for &index in &front {
            for neighbor in neighbors(grid, index) {
                if !known[neighbor] {
                    known[neighbor] = true;
                    values[neighbor] = values[index];
                    next.push(neighbor);
                }
            }
        }
        front = next;
    }
}

fn neighbors(grid: &Grid, index: usize) -> impl Iterator<Item = usize> {
    const STEPS: [(isize, isize); 8] = [(-1, 0), (1, 0), (0, -1), (0, 1), (-1, -1), (1, -1), (-1, 1), (1, 1)];
    let (nx, ny) = (grid.nx as isize, grid.ny as isize);
    let (ix, iy) = ((index % grid.nx) as isize, (index / grid.nx) as isize);
    STEPS.into_iter().filter_map(move |(dx, dy)| {
        let (x, y) = (ix + dx, iy + dy);
        (x >= 0 && y >= 0 && x < nx && y < ny).then_some((y * nx + x) as usize)
    })
}

/// An indexed PNG of a raster: the gradient's colors and one for what lies above the scale.
pub fn heat_png(raster: &Raster, scale: &DensityScale, gradient: &Gradient, over: Rgb) -> Vec<u8> {
    let indices: Vec<u8> = raster.level_db.iter().map(|&level| scale.color_index(level)).collect();
    let palette: Vec<u8> = gradient
        .colors()
        .iter()
        .chain(std::iter::once(&over))
        .flat_map(|color| [color.0, color.1, color.2])
        .collect();
    indexed_png(raster.nx as u32, raster.ny as u32, &indices, palette)
}

/// An 8-bit indexed PNG; empty if it has no pixel.
pub fn indexed_png(width: u32, height: u32, indices: &[u8], palette: Vec<u8>) -> Vec<u8> {
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, width, height);
    encoder.set_color(png::ColorType::Indexed);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_palette(palette);
    encoder.set_compression(png::Compression::High);
    let written = encoder.write_header().and_then(|mut writer| {
        writer.write_image_data(indices)?;
        writer.finish()
    });
    // Writing to memory fails only for a picture without pixels or with the wrong number of them.
    if written.is_ok() { bytes } else { Vec::new() }
}

/// A PNG of 8-bit red, green and blue; empty if it has no pixel.
pub fn rgb_png(width: u32, height: u32, rgb: &[u8]) -> Vec<u8> {
    let mut bytes = Vec::new();
    let mut encoder = png::Encoder::new(&mut bytes, width, height);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    encoder.set_compression(png::Compression::Balanced);
    let written = encoder.write_header().and_then(|mut writer| {
        writer.write_image_data(rgb)?;
        writer.finish()
    });
    // Writing to memory fails only for a picture without pixels or with the wrong number of them.
    if written.is_ok() { bytes } else { Vec::new() }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::Bounds;

    const SCALE: DensityScale = DensityScale::new(0.4e-3, 60.0);

    fn density(nx: usize, ny: usize, value: impl Fn(usize, usize) -> f64) -> Density {
        let grid = Grid { origin: Point::mm(0.0, 0.0), cell_m: 1e-3, nx, ny };
        let values =
            (0..ny).flat_map(|iy| (0..nx).map(move |ix| (ix, iy))).map(|(ix, iy)| value(ix, iy)).collect();
        Density::new(grid, vec![true; nx * ny], values)
    }

    #[test]
    fn shrinking_keeps_the_mean_and_enlarging_is_linear_in_db() {
        let all = density(8, 4, |ix, _| if ix < 4 { 1.0 } else { 9.0 });
        let view = View::filling(all.grid.bounds(), 0.0, 0.0, 8.0, 4.0);
        let one = all.raster(&view, 1, 1, &SCALE);
        assert!((SCALE.density(one.level_db[0]) - 5.0).abs() < 1e-9);
        let step = density(2, 1, |ix, _| if ix == 0 { 1.0 } else { 100.0 });
        let view = View::filling(step.grid.bounds(), 0.0, 0.0, 8.0, 4.0);
        let fine = step.raster(&view, 9, 3, &SCALE);
        assert!((SCALE.density(fine.level_db[4]) - 10.0).abs() < 1e-9, "the middle is the geometric mean");
    }

    #[test]
    fn rows_run_from_the_top_and_turned_views_match() {
        let all = density(3, 6, |ix, iy| (1 + ix + 10 * iy) as f64);
        let upright = View { window: all.grid.bounds(), x: 0.0, y: 0.0, scale: 1.0, turned: false };
        let raster = all.raster(&upright, 3, 6, &SCALE);
        assert!((SCALE.density(raster.level_db[0]) - 51.0).abs() < 1e-9, "top left is the highest row");
        let turned = View::filling(all.grid.bounds(), 0.0, 0.0, 6.0, 3.0);
        let raster = all.raster(&turned, 6, 3, &SCALE);
        assert!((SCALE.density(raster.level_db[5]) - 51.0).abs() < 1e-9, "the top went to the right");
    }

    #[test]
    fn voids_take_the_nearest_copper() {
        let grid = Grid { origin: Point::mm(0.0, 0.0), cell_m: 1e-3, nx: 5, ny: 1 };
        let copper = vec![true, false, false, false, true];
        let filled = Density::new(grid, copper, vec![3.0, 0.0, 0.0, 0.0, 7.0]);
        assert_eq!(filled.values, [3.0, 3.0, 3.0, 7.0, 7.0]);
        let window = Bounds { min: Point::mm(-1.0, -1.0), max: Point::mm(6.0, 2.0) };
        let view = View::filling(window, 0.0, 0.0, 7.0, 3.0);
        assert!(filled.raster(&view, 7, 3, &SCALE).level_db.iter().all(|level| level.is_finite()));
    }
}
