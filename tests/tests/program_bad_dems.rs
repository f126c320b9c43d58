//! DEMs that cannot be used, or not everywhere.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use hillpull_tests::program::{Dem, Folder, HILL_RUN, refused};
use insta::assert_snapshot;

#[test]
fn missing_dem() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("dem.tif", "nowhere.tif")), @"");
}

#[test]
fn not_a_raster() {
    let folder = Folder::with_survey();
    folder.write("dem.tif", "this is not a raster\n");
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
}

#[test]
fn cut_off_file() {
    let folder = Folder::with_survey();
    let whole = std::fs::read(folder.path("dem.tif")).unwrap();
    std::fs::write(folder.path("dem.tif"), &whole[..whole.len() / 2]).unwrap();
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
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
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
}

#[test]
fn dem_all_voids() {
    let folder = Folder::with_survey();
    folder.dem("dem.tif", &Dem::hill().change(|_, _, _| f32::NAN));
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
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
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
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
    assert_snapshot!(ran.stderr.lines().next().unwrap(), @"");
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
    assert_snapshot!(notes(&folder), @"");
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
    assert_snapshot!(notes(&folder), @"");
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
    assert_snapshot!(notes(&folder), @"");
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
    assert_snapshot!(notes(&folder), @"");
}

#[test]
fn ground_below_zero_needs_a_statement() {
    let folder = Folder::with_survey();
    folder.dem(
        "dem.tif",
        &Dem::hill().change(|col, _, h| if col == 50 { h - 1400.0 } else { h }),
    );
    assert_snapshot!(refused(&folder, HILL_RUN), @"");
    assert_snapshot!(refused(&folder, &format!("{HILL_RUN} --below-zero sea")), @"");
    let ran = folder.run(&format!("{HILL_RUN} --below-zero land"));
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
}

/// Station, effect present or not, covered and notes of `out.csv`.
fn notes(folder: &Folder) -> String {
    let text = folder.read("out.csv");
    let mut table = csv::Reader::from_reader(text.as_bytes());
    let header = table.headers().unwrap().clone();
    let column = |name: &str| {
        header
            .iter()
            .position(|h| h == name)
            .unwrap_or_else(|| panic!("no column {name}"))
    };
    let (effect, covered, notes) = (
        column("terrain_effect_mgal"),
        column("covered"),
        column("notes"),
    );
    let mut lines = Vec::new();
    for row in table.records() {
        let row = row.unwrap();
        let has = if row[effect].is_empty() {
            "no result"
        } else {
            "result"
        };
        lines.push(format!(
            "{} | {has} | covered {} | {}",
            &row[0], &row[covered], &row[notes]
        ));
    }
    lines.join("\n")
}
