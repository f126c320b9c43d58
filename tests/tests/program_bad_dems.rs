//! DEMs that cannot be used, or not everywhere.

use hillpull_tests::program::{Dem, Folder, HILL_RUN, refused, without_foreign_words};
use insta::assert_snapshot;

#[test]
fn missing_dem() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("dem.tif", "nowhere.tif")), @"
    error: reading DEM nowhere.tif: no such file

    hint: check the path and the working directory
    ");
}

#[test]
fn not_a_raster() {
    let folder = Folder::with_survey();
    folder.write("dem.tif", "this is not a raster\n");
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: reading DEM dem.tif: it is not a raster: no format that GDAL knows

    hint: `gdalinfo dem.tif` tells what GDAL makes of it; give a grid of heights
    ");
}

#[test]
fn cut_off_file() {
    let folder = Folder::with_survey();
    let whole = std::fs::read(folder.path("dem.tif")).unwrap();
    std::fs::write(folder.path("dem.tif"), &whole[..whole.len() / 2]).unwrap();
    let text = without_foreign_words(&refused(&folder, HILL_RUN), "it cannot be read: ");
    assert_snapshot!(text, @"
    error: reading DEM dem.tif: it cannot be read: [...]

    hint: `gdalinfo -checksum dem.tif` shows whether the file is whole; fetch or copy it again if it is not
    ");
}

#[test]
fn raster_without_crs() {
    let folder = Folder::with_survey();
    folder.dem(
        "dem.tif",
        &Dem {
            epsg: None,
            ..Dem::hill()
        },
    );
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: reading DEM dem.tif: it states no coordinate reference system

    hint: if you know its CRS, assign it: gdal_edit.py -a_srs EPSG:<code> dem.tif
    ");
}

#[test]
fn dem_all_voids() {
    let folder = Folder::with_survey();
    folder.dem("dem.tif", &Dem::hill().change(|_, _, _| f32::NAN));
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: reading DEM dem.tif: all 3422 posts within reach of the stations are voids

    hint: leave this DEM out, or check its nodata value and mask
    ");
}

#[test]
fn every_dem_out_of_reach() {
    let folder = Folder::with_survey();
    folder.dem(
        "dem.tif",
        &Dem {
            corner: (300_000.0, 5_202_050.0),
            ..Dem::hill()
        },
    );
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: no DEM lies within reach of the stations: reading DEM dem.tif: it ends 295.0 km short of the reach of the stations; it covers longitude 6.3724 to 6.4267, latitude 46.9056 to 46.9428 degrees

    hint: check the CRS of the DEM, and --crs, --x and --y of the stations
    ");
}

#[test]
fn one_dem_out_of_reach_is_left_out_with_a_warning() {
    let folder = Folder::with_survey();
    folder.dem(
        "away.tif",
        &Dem {
            corner: (300_000.0, 5_202_050.0),
            ..Dem::hill()
        },
    );
    let alone = folder.run(HILL_RUN);
    let result = folder.read("out.csv");
    let ran = folder.run(&format!("{HILL_RUN} --dem away.tif"));
    assert_eq!((alone.code, ran.code), (Some(0), Some(0)), "{}", ran.stderr);
    assert_snapshot!(ran.stderr.lines().next().unwrap(), @"warning: reading DEM away.tif: it ends 295.0 km short of the reach of the stations; it covers longitude 6.3724 to 6.4267, latitude 46.9056 to 46.9428 degrees; it is left out");
    assert_eq!(folder.read("out.csv"), result);
}

#[test]
fn station_outside_every_dem_has_a_note_and_the_run_goes_on() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,easting,northing,height\nA,600025,5200025,1300\nB,606025,5200025,1000\n",
    );
    let ran = folder.run(HILL_RUN);
    assert_eq!(ran.code, Some(1), "{}", ran.stderr);
    assert_snapshot!(folder.notes("out.csv"), @"
    A | result | covered 1.0000 | 
    B | no result | covered  | no DEM covers the station
    ");
}

#[test]
fn no_station_on_any_dem() {
    let folder = Folder::with_survey();
    // Within reach of the grid, but not on it.
    folder.write(
        "stations.csv",
        "station,easting,northing,height\nA,602425,5200025,1000\nB,602525,5200025,1000\n",
    );
    let ran = folder.run(HILL_RUN);
    assert_eq!(ran.code, Some(1), "{}", ran.stderr);
    assert_snapshot!(folder.notes("out.csv"), @"
    A | no result | covered  | no DEM covers the station
    B | no result | covered  | no DEM covers the station
    ");
}

#[test]
fn void_near_a_station_has_a_note() {
    let folder = Folder::with_survey();
    folder.dem(
        "dem.tif",
        &Dem::hill().change(|col, row, h| {
            if (44..48).contains(&col) && (38..42).contains(&row) {
                f32::NAN
            } else {
                h
            }
        }),
    );
    let ran = folder.run(HILL_RUN);
    assert_eq!(ran.code, Some(1), "{}", ran.stderr);
    assert_snapshot!(folder.notes("out.csv"), @"
    top | result | covered 0.9688 | no DEM for 10.0 % of zone 0 to 230 m, 2.5 % of zone 230 to 800 m
    flank | no result | covered  | no DEM covers the station
    foot | result | covered 0.9940 | no DEM for 0.7 % of zone 230 to 800 m
    ");
}

#[test]
fn a_wrong_datum_is_suspected_where_heights_misfit() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,easting,northing,height\nA,600025,5200025,1352\nB,600025,5199225,1140\n",
    );
    let ran = folder.run(HILL_RUN);
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    assert_snapshot!(ran.stderr.lines().next().unwrap(), @"warning: half of the stations lie 57 m or more above the DEM: check vertical datum and unit of both, and the position of the stations");
    assert_snapshot!(folder.notes("out.csv"), @"
    A | result | covered 1.0000 | station height is 52.0 m above the DEM
    B | result | covered 1.0000 | station height is 56.6 m above the DEM
    ");
}

#[test]
fn ground_below_zero_needs_a_statement() {
    let folder = Folder::with_survey();
    folder.dem(
        "dem.tif",
        &Dem::hill().change(|col, _, h| if col == 50 { h - 1400.0 } else { h }),
    );
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: DEM dem.tif has 58 of 3422 posts below zero, the lowest at -399.7 m, and nothing says what that ground is

    hint: if it is dry land, say --below-zero land; a sea cannot be filled in this version
    ");
    assert_snapshot!(refused(&folder, &format!("{HILL_RUN} --below-zero sea")), @"
    error: --below-zero sea: filling the sea is not available in this version

    hint: use a DEM that covers land only, or whose sea surface is given as 0 m; if all ground below the datum is dry, say --below-zero land
    ");
    let ran = folder.run(&format!("{HILL_RUN} --below-zero land"));
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
}

#[test]
fn resampling_is_done_only_where_it_is_needed() {
    let folder = Folder::with_survey();
    let plain = folder.run(&HILL_RUN.replace("out.csv", "-"));
    let ran = folder.run(&format!("{} --resample", HILL_RUN.replace("out.csv", "-")));
    assert_eq!(ran.stdout, plain.stdout);
    assert!(!ran.stderr.contains("warning"), "{}", ran.stderr);

    // The same posts, placed by ground control points at the corners alone.
    folder.dem(
        "points.tif",
        &Dem {
            control_points: true,
            ..Dem::hill()
        },
    );
    let words = HILL_RUN.replace("dem.tif", "points.tif");
    assert_snapshot!(refused(&folder, &words), @"
    error: reading DEM points.tif: it says where its posts lie only by 4 ground control points, not by a regular grid

    hint: --resample puts it onto a working grid, at the cost of some smoothing
    ");
    let ran = folder.run(&format!("{words} --resample"));
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    assert_snapshot!(ran.stderr.lines().next().unwrap(), @"warning: DEM points.tif: heights were resampled onto a working grid (bilinear, spacing 50.000000 in WGS 84 / UTM zone 32N); this smooths the ground and loses terrain effect, most near stations in steep relief");
}
