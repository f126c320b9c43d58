//! One DEM as read: posts, heights and where the posts lie.

use std::fmt;
use std::path::PathBuf;

use hillpull_physics::ellipsoid::{Ellipsoid, norm, sub};
use rayon::prelude::*;

use crate::error::ReliefError;

/// A grid of posts with heights, as read from one DEM.
#[derive(Clone, Debug, Default)]
pub struct Grid {
    /// Name for messages, usually the file name.
    pub label: String,
    /// Number of rows of posts.
    pub rows: usize,
    /// Number of columns of posts.
    pub cols: usize,
    /// Heights in metres, row-major, `rows * cols` long; NaN marks a void.
    pub heights_m: Vec<f32>,
    /// Where the posts lie.
    pub placement: Placement,
    /// Where the grid comes from.
    pub origin: Origin,
}

/// Where the posts of a grid lie: an affine map to the grid's CRS, and the CRS.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Placement {
    /// `x = a[0] + a[1] * col + a[2] * row`, `y = a[3] + a[4] * col + a[5] * row` in the CRS, with (row, col) = (0, 0)
    /// at the first POST (pixel centre).
    pub affine: [f64; 6],
    /// The CRS as WKT or an authority code; None stands for WGS 84 longitude and latitude in degrees.
    pub crs: Option<String>,
}

/// Where a grid comes from: for messages and for the record of what went into a result.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Origin {
    /// The DEM as the user named it.
    pub path: PathBuf,
    /// Files behind it, as GDAL lists them: the DEM itself, side files, the parts of a VRT.
    pub files: Vec<PathBuf>,
    /// GDAL's short name of the format.
    pub driver: String,
    /// Name of the CRS.
    pub crs_name: String,
    /// Band read, from 1.
    pub band: usize,
    /// Unit of the heights in the file; "m" where the file states none.
    pub height_unit: String,
    /// First row of the file that was read, from 0.
    pub first_row: usize,
    /// First column of the file that was read, from 0.
    pub first_col: usize,
    /// Rows of the whole file.
    pub file_rows: usize,
    /// Columns of the whole file.
    pub file_cols: usize,
    /// What the user should know about this grid; one sentence each.
    pub warnings: Vec<String>,
}

/// What the heights of a grid range over.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct HeightSummary {
    /// Lowest height, metres; None if all posts are voids.
    pub lowest_m: Option<f32>,
    /// Highest height, metres; None if all posts are voids.
    pub highest_m: Option<f32>,
    /// Posts below zero.
    pub below_zero: usize,
    /// Voids.
    pub voids: usize,
}

impl HeightSummary {
    /// Of some heights, NaN for voids. Eight at a time, so that the loop vectorises.
    pub(crate) fn of(heights_m: &[f32]) -> Self {
        const LANES: usize = 8;
        let mut low = [f32::INFINITY; LANES];
        let mut high = [f32::NEG_INFINITY; LANES];
        let mut below_zero = [0_u32; LANES];
        let mut voids = [0_u32; LANES];
        let mut take = |lane: usize, h: f32| {
            // a comparison with NaN is false
            low[lane] = if h < low[lane] { h } else { low[lane] };
            high[lane] = if h > high[lane] { h } else { high[lane] };
            below_zero[lane] += u32::from(h < 0.0);
            voids[lane] += u32::from(h.is_nan());
        };
        let (eights, rest) = heights_m.as_chunks::<LANES>();
        for eight in eights {
            for (lane, &h) in eight.iter().enumerate() {
                take(lane, h);
            }
        }
        for &h in rest {
            take(0, h);
        }
        let count = |lanes: [u32; LANES]| lanes.iter().map(|&n| n as usize).sum();
        let voids = count(voids);
        let any = voids < heights_m.len();
        Self {
            lowest_m: any.then(|| low.into_iter().fold(f32::INFINITY, f32::min)),
            highest_m: any.then(|| high.into_iter().fold(f32::NEG_INFINITY, f32::max)),
            below_zero: count(below_zero),
            voids,
        }
    }

    /// Of these heights and those.
    pub(crate) fn and(self, other: Self) -> Self {
        let either = |a: Option<f32>, b: Option<f32>, pick: fn(f32, f32) -> f32| match (a, b) {
            (Some(a), Some(b)) => Some(pick(a, b)),
            (a, b) => a.or(b),
        };
        Self {
            lowest_m: either(self.lowest_m, other.lowest_m, f32::min),
            highest_m: either(self.highest_m, other.highest_m, f32::max),
            below_zero: self.below_zero + other.below_zero,
            voids: self.voids + other.voids,
        }
    }
}

/// A box of longitude and latitude, degrees on WGS 84. East may pass 180 where the box crosses the antimeridian.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct LonLatBox {
    /// Western edge, in [-180, 180).
    pub west_deg: f64,
    /// Southern edge.
    pub south_deg: f64,
    /// Eastern edge, at least `west_deg`.
    pub east_deg: f64,
    /// Northern edge.
    pub north_deg: f64,
}

impl fmt::Display for LonLatBox {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(
            f,
            "longitude {:.4} to {:.4}, latitude {:.4} to {:.4} degrees",
            self.west_deg, self.east_deg, self.south_deg, self.north_deg
        )
    }
}

impl Grid {
    /// A grid that comes from no file.
    ///
    /// # Panics
    /// If `heights_m` is not `rows * cols` long.
    #[must_use]
    pub fn new(
        label: impl Into<String>,
        rows: usize,
        cols: usize,
        heights_m: Vec<f32>,
        placement: Placement,
    ) -> Self {
        assert_eq!(heights_m.len(), rows * cols, "rows x cols heights");
        Self {
            label: label.into(),
            rows,
            cols,
            heights_m,
            placement,
            origin: Origin::default(),
        }
    }

    /// Longitude and latitude of posts as [`Placement::lonlat_rad`], with errors that name this grid.
    ///
    /// # Errors
    /// If a post has no place on the ellipsoid.
    pub fn lonlat_rad(&self, row_col: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, ReliefError> {
        let placed = self.placement.lonlat_rad(row_col);
        placed.map_err(|error| error.named(&self.label))
    }

    /// Range, voids and posts below zero, in one pass.
    #[must_use]
    pub fn height_summary(&self) -> HeightSummary {
        // minimum, maximum and counts do not depend on the order they are taken in
        self.heights_m
            .par_chunks(1 << 16)
            .map(HeightSummary::of)
            .reduce(HeightSummary::default, HeightSummary::and)
    }

    /// Lowest height, metres; None if all posts are voids.
    #[must_use]
    pub fn lowest_m(&self) -> Option<f32> {
        self.height_summary().lowest_m
    }

    /// Number of posts below zero.
    #[must_use]
    pub fn count_below_zero(&self) -> usize {
        self.height_summary().below_zero
    }

    /// Number of voids.
    #[must_use]
    pub fn void_count(&self) -> usize {
        self.height_summary().voids
    }

    /// Files behind this grid, as GDAL lists them.
    #[must_use]
    pub fn source_files(&self) -> &[PathBuf] {
        &self.origin.files
    }

    /// Spacing at the middle of the grid, metres on the ellipsoid: between rows, and between columns.
    ///
    /// # Errors
    /// If the middle has no place on the ellipsoid.
    pub fn post_spacing_m(&self) -> Result<[f64; 2], ReliefError> {
        let [row, col] = self.middle();
        let ends = [
            [row - 0.5, col],
            [row + 0.5, col],
            [row, col - 0.5],
            [row, col + 0.5],
        ];
        let p: Vec<_> = self
            .lonlat_rad(&ends)?
            .iter()
            .map(|&[lon, lat]| Ellipsoid::WGS84.foot_ecef_m(lon, lat))
            .collect();
        Ok([norm(sub(p[1], p[0])), norm(sub(p[3], p[2]))])
    }

    /// Box of longitude and latitude around the posts, from a lattice of 65 x 65 of them at most.
    ///
    /// # Errors
    /// If the middle has no place on the ellipsoid.
    pub fn lonlat_box(&self) -> Result<LonLatBox, ReliefError> {
        self.placement
            .lonlat_box(self.rows, self.cols)
            .map_err(|error| error.named(&self.label))
    }

    fn middle(&self) -> [f64; 2] {
        [
            (self.rows as f64 - 1.0) / 2.0,
            (self.cols as f64 - 1.0) / 2.0,
        ]
    }
}
