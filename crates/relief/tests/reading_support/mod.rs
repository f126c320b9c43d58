//! Rasters for the tests, written by GDAL into a folder that goes away.
#![allow(dead_code, reason = "each test file uses a part")]
#![allow(clippy::unwrap_used, reason = "a test may end here")]

use std::path::{Path, PathBuf};

use gdal::raster::{Buffer, GdalType, RasterCreationOptions};
use gdal::spatial_ref::SpatialRef;
use gdal::{Dataset, DriverManager};
use hillpull_relief::{Fault, Grid, ReadOptions, read_grid};
use tempfile::TempDir;

/// A folder for one test.
pub(crate) fn folder() -> TempDir {
    tempfile::tempdir().unwrap()
}

/// Shape and place of a raster to write: rows, columns, GDAL's affine map of pixel edges, CRS.
pub(crate) struct Shape<'a> {
    pub(crate) rows: usize,
    pub(crate) cols: usize,
    pub(crate) edges: [f64; 6],
    pub(crate) crs: Option<&'a str>,
}

/// A small grid at the corner of UTM zone 32, 30 m apart.
pub(crate) const UTM: Shape<'_> = Shape {
    rows: 5,
    cols: 7,
    edges: [500_000.0, 30.0, 0.0, 5_000_000.0, 0.0, -30.0],
    crs: Some("EPSG:32632"),
};

impl Shape<'_> {
    /// Values of a function of row and column, row-major.
    pub(crate) fn values<T>(&self, f: impl Fn(usize, usize) -> T) -> Vec<T> {
        let mut out = Vec::with_capacity(self.rows * self.cols);
        for row in 0..self.rows {
            for col in 0..self.cols {
                out.push(f(row, col));
            }
        }
        out
    }

    /// An open data set of one band, of any driver that can create.
    pub(crate) fn create<T: GdalType + Copy>(
        &self,
        driver: &str,
        path: &Path,
        options: &[&str],
        values: Vec<T>,
    ) -> Dataset {
        let driver = DriverManager::get_driver_by_name(driver).unwrap();
        let options = RasterCreationOptions::from_iter(options.iter().copied());
        let mut dataset = driver
            .create_with_band_type_with_options::<T, _>(path, self.cols, self.rows, 1, &options)
            .unwrap();
        if self.edges != [0.0; 6] {
            dataset.set_geo_transform(&self.edges).unwrap();
        }
        if let Some(crs) = self.crs {
            let srs = SpatialRef::from_definition(crs).unwrap();
            dataset.set_spatial_ref(&srs).unwrap();
        }
        let size = (self.cols, self.rows);
        let mut band = dataset.rasterband(1).unwrap();
        band.write((0, 0), size, &mut Buffer::new(size, values))
            .unwrap();
        dataset
    }

    /// A GeoTIFF, after `tune` has had its way with it.
    pub(crate) fn geotiff<T: GdalType + Copy>(
        &self,
        path: &Path,
        values: Vec<T>,
        tune: impl FnOnce(&mut Dataset),
    ) -> PathBuf {
        let mut dataset = self.create("GTiff", path, &[], values);
        tune(&mut dataset);
        dataset.close().unwrap();
        path.to_owned()
    }
}

/// Reads all of a DEM.
pub(crate) fn read(path: &Path) -> Grid {
    read_grid(path, &ReadOptions::default()).unwrap()
}

/// Why a DEM is refused, the text of the error, and its hint.
pub(crate) fn refused(path: &Path, options: &ReadOptions<'_>) -> (Fault, String, String) {
    let error = read_grid(path, options).expect_err("it must be refused");
    let folder = path.parent().unwrap().display().to_string() + "/";
    let text = error.to_string().replace(&folder, "");
    let hint = error.hint().unwrap_or_default().replace(&folder, "");
    (error.fault, text, hint)
}

/// Longitude and latitude in degrees of one post.
pub(crate) fn lonlat_deg(grid: &Grid, row: f64, col: f64) -> [f64; 2] {
    grid.lonlat_rad(&[[row, col]]).unwrap()[0].map(f64::to_degrees)
}

/// Asserts a longitude and latitude in degrees.
#[track_caller]
pub(crate) fn assert_lonlat(found: [f64; 2], lon_deg: f64, lat_deg: f64, tolerance_deg: f64) {
    let off = f64::max((found[0] - lon_deg).abs(), (found[1] - lat_deg).abs());
    assert!(
        off <= tolerance_deg,
        "{found:?} is {off:e} off ({lon_deg}, {lat_deg})"
    );
}

/// Asserts heights, voids equal to voids.
#[track_caller]
pub(crate) fn assert_heights(found: &[f32], expected: &[f32]) {
    let same = |(a, b): (&f32, &f32)| a == b || (a.is_nan() && b.is_nan());
    assert_eq!(found.len(), expected.len());
    assert!(
        found.iter().zip(expected).all(same),
        "{found:?} is not {expected:?}"
    );
}
