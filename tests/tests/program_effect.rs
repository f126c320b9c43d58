//! The main job as a user runs it.
#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use gdal::vector::LayerAccess;
use hillpull_tests::program::{Dem, Folder, HILL_RUN, Ran, STATIONS};
use insta::assert_snapshot;

/// Runs and expects a complete result.
fn done(folder: &Folder, words: &str) -> Ran {
    let ran = folder.run(words);
    assert_eq!(ran.code, Some(0), "{}", ran.stderr);
    ran
}

/// The column of a CSV text.
fn column(text: &str, name: &str) -> Vec<String> {
    let mut table = csv::Reader::from_reader(text.as_bytes());
    let at = table
        .headers()
        .unwrap()
        .iter()
        .position(|h| h == name)
        .unwrap_or_else(|| panic!("no column {name}"));
    table.records().map(|r| r.unwrap()[at].to_owned()).collect()
}

fn effects_mgal(text: &str) -> Vec<f64> {
    column(text, "terrain_effect_mgal")
        .iter()
        .map(|v| v.parse().unwrap())
        .collect()
}

#[test]
fn the_users_columns_come_first_and_unchanged() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    let out = folder.read("out.csv");
    for (input, output) in STATIONS.lines().zip(out.lines()) {
        assert!(output.starts_with(input), "{output}");
    }
    assert_eq!(out.lines().count(), STATIONS.lines().count());
    assert_snapshot!(out.lines().next().unwrap(), @"station,easting,northing,height,remark,terrain_effect_mgal,terrain_correction_mgal,topography_mgal,zone_0_230_m_mgal,zone_230_800_m_mgal,numeric_bound_mgal,dem_height_m,height_misfit_m,covered,notes");
    assert_eq!(
        folder.files(),
        [
            "dem.tif",
            "out.csv",
            "out.csv.provenance.toml",
            "stations.csv"
        ]
    );
}

#[test]
fn a_hill_lowers_gravity_on_and_beside_it() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    let out = folder.read("out.csv");
    let effects = effects_mgal(&out);
    // Less than the infinite plate of the summit's 300 m, 2 pi G rho h = 33.6 mGal (Bouguer plate), and not nothing.
    assert!(
        effects.iter().all(|e| *e < -0.01 && *e > -33.6),
        "{effects:?}"
    );
    for (zone, other) in column(&out, "zone_0_230_m_mgal")
        .iter()
        .zip(column(&out, "zone_230_800_m_mgal"))
        .enumerate()
        .map(|(i, (a, b))| {
            (
                effects[i],
                a.parse::<f64>().unwrap() + b.parse::<f64>().unwrap(),
            )
        })
    {
        assert!(
            (zone - other).abs() < 1.6e-3,
            "the zones add up to the total: {zone} {other}"
        );
    }
}

#[test]
fn the_summary() {
    let folder = Folder::with_survey();
    let ran = done(&folder, HILL_RUN);
    assert_eq!(ran.stdout, "");
    assert_snapshot!(steady(&ran.stderr), @"
    stations  3 of 3 have a result
    effect    smallest    -1.279 mGal  foot
              median      -1.659 mGal
              largest     -1.710 mGal  top
    zones     0 to 230 m          24.1 %
              230 to 800 m        75.9 %
    bound     worst [...] µGal, at flank; asked 1 µGal
    coverage  the whole disc at every station
    notes     none
    model     density 2670 kg/m3, G 6.6743e-11 m3 kg-1 s-2, outer radius 800 m, ground bend
    time      [...]
    written   out.csv, provenance in out.csv.provenance.toml
    ");
}

#[test]
fn quiet_is_silent_and_changes_no_result() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    let loud = folder.read("out.csv");
    let ran = done(&folder, &format!("{HILL_RUN} --quiet"));
    assert_eq!((ran.stdout.as_str(), ran.stderr.as_str()), ("", ""));
    assert_eq!(folder.read("out.csv"), loud);
}

#[test]
fn standard_output_is_the_table_and_nothing_else() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    let before = folder.files();
    let ran = done(&folder, &HILL_RUN.replace("out.csv", "-"));
    assert_eq!(ran.stdout, folder.read("out.csv"));
    assert_eq!(folder.files(), before);
}

#[test]
fn the_number_of_threads_changes_no_byte() {
    let folder = Folder::with_survey();
    let with = |threads: usize| {
        done(
            &folder,
            &format!("{} --threads {threads}", HILL_RUN.replace("out.csv", "-")),
        )
        .stdout
    };
    let one = with(1);
    assert_eq!(with(2), one);
    assert_eq!(with(7), one);
}

#[test]
fn the_order_of_the_stations_changes_no_result() {
    let folder = Folder::with_survey();
    let words = HILL_RUN.replace("out.csv", "-");
    let mut forward: Vec<String> = done(&folder, &words)
        .stdout
        .lines()
        .map(str::to_owned)
        .collect();
    let mut rows: Vec<&str> = STATIONS.lines().collect();
    rows[1..].reverse();
    folder.write("stations.csv", &(rows.join("\n") + "\n"));
    let backward: Vec<String> = done(&folder, &words)
        .stdout
        .lines()
        .map(str::to_owned)
        .collect();
    forward[1..].reverse();
    assert_eq!(forward, backward);
}

#[test]
fn the_survey_file_says_the_same_and_the_command_line_wins() {
    let folder = Folder::with_survey();
    let by_flags = done(
        &folder,
        &HILL_RUN.replace("out.csv", "- --density 2000 --ground given"),
    )
    .stdout;
    folder.write(
        "survey.toml",
        r#"
stations = "stations.csv"
dem = ["dem.tif"]
out = "-"
crs = "EPSG:32632"
outer = 800
zones = [230]
density = 2000
ground = "given"
"#,
    );
    assert_eq!(done(&folder, "effect survey.toml").stdout, by_flags);
    let denser = done(&folder, "effect survey.toml --density 3000 --zones 100").stdout;
    assert_snapshot!(denser.lines().next().unwrap(), @"station,easting,northing,height,remark,terrain_effect_mgal,terrain_correction_mgal,topography_mgal,zone_0_100_m_mgal,zone_100_800_m_mgal,numeric_bound_mgal,dem_height_m,height_misfit_m,covered,notes");
    for (light, dense) in effects_mgal(&by_flags).iter().zip(effects_mgal(&denser)) {
        // Effects are linear in density; figures are rounded to 1 µGal and computed to 1 µGal.
        assert!((dense - 1.5 * light).abs() < 3e-3, "{light} {dense}");
    }
    let elsewhere = done(&folder, "effect survey.toml --out other.csv");
    assert_eq!(elsewhere.stdout, "");
    assert_eq!(folder.read("other.csv"), by_flags);
}

#[test]
fn paths_in_the_survey_file_start_at_its_folder() {
    let folder = Folder::new();
    std::fs::create_dir(folder.path("survey")).unwrap();
    folder.dem("survey/dem.tif", &Dem::hill());
    folder.write("survey/stations.csv", STATIONS);
    folder.write(
        "survey/survey.toml",
        "stations = \"stations.csv\"\ndem = \"dem.tif\"\nout = \"out.csv\"\ncrs = \"EPSG:32632\"\nouter = 800\n",
    );
    done(&folder, "effect survey/survey.toml");
    assert_eq!(effects_mgal(&folder.read("survey/out.csv")).len(), 3);
    assert_eq!(folder.files(), ["survey"]);
}

#[test]
fn default_zone_edges_beyond_the_outer_radius_are_left_out() {
    let folder = Folder::with_survey();
    let out = done(
        &folder,
        &HILL_RUN.replace("--zones 230", "").replace("out.csv", "-"),
    )
    .stdout;
    assert_snapshot!(out.lines().next().unwrap(), @"station,easting,northing,height,remark,terrain_effect_mgal,terrain_correction_mgal,topography_mgal,zone_0_230_m_mgal,zone_230_800_m_mgal,numeric_bound_mgal,dem_height_m,height_misfit_m,covered,notes");
}

#[test]
fn the_finer_dem_counts_where_it_covers() {
    let folder = Folder::with_survey();
    // 10 m higher everywhere: the misfit tells which DEM lies under a station.
    folder.dem("far.tif", &Dem::hill().change(|_, _, h| h + 10.0));
    let heights = |words: &str| column(&done(&folder, words).stdout, "dem_height_m");
    let words = HILL_RUN.replace("out.csv", "-");
    assert_eq!(heights(&format!("{words} --dem far.tif")), heights(&words));
    assert_ne!(
        heights(&words.replace("dem.tif", "far.tif --dem dem.tif")),
        heights(&words)
    );
}

#[test]
fn tiles_in_a_vrt_are_one_dem() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    let whole = folder.read("out.csv");
    // The hill cut between rows 40 and 41, amid the stations.
    let hill = Dem::hill();
    let (north, south) = hill.heights_m.split_at(81 * 41);
    folder.dem(
        "north.tif",
        &Dem {
            size: (81, 41),
            heights_m: north.to_vec(),
            ..hill.clone()
        },
    );
    let corner = (hill.corner.0, hill.corner.1 - 41.0 * hill.step);
    folder.dem(
        "south.tif",
        &Dem {
            size: (81, 40),
            heights_m: south.to_vec(),
            corner,
            ..hill.clone()
        },
    );
    let tile = |name: &str, rows: usize, from: usize| {
        format!(
            r#"<SimpleSource><SourceFilename relativeToVRT="1">{name}</SourceFilename><SourceBand>1</SourceBand>
            <SrcRect xOff="0" yOff="0" xSize="81" ySize="{rows}"/><DstRect xOff="0" yOff="{from}" xSize="81" ySize="{rows}"/></SimpleSource>"#
        )
    };
    folder.write(
        "both.vrt",
        &format!(
            r#"<VRTDataset rasterXSize="81" rasterYSize="81"><SRS>EPSG:32632</SRS>
            <GeoTransform>{}, {}, 0, {}, 0, -{}</GeoTransform>
            <VRTRasterBand dataType="Float32" band="1"><NoDataValue>-9999</NoDataValue>{}{}</VRTRasterBand></VRTDataset>"#,
            hill.corner.0,
            hill.step,
            hill.corner.1,
            hill.step,
            tile("north.tif", 41, 0),
            tile("south.tif", 40, 41)
        ),
    );
    done(&folder, &HILL_RUN.replace("dem.tif", "both.vrt"));
    assert_eq!(folder.read("out.csv"), whole);
    let provenance = folder.read("out.csv.provenance.toml");
    for name in ["both.vrt", "north.tif", "south.tif", "stations.csv"] {
        assert!(
            provenance.contains(name),
            "{name} is missing in\n{provenance}"
        );
    }
}

#[test]
fn geographic_stations_and_named_columns() {
    let folder = Folder::with_survey();
    // The summit station in degrees (PROJ, EPSG:32632 to EPSG:4326), under names nobody would guess.
    folder.write(
        "stations.csv",
        "punkt;a;b;c\ntop;10.314364802;46.946209466;1300\n",
    );
    let words = HILL_RUN
        .replace("EPSG:32632", "EPSG:4326")
        .replace("out.csv", "-");
    let out = done(
        &folder,
        &format!("{words} --id punkt --x a --y b --height c"),
    )
    .stdout;
    assert_snapshot!(out.lines().next().unwrap(), @"punkt,a,b,c,terrain_effect_mgal,terrain_correction_mgal,topography_mgal,zone_0_230_m_mgal,zone_230_800_m_mgal,numeric_bound_mgal,dem_height_m,height_misfit_m,covered,notes");
}

#[test]
fn a_geopackage_holds_the_same_numbers() {
    let folder = Folder::with_survey();
    done(&folder, HILL_RUN);
    done(&folder, &HILL_RUN.replace("out.csv", "out.gpkg"));
    let set = gdal::Dataset::open(folder.path("out.gpkg")).unwrap();
    let mut layer = set.layer(0).unwrap();
    let from_layer: Vec<(String, f64, f64)> = layer
        .features()
        .map(|feature| {
            let at = |name| feature.field_index(name).unwrap();
            let effect = feature
                .field_as_double(at("terrain_effect_mgal"))
                .unwrap()
                .unwrap();
            let name = feature.field_as_string(at("station")).unwrap().unwrap();
            (name, effect, feature.geometry().unwrap().get_point(0).0)
        })
        .collect();
    let text = folder.read("out.csv");
    let names = column(&text, "station");
    let eastings = column(&text, "easting");
    for (i, effect) in effects_mgal(&text).into_iter().enumerate() {
        assert_eq!(
            from_layer[i],
            (names[i].clone(), effect, eastings[i].parse().unwrap())
        );
    }
    assert_eq!(from_layer.len(), 3);
    assert!(
        !folder.files().iter().any(|name| name.starts_with('.')),
        "litter: {:?}",
        folder.files()
    );
}

#[test]
fn nothing_is_coloured_where_stderr_is_no_terminal() {
    let folder = Folder::with_survey();
    let ran = folder.run(&format!("{HILL_RUN} --dem nowhere.tif"));
    assert_eq!(ran.code, Some(2));
    assert!(!ran.stderr.contains('\u{1b}'), "{:?}", ran.stderr);
}

/// The summary without times, and without the bound, which is the engine's business.
fn steady(stderr: &str) -> String {
    let line = |line: &str| match line.split_whitespace().next() {
        Some("time") => "time      [...]".to_owned(),
        Some("bound") => {
            let (before, after) = line.split_once("worst ").unwrap();
            let (number, rest) = after.split_once(' ').unwrap();
            let bound_ugal: f64 = number.parse().unwrap();
            assert!(bound_ugal > 0.0 && bound_ugal <= 1.0, "{line}");
            format!("{before}worst [...] {rest}")
        }
        _ => line.to_owned(),
    };
    stderr.lines().map(line).collect::<Vec<_>>().join("\n")
}
