//! Prisms against exact values.

use approx::assert_relative_eq;
use hillpull_physics::bodies::prism::prism_m;
use hillpull_physics::constants::{DENSITY_ROCK_KG_M3, G_CODATA_2018, MGAL_PER_M_S2};
use hillpull_tests::published::rows;

/// 20 prisms computed with 80 digits from the closed form of Nagy 1966 (Geophysics 31, 362-371),
/// each checked by 1-D and 3-D quadrature: near, touching, thin, tall, far. The printed formula in
/// double precision is 9 % wrong for P14.
#[test]
fn twenty_prisms() {
    let cases = rows("prism_cases.csv");
    assert_eq!(cases.len(), 20);
    for case in cases {
        let limits = |a: &str, b: &str| [case.number(a), case.number(b)];
        let found_m = prism_m(limits("x1", "x2"), limits("y1", "y2"), limits("z1", "z2"));
        let expected_m = case.number("I_m_closed");
        let error = (found_m / expected_m - 1.0).abs();
        assert!(
            error <= 1e-12,
            "{}: {found_m:e} is not {expected_m:e} (relative {error:.1e})",
            case.text("id")
        );
        let found_mgal = found_m * G_CODATA_2018 * DENSITY_ROCK_KG_M3 * MGAL_PER_M_S2;
        assert_relative_eq!(found_mgal, case.number("gz_mGal"), max_relative = 1e-12);
    }
}

/// A cube of unit mass with edge 2 attracts with 0.649224... at the centre of a face and
/// 0.419757... at a vertex (modulus), G = 1: OEIS A353769 and A353770, after Klamkin, SIAM Review
/// 34 (1992) 120-121 and Grosjean, SIAM Review 38 (1996) 515-520.
#[test]
fn cube_at_face_and_vertex() {
    const FACE: f64 = 0.649_224_144_564_591_264_71;
    const VERTEX: f64 = 0.419_757_339_887_106_291_87;
    let density = 1.0 / 8.0;
    let face = density * prism_m([-1.0, 1.0], [-1.0, 1.0], [-2.0, 0.0]);
    assert_relative_eq!(face, FACE, max_relative = 1e-15);
    let component = density * prism_m([0.0, 2.0], [0.0, 2.0], [-2.0, 0.0]);
    assert_relative_eq!(component * 3f64.sqrt(), VERTEX, max_relative = 1e-15);
}
