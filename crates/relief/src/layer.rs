//! A layer: one DEM's posts, where they lie, and its pyramid of moments.

use crate::clip::{Ring, clip_rings, moments_less_rings};
use crate::moments::{Bilinear, Moments, pool, pool_full};
use crate::tile::TileGeometry;
use crate::upper::UpperTree;
use hillpull_physics::ellipsoid::{Vec3, norm, sub};
use std::collections::BTreeMap;

/// The moments of four sibling nodes that are full squares, one cache line.
#[derive(Clone, Copy, Debug, Default)]
#[repr(C, align(64))]
pub struct Quad {
    /// Mean heights, m.
    pub mean: [f32; 4],
    /// Variances of height, m2.
    pub var: [f32; 4],
    /// Covariances of height with column, m cells.
    pub cx: [f32; 4],
    /// Covariances of height with row, m cells.
    pub cy: [f32; 4],
}

/// What a layer supplies of a cell.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum CellState {
    /// Nothing: beyond the grid, void, or covered by a finer layer.
    None,
    /// All of it.
    Full,
    /// What the rings of the cell leave.
    Clipped,
}

/// A tile of which not every cell is supplied in full.
#[derive(Clone, Debug)]
pub struct PartialTile {
    /// State of each cell, row-major.
    pub state: Vec<CellState>,
    /// Rings of the finer layers' cover in clipped cells, in cells from the cell's middle, by row-major index.
    pub clipped: BTreeMap<u32, Vec<Ring>>,
    /// Moments of the stored nodes, in the order of [`Layer::quads`].
    pub quads: Vec<[Moments; 4]>,
}

/// One DEM with its pyramid.
#[derive(Debug)]
pub struct Layer {
    /// Name for messages.
    pub label: String,
    /// Rows of posts.
    pub rows: usize,
    /// Columns of posts.
    pub cols: usize,
    /// Heights in metres, row-major; NaN marks a void.
    pub heights_m: Vec<f32>,
    /// Cells along a tile's side: a power of two.
    pub tile_cells: usize,
    /// Rows of tiles.
    pub tiles_down: usize,
    /// Columns of tiles.
    pub tiles_across: usize,
    /// Geometry of each tile, row-major.
    pub geometry: Vec<TileGeometry>,
    /// Stored nodes of the full tiles: `quads_per_tile` for each tile, by level from the top, in Morton order.
    pub quads: Vec<Quad>,
    /// Quads stored for a tile.
    pub quads_per_tile: usize,
    /// Tiles that are not full.
    pub partial: Vec<Option<Box<PartialTile>>>,
    /// The pyramid above the tiles.
    pub upper: UpperTree,
    /// Mean distance between posts at the middle, m.
    pub post_spacing_m: f64,
    /// Largest distance found between PROJ's positions and ours, m.
    pub place_error_m: f64,
}

/// (column, row) of a Morton index.
#[inline]
#[must_use]
pub fn morton_decode(index: u32) -> (u32, u32) {
    (even_bits(index), even_bits(index >> 1))
}

#[inline]
fn even_bits(v: u32) -> u32 {
    let mut v = v & 0x5555_5555;
    v = (v | (v >> 1)) & 0x3333_3333;
    v = (v | (v >> 2)) & 0x0f0f_0f0f;
    v = (v | (v >> 4)) & 0x00ff_00ff;
    (v | (v >> 8)) & 0x0000_ffff
}

impl Layer {
    /// log2 of the cells along a tile's side.
    #[must_use]
    pub fn tile_level(&self) -> u32 {
        self.tile_cells.trailing_zeros()
    }

    /// (tile, row, column within the tile) of a cell.
    #[must_use]
    pub fn tile_of(&self, cell_row: usize, cell_col: usize) -> (usize, usize, usize) {
        let t = self.tile_cells;
        (
            (cell_row / t) * self.tiles_across + cell_col / t,
            cell_row % t,
            cell_col % t,
        )
    }

    /// (column, row) in post coordinates of the middle of a tile.
    #[must_use]
    pub fn tile_middle(&self, tile: usize) -> (f64, f64) {
        let t = self.tile_cells as f64;
        (
            ((tile % self.tiles_across) as f64 + 0.5) * t,
            ((tile / self.tiles_across) as f64 + 0.5) * t,
        )
    }

    /// Surface of a cell of the grid (which must lie inside it).
    #[inline]
    #[must_use]
    pub fn surface(&self, cell_row: usize, cell_col: usize) -> Bilinear {
        let k = cell_row * self.cols + cell_col;
        let up = &self.heights_m[k..k + 2];
        let down = &self.heights_m[k + self.cols..k + self.cols + 2];
        Bilinear::from_corners([
            [f64::from(up[0]), f64::from(up[1])],
            [f64::from(down[0]), f64::from(down[1])],
        ])
    }

    /// State of a cell; beyond the grid there is none.
    #[must_use]
    pub fn cell_state(&self, cell_row: usize, cell_col: usize) -> CellState {
        if cell_row + 1 >= self.rows || cell_col + 1 >= self.cols {
            return CellState::None;
        }
        let (tile, r, c) = self.tile_of(cell_row, cell_col);
        self.partial[tile]
            .as_ref()
            .map_or(CellState::Full, |p| p.state[r * self.tile_cells + c])
    }

    /// Rings that a clipped cell leaves out, in cells from its middle.
    #[must_use]
    pub fn cell_rings(&self, cell_row: usize, cell_col: usize) -> &[Ring] {
        let (tile, r, c) = self.tile_of(cell_row, cell_col);
        self.partial[tile]
            .as_ref()
            .and_then(|p| p.clipped.get(&((r * self.tile_cells + c) as u32)))
            .map_or(&[], Vec::as_slice)
    }

    /// Moments of what the layer supplies of a square of width `s` cells about (x, y) from a cell's middle.
    #[must_use]
    pub fn piece_moments(
        &self,
        cell_row: usize,
        cell_col: usize,
        x: f64,
        y: f64,
        s: f64,
    ) -> Moments {
        match self.cell_state(cell_row, cell_col) {
            CellState::None => Moments::default(),
            CellState::Full => self.surface(cell_row, cell_col).about(x, y).moments(s),
            CellState::Clipped => {
                let h = 0.5 * s;
                let mut rings = clip_rings(
                    self.cell_rings(cell_row, cell_col),
                    [x - h, x + h],
                    [y - h, y + h],
                );
                for p in rings.iter_mut().flatten() {
                    p[0] -= x;
                    p[1] -= y;
                }
                moments_less_rings(&self.surface(cell_row, cell_col).about(x, y), s, &rings)
            }
        }
    }

    /// Index within a tile's stored quads of the children of node `morton` at `level`, if they are stored (levels above 2).
    #[inline]
    #[must_use]
    pub fn quad_index(&self, level: u32, morton: u32) -> Option<usize> {
        (level > 2).then(|| {
            let depth = self.tile_level() - level;
            ((1 << (2 * depth)) - 1) / 3 + morton as usize
        })
    }

    /// The stored children of a node of a full tile.
    #[inline]
    #[must_use]
    pub fn stored_quad(&self, tile: usize, level: u32, morton: u32) -> Option<&Quad> {
        let k = self.quad_index(level, morton)?;
        Some(&self.quads[tile * self.quads_per_tile + k])
    }

    /// The children of a node of a full tile at a level that is not stored (1 and 2), from the posts.
    #[must_use]
    pub fn quad_from_posts(&self, tile: usize, level: u32, morton: u32) -> Quad {
        let (x, y) = morton_decode(morton);
        let (row0, col0) = self.tile_origin(tile);
        let (row, col) = (
            row0 + ((y as usize) << level),
            col0 + ((x as usize) << level),
        );
        if level == 1 {
            return self.cell_quad(row, col);
        }
        let mut out = Quad::default();
        for (k, (r, c)) in [(0, 0), (0, 2), (2, 0), (2, 2)].into_iter().enumerate() {
            let cells = self.cell_quad(row + r, col + c);
            let pooled = pool_quad(&cells);
            out.mean[k] = pooled[0] as f32;
            out.var[k] = pooled[1] as f32;
            out.cx[k] = pooled[2] as f32;
            out.cy[k] = pooled[3] as f32;
        }
        out
    }

    /// Moments of 2 x 2 full cells (see [`Bilinear::moments`]).
    #[inline]
    fn cell_quad(&self, row: usize, col: usize) -> Quad {
        let posts: [&[f32]; 3] = std::array::from_fn(|k| {
            let start = (row + k) * self.cols + col;
            &self.heights_m[start..start + 3]
        });
        let mut out = Quad::default();
        for k in 0..4 {
            let (r, c) = (k / 2, k % 2);
            let (h00, h01) = (f64::from(posts[r][c]), f64::from(posts[r][c + 1]));
            let (h10, h11) = (f64::from(posts[r + 1][c]), f64::from(posts[r + 1][c + 1]));
            let surface = Bilinear::from_corners([[h00, h01], [h10, h11]]);
            let m = surface.moments(1.0);
            out.mean[k] = m.mean as f32;
            out.var[k] = m.var as f32;
            out.cx[k] = m.cx as f32;
            out.cy[k] = m.cy as f32;
        }
        out
    }

    /// Moments of the four children of node `morton` at `level` (at least 1) of a tile; width of a child: `2^(level-1)` cells.
    #[must_use]
    pub fn children(&self, tile: usize, level: u32, morton: u32) -> [Moments; 4] {
        if let Some(k) = self.quad_index(level, morton) {
            return match &self.partial[tile] {
                Some(p) => p.quads[k],
                None => unpack(
                    &self.quads[tile * self.quads_per_tile + k],
                    f64::from(1_u32 << (level - 1)),
                ),
            };
        }
        self.children_from_posts(tile, level, morton)
    }

    /// The same from the posts, for the levels that are not stored (1 and 2).
    #[must_use]
    pub(crate) fn children_from_posts(&self, tile: usize, level: u32, morton: u32) -> [Moments; 4] {
        let (x, y) = morton_decode(morton);
        let (row0, col0) = self.tile_origin(tile);
        let width = 1_usize << level;
        let (row, col) = (row0 + y as usize * width, col0 + x as usize * width);
        let full = self.partial[tile].is_none();
        let cell = |r: usize, c: usize| {
            if full {
                self.surface(r, c).moments(1.0)
            } else {
                self.piece_moments(r, c, 0.0, 0.0, 1.0)
            }
        };
        let quad = |r: usize, c: usize| {
            [
                cell(r, c),
                cell(r, c + 1),
                cell(r + 1, c),
                cell(r + 1, c + 1),
            ]
        };
        if level == 1 {
            return quad(row, col);
        }
        [(0, 0), (0, 2), (2, 0), (2, 2)].map(|(r, c)| {
            let cells = quad(row + r, col + c);
            if full {
                pool_full(&cells, 1.0)
            } else {
                pool(&cells, 1.0)
            }
        })
    }

    /// (row, column) of a tile's first cell.
    #[must_use]
    pub fn tile_origin(&self, tile: usize) -> (usize, usize) {
        (
            (tile / self.tiles_across) * self.tile_cells,
            (tile % self.tiles_across) * self.tile_cells,
        )
    }

    /// Post coordinates (column, row) of a ground point given by its foot on the ellipsoid, also somewhat outside the grid.
    ///
    /// Newton's method from tile to tile; None if it doesn't settle (a point far from the grid).
    #[must_use]
    pub fn locate(&self, foot_m: Vec3) -> Option<(f64, f64)> {
        let t = self.tile_cells as f64;
        let clamp = |v: f64, n: usize| ((v / t).floor().max(0.0) as usize).min(n - 1);
        let (mut col, mut row) = (0.5 * (self.cols - 1) as f64, 0.5 * (self.rows - 1) as f64);
        for _ in 0..60 {
            let tile =
                clamp(row, self.tiles_down) * self.tiles_across + clamp(col, self.tiles_across);
            let (mx, my) = self.tile_middle(tile);
            let (x, y) = self.geometry[tile].newton_step(foot_m, col - mx, row - my);
            let (new_col, new_row) = (mx + x, my + y);
            if !(new_col.is_finite() && new_row.is_finite()) {
                return None;
            }
            let step = (new_col - col).abs().max((new_row - row).abs());
            // far steps leave the quadratic's range: never jump beyond the grid by more than its own size
            col = new_col.clamp(-(self.cols as f64), 2.0 * self.cols as f64);
            row = new_row.clamp(-(self.rows as f64), 2.0 * self.rows as f64);
            if step < 1e-7 {
                let near = norm(sub(self.geometry[tile].foot(x, y), foot_m))
                    < 10.0 * self.post_spacing_m + 1e4;
                return near.then_some((col, row));
            }
        }
        None
    }

    /// Foot on the ellipsoid, ECEF m, at post coordinates (column, row).
    #[must_use]
    pub fn foot_m(&self, col: f64, row: f64) -> Vec3 {
        let cell = |v: f64, n: usize| (v.max(0.0) as usize).min(n - 2);
        let (tile, _, _) = self.tile_of(cell(row, self.rows), cell(col, self.cols));
        let (mx, my) = self.tile_middle(tile);
        self.geometry[tile].foot(col - mx, row - my)
    }

    /// Row or column of the cell that a post coordinate lies in; a point on the last post's line belongs to the last cell.
    fn cell_index(v: f64, posts: usize) -> Option<usize> {
        let last = (posts - 1) as f64;
        let v = if (v - last).abs() < 1e-9 { last } else { v };
        (0.0..=last)
            .contains(&v)
            .then(|| (v.floor() as usize).min(posts - 2))
    }

    /// Whether the layer's own grid has ground at a point, whatever other layers cover.
    #[must_use]
    pub fn has_ground(&self, foot_m: Vec3) -> bool {
        self.locate(foot_m).is_some_and(|(col, row)| {
            let cell = (
                Self::cell_index(row, self.rows),
                Self::cell_index(col, self.cols),
            );
            matches!(cell, (Some(r), Some(c)) if !self.surface(r, c).m.is_nan())
        })
    }

    /// The cell that supplies the surface at a ground point, as (row, column, x, y) with (x, y) from the cell's middle.
    #[must_use]
    pub fn cell_at(&self, foot_m: Vec3) -> Option<(usize, usize, f64, f64)> {
        let (col, row) = self.locate(foot_m)?;
        let (r, c) = (
            Self::cell_index(row, self.rows)?,
            Self::cell_index(col, self.cols)?,
        );
        let (x, y) = (col - c as f64 - 0.5, row - r as f64 - 0.5);
        match self.cell_state(r, c) {
            CellState::None => None,
            CellState::Full => Some((r, c, x, y)),
            CellState::Clipped => {
                let tiny = 1e-6;
                let piece = self.piece_moments(r, c, x, y, tiny);
                (piece.area > 0.5 * tiny * tiny).then_some((r, c, x, y))
            }
        }
    }
}

/// To single precision.
#[inline]
pub(crate) fn pack(m: &[Moments; 4]) -> Quad {
    Quad {
        mean: m.map(|v| v.mean as f32),
        var: m.map(|v| v.var as f32),
        cx: m.map(|v| v.cx as f32),
        cy: m.map(|v| v.cy as f32),
    }
}

/// Mean, variance and covariances of the square that four cells make (see [`pool_full`]).
#[inline]
fn pool_quad(cells: &Quad) -> [f64; 4] {
    let m = pool_full(&unpack(cells, 1.0), 1.0);
    [m.mean, m.var, m.cx, m.cy]
}

#[inline]
fn unpack(quad: &Quad, s: f64) -> [Moments; 4] {
    let of = |values: &[f32; 4], k: usize| f64::from(values[k]);
    std::array::from_fn(|k| {
        Moments::of_square(
            s,
            of(&quad.mean, k),
            of(&quad.var, k),
            of(&quad.cx, k),
            of(&quad.cy, k),
        )
    })
}
