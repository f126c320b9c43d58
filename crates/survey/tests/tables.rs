//! Station tables as users write them, good and bad.
#![expect(clippy::unwrap_used, reason = "a test stops where something fails")]
mod common;

use approx::assert_abs_diff_eq;
use common::{Folder, read_csv};
use hillpull_engine::Ground;
use hillpull_survey::{StationFault, SurveyError, TableOptions, TableProblem, read_stations};

fn options(crs: &str) -> TableOptions {
    TableOptions {
        crs: Some(crs.to_owned()),
        ..Default::default()
    }
}

fn problem(text: &str, options: &TableOptions) -> (TableProblem, String, String) {
    let error = read_csv(text, options).unwrap_err();
    let (said, hint) = (error.to_string(), error.hint().unwrap());
    match error {
        SurveyError::Table { problem, .. } => (problem, said, hint),
        other => panic!("{other}"),
    }
}

#[test]
fn every_dialect_gives_the_same_stations() {
    let plain = "station,lon,lat,height_m\nA1,9.5,46.25,1200.5\nB2,-9.75,46.5,800\n";
    let texts = [
        plain.to_owned(),
        plain.replace('\n', "\r\n"),
        format!("\u{feff}{plain}"),
        plain.replace(',', "\t"),
        plain.replace(',', ";"),
        plain.replace(',', ";").replace('.', ","),
        plain.replace(',', "\t").replace('.', ","),
        plain.replace("A1", "\"A1\"").replace("9.5,", "\"9.5\","),
        plain.trim_end().to_owned(),
    ];
    for text in &texts {
        let table = read_csv(text, &TableOptions::default()).unwrap();
        assert_eq!(table.len(), 2, "{text:?}");
        assert_eq!((table.id(0).as_ref(), table.id(1).as_ref()), ("A1", "B2"));
        let s = table.stations();
        assert_eq!(
            (s[0].lon_deg, s[0].lat_deg, s[0].height_m),
            (9.5, 46.25, 1200.5),
            "{text:?}"
        );
        assert_eq!(
            (s[1].lon_deg, s[1].lat_deg, s[1].height_m),
            (-9.75, 46.5, 800.0),
            "{text:?}"
        );
        assert_eq!((s[0].row, s[1].row), (2, 3));
        assert!(table.notes().is_empty(), "{:?}", table.notes());
    }
}

#[test]
fn x_and_y_in_a_named_system() {
    // Central meridian of UTM zone 32, equator: 9 degrees east by definition of the zone.
    let table = read_csv(
        "id,easting,northing,h\na,500000,0,10\n",
        &options("EPSG:32632"),
    )
    .unwrap();
    let s = table.stations()[0];
    assert_abs_diff_eq!(s.lon_deg, 9.0, epsilon = 1e-9);
    assert_abs_diff_eq!(s.lat_deg, 0.0, epsilon = 1e-9);
    assert_eq!((s.x, s.y, table.crs()), (500_000.0, 0.0, "EPSG:32632"));
    // A geographic system other than WGS 84 goes through PROJ: on the Bessel ellipsoid of DHDN, near Potsdam, the
    // longitude differs from WGS 84's by some 100 m (4 to 6 seconds of arc is common knowledge; no source).
    let table = read_csv("id,lon,lat,h\na,13,52.4,10\n", &options("EPSG:4314")).unwrap();
    let shift_arcsec = (table.stations()[0].lon_deg - 13.0).abs() * 3600.0;
    assert!((1.0..10.0).contains(&shift_arcsec), "{shift_arcsec}");
}

#[test]
fn without_a_system_x_and_y_stop() {
    let (p, said, hint) = problem("id,x,y,h\na,500000,0,10\n", &TableOptions::default());
    assert_eq!(
        p,
        TableProblem::NoCrs {
            x: "x".into(),
            y: "y".into()
        }
    );
    assert!(
        said.contains("\"x\"") && hint.contains("--crs"),
        "{said} {hint}"
    );
    let (p, _, _) = problem("id,lon,lat,h\na,9,46,10\n", &options("EPSG:32632"));
    assert!(matches!(p, TableProblem::DegreesInProjectedCrs { .. }));
    // The user may know better: the columns named by option are taken as they are.
    let named = TableOptions {
        x: Some("lon".into()),
        y: Some("lat".into()),
        ..options("EPSG:32632")
    };
    assert!(read_csv("id,lon,lat,h\na,500000,0,10\n", &named).is_ok());
}

#[test]
fn what_stops_before_computing() {
    let plain = TableOptions::default();
    for (text, part, hint_part) in [
        ("", "the file is empty", "header row"),
        ("id,lon,lat,h\n", "no stations in it", "header row"),
        (
            "id,lon,lat,h\na,9,46\n",
            "row 2 has 3 fields, the header has 4",
            "separators",
        ),
        (
            "id,lon,lat,h\na,9,46,1\nb,9,46,1\na,9,46,1\n",
            "station a stands in 2 rows: 2, 4",
            "--id",
        ),
        (
            "id,lon,lat,h\na,9,46,1\nb,9,96,1\nc,190,80,1",
            "row 3, station b: latitude 96",
            "--crs",
        ),
        (
            "id,lon,lat,h\na,46,120,1\nb,47,121,1\n",
            "look swapped: row 2, station a has latitude 120",
            "swap",
        ),
        (
            "id,lon,lat,h\na,9 30 00,46,1\n",
            "row 2, station a: lon \"9 30 00\" is not a number",
            "decimals",
        ),
        (
            "id,lon,lat\na,9,46\n",
            "no column for the height; columns present: id, lon, lat",
            "--height",
        ),
        (
            "id,lon,lat,h,z\na,9,46,1,1\n",
            "several columns could be the height: h, z",
            "--height",
        ),
        (
            "id,lon,lat,h\na,9,46,\nb,,,1\n",
            "none of the 2 stations can be used; row 2, station a: height missing",
            "--height",
        ),
        (
            "id;lon;lat;h\na;9,5;46,5;1.200\n",
            "row 2, column h: \"1.200\" has a decimal point",
            "same decimal mark",
        ),
        (
            "id,lon,lat,h\na,9,46,\"12\n",
            "quote opened in row 2 is never closed",
            "quote",
        ),
    ] {
        let (_, said, hint) = problem(text, &plain);
        assert!(said.contains(part), "{text:?}: {said}");
        assert!(hint.contains(hint_part), "{text:?}: {hint}");
        assert!(said.contains("s.csv"), "{said}");
    }
}

#[test]
fn files_that_cannot_be_read() {
    let folder = Folder::new();
    for name in ["none.csv", "none.gpkg"] {
        let error = read_stations(&folder.path(name), &TableOptions::default()).unwrap_err();
        assert!(matches!(error, SurveyError::Io { .. }), "{error}");
        assert!(
            error.to_string().contains(name) && error.hint().is_some(),
            "{error}"
        );
    }
    std::fs::create_dir(folder.path("folder.csv")).unwrap();
    assert!(read_stations(&folder.path("folder.csv"), &TableOptions::default()).is_err());
    let noise: Vec<u8> = (0..=255).cycle().take(5000).collect();
    for name in ["noise.csv", "noise.gpkg", "noise.shp", "noise"] {
        let error =
            read_stations(&folder.write(name, &noise), &TableOptions::default()).unwrap_err();
        assert!(!error.to_string().contains("NULL"), "{error}");
        assert!(
            matches!(
                error,
                SurveyError::Table {
                    problem: TableProblem::NotATable { .. },
                    ..
                }
            ),
            "{name}: {error}"
        );
    }
}

#[test]
fn a_text_table_may_have_any_suffix() {
    let folder = Folder::new();
    for name in ["s.txt", "stations", "s.survey"] {
        let path = folder.write(name, "id,lon,lat,h\na,9,46,10\n");
        assert_eq!(
            read_stations(&path, &TableOptions::default())
                .unwrap()
                .len(),
            1,
            "{name}"
        );
    }
    let error = read_stations(&folder.write("empty", ""), &TableOptions::default()).unwrap_err();
    assert!(
        matches!(
            error,
            SurveyError::Table {
                problem: TableProblem::Empty,
                ..
            }
        ),
        "{error}"
    );
}

#[test]
fn a_station_with_a_fault_does_not_stop_the_others() {
    let text = "id,lon,lat,h\nok,9,46,10\nno height,9,46,\nnan,9,46,NaN\ntext,9,46,about 12\nhigh,9,46,88480\n\
                deep,9,46,-12001\nplane,9,46,12000\nnowhere,,46,10\n,9,46,-10900\n";
    let table = read_csv(text, &TableOptions::default()).unwrap();
    let faults: Vec<Option<StationFault>> = table.stations().iter().map(|s| s.fault).collect();
    assert_eq!(
        faults,
        [
            None,
            Some(StationFault::HeightMissing),
            Some(StationFault::HeightMissing),
            Some(StationFault::HeightNotANumber),
            Some(StationFault::HeightAbsurd { height_m: 88_480.0 }),
            Some(StationFault::HeightAbsurd {
                height_m: -12_001.0
            }),
            None,
            Some(StationFault::CoordinatesMissing),
            None,
        ]
    );
    assert_eq!(table.id(8), "row 10");
    let engine = table.engine_stations(Ground::Settle);
    assert_eq!(engine.indices, [0, 6, 8]);
    assert!(engine.stations.iter().all(|s| s.ground == Ground::Settle));
    let outcomes = common::outcomes(&table);
    assert_eq!(outcomes[4].notes, ["height 88480 m is absurd"]);
    assert!(outcomes[4].effect.is_none() && outcomes[6].effect.is_some());
}

#[test]
fn without_names_rows_are_named() {
    let table = read_csv("lon,lat,h\n9,46,10\n9,46,10\n", &TableOptions::default()).unwrap();
    assert_eq!(
        (table.id(0).as_ref(), table.id(1).as_ref()),
        ("row 2", "row 3")
    );
    assert_eq!(table.notes().len(), 1);
}
