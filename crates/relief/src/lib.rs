//! Elevation grids placed on the ellipsoid, layers and the moment pyramid.
mod grid;
mod relief;

pub use grid::{Grid, Placement};
pub use relief::Relief;
