//! The numeric bound: never above the tolerance, never below the true error, on rough relief and where things are nearly
//! degenerate.
//!
//! The truth is the slow integration of every cell, on the same bilinear surface posted more densely: that changes nothing
//! of the surface, but makes the slow way finer.

#![expect(
    clippy::print_stdout,
    reason = "the table of errors is what a reader of the test wants"
)]

use hillpull_engine::{Ground, Settings, Station, brute_force};
use hillpull_relief::{Grid, Relief};
use hillpull_tests::relief_fixtures::{
    Posts, Random, SITE, fractal, put_on_surface, relief, run, settings,
};

const ROWS: usize = 131;
const COLS: usize = 140;

/// Heights at (row, column) of a DEM of 131 x 140 posts: tiles of 64 cells, the last ones cut by the hull.
type Heights = Box<dyn Fn(usize, usize) -> f64>;

/// The grid, its bilinear surface posted `times` as densely.
fn grid(heights: &Heights, spacing_m: f64, turn_rad: f64, times: usize) -> Grid {
    let step = spacing_m / times as f64;
    let (rows, cols) = ((ROWS - 1) * times + 1, (COLS - 1) * times + 1);
    let posts = Posts {
        rows,
        cols,
        affine: [-70.0 * spacing_m, step, 0.0, 65.0 * spacing_m, 0.0, -step],
    };
    // heights that a float holds at all densities
    let at = |row: usize, col: usize| 1.0 / 1024.0 * (1024.0 * heights(row, col)).round();
    SITE.grid_of_posts(&posts.turned(turn_rad), |row, col| {
        let (r, c) = ((row / times).min(ROWS - 2), (col / times).min(COLS - 2));
        let (v, u) = (
            (row - r * times) as f64 / times as f64,
            (col - c * times) as f64 / times as f64,
        );
        (1.0 - v) * ((1.0 - u) * at(r, c) + u * at(r, c + 1))
            + v * ((1.0 - u) * at(r + 1, c) + u * at(r + 1, c + 1))
    })
}

struct Case {
    name: &'static str,
    heights: Heights,
    spacing_m: f64,
    turn_rad: f64,
    /// Row and column of the station, in posts.
    row: f64,
    col: f64,
    above_m: f64,
    ground: Ground,
    radius_m: f64,
}

fn rough(seed: u64, slope: f64, spacing_m: f64) -> Heights {
    Box::new(move |row, col| {
        10.0 * slope * spacing_m * fractal(seed, 40.0, 6, 0.55, row as f64, col as f64)
    })
}

fn places(random: &mut Random) -> Vec<(&'static str, f64, f64)> {
    let tiny = 1e-9;
    vec![
        (
            "anywhere",
            random.between(58.0, 72.0),
            random.between(60.0, 80.0),
        ),
        ("on a post", 61.0, 70.0),
        ("on a cell's edge", 61.0, 70.3),
        ("just off a cell's edge", 61.0 + tiny, 70.3),
        ("just off a post", 61.0 - tiny, 70.0 + tiny),
        ("on a tile's border", 64.0, 70.4),
        ("just off a tile's border", 64.0 - tiny, 70.4),
        ("on a tile's corner", 64.0, 64.0),
        ("near the hull", 129.4, 77.3),
        ("on the hull", 130.0, 77.3),
        ("at the DEM's corner", 0.0, 0.0),
    ]
}

fn cases() -> Vec<Case> {
    let mut random = Random(7);
    let mut cases = Vec::new();
    for (k, slope) in [0.15, 0.5, 1.2].into_iter().enumerate() {
        for (name, row, col) in places(&mut random) {
            let spacing_m = random.between(10.0, 90.0);
            let (ground, above_m) = [
                (Ground::Given, 0.0),
                (Ground::Given, 1e-6),
                (Ground::Bend, random.between(-3.0, 3.0)),
                (Ground::Given, random.between(-3.0, 3.0)),
                (Ground::Settle, 5.0),
                (Ground::Given, 150.0),
            ][random.below(6)];
            cases.push(Case {
                name,
                heights: rough(random.bits(), slope, spacing_m),
                spacing_m,
                turn_rad: random.between(0.0, 6.0),
                row,
                col,
                above_m,
                ground,
                radius_m: spacing_m * [40.0, 25.3, 50.0][k],
            });
        }
    }
    for (name, above_m) in [
        ("flat", 0.0),
        ("flat, just above", 1e-6),
        ("flat, in the air", 40.0),
    ] {
        cases.push(Case {
            name,
            heights: Box::new(|_, _| 812.0),
            spacing_m: 30.0,
            turn_rad: 0.4,
            row: 60.3,
            col: 70.4,
            above_m,
            ground: Ground::Given,
            radius_m: 900.0,
        });
    }
    cases
}

/// A face between two plains, one cell of 30 m wide: 45 to 88 degrees.
fn faces() -> Vec<Case> {
    let mut faces = Vec::new();
    for height in [30.0, 100.0, 300.0, 1000.0] {
        for (name, col, above_m) in [
            ("foot of a face", 68.9, 0.0),
            ("edge of a face", 70.0, 0.0),
            ("middle of a face", 69.5, 0.0),
            ("low in a face", 69.1, 1e-6),
        ] {
            faces.push(Case {
                name,
                heights: Box::new(move |_, col| if col > 69 { height } else { 0.0 }),
                spacing_m: 30.0,
                turn_rad: 0.4,
                row: 60.3,
                col,
                above_m,
                ground: Ground::Given,
                radius_m: 300.0,
            });
        }
    }
    faces
}

impl Case {
    fn station(&self, relief: &Relief) -> Station {
        let posts = Posts {
            rows: ROWS,
            cols: COLS,
            affine: [
                -70.0 * self.spacing_m,
                self.spacing_m,
                0.0,
                65.0 * self.spacing_m,
                0.0,
                -self.spacing_m,
            ],
        };
        let (x, y) = posts.turned(self.turn_rad).xy(self.row, self.col);
        let mut stations = SITE.stations(&[(x, y, 0.0)], self.ground);
        put_on_surface(relief, &mut stations, self.above_m);
        stations[0]
    }
}

/// What the slow way itself may miss, uGal: more on a face, where the surface runs past the station's level in a cell.
const SLOW_UGAL: f64 = 0.02;
const SLOW_ON_FACES_UGAL: f64 = 0.1;

/// Runs the cases at two tolerances; returns those above their bounds, and bound over error at 1 uGal.
fn against_the_slow_way(cases: &[Case], times: usize, slow_ugal: f64) -> (Vec<String>, Vec<f64>) {
    let (mut beyond, mut ratios) = (Vec::new(), Vec::new());
    for case in cases {
        let ours = relief(vec![grid(&case.heights, case.spacing_m, case.turn_rad, 1)]);
        let dense = relief(vec![grid(
            &case.heights,
            case.spacing_m,
            case.turn_rad,
            times,
        )]);
        let station = case.station(&ours);
        // the bending radius must not depend on the posts
        let settings_at = |tolerance| Settings {
            bend_radius_m: 4.0 * case.spacing_m,
            ..settings(case.radius_m, &[], tolerance)
        };
        let truth: f64 = brute_force(&dense, &station, &settings_at(1.0))
            .expect("a covered station")
            .iter()
            .sum();
        for tolerance in [1.0, 0.1] {
            let result = &run(&ours, &[station], &settings_at(tolerance))[0];
            let error = 1e3 * (result.terrain_effect_mgal - truth).abs();
            let bound = 1e3 * result.numeric_bound_mgal;
            let line = format!(
                "{:<24} posts {:.0} m, {:?} {:+.2} m: {:>10.2} uGal, tolerance {tolerance}: error {error:.4}, bound {bound:.4}",
                case.name,
                case.spacing_m,
                case.ground,
                case.above_m,
                1e3 * truth,
            );
            println!("{line}");
            assert!(bound <= tolerance, "{line}");
            if error > bound + slow_ugal {
                beyond.push(line);
            }
            if tolerance == 1.0 {
                ratios.push(bound / error.max(slow_ugal));
            }
        }
    }
    (beyond, ratios)
}

#[test]
fn bound_holds_on_rough_relief() {
    let cases = cases();
    let (beyond, mut ratios) = against_the_slow_way(&cases, 2, SLOW_UGAL);
    ratios.sort_by(f64::total_cmp);
    let median = ratios[ratios.len() / 2];
    println!(
        "{} cases, bound over error, median: {median:.1}",
        cases.len()
    );
    assert!(beyond.is_empty(), "above their bounds: {beyond:#?}");
    // useful: not more than about ten times the error
    assert!(median < 10.0, "{median}");
}

#[test]
fn bound_holds_on_faces() {
    let (beyond, _) = against_the_slow_way(&faces(), 4, SLOW_ON_FACES_UGAL);
    assert!(beyond.is_empty(), "above their bounds: {beyond:#?}");
}

/// A DEM that ends just beyond the outer radius: nodes across the edge are themselves cut by the hull.
#[test]
fn hull_just_beyond_the_outer_radius() {
    let mut beyond = Vec::new();
    let spacing_m = 12.5;
    for (name, radius) in [
        ("Gaussian hill", 2000.0),
        ("Gaussian hill", 2012.0),
        ("plane", 2010.0),
    ] {
        let surface = |x: f64, y: f64| {
            if name == "plane" {
                0.3 * x
            } else {
                100.0 * (-0.5 * (x * x + y * y) / 4e4).exp()
            }
        };
        let posts = Posts::out_to(2025.0, spacing_m);
        let relief = relief(vec![SITE.grid(&posts, surface)]);
        let mut stations = SITE.stations(&[(0.0, 0.0, 0.0), (4.7, -7.1, 0.0)], Ground::Given);
        put_on_surface(&relief, &mut stations, 0.0);
        for station in &stations {
            for tolerance in [1.0, 0.1] {
                let settings = settings(radius, &[], tolerance);
                let truth: f64 = brute_force(&relief, station, &settings)
                    .expect("covered")
                    .iter()
                    .sum();
                let result = &run(&relief, &[*station], &settings)[0];
                let error = 1e3 * (result.terrain_effect_mgal - truth).abs();
                let bound = 1e3 * result.numeric_bound_mgal;
                let line = format!(
                    "{name} to {radius} m, tolerance {tolerance}: {:.2} uGal, error {error:.4}, bound {bound:.4}",
                    1e3 * truth
                );
                println!("{line}");
                if error > bound + SLOW_UGAL {
                    beyond.push(line);
                }
            }
        }
    }
    assert!(beyond.is_empty(), "above their bounds: {beyond:#?}");
}

/// Where the DEM covers the whole disc, `covered` says so, whatever the ground's shape.
#[test]
fn covered_is_whole() {
    let shapes: [(&str, Heights); 3] = [
        ("flat at station level", Box::new(|_, _| 0.0)),
        ("nearly flat", Box::new(|row, _| 0.01 * row as f64)),
        ("rough", rough(3, 0.5, 20.0)),
    ];
    for (name, heights) in &shapes {
        let relief = relief(vec![grid(heights, 20.0, 0.2, 1)]);
        let mut stations = SITE.stations(&[(3.0, 4.0, 0.0)], Ground::Given);
        put_on_surface(&relief, &mut stations, 0.0);
        let result = &run(&relief, &stations, &settings(1100.0, &[100.0, 500.0], 1.0))[0];
        println!(
            "{name}: covered {} by zone {:?}",
            result.covered, result.zone_covered
        );
        assert!(result.covered > 0.999, "{name}: {}", result.covered);
        for zone in &result.zone_covered {
            assert!(*zone > 0.995, "{name}: {:?}", result.zone_covered);
        }
    }
}
