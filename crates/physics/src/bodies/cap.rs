//! The spherical cap and the spherical ring, for a station on their axis.

use super::gauss;
use crate::constants::{EARTH_RADIUS_M, MGAL_PER_M_S2};
use std::f64::consts::PI;

/// The cap term of the topography at a station of height `height_m`, mGal, never negative: the
/// attraction of the spherical cap between the datum (R0 = 6371 km) and station level, out to
/// `radius_m` along the ground.
///
/// Above the datum it is the mass below the station. For a negative height it is the rock that is
/// missing overhead, between station level and the datum: what is not there does not pull up, so
/// the term is positive too.
///
/// The same body as in [`LAFEHR_1991`](crate::bibliography::LAFEHR_1991), computed by [`ring_m`],
/// which does not cancel for a thin cap as his closed form does.
///
/// ```
/// use hillpull_physics::bodies::cap::cap_mgal;
/// use hillpull_physics::constants::{DENSITY_ROCK_KG_M3, G_CODATA_2018, OUTER_RADIUS_M};
/// let cap = |height_m| cap_mgal(height_m, OUTER_RADIUS_M, DENSITY_ROCK_KG_M3, G_CODATA_2018);
/// assert!((cap(1000.0) - 113.080_455_450_6).abs() < 1e-9);
/// assert!(cap(-400.0) > 0.0);
/// ```
#[must_use]
pub fn cap_mgal(height_m: f64, radius_m: f64, density_kg_m3: f64, big_g: f64) -> f64 {
    let ring = Ring::new(EARTH_RADIUS_M + height_m, 0.0, radius_m / EARTH_RADIUS_M);
    big_g * density_kg_m3 * -ring.outwards_m(0.0, -height_m) * MGAL_PER_M_S2
}

/// Attraction of a ring of a spherical shell per unit of `G rho`, metres, positive down, for a
/// station on its axis.
///
/// `s_m` is the station's distance from the centre, `psi1_rad` to `psi2_rad` the ring's angular
/// distances (0 <= psi1 < psi2 <= pi; psi1 = 0 for a cap), `from_m` and `to_m` its radii; swapped
/// radii change the sign. The station may be outside, inside, or on the surface.
///
/// Per unit of thickness the sphere of radius r attracts as
///
/// ```text
/// (pi r / s^2) (l2 - l1) [1 + (s^2 - r^2)/(l1 l2)]
/// l2 - l1 = 4 r s sin((psi2 - psi1)/2) sin((psi2 + psi1)/2) / (l1 + l2)
/// ```
///
/// with l1 and l2 the distances from the station to the edges of its ring. That is smooth in r and
/// is integrated by Gauss quadrature, in panels half as wide as their distance from the nearest
/// edge of the ring: relative error about 1e-14. The antiderivative in r (for example in
/// [`LAFEHR_1991`](crate::bibliography::LAFEHR_1991)) is a difference of terms of the size of r^3,
/// and leaves 1e-10 to 1e-6 mGal.
#[must_use]
pub fn ring_m(s_m: f64, psi1_rad: f64, psi2_rad: f64, from_m: f64, to_m: f64) -> f64 {
    let ring = Ring::new(s_m, psi1_rad, psi2_rad);
    let (near, far) = (from_m - s_m, to_m - s_m);
    if near * far < 0.0 {
        ring.outwards_m(0.0, far) - ring.outwards_m(0.0, near)
    } else if near.abs() <= far.abs() {
        ring.outwards_m(near, far)
    } else {
        -ring.outwards_m(far, near)
    }
}

/// A ring as its axis sees it. Radii count from the station's own, which keeps the digits of a
/// small height difference.
struct Ring {
    /// The station's distance from the centre.
    s: f64,
    /// Squared chords on the unit sphere from the axis to the inner and the outer edge, and their
    /// difference.
    inner: f64,
    outer: f64,
    difference: f64,
}

impl Ring {
    fn new(s: f64, psi1: f64, psi2: f64) -> Self {
        Self {
            s,
            inner: 4.0 * (0.5 * psi1).sin().powi(2),
            outer: 4.0 * (0.5 * psi2).sin().powi(2),
            difference: 4.0 * (0.5 * (psi2 - psi1)).sin() * (0.5 * (psi2 + psi1)).sin(),
        }
    }

    /// Distance from the station to a circle of the sphere of radius s + t.
    fn distance(&self, t: f64, chord2: f64) -> f64 {
        (t * t + self.s * (self.s + t) * chord2).sqrt()
    }

    /// Attraction of the sphere of radius s + t, per unit of its thickness.
    fn sphere(&self, t: f64) -> f64 {
        let (s, r) = (self.s, self.s + t);
        let (l1, l2) = (self.distance(t, self.inner), self.distance(t, self.outer));
        // on the axis (s - r)/l1 is 1 or -1, also where l1 vanishes
        let towards = if self.inner == 0.0 {
            -t.signum()
        } else {
            -t / l1
        };
        PI * r / (s * s) * (s * r * self.difference / (l1 + l2)) * (1.0 + towards * (s + r) / l2)
    }

    /// From `near` to `far`, both on one side of the station's radius, `near` the closer one.
    fn outwards_m(&self, near: f64, far: f64) -> f64 {
        if self.difference == 0.0 {
            return 0.0; // without width there is no ring, and no width to step by
        }
        let edge = if self.inner == 0.0 {
            self.outer
        } else {
            self.inner
        };
        let (mut from, mut sum) = (near, 0.0);
        loop {
            let step = 0.5 * self.distance(from, edge);
            // what is not a number ends up in the last panel, and the result is none either
            let more = (far - from).abs() > step;
            let to = if more {
                from + step.copysign(far - from)
            } else {
                far
            };
            sum += gauss::integral(from, to, |t| self.sphere(t));
            if !more {
                return sum;
            }
            from = to;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::bodies::column::column_per_area;
    use approx::assert_relative_eq;
    use gauss_quad::GaussLegendre;
    use proptest::prelude::*;
    use std::f64::consts::TAU;

    #[test]
    fn whole_shell() {
        // Newton: outside a shell as if its mass were at the centre, inside nothing
        let (r1, r2) = (6.371e6, 6.373e6_f64);
        let volume = 4.0 / 3.0 * PI * (r2 - r1) * (r2 * r2 + r2 * r1 + r1 * r1);
        for s in [r2, r2 + 1.0, 7e6] {
            assert_relative_eq!(
                ring_m(s, 0.0, PI, r1, r2),
                volume / (s * s),
                max_relative = 1e-13
            );
        }
        for s in [r1, r1 - 1.0, 6e6] {
            assert!(ring_m(s, 0.0, PI, r1, r2).abs() < 1e-12 * (r2 - r1));
        }
    }

    #[test]
    fn nan_stays_nan() {
        assert!(cap_mgal(f64::NAN, 1e5, 2670.0, 6.674e-11).is_nan());
        assert!(cap_mgal(100.0, f64::NAN, 2670.0, 6.674e-11).is_nan());
    }

    #[test]
    fn no_attraction_without_width_or_thickness() {
        assert_eq!(cap_mgal(100.0, 0.0, 2670.0, 6.674e-11), 0.0);
        assert_eq!(cap_mgal(0.0, 1e5, 2670.0, 6.674e-11), 0.0);
        assert_eq!(ring_m(6.4e6, 0.1, 0.1, 6.3e6, 6.4e6), 0.0);
        assert_eq!(ring_m(6.4e6, 0.1, 0.2, 6.4e6, 6.4e6), 0.0);
    }

    proptest! {
        #[test]
        fn rings_join(
            h in -5e3..9e3f64, log_r1 in -1.0..5.0f64, log_width in -2.0..5.0f64, low in -5e3..9e3f64, log_dh in -5.0..3.5f64,
            cut in 0.1..0.9f64,
        ) {
            let s = EARTH_RADIUS_M + h;
            let psi1 = 10f64.powf(log_r1) / EARTH_RADIUS_M;
            let psi2 = psi1 + 10f64.powf(log_width) / EARTH_RADIUS_M;
            let (r1, r2) = (EARTH_RADIUS_M + low, EARTH_RADIUS_M + low + 10f64.powf(log_dh));
            let (psi, r) = (psi1 + cut * (psi2 - psi1), r1 + cut * (r2 - r1));
            let whole = ring_m(s, psi1, psi2, r1, r2);
            // what may cancel: mass above against mass below, height against curvature
            let below = ring_m(s, psi1, psi2, r1.min(s), r2.min(s));
            let above = ring_m(s, psi1, psi2, r1.max(s), r2.max(s));
            let size = below.abs() + above.abs() + PI * (psi2 - psi1) * (r2 - r1);
            let parts = ring_m(s, psi1, psi, r1, r2) + ring_m(s, psi, psi2, r1, r2);
            // psi itself is rounded: 1e-16 of psi1 is a share 1e-16 psi1/(psi2 - psi1) of the ring
            let rounding = 1e-13 + 1e-15 * psi1 / (psi2 - psi1);
            prop_assert!((parts - whole).abs() <= rounding * size, "{parts} {whole}");
            let parts = ring_m(s, psi1, psi2, r1, r) + ring_m(s, psi1, psi2, r, r2);
            prop_assert!((parts - whole).abs() <= 1e-13 * size, "{parts} {whole}");
        }

        /// A ring is the sum of the columns that stand in it: two derivations of one body.
        #[test]
        fn ring_is_its_columns(
            h in -500.0..9e3f64, log_r1 in 0.0..5.0f64, log_ratio in 0.01..0.7f64, log_dh in -6.0..3.9f64, up in any::<bool>(),
        ) {
            let s = EARTH_RADIUS_M + h;
            let dh = 10f64.powf(log_dh) * if up { 1.0 } else { -1.0 };
            let psi1 = 10f64.powf(log_r1) / s;
            let psi2 = psi1 * 10f64.powf(log_ratio);
            let column = |psi: f64| {
                let sink = 2.0 * s * (0.5 * psi).sin().powi(2); // of the ground below the station's level
                let d = 2.0 * s * (0.5 * psi).sin();
                let per_area = column_per_area(sink, -psi.cos(), sink, d * d, 1.0 / s, 1.0 / s, dh);
                TAU * s * s * psi.sin() * per_area
            };
            let rule = GaussLegendre::new(30.try_into().unwrap());
            let sum = rule.integrate(psi1, psi2, column);
            let modulus = rule.integrate(psi1, psi2, |psi| column(psi).abs());
            let ring = Ring::new(s, psi1, psi2).outwards_m(0.0, dh);
            prop_assert!((ring - sum).abs() <= 3e-13 * modulus, "{ring:e} {sum:e} of {modulus:e}");
        }
    }
}
