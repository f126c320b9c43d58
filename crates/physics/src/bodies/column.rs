//! The column of terrain over a ground point, along the ellipsoid's normal there.

/// Attraction of a column per unit of area at station level and of `G rho`, 1/m, positive down.
///
/// The column stands over a ground point Q, from station level (z = 0) to `dh_m` above it (or down
/// to it, then the column is rock missing and counts negative). With P the station, u its normal, n
/// the normal at Q and D = Q(at station level) - P:
///
/// | argument | meaning |
/// |---|---|
/// | `c0_m`, `c1` | -u.D and -u.n |
/// | `b_m`, `d2_m2` | D.n and D.D |
/// | `kappa_m_per_m`, `kappa_n_per_m` | 1/(M + H_P) and 1/(N + H_P) at Q; both 0 on a plane |
/// | `dh_m` | height of the surface less height of the station |
///
/// The area that multiplies the result is (1 + H_P/M)(1 + H_P/N) times the area on the ellipsoid.
///
/// The value is Newton's law over the ellipsoid's volume element:
///
/// ```text
/// integral of (c0 + c1 z) (1 + z/M') (1 + z/N') / (d2 + 2 b z + z^2)^(3/2) dz from 0 to dh
/// ```
///
/// It is written in the integrals I0..I3 of z^k / l^3, in a form that does not cancel however thin,
/// tall, near or far the column is (derivation in the source). Only a station on the column's own
/// axis (d = 0) has no value: NaN or an infinity is returned.
///
/// On a plane it is -(1/r - 1/sqrt(r^2 + dh^2)):
///
/// ```
/// use hillpull_physics::bodies::column::column_per_area;
/// let (r_m, dh_m) = (300.0_f64, -400.0_f64);
/// let flat = column_per_area(0.0, -1.0, 0.0, r_m * r_m, 0.0, 0.0, dh_m);
/// assert!((flat + (1.0 / 300.0 - 1.0 / 500.0)).abs() < 1e-18);
/// ```
#[must_use]
#[inline]
pub fn column_per_area(
    c0_m: f64,
    c1: f64,
    b_m: f64,
    d2_m2: f64,
    kappa_m_per_m: f64,
    kappa_n_per_m: f64,
    dh_m: f64,
) -> f64 {
    let [i0, i1, i2, i3] = moments(b_m, d2_m2, dh_m);
    let k1 = kappa_m_per_m + kappa_n_per_m;
    let k2 = kappa_m_per_m * kappa_n_per_m;
    c0_m * (i0 + k1 * i1 + k2 * i2) + c1 * (i1 + k1 * i2 + k2 * i3)
}

/// I0..I3: integrals over t from 0 to z of t^k / l^3, l^2 = d2 + 2 b t + t^2.
///
/// The textbook forms, with q = d^2 - b^2, L = l(z) and Lambda the integral of 1/l,
///
/// ```text
/// I0 = [(t + b)/(q l)]            I2 = Lambda - 2 b I1 - d^2 I0
/// I1 = [-(d^2 + b t)/(q l)]       I3 = (L - d) - b Lambda - 2 b I2 - d^2 I1
/// ```
///
/// are differences of nearly equal numbers when |z| << d. With
///
/// ```text
/// w = z/(L + d)    v = d + b w    L - d = w (2b + z)    z = w (L + d)    Lambda = 2 atanh w
/// ```
///
/// every difference can be carried out by hand, q drops out, and what is left is
///
/// ```text
/// I0 = z/(d L v)    I1 = z w/(L v)
/// I2 = d w^2 z/(L v) + 2 (atanh w - w)
/// I3 = d w^2 z^2/(L v) + b w^4 (z/v - 6 w T)
/// T = (atanh w - w - w^3/3)/w^5 = 1/5 + w^2/7 + w^4/9 ...
/// ```
#[inline]
fn moments(b: f64, d2: f64, z: f64) -> [f64; 4] {
    let d = d2.sqrt();
    let l = (d2 + z * (2.0 * b + z)).sqrt();
    let w = z / (l + d);
    let v = d + b * w;
    let z_lv = z / (l * v);
    let w2 = w * w;
    let t = atanh_tail(w, || {
        // 1 - |w| without cancellation, for a column much taller than it is distant
        let z = z.abs();
        (d + (d2 + 2.0 * b * z.copysign(w)) / (l + z)) / (l + d)
    });
    let dw2z_lv = d * w2 * z_lv;
    [
        z_lv / d,
        w * z_lv,
        dw2z_lv + 2.0 * w * w2 * (1.0 / 3.0 + w2 * t),
        z * dw2z_lv + b * w2 * w2 * (l * z_lv - 6.0 * w * t),
    ]
}

/// T(w) = (atanh w - w - w^3/3)/w^5. `gap` returns 1 - |w|.
#[inline]
fn atanh_tail(w: f64, gap: impl FnOnce() -> f64) -> f64 {
    let w2 = w * w;
    if w2 < 1.0 / 64.0 {
        // next term: w^18/23 < 3e-18
        let mut t = 1.0 / 21.0;
        for odd in [19.0, 17.0, 15.0, 13.0, 11.0, 9.0, 7.0, 5.0] {
            t = t * w2 + 1.0 / odd;
        }
        t
    } else {
        let w = w.abs();
        let atanh = 0.5 * (2.0 * w / gap()).ln_1p();
        (atanh - w - w * w2 / 3.0) / (w * w2 * w2)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use gauss_quad::GaussLegendre;
    use proptest::prelude::*;
    use std::sync::LazyLock;

    static RULE: LazyLock<GaussLegendre> =
        LazyLock::new(|| GaussLegendre::new(20.try_into().unwrap()));

    /// Integral of f over 0..z in panels that widen with the distance from the station.
    fn quadrature(d: f64, z: f64, f: impl Fn(f64) -> f64) -> f64 {
        let (mut from, mut parts) = (0.0, Vec::new());
        while from < z.abs() {
            let to = z.abs().min(from + 0.5 * d.hypot(from));
            parts.push(RULE.integrate(from.copysign(z), to.copysign(z), &f));
            from = to;
        }
        parts.iter().rev().sum() // small ones first
    }

    fn check(d: f64, b: f64, z: f64) {
        let l2 = |t: f64| d * d + t * (2.0 * b + t);
        let found = moments(b, d * d, z);
        for (k, found) in found.into_iter().enumerate() {
            let expected = quadrature(d, z, |t| t.powi(k as i32) / (l2(t) * l2(t).sqrt()));
            assert_relative_eq!(found, expected, max_relative = 1e-13);
        }
    }

    #[test]
    fn moments_near_and_far() {
        for exponent in -16..=6 {
            let ratio = 10f64.powf(f64::from(exponent) / 2.0);
            for tilt in [-0.04, -1e-3, -1e-9, 0.0, 1e-6, 0.013, 0.04] {
                for d in [0.01, 1.0, 3e4, 166_735.0] {
                    check(d, tilt * d, ratio * d);
                    check(d, tilt * d, -ratio * d);
                }
            }
        }
    }

    #[test]
    fn moments_on_both_sides_of_the_series() {
        for w in [0.1249f64, 0.1251] {
            let z = 2.0 * w / (1.0 - w * w); // b = 0, d = 1: w = z/(1 + sqrt(1 + z^2))
            check(1.0, 0.01, z);
            check(1.0, -0.01, -z);
        }
    }

    #[test]
    fn no_attraction_without_thickness() {
        assert_eq!(column_per_area(1.0, -1.0, 0.1, 100.0, 1e-7, 1e-7, 0.0), 0.0);
    }

    #[test]
    fn nan_stays_nan() {
        assert!(column_per_area(0.0, -1.0, 0.0, 100.0, 0.0, 0.0, f64::NAN).is_nan());
        assert!(column_per_area(0.0, -1.0, f64::NAN, 100.0, 0.0, 0.0, 1.0).is_nan());
    }

    proptest! {
        #[test]
        fn moments_for_any_shape(
            log_d in -3.0..6.0f64, log_ratio in -8.0..3.0f64, up in any::<bool>(), tilt in -0.05..0.05f64,
        ) {
            let d = 10f64.powf(log_d);
            let z = d * 10f64.powf(log_ratio) * if up { 1.0 } else { -1.0 };
            check(d, tilt * d, z);
        }

        /// The whole integrand with Earth-like curvature; the scale of the error is the integral of
        /// its modulus.
        #[test]
        fn whole_column(
            log_d in 0.0..5.3f64, log_ratio in -8.0..3.0f64, up in any::<bool>(),
            c0 in -1.0..1.0f64, tilt in -0.02..0.02f64, c1 in -1.0..-0.99f64,
        ) {
            let d = 10f64.powf(log_d);
            let z = (d * 10f64.powf(log_ratio)).min(9e3) * if up { 1.0 } else { -1.0 };
            let (b, c0, km, kn) = (tilt * d, 0.02 * c0 * d, 1.0 / 6.36e6, 1.0 / 6.39e6);
            let f = |t: f64| (c0 + c1 * t) * (1.0 + t * km) * (1.0 + t * kn) / (d * d + t * (2.0 * b + t)).powf(1.5);
            let expected = quadrature(d, z, f);
            let scale = quadrature(d, z, |t| f(t).abs()).abs();
            let found = column_per_area(c0, c1, b, d * d, km, kn, z);
            prop_assert!((found - expected).abs() <= 1e-13 * scale, "{found:e} {expected:e} {scale:e}");
        }
    }
}
