//! What must not change: radii that join, grids posted in another CRS, rows and columns in another order, density, order of
//! stations, threads.

use hillpull_engine::{Ground, Settings, Station, StationEffect, effects};
use hillpull_relief::{Grid, Placement, Relief};
use hillpull_tests::relief_fixtures::{
    Posts, Random, SITE, fractal, put_on_surface, relief, run, settings,
};
use std::f64::consts::FRAC_PI_2;
use std::sync::atomic::AtomicBool;

/// Rough hills, m, at local (x, y).
fn rough(x: f64, y: f64) -> f64 {
    600.0 + 400.0 * fractal(23, 1800.0, 6, 0.5, y + 2e4, x + 2e4)
}

/// Smooth hills, m, at local (x, y).
fn smooth(x: f64, y: f64) -> f64 {
    250.0 * (x / 410.0).sin() * (y / 530.0 + 0.4).cos() + 400.0 * (-(x * x + y * y) / 1.6e6).exp()
}

fn stations(relief: &Relief) -> Vec<Station> {
    let places = [
        (12.3, -45.6),
        (-803.1, 390.2),
        (407.0, 688.8),
        (0.0, 0.0),
        (-55.5, -900.1),
    ];
    let mut stations = SITE.stations(&places.map(|(x, y)| (x, y, 0.0)), Ground::Given);
    put_on_surface(relief, &mut stations, 0.0);
    stations[3].height_m += 35.0;
    stations[4].ground = Ground::Bend;
    stations[4].height_m -= 1.5;
    stations
}

/// T(0, R1) + T(R1, R2) = T(0, R2), the three from runs of their own, on the surface and above it.
#[test]
fn radii_join() {
    let relief = relief(vec![SITE.grid(&Posts::out_to(3600.0, 25.0), rough)]);
    let stations = stations(&relief);
    let outer_m = 3000.0;
    let mut random = Random(20);
    let whole = run(&relief, &stations, &settings(outer_m, &[], 1.0));
    let (mut worst, mut worst_zone) = (0.0_f64, 0.0_f64);
    for _ in 0..20 {
        // as many radii of some cells as of many
        let radius_m = outer_m * random.between(-4.5, -0.01).exp();
        let inner = run(&relief, &stations, &settings(radius_m, &[], 1.0));
        let zones = run(&relief, &stations, &settings(outer_m, &[radius_m], 1.0));
        for ((whole, inner), zones) in whole.iter().zip(&inner).zip(&zones) {
            let sum = 1e3 * (zones.zone_effect_mgal[0] + zones.zone_effect_mgal[1]);
            assert!((sum - 1e3 * zones.terrain_effect_mgal).abs() < 1e-9);
            let bounds = 1e3
                * (whole.numeric_bound_mgal + inner.numeric_bound_mgal + zones.numeric_bound_mgal);
            // the inner part by a run that ends there, the outer part by a run that goes on
            let joined = 1e3
                * (inner.terrain_effect_mgal + zones.zone_effect_mgal[1]
                    - whole.terrain_effect_mgal);
            let zone = 1e3 * (inner.terrain_effect_mgal - zones.zone_effect_mgal[0]);
            worst = worst.max(joined.abs());
            worst_zone = worst_zone.max(zone.abs());
            assert!(
                joined.abs() <= bounds,
                "R1 = {radius_m} m: {joined} uGal, bounds {bounds}"
            );
            assert!(zone.abs() <= bounds, "R1 = {radius_m} m: {zone} uGal");
        }
    }
    println!("20 radii, 5 stations: worst {worst:.4} uGal, of an inner zone {worst_zone:.4} uGal");
}

/// Posts of other CRS about the site, north-up in their own x and y, 2.6 km each way.
fn posted(crs: Option<&str>, spacing: [f64; 2], height_m: impl Fn(f64, f64) -> f64) -> Grid {
    let reach_m = 2600.0;
    let origin = in_crs(crs, SITE.lonlat_deg(&[(0.0, 0.0)])[0]);
    let metres = if crs.is_none() {
        [76_000.0, 111_000.0]
    } else {
        [1.0, 1.0]
    };
    let half = [0, 1].map(|k| (reach_m / metres[k] / spacing[k]).ceil());
    let (rows, cols) = (2 * half[1] as usize + 1, 2 * half[0] as usize + 1);
    let placement = Placement {
        affine: [
            origin.0 - (half[0] + 0.23) * spacing[0],
            spacing[0],
            0.0,
            origin.1 + (half[1] + 0.37) * spacing[1],
            0.0,
            -spacing[1],
        ],
        crs: crs.map(str::to_owned),
    };
    let posts: Vec<[f64; 2]> = (0..rows)
        .flat_map(|r| (0..cols).map(move |c| [r as f64, c as f64]))
        .collect();
    let heights = placement
        .lonlat_rad(&posts)
        .expect("posts")
        .iter()
        .map(|&[lon, lat]| {
            // local coordinates for the relief: any fixed smooth map of longitude and latitude does
            let x = (lon.to_degrees() - SITE.lon_deg) * 76_650.0;
            let y = (lat.to_degrees() - SITE.lat_deg) * 111_160.0;
            height_m(x, y) as f32
        })
        .collect();
    Grid::new("posted", rows, cols, heights, placement)
}

/// Coordinates of a place in a CRS, by solving for them: placements go one way only.
fn in_crs(crs: Option<&str>, (lon_deg, lat_deg): (f64, f64)) -> (f64, f64) {
    if crs.is_none() {
        return (lon_deg, lat_deg);
    }
    let at = |x: f64, y: f64| {
        let placement = Placement {
            affine: [x, 0.0, 0.0, y, 0.0, 0.0],
            crs: crs.map(str::to_owned),
        };
        let [lon, lat] = placement.lonlat_rad(&[[0.0, 0.0]]).expect("a place")[0];
        (
            (lon.to_degrees() - lon_deg) * 76_650.0,
            (lat.to_degrees() - lat_deg) * 111_160.0,
        )
    };
    let (mut x, mut y) = (600_000.0, 5_100_000.0);
    if crs.is_some_and(|c| c.contains("+x_0=0")) {
        (x, y) = (0.0, 0.0);
    }
    for _ in 0..40 {
        let (f, g) = at(x, y);
        let (fx, gx) = at(x + 1.0, y);
        let (fy, gy) = at(x, y + 1.0);
        let (a, b, c, d) = (fx - f, fy - f, gx - g, gy - g);
        let det = a * d - b * c;
        x -= (d * f - b * g) / det;
        y -= (a * g - c * f) / det;
        if f.hypot(g) < 1e-6 {
            return (x, y);
        }
    }
    panic!("{crs:?}: no coordinates found");
}

const OBLIQUE: &str = "+proj=omerc +lat_0=46.5 +lonc=11 +alpha=37 +gamma=0 +k=0.9999 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs +type=crs";

const AZIMUTHAL: &str = "+proj=laea +lat_0=52 +lon_0=10 +x_0=4321000 +y_0=3210000 +datum=WGS84 +units=m +no_defs +type=crs";

/// The same relief posted in longitude and latitude, in UTM, in an oblique Mercator and in an azimuthal projection: as the
/// posts get finer, the effects meet with order 2.
#[test]
fn crs_of_the_posts_does_not_matter() {
    let kinds = [
        ("longitude and latitude", None),
        ("UTM", Some("EPSG:32632")),
        ("oblique Mercator", Some(OBLIQUE)),
        ("azimuthal, far from its middle", Some(AZIMUTHAL)),
    ];
    let settings = settings(2000.0, &[230.0], 0.02);
    let places = [(12.3, -45.6), (-303.1, 190.2), (107.0, 288.8)];
    let mut spreads = Vec::new();
    let spacings = [40.0, 20.0, 10.0];
    for spacing in spacings {
        let mut found: Vec<Vec<f64>> = Vec::new();
        for (name, crs) in kinds {
            let steps = if crs.is_none() {
                [spacing / 76_650.0, spacing / 111_160.0]
            } else {
                [spacing, spacing]
            };
            let relief = relief(vec![posted(crs, steps, smooth)]);
            let mut stations = SITE.stations(&places.map(|(x, y)| (x, y, 0.0)), Ground::Given);
            for station in &mut stations {
                let x = (station.lon_deg - SITE.lon_deg) * 76_650.0;
                let y = (station.lat_deg - SITE.lat_deg) * 111_160.0;
                // well above the ground: what the posts miss right below it is another matter
                station.height_m = smooth(x, y) + 15.0;
            }
            let effects: Vec<f64> = run(&relief, &stations, &settings)
                .iter()
                .map(|r| 1e3 * r.terrain_effect_mgal)
                .collect();
            println!("posts {spacing} m, {name}: {effects:.3?} uGal");
            found.push(effects);
        }
        let spread = (0..places.len())
            .map(|k| {
                let all = found.iter().map(|f| f[k]);
                all.clone().fold(f64::MIN, f64::max) - all.fold(f64::MAX, f64::min)
            })
            .fold(0.0, f64::max);
        println!("posts {spacing} m: spread {spread:.4} uGal");
        spreads.push(spread);
    }
    assert!(spreads[2] < 1.0, "{spreads:?}");
    assert!(
        spreads[1] < 0.5 * spreads[0] && spreads[2] < 0.5 * spreads[1],
        "{spreads:?}"
    );
}

/// The same posts in another order: rows upside down, columns from the east, rows for columns; and with posts added between,
/// on the bilinear surface. The surface is the same, so the effects are, within their bounds.
#[test]
fn order_of_rows_and_columns_does_not_matter() {
    let posts = Posts::over([-2900.0, 3300.0], [-2750.0, 3050.0], 25.0);
    // heights in 1/1024 m, which a float holds at the posts between as well
    let plain = SITE.grid(&posts, |x, y| (1024.0 * rough(x, y)).round() / 1024.0);
    let (rows, cols) = (posts.rows, posts.cols);
    let a = posts.affine;
    let reordered = |rows: usize,
                     cols: usize,
                     affine: [f64; 6],
                     from: &dyn Fn(usize, usize) -> (usize, usize)| {
        let mut grid = plain.clone();
        grid.rows = rows;
        grid.cols = cols;
        grid.placement.affine = affine;
        grid.heights_m = (0..rows)
            .flat_map(|r| (0..cols).map(move |c| (r, c)))
            .map(|(r, c)| {
                let (r, c) = from(r, c);
                plain.heights_m[r * plain.cols + c]
            })
            .collect();
        grid
    };
    let (down, across) = ((rows - 1) as f64, (cols - 1) as f64);
    let south_up = [
        a[0] + down * a[2],
        a[1],
        -a[2],
        a[3] + down * a[5],
        a[4],
        -a[5],
    ];
    let mirrored = [
        a[0] + across * a[1],
        -a[1],
        a[2],
        a[3] + across * a[4],
        -a[4],
        a[5],
    ];
    let transposed = [a[0], a[2], a[1], a[3], a[5], a[4]];
    let denser = {
        let step = |k: usize| if k == 0 || k == 3 { a[k] } else { 0.5 * a[k] };
        let affine = [0, 1, 2, 3, 4, 5].map(step);
        let mut grid = reordered(2 * rows - 1, 2 * cols - 1, affine, &|r, c| (r / 2, c / 2));
        for r in 0..grid.rows {
            for c in 0..grid.cols {
                let post = |r: usize, c: usize| plain.heights_m[r * cols + c];
                let (up, down) = (r / 2, r.div_ceil(2));
                let (left, right) = (c / 2, c.div_ceil(2));
                grid.heights_m[r * (2 * cols - 1) + c] = 0.25
                    * (post(up, left) + post(up, right) + post(down, left) + post(down, right));
            }
        }
        grid
    };
    let grids = [
        (
            "south up",
            reordered(rows, cols, south_up, &|r, c| (rows - 1 - r, c)),
        ),
        (
            "from the east",
            reordered(rows, cols, mirrored, &|r, c| (r, cols - 1 - c)),
        ),
        (
            "rows for columns",
            reordered(cols, rows, transposed, &|r, c| (c, r)),
        ),
        ("posts between", denser),
    ];
    let base = relief(vec![plain.clone()]);
    let mut stations = stations(&base);
    // the bending radius may depend on the posts' spacing
    stations[4].ground = Ground::Given;
    let settings = settings(2500.0, &[100.0, 1000.0], 0.5);
    let expected = run(&base, &stations, &settings);
    let mut worst = 0.0_f64;
    for (name, grid) in grids {
        for (found, expected) in run(&relief(vec![grid]), &stations, &settings)
            .iter()
            .zip(&expected)
        {
            let change = 1e3 * (found.terrain_effect_mgal - expected.terrain_effect_mgal).abs();
            let bounds = 1e3 * (found.numeric_bound_mgal + expected.numeric_bound_mgal);
            println!(
                "{name}: {:.3} uGal, change {change:.5}, bounds {bounds:.4}",
                1e3 * expected.terrain_effect_mgal
            );
            assert!(change <= bounds, "{name}: {change} uGal, bounds {bounds}");
            assert!((found.dem_height_m - expected.dem_height_m).abs() < 1e-6);
            worst = worst.max(change);
        }
    }
    println!("largest change {worst:.5} uGal");
}

/// The relief turned about the station, hills and all: a rotation of the grid's affine map, seen from the same point.
#[test]
fn relief_turned_about_the_station() {
    let posts = Posts::out_to(1500.0, 20.0).moved(7.0, -3.0);
    let mut expected = f64::NAN;
    for quarter in 0..8 {
        let turned = posts.turned(0.5 * FRAC_PI_2 * f64::from(quarter));
        let grid = SITE.grid_of_posts(&turned, |row, col| {
            let (x, y) = posts.xy(row as f64, col as f64);
            rough(x, y) - 600.0
        });
        let relief = relief(vec![grid]);
        let mut station = SITE.stations(&[(0.0, 0.0, 0.0)], Ground::Given);
        put_on_surface(&relief, &mut station, 0.0);
        let result = &run(&relief, &station, &settings(1000.0, &[], 0.1))[0];
        let found = 1e3 * result.terrain_effect_mgal;
        if quarter == 0 {
            expected = found;
        }
        println!(
            "turned by {:>3} degrees: {found:.4} uGal, bound {:.4}",
            45 * quarter,
            1e3 * result.numeric_bound_mgal
        );
        // M and N differ by 0.3 % at the site: up to 0.3 % of what curvature does within 1 km, 0.01 uGal
        assert!((found - expected).abs() <= 2e3 * result.numeric_bound_mgal + 0.01);
    }
}

/// Effects are proportional to the density and to G.
#[test]
fn density_scales() {
    let relief = relief(vec![SITE.grid(&Posts::out_to(3000.0, 30.0), rough)]);
    let stations = stations(&relief);
    let base = settings(2500.0, &[230.0], 1.0);
    let reference = run(&relief, &stations, &base);
    for factor in [0.5, 0.9, 1.0 / 3.0, 2.0, -1.0] {
        for by_g in [false, true] {
            if by_g && factor < 0.0 {
                continue;
            }
            let mut settings = base.clone();
            // the tolerance is absolute: it goes along, so that the same walk is made
            settings.tolerance_mgal *= f64::abs(factor);
            if by_g {
                settings.big_g *= factor;
            } else {
                settings.density_kg_m3 *= factor;
            }
            for (result, reference) in run(&relief, &stations, &settings).iter().zip(&reference) {
                let all = |r: &StationEffect| {
                    let mut v = vec![r.terrain_effect_mgal, r.topography_mgal];
                    v.extend(&r.zone_effect_mgal);
                    v
                };
                for (found, expected) in all(result).iter().zip(all(reference)) {
                    let error = (found - factor * expected).abs();
                    assert!(
                        error <= 1e-12 * expected.abs(),
                        "{factor}: {found} {expected}"
                    );
                }
            }
        }
    }
}

fn bits(results: &[StationEffect]) -> Vec<u64> {
    results
        .iter()
        .flat_map(|r| {
            let mut v = vec![
                r.terrain_effect_mgal,
                r.topography_mgal,
                r.numeric_bound_mgal,
                r.dem_height_m,
                r.height_misfit_m,
                r.covered,
            ];
            v.extend(&r.zone_effect_mgal);
            v.extend(&r.zone_covered);
            v.into_iter()
                .map(f64::to_bits)
                .chain([r.evaluations, r.layer as u64])
        })
        .collect()
}

/// Every bit of every result is the same for any number of threads (also those that build the relief), any order of the
/// stations, and each station alone.
#[test]
fn threads_and_order_bit_for_bit() {
    let mut random = Random(99);
    let xyh: Vec<_> = (0..150)
        .map(|_| {
            (
                random.between(-900.0, 900.0),
                random.between(-900.0, 900.0),
                0.0,
            )
        })
        .collect();
    let grids = || {
        let fine = SITE.grid(&Posts::out_to(700.0, 10.0).turned(0.3), |x, y| {
            rough(x, y) + 3.0
        });
        let coarse = SITE.grid(&Posts::out_to(4500.0, 50.0), rough);
        vec![fine, coarse]
    };
    let settings: Settings = settings(3000.0, &[230.0, 1000.0], 1.0);
    let mut stations = SITE.stations(&xyh, Ground::Bend);
    put_on_surface(&relief(grids()), &mut stations, 0.7);
    let with = |threads: usize| {
        rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("a pool")
            .install(|| bits(&run(&relief(grids()), &stations, &settings)))
    };
    let one = with(1);
    for threads in [2, 3, 7] {
        assert!(with(threads) == one, "{threads} threads");
    }
    // shuffled
    let relief = relief(grids());
    let mut order: Vec<usize> = (0..stations.len()).collect();
    for k in (1..order.len()).rev() {
        order.swap(k, random.below(k + 1));
    }
    let shuffled: Vec<Station> = order.iter().map(|&k| stations[k]).collect();
    let results = run(&relief, &shuffled, &settings);
    let mut back = results.clone();
    for (result, &k) in results.into_iter().zip(&order) {
        back[k] = result;
    }
    assert!(bits(&back) == one, "another order");
    // alone, and twice in one run
    for k in [0, 17, 149] {
        let pair = effects(
            &relief,
            &[stations[k], stations[k]],
            &settings,
            &|_| (),
            &AtomicBool::new(false),
        );
        for result in pair {
            let result = result.expect("a result");
            assert!(bits(&[result]) == bits(&back[k..=k]), "station {k} alone");
        }
    }
}
