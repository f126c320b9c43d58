//! Only what lies within reach of the stations is read, also across the antimeridian.
#![allow(clippy::unwrap_used, reason = "a test may end here")]

mod reading_support;

use std::cell::RefCell;
use std::path::Path;
use std::sync::atomic::{AtomicBool, Ordering};

use hillpull_physics::ellipsoid::{Ellipsoid, Vec3, norm, sub};
use hillpull_relief::{Fault, Grid, Reach, ReadOptions, read_grid};
use proptest::prelude::*;
use reading_support::{Shape, assert_lonlat, folder, lonlat_deg, read};

fn within(path: &Path, reach: Reach) -> Result<Grid, hillpull_relief::ReliefError> {
    let options = ReadOptions {
        reach: Some(reach),
        ..ReadOptions::default()
    };
    read_grid(path, &options)
}

/// Rows and columns of all posts of a grid, and their places in ECEF, metres.
fn all_posts(grid: &Grid) -> Vec<((usize, usize), Vec3)> {
    let posts: Vec<[f64; 2]> = (0..grid.rows)
        .flat_map(|r| (0..grid.cols).map(move |c| [r as f64, c as f64]))
        .collect();
    let places = grid.lonlat_rad(&posts).unwrap();
    let feet = places
        .iter()
        .map(|at| Ellipsoid::WGS84.foot_ecef_m(at[0], at[1]));
    posts
        .iter()
        .map(|post| (post[0] as usize, post[1] as usize))
        .zip(feet)
        .collect()
}

/// Rows and columns of those within reach.
fn posts_within(
    posts: &[((usize, usize), Vec3)],
    reach: &Reach,
) -> impl Iterator<Item = (usize, usize)> {
    let middle = Ellipsoid::WGS84.foot_ecef_m(reach.lon_rad, reach.lat_rad);
    posts
        .iter()
        .filter(move |(_, foot)| norm(sub(*foot, middle)) <= reach.radius_m)
        .map(|(post, _)| *post)
}

/// 300 x 400 posts 100 m apart, tiled and compressed, a different height at each.
fn alps(dir: &Path) -> std::path::PathBuf {
    let shape = Shape {
        rows: 300,
        cols: 400,
        edges: [480_000.0, 100.0, 0.0, 5_130_000.0, 0.0, -100.0],
        crs: Some("EPSG:32632"),
    };
    let path = dir.join("alps.tif");
    let values = shape.values(|row, col| (row * 400 + col) as f32 / 16.0);
    let options = [
        "TILED=YES",
        "BLOCKXSIZE=64",
        "BLOCKYSIZE=64",
        "COMPRESS=DEFLATE",
    ];
    shape
        .create("GTiff", &path, &options, values)
        .close()
        .unwrap();
    path
}

#[test]
fn a_window_is_a_cut_of_the_whole() {
    let dir = folder();
    let path = alps(dir.path());
    let whole = read(&path);
    let posts = all_posts(&whole);
    let mut runner = proptest::test_runner::TestRunner::new(ProptestConfig::with_cases(60));
    // middles in and around the grid: 8.74 to 9.26 E, 46.05 to 46.32 N
    let places = (8.6..9.4f64, 45.95..46.4f64, 100.0..20_000.0f64);
    runner
        .run(&places, |(lon_deg, lat_deg, radius_m)| {
            let reach = Reach {
                lon_rad: lon_deg.to_radians(),
                lat_rad: lat_deg.to_radians(),
                radius_m,
            };
            let needed: Vec<_> = posts_within(&posts, &reach).collect();
            let window = match within(&path, reach) {
                Ok(window) => window,
                Err(error) => {
                    prop_assert!(needed.is_empty() && error.is_out_of_reach(), "{error}");
                    return Ok(());
                }
            };
            let (r0, c0) = (window.origin.first_row, window.origin.first_col);
            prop_assert_eq!(
                (window.origin.file_rows, window.origin.file_cols),
                (300, 400)
            );
            for row in 0..window.rows {
                let from = (r0 + row) * 400 + c0;
                let cut = &whole.heights_m[from..from + window.cols];
                prop_assert_eq!(
                    &window.heights_m[row * window.cols..(row + 1) * window.cols],
                    cut
                );
            }
            let here = lonlat_deg(&window, 1.0, 1.0);
            let there = lonlat_deg(&whole, r0 as f64 + 1.0, c0 as f64 + 1.0);
            assert_lonlat(here, there[0], there[1], 1e-11);
            // nothing needed is lost, the two rows and columns around it included where the file has them
            for &(row, col) in &needed {
                prop_assert!(
                    row.saturating_sub(2) >= r0.min(row.saturating_sub(2))
                        && row >= r0
                        && col >= c0
                );
                prop_assert!(row < r0 + window.rows && col < c0 + window.cols);
                prop_assert!(row < 2 || row - 2 >= r0);
                prop_assert!(row + 2 >= 300 || row + 2 < r0 + window.rows);
                prop_assert!(col < 2 || col - 2 >= c0);
                prop_assert!(col + 2 >= 400 || col + 2 < c0 + window.cols);
            }
            // and not much more is read: 4 posts a side, 5 % of the reach
            let side = 2.0 * radius_m * 1.05 / 100.0 + 12.0;
            prop_assert!((window.rows as f64) < side && (window.cols as f64) < side);
            Ok(())
        })
        .unwrap();
}

#[test]
fn a_dem_out_of_reach_is_told_apart() {
    let dir = folder();
    let path = alps(dir.path());
    // the northernmost posts lie at 46.3231 N, 75.2 km (at 111.17 km a degree) south of the station
    let reach = Reach::around(&[(9.0, 47.0)], 10_000.0).unwrap();
    let error = within(&path, reach).unwrap_err();
    assert!(error.is_out_of_reach());
    let Fault::OutOfReach { distance_km, .. } = error.fault else {
        panic!("{error}");
    };
    assert!((distance_km - 65.2).abs() < 0.1, "{distance_km}");
    let text = error
        .to_string()
        .replace(&dir.path().display().to_string(), "");
    assert_eq!(
        text,
        "reading DEM /alps.tif: it ends 65.2 km short of the reach of the stations; \
         it covers longitude 8.7408 to 9.2592, latitude 46.0537 to 46.3231 degrees"
    );
    assert_eq!(
        error.hint().unwrap(),
        "leave it out, or check its CRS and that of the stations"
    );
}

/// Heights of a grid over the globe: whole degrees of longitude from -180, tenths for latitude.
fn globe_height(lon_deg: f64, lat_deg: f64) -> f32 {
    let lon = (lon_deg + 180.0).rem_euclid(360.0);
    (lon * 10.0 + (lat_deg + 90.0) / 100.0) as f32
}

/// A grid of 1 degree over the globe, with its first post at `west_deg` and `cols` columns.
fn globe(path: &Path, west_deg: f64, cols: usize, step: f64) {
    let shape = Shape {
        rows: 179,
        cols,
        edges: [west_deg - step / 2.0, step, 0.0, 89.5, 0.0, -1.0],
        crs: Some("EPSG:4326"),
    };
    let values =
        shape.values(|row, col| globe_height(west_deg + step * col as f64, 89.0 - row as f64));
    shape.geotiff(path, values, |_| {});
}

fn assert_globe(grid: &Grid) {
    for row in 0..grid.rows {
        for col in 0..grid.cols {
            let [lon, lat] = lonlat_deg(grid, row as f64, col as f64);
            let height = grid.heights_m[row * grid.cols + col];
            let expected = globe_height((lon * 2.0).round() / 2.0, lat);
            assert!(
                (height - expected).abs() < 1e-3,
                "{height} at {lon} {lat} is not {expected}"
            );
        }
    }
}

#[test]
fn across_the_antimeridian() {
    let dir = folder();
    let reach = Reach::around(&[(179.0, 10.2), (-178.5, 9.0)], 166_735.0).unwrap();
    // posts in the middle of pixels; with -180 and 180 both; from 0 to 360; turned to run west
    for (name, west_deg, cols, step) in [
        ("a.tif", -179.5, 360, 1.0),
        ("b.tif", -180.0, 361, 1.0),
        ("c.tif", 0.0, 360, 1.0),
        ("d.tif", 0.0, 361, 1.0),
        ("e.tif", 180.0, 360, -1.0),
        ("f.tif", -180.0, 363, 1.0),
    ] {
        let path = dir.path().join(name);
        globe(&path, west_deg, cols, step);
        let grid = within(&path, reach).unwrap();
        assert_globe(&grid);
        // 2.5 degrees of stations, 1.5 on each side, margins of 2 posts, and the lattice's coarseness
        assert!(
            (7..=16).contains(&grid.cols) && (5..=14).contains(&grid.rows),
            "{name} {}",
            grid.cols
        );
        // every longitude from 177.6 to 183 is there, once
        let lons: Vec<f64> = (0..grid.cols)
            .map(|c| lonlat_deg(&grid, 0.0, c as f64)[0].rem_euclid(360.0))
            .collect();
        let (low, high) = lons
            .iter()
            .fold((f64::MAX, f64::MIN), |(a, b), &x| (a.min(x), b.max(x)));
        assert!(
            low < 177.5 && high > 183.0 && high - low < 16.0,
            "{name} {lons:?}"
        );
        assert!(
            lons.windows(2)
                .all(|w| ((w[1] - w[0]).abs() - 1.0).abs() < 1e-9),
            "{name} {lons:?}"
        );
    }
}

#[test]
fn away_from_the_antimeridian_a_globe_is_cut_like_any_other() {
    let dir = folder();
    for (name, west_deg) in [("a.tif", -180.0), ("b.tif", 0.0)] {
        let path = dir.path().join(name);
        globe(&path, west_deg, 361, 1.0);
        // 0 E is the seam of the second
        for lon_deg in [90.0, 0.0, -10.0] {
            let reach = Reach::around(&[(lon_deg, -30.0)], 166_735.0).unwrap();
            let grid = within(&path, reach).unwrap();
            assert_globe(&grid);
            assert!(grid.cols <= 14, "{name} {lon_deg} {}", grid.cols);
            assert!(posts_within(&all_posts(&grid), &reach).count() > 3);
        }
    }
}

#[test]
fn around_the_pole_the_ring_is_closed() {
    let dir = folder();
    let path = dir.path().join("a.tif");
    globe(&path, -179.5, 360, 1.0);
    let reach = Reach::around(&[(33.0, 89.8)], 166_735.0).unwrap();
    let grid = within(&path, reach).unwrap();
    assert_globe(&grid);
    // the first column again, so that the last cell of the ring is covered too
    assert_eq!(grid.cols, 361);
    assert!(grid.rows < 12, "{}", grid.rows);
    for row in 0..grid.rows {
        let line = &grid.heights_m[row * 361..(row + 1) * 361];
        assert_eq!(line[0], line[360]);
    }
}

#[test]
fn a_part_of_the_globe_is_no_ring() {
    let dir = folder();
    let path = dir.path().join("a.tif");
    // 170 E to 170 W in one piece, counted past 180
    globe(&path, 170.0, 21, 1.0);
    let reach = Reach::around(&[(-179.0, 0.0)], 166_735.0).unwrap();
    let grid = within(&path, reach).unwrap();
    assert_globe(&grid);
    assert!(
        grid.origin.first_col >= 6 && grid.cols <= 12,
        "{:?}",
        grid.origin
    );
}

#[test]
fn all_voids_within_reach() {
    let dir = folder();
    let shape = Shape {
        rows: 300,
        cols: 300,
        edges: [7.0, 0.01, 0.0, 47.0, 0.0, -0.01],
        crs: Some("EPSG:4326"),
    };
    // heights in the west only
    let values = shape.values(|_, col| if col < 20 { 5.0 } else { f32::NAN });
    let path = shape.geotiff(&dir.path().join("west.tif"), values, |_| {});
    let reach = Reach::around(&[(9.0, 45.5)], 5000.0).unwrap();
    let error = within(&path, reach).unwrap_err();
    assert!(matches!(error.fault, Fault::AllVoid { posts } if posts < 1000));
    assert!(
        error
            .to_string()
            .ends_with("posts within reach of the stations are voids")
    );
    assert_eq!(
        error.hint().unwrap(),
        "leave this DEM out, or check its nodata value and mask"
    );
}

#[test]
fn progress_is_told_and_stop_is_heard() {
    let dir = folder();
    let shape = Shape {
        rows: 5000,
        cols: 4000,
        edges: [7.0, 0.0001, 0.0, 47.0, 0.0, -0.0001],
        crs: Some("EPSG:4326"),
    };
    let path = dir.path().join("large.tif");
    let options = ["COMPRESS=ZSTD"];
    shape
        .create("GTiff", &path, &options, vec![7_i16; 5000 * 4000])
        .close()
        .unwrap();
    let told = RefCell::new(Vec::new());
    let stop = AtomicBool::new(false);
    let note = |share: f64| told.borrow_mut().push(share);
    let mut options = ReadOptions {
        progress: Some(&note),
        stop: Some(&stop),
        ..ReadOptions::default()
    };
    let grid = read_grid(&path, &options).unwrap();
    options.threads = Some(1);
    assert_eq!(
        grid.heights_m,
        read_grid(
            &path,
            &ReadOptions {
                progress: None,
                ..options.clone()
            }
        )
        .unwrap()
        .heights_m
    );
    assert!(grid.heights_m.iter().all(|&h| h == 7.0));
    let told = told.take();
    assert!(
        told.len() > 1 && told.windows(2).all(|w| w[0] < w[1]),
        "{told:?}"
    );
    assert_eq!(told.last(), Some(&1.0));

    // set from within, after the first part
    let set = |_: f64| stop.store(true, Ordering::Relaxed);
    options.progress = Some(&set);
    let error = read_grid(&path, &options).unwrap_err();
    assert_eq!(error.fault, Fault::Stopped);
    assert_eq!(error.hint(), None);
}
