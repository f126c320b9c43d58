//! The three DEMs of the demo, each with the faults a real one of its kind has.

use std::path::Path;

use anyhow::{Context, Result};
use gdal::{
    DriverManager,
    raster::{Buffer, GdalType, RasterCreationOptions},
    spatial_ref::SpatialRef,
};
use rayon::prelude::*;

use crate::{
    noise::{fractal, near_normal},
    place::{SURVEY_EPSG, plane_from_lon_lat, plane_from_survey},
    relief::Relief,
};

/// A north-up grid of posts in the middle of their pixels.
#[derive(Clone, Copy, Debug)]
pub struct Posts {
    /// West edge of the first column, in the units of the CRS.
    pub west: f64,
    /// North edge of the first row.
    pub north: f64,
    /// Size of a pixel.
    pub step: f64,
    /// Number of columns.
    pub columns: usize,
    /// Number of rows.
    pub rows: usize,
    /// EPSG code of the CRS.
    pub epsg: u32,
}

/// Fine DEM: 5 m posts on the survey's map grid, as from an airborne laser scan.
pub const FINE: Posts = Posts {
    west: 336_770.0,
    north: 5_152_230.0,
    step: 5.0,
    columns: 1_000,
    rows: 1_300,
    epsg: SURVEY_EPSG,
};

/// Regional DEM: 1 arc second over some 60 km, whole metres, as from a radar mission.
pub const REGIONAL: Posts = Posts {
    west: -29.49,
    north: 46.77,
    step: 1.0 / 3600.0,
    columns: 2_808,
    rows: 1_944,
    epsg: 4326,
};

/// Far DEM: 30 arc seconds, to more than 166.7 km from every station.
pub const FAR: Posts = Posts {
    west: -31.5,
    north: 48.1,
    step: 1.0 / 120.0,
    columns: 576,
    rows: 384,
    epsg: 4326,
};

impl Posts {
    /// Heights at all posts, row by row from the north-west, from a function of the CRS's (x, y).
    fn heights<T: Send>(&self, height: impl Fn(f64, f64) -> T + Sync) -> Vec<T> {
        let rows: Vec<Vec<T>> = (0..self.rows)
            .into_par_iter()
            .map(|row| {
                let y = self.north - (row as f64 + 0.5) * self.step;
                (0..self.columns)
                    .map(|column| height(self.west + (column as f64 + 0.5) * self.step, y))
                    .collect()
            })
            .collect();
        rows.into_iter().flatten().collect()
    }
}

/// Heights of the fine DEM, metres: 0.1 m of noise, a few decimetres of slow error, and 0.4 m off in plan.
#[must_use]
pub fn fine_heights(relief: &Relief) -> Vec<f32> {
    FINE.heights(|easting, northing| {
        let (x, y) = plane_from_survey(easting, northing);
        let noise = 0.1 * near_normal(easting as i64, northing as i64, 71);
        centimetres(
            relief.height_m(x + 0.35, y - 0.2) + noise + 0.4 * fractal(x, y, 400.0, 3, 0.5, 72),
        )
    })
}

/// Heights of the regional DEM, metres: blocks and gullies lost, metres of slow error, 6 m off in plan.
#[must_use]
pub fn regional_heights(relief: &Relief) -> Vec<i16> {
    REGIONAL.heights(|lon, lat| {
        let (x, y) = plane_from_lon_lat(lon, lat);
        whole_metres(
            relief.soft_height_m(x - 5.0, y + 3.0) + 5.0 * fractal(x, y, 900.0, 4, 0.6, 73),
        )
    })
}

/// Heights of the far DEM, metres: the mean of each square, with metres of slow error.
#[must_use]
pub fn far_heights(relief: &Relief) -> Vec<i16> {
    FAR.heights(|lon, lat| {
        let (x, y) = plane_from_lon_lat(lon, lat);
        whole_metres(relief.mean_height_m(x, y) + 8.0 * fractal(x, y, 30_000.0, 4, 0.6, 74))
    })
}

fn centimetres(height_m: f64) -> f32 {
    ((height_m * 100.0 + 0.5).floor() / 100.0) as f32
}

fn whole_metres(height_m: f64) -> i16 {
    (height_m + 0.5).floor() as i16
}

/// Writes heights as a deflated GeoTIFF, beside the target first and then renamed.
///
/// # Errors
/// What GDAL or the file system says.
pub fn write<T: GdalType + Copy>(
    path: &Path,
    posts: &Posts,
    heights: Vec<T>,
    predictor: u8,
) -> Result<()> {
    let beside = path.with_extension("part.tif");
    let options = RasterCreationOptions::from_iter([
        "COMPRESS=DEFLATE".to_owned(),
        format!("PREDICTOR={predictor}"),
        "TILED=YES".to_owned(),
        "ZLEVEL=9".to_owned(),
    ]);
    let driver = DriverManager::get_driver_by_name("GTiff")?;
    let mut file = driver
        .create_with_band_type_with_options::<T, _>(&beside, posts.columns, posts.rows, 1, &options)
        .with_context(|| format!("creating {}", beside.display()))?;
    file.set_geo_transform(&[posts.west, posts.step, 0.0, posts.north, 0.0, -posts.step])?;
    file.set_spatial_ref(&SpatialRef::from_epsg(posts.epsg)?)?;
    let size = (posts.columns, posts.rows);
    file.rasterband(1)?
        .write((0, 0), size, &mut Buffer::new(size, heights))?;
    file.close()
        .with_context(|| format!("writing {}", beside.display()))?;
    std::fs::rename(&beside, path).with_context(|| format!("renaming {}", beside.display()))
}
