//! Hills in closed form through real DEMs, at posts finer and finer: the error falls with the order that the shape allows.
//!
//! A bilinear surface through posts s apart misses a smooth one by up to s^2/8 of its second derivative: order 2. A tip (the
//! cone's) looks the same at every spacing: what is missed there is worth an area s^2, times a slope error that does not
//! fall, over s: order 1. A crease along a line is missed by a share of s over a band s wide: order 2. At the vertical rim of
//! the hemisphere the surface is missed by sqrt(2 a s) over a band s wide. Linear interpolation has the right volume on
//! average over how the posts fall, so that what is left of order is the square, 2 a s over a band s wide: order 2, but with
//! scatter from one grid to the next. Errors are root mean squares over orientations of the grid.
//!
//! The closed forms are for a flat Earth, derived and checked in high precision beside the tables they are read from. The
//! tables' hills are scaled down (a flat form is proportional to its size), the station stands at height 0, and what
//! curvature adds is put in to first order (`Site::curvature_m`, with its derivation).

#![expect(
    clippy::print_stdout,
    reason = "the table of errors is what a reader of the test wants"
)]

use hillpull_engine::Ground;
use hillpull_tests::published::{Row, rows};
use hillpull_tests::relief_fixtures::{
    Posts, SITE, UNIT_MGAL, order, put_on_surface, relief, run, settings,
};
use std::f64::consts::{PI, TAU};

/// What is expected of one ring of a hill.
struct Part {
    to_m: f64,
    /// Effect per unit of `G rho`, m.
    expected_m: f64,
    /// Order of convergence, from and to.
    order: [f64; 2],
    /// Largest error at the finest spacing, uGal.
    finest_ugal: f64,
}

struct Hill {
    name: &'static str,
    /// Height above the foot at distance r.
    height_m: Box<dyn Fn(f64) -> f64>,
    /// Station above the foot, on the axis.
    station_m: f64,
    spacings_m: [f64; 4],
    /// Distances where the profile bends, to the outer radius.
    panels_m: Vec<f64>,
    parts: Vec<Part>,
}

fn part(to_m: f64, expected_m: f64, order: [f64; 2], finest_ugal: f64) -> Part {
    Part {
        to_m,
        expected_m,
        order,
        finest_ugal,
    }
}

/// The row of a table with this case and these parameters.
fn row(file: &str, column: &str, case: &str, parameters: &str) -> Row {
    rows(file)
        .into_iter()
        .find(|r| r.text(column).starts_with(case) && r.text("parameters") == parameters)
        .unwrap_or_else(|| panic!("{file}: no {case}, {parameters}"))
}

fn geometry_m(case: &str, parameters: &str) -> f64 {
    row("closed_forms.csv", "case", case, parameters).number("geom_m")
}

/// Disc of radius `r` and thickness `h` right below the station.
fn disc_m(r: f64, h: f64) -> f64 {
    TAU * (r + h - r.hypot(h))
}

const SCALE: f64 = 0.1;
const SMOOTH: [f64; 2] = [1.8, 2.2];
const CREASE: [f64; 2] = [1.6, 2.4];
const TIP: [f64; 2] = [0.9, 1.1];
const RIM: [f64; 2] = [1.4, 2.6];

fn cone() -> [Hill; 2] {
    let (radius, height) = (1000.0 * SCALE, 300.0 * SCALE);
    let case = "R=1000.0 H=300.0";
    let apex = -SCALE * geometry_m("TC at summit of cone, terrain r<=R", case);
    let base = -SCALE * geometry_m("cone, station at base centre", case);
    // the effect at the apex is proportional to the distance: 2 pi r (1 - cos slope)
    let near = 0.2;
    let hill = |name, station_m, panels_m, parts| Hill {
        name,
        height_m: Box::new(move |r| height * (1.0 - r / radius).max(0.0)),
        station_m,
        spacings_m: [10.0, 5.0, 2.5, 1.25],
        panels_m,
        parts,
    };
    [
        hill(
            "cone, apex",
            height,
            vec![0.2 * radius, radius],
            vec![
                part(near * radius, near * apex, TIP, 4.0),
                part(radius, (1.0 - near) * apex, CREASE, 0.08),
            ],
        ),
        hill(
            "cone, base centre",
            0.0,
            vec![0.1 * radius, 0.5 * radius, radius],
            vec![part(radius, base, CREASE, 0.25)],
        ),
    ]
}

fn truncated_cone() -> Hill {
    let (top, radius, height) = (200.0 * SCALE, 1000.0 * SCALE, 300.0 * SCALE);
    let body = SCALE * geometry_m("truncated cone", "a=200.0 R=1000.0 H=300.0");
    Hill {
        name: "truncated cone, top",
        height_m: Box::new(move |r| height * ((radius - r) / (radius - top)).clamp(0.0, 1.0)),
        station_m: height,
        spacings_m: [10.0, 5.0, 2.5, 1.25],
        panels_m: vec![top, 2.0 * top, radius],
        parts: vec![part(radius, body - disc_m(radius, height), CREASE, 0.05)],
    }
}

/// The hemisphere, its pit, and the hemisphere from the middle of its base.
///
/// Within r = a sin(psi) of the axis the bowl has l^2 = 2 a Delta, so that r / l = cos(psi / 2), and the effect at its
/// bottom is -2 pi a (sin psi - sin(psi/2) - sin(3 psi/2)/3); at psi = pi/2 and with the plain around it is the table's.
fn hemisphere() -> [Hill; 3] {
    let a: f64 = 100.0;
    let case = "a=100.0";
    let outer = 3.0 * a;
    let psi = PI / 3.0;
    let inner = -TAU * a * (psi.sin() - (0.5 * psi).sin() - (1.5 * psi).sin() / 3.0);
    let whole = geometry_m("hemisphere dome, station at summit", case) - disc_m(outer, a);
    // the table's form for the infinite plane: what lies beyond the outer radius is a disc's complement
    let beyond = TAU * ((outer).hypot(a) - outer);
    let infinite = geometry_m("TC bottom of hemispherical pit", case);
    assert!((whole - beyond + infinite).abs() < 1e-9 * infinite);
    let base = -geometry_m("hemisphere dome, station base centre", case);
    let dome = move |r: f64| (a * a - r * r).max(0.0).sqrt();
    let panels = || vec![0.5 * a, psi.sin() * a, 0.97 * a, 0.999 * a, a, outer];
    let parts = || {
        vec![
            part(psi.sin() * a, inner, SMOOTH, 0.3),
            part(outer, whole - inner, RIM, 0.4),
        ]
    };
    let spacings_m = [10.0, 5.0, 2.5, 1.25];
    [
        Hill {
            name: "hemisphere, summit",
            height_m: Box::new(dome),
            station_m: a,
            spacings_m,
            panels_m: panels(),
            parts: parts(),
        },
        Hill {
            name: "hemispherical pit, bottom",
            height_m: Box::new(move |r| -dome(r)),
            station_m: -a,
            spacings_m,
            panels_m: panels(),
            parts: parts(),
        },
        Hill {
            name: "hemisphere, base centre",
            height_m: Box::new(dome),
            station_m: 0.0,
            spacings_m,
            panels_m: panels(),
            parts: vec![part(outer, base, RIM, 0.9)],
        },
    ]
}

fn smooth() -> [Hill; 3] {
    let (h, sigma) = (1000.0 * SCALE, 2000.0 * SCALE);
    let gauss = "H=1000.0 sigma=2000.0 x=0.0 R=20000.0";
    let gauss = row("hills_off_axis.csv", "surface", "gauss", gauss).number("geom_m");
    let a = 5000.0 * SCALE;
    let cosine = row("hills_summit.csv", "surface", "cosine", "H=1000.0 a=5000.0").number("geom_m");
    let (radius, height) = (1000.0 * SCALE, 300.0 * SCALE);
    let paraboloid = SCALE * geometry_m("paraboloid hill", "R=1000.0 H=300.0");
    let thirds = |r: f64| vec![0.1 * r, 0.3 * r, 0.6 * r, r];
    [
        Hill {
            name: "Gaussian hill, summit",
            height_m: Box::new(move |r| h * (-0.5 * (r / sigma).powi(2)).exp()),
            station_m: h,
            spacings_m: [50.0, 25.0, 12.5, 6.25],
            panels_m: thirds(10.0 * sigma),
            parts: vec![part(10.0 * sigma, -SCALE * gauss, SMOOTH, 0.5)],
        },
        Hill {
            name: "cosine hill, summit",
            height_m: Box::new(move |r| 0.5 * h * (1.0 + (PI * (r / a).min(1.0)).cos())),
            station_m: h,
            spacings_m: [50.0, 25.0, 12.5, 6.25],
            panels_m: thirds(a),
            parts: vec![part(a, -SCALE * cosine, SMOOTH, 0.4)],
        },
        Hill {
            name: "paraboloid hill, summit",
            height_m: Box::new(move |r| height * (1.0 - (r / radius).powi(2)).max(0.0)),
            station_m: height,
            spacings_m: [10.0, 5.0, 2.5, 1.25],
            panels_m: thirds(radius),
            parts: vec![part(
                radius,
                paraboloid - disc_m(radius, height),
                SMOOTH,
                0.08,
            )],
        },
    ]
}

/// The DEM goes on beyond the outer radius by this many posts.
const MARGIN_POSTS: f64 = 64.0;
/// Orientations of the grid: rows north, and four others.
const TURNS_RAD: [f64; 5] = [0.0, 0.35, 0.61, 0.83, 1.02];

/// Root mean square error over the orientations, uGal, of each part.
fn errors_ugal(hill: &Hill, spacing_m: f64) -> Vec<f64> {
    let outer_m = hill.panels_m[hill.panels_m.len() - 1];
    let edges: Vec<f64> = hill.parts.iter().map(|p| p.to_m).collect();
    let settings = settings(outer_m, &edges[..edges.len() - 1], 0.02);
    let dh = |r: f64| (hill.height_m)(r) - hill.station_m;
    let mut from = 0.0;
    let mut expected_ugal = Vec::new();
    for part in &hill.parts {
        let panels: Vec<f64> = hill
            .panels_m
            .iter()
            .copied()
            .filter(|&p| p <= part.to_m)
            .collect();
        let curved = SITE.curvature_m(&panels, |s, _| dh(s));
        expected_ugal.push(1e3 * UNIT_MGAL * (part.expected_m + curved - from));
        from = curved;
    }
    let station = SITE.stations(&[(0.0, 0.0, 0.0)], Ground::Given);
    let mut squares = vec![0.0; hill.parts.len()];
    for turn in TURNS_RAD {
        let posts = Posts::out_to(outer_m + MARGIN_POSTS * spacing_m, spacing_m).turned(turn);
        let relief = relief(vec![SITE.grid(&posts, |x, y| dh(x.hypot(y)))]);
        let result = &run(&relief, &station, &settings)[0];
        assert!(result.covered > 0.98, "{}", result.covered);
        assert!(result.numeric_bound_mgal <= settings.tolerance_mgal);
        for (k, zone) in result.zone_effect_mgal.iter().enumerate() {
            squares[k] += (1e3 * zone - expected_ugal[k]).powi(2) / TURNS_RAD.len() as f64;
        }
    }
    squares.into_iter().map(f64::sqrt).collect()
}

fn check(hill: &Hill) {
    let mut errors = vec![Vec::new(); hill.parts.len()];
    for spacing in hill.spacings_m {
        for (all, error) in errors.iter_mut().zip(errors_ugal(hill, spacing)) {
            all.push(error);
        }
    }
    let mut from = 0.0;
    for (part, errors) in hill.parts.iter().zip(&errors) {
        let order = order(&hill.spacings_m, errors);
        println!(
            "{:<27} {from:>6.1}..{:<6.1} m  effect {:>10.3} uGal  errors at {:?} m: {:?} uGal  order {order:.2}",
            hill.name,
            part.to_m,
            1e3 * UNIT_MGAL * part.expected_m,
            hill.spacings_m,
            errors.iter().map(|e| format!("{e:.3}")).collect::<Vec<_>>(),
        );
        from = part.to_m;
    }
    for (part, errors) in hill.parts.iter().zip(&errors) {
        let order = order(&hill.spacings_m, errors);
        assert!(
            (part.order[0]..=part.order[1]).contains(&order),
            "{} to {} m: order {order}, not within {:?}",
            hill.name,
            part.to_m,
            part.order
        );
        let finest = errors[errors.len() - 1];
        assert!(
            finest <= part.finest_ugal,
            "{} to {} m: {finest} uGal",
            hill.name,
            part.to_m
        );
    }
}

#[test]
fn cone_from_its_apex_and_its_base() {
    cone().iter().for_each(check);
}

#[test]
fn truncated_cone_from_its_top() {
    check(&truncated_cone());
}

#[test]
fn hemisphere_and_its_pit() {
    hemisphere().iter().for_each(check);
}

#[test]
fn smooth_hills_from_their_summits() {
    smooth().iter().for_each(check);
}

/// Stations on the flank of two Gaussian hills, on posts and within cells: circles about the station, not about the hill.
#[test]
fn gaussian_hill_off_its_axis() {
    let spacings = [50.0, 25.0, 12.5, 6.25];
    let table: Vec<Row> = rows("hills_off_axis.csv")
        .into_iter()
        .filter(|r| r.parameter("parameters", "R") == 20000.0)
        .collect();
    assert_eq!(table.len(), 14);
    for (hill, rows) in table.chunk_by(hill_of).enumerate() {
        let of = |name| SCALE * rows[0].parameter("parameters", name);
        let (height, sigma, outer) = (of("H"), of("sigma"), of("R"));
        let surface = |x: f64, y: f64| height * (-0.5 * (x * x + y * y) / (sigma * sigma)).exp();
        for (place, offset) in [("on a post", (0.0, 0.0)), ("within a cell", (0.3, 0.2))] {
            let mut errors = vec![Vec::new(); rows.len()];
            for spacing in spacings {
                for (row, errors) in rows.iter().zip(&mut errors) {
                    let x = SCALE * row.parameter("parameters", "x");
                    // the station's height is taken off the DEM, so that it stands at 0
                    let level = surface(x, 0.0);
                    let dh = |s: f64, azimuth: f64| {
                        surface(x + s * azimuth.cos(), s * azimuth.sin()) - level
                    };
                    let panels = [0.05, 0.15, 0.3, 0.5, 0.75, 1.0].map(|f| f * outer);
                    let curved = SITE.curvature_m(&panels, dh);
                    let expected = 1e3 * UNIT_MGAL * (curved - SCALE * row.number("geom_m"));
                    let reach = outer + MARGIN_POSTS * spacing;
                    // all stations of the tables lie at the same place within their cells
                    let posts = Posts::over([x - reach, x + reach], [-reach, reach], spacing)
                        .moved(-offset.0 * spacing, -offset.1 * spacing);
                    let relief = relief(vec![SITE.grid(&posts, |x, y| surface(x, y) - level)]);
                    let mut station = SITE.stations(&[(x, 0.0, 0.0)], Ground::Given);
                    put_on_surface(&relief, &mut station, 0.0);
                    let result = &run(&relief, &station, &settings(outer, &[], 0.02))[0];
                    errors.push(1e3 * result.terrain_effect_mgal - expected);
                }
            }
            for (row, errors) in rows.iter().zip(&errors) {
                let order = order(&spacings, errors);
                println!(
                    "Gaussian {hill} {place} {}: errors at {spacings:?} m: {:?} uGal, order {order:.2}",
                    row.text("parameters"),
                    errors
                        .iter()
                        .map(|e| format!("{e:+.3}"))
                        .collect::<Vec<_>>(),
                );
                let finest = errors[errors.len() - 1].abs();
                assert!(finest <= 1.2, "{row:?} {place}: {finest} uGal");
                assert!(
                    (1.7..=2.35).contains(&order),
                    "{row:?} {place}: order {order}"
                );
            }
        }
    }
}

fn hill_of(a: &Row, b: &Row) -> bool {
    a.parameter("parameters", "H") == b.parameter("parameters", "H")
}
