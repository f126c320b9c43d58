//! Sectors of rings about the station on a plane: the compartment of a zone chart, and the plane
//! slope.

/// Attraction of an annular sector from level `from_m` to level `to_m` per unit of `G rho`, metres,
/// positive down.
///
/// The station is on the axis; levels are heights above it, radii horizontal distances,
/// `azimuth_rad` the sector's angle (2 pi for a full ring; `r1_m` = 0 for a disc). Swapped levels
/// change the sign, so that with `from_m` = 0 and `to_m` = the height of the terrain above the
/// station the result is the terrain effect, negative for hills and valleys alike, of one
/// compartment of [`HAMMER_1939`](crate::bibliography::HAMMER_1939).
///
/// The textbook form is azimuth times sqrt(r2^2 + z^2) - sqrt(r1^2 + z^2) between two levels. Here
/// both differences, over radius and over level, are taken by hand: no cancellation for a thin,
/// narrow or far ring.
///
/// ```
/// use hillpull_physics::bodies::sector::annular_sector_m;
/// let (hill, valley) = (annular_sector_m(0.5, 50.0, 90.0, 0.0, 20.0), annular_sector_m(0.5, 50.0, 90.0, 0.0, -20.0));
/// assert!(hill < 0.0 && hill == valley);
/// ```
#[must_use]
pub fn annular_sector_m(azimuth_rad: f64, r1_m: f64, r2_m: f64, from_m: f64, to_m: f64) -> f64 {
    if from_m == to_m {
        return 0.0; // also spares the centre of a disc without thickness its 0/0
    }
    let (from1, from2) = (r1_m.hypot(from_m), r2_m.hypot(from_m));
    let (to1, to2) = (r1_m.hypot(to_m), r2_m.hypot(to_m));
    let over_level =
        (from_m - to_m) * (from_m + to_m) * (1.0 / (from1 + to1) + 1.0 / (from2 + to2));
    azimuth_rad * (r2_m - r1_m) * (r2_m + r1_m) * over_level / ((from1 + from2) * (to1 + to2))
}

/// Terrain effect of a plane slope through the station, of `slope_rad`, inside the annular sector
/// from `r1_m` to `r2_m` and from azimuth `p1_rad` to `p2_rad`, counted from the direction of dip;
/// per unit of `G rho`, metres, positive down: negative.
///
/// -(r2 - r1) {(p2 - p1) - cos(slope) [F(p2 | m) - F(p1 | m)]}, m = sin^2(slope), F Legendre's
/// elliptic integral of the first kind: the integral over azimuth of 1 - cos(slope in that
/// azimuth). The difference loses digits as 1/slope^2: 13 are good at 10 degrees, 11 at 1 degree.
#[must_use]
pub fn plane_slope_sector_m(slope_rad: f64, r1_m: f64, r2_m: f64, p1_rad: f64, p2_rad: f64) -> f64 {
    let (sin_slope, cos_slope) = slope_rad.sin_cos();
    let elliptic =
        elliptic_f(p2_rad, sin_slope * sin_slope) - elliptic_f(p1_rad, sin_slope * sin_slope);
    -(r2_m - r1_m) * ((p2_rad - p1_rad) - cos_slope * elliptic)
}

/// Legendre's F(p | m), 0 <= m < 1, any p ([`CARLSON_1995`](crate::bibliography::CARLSON_1995),
/// equation 4.5, and the period of the integrand).
fn elliptic_f(p: f64, m: f64) -> f64 {
    let turns = (p / std::f64::consts::PI).round();
    let (sin, cos) = (p - turns * std::f64::consts::PI).sin_cos();
    let part = sin * carlson_rf(cos * cos, 1.0 - m * sin * sin, 1.0);
    if turns == 0.0 {
        part
    } else {
        2.0 * turns * carlson_rf(0.0, 1.0 - m, 1.0) + part
    }
}

/// Carlson's symmetric integral R_F ([`CARLSON_1995`](crate::bibliography::CARLSON_1995), algorithm
/// 1), at most one argument 0.
fn carlson_rf(mut x: f64, mut y: f64, mut z: f64) -> f64 {
    // each duplication brings the arguments 4 times closer: 30 take any pair of doubles of like
    // size to rounding
    for _ in 0..30 {
        let mean = (x + y + z) / 3.0;
        if (x - mean).abs().max((y - mean).abs()).max((z - mean).abs()) < 2e-3 * mean {
            break; // the series below then errs by (2e-3)^6
        }
        let (rx, ry, rz) = (x.sqrt(), y.sqrt(), z.sqrt());
        let lambda = rx * ry + ry * rz + rz * rx;
        (x, y, z) = (
            0.25 * (x + lambda),
            0.25 * (y + lambda),
            0.25 * (z + lambda),
        );
    }
    let mean = (x + y + z) / 3.0;
    let (dx, dy) = (1.0 - x / mean, 1.0 - y / mean);
    let dz = -dx - dy;
    let e2 = dx * dy - dz * dz;
    let e3 = dx * dy * dz;
    (1.0 - e2 / 10.0 + e3 / 14.0 + e2 * e2 / 24.0 - 3.0 * e2 * e3 / 44.0) / mean.sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use proptest::prelude::*;

    #[test]
    fn carlson_rf_published() {
        // Carlson 1995, section 3 (recalled from memory): R_F(1,2,0), R_F(0.5,1,0), R_F(2,3,4)
        assert_relative_eq!(
            carlson_rf(1.0, 2.0, 0.0),
            1.311_028_777_146_1,
            max_relative = 1e-13
        );
        assert_relative_eq!(
            carlson_rf(0.5, 1.0, 0.0),
            1.854_074_677_301_4,
            max_relative = 1e-13
        );
        assert_relative_eq!(
            carlson_rf(2.0, 3.0, 4.0),
            0.584_082_841_677_15,
            max_relative = 1e-13
        );
    }

    #[test]
    fn elliptic_f_is_the_angle_without_modulus() {
        for p in [-7.0, -1.6, -0.2, 0.0, 1e-9, 1.5, 1.6, 3.2, 40.0] {
            assert_relative_eq!(elliptic_f(p, 0.0), p, max_relative = 4e-16, epsilon = 1e-15);
        }
    }

    #[test]
    fn slope_sectors_join() {
        let sector = |p1, p2| plane_slope_sector_m(0.4, 3.0, 20.0, p1, p2);
        let whole = sector(0.0, std::f64::consts::TAU);
        let parts: f64 = (0..8)
            .map(|i| sector(0.7 * f64::from(i) + 0.1, 0.7 * f64::from(i + 1) + 0.1))
            .sum();
        let rest = sector(5.7, std::f64::consts::TAU + 0.1);
        assert_relative_eq!(parts + rest, whole, max_relative = 1e-13);
    }

    proptest! {
        /// Rings however thin, narrow and far: two halves make the whole, in radius and in level.
        #[test]
        fn rings_join(
            r1 in 0.0..1e5f64, log_width in -6.0..5.0f64, from in -3e3..3e3f64, log_dh in -6.0..3.5f64, cut in 0.1..0.9f64,
        ) {
            let (r2, to) = (r1 + 10f64.powf(log_width), from + 10f64.powf(log_dh));
            // from here on the ring that floating point holds
            let whole = annular_sector_m(1.0, r1, r2, from, to);
            let (r, level) = (r1 + cut * (r2 - r1), from + cut * (to - from));
            let radii = annular_sector_m(1.0, r1, r, from, to) + annular_sector_m(1.0, r, r2, from, to);
            prop_assert!((radii - whole).abs() <= 4e-15 * whole.abs());
            let (low, high) = (annular_sector_m(1.0, r1, r2, from, level), annular_sector_m(1.0, r1, r2, level, to));
            prop_assert!((low + high - whole).abs() <= 4e-15 * (low.abs() + high.abs()));
        }
    }
}
