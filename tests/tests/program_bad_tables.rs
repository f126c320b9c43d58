//! Station tables that cannot be used: one clear message each, nothing written.

use hillpull_tests::program::{Folder, HILL_RUN, refused, without_foreign_words};
use insta::assert_snapshot;

/// The message for a station table with this text.
fn message(table: &str) -> String {
    let folder = Folder::with_survey();
    folder.write("stations.csv", table);
    refused(&folder, HILL_RUN)
}

#[test]
fn missing_table() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("stations.csv", "nowhere.csv");
    assert_snapshot!(refused(&folder, &words), @"
    error: cannot read the station table nowhere.csv: No such file or directory (os error 2)

    hint: check the spelling of the path; relative paths start at the current folder
    ");
}

#[cfg(unix)]
#[test]
fn files_that_may_not_be_read() {
    let folder = Folder::with_survey();
    if !folder.forbid("stations.csv") {
        eprintln!("SKIPPED files_that_may_not_be_read: this user may read everything");
        return;
    }
    assert_snapshot!(refused(&folder, HILL_RUN), @r"
    error: cannot read the station table stations.csv: Permission denied (os error 13)

    hint: check the permissions of the file and of its folder
    ");
    let folder = Folder::with_survey();
    assert!(folder.forbid("dem.tif"));
    assert!(
        refused(&folder, HILL_RUN).starts_with("error: reading DEM dem.tif: it cannot be read: ")
    );
}

#[test]
fn a_folder_is_no_table() {
    let folder = Folder::with_survey();
    std::fs::create_dir(folder.path("stations")).unwrap();
    let words = HILL_RUN.replace("stations.csv", "stations");
    let text = without_foreign_words(&refused(&folder, &words), "nor a vector layer: ");
    assert_snapshot!(text, @"
    error: station table stations: it is neither a text table nor a vector layer: [...]

    hint: give a CSV file (comma, semicolon or tab, UTF-8) or a point layer that GDAL reads
    ");
}

#[test]
fn x_and_y_without_crs() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @r#"
    error: station table stations.csv: columns "easting" and "northing" hold coordinates without a coordinate reference system

    hint: say which system with --crs, such as --crs EPSG:32632; for degrees on WGS 84 --crs EPSG:4326
    "#);
}

#[test]
fn unknown_crs() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("EPSG:32632", "EPSG:999999");
    let text = without_foreign_words(&refused(&folder, &words), "cannot be used: ");
    assert_snapshot!(text, @r#"
    error: station table stations.csv: coordinate reference system "EPSG:999999" cannot be used: [...]

    hint: give an EPSG code (EPSG:32632), a PROJ string or WKT with --crs
    "#);
}

#[test]
fn heights_missing_or_absurd_leave_the_others_their_results() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025,\nC,600325,5200025,NaN\nD,600325,5200025,high\n\
         E,600325,5200025,123456\nF,600325,5200025,1230\n",
    );
    let ran = folder.run(HILL_RUN);
    assert_eq!(ran.code, Some(1), "{}", ran.stderr);
    assert_snapshot!(folder.notes("out.csv"), @"
    A | result | covered 1.0000 | 
    B | no result | covered  | height missing
    C | no result | covered  | height missing
    D | no result | covered  | height is not a number
    E | no result | covered  | height 123456 m is absurd
    F | result | covered 1.0000 |
    ");
}

#[test]
fn no_height_at_all() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,NaN\nB,600325,5200025,\n"), @"
    error: station table stations.csv: none of the 2 stations can be used; row 2, station A: height missing

    hint: check the columns; --x, --y and --height name others
    ");
}

#[test]
fn duplicate_names() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025,1230\nA,600025,5199225,1075\n"), @"
    error: station table stations.csv: station A stands in 2 rows: 2, 4

    hint: give every station its own name, or name another column with --id
    ");
}

#[test]
fn longitude_and_latitude_swapped() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,lon,lat,height\nA,46.95,10.31,1300\nB,46.94,10.32,1230\n",
    );
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"
    error: no DEM lies within reach of the stations: reading DEM dem.tif: it ends 5167.6 km short of the reach of the stations; it covers longitude 10.2877 to 10.3411, latitude 46.9279 to 46.9645 degrees

    hint: the stations fit with longitude and latitude swapped: check the two columns, or name them with --x and --y
    ");
}

#[test]
fn longitude_and_latitude_swapped_and_out_of_range() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,lon,lat,height\nA,-33.91,151.21,1300\nB,-33.92,151.22,1230\n",
    );
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"
    error: station table stations.csv: longitude and latitude look swapped: row 2, station A has latitude 151.21, and every station fits the other way round

    hint: swap the names of the two columns, or name them with --x and --y
    ");
}

#[test]
fn latitude_out_of_range() {
    let folder = Folder::with_survey();
    folder.write(
        "stations.csv",
        "station,lon,lat,height\nA,10.31,46.95,1300\nB,110.31,146.95,1230\n",
    );
    let words = HILL_RUN.replace("--crs EPSG:32632", "");
    assert_snapshot!(refused(&folder, &words), @"
    error: station table stations.csv: row 3, station B: latitude 146.95 is out of range (-90 to 90 degrees)

    hint: longitudes and latitudes are degrees; for coordinates in metres give --crs and name the columns with --x and --y
    ");
}

#[test]
fn metres_taken_for_degrees() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &HILL_RUN.replace("EPSG:32632", "EPSG:4326")), @"
    error: station table stations.csv: row 2, station top: latitude 5200025 is out of range (-90 to 90 degrees)

    hint: longitudes and latitudes are degrees; for coordinates in metres give --crs and name the columns with --x and --y
    ");
}

#[test]
fn empty_table() {
    assert_snapshot!(message(""), @"
    error: station table stations.csv: the file is empty

    hint: a station table has a header row and one row per station: station, lon, lat, height
    ");
}

#[test]
fn header_only() {
    assert_snapshot!(message("station,easting,northing,height\n"), @"
    error: station table stations.csv: there are no stations in it, only column names

    hint: a station table has a header row and one row per station: station, lon, lat, height
    ");
}

#[test]
fn ragged_row() {
    assert_snapshot!(message("station,easting,northing,height\nA,600025,5200025,1300\nB,600325,5200025\n"), @"
    error: station table stations.csv: row 3 has 3 fields, the header has 4

    hint: give every row as many separators as the header; put fields that hold a separator in quotes
    ");
}

#[test]
fn no_height_column() {
    assert_snapshot!(message("station,easting,northing,remark\nA,600025,5200025,summit\n"), @"
    error: station table stations.csv: no column for the height; columns present: station, easting, northing, remark

    hint: name the column with --height
    ");
}

#[test]
fn named_column_missing() {
    let folder = Folder::with_survey();
    assert_snapshot!(refused(&folder, &format!("{HILL_RUN} --height heigth")), @r#"
    error: station table stations.csv: no column is called "heigth" (given by --height); columns present: station, easting, northing, height, remark

    hint: give --height one of the columns present
    "#);
}

#[test]
fn not_text() {
    let folder = Folder::with_survey();
    std::fs::write(
        folder.path("stations.csv"),
        [0_u8, 159, 146, 150, 0, 10, 255, 254],
    )
    .unwrap();
    assert_snapshot!(refused(&folder, HILL_RUN), @"
    error: station table stations.csv: it is neither a text table nor a vector layer: it holds zero bytes (binary, or text in UTF-16)

    hint: give a CSV file (comma, semicolon or tab, UTF-8) or a point layer that GDAL reads
    ");
}
