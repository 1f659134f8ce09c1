//! Plane geometry in metres: points, polygons with holes, regions, the uniform grid of cells.

pub mod boolean;
mod grid;
pub mod locate;
mod point;
pub mod polygon;
pub mod raster;
pub mod simplify;
pub mod stroke;

pub use grid::Grid;
pub use point::{Bounds, Point};
pub use polygon::{Polygon, Region, Ring};
