//! Vector layers in, GeoPackage out, through GDAL.
#![expect(clippy::unwrap_used, reason = "a test stops where something fails")]
mod common;

use common::{Folder, csv_text, outcomes, provenance, records, settings};
use gdal::spatial_ref::SpatialRef;
use gdal::vector::{
    Feature, FieldDefn, Geometry, LayerAccess, LayerOptions, OGRFieldType as T,
    OGRwkbGeometryType as G,
};
use gdal::{Dataset, DriverManager};
use hillpull_survey::{
    OutputProblem, OutputTarget, StationFault, StationTable, SurveyError, TableOptions,
    TableProblem, read_stations, write_effects,
};
use std::path::Path;

const GEOJSON: &str = r#"{"type":"FeatureCollection","features":[
 {"type":"Feature","properties":{"name":"Hut","reading":12.5,"n":3},
  "geometry":{"type":"Point","coordinates":[9.5,46.5,1500]}},
 {"type":"Feature","properties":{"name":"Pass","reading":null,"n":4},"geometry":null},
 {"type":"Feature","properties":{"name":"Lake","reading":0.1,"n":null},
  "geometry":{"type":"Point","coordinates":[9.75,46.25,1200.5]}}]}"#;

/// Three stations in UTM 32 with fields of several types; the second has neither point nor values.
fn layer(driver: &str, path: &Path, z: bool, srs: bool) {
    let srs = srs.then(|| SpatialRef::from_epsg(32632).unwrap());
    let mut dataset = DriverManager::get_driver_by_name(driver)
        .unwrap()
        .create_vector_only(path)
        .unwrap();
    let ty = if z { G::wkbPoint25D } else { G::wkbPoint };
    let layer = dataset
        .create_layer(LayerOptions {
            name: "survey",
            srs: srs.as_ref(),
            ty,
            options: None,
        })
        .unwrap();
    let fields = [
        ("station", T::OFTString),
        ("height", T::OFTReal),
        ("loops", T::OFTInteger),
        ("day", T::OFTDate),
    ];
    for (name, kind) in fields {
        FieldDefn::new(name, kind)
            .unwrap()
            .add_to_layer(&layer)
            .unwrap();
    }
    for i in 0..3 {
        let mut f = Feature::new(layer.defn()).unwrap();
        f.set_field_string(0, ["Hütte", "Pass", "Lake"][i]).unwrap();
        if i != 1 {
            f.set_field_double(1, 1200.125 + i as f64).unwrap();
            f.set_field_integer(2, i as i32 + 5).unwrap();
            f.set_field_string(3, "2026/05/01").unwrap();
            let mut g = Geometry::empty(ty).unwrap();
            let (x, y) = (500_000.0 + 1000.25 * i as f64, 5_100_000.5);
            if z {
                g.add_point((x, y, 77.5))
            } else {
                g.add_point_2d((x, y))
            }
            f.set_geometry(g).unwrap();
        }
        f.create(&layer).unwrap();
    }
}

fn read(path: &Path) -> Result<StationTable, SurveyError> {
    read_stations(path, &TableOptions::default())
}

fn write(table: &StationTable, path: &Path) {
    let target = OutputTarget::from_path(path).unwrap();
    target.check(table, &settings(), &[]).unwrap();
    write_effects(
        &target,
        &mut Vec::new(),
        table,
        &outcomes(table),
        &settings(),
        &provenance(),
    )
    .unwrap();
}

#[test]
fn geojson_points_and_third_coordinates() {
    let folder = Folder::new();
    let table = read(&folder.write("s.geojson", GEOJSON)).unwrap();
    assert_eq!(table.column_names(), ["name", "reading", "n"]);
    // GDAL names the three-dimensional WGS 84 for points with a third coordinate.
    assert_eq!(table.crs(), "EPSG:4979");
    let s = table.stations();
    assert_eq!(
        (s[0].lon_deg, s[0].lat_deg, s[0].height_m, s[0].row),
        (9.5, 46.5, 1500.0, 1)
    );
    assert_eq!(s[1].fault, Some(StationFault::CoordinatesMissing));
    assert_eq!(table.id(2), "Lake");
    let rows = records(&csv_text(&table), b',');
    assert_eq!(
        rows[0][..6],
        [
            "name",
            "reading",
            "n",
            "geometry_x",
            "geometry_y",
            "geometry_z"
        ]
    );
    assert_eq!(rows[1][..6], ["Hut", "12.5", "3", "9.5", "46.5", "1500"]);
    assert_eq!(rows[2][..6], ["Pass", "", "4", "", "", ""]);
    assert_eq!(
        rows[3][..7],
        ["Lake", "0.1", "", "9.75", "46.25", "1200.5", "-12.346"]
    );
}

#[test]
fn shapefile_and_geopackage_read_alike() {
    let folder = Folder::new();
    for (driver, name) in [("GPKG", "s.gpkg"), ("ESRI Shapefile", "s.shp")] {
        let path = folder.path(name);
        layer(driver, &path, false, true);
        let table = read(&path).unwrap();
        assert_eq!(
            table.column_names(),
            ["station", "height", "loops", "day"],
            "{driver}"
        );
        assert_eq!(table.id(0), "Hütte");
        let s = table.stations();
        assert_eq!(
            (s[0].x, s[0].y, s[0].height_m),
            (500_000.0, 5_100_000.5, 1200.125),
            "{driver}"
        );
        assert!(
            (s[0].lon_deg - 9.0).abs() < 1e-9,
            "{driver}: central meridian of zone 32 is 9 degrees"
        );
        assert_eq!(s[1].fault, Some(StationFault::CoordinatesMissing));
        let rows = records(&csv_text(&table), b',');
        assert_eq!(
            rows[3][..6],
            [
                "Lake",
                "1202.125",
                "7",
                "2026-05-01",
                "502000.5",
                "5100000.5"
            ],
            "{driver}"
        );
    }
}

#[test]
fn a_layer_without_system_stops() {
    let folder = Folder::new();
    let path = folder.path("s.shp");
    layer("ESRI Shapefile", &path, false, false);
    let error = read(&path).unwrap_err();
    assert!(
        matches!(
            error,
            SurveyError::Table {
                problem: TableProblem::NoCrs { .. },
                ..
            }
        ),
        "{error}"
    );
    let named = TableOptions {
        crs: Some("EPSG:32632".into()),
        ..Default::default()
    };
    assert_eq!(read_stations(&path, &named).unwrap().crs(), "EPSG:32632");
}

#[test]
fn geopackage_to_geopackage_keeps_types_nulls_and_points() {
    let folder = Folder::new();
    let (from, to) = (folder.path("s.gpkg"), folder.path("out.gpkg"));
    layer("GPKG", &from, true, true);
    let table = read(&from).unwrap();
    // The height column wins over the third coordinate.
    assert_eq!(table.stations()[0].height_m, 1200.125);
    write(&table, &to);
    assert_eq!(folder.names(), ["out.gpkg", "s.gpkg"]);

    let dataset = Dataset::open(&to).unwrap();
    let mut layer = dataset.layer_by_name("terrain_effect").unwrap();
    assert_eq!(layer.spatial_ref().unwrap().auth_code().unwrap(), 32632);
    let fields: Vec<(String, T::Type)> = layer
        .defn()
        .fields()
        .map(|f| (f.name(), f.field_type()))
        .collect();
    let expected = [
        ("station", T::OFTString),
        ("height", T::OFTReal),
        ("loops", T::OFTInteger),
        ("day", T::OFTDate),
        ("terrain_effect_mgal", T::OFTReal),
        ("terrain_correction_mgal", T::OFTReal),
        ("topography_mgal", T::OFTReal),
        ("zone_0_230_m_mgal", T::OFTReal),
        ("zone_230_5240_m_mgal", T::OFTReal),
        ("zone_5240_28800_m_mgal", T::OFTReal),
        ("zone_28800_166735_m_mgal", T::OFTReal),
        ("numeric_bound_mgal", T::OFTReal),
        ("dem_height_m", T::OFTReal),
        ("height_misfit_m", T::OFTReal),
        ("covered", T::OFTReal),
        ("notes", T::OFTString),
    ];
    assert_eq!(fields, expected.map(|(n, t)| (n.to_owned(), t)));
    let features: Vec<Feature<'_>> = layer.features().collect();
    assert_eq!(features.len(), 3);
    let f = &features[2];
    assert_eq!(f.field_as_double(1).unwrap(), Some(1202.125));
    assert_eq!(f.field_as_integer(2).unwrap(), Some(7));
    assert_eq!(f.field_as_string(3).unwrap().unwrap(), "2026/05/01");
    assert_eq!(f.field_as_double(4).unwrap(), Some(-12.346));
    assert_eq!(f.field_as_double(11).unwrap(), Some(0.0004));
    assert_eq!(f.field_as_string(15).unwrap(), None);
    assert_eq!(
        f.geometry().unwrap().get_point(0),
        (502_000.5, 5_100_000.5, 77.5)
    );
    let bad = &features[1];
    for i in [1, 2, 4, 14] {
        assert_eq!(bad.field_as_double(i).unwrap(), None, "field {i}");
    }
    assert_eq!(
        bad.field_as_string(15).unwrap().unwrap(),
        "coordinates missing"
    );
}

#[test]
fn csv_to_geopackage_keeps_text_and_reads_back() {
    let folder = Folder::new();
    let text =
        "fid,geom,lon,lat,h,remark\n007,\"a,b\",9.50,46.25,1200,\"two\nlines\"\n8,,9.5,46.5,,\n";
    let named = TableOptions {
        id: Some("fid".into()),
        ..Default::default()
    };
    let table = read_stations(&folder.write("s.csv", text), &named).unwrap();
    let to = folder.path("out.gpkg");
    write(&table, &to);

    let dataset = Dataset::open(&to).unwrap();
    let mut layer = dataset.layer_by_name("terrain_effect").unwrap();
    assert_eq!(layer.spatial_ref().unwrap().auth_code().unwrap(), 4326);
    let f = layer.features().next().unwrap();
    let users: Vec<String> = (0..6)
        .map(|i| f.field_as_string(i).unwrap().unwrap())
        .collect();
    assert_eq!(users, ["007", "a,b", "9.50", "46.25", "1200", "two\nlines"]);
    let point = f.geometry().unwrap().get_point(0);
    assert_eq!((point.0, point.1), (9.5, 46.25));
    let mut origin = dataset.layer_by_name("provenance").unwrap();
    let items: Vec<(String, String)> = origin
        .features()
        .map(|f| {
            (
                f.field_as_string(0).unwrap().unwrap(),
                f.field_as_string(1).unwrap().unwrap(),
            )
        })
        .collect();
    assert!(
        items.contains(&("density_kg_m3".into(), "2670".into())),
        "{items:?}"
    );
    assert!(
        items.contains(&("option --tolerance".into(), "1".into())),
        "{items:?}"
    );

    // Our own output is a station table again (the provenance table beside it is not mistaken for one), but its
    // results are in the way of new ones.
    let again = read_stations(&to, &named).unwrap();
    assert_eq!(again.len(), 2);
    let error = OutputTarget::Stdout
        .check(&again, &settings(), &[])
        .unwrap_err();
    assert!(matches!(
        error,
        SurveyError::Output {
            problem: OutputProblem::ColumnTaken { .. },
            ..
        }
    ));
}

#[test]
fn equal_runs_give_equal_geopackages() {
    let folder = Folder::new();
    let table = read(&folder.write("s.csv", "id,lon,lat,h\na,9,46,10\nb,9.5,46,10\n")).unwrap();
    let (one, two) = (folder.path("one.gpkg"), folder.path("two.gpkg"));
    write(&table, &one);
    std::fs::copy(&one, &two).unwrap();
    std::thread::sleep(std::time::Duration::from_millis(20));
    write(&table, &one);
    assert!(std::fs::read(&one).unwrap() == std::fs::read(&two).unwrap());
}

#[test]
fn columns_a_geopackage_cannot_hold() {
    let folder = Folder::new();
    let target = OutputTarget::from_path(&folder.path("out.gpkg")).unwrap();
    let problem = |text: &str| {
        let table = read(&folder.write("s.csv", text)).unwrap();
        match target.check(&table, &settings(), &[]).unwrap_err() {
            SurveyError::Output { problem, .. } => problem,
            other => panic!("{other}"),
        }
    };
    let twice = problem("id,lon,lat,h,g,G\na,9,46,10,1,2\n");
    assert_eq!(
        twice,
        OutputProblem::SameField {
            first: "g".into(),
            second: "G".into()
        }
    );
    assert_eq!(
        problem("id,lon,lat,h,\na,9,46,10,1\n"),
        OutputProblem::NamelessField { number: 5 }
    );
}

#[test]
fn layers_that_hold_no_stations() {
    let folder = Folder::new();
    let line = GEOJSON.replace(
        "\"Point\",\"coordinates\":[9.75,46.25,1200.5]",
        "\"LineString\",\"coordinates\":[[9,46],[10,47]]",
    );
    let error = read(&folder.write("line.geojson", line)).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("row 3 is a linestring, not a point"),
        "{error}"
    );
    let empty = r#"{"type":"FeatureCollection","features":[]}"#;
    let error = read(&folder.write("empty.geojson", empty)).unwrap_err();
    assert!(
        matches!(
            error,
            SurveyError::Table {
                problem: TableProblem::HeaderOnly,
                ..
            }
        ),
        "{error}"
    );
    let path = folder.path("two.gpkg");
    {
        let mut dataset = DriverManager::get_driver_by_name("GPKG")
            .unwrap()
            .create_vector_only(&path)
            .unwrap();
        for name in ["first", "second"] {
            dataset
                .create_layer(LayerOptions {
                    name,
                    srs: None,
                    ty: G::wkbPoint,
                    options: None,
                })
                .unwrap();
        }
    }
    let error = read(&path).unwrap_err();
    assert!(
        error
            .to_string()
            .contains("2 layers could hold the stations: first, second"),
        "{error}"
    );
    assert!(error.hint().is_some());
}

#[test]
fn a_truncated_geopackage_is_no_table() {
    let folder = Folder::new();
    let path = folder.path("s.gpkg");
    layer("GPKG", &path, false, true);
    let bytes = std::fs::read(&path).unwrap();
    let cut = folder.write("cut.gpkg", &bytes[..bytes.len() / 2]);
    assert!(read(&cut).is_err());
}
