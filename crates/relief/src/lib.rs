//! Elevation grids placed on the ellipsoid, layers and the moment pyramid.

mod build;
pub mod clip;
mod cover;
pub mod error;
mod grid;
pub mod layer;
pub mod moments;
mod read;
mod relief;
pub mod tile;
pub mod upper;

pub use error::{Fault, ReliefError};
pub use grid::{Grid, HeightSummary, LonLatBox, Origin, Placement};
pub use layer::Layer;
pub use read::{Reach, ReadOptions, Resample, ResampleMethod, read_grid};
pub use relief::{Relief, SurfacePoint};
