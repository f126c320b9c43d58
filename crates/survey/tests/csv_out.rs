//! Results as CSV: the user's text unchanged, numbers without false digits.
#![expect(clippy::unwrap_used, reason = "a test stops where something fails")]
mod common;

use common::{Folder, csv_text, outcomes, provenance, read_csv, records, settings};
use hillpull_engine::Ground;
use hillpull_survey::{
    OutputProblem, OutputTarget, SurveyError, TableOptions, join, read_stations, write_effects,
    write_effects_csv,
};
use proptest::prelude::*;
use std::fs;
use std::io::{self, Write};

const PLAIN: &str = "id,lon,lat,h\na,9.50,46.250,01200\nb,9.5,46.5,\n";

fn table(text: &str) -> hillpull_survey::StationTable {
    read_csv(text, &TableOptions::default()).unwrap()
}

#[test]
fn the_whole_text() {
    assert_eq!(
        csv_text(&table(PLAIN)),
        "id,lon,lat,h,terrain_effect_mgal,terrain_correction_mgal,topography_mgal,zone_0_230_m_mgal,\
         zone_230_5240_m_mgal,zone_5240_28800_m_mgal,zone_28800_166735_m_mgal,numeric_bound_mgal,dem_height_m,\
         height_misfit_m,covered,notes\n\
         a,9.50,46.250,01200,-12.346,12.346,101.500,-1.000,-10.000,-1.346,0.000,0.0004,1203.457,-0.250,1.0000,\n\
         b,9.5,46.5,,,,,,,,,,,,,height missing\n"
    );
}

#[test]
fn a_decimal_comma_keeps_its_dialect() {
    let text = csv_text(&table("id;lon;lat;h\r\na;9,50;46,25;1200\r\n"));
    let lines: Vec<&str> = text.split("\r\n").collect();
    assert!(
        lines[0].starts_with("id;lon;lat;h;terrain_effect_mgal;"),
        "{text}"
    );
    assert!(
        lines[1].starts_with("a;9,50;46,25;1200;-12,346;12,346;101,500;"),
        "{text}"
    );
    // A decimal point becomes comma-separated, whatever the separator was.
    let text = csv_text(&table("id;lon;lat;h;x, y\na;9.50;46.25;1200;1, 2\n"));
    assert!(
        text.starts_with("id,lon,lat,h,\"x, y\",terrain_effect_mgal,"),
        "{text}"
    );
}

#[test]
fn more_digits_only_for_a_finer_tolerance() {
    let t = table(PLAIN);
    let fine = hillpull_engine::Settings {
        tolerance_mgal: 1e-5,
        ..settings()
    };
    let mut out = Vec::new();
    write_effects_csv(&mut out, &t, &outcomes(&t), &fine).unwrap();
    let rows = records(std::str::from_utf8(&out).unwrap(), b',');
    assert_eq!(rows[1][4..7], ["-12.34568", "12.34568", "101.50000"]);
    assert_eq!(rows[1][11], "0.000312");
}

#[test]
fn gaps_and_misfits_are_noted() {
    let t = table("id,lon,lat,h\na,9,46,10\nb,9,46,10\n");
    let mut gap = common::effect();
    gap.covered = 0.999_999;
    gap.zone_covered = vec![1.0, 1.0, 0.9, 0.999_999];
    let mut off = common::effect();
    off.height_misfit_m = -45.0;
    let results = vec![Ok(gap), Ok(off)];
    let bent = join(&t, results.clone(), &settings(), Ground::Bend);
    assert_eq!(
        bent[0].notes,
        ["no DEM for 10.0 % of zone 5240 to 28800 m, under 0.1 % of zone 28800 to 166735 m"]
    );
    assert_eq!(bent[1].notes, ["station height is 45.0 m below the DEM"]);
    // In the air a misfit means nothing.
    assert!(
        join(&t, results, &settings(), Ground::Given)[1]
            .notes
            .is_empty()
    );
    let mut out = Vec::new();
    write_effects_csv(&mut out, &t, &bent, &settings()).unwrap();
    assert_eq!(
        records(std::str::from_utf8(&out).unwrap(), b',')[1][14],
        "0.9999"
    );
}

#[test]
fn a_number_that_is_none_is_no_result() {
    let t = table("id,lon,lat,h\na,9,46,10\n");
    let broken = hillpull_engine::StationEffect {
        topography_mgal: f64::NAN,
        ..common::effect()
    };
    let outcome = &join(&t, vec![Ok(broken)], &settings(), Ground::Bend)[0];
    assert!(outcome.effect.is_none() && !outcome.notes.is_empty());
}

#[test]
fn files_come_with_their_provenance_and_no_litter() {
    let folder = Folder::new();
    let t = read_stations(&folder.write("s.csv", PLAIN), &TableOptions::default()).unwrap();
    let path = folder.write("out.csv", "old");
    let target = OutputTarget::from_path(&path).unwrap();
    target.check(&t, &settings(), &[]).unwrap();
    assert_eq!(fs::read_to_string(&path).unwrap(), "old");
    write_effects(
        &target,
        &mut Vec::new(),
        &t,
        &outcomes(&t),
        &settings(),
        &provenance(),
    )
    .unwrap();
    assert_eq!(fs::read_to_string(&path).unwrap(), csv_text(&t));
    assert_eq!(
        folder.names(),
        ["out.csv", "out.csv.provenance.toml", "s.csv"]
    );
    let origin: toml::Table = fs::read_to_string(folder.path("out.csv.provenance.toml"))
        .unwrap()
        .parse()
        .unwrap();
    assert_eq!(origin["program"].as_str(), Some("hillpull 0.0.0"));

    let mut out = Vec::new();
    write_effects(
        &OutputTarget::Stdout,
        &mut out,
        &t,
        &outcomes(&t),
        &settings(),
        &provenance(),
    )
    .unwrap();
    assert_eq!(out, csv_text(&t).as_bytes());
    assert_eq!(folder.names().len(), 3);
}

#[test]
fn what_is_refused_before_the_run() {
    let folder = Folder::new();
    let input = folder.write("s.csv", PLAIN);
    let dem = folder.write("dem.gpkg", "");
    let t = read_stations(&input, &TableOptions::default()).unwrap();
    let problem = |e: SurveyError| match e {
        SurveyError::Output { problem, .. } => problem,
        other => panic!("{other}"),
    };
    let check = |name: &str| {
        OutputTarget::from_path(&folder.path(name)).unwrap().check(
            &t,
            &settings(),
            std::slice::from_ref(&dem),
        )
    };
    assert_eq!(problem(check("s.csv").unwrap_err()), OutputProblem::IsInput);
    assert_eq!(
        problem(check("dem.gpkg").unwrap_err()),
        OutputProblem::IsInput
    );
    assert!(matches!(
        problem(check("no/such.csv").unwrap_err()),
        OutputProblem::NoFolder { .. }
    ));
    folder.write("open.gpkg-wal", "");
    assert!(matches!(
        problem(check("open.gpkg").unwrap_err()),
        OutputProblem::Busy { .. }
    ));
    check("new.csv").unwrap();
    check("new.gpkg").unwrap();
    for name in ["out.xlsx", "out", "out.csv.bak"] {
        assert_eq!(
            problem(OutputTarget::from_path(name.as_ref()).unwrap_err()),
            OutputProblem::UnknownSuffix
        );
    }
    assert_eq!(folder.names(), ["dem.gpkg", "open.gpkg-wal", "s.csv"]);
}

#[test]
fn names_that_are_taken() {
    let stdout = OutputTarget::Stdout;
    let again = table(&csv_text(&table(PLAIN)));
    let error = stdout.check(&again, &settings(), &[]).unwrap_err();
    assert!(
        error.to_string().contains("\"terrain_effect_mgal\""),
        "{error}"
    );
    assert!(error.hint().is_some());
    let own = table("id,lon,lat,h,zone_0_230_M_mgal\na,9,46,1,2\n");
    assert!(stdout.check(&own, &settings(), &[]).is_err());
    // Other zones, other names.
    let other = hillpull_engine::Settings {
        zone_edges_m: vec![],
        ..settings()
    };
    stdout.check(&own, &other, &[]).unwrap();
    // The user's notes stay; the program's go beside them.
    let t = table("id,lon,lat,h,Notes\na,9,46,,windy\nb,9,46,1,\n");
    stdout.check(&t, &settings(), &[]).unwrap();
    let rows = records(&csv_text(&t), b',');
    assert_eq!(
        (rows[0][4].as_str(), rows[0].last().unwrap().as_str()),
        ("Notes", "terrain_notes")
    );
    assert_eq!(
        (rows[1][4].as_str(), rows[1].last().unwrap().as_str()),
        ("windy", "height missing")
    );
}

/// A disk with no space left.
struct Full;

impl Write for Full {
    fn write(&mut self, _: &[u8]) -> io::Result<usize> {
        Err(io::ErrorKind::StorageFull.into())
    }
    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

#[test]
fn a_full_disk_is_called_so() {
    let t = table(PLAIN);
    let error = write_effects(
        &OutputTarget::Stdout,
        &mut Full,
        &t,
        &outcomes(&t),
        &settings(),
        &provenance(),
    );
    let error = error.unwrap_err();
    let SurveyError::Io { source, .. } = &error else {
        panic!("{error}")
    };
    assert_eq!(source.kind(), io::ErrorKind::StorageFull);
    assert!(error.hint().unwrap().contains("space"));
}

/// Cells that CSV writers and readers get wrong: separators, quotes, line ends, spaces, other scripts.
fn odd_cell() -> impl Strategy<Value = String> {
    prop_oneof![
        "[ -~]{0,12}",
        "[,;\t\"'\r\n =+-]{0,6}",
        "\\PC{0,8}",
        Just("007".to_owned()),
        Just("1,5".to_owned()),
        Just("=1+1".to_owned()),
        Just(" \"\" ".to_owned()),
        Just("\u{feff}".to_owned()),
    ]
}

proptest! {
    #[test]
    fn odd_text_comes_out_as_it_went_in(
        cells in prop::collection::vec((odd_cell(), odd_cell()), 1..12),
        header in ("[A-Za-z ]{1,8}q", "[äöü]{1,5}q"),
        delimiter in prop_oneof![Just(b','), Just(b';'), Just(b'\t')],
        always in any::<bool>(),
        crlf in any::<bool>(),
    ) {
        let decimal = if delimiter == b',' { '.' } else { ',' };
        let mut rows = vec![vec![header.0, "lon".into(), "lat".into(), header.1, "h".into(), "station".into()]];
        for (i, (a, b)) in cells.into_iter().enumerate() {
            rows.push(vec![a, format!("9{decimal}50"), "46".into(), b, "1200".into(), format!("S{i}")]);
        }
        let style = if always { csv::QuoteStyle::Always } else { csv::QuoteStyle::Necessary };
        let end = if crlf { csv::Terminator::CRLF } else { csv::Terminator::Any(b'\n') };
        let mut writer =
            csv::WriterBuilder::new().delimiter(delimiter).quote_style(style).terminator(end).from_writer(Vec::new());
        for row in &rows {
            writer.write_record(row).unwrap();
        }
        let text = String::from_utf8(writer.into_inner().unwrap()).unwrap();

        let out = csv_text(&table(&text));
        let back = records(&out, delimiter);
        let users: Vec<Vec<String>> = back.iter().map(|r| r[..6].to_vec()).collect();
        prop_assert_eq!(users, rows);
        let effect = format!("-12{decimal}346");
        prop_assert!(back[1..].iter().all(|r| r[6] == effect));
    }

    #[test]
    fn no_text_makes_the_reader_panic(text in "\\PC{0,200}", header in any::<bool>()) {
        let text = if header { format!("id,lon,lat,h\n{text}") } else { text };
        let _ = read_csv(&text, &TableOptions::default());
    }
}
