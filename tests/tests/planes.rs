//! The inclined plane through the station: the case on which every way of cutting the ground next to the station into
//! prisms or compartments fails, worst where the station does not stand in the middle of its cell.
//!
//! A bilinear surface holds a plane exactly, whatever the posts' spacing and the rows' direction, so the only errors left
//! are the engine's own. Slopes of 10 to 50 degrees, all azimuths, stations anywhere within their cells. To first order
//! the Earth's curvature adds nothing: what it adds on one side it takes on the other.

use hillpull_engine::{Ground, Station, StationEffect};
use hillpull_physics::bodies::sector::plane_slope_sector_m;
use hillpull_relief::{Grid, Relief};
use hillpull_tests::published::rows;
use hillpull_tests::relief_fixtures::{
    Posts, Random, SITE, UNIT_MGAL, put_on_surface, relief, run, settings,
};
use rayon::prelude::*;
use std::f64::consts::TAU;

const RADIUS_M: f64 = 100.0;
/// The DEM goes on beyond the outer radius by this many posts.
const MARGIN_POSTS: f64 = 64.0;
const PLANES: usize = 250;
const STATIONS: usize = 4;

struct Plane {
    slope_rad: f64,
    spacing_m: f64,
    relief: Relief,
    /// Stations within the cells around the middle of the grid, on the surface.
    stations: Vec<Station>,
    /// The same with (x, y) put to the middle of the cell, height unchanged.
    in_the_middle: Vec<Station>,
}

fn plane(random: &mut Random, spacing_m: f64) -> Plane {
    let slope_rad = random.between(10.0, 50.0).to_radians();
    let (sin, cos) = random.between(0.0, TAU).sin_cos();
    let posts = Posts::out_to(RADIUS_M + MARGIN_POSTS * spacing_m, spacing_m)
        .turned(random.between(0.0, TAU))
        .moved(random.between(-1e3, 1e3), random.between(-1e3, 1e3));
    let middle = (posts.rows - 1) as f64 / 2.0;
    let (x0, y0) = posts.xy(middle, middle);
    let height = |x: f64, y: f64| slope_rad.tan() * ((x - x0) * cos + (y - y0) * sin);
    let relief = relief(vec![SITE.grid(&posts, height)]);
    let (mut places, mut middles) = (Vec::new(), Vec::new());
    for _ in 0..STATIONS {
        let (row, col) = (
            middle + random.between(-1.0, 1.0),
            middle + random.between(-1.0, 1.0),
        );
        let (x, y) = posts.xy(row, col);
        places.push((x, y, 0.0));
        let (x, y) = posts.xy(row.floor() + 0.5, col.floor() + 0.5);
        middles.push((x, y, 0.0));
    }
    places.extend(middles);
    let mut stations = SITE.stations(&places, Ground::Given);
    put_on_surface(&relief, &mut stations, 0.0);
    let mut in_the_middle = stations.split_off(STATIONS);
    for (moved, station) in in_the_middle.iter_mut().zip(&stations) {
        moved.height_m = station.height_m;
    }
    Plane {
        slope_rad,
        spacing_m,
        relief,
        stations,
        in_the_middle,
    }
}

impl Plane {
    fn expected_ugal(&self) -> f64 {
        1e3 * UNIT_MGAL * plane_slope_sector_m(self.slope_rad, 0.0, RADIUS_M, 0.0, TAU)
    }

    fn run(&self, stations: &[Station]) -> Vec<StationEffect> {
        run(&self.relief, stations, &settings(RADIUS_M, &[], 1.0))
    }
}

#[test]
fn a_thousand_stations_on_planes() {
    let planes: Vec<Plane> = (0..PLANES)
        .into_par_iter()
        .map(|k| plane(&mut Random(k as u64), [30.0, 10.0, 3.0, 45.0, 1.5][k % 5]))
        .collect();
    let (mut worst, mut worst_bound, mut far_off) = (0.0_f64, 0.0_f64, 0);
    let mut beyond = Vec::new();
    for spacing in [45.0, 30.0, 10.0, 3.0, 1.5] {
        let (mut worst_here, mut bound_here) = (0.0_f64, 0.0_f64);
        for plane in planes.iter().filter(|p| p.spacing_m == spacing) {
            let expected = plane.expected_ugal();
            for (result, station) in plane.run(&plane.stations).iter().zip(&plane.stations) {
                let error = (1e3 * result.terrain_effect_mgal - expected).abs();
                let bound = 1e3 * result.numeric_bound_mgal;
                if error > bound + 1e-3 {
                    beyond.push(format!(
                        "{:.1} degrees, posts {spacing} m, {station:?}: error {error:.4} uGal of {expected:.2}, bound {bound:.4}",
                        plane.slope_rad.to_degrees()
                    ));
                }
                assert!(
                    error <= 1.0 && bound <= 1.0,
                    "{station:?}: {error} uGal, bound {bound}"
                );
                worst_here = worst_here.max(error);
                bound_here = bound_here.max(bound);
            }
            for result in plane.run(&plane.in_the_middle) {
                far_off += usize::from((1e3 * result.terrain_effect_mgal - expected).abs() > 10.0);
            }
        }
        println!(
            "posts {spacing} m: worst error {worst_here:.5} uGal, worst bound {bound_here:.5} uGal"
        );
        worst = worst.max(worst_here);
        worst_bound = worst_bound.max(bound_here);
    }
    let count = PLANES * STATIONS;
    println!(
        "{count} stations on {PLANES} planes: worst error {worst:.5} uGal, worst bound {worst_bound:.5} uGal; \
         {far_off} would be off by more than 10 uGal in the middle of their cells"
    );
    // what makes the positions count: a program that moves its stations to the middles of cells does not pass
    assert!(far_off > count * 8 / 10, "{far_off}");
    assert!(beyond.is_empty(), "above their bounds: {beyond:#?}");
}

/// The closed form with the complete elliptic integral, from the table of closed forms (high precision), at its slopes and
/// radii: Hammer 1939 gave the equation, Sandberg 1958 tables to 30 degrees (neither table seen).
#[test]
fn tabulated_slopes() {
    let mut found = 0;
    let mut beyond = Vec::new();
    for row in rows("closed_forms.csv") {
        let case = row.text("case");
        if !case.starts_with("infinite plane slope") {
            continue;
        }
        let slope = row.parameter("parameters", "theta").to_radians();
        let radius = if case.contains("disc") {
            row.parameter("parameters", "r")
        } else {
            RADIUS_M
        };
        let expected = if case.contains("disc") {
            -row.number("geom_m")
        } else {
            -row.number("geom_m") * radius
        };
        for spacing in [30.0, 5.0] {
            let posts = Posts::out_to(radius + MARGIN_POSTS * spacing, spacing).turned(0.3);
            let relief = relief(vec![
                SITE.grid(&posts, |x, y| slope.tan() * (0.6 * x + 0.8 * y)),
            ]);
            let mut stations =
                SITE.stations(&[(0.23 * spacing, 0.41 * spacing, 0.0)], Ground::Given);
            put_on_surface(&relief, &mut stations, 0.0);
            let result = &run(&relief, &stations, &settings(radius, &[], 1.0))[0];
            let error = 1e3 * (result.terrain_effect_mgal - UNIT_MGAL * expected);
            println!(
                "{:>5.1} degrees to {radius:>6.2} m, posts {spacing:>4} m: {:>10.3} uGal, error {error:+.4}, bound {:.4}",
                slope.to_degrees(),
                1e3 * UNIT_MGAL * expected,
                1e3 * result.numeric_bound_mgal
            );
            if error.abs() > 1e3 * result.numeric_bound_mgal + 1e-3 {
                beyond.push(format!(
                    "{} posts {spacing} m: {error:.4} uGal",
                    row.text("parameters")
                ));
            }
            found += 1;
        }
    }
    assert_eq!(found, 30);
    assert!(beyond.is_empty(), "above their bounds: {beyond:#?}");
}

/// A station a little above or below the plane, as surveyed heights are: between the two the surface is crossed.
#[test]
fn a_little_off_the_plane() {
    let slope = 35_f64.to_radians();
    let posts = Posts::out_to(150.0, 10.0);
    let grid: Grid = SITE.grid(&posts, |x, _| slope.tan() * x);
    let relief = relief(vec![grid]);
    for offset in [-3.0, -0.1, -1e-6, 1e-6, 1e-3, 0.1, 3.0] {
        let mut stations = SITE.stations(&[(2.3, 4.1, 0.0)], Ground::Given);
        put_on_surface(&relief, &mut stations, offset);
        let result = &run(&relief, &stations, &settings(RADIUS_M, &[], 0.1))[0];
        // by quadrature over azimuth of the ray's integral: with z = d + g s along a ray (d = -offset), s / l has the
        // antiderivative l / A - d g / A^(3/2) asinh((A s + d g) / |d|), A = 1 + g^2
        let n = 20_000;
        let mut sum = 0.0;
        for k in 0..n {
            let g = slope.tan() * (TAU * (f64::from(k) + 0.5) / f64::from(n)).cos();
            let (d, a) = (-offset, 1.0 + g * g);
            let part = |s: f64| {
                (s * s + (d + g * s) * (d + g * s)).sqrt() / a
                    - d * g / a.powf(1.5) * ((a * s + d * g) / d.abs()).asinh()
            };
            sum += RADIUS_M - (part(RADIUS_M) - part(0.0));
        }
        let expected = -1e3 * UNIT_MGAL * sum * TAU / f64::from(n);
        let error = 1e3 * result.terrain_effect_mgal - expected;
        println!(
            "{offset:>9} m above the plane: {expected:.4} uGal, error {error:+.5}, bound {:.5}",
            1e3 * result.numeric_bound_mgal
        );
        assert!(error.abs() <= 1e3 * result.numeric_bound_mgal + 2e-3);
    }
}
