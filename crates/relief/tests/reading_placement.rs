//! Where the posts of a DEM come to lie.
#![allow(clippy::unwrap_used, reason = "a test may end here")]

mod reading_support;

use hillpull_physics::ellipsoid::{Ellipsoid, add, norm, sub};
use hillpull_relief::{Fault, Placement};
use reading_support::{Shape, UTM, assert_lonlat, folder, lonlat_deg, read};

/// Length of the meridian from the equator to 45 degrees on WGS 84 and GRS 80, metres (recalled from memory).
const MERIDIAN_45_M: f64 = 4_984_944.378;

fn placement(affine: [f64; 6], crs: &str) -> Placement {
    Placement {
        affine,
        crs: Some(crs.to_owned()),
    }
}

fn place_deg(crs: &str, x: f64, y: f64) -> [f64; 2] {
    placement([x, 1.0, 0.0, y, 0.0, -1.0], crs)
        .lonlat_rad(&[[0.0, 0.0]])
        .unwrap()[0]
        .map(f64::to_degrees)
}

#[test]
fn transverse_mercator_of_the_guidance_note() {
    // IOGP guidance note 7-2, transverse Mercator, worked example on Airy 1830 (recalled from memory):
    // 50 30 00 N, 0 30 00 E is E 577 274.99 m, N 69 740.50 m. No datum is named, so that none is changed.
    let crs = "+proj=tmerc +lat_0=49 +lon_0=-2 +k=0.9996012717 +x_0=400000 +y_0=-100000 +ellps=airy +type=crs";
    // the example is printed to 1 cm, 1.4e-7 degrees of longitude there
    assert_lonlat(place_deg(crs, 577_274.99, 69_740.50), 0.5, 50.5, 1e-7);
}

#[test]
fn utm_on_its_central_meridian() {
    let northing = 0.9996 * MERIDIAN_45_M;
    let at = place_deg("EPSG:32632", 500_000.0, northing);
    assert_lonlat(at, 9.0, 45.0, 1e-8);
}

#[test]
fn axes_are_easting_and_northing_whatever_the_crs_says() {
    // EPSG:2193 states northing first; its false origin is 173 E on the equator at E 1 600 000, N 10 000 000
    let northing = 10_000_000.0 - 0.9996 * MERIDIAN_45_M;
    let at = place_deg("EPSG:2193", 1_600_000.0, northing);
    assert_lonlat(at, 173.0, -45.0, 1e-8);
    // EPSG:3031, Antarctic polar stereographic: 0 E goes up, 90 E goes right
    assert_lonlat(place_deg("EPSG:3031", 0.0, 0.0), 0.0, -90.0, 1e-8);
    assert!((place_deg("EPSG:3031", 0.0, 1e6)[0] - 0.0).abs() < 1e-9);
    assert!((place_deg("EPSG:3031", 1e6, 0.0)[0] - 90.0).abs() < 1e-9);
    // EPSG:32661, UPS north, states northing first: 90 E goes right of the false origin (2e6, 2e6)
    assert!((place_deg("EPSG:32661", 3e6, 2e6)[0] - 90.0).abs() < 1e-9);
    // geographic CRSs state latitude first; ETRS89 is taken for WGS 84
    assert_lonlat(place_deg("EPSG:4258", 7.0, 50.0), 7.0, 50.0, 1e-12);
    assert_lonlat(place_deg("EPSG:4326", 7.0, 50.0), 7.0, 50.0, 1e-12);
}

#[test]
fn grads_from_paris_on_another_datum() {
    // EPSG:4807: Clarke 1880 (IGN), a 6 378 249.2 m, b 6 356 515 m; Paris lies 2.5969213 grads east of Greenwich;
    // to WGS 84 by (-168, -60, 320) m (EPSG:1193)
    let (a_m, b_m) = (6_378_249.2, 6_356_515.0);
    let clarke = Ellipsoid::from_inverse_flattening(a_m, a_m / (a_m - b_m));
    let grad = std::f64::consts::PI / 200.0;
    let (lon, lat) = (4.0, 50.0);
    let foot = clarke.foot_ecef_m((lon + 2.596_921_3) * grad, lat * grad);
    let (lon_rad, lat_rad) = Ellipsoid::WGS84.lonlat_rad(add(foot, [-168.0, -60.0, 320.0]));
    let found = place_deg("EPSG:4807", lon, lat);
    // 1e-7 degrees is 1 cm
    assert_lonlat(found, lon_rad.to_degrees(), lat_rad.to_degrees(), 1e-7);
}

#[test]
fn another_datum_from_a_file_and_a_datum_nobody_knows() {
    let dir = folder();
    let read_in = |name: &str, crs| {
        let shape = Shape {
            rows: 3,
            cols: 3,
            edges: [6.5, 1.0, 0.0, 51.5, 0.0, -1.0],
            crs: Some(crs),
        };
        read(&shape.geotiff(&dir.path().join(name), vec![1_f32; 9], |_| {}))
    };
    // Bessel 1841 with a shift of three made-up parameters that the file carries itself
    let grid = read_in(
        "a.tif",
        "+proj=longlat +ellps=bessel +towgs84=582,105,414,0,0,0,0 +type=crs",
    );
    let bessel = Ellipsoid::from_inverse_flattening(6_377_397.155, 299.152_812_8);
    let foot = bessel.foot_ecef_m(8_f64.to_radians(), 50_f64.to_radians());
    let (lon, lat) = Ellipsoid::WGS84.lonlat_rad(add(foot, [582.0, 105.0, 414.0]));
    let found = lonlat_deg(&grid, 1.0, 1.0);
    assert_lonlat(found, lon.to_degrees(), lat.to_degrees(), 1e-7);
    assert_eq!(grid.origin.warnings, [""; 0]);

    // no shift given: the numbers pass through, with a word about it
    let grid = read_in("b.tif", "+proj=longlat +ellps=bessel +type=crs");
    assert_lonlat(lonlat_deg(&grid, 1.0, 1.0), 8.0, 50.0, 1e-9);
    let name = &grid.origin.crs_name;
    assert_eq!(
        grid.origin.warnings,
        [format!(
            "no transformation from the datum of '{name}' to WGS 84 is known here; it is taken for WGS 84, and posts \
             may lie off by up to some hundred metres"
        )]
    );
}

#[test]
fn posts_are_pixel_centres() {
    let dir = folder();
    let degrees = Shape {
        rows: 4,
        cols: 6,
        edges: [7.0, 0.25, 0.0, 47.0, 0.0, -0.5],
        crs: Some("EPSG:4326"),
    };
    let path = degrees.geotiff(&dir.path().join("area.tif"), vec![1_i16; 24], |_| {});
    let grid = read(&path);
    assert_eq!(grid.placement.crs, None);
    assert_lonlat(lonlat_deg(&grid, 0.0, 0.0), 7.125, 46.75, 1e-13);
    assert_lonlat(lonlat_deg(&grid, 3.0, 5.0), 8.375, 45.25, 1e-13);
    // degrees pass through: fractional posts are as good as whole ones
    assert_lonlat(lonlat_deg(&grid, -0.5, -0.5), 7.0, 47.0, 1e-13);
}

/// A TIFF of 3 x 2 f32 in EPSG:4326 by the tags of the GeoTIFF standard (OGC 19-008r4), without GDAL's help.
fn tiff_with_raster_type(raster_type: u16) -> Vec<u8> {
    let (cols, rows) = (3_u32, 2_u32);
    let heights: Vec<f32> = (0..cols * rows).map(|k| k as f32).collect();
    let scale = [0.5_f64, 0.25, 0.0];
    // raster (0, 0, 0) is at 10 E, 40 N
    let tie = [0.0_f64, 0.0, 0.0, 10.0, 40.0, 0.0];
    let keys: [u16; 16] = [
        1,
        1,
        0,
        3, // version 1.1.0, three keys
        1024,
        0,
        1,
        2, // GTModelTypeGeoKey: geographic 2D
        1025,
        0,
        1,
        raster_type, // GTRasterTypeGeoKey
        2048,
        0,
        1,
        4326, // GeodeticCRSGeoKey
    ];
    let mut body = Vec::new();
    let mut put = |bytes: Vec<u8>| {
        let at = 8 + body.len() as u32;
        body.extend(bytes);
        at
    };
    let data_at = put(heights.iter().flat_map(|v| v.to_le_bytes()).collect());
    let scale_at = put(scale.iter().flat_map(|v| v.to_le_bytes()).collect());
    let tie_at = put(tie.iter().flat_map(|v| v.to_le_bytes()).collect());
    let keys_at = put(keys.iter().flat_map(|v| v.to_le_bytes()).collect());
    let (short, long, double) = (3_u16, 4_u16, 12_u16);
    let entries: [(u16, u16, u32, u32); 12] = [
        (256, long, 1, cols),
        (257, long, 1, rows),
        (258, short, 1, 32),
        (259, short, 1, 1),
        (262, short, 1, 1),
        (273, long, 1, data_at),
        (277, short, 1, 1),
        (278, long, 1, rows),
        (279, long, 1, 4 * cols * rows),
        (339, short, 1, 3),
        (33_550, double, 3, scale_at),
        (33_922, double, 6, tie_at),
    ];
    let mut out = b"II*\0".to_vec();
    out.extend((8 + body.len() as u32).to_le_bytes());
    out.extend(body);
    out.extend((entries.len() as u16 + 1).to_le_bytes());
    for (tag, kind, count, value) in entries.into_iter().chain([(34_735, short, 16, keys_at)]) {
        out.extend(tag.to_le_bytes());
        out.extend(kind.to_le_bytes());
        out.extend(count.to_le_bytes());
        out.extend(value.to_le_bytes());
    }
    out.extend(0_u32.to_le_bytes());
    out
}

#[test]
fn pixel_is_point_and_pixel_is_area() {
    let dir = folder();
    // OGC 19-008r4, 7.1.1.4: the tie point is the post itself for PixelIsPoint (2), the pixel's corner for
    // PixelIsArea (1)
    for (raster_type, lon_deg, lat_deg) in [(2, 10.0, 40.0), (1, 10.25, 39.875)] {
        let path = dir.path().join(format!("type{raster_type}.tif"));
        std::fs::write(&path, tiff_with_raster_type(raster_type)).unwrap();
        let grid = read(&path);
        assert_eq!(grid.heights_m, [0.0, 1.0, 2.0, 3.0, 4.0, 5.0]);
        assert_lonlat(lonlat_deg(&grid, 0.0, 0.0), lon_deg, lat_deg, 1e-12);
        assert_lonlat(
            lonlat_deg(&grid, 1.0, 2.0),
            lon_deg + 1.0,
            lat_deg - 0.25,
            1e-12,
        );
    }
}

#[test]
fn ascii_grid_by_corner_and_by_centre() {
    let dir = folder();
    for (word, x_deg, y_deg) in [("corner", 10.05, 40.05), ("center", 10.0, 40.0)] {
        let path = dir.path().join(format!("{word}.asc"));
        let text = format!(
            "ncols 3\nnrows 2\nxll{word} 10\nyll{word} 40\ncellsize 0.1\nNODATA_value -9999\n\
             5.5 6.5 7.5\n-9999 2.5 3.5\n"
        );
        std::fs::write(&path, text).unwrap();
        std::fs::write(path.with_extension("prj"), WGS84_PRJ).unwrap();
        let grid = read(&path);
        // rows run from north: the last one holds the lower left corner
        assert_lonlat(lonlat_deg(&grid, 1.0, 0.0), x_deg, y_deg, 1e-12);
        assert_lonlat(lonlat_deg(&grid, 0.0, 2.0), x_deg + 0.2, y_deg + 0.1, 1e-12);
        let expected = [5.5, 6.5, 7.5, f32::NAN, 2.5, 3.5];
        reading_support::assert_heights(&grid.heights_m, &expected);
        assert_eq!(grid.origin.driver, "AAIGrid");
        let prj = path.with_extension("prj");
        assert_eq!(grid.source_files(), [path, prj]);
    }
}

const WGS84_PRJ: &str = r#"GEOGCS["GCS_WGS_1984",DATUM["D_WGS_1984",SPHEROID["WGS_1984",6378137.0,298.257223563]],PRIMEM["Greenwich",0.0],UNIT["Degree",0.0174532925199433]]"#;

#[test]
fn south_up_rotated_and_east_of_180() {
    let dir = folder();
    let in_degrees = |edges| Shape {
        rows: 3,
        cols: 4,
        edges,
        crs: Some("EPSG:4326"),
    };
    let south_up = in_degrees([7.0, 0.1, 0.0, 46.0, 0.0, 0.1]);
    let values: Vec<f32> = (0..12).map(|k| k as f32).collect();
    let path = south_up.geotiff(&dir.path().join("south.tif"), values.clone(), |_| {});
    let grid = read(&path);
    assert_lonlat(lonlat_deg(&grid, 0.0, 0.0), 7.05, 46.05, 1e-12);
    assert_lonlat(lonlat_deg(&grid, 2.0, 0.0), 7.05, 46.25, 1e-12);
    assert_eq!(grid.heights_m, values);

    // turned by 30 degrees: 100 m along the row, 50 m along the column
    let (sin, cos) = 30_f64.to_radians().sin_cos();
    let turned = Shape {
        edges: [5e5, 100.0 * cos, 50.0 * sin, 5e6, 100.0 * sin, -50.0 * cos],
        ..UTM
    };
    let path = turned.geotiff(&dir.path().join("turned.tif"), vec![1_f32; 35], |_| {});
    let grid = read(&path);
    let [x, y] = [
        5e5 + 100.0 * cos * 4.5 + 50.0 * sin * 2.5,
        5e6 + 100.0 * sin * 4.5 - 50.0 * cos * 2.5,
    ];
    assert_eq!(grid.placement.xy(2.0, 4.0), [x, y]);
    let expected = place_deg("EPSG:32632", x, y);
    assert_lonlat(lonlat_deg(&grid, 2.0, 4.0), expected[0], expected[1], 1e-13);
    let [between_rows, between_cols] = grid.post_spacing_m().unwrap();
    // the scale of UTM is 0.9996 on its central meridian
    assert!(
        (between_rows * 0.9996 - 50.0).abs() < 1e-3,
        "{between_rows}"
    );
    assert!(
        (between_cols * 0.9996 - 100.0).abs() < 1e-3,
        "{between_cols}"
    );

    let eastern = in_degrees([190.0, 0.1, 0.0, 46.0, 0.0, -0.1]);
    let path = eastern.geotiff(&dir.path().join("east.tif"), values, |_| {});
    let grid = read(&path);
    let at = grid.lonlat_rad(&[[0.0, 0.0]]).unwrap()[0];
    let western = Ellipsoid::WGS84.foot_ecef_m((-169.95_f64).to_radians(), 45.95_f64.to_radians());
    let foot = Ellipsoid::WGS84.foot_ecef_m(at[0], at[1]);
    assert!(norm(sub(foot, western)) < 1e-6);
    let bounds = grid.lonlat_box().unwrap();
    assert!((bounds.west_deg + 169.95).abs() < 1e-9, "{bounds:?}");
}

#[test]
fn boxes_for_messages() {
    let across = Placement {
        affine: [179.0, 0.5, 0.0, 10.0, 0.0, -0.5],
        crs: None,
    };
    let grid = |placement, rows, cols| {
        hillpull_relief::Grid::new("a", rows, cols, vec![0.0; rows * cols], placement)
    };
    let text = grid(across, 3, 5).lonlat_box().unwrap().to_string();
    assert_eq!(
        text,
        "longitude 179.0000 to 181.0000, latitude 9.0000 to 10.0000 degrees"
    );
    // UTM zone 1 begins at 180: its western edge reaches over the antimeridian
    let zone_1 = placement([166_000.0, 1000.0, 0.0, 1000.0, 0.0, -1000.0], "EPSG:32601");
    let bounds = grid(zone_1, 2, 11).lonlat_box().unwrap();
    assert!(
        bounds.west_deg > 179.9 && bounds.east_deg < 180.2,
        "{bounds}"
    );
    // a grid over the pole holds every longitude
    let polar = placement([-5e5, 1e4, 0.0, 5e5, 0.0, -1e4], "EPSG:3031");
    let bounds = grid(polar, 101, 101).lonlat_box().unwrap();
    assert_eq!((bounds.west_deg, bounds.east_deg), (-180.0, 180.0));
    assert_eq!(bounds.south_deg, -90.0);
    assert!(
        bounds.north_deg > -84.0 && bounds.north_deg < -83.0,
        "{bounds}"
    );
}

#[test]
fn spacing_on_the_ellipsoid() {
    // at the equator a degree of longitude is a pi / 180, one of latitude a (1 - e2) pi / 180
    let degrees = Placement {
        affine: [0.0, 0.01, 0.0, 0.05, 0.0, -0.01],
        crs: None,
    };
    let grid = hillpull_relief::Grid::new("a", 11, 11, vec![0.0; 121], degrees);
    let [between_rows, between_cols] = grid.post_spacing_m().unwrap();
    assert!((between_cols - 1113.194908).abs() < 1e-3, "{between_cols}");
    assert!((between_rows - 1105.742758).abs() < 1e-3, "{between_rows}");
}

#[test]
fn from_many_threads_the_same() {
    let utm = placement([3e5, 90.0, 0.0, 5.2e6, 0.0, -90.0], "EPSG:32632");
    let posts: Vec<[f64; 2]> = (0..5000)
        .map(|k| [f64::from(k), f64::from(k % 7)])
        .collect();
    let one = utm.lonlat_rad(&posts).unwrap();
    std::thread::scope(|scope| {
        for _ in 0..8 {
            scope.spawn(|| assert_eq!(utm.lonlat_rad(&posts).unwrap(), one));
        }
    });
}

#[test]
fn posts_without_a_place_are_an_error() {
    let globe = placement(
        [0.0, 1e6, 0.0, 0.0, 0.0, -1e6],
        "+proj=ortho +lat_0=40 +lon_0=10 +datum=WGS84 +type=crs",
    );
    let error = globe.lonlat_rad(&[[0.0, 0.0], [0.0, 7.0]]).unwrap_err();
    assert!(matches!(
        error.fault,
        Fault::Unplaceable {
            row: 0.0,
            col: 7.0,
            x: 7e6,
            y: 0.0,
            ..
        }
    ));
    let text = error.named("globe.tif").to_string();
    let start = "placing posts of globe.tif: the post at row 0, column 7 (x 7000000, y 0) has no place on the ellipsoid: ";
    assert!(text.starts_with(start), "{text}");
    // metres taken for degrees
    let metres = Placement {
        affine: [5e5, 30.0, 0.0, 5e6, 0.0, -30.0],
        crs: None,
    };
    let error = metres.lonlat_rad(&[[0.0, 0.0]]).unwrap_err();
    assert!(error.to_string().ends_with("not a longitude and latitude"));
    // words that are no CRS
    let error = placement([0.0; 6], "EPSG:999999").lonlat_rad(&[[0.0, 0.0]]);
    assert!(matches!(
        error.unwrap_err().fault,
        Fault::UnusableCrs { .. }
    ));
}
