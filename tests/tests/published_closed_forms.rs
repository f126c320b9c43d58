//! Discs, rings and plane slopes in closed form, and the facts that every worker in the trade
//! knows.
//!
//! The values are elementary closed forms in high precision, each agreeing with quadrature in
//! another order to 1e-23. Cylinder: Heiskanen and Moritz 1967, Physical geodesy, section 3-2
//! (formula recalled from memory).

use approx::assert_relative_eq;
use hillpull_physics::bodies::sector::{annular_sector_m, plane_slope_sector_m};
use hillpull_physics::constants::{
    DENSITY_ROCK_KG_M3, G_CODATA_2018, MGAL_PER_M_S2, OUTER_RADIUS_M,
};
use hillpull_tests::published::{Row, rows};
use std::f64::consts::{PI, TAU};

fn cases(name: &str, count: usize) -> Vec<Row> {
    let cases: Vec<Row> = rows("closed_forms.csv")
        .into_iter()
        .filter(|c| c.text("case").starts_with(name))
        .collect();
    assert_eq!(cases.len(), count, "{name}");
    cases
}

fn check(case: &Row, found_m: f64, max_relative: f64) {
    let expected_m = case.number("geom_m");
    let error = (found_m / expected_m - 1.0).abs();
    assert!(
        error <= max_relative,
        "{case:?}: {found_m} is not {expected_m} (relative {error:.1e})"
    );
    let found_mgal = found_m * G_CODATA_2018 * DENSITY_ROCK_KG_M3 * MGAL_PER_M_S2;
    assert_relative_eq!(
        found_mgal,
        case.number("value_mGal"),
        max_relative = 1e-14 + max_relative
    );
}

#[test]
fn cylinder_on_its_axis() {
    for case in cases("cylinder on axis", 8) {
        let of = |name| case.parameter("parameters", name);
        let (radius, height, station) = (of("a"), of("b"), of("c"));
        check(
            &case,
            annular_sector_m(TAU, 0.0, radius, -station, height - station),
            1e-14,
        );
    }
}

#[test]
fn annular_sector() {
    for case in cases("annular sector", 5) {
        let of = |name| case.parameter("parameters", name);
        check(
            &case,
            -annular_sector_m(TAU / of("n"), of("r1"), of("r2"), 0.0, of("h")),
            1e-14,
        );
    }
}

#[test]
fn plane_slope_all_round() {
    for case in cases("infinite plane slope theta", 11) {
        let slope = case.parameter("parameters", "theta").to_radians();
        check(
            &case,
            -plane_slope_sector_m(slope, 0.0, 1.0, 0.0, TAU),
            1e-11,
        );
        // the square law (Geophysics 45, 109, 1980), too big by up to tan^2 of the slope
        let square_law = 0.5 * PI * slope.tan().powi(2);
        let excess = square_law / case.number("geom_m") - 1.0;
        assert!(
            excess > 0.0 && excess < slope.tan().powi(2),
            "{case:?}: {excess}"
        );
    }
    for case in cases("infinite plane slope, disc", 4) {
        let of = |name| case.parameter("parameters", name);
        check(
            &case,
            -plane_slope_sector_m(of("theta").to_radians(), 0.0, of("r"), -PI, PI),
            1e-12,
        );
    }
}

#[test]
fn plane_slope_in_a_sector() {
    for case in cases("plane slope, azimuth sector", 3) {
        let slope = case.parameter("parameters", "theta").to_radians();
        let (_, range) = case.text("parameters").split_once("p=").unwrap();
        let (from, to) = range.trim_end_matches(" deg").split_once("..").unwrap();
        let angle = |text: &str| text.parse::<f64>().unwrap().to_radians();
        check(
            &case,
            -plane_slope_sector_m(slope, 2.0, 3.0, angle(from), angle(to)),
            1e-13,
        );
    }
}

const UNIT_MGAL: f64 = G_CODATA_2018 * DENSITY_ROCK_KG_M3 * MGAL_PER_M_S2;

/// Common practice, no source: a metre of infinite plate of rock is worth 0.1119 mGal (0.04193
/// times the density in g/cm3).
#[test]
fn a_metre_of_plate() {
    let plate = annular_sector_m(TAU, 0.0, 1e9, -1.0, 0.0) * UNIT_MGAL;
    assert!((plate - 0.1119).abs() < 1e-4, "{plate}");
    assert!((plate / 2.670 - 0.041_93).abs() < 1e-5);
    // Talwani 1998 (Geophysics 63, 1125-1130), first page: 0.111897 mGal/m at G = 6.67e-11, 0.1118
    // at 6.6635e-11
    assert!((plate * 6.67e-11 / G_CODATA_2018 - 0.111_897).abs() < 5e-7);
    assert!((plate * 6.6635e-11 / G_CODATA_2018 - 0.1118).abs() < 5e-5);
}

/// Common practice, no source: terrain that differs by H beyond the distance r has an effect of
/// about pi G rho H^2 / r.
#[test]
fn far_relief() {
    let (height_m, from_m) = (1000.0, 21_944.381);
    let effect = annular_sector_m(TAU, from_m, OUTER_RADIUS_M, 0.0, height_m) * UNIT_MGAL;
    assert!((effect + 2.214_105_558_7).abs() < 1e-10, "{effect}"); // closed form in high precision
    let rule = -PI * height_m * height_m * (1.0 / from_m - 1.0 / OUTER_RADIUS_M) * UNIT_MGAL;
    assert!((effect / rule - 1.0).abs() < 1e-3);
}

/// Common practice, no source: a station 1 m off its DEM is wrong by 0.112 mGal when the DEM is
/// used right up to the station, and by 2 pi G rho [sqrt(r^2 + d^2) - r] when it is used from r on.
#[test]
fn station_off_its_surface() {
    for (from_m, off_m, printed, unit) in [
        (0.0, 1.0, 0.112, 1e-3),
        (2.0, 1.0, 0.0264, 1e-4),
        (16.642, 1.0, 0.003_36, 1e-5),
        (30.0, 1.0, 0.001_87, 1e-5),
        (250.0, 1.0, 0.000_22, 1e-5),
        (2.0, 5.0, 0.379, 1e-3),
        (30.0, 5.0, 0.0463, 1e-4),
    ] {
        let effect = annular_sector_m(TAU, from_m, 1e9, 0.0, off_m) * UNIT_MGAL;
        assert!(
            (effect + printed).abs() <= 0.5 * unit + 1e-6,
            "from {from_m} m, {off_m} m off: {effect}"
        );
    }
}
