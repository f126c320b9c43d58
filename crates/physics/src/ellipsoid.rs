//! The ellipsoid: positions, normals, radii of curvature, and distances along the ground.

use crate::constants::{EARTH_RADIUS_M, WGS84_A_M, WGS84_INV_F};

/// A position or direction in the Earth-centred, Earth-fixed frame (ECEF), metres for positions.
pub type Vec3 = [f64; 3];

/// Scalar product.
#[must_use]
#[inline]
pub fn dot(a: Vec3, b: Vec3) -> f64 {
    a[0] * b[0] + a[1] * b[1] + a[2] * b[2]
}

/// Sum.
#[must_use]
#[inline]
pub fn add(a: Vec3, b: Vec3) -> Vec3 {
    [a[0] + b[0], a[1] + b[1], a[2] + b[2]]
}

/// Difference a - b.
#[must_use]
#[inline]
pub fn sub(a: Vec3, b: Vec3) -> Vec3 {
    [a[0] - b[0], a[1] - b[1], a[2] - b[2]]
}

/// Vector times number.
#[must_use]
#[inline]
pub fn scale(a: Vec3, s: f64) -> Vec3 {
    [a[0] * s, a[1] * s, a[2] * s]
}

/// Vector product a x b.
#[must_use]
#[inline]
pub fn cross(a: Vec3, b: Vec3) -> Vec3 {
    [
        a[1] * b[2] - a[2] * b[1],
        a[2] * b[0] - a[0] * b[2],
        a[0] * b[1] - a[1] * b[0],
    ]
}

/// Length.
#[must_use]
#[inline]
pub fn norm(a: Vec3) -> f64 {
    dot(a, a).sqrt()
}

/// Unit vectors east, north and up (along the ellipsoid normal) at a point, in ECEF.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Frame {
    /// East.
    pub east: Vec3,
    /// North.
    pub north: Vec3,
    /// Up, along the ellipsoid normal.
    pub up: Vec3,
}

/// An ellipsoid of revolution.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Ellipsoid {
    /// Equatorial radius, metres.
    pub a_m: f64,
    /// First eccentricity squared.
    pub e2: f64,
}

impl Ellipsoid {
    /// WGS 84 ([`WGS84`](crate::bibliography::WGS84)).
    pub const WGS84: Self = Self::from_inverse_flattening(WGS84_A_M, WGS84_INV_F);

    /// From equatorial radius in metres and inverse flattening: e2 = f (2 - f).
    #[must_use]
    pub const fn from_inverse_flattening(a_m: f64, inverse_flattening: f64) -> Self {
        let f = 1.0 / inverse_flattening;
        Self {
            a_m,
            e2: f * (2.0 - f),
        }
    }

    /// A sphere.
    #[must_use]
    pub const fn sphere(radius_m: f64) -> Self {
        Self {
            a_m: radius_m,
            e2: 0.0,
        }
    }

    /// Radius of curvature M of the meridian, metres, at geodetic latitude `lat_rad`.
    #[must_use]
    #[inline]
    pub fn meridian_radius_m(&self, lat_rad: f64) -> f64 {
        let w2 = self.w2(lat_rad.sin());
        self.a_m * (1.0 - self.e2) / (w2 * w2.sqrt())
    }

    /// Radius of curvature N of the prime vertical, metres, at geodetic latitude `lat_rad`.
    #[must_use]
    #[inline]
    pub fn prime_vertical_radius_m(&self, lat_rad: f64) -> f64 {
        self.a_m / self.w2(lat_rad.sin()).sqrt()
    }

    /// ECEF position, metres, of the point at height 0 at geodetic longitude and latitude.
    #[must_use]
    #[inline]
    pub fn foot_ecef_m(&self, lon_rad: f64, lat_rad: f64) -> Vec3 {
        let (sin_lat, cos_lat) = lat_rad.sin_cos();
        let (sin_lon, cos_lon) = lon_rad.sin_cos();
        let n = self.a_m / self.w2(sin_lat).sqrt();
        [
            n * cos_lat * cos_lon,
            n * cos_lat * sin_lon,
            n * (1.0 - self.e2) * sin_lat,
        ]
    }

    /// Unit normal of the ellipsoid, outward.
    #[must_use]
    #[inline]
    pub fn normal(&self, lon_rad: f64, lat_rad: f64) -> Vec3 {
        let (sin_lat, cos_lat) = lat_rad.sin_cos();
        let (sin_lon, cos_lon) = lon_rad.sin_cos();
        [cos_lat * cos_lon, cos_lat * sin_lon, sin_lat]
    }

    /// East, north and up at geodetic longitude and latitude.
    #[must_use]
    pub fn local_frame(&self, lon_rad: f64, lat_rad: f64) -> Frame {
        let (sin_lat, cos_lat) = lat_rad.sin_cos();
        let (sin_lon, cos_lon) = lon_rad.sin_cos();
        Frame {
            east: [-sin_lon, cos_lon, 0.0],
            north: [-sin_lat * cos_lon, -sin_lat * sin_lon, cos_lat],
            up: [cos_lat * cos_lon, cos_lat * sin_lon, sin_lat],
        }
    }

    /// Geodetic (longitude, latitude), radians, of a point near the surface, longitude in (-pi,
    /// pi].
    ///
    /// One step of [`BOWRING_1976`](crate::bibliography::BOWRING_1976): exact on the ellipsoid, and
    /// within 2e-13 rad (about 1 um) for heights up to 10 km.
    #[must_use]
    pub fn lonlat_rad(&self, ecef_m: Vec3) -> (f64, f64) {
        let [x, y, z] = ecef_m;
        let p = x.hypot(y);
        let flat = (1.0 - self.e2).sqrt(); // b / a
        let b_m = self.a_m * flat;
        // reduced latitude, starting from the point's own
        let u = z.atan2(p * flat);
        let (sin_u, cos_u) = u.sin_cos();
        let ep2 = self.e2 / (1.0 - self.e2);
        let lat = (z + ep2 * b_m * sin_u.powi(3)).atan2(p - self.e2 * self.a_m * cos_u.powi(3));
        (y.atan2(x), lat)
    }

    #[inline]
    fn w2(&self, sin_lat: f64) -> f64 {
        1.0 - self.e2 * sin_lat * sin_lat
    }
}

/// Chord, metres, of an arc along the ground: c = 2 R sin(arc / 2R), R = 6371 km.
///
/// ```
/// use hillpull_physics::ellipsoid::{arc_from_chord_m, chord_from_arc_m};
/// let chord_m = chord_from_arc_m(166_735.0);
/// assert!((166_735.0 - chord_m - 4.76).abs() < 0.01); // arc^3 / (24 R^2)
/// assert!((arc_from_chord_m(chord_m) - 166_735.0).abs() < 1e-9);
/// ```
#[must_use]
pub fn chord_from_arc_m(arc_m: f64) -> f64 {
    2.0 * EARTH_RADIUS_M * (arc_m / (2.0 * EARTH_RADIUS_M)).sin()
}

/// Arc along the ground, metres, over a chord: 2 R asin(c / 2R), R = 6371 km. NaN for a chord above
/// 2 R.
#[must_use]
pub fn arc_from_chord_m(chord_m: f64) -> f64 {
    2.0 * EARTH_RADIUS_M * (chord_m / (2.0 * EARTH_RADIUS_M)).asin()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use proptest::prelude::*;

    #[test]
    fn radii_at_equator_and_pole() {
        let e = Ellipsoid::WGS84;
        // NIMA TR8350.2 table 3.3 (recalled from memory): e2, polar radius of curvature a^2/b,
        // semi-minor axis b
        assert_relative_eq!(e.e2, 6.694_379_990_14e-3, max_relative = 1e-11);
        let pole = std::f64::consts::FRAC_PI_2;
        assert_relative_eq!(
            e.meridian_radius_m(pole),
            6_399_593.625_8,
            max_relative = 1e-11
        );
        assert_relative_eq!(
            e.prime_vertical_radius_m(pole),
            6_399_593.625_8,
            max_relative = 1e-11
        );
        assert_relative_eq!(
            e.foot_ecef_m(0.3, pole)[2],
            6_356_752.314_2,
            max_relative = 1e-11
        );
        // at the equator M = a (1 - e2) = b^2 / a
        assert_relative_eq!(
            e.meridian_radius_m(0.0),
            6_356_752.314_245_f64.powi(2) / WGS84_A_M,
            max_relative = 1e-12
        );
        assert_eq!(e.prime_vertical_radius_m(0.0), WGS84_A_M);
    }

    #[test]
    fn curvature_is_the_rate_of_the_foot() {
        let e = Ellipsoid::WGS84;
        let (lon, lat, step) = (0.4, 0.8, 1e-5);
        let north = norm(sub(
            e.foot_ecef_m(lon, lat + step),
            e.foot_ecef_m(lon, lat - step),
        )) / (2.0 * step);
        let east = norm(sub(
            e.foot_ecef_m(lon + step, lat),
            e.foot_ecef_m(lon - step, lat),
        )) / (2.0 * step);
        assert_relative_eq!(north, e.meridian_radius_m(lat), max_relative = 1e-9);
        assert_relative_eq!(
            east,
            e.prime_vertical_radius_m(lat) * lat.cos(),
            max_relative = 1e-9
        );
    }

    proptest! {
        #[test]
        fn frame_is_right_handed(lon in -3.2..3.2f64, lat in -1.5..1.5f64) {
            let f = Ellipsoid::WGS84.local_frame(lon, lat);
            prop_assert!(norm(sub(cross(f.east, f.north), f.up)) < 1e-15);
            prop_assert!(dot(f.east, f.up).abs() < 1e-15);
            prop_assert_eq!(f.up, Ellipsoid::WGS84.normal(lon, lat));
        }

        #[test]
        fn lonlat_inverts_the_foot(lon in -3.1..3.1f64, lat in -1.5..1.5f64, height in -10_000.0..10_000.0f64) {
            let e = Ellipsoid::WGS84;
            let point = add(e.foot_ecef_m(lon, lat), scale(e.normal(lon, lat), height));
            let (lon2, lat2) = e.lonlat_rad(point);
            prop_assert!((lat2 - lat).abs() < 2e-13, "latitude off by {:e}", lat2 - lat);
            prop_assert!((lon2 - lon).abs() * lat.cos() < 2e-15);
        }
    }
}
