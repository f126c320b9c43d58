//! The whole path against reference values: five reliefs with terrain effects from an independent brute-force integration
//! of the same bilinear surface (columns of finite thickness on the ellipsoid, policy `given`), converged to 0.001 uGal.
//! The DEMs and values are in `data/reference`; `maunga_whau` is the open 10 m grid known as `volcano`.

use hillpull_engine::{Ground, Settings, Station, StationEffect, effects};
use hillpull_physics::constants::{DENSITY_ROCK_KG_M3, G_CODATA_2018, OUTER_RADIUS_M};
use hillpull_relief::{Placement, Relief};
use hillpull_relief::{ReadOptions, read_grid};
use std::path::PathBuf;
use std::sync::atomic::AtomicBool;

struct Case {
    name: &'static str,
    crs: Option<&'static str>,
    density_kg_m3: f64,
    outer_radius_m: f64,
    zone_edges_m: &'static [f64],
}

const CASES: [Case; 4] = [
    Case {
        name: "massif_geographic",
        crs: None,
        density_kg_m3: DENSITY_ROCK_KG_M3,
        outer_radius_m: 9000.0,
        zone_edges_m: &[230.0, 2000.0],
    },
    Case {
        name: "maunga_whau_nztm",
        crs: Some("EPSG:2193"),
        density_kg_m3: 2300.0,
        outer_radius_m: 250.0,
        zone_edges_m: &[50.0],
    },
    Case {
        name: "range_far_land",
        crs: None,
        density_kg_m3: DENSITY_ROCK_KG_M3,
        outer_radius_m: OUTER_RADIUS_M,
        zone_edges_m: &[5240.0, 28800.0],
    },
    Case {
        name: "fells_utm",
        crs: Some("EPSG:32632"),
        density_kg_m3: DENSITY_ROCK_KG_M3,
        outer_radius_m: 19000.0,
        zone_edges_m: &[230.0, 5240.0],
    },
];

/// What `data/reference/NAME.csv` says of a station.
struct Reference {
    station: Station,
    total_mgal: f64,
    zones_mgal: Vec<f64>,
}

fn data(name: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("data/reference")
        .join(name)
}

fn load(case: &Case) -> (Relief, Vec<Reference>) {
    let grid = read_grid(
        &data(&format!("{}.tif", case.name)),
        &ReadOptions::default(),
    )
    .expect("reference DEM");
    let mut rows =
        csv::Reader::from_path(data(&format!("{}.csv", case.name))).expect("reference values");
    let mut references = Vec::new();
    for row in rows.records() {
        let row = row.expect("a row");
        let v: Vec<f64> = row
            .iter()
            .skip(1)
            .map(|t| t.parse().expect("a number"))
            .collect();
        // the stations' CRS is the DEM's: x and y through the same placement
        let placement = Placement {
            affine: [v[0], 0.0, 0.0, v[1], 0.0, 0.0],
            crs: case.crs.map(str::to_owned),
        };
        let [lon, lat] = placement.lonlat_rad(&[[0.0, 0.0]]).expect("a place")[0];
        references.push(Reference {
            station: Station {
                lon_deg: lon.to_degrees(),
                lat_deg: lat.to_degrees(),
                height_m: v[2],
                ground: Ground::Given,
            },
            total_mgal: v[3],
            zones_mgal: v[4..].to_vec(),
        });
    }
    (Relief::build(vec![grid]).expect("relief"), references)
}

fn settings(case: &Case, tolerance_mgal: f64) -> Settings {
    Settings {
        density_kg_m3: case.density_kg_m3,
        big_g: G_CODATA_2018,
        outer_radius_m: case.outer_radius_m,
        zone_edges_m: case.zone_edges_m.to_vec(),
        tolerance_mgal,
        bend_radius_m: 100.0,
    }
}

fn run(relief: &Relief, references: &[Reference], settings: &Settings) -> Vec<StationEffect> {
    let stations: Vec<Station> = references.iter().map(|r| r.station).collect();
    effects(
        relief,
        &stations,
        settings,
        &|_| (),
        &AtomicBool::new(false),
    )
    .into_iter()
    .map(|r| r.expect("a result"))
    .collect()
}

/// How far the references themselves may be off, uGal: they are printed to 0.001 uGal, and 3e-8 of the value is a few
/// millimetres in the radius at which they were cut off.
fn reference_error_ugal(reference: &Reference) -> f64 {
    0.0006 + 3e-8 * 1e3 * reference.total_mgal.abs()
}

#[test]
fn every_total_and_zone_within_a_microgal_and_its_bound() {
    for case in &CASES {
        let (relief, references) = load(case);
        let results = run(&relief, &references, &settings(case, 1e-3));
        let (mut worst, mut worst_zone, mut worst_bound) = (0.0_f64, 0.0_f64, 0.0_f64);
        for (k, (result, reference)) in results.iter().zip(&references).enumerate() {
            let error = 1e3 * (result.terrain_effect_mgal - reference.total_mgal).abs();
            let bound = 1e3 * result.numeric_bound_mgal;
            let mut zones = Vec::new();
            for (zone, expected) in result.zone_effect_mgal.iter().zip(&reference.zones_mgal) {
                let error = 1e3 * (zone - expected);
                worst_zone = worst_zone.max(error.abs());
                zones.push(format!("{error:+.4}"));
            }
            println!(
                "{} {k}: error {error:.4} uGal, bound {bound:.4}, zones {zones:?}, {} evaluations",
                case.name, result.evaluations
            );
            worst = worst.max(error);
            worst_bound = worst_bound.max(bound);
        }
        println!(
            "{}: {} stations, worst error {worst:.4} uGal, worst zone {worst_zone:.4} uGal, worst bound {worst_bound:.4} uGal",
            case.name,
            results.len()
        );
        for (result, reference) in results.iter().zip(&references) {
            let error = 1e3 * (result.terrain_effect_mgal - reference.total_mgal).abs();
            let bound = 1e3 * result.numeric_bound_mgal;
            assert!(
                error <= bound + reference_error_ugal(reference),
                "{}: error {error} uGal above its bound {bound}",
                case.name
            );
            assert!(
                bound <= 1.0,
                "{}: bound {bound} uGal above the tolerance",
                case.name
            );
        }
        assert!(
            worst_zone <= 1.0,
            "{}: a zone is off by {worst_zone} uGal",
            case.name
        );
    }
}

#[test]
fn the_error_follows_the_tolerance() {
    for case in &CASES {
        let (relief, references) = load(case);
        let mut last_evaluations = 0;
        for tolerance_ugal in [100.0, 10.0, 1.0, 0.1, 0.01] {
            let results = run(&relief, &references, &settings(case, 1e-3 * tolerance_ugal));
            let (mut worst, mut worst_bound, mut evaluations) = (0.0_f64, 0.0_f64, 0);
            for (result, reference) in results.iter().zip(&references) {
                let error = 1e3 * (result.terrain_effect_mgal - reference.total_mgal).abs();
                let bound = 1e3 * result.numeric_bound_mgal;
                assert!(
                    error <= bound + reference_error_ugal(reference),
                    "{} at {tolerance_ugal}: error {error} above bound {bound}",
                    case.name
                );
                assert!(
                    bound <= tolerance_ugal,
                    "{} at {tolerance_ugal}: bound {bound}",
                    case.name
                );
                worst = worst.max(error);
                worst_bound = worst_bound.max(bound);
                evaluations += result.evaluations;
            }
            println!(
                "{} tolerance {tolerance_ugal}: worst error {worst:.4}, worst bound {worst_bound:.4} uGal, {} evaluations a station",
                case.name,
                evaluations / results.len() as u64
            );
            assert!(
                evaluations >= last_evaluations,
                "a finer tolerance takes no fewer evaluations"
            );
            last_evaluations = evaluations;
        }
    }
}
