//! Relief that runs on for ever in one direction: the ramp between two plains, and the sinusoid.
//!
//! Both have closed forms for an infinite flat Earth. Ours end at an outer radius, so what lies beyond it is integrated
//! here, by quadrature of 1 - r/l over distance and azimuth, and taken off; curvature is put in to first order.

use hillpull_engine::Ground;
use hillpull_tests::published::rows;
use hillpull_tests::relief_fixtures::{
    Posts, Random, SITE, UNIT_MGAL, gauss, order, put_on_surface, relief, run, settings,
};
use std::f64::consts::{PI, TAU};

/// 1 - r / sqrt(r^2 + dh^2), without cancellation.
fn unseen(r: f64, dh: f64) -> f64 {
    let l = r.hypot(dh);
    dh * dh / (l * (l + r))
}

/// What a ramp of `slope_rad` between plains at `low` and `high` above the station adds beyond `outer_m`, m.
///
/// In u = 1/r the integrand over distance is smooth to infinity; over azimuth it bends where the ramp's two edges are seen.
fn ramp_beyond_m(slope_rad: f64, low: f64, high: f64, outer_m: f64) -> f64 {
    let (points, tan) = (gauss(24), slope_rad.tan());
    points.integrate(0.0, 1.0 / outer_m, |u| {
        let r = 1.0 / u;
        let cuts = [0.0, (high / tan / r).acos(), (low / tan / r).acos(), PI];
        let half: f64 = (0..3)
            .map(|k| {
                points.integrate(cuts[k], cuts[k + 1], |azimuth| {
                    unseen(r, (tan * r * azimuth.cos()).clamp(low, high))
                })
            })
            .sum();
        2.0 * half * r * r
    })
}

/// The effect is 2 H theta wherever on the ramp the station stands (closed form, checked by quadrature in another order).
#[test]
fn ramp_between_two_plains() {
    const SCALE: f64 = 0.2;
    let outer_m = 600.0;
    let mut random = Random(5);
    let mut cases = Vec::new();
    for row in rows("closed_forms.csv") {
        if row.text("case").starts_with("2-D ramp between") {
            let of = |name| row.parameter("parameters", name);
            let slope = of("th").to_radians();
            let height = SCALE * of("H");
            assert!((SCALE * row.number("geom_m") - 2.0 * height * slope).abs() < 1e-12);
            let (_, fraction) = row.text("parameters").split_once("up=").expect("fraction");
            cases.push((slope, height, fraction.parse().expect("a number")));
        }
    }
    assert_eq!(cases.len(), 4);
    for degrees in [10.0_f64, 40.0, 60.0] {
        for _ in 0..6 {
            cases.push((degrees.to_radians(), 40.0, random.between(0.0, 1.0)));
        }
    }
    let mut worst = 0.0_f64;
    for (k, &(slope, height, fraction)) in cases.iter().enumerate() {
        // the ramp's edges lie on columns of posts, so that the DEM holds the ramp exactly
        let length = height / slope.tan();
        let spacing = length / [2.0, 6.0, 16.0][k % 3];
        let turn = random.between(0.0, TAU);
        let straight = Posts::out_to(outer_m + 64.0 * spacing, spacing);
        let relief = relief(vec![SITE.grid_of_posts(
            &straight.turned(turn),
            |row, col| {
                let (x, _) = straight.xy(row as f64, col as f64);
                (x * slope.tan()).clamp(-0.5 * height, 0.5 * height)
            },
        )]);
        let x = (fraction - 0.5) * length;
        let y = random.between(-1.0, 1.0) * spacing;
        let (sin, cos) = turn.sin_cos();
        let mut station = SITE.stations(
            &[(x * cos - y * sin, x * sin + y * cos, 0.0)],
            Ground::Given,
        );
        put_on_surface(&relief, &mut station, 0.0);
        let result = &run(&relief, &station, &settings(outer_m, &[], 1.0))[0];
        let (low, high) = (-fraction * height, (1.0 - fraction) * height);
        let curved = SITE.curvature_m(&[10.0, 50.0, 200.0, outer_m], |s, azimuth| {
            (s * slope.tan() * azimuth.cos()).clamp(low, high)
        });
        let beyond = ramp_beyond_m(slope, low, high, outer_m);
        let expected = 1e3 * UNIT_MGAL * (beyond - 2.0 * height * slope + curved);
        let error = 1e3 * result.terrain_effect_mgal - expected;
        let bound = 1e3 * result.numeric_bound_mgal;
        println!(
            "{:>4.0} degrees, {fraction:.3} up, posts {spacing:.2} m: 2 H theta {:.3} uGal, beyond {:.3}, curvature {:+.3}, \
             error {error:+.4}, bound {bound:.4}",
            slope.to_degrees(),
            2e3 * UNIT_MGAL * height * slope,
            1e3 * UNIT_MGAL * beyond,
            1e3 * UNIT_MGAL * curved,
        );
        assert!(error.abs() <= bound + 2e-3 && bound <= 1.0, "case {k}");
        worst = worst.max(error.abs());
    }
    println!("{} stations, worst error {worst:.4} uGal", cases.len());
    assert!(worst < 0.2, "{worst}");
}

/// What the sinusoid A cos(kx) adds beyond `outer_m` from a station at x, m.
///
/// By quadrature to 100 wavelengths; farther out dh^2 / 2r^2 with the mean of dh^2, A^2/2 + (A cos kx)^2: what oscillates
/// about it is smaller by the root of the number of waves.
fn sinusoid_beyond_m(amplitude: f64, wavelength: f64, x: f64, outer_m: f64) -> f64 {
    const AZIMUTHS: usize = 2048;
    let k = TAU / wavelength;
    let level = amplitude * (k * x).cos();
    let points = gauss(8);
    let cosines: Vec<f64> = (0..AZIMUTHS)
        .map(|i| (PI * (i as f64 + 0.5) / AZIMUTHS as f64).cos())
        .collect();
    let far = 100.0 * wavelength;
    let panels = ((far - outer_m) / (0.5 * wavelength)).ceil() as usize;
    let width = (far - outer_m) / panels as f64;
    let near: f64 = (0..panels)
        .map(|p| {
            let from = outer_m + width * p as f64;
            points.integrate(from, from + width, |r| {
                cosines
                    .iter()
                    .map(|c| unseen(r, amplitude * (k * (x + r * c)).cos() - level))
                    .sum::<f64>()
                    * TAU
                    / AZIMUTHS as f64
            })
        })
        .sum();
    near + PI * (0.5 * amplitude * amplitude + level * level) / far
}

/// Exact values of the infinite sinusoid (summed over 800 wavelengths each way), and 2 pi^2 G rho A^2 / lambda where it is
/// low: second order in height, Moritz-type (recalled from memory, then derived).
#[test]
fn sinusoid() {
    let wavelength = 200.0;
    let outer_m = 5.0 * wavelength;
    let spacings = [16.0, 32.0, 64.0, 128.0].map(|n| wavelength / n);
    let table = rows("sinusoid.csv");
    for cases in table.chunk_by(|a, b| a.text("parameters") == b.text("parameters")) {
        let scale = wavelength / cases[0].parameter("parameters", "lambda");
        let amplitude = scale * cases[0].parameter("parameters", "A");
        let surface = |x: f64| amplitude * (TAU * x / wavelength).cos();
        let places = cases.iter().map(|case| match case.text("place") {
            "crest" => 0.0,
            "45deg" => wavelength / 8.0,
            "mid-slope" => wavelength / 4.0,
            "trough" => wavelength / 2.0,
            other => panic!("{other}"),
        });
        let places: Vec<f64> = places.collect();
        let xyh: Vec<_> = places.iter().map(|&x| (x, 0.0, surface(x))).collect();
        let stations = SITE.stations(&xyh, Ground::Given);
        let tolerance_ugal = (2e-2 * scale * cases[0].number("exact_mGal")).max(0.005);
        let mut found = vec![Vec::new(); cases.len()];
        for spacing in spacings {
            let reach = outer_m + 64.0 * spacing;
            let posts = Posts::over([-reach, wavelength + reach], [-reach, reach], spacing);
            let relief = relief(vec![SITE.grid(&posts, |x, _| surface(x))]);
            let results = run(&relief, &stations, &settings(outer_m, &[], tolerance_ugal));
            for (all, result) in found.iter_mut().zip(results) {
                all.push(1e3 * result.terrain_effect_mgal);
            }
        }
        for ((case, &x), found) in cases.iter().zip(&places).zip(&found) {
            let beyond = sinusoid_beyond_m(amplitude, wavelength, x, outer_m);
            let panels: Vec<f64> = (1..=20).map(|k| 0.25 * wavelength * f64::from(k)).collect();
            let curved = SITE.curvature_m(&panels, |s, azimuth| {
                surface(x + s * azimuth.cos()) - surface(x)
            });
            let add = 1e3 * UNIT_MGAL * (beyond + curved);
            let expected = -1e3 * scale * case.number("exact_mGal");
            let errors: Vec<f64> = found.iter().map(|f| f - add - expected).collect();
            let order = order(&spacings, &errors);
            println!(
                "{:<9} {:<24} exact {expected:>9.3} uGal, beyond and curvature {add:+.3}, errors at {spacings:?} m: {:?} uGal, order {order:.2}",
                case.text("place"),
                case.text("parameters"),
                errors
                    .iter()
                    .map(|e| format!("{e:+.4}"))
                    .collect::<Vec<_>>(),
            );
            // at the crests the term in s^2 is nearly nothing
            assert!(order >= 1.7, "{case:?}: order {order}");
            // order 2 taken out of the two finest
            let limit = errors[3] + (errors[3] - errors[2]) / 3.0;
            assert!(limit.abs() <= 0.05, "{case:?}: in the limit {limit} uGal");
            let steepness = TAU * amplitude / wavelength;
            let linear = -1e3 * scale * case.number("linear_mGal");
            let formula = -1e3 * UNIT_MGAL * 2.0 * PI * PI * amplitude * amplitude / wavelength;
            assert!((linear / formula - 1.0).abs() < 1e-9);
            let ratio = (expected + limit) / linear;
            println!(
                "          of the linear value: {ratio:.6}, 1 - {:.3} steepness^2",
                (1.0 - ratio) / (steepness * steepness)
            );
            assert!(
                (ratio - 1.0).abs() < 0.4 * steepness * steepness,
                "{case:?}: {ratio}"
            );
        }
    }
}
