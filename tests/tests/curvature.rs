//! Flat ground and hills on the curved Earth, against closed forms and quadrature on the sphere.
//!
//! The tables are for R = 6371 km. To first order in 1/R a terrain effect on the ellipsoid, all round the station, has the
//! mean of 1/R over the azimuths, (1/M + 1/N)/2, so the stations stand at the latitude where that is 1/6371 km. What is
//! left: the azimuths differ by e^2 cos^2(lat) / 2 = 0.2 %, which counts squared, 1e-5 of what curvature does, 0.03 uGal in
//! 3 mGal.

#![expect(
    clippy::print_stdout,
    reason = "the table of errors is what a reader of the test wants"
)]

use hillpull_engine::{Ground, Station};
use hillpull_physics::bodies::cap::ring_m;
use hillpull_physics::constants::{EARTH_RADIUS_M, OUTER_RADIUS_M};
use hillpull_physics::ellipsoid::chord_from_arc_m;
use hillpull_relief::{Grid, Placement, Relief};
use hillpull_tests::published::rows;
use hillpull_tests::relief_fixtures::{Posts, Site, UNIT_MGAL, order, relief, run, settings};
use std::f64::consts::PI;

/// The latitude where the mean curvature is that of the table's sphere.
fn site_of_the_sphere() -> Site {
    let at = |lat_deg| Site {
        lon_deg: -3.0,
        lat_deg,
    };
    let (mut low, mut high) = (0.0, 90.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        // flatter toward the poles
        if at(middle).mean_curvature() * EARTH_RADIUS_M > 1.0 {
            low = middle;
        } else {
            high = middle;
        }
    }
    at(low)
}

/// Flat ground at `height_m` around a site, in longitude and latitude.
fn flat_grid(site: Site, height_m: f64, spacing_deg: f64) -> Grid {
    let wide = 1.6 / site.lat_deg.to_radians().cos();
    let (rows, cols) = (
        (3.2 / spacing_deg) as usize,
        (2.0 * wide / spacing_deg) as usize,
    );
    let placement = Placement {
        affine: [
            site.lon_deg - wide + 0.31 * spacing_deg,
            spacing_deg,
            0.0,
            site.lat_deg + 1.6 - 0.17 * spacing_deg,
            0.0,
            -spacing_deg,
        ],
        crs: None,
    };
    let heights = vec![height_m as f32; rows * cols];
    Grid::new("flat", rows, cols, heights, placement)
}

fn flat(site: Site, height_m: f64, spacing_deg: f64) -> Relief {
    relief(vec![flat_grid(site, height_m, spacing_deg)])
}

fn station(site: Site, height_m: f64) -> Station {
    Station {
        lon_deg: site.lon_deg,
        lat_deg: site.lat_deg,
        height_m,
        ground: Ground::Given,
    }
}

const EDGES_M: [f64; 5] = [250.0, 5240.0, 21_944.381, 28_800.0, 99_000.0];

/// Rings of flat ground: the closed form of the spherical ring, agreeing with 2-D quadrature to 1e-21.
#[test]
fn rings_of_flat_ground() {
    let site = site_of_the_sphere();
    println!("latitude {:.4}", site.lat_deg);
    let table = rows("spherical_ring_TC.csv");
    assert_eq!(table.len(), 40);
    let settings = settings(OUTER_RADIUS_M, &EDGES_M, 0.1);
    for spacing_deg in [0.02, 0.005] {
        let mut worst = 0.0_f64;
        for terrain_m in [0.0, 500.0, 1000.0, 2000.0, 3000.0] {
            let relief = flat(site, terrain_m, spacing_deg);
            for station_m in [0.0, 1000.0, 3000.0] {
                let cases: Vec<_> = table
                    .iter()
                    .filter(|r| {
                        r.number("terrain_h") == terrain_m && r.number("station_h") == station_m
                    })
                    .collect();
                if cases.is_empty() {
                    continue;
                }
                let result = &run(&relief, &[station(site, station_m)], &settings)[0];
                assert!(result.covered > 0.999);
                for case in cases {
                    let (from, to) = case.text("ring_m").split_once("..").expect("a ring");
                    let zone = |edge: &str| {
                        let edge: f64 = edge.parse().expect("a number");
                        EDGES_M.iter().take_while(|&&e| e < edge - 1e-6).count()
                    };
                    let (from, to) = (zone(from) + 1, zone(to));
                    let found: f64 = result.zone_effect_mgal[from..=to].iter().sum();
                    let error = 1e3 * (found + case.number("TC_spherical_mGal"));
                    let planar =
                        1e3 * (case.number("TC_spherical_mGal") - case.number("TC_planar_mGal"));
                    println!(
                        "posts {spacing_deg} deg, ring {:<20} station {station_m:>4} terrain {terrain_m:>4}: \
                         {:>9.3} uGal, of which curvature {planar:>9.3}, error {error:+.4}",
                        case.text("ring_m"),
                        1e3 * found,
                    );
                    worst = worst.max(error.abs());
                }
            }
        }
        println!("posts {spacing_deg} deg: worst error {worst:.4} uGal");
        assert!(worst < 0.4, "{worst}");
    }
}

/// Largest errors of a total and of a zone at other latitudes, uGal, with what the totals exceed their bounds by.
///
/// The sphere is the one of mean curvature there (`ring_m` is checked against the table elsewhere).
fn worst_at_other_latitudes(spacing_deg: f64) -> (f64, f64, f64) {
    let (mut worst, mut worst_zone, mut beyond) = (0.0_f64, 0.0_f64, 0.0_f64);
    for lat_deg in [0.0, -21.0, 52.0, 78.0] {
        let site = Site {
            lon_deg: 179.6, // the disc crosses the antimeridian
            lat_deg,
        };
        let radius_m = 1.0 / site.mean_curvature();
        // zone edges are chords
        let psi = |edge_m: f64| 2.0 * (0.5 * chord_from_arc_m(edge_m) / radius_m).asin();
        for (station_m, terrain_m) in [(-300.0, 0.0), (1700.0, 0.0), (0.0, 800.0), (2500.0, 600.0)]
        {
            let relief = flat(site, terrain_m, spacing_deg);
            let settings = settings(OUTER_RADIUS_M, &EDGES_M, 0.1);
            let result = &run(&relief, &[station(site, station_m)], &settings)[0];
            let mut total = 0.0;
            for (&(from, to), found) in settings.zones_m().iter().zip(&result.zone_effect_mgal) {
                let s = radius_m + station_m;
                let ring = ring_m(s, psi(from), psi(to), s, radius_m + terrain_m);
                let error = 1e3 * (found - UNIT_MGAL * ring);
                worst_zone = worst_zone.max(error.abs());
                total += error;
            }
            let bound = 1e3 * result.numeric_bound_mgal;
            println!(
                "posts {spacing_deg} deg, latitude {lat_deg}, station {station_m}, terrain {terrain_m}: {:.3} uGal, error {total:+.4}, bound {bound:.4}",
                1e3 * result.terrain_effect_mgal
            );
            worst = worst.max(total.abs());
            beyond = beyond.max(total.abs() - bound);
        }
    }
    println!(
        "posts {spacing_deg} deg: worst error of a total {worst:.4} uGal, of a zone {worst_zone:.4} uGal"
    );
    (worst, worst_zone, beyond)
}

/// Part of the ellipsoid that its mean sphere leaves out, uGal: see the top of this file.
const ELLIPSOID_UGAL: f64 = 0.05;

#[test]
fn rings_at_other_latitudes() {
    let (worst, worst_zone, beyond) = worst_at_other_latitudes(0.01);
    assert!(worst < 0.2, "{worst}");
    assert!(worst_zone < 1.0, "{worst_zone}");
    assert!(beyond < ELLIPSOID_UGAL, "{beyond} uGal above the bound");
}

/// The same on posts 2 km apart, where the ground under the station is placed to a millimetre only.
#[test]
fn rings_on_coarse_posts() {
    let (worst, worst_zone, beyond) = worst_at_other_latitudes(0.02);
    assert!(worst < 1.0, "{worst}");
    assert!(worst_zone < 1.0, "{worst_zone}");
    assert!(beyond < ELLIPSOID_UGAL, "{beyond} uGal above the bound");
}

/// Hills on the sphere, station on the summit: 2-D quadrature, the profile against distance along the ground. Two layers:
/// the hill in metres about the site, the plain in longitude and latitude.
#[test]
fn hills_on_the_sphere() {
    let site = site_of_the_sphere();
    let fractions = [30.0, 60.0, 120.0];
    let table = rows("spherical_hills.csv");
    assert_eq!(table.len(), 12);
    for cases in table
        .chunk_by(|a, b| a.text("hill") == b.text("hill") && a.number("H_m") == b.number("H_m"))
    {
        let (height, width) = (cases[0].number("H_m"), cases[0].number("width_m"));
        let name = cases[0].text("hill");
        let profile = |r: f64| match name {
            "gauss" => height * (-0.5 * (r / width).powi(2)).exp(),
            "cos" => 0.5 * height * (1.0 + (PI * (r / width).min(1.0)).cos()),
            "cone" => height * (1.0 - r / width).max(0.0),
            other => panic!("{other}"),
        };
        let reach = if name == "gauss" { 6.0 } else { 1.1 } * width;
        let mut errors = vec![Vec::new(); cases.len()];
        for fraction in fractions {
            let posts = Posts::out_to(reach, width / fraction);
            let hill = site.grid(&posts, |x, y| profile(x.hypot(y)));
            let relief = relief(vec![hill, flat_grid(site, 0.0, 0.02)]);
            for (case, errors) in cases.iter().zip(&mut errors) {
                let settings = settings(case.number("outer S_m"), &[], 0.1);
                let result = &run(&relief, &[station(site, height)], &settings)[0];
                assert!(result.covered > 0.999 && result.layer == 0);
                let error = result.terrain_effect_mgal + case.number("TC_spherical=cap-topo_mGal");
                let topography = result.topography_mgal - case.number("topo attraction_mGal");
                // the cap's closed form is another matter: the two errors are one
                assert!((error - topography).abs() < 1e-9);
                errors.push(1e3 * error);
            }
        }
        let spacings = fractions.map(|f| width / f);
        for (case, errors) in cases.iter().zip(&errors) {
            let order = order(&spacings, errors);
            // the cone's tip is missed by order 1 and the rest by order 2
            let without = |power: i32, fine: f64, coarse: f64| {
                fine + (fine - coarse) / (2_f64.powi(power) - 1.0)
            };
            let (due, limit) = if name == "cone" {
                let first = [1, 2].map(|k| without(1, errors[k], errors[k - 1]));
                (1.0, without(2, first[1], first[0]))
            } else {
                (2.0, without(2, errors[2], errors[1]))
            };
            println!(
                "{name} {height} m, {width} m, to {} m: {:.3} mGal, errors at {spacings:?} m: {:?} uGal, order {order:.2}, in the limit {limit:+.3} uGal",
                case.number("outer S_m"),
                -case.number("TC_spherical=cap-topo_mGal"),
                errors
                    .iter()
                    .map(|e| format!("{e:+.3}"))
                    .collect::<Vec<_>>(),
            );
            assert!((order - due).abs() < 0.15, "{case:?}: order {order}");
            assert!(limit.abs() < 0.4, "{case:?}: {limit}");
        }
    }
}
