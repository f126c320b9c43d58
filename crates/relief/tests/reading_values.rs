//! What the stored values of a DEM come to mean.
#![allow(clippy::unwrap_used, reason = "a test may end here")]

mod reading_support;

use gdal::Dataset;
use gdal::raster::{Buffer, RasterCreationOptions};
use gdal::{DriverManager, Metadata};
use hillpull_relief::{Fault, ReadOptions};
use reading_support::{Shape, UTM, assert_heights, folder, read, refused};

const VOID: f32 = f32::NAN;

/// One row above another of three posts.
const SIX: Shape<'_> = Shape {
    rows: 2,
    cols: 3,
    ..UTM
};

fn set_unit(dataset: &Dataset, unit: &str) {
    let band = dataset.rasterband(1).unwrap();
    let unit = std::ffi::CString::new(unit).unwrap();
    // SAFETY: the band and the string live through the call.
    let code = unsafe { gdal_sys::GDALSetRasterUnitType(band.c_rasterband(), unit.as_ptr()) };
    assert_eq!(code, 0);
}

fn set_nodata(dataset: &Dataset, nodata: f64) {
    let mut band = dataset.rasterband(1).unwrap();
    band.set_no_data_value(Some(nodata)).unwrap();
}

#[test]
fn nodata_of_integers_and_floats() {
    let dir = folder();
    let file = |name: &str| dir.path().join(name);
    let path = SIX.geotiff(&file("i16.tif"), vec![1, -32_768, 3, 4, -5, 6_i16], |d| {
        set_nodata(d, -32_768.0);
    });
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, -5.0, 6.0]);

    let path = SIX.geotiff(&file("u16.tif"), vec![1, 65_535, 3, 4, 5, 6_u16], |d| {
        set_nodata(d, 65_535.0);
    });
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, 5.0, 6.0]);

    let stored = vec![1, i32::MIN, i32::MAX - 1, 4, 5, 6_i32];
    let path = SIX.geotiff(&file("i32.tif"), stored, |d| {
        set_nodata(d, f64::from(i32::MIN))
    });
    let (fault, ..) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::AbsurdHeight { row: 0, col: 2, .. }));

    // 0.1 is not the same number in f32 and f64
    let path = SIX.geotiff(
        &file("f32.tif"),
        vec![1.0, -9999.1, 3.0, 4.0, 5.0, 6.0_f32],
        |d| {
            set_nodata(d, -9999.1);
        },
    );
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, 5.0, 6.0]);

    let path = SIX.geotiff(&file("nan.tif"), vec![1.0, VOID, 3.0, 4.0, 5.0, 6.0], |d| {
        set_nodata(d, f64::NAN);
    });
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, 5.0, 6.0]);

    // NaN is a void also where another value is nodata
    let path = SIX.geotiff(
        &file("both.tif"),
        vec![1.0, VOID, 0.0, 4.0, 5.0, 6.0],
        |d| {
            set_nodata(d, 0.0);
        },
    );
    assert_heights(&read(&path).heights_m, &[1.0, VOID, VOID, 4.0, 5.0, 6.0]);

    let path = SIX.geotiff(
        &file("f64.tif"),
        vec![1.0, f64::MIN, 3.0, 4.0, 5.0, 6.0],
        |d| {
            set_nodata(d, f64::MIN);
        },
    );
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, 5.0, 6.0]);

    // written with few digits, as some text formats do
    let path = SIX.geotiff(
        &file("few.tif"),
        vec![1.0, f32::MIN, 3.0, 4.0, 5.0, 6.0],
        |d| {
            set_nodata(d, -3.4e38);
        },
    );
    assert_heights(&read(&path).heights_m, &[1.0, VOID, 3.0, 4.0, 5.0, 6.0]);
}

#[test]
fn scale_and_offset_after_nodata() {
    let dir = folder();
    // nodata is a stored value: 100 is a void, 99 is 99 * 0.5 + 1000
    let path = SIX.geotiff(
        &dir.path().join("a.tif"),
        vec![0, 100, 99, 1, 2, 3_i16],
        |d| {
            let mut band = d.rasterband(1).unwrap();
            band.set_scale(0.5).unwrap();
            band.set_offset(1000.0).unwrap();
            band.set_no_data_value(Some(100.0)).unwrap();
        },
    );
    let expected = [1000.0, VOID, 1049.5, 1000.5, 1001.0, 1001.5];
    assert_heights(&read(&path).heights_m, &expected);

    // 1e9 + 1 has more digits than f32: rounded before the scale it would be 1000 m off by 0.02 m and more
    let big = 1_000_000_000_i32;
    let stored = vec![big + 1, big + 1234, big, big, i32::MIN, big];
    let path = SIX.geotiff(&dir.path().join("b.tif"), stored, |d| {
        let mut band = d.rasterband(1).unwrap();
        band.set_scale(0.001).unwrap();
        band.set_offset(-999_000.0).unwrap();
        band.set_no_data_value(Some(f64::from(i32::MIN))).unwrap();
    });
    let expected = [1000.001, 1001.234, 1000.0, 1000.0, VOID, 1000.0];
    assert_heights(&read(&path).heights_m, &expected);

    let path = SIX.geotiff(&dir.path().join("c.tif"), vec![1_i16; 6], |d| {
        d.rasterband(1).unwrap().set_scale(0.0).unwrap();
    });
    let (fault, text, hint) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::BadScale { .. }));
    assert_eq!(
        text,
        "reading DEM c.tif: its scale 0 and offset 0 make no heights"
    );
    assert_eq!(
        hint,
        "set them right: gdal_edit.py -scale <scale> -offset <offset> c.tif"
    );
}

#[test]
fn feet_become_metres() {
    let dir = folder();
    for (unit, metres) in [
        ("ft", 0.3048),
        ("US survey foot", 1200.0 / 3937.0),
        ("m", 1.0),
    ] {
        let stored: Vec<f32> = vec![0.0, 1000.0, 10_000.0, -9999.0, 3937.0, 0.5];
        let path = SIX.geotiff(&dir.path().join("feet.tif"), stored.clone(), |d| {
            set_unit(d, unit);
            set_nodata(d, -9999.0);
        });
        let grid = read(&path);
        let expected: Vec<f32> = stored
            .iter()
            .map(|&v| {
                if v == -9999.0 {
                    VOID
                } else {
                    (f64::from(v) * metres) as f32
                }
            })
            .collect();
        assert_heights(&grid.heights_m, &expected);
        assert_eq!(grid.origin.height_unit, unit);
    }
}

#[test]
fn unit_of_the_vertical_crs() {
    let dir = folder();
    // EPSG:6360 is NAVD88 height in US survey feet, EPSG:5703 the same in metres
    for (crs, metres) in [
        ("EPSG:32632+6360", 1200.0 / 3937.0),
        ("EPSG:32632+5703", 1.0),
    ] {
        let compound = Shape {
            crs: Some(crs),
            ..SIX
        };
        let path = dir.path().join("compound.tif");
        let path = compound.geotiff(&path, vec![3937.0_f32; 6], |_| {});
        let grid = read(&path);
        assert_eq!(grid.heights_m, [(3937.0 * metres) as f32; 6]);
        // only the horizontal part places the posts
        assert_eq!(
            grid.lonlat_rad(&[[0.0, 0.0], [1.0, 2.0]]).unwrap(),
            read(&SIX.geotiff(&dir.path().join("plain.tif"), vec![1_f32; 6], |_| {}))
                .lonlat_rad(&[[0.0, 0.0], [1.0, 2.0]])
                .unwrap()
        );
    }
}

#[test]
fn horizontal_feet_without_a_word_on_heights_are_a_doubt() {
    let dir = folder();
    let feet = Shape {
        edges: [4_760_096.0, 30.0, 0.0, 3_744_293.0, 0.0, -30.0],
        crs: Some("EPSG:2230"),
        ..SIX
    };
    let path = feet.geotiff(&dir.path().join("ca.tif"), vec![100_f32; 6], |_| {});
    let grid = read(&path);
    assert_eq!(grid.heights_m, [100.0; 6]);
    assert_eq!(
        grid.origin.warnings,
        [
            "x and y are in 'US survey foot' and no unit is stated for the heights; they are taken for metres"
        ]
    );
}

#[test]
fn mask_bands_make_voids() {
    let dir = folder();
    let path = SIX.geotiff(
        &dir.path().join("mask.tif"),
        vec![1, 2, 3, 4, 32_000, 6_i16],
        |d| {
            set_nodata(d, 1.0);
            let mut band = d.rasterband(1).unwrap();
            band.create_mask_band(true).unwrap();
            let mut mask = band.open_mask_band().unwrap();
            let valid = vec![255_u8, 255, 255, 0, 0, 255];
            mask.write((0, 0), (3, 2), &mut Buffer::new((3, 2), valid))
                .unwrap();
        },
    );
    // what a mask hides may be as absurd as it likes
    assert_heights(&read(&path).heights_m, &[VOID, 2.0, 3.0, VOID, VOID, 6.0]);
}

#[test]
fn absurd_heights_are_named() {
    let dir = folder();
    let path = dir.path().join("a.tif");
    let path = SIX.geotiff(&path, vec![1.0, 2.0, 3.0, 4.0, f32::INFINITY, 6.0], |_| {});
    let (fault, text, hint) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::AbsurdHeight { row: 1, col: 1, .. }));
    assert_eq!(
        text,
        "reading DEM a.tif: the value inf at row 1, column 1 of the file (from 0) is inf m, beyond 12000 m"
    );
    assert_eq!(
        hint,
        "if this value marks missing data, say so: gdal_edit.py -a_nodata inf a.tif"
    );
}

#[test]
fn marks_of_missing_data_that_are_not_stated() {
    let dir = folder();
    let file = |name: &str| dir.path().join(name);
    let options = ReadOptions::default();
    let path = SIX.geotiff(&file("a.tif"), vec![1, 2, 3, 4, 5, -9999_i16], |_| {});
    let (_, text, hint) = refused(&path, &options);
    assert_eq!(
        text,
        "reading DEM a.tif: the value -9999 at row 1, column 2 of the file (from 0) stands beside a height of 5 m: it \
         looks like a mark of missing data, but the file states none such"
    );
    assert_eq!(
        hint,
        "if this value marks missing data, say so: gdal_edit.py -a_nodata -9999 a.tif"
    );
    // in feet even -32768 is a depth that exists: 9988 m
    let path = SIX.geotiff(&file("b.tif"), vec![1, 2, 3, 4, 5, -32_768_i16], |d| {
        set_unit(d, "ft")
    });
    let (fault, ..) = refused(&path, &options);
    assert!(matches!(
        fault,
        Fault::UnstatedVoid {
            value: -32_768.0,
            ..
        }
    ));
    // the sea floor of a trench comes by there honestly
    let trench = vec![-9500, -9800, -9999, -10_100, -9999, -9700_i16];
    let path = SIX.geotiff(&file("c.tif"), trench, |_| {});
    assert_eq!(read(&path).lowest_m(), Some(-10_100.0));
}

#[test]
fn formats_and_types() {
    let dir = folder();
    let heights = SIX.values(|row, col| (10 * row + col) as f32 + 0.5);
    let memory = SIX.create("MEM", std::path::Path::new(""), &[], heights.clone());
    set_nodata(&memory, 1.5);
    let expected = [0.5, VOID, 2.5, 10.5, 11.5, 12.5];
    for (driver, name) in [
        ("COG", "a.tif"),
        ("netCDF", "a.nc"),
        ("VRT", "a.vrt"),
        ("HFA", "a.img"),
    ] {
        let path = dir.path().join(name);
        let driver = DriverManager::get_driver_by_name(driver).unwrap();
        if name == "a.vrt" {
            // of a file: the data set in memory is gone when it is read again
            let source = SIX.geotiff(&dir.path().join("source.tif"), heights.clone(), |d| {
                set_nodata(d, 1.5)
            });
            let source = Dataset::open(&source).unwrap();
            source
                .create_copy(&driver, &path, &RasterCreationOptions::new())
                .unwrap();
        } else {
            memory
                .create_copy(&driver, &path, &RasterCreationOptions::new())
                .unwrap();
        }
        let grid = read(&path);
        assert_heights(&grid.heights_m, &expected);
        let at = grid.lonlat_rad(&[[1.0, 2.0]]).unwrap()[0];
        let plain = read(&dir.path().join("a.tif"))
            .lonlat_rad(&[[1.0, 2.0]])
            .unwrap()[0];
        assert!(
            (at[0] - plain[0]).abs() < 1e-12 && (at[1] - plain[1]).abs() < 1e-12,
            "{name}"
        );
        assert!(grid.source_files().contains(&path), "{name}");
    }
}

#[test]
fn several_files_by_vrt() {
    let dir = folder();
    let tile = |name: &str, west: f64, first: f32| {
        let shape = Shape {
            edges: [west, 30.0, 0.0, 5e6, 0.0, -30.0],
            ..SIX
        };
        let values = shape.values(|row, col| first + (3 * row + col) as f32);
        shape.geotiff(&dir.path().join(name), values, |_| {})
    };
    // a gap of one post between the two
    let tiles = [
        tile("west.tif", 5e5, 0.0),
        tile("east.tif", 5e5 + 120.0, 100.0),
    ];
    let open: Vec<Dataset> = tiles.iter().map(|t| Dataset::open(t).unwrap()).collect();
    let path = dir.path().join("both.vrt");
    let options = gdal::programs::raster::BuildVRTOptions::new(["-vrtnodata", "-9999"]).unwrap();
    gdal::programs::raster::build_vrt(Some(&path), &open, Some(options))
        .unwrap()
        .close()
        .unwrap();
    let grid = read(&path);
    let expected = [
        0.0, 1.0, 2.0, VOID, 100.0, 101.0, 102.0, 3.0, 4.0, 5.0, VOID, 103.0, 104.0, 105.0,
    ];
    assert_heights(&grid.heights_m, &expected);
    let mut files = grid.source_files().to_vec();
    files.sort();
    assert_eq!(files, [path, tiles[1].clone(), tiles[0].clone()]);
}

#[test]
fn bands_by_number() {
    let dir = folder();
    let path = dir.path().join("two.tif");
    let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
    let mut dataset = driver
        .create_with_band_type::<f32, _>(&path, 3, 2, 2)
        .unwrap();
    dataset.set_geo_transform(&UTM.edges).unwrap();
    let srs = gdal::spatial_ref::SpatialRef::from_epsg(32_632).unwrap();
    dataset.set_spatial_ref(&srs).unwrap();
    for number in [1, 2] {
        let mut band = dataset.rasterband(number).unwrap();
        let mut values = Buffer::new((3, 2), vec![number as f32; 6]);
        band.write((0, 0), (3, 2), &mut values).unwrap();
    }
    dataset.set_description("two bands").unwrap();
    dataset.close().unwrap();
    let second = ReadOptions {
        band: 2,
        ..ReadOptions::default()
    };
    let grid = hillpull_relief::read_grid(&path, &second).unwrap();
    assert_eq!(grid.heights_m, [2.0; 6]);
    assert_eq!(
        grid.origin.warnings,
        ["it has 2 bands; band 2 is taken for the heights"]
    );
    for band in [0, 3] {
        let options = ReadOptions {
            band,
            ..ReadOptions::default()
        };
        let (_, text, hint) = refused(&path, &options);
        assert_eq!(
            text,
            format!("reading DEM two.tif: it has 2 bands, so there is no band {band}")
        );
        assert_eq!(hint, "choose a band from 1 to 2");
    }
}

#[test]
fn summary_of_heights() {
    let dir = folder();
    let path = SIX.geotiff(
        &dir.path().join("a.tif"),
        vec![-3.0, VOID, -0.0, 7.0, -1.5, 2.0],
        |_| {},
    );
    let grid = read(&path);
    assert_eq!(grid.lowest_m(), Some(-3.0));
    assert_eq!(grid.height_summary().highest_m, Some(7.0));
    assert_eq!(grid.count_below_zero(), 2);
    assert_eq!(grid.void_count(), 1);
}
