//! The relief: layers in order of preference, each reduced to what the ones before it leave.

use crate::clip::Ring;
use crate::cover::union;
use crate::error::ReliefError;
use crate::grid::Grid;
use crate::layer::Layer;
use hillpull_physics::constants::EARTH_RADIUS_M;
use hillpull_physics::ellipsoid::{Vec3, dot, norm, scale, sub};

/// Layers of relief, the preferred first, with their moment pyramids.
#[derive(Debug)]
pub struct Relief {
    /// The layers; every piece of ground belongs to the first that covers it.
    pub layers: Vec<Layer>,
    /// Borders of ground that no layer covers, as pieces from foot to foot.
    gaps: Vec<[Vec3; 2]>,
}

/// The surface found at a ground point.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SurfacePoint {
    /// Index of the layer that supplies it.
    pub layer: usize,
    /// Row and column of the cell.
    pub cell: (usize, usize),
    /// Column and row offset from the cell's middle, cells.
    pub offset: (f64, f64),
    /// Height of the surface, m.
    pub height_m: f64,
}

impl Relief {
    /// Places the grids on the ellipsoid, the preferred first, and builds their pyramids.
    ///
    /// # Errors
    /// A grid whose posts can't be placed.
    pub fn build(grids: Vec<Grid>) -> Result<Self, ReliefError> {
        let mut layers = Vec::with_capacity(grids.len());
        let mut covers: Vec<Vec<Ring>> = Vec::with_capacity(grids.len());
        for grid in grids {
            let mut layer = Layer::place(grid)?;
            let voids = layer.mark_voids();
            let last = layers.len();
            layers.push(layer);
            let finer: Vec<Vec<Ring>> = (0..last)
                .map(|k: usize| {
                    let before: &Layer = &layers[k];
                    before.rings_in(&covers[k], &layers[last])
                })
                .collect();
            covers.push(layers[last].own_rings(voids));
            let layer = &mut layers[last];
            layer.mark_covered(&union(finer));
            layer.pool_moments();
        }
        let gaps = borders_of_gaps(&layers, &covers);
        Ok(Self { layers, gaps })
    }

    /// No ground nearer than this to a foot on the ellipsoid is without a layer, m along the chord.
    #[must_use]
    pub fn nearest_gap_m(&self, foot_m: Vec3) -> f64 {
        let distance = |[start, end]: &[Vec3; 2]| {
            let (along, to) = (sub(*end, *start), sub(foot_m, *start));
            let share = (dot(to, along) / dot(along, along).max(f64::MIN_POSITIVE)).clamp(0.0, 1.0);
            // the border bulges out of the straight line by at most length^2 / 8 R, taken double
            let bulge = dot(along, along) / (4.0 * EARTH_RADIUS_M);
            norm(sub(to, scale(along, share))) - bulge
        };
        self.gaps.iter().map(distance).fold(f64::INFINITY, f64::min)
    }

    /// The surface at a ground point given by its foot on the ellipsoid (ECEF, m).
    #[must_use]
    pub fn surface_at(&self, foot_m: Vec3) -> Option<SurfacePoint> {
        self.layers.iter().enumerate().find_map(|(layer, l)| {
            let (row, col, x, y) = l.cell_at(foot_m)?;
            Some(SurfacePoint {
                layer,
                cell: (row, col),
                offset: (x, y),
                height_m: l.surface(row, col).at(x, y),
            })
        })
    }
}

/// Where the cover of a layer ends and no other layer goes on.
fn borders_of_gaps(layers: &[Layer], covers: &[Vec<Ring>]) -> Vec<[Vec3; 2]> {
    let mut gaps = Vec::new();
    for (k, (layer, rings)) in layers.iter().zip(covers).enumerate() {
        for ring in rings {
            let feet: Vec<Vec3> = ring.iter().map(|p| layer.foot_m(p[0], p[1])).collect();
            let bare = |foot: &Vec3| {
                !layers
                    .iter()
                    .enumerate()
                    .any(|(j, other)| j != k && other.has_ground(*foot))
            };
            let open: Vec<bool> = feet.iter().map(bare).collect();
            for i in 0..feet.len() {
                let next = (i + 1) % feet.len();
                if open[i] || open[next] {
                    gaps.push([feet[i], feet[next]]);
                }
            }
        }
    }
    gaps
}
