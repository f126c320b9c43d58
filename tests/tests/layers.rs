//! Several DEMs, the first that covers a place supplying it: nested layers of different CRS, with voids, against the slow
//! integration; reliefs cut into layers that must be the same as whole; a block with a closed form.

use hillpull_engine::{Ground, Station, brute_force};
use hillpull_physics::bodies::prism::prism_m;
use hillpull_relief::{Grid, Placement, Relief};
use hillpull_tests::relief_fixtures::{
    Posts, Random, SITE, UNIT_MGAL, fractal, put_on_surface, relief, run, settings,
};

/// Rough hills, m, at local (x, y).
fn hills(x: f64, y: f64) -> f64 {
    900.0 + 300.0 * fractal(11, 2400.0, 5, 0.5, y + 1e4, x + 1e4)
}

/// A coarse layer in longitude and latitude, 100 m posts, 5 km each way, 20 m lower than the hills.
fn geographic() -> Grid {
    let (step_lon, step_lat) = (0.0013, 0.0009);
    let middle = 50_usize;
    let mut heights = Vec::new();
    for row in 0..=2 * middle {
        for col in 0..=2 * middle {
            let (dx, dy) = (col as f64 - middle as f64, middle as f64 - row as f64);
            heights.push((hills(100.0 * dx, 100.0 * dy) - 20.0) as f32);
        }
    }
    let placement = Placement {
        affine: [
            SITE.lon_deg - middle as f64 * step_lon,
            step_lon,
            0.0,
            SITE.lat_deg + middle as f64 * step_lat,
            0.0,
            -step_lat,
        ],
        crs: None,
    };
    Grid::new(
        "geographic",
        2 * middle + 1,
        2 * middle + 1,
        heights,
        placement,
    )
}

/// A middle layer in UTM, 35 m posts, rows turned, with a void in it, a notch at its edge and an island in a hole.
fn utm() -> Grid {
    // easting and northing of 11.004 E, 46.497 N in zone 32
    let (x0, y0) = (653_778.0, 5_151_221.0);
    let (rows, cols, step) = (91, 81, 35.0);
    let (sin, cos) = 0.5_f64.sin_cos();
    let mut heights = Vec::new();
    for row in 0..rows {
        for col in 0..cols {
            let (dx, dy) = (
                step * (f64::from(col) - 40.0),
                step * (45.0 - f64::from(row)),
            );
            let hole = (28..40).contains(&row)
                && (50..64).contains(&col)
                && !((32..35).contains(&row) && (55..58).contains(&col));
            let void = hole || (row < 8 && col > 70);
            heights.push(if void {
                f32::NAN
            } else {
                hills(300.0 + cos * dx - sin * dy, -330.0 + sin * dx + cos * dy) as f32
            });
        }
    }
    let placement = Placement {
        affine: [
            x0 - step * (40.0 * cos + 45.0 * sin),
            step * cos,
            step * sin,
            y0 - step * (40.0 * sin - 45.0 * cos),
            step * sin,
            -step * cos,
        ],
        crs: Some("EPSG:32632".to_owned()),
    };
    Grid::new("utm", rows as usize, cols as usize, heights, placement)
}

/// The finest layer, 9 m posts about the site, with a void near its middle.
fn fine() -> Grid {
    let posts = Posts::out_to(450.0, 9.0).turned(-0.3);
    SITE.grid_of_posts(&posts, |row, col| {
        if (58..63).contains(&row) && (60..66).contains(&col) {
            f64::NAN
        } else {
            let (x, y) = posts.xy(row as f64, col as f64);
            hills(x, y) + 5.0
        }
    })
}

fn slow_ugal(relief: &Relief, station: &Station, radius_m: f64, edges: &[f64]) -> Vec<f64> {
    brute_force(relief, station, &settings(radius_m, edges, 1.0))
        .expect("covered")
        .into_iter()
        .map(|v| 1e3 * v)
        .collect()
}

/// What the slow integration may miss across seams and edges, uGal.
const SLOW_UGAL: f64 = 0.05;

#[test]
fn two_and_three_layers_with_voids() {
    let stacks = [
        ("fine over geographic", vec![fine(), geographic()]),
        (
            "fine over UTM over geographic",
            vec![fine(), utm(), geographic()],
        ),
    ];
    // in the fine layer, in its void, at its seam, in the middle layer, in its hole and on the island, in the coarse one
    let places = [
        (-120.0, 80.0),
        (33.0, 7.0),
        (-4.0, 12.0),
        (443.0, 131.0),
        (520.0, -560.0),
        (840.0, 160.0),
        (-1900.0, 900.0),
    ];
    let (radius_m, edges) = (3000.0, [400.0]);
    for (name, grids) in stacks {
        let relief = relief(grids);
        let xyh = places.map(|(x, y)| (x, y, 0.0));
        let mut stations = SITE.stations(&xyh, Ground::Given);
        put_on_surface(&relief, &mut stations, 0.0);
        let results = run(&relief, &stations, &settings(radius_m, &edges, 1.0));
        for ((result, station), place) in results.iter().zip(&stations).zip(&places) {
            let slow = slow_ugal(&relief, station, radius_m, &edges);
            let total: f64 = slow.iter().sum();
            let error = 1e3 * result.terrain_effect_mgal - total;
            let bound = 1e3 * result.numeric_bound_mgal;
            println!(
                "{name}, station at {place:?} in layer {}: {total:.3} uGal, error {error:+.4}, bound {bound:.4}, covered {:.6}",
                result.layer, result.covered
            );
            assert!(error.abs() <= bound + SLOW_UGAL && bound <= 1.0);
            for (zone, slow) in result.zone_effect_mgal.iter().zip(&slow) {
                assert!((1e3 * zone - slow).abs() < 1.0, "{place:?}: {zone} {slow}");
            }
            // all of it is covered by one layer or another
            assert!(result.covered > 0.9995, "{place:?}: {}", result.covered);
        }
    }
}

/// The posts of a grid from (row, col), as a grid of its own.
fn window(whole: &Grid, rows: [usize; 2], cols: [usize; 2]) -> Grid {
    let mut heights = Vec::new();
    for row in rows[0]..=rows[1] {
        heights.extend(&whole.heights_m[row * whole.cols + cols[0]..=row * whole.cols + cols[1]]);
    }
    let mut placement = whole.placement.clone();
    let [x, y] = whole.placement.xy(rows[0] as f64, cols[0] as f64);
    placement.affine[0] = x;
    placement.affine[3] = y;
    Grid::new(
        "window",
        rows[1] - rows[0] + 1,
        cols[1] - cols[0] + 1,
        heights,
        placement,
    )
}

/// The same surface whole, cut into an inner and an outer DEM of the same posts, and with a void that the next layer fills.
#[test]
fn cut_reliefs_are_the_same_as_whole() {
    let posts = Posts::out_to(2500.0, 20.0).turned(0.2);
    let whole = SITE.grid(&posts, hills);
    let inner = window(&whole, [97, 161], [80, 170]);
    let island = window(&whole, [100, 130], [100, 133]);
    let mut holed = whole.clone();
    let mut random = Random(3);
    for _ in 0..25 {
        let (row, col) = (random.below(whole.rows), random.below(whole.cols));
        for r in row..(row + 7).min(whole.rows) {
            for c in col..(col + 9).min(whole.cols) {
                holed.heights_m[r * whole.cols + c] = f32::NAN;
            }
        }
    }
    let reliefs = [
        ("whole", relief(vec![whole.clone()])),
        (
            "inner over whole",
            relief(vec![inner.clone(), whole.clone()]),
        ),
        ("three nested", relief(vec![island, inner, whole.clone()])),
        ("voids filled", relief(vec![holed, whole])),
    ];
    let places = [(0.0, 0.0), (133.7, -48.1), (-310.0, 220.0), (612.0, 505.0)];
    let xyh = places.map(|(x, y)| (x, y, 0.0));
    let mut stations = SITE.stations(&xyh, Ground::Given);
    put_on_surface(&reliefs[0].1, &mut stations, 0.0);
    let mut worst = 0.0_f64;
    let settings = settings(1500.0, &[230.0], 0.002);
    let reference = run(&reliefs[0].1, &stations, &settings);
    for (name, relief) in &reliefs[1..] {
        for ((result, whole), place) in run(relief, &stations, &settings)
            .iter()
            .zip(&reference)
            .zip(&places)
        {
            let change = 1e3 * (result.terrain_effect_mgal - whole.terrain_effect_mgal);
            println!(
                "{name}, {place:?}: {:.4} uGal, change {change:+.5}, covered {:.8}",
                1e3 * whole.terrain_effect_mgal,
                result.covered
            );
            worst = worst.max(change.abs());
            assert!(result.covered > 0.9995);
            assert!((result.height_misfit_m).abs() < 1e-3);
        }
    }
    println!("largest change {worst:.5} uGal");
    assert!(worst < 0.01, "{worst}");
}

/// A flat DEM over another flat one of another CRS, and rows across each other: a block with the prism's closed form
/// (Nagy 1966, recalled from memory, tested elsewhere), its footprint the hull of the upper DEM's posts. To each attraction
/// what the plain alone has is common and is taken off.
#[test]
fn a_block_on_a_plain() {
    let plain = || {
        let mut grid = geographic();
        grid.heights_m.fill(-60.0);
        grid
    };
    let (width, depth, turn) = (600.0, 300.0, 0.7_f64);
    let places = [(0.0, 0.0), (200.0, 100.0), (320.0, 20.0), (-700.0, 300.0)];
    for (spacing, top) in [(30.0, -10.0), (30.0, 45.0), (7.5, -59.0), (150.0, -200.0)] {
        let straight = Posts::over(
            [-0.5 * width, 0.5 * width],
            [-0.5 * depth, 0.5 * depth],
            spacing,
        );
        let block = SITE.grid(&straight.turned(turn), |_, _| top);
        let both = relief(vec![block, plain()]);
        let alone = relief(vec![plain()]);
        let (sin, cos) = turn.sin_cos();
        let xyh = places.map(|(x, y)| (x * cos - y * sin, x * sin + y * cos, 0.0));
        let stations = SITE.stations(&xyh, Ground::Given);
        let settings = settings(3000.0, &[], 0.05);
        let with = run(&both, &stations, &settings);
        let without = run(&alone, &stations, &settings);
        for (k, &(x, y)) in places.iter().enumerate() {
            let found = with[k].terrain_effect_mgal - without[k].terrain_effect_mgal;
            let x_m = [-0.5 * width - x, 0.5 * width - x];
            let y_m = [-0.5 * depth - y, 0.5 * depth - y];
            let (low, high) = if top > -60.0 {
                (-60.0, top)
            } else {
                (top, -60.0)
            };
            let prism = prism_m(x_m, y_m, [low, high]) * if top > -60.0 { 1.0 } else { -1.0 };
            // what curvature adds to the block, with the block's outline
            let inside = |s: f64, azimuth: f64| {
                let (u, v) = (x + s * azimuth.cos(), y + s * azimuth.sin());
                u.abs() < 0.5 * width && v.abs() < 0.5 * depth
            };
            let panels: Vec<f64> = (1..=60).map(|k| 20.0 * f64::from(k)).collect();
            let curved = SITE.curvature_m(&panels, |s, a| if inside(s, a) { top } else { -60.0 })
                - SITE.curvature_m(&panels, |_, _| -60.0);
            let expected = UNIT_MGAL * (prism + curved);
            let error = 1e3 * (found - expected);
            println!(
                "block from -60 to {top} m, posts {spacing} m, station {:?}: {:.3} uGal, curvature {:+.4}, error {error:+.4}",
                places[k],
                1e3 * expected,
                1e3 * UNIT_MGAL * curved
            );
            assert!(error.abs() < 0.1, "{error}");
        }
    }
}
