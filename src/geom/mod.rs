//! Plane geometry in metres: points, polygons with holes, regions, the uniform grid of cells.

mod grid;
mod point;
mod polygon;
pub mod raster;

pub use grid::Grid;
pub use point::{Bounds, Point};
pub use polygon::{Polygon, Region, Ring};
