//! A table of a million rows: refused fast where it is wrong, carried through where it is right.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use hillpull_tests::program::{Dem, Folder, refused};
use insta::assert_snapshot;
use std::fmt::Write;

const ROWS: usize = 1_000_000;
const RUN: &str = "effect --stations stations.csv --crs EPSG:32632 --dem dem.tif --outer 90 --tolerance 1000 --ground given --out out.csv";

/// A million stations, one in a thousand on a slope of 4 x 4 posts 60 m apart and the others beside it, so that the
/// test is about the table and not about the computing.
fn million() -> (Folder, String) {
    let folder = Folder::new();
    let slope = |col, _| 900.0 + 3.0 * col as f64;
    folder.dem(
        "dem.tif",
        &Dem::new(Some(32632), (600_000.0, 5_200_240.0), 60.0, (4, 4), slope),
    );
    let mut table = String::with_capacity(40 * ROWS);
    table.push_str("station,easting,northing,height\n");
    for i in 0..ROWS {
        let aside = if i % 1000 == 0 { 0.0 } else { 500.0 };
        let (east, north) = (
            600_080.0 + 0.08 * (i / 1000) as f64,
            5_200_080.0 + aside + 0.08 * (i % 1000) as f64,
        );
        writeln!(table, "S{i},{east:.2},{north:.2},905").unwrap();
    }
    (folder, table)
}

#[test]
fn the_last_row_repeats_a_name() {
    let (folder, mut table) = million();
    table.push_str("S17,600100,5200100,905\n");
    folder.write("stations.csv", &table);
    assert_snapshot!(refused(&folder, RUN), @"
    error: station table stations.csv: station S17 stands in 2 rows: 19, 1000002

    hint: give every station its own name, or name another column with --id
    ");
}

#[test]
fn the_last_row_is_ragged() {
    let (folder, mut table) = million();
    table.push_str("S1000000,600100,5200100\n");
    folder.write("stations.csv", &table);
    assert_snapshot!(refused(&folder, RUN), @"
    error: station table stations.csv: row 1000002 has 3 fields, the header has 4

    hint: give every row as many separators as the header; put fields that hold a separator in quotes
    ");
}

#[test]
fn every_row_comes_out_again() {
    let (folder, table) = million();
    folder.write("stations.csv", &table);
    let ran = folder.run(RUN);
    assert_eq!(ran.code, Some(1), "{}", ran.stderr);
    let out = folder.read("out.csv");
    let mut with_result = 0;
    for (input, output) in table.lines().zip(out.lines()) {
        assert!(output.starts_with(input), "{output}");
        with_result += usize::from(!output.ends_with("no DEM covers the station"));
    }
    assert_eq!(out.lines().count(), ROWS + 1);
    // The header is one of the lines that do not end so.
    assert_eq!(with_result, ROWS / 1000 + 1);
}
