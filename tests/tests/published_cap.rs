//! The spherical cap and rings on the sphere against published curvature values.

use hillpull_physics::bodies::cap::{cap_mgal, ring_m};
use hillpull_physics::constants::{
    DENSITY_ROCK_KG_M3, EARTH_RADIUS_M, G_CODATA_2018, MGAL_PER_M_S2, OUTER_RADIUS_M,
};
use hillpull_tests::published::rows;
use std::f64::consts::TAU;

const UNIT_MGAL: f64 = G_CODATA_2018 * DENSITY_ROCK_KG_M3 * MGAL_PER_M_S2;

fn cap(height_m: f64) -> f64 {
    cap_mgal(height_m, OUTER_RADIUS_M, DENSITY_ROCK_KG_M3, G_CODATA_2018)
}

fn curvature(height_m: f64) -> f64 {
    cap(height_m) - TAU * UNIT_MGAL * height_m
}

/// Cap and Bullard B from 100 m to 5 km: closed form in high precision, checked by 2-D quadrature
/// of Newton's integral. Beside it three approximations recalled from memory: Whitman 1991
/// (Geophysics 56, 1980), a quartic, and a cubic.
#[test]
fn cap_to_5_km() {
    let table = rows("bullard_b.csv");
    assert_eq!(table.len(), 7);
    for row in table {
        let height_m = row.number("h_m");
        let expected = row.number("cap_mGal");
        assert!(
            (cap(height_m) - expected).abs() <= 2e-12 * expected,
            "cap at {height_m} m: {}",
            cap(height_m)
        );
        let b = curvature(height_m);
        assert!(
            (b - row.number("B=cap-slab_mGal")).abs() < 1e-11,
            "B at {height_m} m: {b}"
        );
        // Whitman's abstract promises 1 uGal below 4 km; it is 3 uGal at 5 km
        assert!((b - row.number("B_Whitman")).abs() < if height_m <= 4000.0 { 1e-3 } else { 3e-3 });
        // the series use G = 6.67e-11, the cubic is good to 1 uGal then
        assert!((b * 6.67e-11 / G_CODATA_2018 - row.number("poly4_m")).abs() < 0.5e-3);
        assert!((b * 6.67e-11 / G_CODATA_2018 - row.number("poly3_m")).abs() < 1.0e-3);
    }
}

/// LaFehr 1991 (Geophysics 56, 1179-1184): cap = 2 pi G rho [(1 + mu) h - lambda R], constants
/// recalled from memory.
fn lafehr_cap_mgal(h: f64) -> f64 {
    let r = EARTH_RADIUS_M + h;
    let (eta, delta, a) = (h / r, EARTH_RADIUS_M / r, OUTER_RADIUS_M / EARTH_RADIUS_M);
    let mu = eta * eta / 3.0 - eta;
    let (sin_half, f, k) = ((0.5 * a).sin(), a.cos(), a.sin().powi(2));
    let d = 3.0 * f * f - 2.0;
    let p = -6.0 * f * f * sin_half + 4.0 * sin_half.powi(3);
    let m = -3.0 * k * f;
    let n = 2.0 * (sin_half - sin_half * sin_half);
    let q = ((f - delta).powi(2) + k).sqrt();
    let lambda = ((d + f * delta + delta * delta) * q + p + m * (n / (f - delta + q)).ln()) / 3.0;
    TAU * UNIT_MGAL * ((1.0 + mu) * h - lambda * r)
}

#[test]
fn cap_as_lafehr() {
    for tens in 0..900 {
        let height_m = f64::from(tens) * 10.0;
        let difference = cap(height_m) - lafehr_cap_mgal(height_m);
        assert!(
            difference.abs() < 1e-10,
            "{height_m} m: {difference:e} mGal"
        );
    }
}

/// The largest Bullard B is 1.5189 mGal at 2074 m, and it changes sign at 4149.8 m (derived in high
/// precision; "up to 1.5 mGal" in the abstract of Whitman 1991).
#[test]
fn largest_curvature_and_its_change_of_sign() {
    assert!((curvature(2074.14) - 1.518_931_325).abs() < 1e-9);
    assert!(curvature(2064.0) < curvature(2074.14) && curvature(2084.0) < curvature(2074.14));
    assert!(curvature(4149.80) > 0.0 && curvature(4149.82) < 0.0);
}

/// Antiderivative of the ring's attraction in r: closed form verified against 2-D quadrature to 12
/// digits, see [`ring_closed_m`].
fn antiderivative(s: f64, r: f64, psi: f64) -> f64 {
    let c = psi.cos();
    let l = ((r - s).powi(2) + 4.0 * r * s * (0.5 * psi).sin().powi(2)).sqrt();
    // on the axis the logarithm has no weight
    let log = if psi == 0.0 {
        0.0
    } else {
        (s * psi.sin()).powi(2) * (r - s * c + l).ln()
    };
    r * r * l - 2.0 / 3.0 * l.powi(3) - s * c * ((r - s * c) * l + log)
}

/// (2 pi / s^2)[J(r2, psi2) - J(r1, psi2) - J(r2, psi1) + J(r1, psi1)]: exact, but its terms cancel
/// to 1e-6 mGal.
fn ring_closed_m(s: f64, psi1: f64, psi2: f64, r1: f64, r2: f64) -> f64 {
    let of = |psi| antiderivative(s, r2, psi) - antiderivative(s, r1, psi);
    TAU / (s * s) * (of(psi2) - of(psi1))
}

/// Below the datum the cap is the rock missing overhead: minus the pull of the shell on a station
/// at its base.
#[test]
fn cap_below_the_datum() {
    for depth_m in [1.0, 50.0, 430.0, 2500.0, 11_000.0] {
        let s = EARTH_RADIUS_M - depth_m;
        let shell =
            ring_closed_m(s, 0.0, OUTER_RADIUS_M / EARTH_RADIUS_M, s, EARTH_RADIUS_M) * UNIT_MGAL;
        let found = cap(-depth_m);
        assert!(found > 0.0);
        assert!(
            (found + shell).abs() < 2e-6,
            "{depth_m} m: {found} and {shell}"
        );
    }
    assert_eq!(cap(0.0), 0.0);
}

/// Rings on the sphere for stations below, above and between their surfaces, rock and the contrasts
/// of water and ice: closed form in high precision, checked by 2-D quadrature to 1e-21.
#[test]
fn spherical_rings() {
    let table = rows("spherical_rings.csv");
    assert_eq!(table.len(), 40);
    for row in table {
        let (inner, outer) = row.text("ring_m").split_once("..").unwrap();
        let psi = |ground: &str| ground.parse::<f64>().unwrap() / EARTH_RADIUS_M;
        let radius = |column: &str| EARTH_RADIUS_M + row.number(column);
        let unit = G_CODATA_2018 * row.number("rho") * MGAL_PER_M_S2;
        let args = (
            radius("station_h_m"),
            psi(inner),
            psi(outer),
            radius("terrain_from_m"),
            radius("terrain_to_m"),
        );
        let found = unit * ring_m(args.0, args.1, args.2, args.3, args.4);
        let expected = row.number("spherical_mGal");
        assert!(
            (found - expected).abs() <= 1e-13 + 1e-12 * expected.abs(),
            "{row:?}: {found}"
        );
        let closed = unit * ring_closed_m(args.0, args.1, args.2, args.3, args.4);
        assert!(
            (closed - expected).abs() <= 1e-6,
            "{row:?}: closed form {closed}"
        );
    }
}
