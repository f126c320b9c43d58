//! TRANSITIONAL.
use crate::grid::Grid;

/// Layers of relief, finest first, with their moment pyramids.
#[derive(Debug)]
pub struct Relief {
    grids: Vec<Grid>,
}

impl Relief {
    /// Builds.
    #[must_use]
    pub fn build(grids: Vec<Grid>) -> Self {
        Self { grids }
    }

    /// Number of layers.
    #[must_use]
    pub fn layer_count(&self) -> usize {
        self.grids.len()
    }
}
