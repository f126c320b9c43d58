//! DEMs that cannot be used, and what is said about them.
#![allow(clippy::unwrap_used, reason = "a test may end here")]

mod reading_support;

use std::path::Path;

use gdal::raster::{ColorInterpretation, RasterCreationOptions};
use gdal::spatial_ref::SpatialRef;
use gdal::{DriverManager, Metadata};
use hillpull_relief::{Fault, ReadOptions, Resample, ResampleMethod, read_grid};
use reading_support::{Shape, UTM, assert_lonlat, folder, lonlat_deg, refused};

fn says(path: &Path) -> (String, String) {
    let (_, text, hint) = refused(path, &ReadOptions::default());
    (text, hint)
}

#[test]
fn missing_and_foreign_files() {
    let dir = folder();
    let file = |name: &str| dir.path().join(name);
    assert_eq!(
        says(&file("none.tif")),
        (
            "reading DEM none.tif: no such file".to_owned(),
            "check the path and the working directory".to_owned()
        )
    );
    std::fs::write(file("words.tif"), "not a raster at all").unwrap();
    assert_eq!(
        says(&file("words.tif")),
        (
            "reading DEM words.tif: it is not a raster: no format that GDAL knows".to_owned(),
            "`gdalinfo words.tif` tells what GDAL makes of it; give a grid of heights".to_owned()
        )
    );
    std::fs::write(file("stations.csv"), "id,x,y,height\nA,1,2,3\n").unwrap();
    assert_eq!(
        says(&file("stations.csv")).0,
        "reading DEM stations.csv: it is not a raster: it holds vector features or a plain table"
    );
    std::fs::write(file("empty.tif"), "").unwrap();
    assert!(
        says(&file("empty.tif"))
            .0
            .starts_with("reading DEM empty.tif: it is not a raster")
    );
    // a folder
    assert!(matches!(
        refused(dir.path(), &ReadOptions::default()).0,
        Fault::NotARaster { .. }
    ));
}

#[test]
fn a_file_cut_short() {
    let dir = folder();
    let shape = Shape {
        rows: 600,
        cols: 600,
        ..UTM
    };
    let path = dir.path().join("short.tif");
    let noise = shape.values(|r, c| ((r * 7919 + c * 104_729) % 9973) as f32);
    let options = ["TILED=YES", "COMPRESS=DEFLATE"];
    shape
        .create("GTiff", &path, &options, noise)
        .close()
        .unwrap();
    let whole = std::fs::read(&path).unwrap();
    std::fs::write(&path, &whole[..whole.len() * 2 / 3]).unwrap();
    let (fault, text, hint) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::Unreadable { .. }), "{text}");
    assert!(
        text.starts_with("reading DEM short.tif: it cannot be read: "),
        "{text}"
    );
    assert_eq!(
        hint,
        "`gdalinfo -checksum short.tif` shows whether the file is whole; fetch or copy it again if it is not"
    );
}

#[test]
fn no_crs_or_one_of_no_use() {
    let dir = folder();
    let with = |name: &str, crs| {
        let path = dir.path().join(name);
        Shape { crs, ..UTM }.geotiff(&path, vec![1_f32; 35], |_| {})
    };
    assert_eq!(
        says(&with("a.tif", None)),
        (
            "reading DEM a.tif: it states no coordinate reference system".to_owned(),
            "if you know its CRS, assign it: gdal_edit.py -a_srs EPSG:<code> a.tif".to_owned()
        )
    );
    let local = r#"LOCAL_CS["mine grid",UNIT["metre",1]]"#;
    assert_eq!(
        says(&with("b.tif", Some(local))).0,
        "reading DEM b.tif: its coordinate reference system 'mine grid' is local: it is not tied to the Earth"
    );
    let (text, _) = says(&with("c.tif", Some("EPSG:4978")));
    assert_eq!(
        text,
        "reading DEM c.tif: its coordinate reference system 'WGS 84' is geocentric: it has no horizontal axes"
    );
    // EPSG:5831 is a depth below instantaneous water level
    let (text, hint) = says(&with("d.tif", Some("EPSG:32632+5831")));
    assert!(text.ends_with("counts depths downward"), "{text}");
    assert!(hint.contains("positive up"), "{hint}");
}

#[test]
fn no_place_for_the_posts() {
    let dir = folder();
    let path = dir.path().join("a.tif");
    Shape {
        edges: [0.0; 6],
        ..UTM
    }
    .geotiff(&path, vec![1_f32; 35], |_| {});
    assert_eq!(
        says(&path),
        (
            "reading DEM a.tif: it does not say where its rows and columns lie (no geotransform)".to_owned(),
            "if you know where it lies, assign its corners: gdal_edit.py -a_ullr <west> <north> <east> <south> a.tif"
                .to_owned()
        )
    );
    let flat = Shape {
        edges: [5e5, 30.0, 30.0, 5e6, -30.0, -30.0],
        ..UTM
    };
    let path = flat.geotiff(&dir.path().join("b.tif"), vec![1_f32; 35], |_| {});
    let (fault, text, _) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::DegeneratePlacement { .. }), "{text}");
}

#[test]
fn posts_off_the_globe() {
    let dir = folder();
    // metres said to be degrees
    let wrong = Shape {
        crs: Some("EPSG:4326"),
        ..UTM
    };
    let path = wrong.geotiff(&dir.path().join("a.tif"), vec![1_f32; 35], |_| {});
    let (fault, text, hint) = refused(&path, &ReadOptions::default());
    assert!(matches!(fault, Fault::Unplaceable { .. }));
    assert_eq!(
        text,
        "placing posts of a.tif: the post at row 2, column 3 (x 500105, y 4999925) has no place on the ellipsoid: \
         not a longitude and latitude"
    );
    assert!(
        hint.starts_with("check its CRS and corners with `gdalinfo a.tif`"),
        "{hint}"
    );
}

#[test]
fn too_few_posts() {
    let dir = folder();
    for (rows, cols) in [(1, 5), (5, 1)] {
        let path = dir.path().join("a.tif");
        Shape { rows, cols, ..UTM }.geotiff(&path, vec![1_f32; 5], |_| {});
        assert_eq!(
            says(&path).0,
            format!("reading DEM a.tif: {rows} rows and {cols} columns of posts make no surface")
        );
    }
}

#[test]
fn bands_that_hold_no_heights() {
    let dir = folder();
    let path = dir.path().join("picture.tif");
    let driver = DriverManager::get_driver_by_name("GTiff").unwrap();
    let options = RasterCreationOptions::from_iter(["PHOTOMETRIC=RGB"]);
    let mut dataset = driver
        .create_with_band_type_with_options::<u8, _>(&path, 3, 2, 3, &options)
        .unwrap();
    dataset.set_geo_transform(&UTM.edges).unwrap();
    let srs = SpatialRef::from_epsg(32_632).unwrap();
    dataset.set_spatial_ref(&srs).unwrap();
    assert_eq!(
        dataset.rasterband(1).unwrap().color_interpretation(),
        ColorInterpretation::RedBand
    );
    dataset.close().unwrap();
    assert_eq!(
        says(&path).0,
        "reading DEM picture.tif: band 1 does not hold heights: it is one colour of a picture"
    );

    // complex values, which the gdal crate cannot write: a VRT says so
    let path = dir.path().join("complex.vrt");
    let text = r#"<VRTDataset rasterXSize="3" rasterYSize="2"><GeoTransform>0,1,0,9,0,-1</GeoTransform>
        <SRS>EPSG:4326</SRS><VRTRasterBand dataType="CFloat32" band="1"/></VRTDataset>"#;
    std::fs::write(&path, text).unwrap();
    let (text, hint) = says(&path);
    assert_eq!(
        text,
        "reading DEM complex.vrt: band 1 does not hold heights: its values are complex or of a type that is not known here"
    );
    assert_eq!(hint, "give the band that holds heights, in metres or feet");
}

#[test]
fn heights_in_kelvin() {
    let dir = folder();
    let path = dir.path().join("warm.vrt");
    let text = r#"<VRTDataset rasterXSize="3" rasterYSize="2"><GeoTransform>0,1,0,9,0,-1</GeoTransform>
        <SRS>EPSG:4326</SRS><VRTRasterBand dataType="Float32" band="1"><UnitType>K</UnitType></VRTRasterBand></VRTDataset>"#;
    std::fs::write(&path, text).unwrap();
    let (text, hint) = says(&path);
    assert_eq!(
        text,
        "reading DEM warm.vrt: its heights are in 'K', which is no unit of length known here"
    );
    assert_eq!(
        hint,
        "set the band's unit to 'm', 'ft' or 'US survey foot': gdal_translate to VRT and edit its UnitType"
    );
}

#[test]
fn a_container_of_several_rasters() {
    let dir = folder();
    let path = dir.path().join("two.gpkg");
    let driver = DriverManager::get_driver_by_name("GPKG").unwrap();
    let memory = UTM.create("MEM", Path::new(""), &[], vec![1_u8; 35]);
    for (table, append) in [("relief", "NO"), ("bed", "YES")] {
        let options = RasterCreationOptions::from_iter([
            format!("RASTER_TABLE={table}"),
            format!("APPEND_SUBDATASET={append}"),
        ]);
        memory
            .create_copy(&driver, &path, &options)
            .unwrap()
            .close()
            .unwrap();
    }
    let (fault, text, hint) = refused(&path, &ReadOptions::default());
    let Fault::SeveralRasters { names } = fault else {
        panic!("{text}");
    };
    assert_eq!(names.len(), 2);
    assert!(
        hint.starts_with("name the one with the heights, as GPKG:"),
        "{hint}"
    );
}

/// A GeoTIFF that says by ground control points alone where it lies: 40 x 50 posts, 100 m apart, turned by 10 degrees
/// about (500 000, 5 000 000), heights a plane rising east.
fn by_control_points(path: &Path) {
    let (rows, cols) = (40, 50);
    let (sin, cos) = 10_f64.to_radians().sin_cos();
    let xy = |row: f64, col: f64| {
        let (x, y) = (100.0 * col, -100.0 * row);
        (5e5 + x * cos - y * sin, 5e6 + x * sin + y * cos)
    };
    let shape = Shape {
        rows,
        cols,
        edges: [0.0; 6],
        crs: None,
    };
    let values = shape.values(|row, col| {
        let (x, _) = xy(row as f64 + 0.5, col as f64 + 0.5);
        ((x - 5e5) / 10.0) as f32
    });
    shape.geotiff(path, values, |dataset| {
        let corners = [(0.0, 0.0), (0.0, 50.0), (40.0, 0.0), (40.0, 50.0)];
        let points = corners
            .iter()
            .enumerate()
            .map(|(k, &(line, pixel))| {
                let (x, y) = xy(line, pixel);
                gdal::Gcp {
                    id: k.to_string(),
                    info: String::new(),
                    pixel,
                    line,
                    x,
                    y,
                    z: 0.0,
                }
            })
            .collect();
        let srs = SpatialRef::from_epsg(32_632).unwrap();
        dataset.set_gcps(points, &srs).unwrap();
    });
}

#[test]
fn control_points_need_resampling() {
    let dir = folder();
    let path = dir.path().join("turned.tif");
    by_control_points(&path);
    assert_eq!(
        says(&path),
        (
            "reading DEM turned.tif: it says where its posts lie only by 4 ground control points, not by a regular grid"
                .to_owned(),
            "--resample puts it onto a working grid, at the cost of some smoothing".to_owned()
        )
    );
    for method in [ResampleMethod::Bilinear, ResampleMethod::Cubic] {
        let resample = Resample {
            spacing: Some(50.0),
            method,
            crs: None,
        };
        let options = ReadOptions {
            resample: Some(resample),
            ..ReadOptions::default()
        };
        let grid = read_grid(&path, &options).unwrap();
        let [between_rows, between_cols] = grid.post_spacing_m().unwrap();
        assert!(
            (between_rows * 0.9996 - 50.0).abs() < 1e-3
                && (between_cols * 0.9996 - 50.0).abs() < 1e-3
        );
        // a plane stays a plane, bilinear or cubic
        let mut seen = 0;
        for row in 0..grid.rows {
            for col in 0..grid.cols {
                let height = grid.heights_m[row * grid.cols + col];
                let x = grid.placement.xy(row as f64, col as f64)[0];
                let inside = col.abs_diff(grid.cols / 2) < 20 && row.abs_diff(grid.rows / 2) < 20;
                if inside {
                    seen += 1;
                    assert!(
                        (f64::from(height) - (x - 5e5) / 10.0).abs() < 0.1,
                        "{height} at {x}"
                    );
                }
            }
        }
        assert!(seen > 1000, "{seen}");
        assert!(
            grid.void_count() > 0,
            "the corners of the working grid are void"
        );
        let word = if method == ResampleMethod::Cubic {
            "cubic"
        } else {
            "bilinear"
        };
        assert_eq!(
            grid.origin.warnings,
            [format!(
                "heights were resampled onto a working grid ({word}, spacing 50.000000 in WGS 84 / UTM zone 32N); this \
                 smooths the ground and loses terrain effect, most near stations in steep relief"
            )]
        );
        assert!(grid.source_files().contains(&path));
    }
}

#[test]
fn resampling_keeps_unit_scale_and_voids() {
    let dir = folder();
    let degrees = Shape {
        rows: 60,
        cols: 80,
        edges: [9.0, 0.001, 0.0, 46.0, 0.0, -0.001],
        crs: Some("EPSG:4326"),
    };
    let values = degrees.values(|row, _| if row < 20 { -1_i16 } else { 1000 });
    let path = degrees.geotiff(&dir.path().join("a.tif"), values, |d| {
        let mut band = d.rasterband(1).unwrap();
        band.set_no_data_value(Some(-1.0)).unwrap();
        band.set_scale(0.5).unwrap();
        d.set_description("half metres").unwrap();
    });
    let resample = Resample {
        crs: Some("EPSG:32632".to_owned()),
        ..Resample::default()
    };
    let options = ReadOptions {
        resample: Some(resample),
        ..ReadOptions::default()
    };
    let grid = read_grid(&path, &options).unwrap();
    assert_eq!(grid.lowest_m(), Some(500.0));
    assert_eq!(grid.height_summary().highest_m, Some(500.0));
    let void_share = grid.void_count() as f64 / grid.heights_m.len() as f64;
    assert!((void_share - 1.0 / 3.0).abs() < 0.05, "{void_share}");
    // mean spacing of the posts: 0.001 degrees are 111 m north and 77 m east there
    let [between_rows, _] = grid.post_spacing_m().unwrap();
    assert!((77.0..111.0).contains(&between_rows), "{between_rows}");
    let at = lonlat_deg(
        &grid,
        (grid.rows - 1) as f64 / 2.0,
        (grid.cols - 1) as f64 / 2.0,
    );
    assert_lonlat(at, 9.04, 45.97, 1e-3);
}

#[test]
fn resampling_that_cannot_be() {
    let dir = folder();
    let path = UTM.geotiff(&dir.path().join("a.tif"), vec![1_f32; 35], |_| {});
    let with = |resample| ReadOptions {
        resample: Some(resample),
        ..ReadOptions::default()
    };
    let backward = Resample {
        spacing: Some(-3.0),
        ..Resample::default()
    };
    let (_, text, hint) = refused(&path, &with(backward));
    assert_eq!(
        text,
        "reading DEM a.tif: it cannot be resampled: a spacing of -3 makes no grid"
    );
    assert_eq!(
        hint,
        "warp the DEM to a CRS in metres with GDAL's own tools, and give the result"
    );
    let nowhere = Resample {
        crs: Some("EPSG:999999".to_owned()),
        ..Resample::default()
    };
    let (fault, ..) = refused(&path, &with(nowhere));
    assert!(matches!(fault, Fault::NotResampled { .. }));
}
