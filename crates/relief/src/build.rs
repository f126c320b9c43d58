//! Building a layer: placing tiles on the ellipsoid, marking what is missing, pooling the moments.

use crate::clip::{Ring, clip_rings, ring_area};
use crate::cover::{hull_ring, trace_rings};
use crate::error::ReliefError;
use crate::grid::Grid;
use crate::layer::{CellState, Layer, PartialTile, Quad, pack};
use crate::moments::{Moments, pool, pool_full};
use crate::tile::TileGeometry;
use crate::upper::{UpperNode, UpperTree};
use hillpull_physics::ellipsoid::{Ellipsoid, norm, sub};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Largest side of a tile in cells, and the smallest.
const TILE_CELLS: (usize, usize) = (64, 4);
/// A tile's half width stays below this, so that a quadratic places its posts within a centimetre.
const TILE_HALF_WIDTH_M: f64 = 2000.0;
/// What the fit of positions may miss, m, before tiles are made smaller.
const PLACE_ERROR_M: f64 = 0.01;
/// Tiles checked against PROJ.
const CHECKED_TILES: usize = 256;

impl Layer {
    /// Places a grid's tiles on the ellipsoid; nothing is marked or pooled yet.
    pub(crate) fn place(grid: Grid) -> Result<Self, ReliefError> {
        let (rows, cols) = (grid.rows, grid.cols);
        let middle = [(rows / 2) as f64, (cols / 2) as f64];
        let feet: Vec<_> = grid
            .placement
            .lonlat_rad(&[
                middle,
                [middle[0] - 1.0, middle[1]],
                [middle[0], middle[1] - 1.0],
            ])?
            .iter()
            .map(|p| Ellipsoid::WGS84.foot_ecef_m(p[0], p[1]))
            .collect();
        let post_spacing_m = 0.5 * (norm(sub(feet[0], feet[1])) + norm(sub(feet[0], feet[2])));
        let cells = (rows - 1)
            .min(cols - 1)
            .next_power_of_two()
            .clamp(TILE_CELLS.1, TILE_CELLS.0);
        let mut tile_cells = cells;
        while tile_cells > TILE_CELLS.1
            && 0.5 * tile_cells as f64 * post_spacing_m > TILE_HALF_WIDTH_M
        {
            tile_cells /= 2;
        }
        let (geometry, place_error_m) = loop {
            let (geometry, error) = place_tiles(&grid, tile_cells)?;
            if error <= PLACE_ERROR_M || tile_cells == TILE_CELLS.1 {
                break (geometry, error);
            }
            tile_cells /= 2;
        };
        let (tiles_down, tiles_across) = (
            (rows - 1).div_ceil(tile_cells),
            (cols - 1).div_ceil(tile_cells),
        );
        let stored_levels = tile_cells.trailing_zeros() - 2;
        Ok(Self {
            label: grid.label,
            rows,
            cols,
            heights_m: grid.heights_m,
            tile_cells,
            tiles_down,
            tiles_across,
            geometry,
            quads: Vec::new(),
            quads_per_tile: ((1 << (2 * stored_levels)) - 1) / 3,
            partial: vec![None; tiles_down * tiles_across],
            upper: UpperTree::default(),
            post_spacing_m,
            place_error_m,
        })
    }

    /// Marks cells beyond the grid or with a void at a corner. Returns true if there are voids.
    pub(crate) fn mark_voids(&mut self) -> bool {
        let t = self.tile_cells;
        let marks: Vec<(Option<Box<PartialTile>>, bool)> = (0..self.geometry.len())
            .into_par_iter()
            .map(|tile| {
                let (r0, c0) = self.tile_origin(tile);
                let outside = r0 + t > self.rows - 1 || c0 + t > self.cols - 1;
                let mut void = false;
                for r in r0..(r0 + t + 1).min(self.rows) {
                    let row = &self.heights_m
                        [r * self.cols + c0..r * self.cols + (c0 + t + 1).min(self.cols)];
                    void |= row.iter().any(|h| h.is_nan());
                }
                if !outside && !void {
                    return (None, false);
                }
                let mut state = vec![CellState::Full; t * t];
                for r in 0..t {
                    for c in 0..t {
                        let (row, col) = (r0 + r, c0 + c);
                        let missing = row + 1 >= self.rows
                            || col + 1 >= self.cols
                            || self.surface(row, col).m.is_nan();
                        if missing {
                            state[r * t + c] = CellState::None;
                        }
                    }
                }
                (
                    Some(Box::new(PartialTile {
                        state,
                        clipped: BTreeMap::new(),
                        quads: Vec::new(),
                    })),
                    void,
                )
            })
            .collect();
        let mut voids = false;
        self.partial = marks
            .into_iter()
            .map(|(p, v)| {
                voids |= v;
                p
            })
            .collect();
        voids
    }

    /// The rings around the layer's own valid cells, in (column, row) post coordinates.
    pub(crate) fn own_rings(&self, voids: bool) -> Vec<Ring> {
        let (down, across) = (self.rows - 1, self.cols - 1);
        if voids {
            trace_rings(down, across, |r, c| !self.surface(r, c).m.is_nan())
        } else {
            vec![hull_ring(down, across)]
        }
    }

    /// Carries rings of this layer into the post coordinates of another.
    pub(crate) fn rings_in(&self, rings: &[Ring], other: &Self) -> Vec<Ring> {
        let mut out: Vec<Ring> = rings
            .iter()
            .map(|ring| {
                ring.iter()
                    .filter_map(|p| {
                        other
                            .locate(self.foot_m(p[0], p[1]))
                            .map(|(col, row)| [col, row])
                    })
                    .collect()
            })
            .collect();
        // grids of the other handedness turn the rings round
        if out.iter().map(|r: &Ring| ring_area(r)).sum::<f64>() < 0.0 {
            for ring in &mut out {
                ring.reverse();
            }
        }
        out.retain(|r| r.len() >= 3);
        out
    }

    /// Takes out of the layer what the rings (post coordinates of this layer) hold.
    pub(crate) fn mark_covered(&mut self, rings: &[Ring]) {
        let size = (self.rows - 1).max(self.cols - 1).next_power_of_two();
        self.mark_square(rings, 0, 0, size);
    }

    fn mark_square(&mut self, rings: &[Ring], row: usize, col: usize, size: usize) {
        if row + 1 >= self.rows || col + 1 >= self.cols {
            return;
        }
        let (x, y, s) = (col as f64, row as f64, size as f64);
        let inner = clip_rings(rings, [x, x + s], [y, y + s]);
        let covered: f64 = inner.iter().map(|r| ring_area(r)).sum();
        if covered.abs() <= 1e-9 && inner.iter().all(|r| ring_area(r).abs() <= 1e-9) {
            return;
        }
        if (covered - s * s).abs() <= 1e-9 * s * s && inner.iter().all(|r| ring_area(r) > 0.0) {
            for r in row..(row + size).min(self.rows - 1) {
                for c in col..(col + size).min(self.cols - 1) {
                    self.set_state(r, c, CellState::None);
                }
            }
            return;
        }
        if size == 1 {
            if self.cell_state(row, col) != CellState::None {
                let mut own = inner;
                for p in own.iter_mut().flatten() {
                    p[0] -= x + 0.5;
                    p[1] -= y + 0.5;
                }
                self.set_state(row, col, CellState::Clipped);
                let (tile, r, c) = self.tile_of(row, col);
                let index = (r * self.tile_cells + c) as u32;
                if let Some(p) = &mut self.partial[tile] {
                    p.clipped.insert(index, own);
                }
            }
            return;
        }
        let half = size / 2;
        for (dr, dc) in [(0, 0), (0, half), (half, 0), (half, half)] {
            self.mark_square(&inner, row + dr, col + dc, half);
        }
    }

    fn set_state(&mut self, row: usize, col: usize, state: CellState) {
        let t = self.tile_cells;
        let (tile, r, c) = self.tile_of(row, col);
        let partial = self.partial[tile].get_or_insert_with(|| {
            Box::new(PartialTile {
                state: vec![CellState::Full; t * t],
                clipped: BTreeMap::new(),
                quads: Vec::new(),
            })
        });
        partial.state[r * t + c] = state;
    }

    /// Pools the moments of all tiles and builds the pyramid above them.
    pub(crate) fn pool_moments(&mut self) {
        let per_tile = self.quads_per_tile;
        let level = self.tile_level();
        let mut quads = vec![Quad::default(); per_tile * self.geometry.len()];
        let this = &*self;
        let pooled: Vec<(UpperNode, Option<Vec<[Moments; 4]>>)> = if per_tile == 0 {
            (0..this.geometry.len())
                .into_par_iter()
                .map(|tile| {
                    let root = pool(
                        &this.children_from_posts(tile, level, 0),
                        f64::from(1_u32 << (level - 1)),
                    );
                    (
                        UpperNode::of_tile(&this.geometry[tile], &root, this.tile_cells),
                        Some(Vec::new()),
                    )
                })
                .collect()
        } else {
            quads
                .par_chunks_mut(per_tile)
                .enumerate()
                .map(|(tile, out)| {
                    let nodes = this.pool_tile(tile);
                    let full = this.partial[tile].is_none();
                    let width = f64::from(1_u32 << (level - 1));
                    let root = if full {
                        pool_full(&nodes[0], width)
                    } else {
                        pool(&nodes[0], width)
                    };
                    let upper = UpperNode::of_tile(&this.geometry[tile], &root, this.tile_cells);
                    if full {
                        for (quad, node) in out.iter_mut().zip(&nodes) {
                            *quad = pack(node);
                        }
                        return (upper, None);
                    }
                    (upper, Some(nodes))
                })
                .collect()
        };
        self.quads = quads;
        let mut tiles = Vec::with_capacity(pooled.len());
        for (tile, (upper, nodes)) in pooled.into_iter().enumerate() {
            tiles.push(upper);
            if let (Some(partial), Some(nodes)) = (&mut self.partial[tile], nodes) {
                partial.quads = nodes;
            }
        }
        self.upper = UpperTree::build(tiles, self.tiles_down, self.tiles_across);
    }

    /// The stored nodes of one tile, from the posts upward.
    fn pool_tile(&self, tile: usize) -> Vec<[Moments; 4]> {
        let full = self.partial[tile].is_none();
        let top = self.tile_level();
        let mut nodes = vec![[Moments::default(); 4]; self.quads_per_tile];
        for level in 3..=top {
            let s = f64::from(1_u32 << (level - 2));
            for morton in 0..1_u32 << (2 * (top - level)) {
                // the four children of this node, each pooled from its own children
                let siblings = std::array::from_fn(|k| {
                    let child = 4 * morton + k as u32;
                    let below = match self.quad_index(level - 1, child) {
                        Some(i) => nodes[i],
                        None => self.children_from_posts(tile, level - 1, child),
                    };
                    if full {
                        pool_full(&below, s)
                    } else {
                        pool(&below, s)
                    }
                });
                if let Some(i) = self.quad_index(level, morton) {
                    nodes[i] = siblings;
                }
            }
        }
        nodes
    }
}

/// Geometry of every tile, and the largest position error at points the fit has not seen.
fn place_tiles(grid: &Grid, cells: usize) -> Result<(Vec<TileGeometry>, f64), ReliefError> {
    let (down, across) = (
        (grid.rows - 1).div_ceil(cells),
        (grid.cols - 1).div_ceil(cells),
    );
    let half = cells as f64 / 2.0;
    let (lattice_rows, lattice_cols) = (2 * down + 1, 2 * across + 1);
    let mut points = Vec::with_capacity(lattice_rows * lattice_cols);
    for i in 0..lattice_rows {
        for j in 0..lattice_cols {
            points.push([i as f64 * half, j as f64 * half]);
        }
    }
    let places = grid.placement.lonlat_rad(&points)?;
    let geometry: Vec<TileGeometry> = (0..down * across)
        .into_par_iter()
        .map(|tile| {
            let (i0, j0) = (2 * (tile / across), 2 * (tile % across));
            let lattice = std::array::from_fn(|i| {
                std::array::from_fn(|j| places[(i0 + i) * lattice_cols + j0 + j])
            });
            TileGeometry::from_lattice(&lattice, cells)
        })
        .collect();
    // quarter points of some tiles, among them the corners'
    let step = (down * across).div_ceil(CHECKED_TILES);
    let offsets = [
        (-0.5, -0.5),
        (0.5, -0.5),
        (0.25, 0.5),
        (-0.75, 0.75),
        (0.9, 0.4),
    ];
    let mut tiles: Vec<usize> = (0..down * across).step_by(step).collect();
    tiles.extend([across - 1, (down - 1) * across, down * across - 1]);
    let mut checks = Vec::new();
    for &tile in &tiles {
        let (mx, my) = (
            ((tile % across) as f64 + 0.5) * cells as f64,
            ((tile / across) as f64 + 0.5) * cells as f64,
        );
        checks.extend(offsets.map(|(x, y)| [my + y * half, mx + x * half]));
    }
    let seen = grid.placement.lonlat_rad(&checks)?;
    let mut error = 0.0_f64;
    for (&tile, places) in tiles.iter().zip(seen.chunks(offsets.len())) {
        let points: Vec<_> = offsets
            .iter()
            .zip(places)
            .map(|(&(x, y), &p)| (x * half, y * half, p))
            .collect();
        error = error.max(geometry[tile].misfit_m(&points));
    }
    Ok((geometry, error))
}
