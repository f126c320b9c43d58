//! Which rows and columns of a grid lie within reach of the stations.

use hillpull_physics::ellipsoid::{Ellipsoid, Vec3, norm, sub};

use super::reach::Reach;
use crate::error::ReliefError;
use crate::grid::Placement;

/// Rows and columns to read.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Window {
    pub(super) first_row: usize,
    pub(super) rows: usize,
    /// First column, within the file.
    pub(super) first_col: usize,
    /// Number of columns; past the last one of a ring they go on with the first.
    pub(super) cols: usize,
}

/// A grid as a whole.
#[derive(Clone, Copy, Debug)]
pub(super) struct Extent<'a> {
    pub(super) placement: &'a Placement,
    pub(super) rows: usize,
    pub(super) cols: usize,
    /// Number of different columns of a grid that goes all the way round the Earth. Column `ring` is column 0 again.
    pub(super) ring: Option<usize>,
}

/// Nodes of the lattice per axis.
const NODES: usize = 192;
/// Posts kept around what is within reach.
const MARGIN: usize = 2;

/// Columns of a grid in longitude that goes all the way round, counted once; None if it does not.
///
/// `full_circle` is the length of a parallel in units of the CRS's x.
pub(super) fn ring(placement: &Placement, cols: usize, full_circle: Option<f64>) -> Option<usize> {
    let a = &placement.affine;
    if a[2] != 0.0 || a[4] != 0.0 {
        return None;
    }
    let around = (full_circle? / a[1]).abs();
    let whole = around.round();
    // off by less than a hundredth of a post all the way round: the last column meets the first
    ((around - whole).abs() < 0.01 && whole >= 2.0 && cols as f64 >= whole)
        .then_some(whole as usize)
}

/// The window of the posts within reach, or the distance in metres by which the grid misses it.
pub(super) fn within(
    extent: Extent<'_>,
    reach: &Reach,
) -> Result<Result<Window, f64>, ReliefError> {
    let last = |count: usize| count - 1;
    let mut rows = (0, last(extent.rows));
    let mut cols = (0, extent.ring.unwrap_or_else(|| last(extent.cols)));
    let mut whole_ring = extent.ring;
    // each round looks at a smaller part of the grid with finer steps
    for _ in 0..4 {
        let lattice = Lattice::over(extent.placement, rows, cols)?;
        let near = lattice.cells_near(reach);
        let Some(((row_a, row_b), kept_cols)) = near.bounds() else {
            return Ok(Err((near.nearest_m - reach.radius_m).max(0.0)));
        };
        let new_rows = (lattice.rows[row_a], lattice.rows[row_b]);
        let new_cols = match whole_ring.take() {
            Some(ring) => arc(&kept_cols, &lattice.cols, ring),
            None => {
                let first = kept_cols.iter().position(|&kept| kept).unwrap_or(0);
                let end = kept_cols.iter().rposition(|&kept| kept).unwrap_or(0) + 1;
                (lattice.cols[first], lattice.cols[end])
            }
        };
        let size = |(a, b): (usize, usize)| b - a;
        let settled = 10 * size(new_rows) > 9 * size(rows) && 10 * size(new_cols) > 9 * size(cols);
        (rows, cols) = (new_rows, new_cols);
        if settled {
            break;
        }
    }
    let first_row = rows.0.saturating_sub(MARGIN);
    let end_row = (rows.1 + MARGIN).min(last(extent.rows));
    let (first_col, count) = match extent.ring {
        // all the way round, and the first column again to close it
        Some(ring) if cols.1 - cols.0 + 2 * MARGIN >= ring => (cols.0 % ring, ring + 1),
        Some(ring) => (
            (cols.0 + ring - MARGIN) % ring,
            cols.1 - cols.0 + 2 * MARGIN + 1,
        ),
        None => {
            let first = cols.0.saturating_sub(MARGIN);
            (first, (cols.1 + MARGIN).min(last(extent.cols)) - first + 1)
        }
    };
    Ok(Ok(Window {
        first_row,
        rows: end_row - first_row + 1,
        first_col,
        cols: count,
    }))
}

/// The shortest run of columns round a ring that holds all kept ones: all but the longest gap.
fn arc(kept: &[bool], nodes: &[usize], ring: usize) -> (usize, usize) {
    let count = kept.len();
    let (mut gap_start, mut gap_len) = (0, 0);
    for start in 0..count {
        let len = (0..count)
            .take_while(|k| !kept[(start + k) % count])
            .count();
        if len > gap_len {
            (gap_start, gap_len) = (start, len);
        }
    }
    if gap_len == 0 {
        return (0, ring);
    }
    let first = (gap_start + gap_len) % count;
    let cells = count - gap_len;
    let (from, to) = (nodes[first], first + cells);
    // node `count` is node 0 again
    let end = nodes[to % count] + if to >= count { ring } else { 0 };
    (from, end)
}

/// Places of a coarse lattice of posts.
struct Lattice {
    rows: Vec<usize>,
    cols: Vec<usize>,
    /// ECEF in metres, row-major; NaN where a post has no place.
    feet: Vec<Vec3>,
}

/// Lattice cells within reach.
struct Near {
    keep: Vec<bool>,
    cells: (usize, usize),
    nearest_m: f64,
}

impl Lattice {
    fn over(
        placement: &Placement,
        rows: (usize, usize),
        cols: (usize, usize),
    ) -> Result<Self, ReliefError> {
        let nodes = |(first, last): (usize, usize)| -> Vec<usize> {
            let steps = (last - first).clamp(1, NODES - 1);
            (0..=steps)
                .map(|k| first + (last - first) * k / steps)
                .collect()
        };
        let (rows, cols) = (nodes(rows), nodes(cols));
        let posts: Vec<[f64; 2]> = rows
            .iter()
            .flat_map(|&row| cols.iter().map(move |&col| [row as f64, col as f64]))
            .collect();
        let feet = placement
            .lonlat_rad_or_nan(&posts)?
            .iter()
            .map(|&[lon, lat]| Ellipsoid::WGS84.foot_ecef_m(lon, lat))
            .collect();
        Ok(Self { rows, cols, feet })
    }

    /// Cells that may hold something within reach: a corner is not farther than the reach and the cell's diagonal.
    fn cells_near(&self, reach: &Reach) -> Near {
        let middle = reach.middle_ecef_m();
        let (cell_rows, cell_cols) = (self.rows.len() - 1, self.cols.len() - 1);
        let corners = |i: usize, j: usize| {
            let at = |r: usize, c: usize| self.feet[r * self.cols.len() + c];
            [at(i, j), at(i + 1, j + 1), at(i, j + 1), at(i + 1, j)]
        };
        let diagonal = |p: [Vec3; 4]| f64::max(norm(sub(p[0], p[1])), norm(sub(p[2], p[3])));
        let mut longest = 0.0_f64;
        for i in 0..cell_rows {
            for j in 0..cell_cols {
                longest = longest.max(diagonal(corners(i, j)));
            }
        }
        let mut near = Near {
            keep: Vec::with_capacity(cell_rows * cell_cols),
            cells: (cell_rows, cell_cols),
            nearest_m: f64::INFINITY,
        };
        for i in 0..cell_rows {
            for j in 0..cell_cols {
                let p = corners(i, j);
                let distance = p
                    .iter()
                    .map(|&foot| norm(sub(foot, middle)))
                    .fold(f64::INFINITY, f64::min);
                // `max` passes over NaN, so a cell at the edge of a projection's domain counts as the longest
                let some_lost = p.iter().any(|foot| foot[0].is_nan());
                let size = if some_lost { longest } else { diagonal(p) };
                near.nearest_m = near.nearest_m.min(distance);
                near.keep.push(distance <= reach.radius_m + size);
            }
        }
        near
    }
}

impl Near {
    /// First and last lattice row around the kept cells, and which columns of cells are kept.
    fn bounds(&self) -> Option<((usize, usize), Vec<bool>)> {
        let (cell_rows, cell_cols) = self.cells;
        let in_row = |i: usize| self.keep[i * cell_cols..(i + 1) * cell_cols].contains(&true);
        let first = (0..cell_rows).find(|&i| in_row(i))?;
        let last = (0..cell_rows).rfind(|&i| in_row(i))?;
        let cols = (0..cell_cols)
            .map(|j| (0..cell_rows).any(|i| self.keep[i * cell_cols + j]))
            .collect();
        Some(((first, last + 1), cols))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn arc_leaves_out_the_longest_gap() {
        let nodes: Vec<usize> = (0..=8).map(|k| 10 * k).collect();
        let kept = |cells: &[usize]| (0..8).map(|k| cells.contains(&k)).collect::<Vec<_>>();
        assert_eq!(arc(&kept(&[2, 3]), &nodes, 80), (20, 40));
        assert_eq!(arc(&kept(&[0, 7]), &nodes, 80), (70, 90));
        assert_eq!(arc(&kept(&[0]), &nodes, 80), (0, 10));
        assert_eq!(arc(&kept(&[7]), &nodes, 80), (70, 80));
        assert_eq!(arc(&kept(&[1, 6]), &nodes, 80), (60, 100));
        assert_eq!(arc(&[true; 8], &nodes, 80), (0, 80));
    }

    #[test]
    fn ring_counts_columns_once() {
        let global = |step: f64| Placement {
            affine: [-180.0, step, 0.0, 90.0, 0.0, -step],
            crs: None,
        };
        assert_eq!(ring(&global(1.0), 360, Some(360.0)), Some(360));
        assert_eq!(ring(&global(1.0), 361, Some(360.0)), Some(360));
        assert_eq!(ring(&global(1.0), 359, Some(360.0)), None);
        assert_eq!(ring(&global(1.0), 360, None), None);
        assert_eq!(ring(&global(0.7), 515, Some(360.0)), None);
        // 1 arc minute written with few digits
        assert_eq!(
            ring(&global(0.016_666_667), 21_600, Some(360.0)),
            Some(21_600)
        );
    }
}
