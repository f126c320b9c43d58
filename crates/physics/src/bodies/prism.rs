//! The rectangular prism with vertical sides.

use super::gauss;

/// Below this share of its corner terms a sum has lost too many digits to be used.
const WELL_CONDITIONED: f64 = 1e-2;

/// A prism this many half-diagonals away is integrated by quadrature (8 x 8 points: relative error
/// 5e-15).
const FAR: f64 = 5.0;

/// Attraction of a rectangular prism per unit of `G rho`, metres, positive down (mass below the
/// station pulls down).
///
/// `x_m`, `y_m`, `z_m` are the (lower, upper) limits in metres, station at the origin, z up. The
/// station may be anywhere, also inside or on a face, edge or corner. Swapped limits change the
/// sign.
///
/// Three forms of one integral, so that about 13 digits are good for any shape and distance; a body
/// that reaches above and below station level is cut there first, and its two parts may of course
/// cancel:
///
/// 1. the 8-corner closed form of [`NAGY_1966`](crate::bibliography::NAGY_1966) and
///    [`NAGY_2000`](crate::bibliography::NAGY_2000), with the difference over z taken by hand in
///    each vertical edge, so that a thin prism does not cancel;
/// 2. where the four edges still cancel (their sum is under 1 % of the terms) and the prism's
///    middle is at least 5 half-diagonals away, Gauss quadrature over its footprint of 1/l(top) -
///    1/l(bottom), in difference form;
/// 3. where they cancel and the prism is near, the prism is halved.
///
/// ```
/// use hillpull_physics::bodies::prism::prism_m;
/// // a wide plate approaches the infinite one: 2 pi times its thickness
/// let plate_m = prism_m([-1e7, 1e7], [-1e7, 1e7], [-1.0, 0.0]);
/// assert!((plate_m / std::f64::consts::TAU - 1.0).abs() < 1e-6);
/// ```
#[must_use]
pub fn prism_m(x_m: [f64; 2], y_m: [f64; 2], z_m: [f64; 2]) -> f64 {
    let [bottom, top] = z_m;
    if bottom < 0.0 && top > 0.0 || bottom > 0.0 && top < 0.0 {
        return one_side(x_m, y_m, [0.0, -bottom]) - one_side(x_m, y_m, [0.0, top]);
    }
    if bottom > 0.0 || top > 0.0 {
        -one_side(x_m, y_m, [bottom, top])
    } else {
        one_side(x_m, y_m, [-top, -bottom])
    }
}

/// Prism between distances `z[0]` and `z[1]` (both of one sign or zero) from station level, as if
/// below it.
fn one_side(x: [f64; 2], y: [f64; 2], z: [f64; 2]) -> f64 {
    let terms = [
        edge(x[1], y[1], z),
        -edge(x[0], y[1], z),
        -edge(x[1], y[0], z),
        edge(x[0], y[0], z),
    ];
    let sum = (terms[0] + terms[1]) + (terms[2] + terms[3]);
    let size: f64 = terms.iter().map(|t| t.abs()).sum();
    // a footprint around or touching the vertical through the station has terms of one sign, so
    // halving ends
    if sum.is_nan() || sum.abs() >= WELL_CONDITIONED * size {
        return sum;
    }
    let middle = [0.5 * (x[0] + x[1]), 0.5 * (y[0] + y[1])];
    let half = [0.5 * (x[1] - x[0]).abs(), 0.5 * (y[1] - y[0]).abs()];
    let depth = z[0].abs().min(z[1].abs());
    let distance = middle[0].hypot(middle[1]).hypot(depth);
    if distance >= FAR * half[0].hypot(half[1]) {
        far(x, y, z)
    } else if half[0] >= half[1] {
        one_side([x[0], middle[0]], y, z) + one_side([middle[0], x[1]], y, z)
    } else {
        one_side(x, [y[0], middle[1]], z) + one_side(x, [middle[1], y[1]], z)
    }
}

/// Prism from the vertical through the station to the vertical edge at (x, y), between depths z0
/// and z1: the integral over z of atan(x y / (z r)). With p^2 = x^2 + z^2 and q^2 = y^2 + z^2 it is
///
/// ```text
/// [z atan(x y / (z r)) - x asinh(y / p) - y asinh(x / q)]
/// ```
///
/// whose differences over z are taken by hand, with r1 - r0 = (z1 - z0)(z1 + z0)/(r1 + r0).
fn edge(x: f64, y: f64, [z0, z1]: [f64; 2]) -> f64 {
    if x == 0.0 || y == 0.0 {
        return 0.0;
    }
    let xy = x * y;
    let horizontal2 = x * x + y * y;
    let (r0, r1) = (
        (horizontal2 + z0 * z0).sqrt(),
        (horizontal2 + z1 * z1).sqrt(),
    );
    let dz = z1 - z0;
    let dr = dz * (z1 + z0) / (r1 + r0);
    dz * (xy).atan2(z1 * r1) - z0 * (xy * (dz * r1 + z0 * dr)).atan2(z0 * r0 * z1 * r1 + xy * xy)
        + x * (y * dr / (x.hypot(z0) * x.hypot(z1))).asinh()
        + y * (x * dr / (y.hypot(z0) * y.hypot(z1))).asinh()
}

/// Quadrature over the footprint of 1/l0 - 1/l1 = (z1 - z0)(z1 + z0)/(l0 l1 (l0 + l1)).
fn far(x: [f64; 2], y: [f64; 2], [z0, z1]: [f64; 2]) -> f64 {
    let sum = gauss::integral(x[0], x[1], |x| {
        gauss::integral(y[0], y[1], |y| {
            let horizontal2 = x * x + y * y;
            let (l0, l1) = (
                (horizontal2 + z0 * z0).sqrt(),
                (horizontal2 + z1 * z1).sqrt(),
            );
            1.0 / (l0 * l1 * (l0 + l1))
        })
    });
    (z1 - z0) * (z1 + z0) * sum
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use proptest::prelude::*;

    /// The closed form as its authors print it, one term a corner.
    fn eight_corners(x: [f64; 2], y: [f64; 2], z: [f64; 2]) -> f64 {
        let mut sum = 0.0;
        for (i, j, k) in (0..8).map(|n| (n & 1, n >> 1 & 1, n >> 2)) {
            let (x, y, z) = (x[i], y[j], z[k]);
            let r = (x * x + y * y + z * z).sqrt();
            let term = x * (y + r).ln() + y * (x + r).ln() - z * (x * y / (z * r)).atan();
            sum += if (i + j + k) % 2 == 1 { term } else { -term };
        }
        sum
    }

    #[test]
    fn corners_as_published() {
        for (x, y, z) in [
            ([-3.0, 5.0], [-2.0, 4.0], [-7.0, -1.0]),
            ([3.0, 5.0], [2.0, 4.0], [1.0, 6.0]),
            ([-9.0, -4.0], [1.0, 4.0], [-2.0, 6.0]),
        ] {
            assert_relative_eq!(
                prism_m(x, y, z),
                eight_corners(x, y, z),
                max_relative = 1e-12
            );
        }
    }

    #[test]
    fn nan_stays_nan() {
        for n in 0..6 {
            let mut limits = [1.0, 2.0, 1.0, 2.0, 1.0, 2.0];
            limits[n] = f64::NAN;
            let [x0, x1, y0, y1, z0, z1] = limits;
            assert!(prism_m([x0, x1], [y0, y1], [z0, z1]).is_nan(), "limit {n}");
        }
    }

    #[test]
    fn nothing_attracts_nothing() {
        assert_eq!(prism_m([0.0, 0.0], [-1.0, 1.0], [-1.0, 0.0]), 0.0);
        assert_eq!(prism_m([5.0, 5.0], [-1.0, 1.0], [-1.0, 1.0]), 0.0);
        assert_eq!(prism_m([5.0, 6.0], [-1.0, 1.0], [2.0, 2.0]), 0.0);
        assert_eq!(prism_m([5.0, 6.0], [-1.0, 1.0], [-3.0, 3.0]), 0.0);
    }

    fn signed(log: f64, up: bool) -> f64 {
        10f64.powf(log) * if up { 1.0 } else { -1.0 }
    }

    proptest! {
        /// Two parts make the whole, for slivers, needles, plates and dust from under the station
        /// out to 100 km.
        #[test]
        fn parts_join(
            log in [-4.0..5.0f64, -4.0..5.0f64, -4.0..4.0f64], negative in any::<[bool; 3]>(),
            log_size in [-4.0..4.0f64, -4.0..4.0f64, -4.0..4.0f64], cut in 0.1..0.9f64, axis in 0..3usize,
        ) {
            let limits: [[f64; 2]; 3] = std::array::from_fn(|i| {
                let from = signed(log[i], negative[i]);
                [from, from + 10f64.powf(log_size[i])]
            });
            let [low, high] = limits[axis];
            let middle = low + cut * (high - low);
            let (mut a, mut b) = (limits, limits);
            a[axis][1] = middle;
            b[axis][0] = middle;
            let of = |l: [[f64; 2]; 3]| prism_m(l[0], l[1], l[2]);
            let (a, b, whole) = (of(a), of(b), of(limits));
            // a body on both sides of station level: what its two sides amount to
            let [x, y, z] = limits;
            let size = prism_m(x, y, [z[0].min(0.0), z[1].min(0.0)]).abs() + prism_m(x, y, [z[0].max(0.0), z[1].max(0.0)]).abs();
            prop_assert!((a + b - whole).abs() <= 2e-12 * size, "{a:e} + {b:e} is not {whole:e}");
        }

        /// Far away every prism is a point: relative difference of the order (size/distance)^2.
        #[test]
        fn far_prism_is_a_point(
            distance in 1e4..2e5f64, azimuth in 0.0..6.3f64, size in [1e-3..100.0f64, 1e-3..100.0f64, 1e-3..100.0f64], depth in 1e2..3e3f64,
        ) {
            let (x, y, z) = (distance * azimuth.cos(), distance * azimuth.sin(), -depth);
            let around = |c: f64, s: f64| [c - 0.5 * s, c + 0.5 * s];
            let found = prism_m(around(x, size[0]), around(y, size[1]), around(z, size[2]));
            let r2 = x * x + y * y + z * z;
            // the size that floating point holds
            let volume: f64 = [(x, size[0]), (y, size[1]), (z, size[2])].iter().map(|&(c, s)| around(c, s)[1] - around(c, s)[0]).product();
            let largest = size[0].max(size[1]).max(size[2]);
            prop_assert!((found * r2 * r2.sqrt() / (volume * depth) - 1.0).abs() <= 3.0 * largest * largest / r2 + 1e-8);
        }
    }
}
