//! A deterministic alpine relief for the benches: as wide as the terrain effect reaches, rough down to the last post.
//!
//! Rivers carve a mesh of 400 m (the same code as the demo's), then crags of 500 m down to 30 m are added, more of them
//! where the ground is steep: neighbouring posts of a 1 arc second DEM differ by metres to tens of metres, as they do in
//! the Alps, so that neither compression nor the walk through the pyramid has it easier than with a real DEM.

use std::path::{Path, PathBuf};

use anyhow::{Context, Result};
use gdal::{
    DriverManager,
    raster::{Buffer, RasterCreationOptions},
    spatial_ref::SpatialRef,
};
use hillpull_demo::{
    erosion::{Ground as Rock, carve, trough},
    field::Field,
    noise::{fractal, hash, near_normal, noise, ridged, signed_unit},
};
use hillpull_engine::{Ground, Station};
use rayon::prelude::*;

/// Longitude of the middle, degrees.
pub const MIDDLE_LON_DEG: f64 = -29.1;
/// Latitude of the middle, degrees.
pub const MIDDLE_LAT_DEG: f64 = 46.5;
/// Half height of the full DEM, degrees: 166.735 km plus 10 km on which stations are scattered.
pub const FULL_HALF_LAT_DEG: f64 = 1.6;
/// Half width of the full DEM, degrees: the same at the latitude where a station's disc is widest.
pub const FULL_HALF_LON_DEG: f64 = 2.33;
/// Posts per degree: 1 arc second.
const POSTS_PER_DEG: f64 = 3600.0;
/// Plane metres per degree at the middle; the relief is defined in this plane.
const EAST_M_PER_DEG: f64 = 76_765.0;
const NORTH_M_PER_DEG: f64 = 111_160.0;
/// Half width of the carved mesh, metres.
const HALF_WIDTH_M: f64 = 190_000.0;

/// The relief, carved once.
#[derive(Clone, Debug)]
pub struct Alpine {
    mesh: Field,
}

impl Default for Alpine {
    fn default() -> Self {
        Self::new()
    }
}

/// Steepness U/K (see the demo's `erosion`) in metres: high ranges with lower ground between them.
fn steepness_m(x: f64, y: f64) -> f64 {
    let ranges = 0.75 + 0.7 * fractal(x, y, 70_000.0, 2, 0.5, 211);
    let rock = 1.0 + 0.8 * fractal(x, y, 9_000.0, 3, 0.6, 213);
    370.0 * ranges.clamp(0.3, 1.3) * rock.max(0.35)
}

impl Alpine {
    /// Carves the relief; takes some seconds.
    #[must_use]
    pub fn new() -> Self {
        let side = |step: f64| (2.0 * HALF_WIDTH_M / step) as usize + 1;
        let plain = |x: f64, y: f64| 330.0 + 90.0 * (1.0 + fractal(x, y, 40_000.0, 6, 0.7, 221));
        let mut mesh = Field::from_fn(
            -HALF_WIDTH_M,
            -HALF_WIDTH_M,
            800.0,
            side(800.0),
            side(800.0),
            plain,
        );
        let rock = Rock::new(&mesh, steepness_m, |_, _| 0.8);
        carve(&mut mesh, &rock, 90, 0.25);

        let mut finer = Field::from_fn(
            -HALF_WIDTH_M,
            -HALF_WIDTH_M,
            400.0,
            side(400.0),
            side(400.0),
            |x, y| mesh.smooth(x, y).0 + 20.0 * noise(x / 1_700.0, y / 1_700.0, 222),
        );
        let rock = Rock::new(&finer, steepness_m, |x, y| {
            (0.85 + 0.6 * fractal(x, y, 3_000.0, 3, 0.6, 214)).clamp(0.5, 1.4)
        });
        let rivers = carve(&mut finer, &rock, 10, 0.25);
        trough(&mut finer, &rivers, 8.0, 60.0);
        Self { mesh: finer }
    }

    /// Height of the ground, metres, at a longitude and latitude in degrees.
    #[must_use]
    pub fn height_m(&self, lon_deg: f64, lat_deg: f64) -> f64 {
        let (x, y) = (
            (lon_deg - MIDDLE_LON_DEG) * EAST_M_PER_DEG,
            (lat_deg - MIDDLE_LAT_DEG) * NORTH_M_PER_DEG,
        );
        let wx = x
            + 900.0 * noise(x / 6_500.0, y / 6_500.0, 231)
            + 280.0 * noise(x / 1_700.0, y / 1_700.0, 232);
        let wy = y
            + 900.0 * noise(x / 6_500.0, y / 6_500.0, 233)
            + 280.0 * noise(x / 1_700.0, y / 1_700.0, 234);
        let (height, east, north) = self.mesh.smooth(wx, wy);
        let slope = east * east + north * north;
        let rough = slope / (slope + 0.08);
        let crags = ridged(wx, wy, 1_100.0, 6, 0.5, 242) - 0.6;
        height + 150.0 * rough * crags + 1.5 * noise(x / 80.0, y / 80.0, 251)
    }

    /// Writes the DEM about the middle as a GeoTIFF: float heights in decimetre steps, deflated with the floating
    /// point predictor, tiles of 512 posts. Written beside and renamed, so that no half a file is taken for the DEM.
    ///
    /// # Errors
    /// What GDAL or the file system says.
    pub fn write_dem(&self, path: &Path, half_lat_deg: f64, half_lon_deg: f64) -> Result<()> {
        const BAND: usize = 512;
        let count = |half_deg: f64| 2 * (half_deg * POSTS_PER_DEG) as usize;
        let (columns, rows) = (count(half_lon_deg), count(half_lat_deg));
        let (west, north) = (
            MIDDLE_LON_DEG - 0.5 * columns as f64 / POSTS_PER_DEG,
            MIDDLE_LAT_DEG + 0.5 * rows as f64 / POSTS_PER_DEG,
        );
        let beside = path.with_extension("part.tif");
        let options = RasterCreationOptions::from_iter([
            "COMPRESS=DEFLATE",
            "PREDICTOR=3",
            "TILED=YES",
            "BLOCKXSIZE=512",
            "BLOCKYSIZE=512",
            "NUM_THREADS=ALL_CPUS",
        ]);
        let mut file = DriverManager::get_driver_by_name("GTiff")?
            .create_with_band_type_with_options::<f32, _>(&beside, columns, rows, 1, &options)
            .with_context(|| format!("creating {}", beside.display()))?;
        file.set_geo_transform(&[
            west,
            1.0 / POSTS_PER_DEG,
            0.0,
            north,
            0.0,
            -1.0 / POSTS_PER_DEG,
        ])?;
        file.set_spatial_ref(&SpatialRef::from_epsg(4326)?)?;
        let mut band = file.rasterband(1)?;
        for first in (0..rows).step_by(BAND) {
            let height = BAND.min(rows - first);
            let mut posts = vec![0.0_f32; height * columns];
            posts
                .par_chunks_mut(columns)
                .enumerate()
                .for_each(|(row, line)| {
                    let lat = north - ((first + row) as f64 + 0.5) / POSTS_PER_DEG;
                    for (column, post) in line.iter_mut().enumerate() {
                        let lon = west + (column as f64 + 0.5) / POSTS_PER_DEG;
                        *post = ((self.height_m(lon, lat) * 10.0 + 0.5).floor() / 10.0) as f32;
                    }
                });
            band.write(
                (0, first as isize),
                (columns, height),
                &mut Buffer::new((columns, height), posts),
            )?;
        }
        file.close()
            .with_context(|| format!("writing {}", beside.display()))?;
        std::fs::rename(&beside, path).with_context(|| format!("renaming {}", beside.display()))
    }

    /// Ground stations scattered over the middle square of `2 * half_width_m`, within a metre or so of the surface.
    #[must_use]
    pub fn scattered_stations(&self, count: usize, seed: u64, half_width_m: f64) -> Vec<Station> {
        (0..count as i64)
            .map(|index| {
                let bits = hash(index, 0, seed);
                let lon_deg = MIDDLE_LON_DEG + signed_unit(bits) * half_width_m / EAST_M_PER_DEG;
                let lat_deg =
                    MIDDLE_LAT_DEG + signed_unit(bits >> 32) * half_width_m / NORTH_M_PER_DEG;
                let height_m = self.height_m(lon_deg, lat_deg) + 0.7 * near_normal(index, 1, seed);
                Station {
                    lon_deg,
                    lat_deg,
                    height_m,
                    ground: Ground::Bend,
                }
            })
            .collect()
    }
}

/// The DEM of a size in the folder of bench data, made there if it is not yet.
///
/// # Errors
/// What GDAL or the file system says.
pub fn alpine_dem(
    alpine: &Alpine,
    folder: &Path,
    half_lat_deg: f64,
    half_lon_deg: f64,
) -> Result<PathBuf> {
    let path = folder.join(format!("alpine_{half_lon_deg:.3}x{half_lat_deg:.3}.tif"));
    if !path.is_file() {
        std::fs::create_dir_all(folder)
            .with_context(|| format!("creating {}", folder.display()))?;
        alpine.write_dem(&path, half_lat_deg, half_lon_deg)?;
    }
    Ok(path)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Great circle, R = 6371 km, with half a percent for the ellipsoid: the disc of a station at the corner of the
    /// 20 km x 20 km square must lie on the full DEM.
    #[test]
    fn full_dem_covers_every_stations_disc() {
        let arc = 1.002 * 166_735.0 / 6_371_000.0f64;
        let (lon_m, lat_m) = (10_000.0 / EAST_M_PER_DEG, 10_000.0 / NORTH_M_PER_DEG);
        assert!(arc.to_degrees() + lat_m < FULL_HALF_LAT_DEG);
        let lat = (MIDDLE_LAT_DEG + lat_m).to_radians();
        assert!((arc.sin() / lat.cos()).asin().to_degrees() + lon_m < FULL_HALF_LON_DEG);
        let cells = 4.0 * FULL_HALF_LAT_DEG * FULL_HALF_LON_DEG * POSTS_PER_DEG * POSTS_PER_DEG;
        assert!((1.9e8..2.0e8).contains(&cells), "{cells} cells");
    }

    #[test]
    fn relief_is_alpine() {
        let alpine = Alpine::new();
        let (mut heights, mut steps) = (Vec::new(), Vec::new());
        for i in 0..200 {
            for j in 0..200 {
                let (lon, lat) = (
                    MIDDLE_LON_DEG + 0.02 * f64::from(i - 100),
                    MIDDLE_LAT_DEG + 0.014 * f64::from(j - 100),
                );
                let height = alpine.height_m(lon, lat);
                heights.push(height);
                // What a post adds to the mean of its neighbours to the west and east: the roughness at the post.
                let beside = 0.5
                    * (alpine.height_m(lon - 1.0 / POSTS_PER_DEG, lat)
                        + alpine.height_m(lon + 1.0 / POSTS_PER_DEG, lat));
                steps.push((height - beside).abs());
            }
        }
        heights.sort_by(f64::total_cmp);
        steps.sort_by(f64::total_cmp);
        let share = |sorted: &[f64], part: f64| sorted[(part * (sorted.len() - 1) as f64) as usize];
        assert!(
            share(&heights, 0.0) > 250.0 && share(&heights, 1.0) < 4_800.0,
            "{heights:?}"
        );
        assert!(
            share(&heights, 0.95) - share(&heights, 0.05) > 1_500.0,
            "relief of a mountain range"
        );
        let (median, high) = (share(&steps, 0.5), share(&steps, 0.95));
        assert!(
            median > 0.5 && high > 3.0 && high < 12.0,
            "roughness at the posts: {median} m, {high} m"
        );
    }
}
