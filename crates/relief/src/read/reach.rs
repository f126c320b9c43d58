//! How far from the stations a DEM matters.

use hillpull_physics::ellipsoid::{Ellipsoid, Vec3, norm, sub};

/// A cap on the ellipsoid that holds every station and everything within the outer radius of any.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reach {
    /// Geodetic longitude of the middle on WGS 84, radians.
    pub lon_rad: f64,
    /// Geodetic latitude of the middle on WGS 84, radians.
    pub lat_rad: f64,
    /// Radius, metres. Posts whose straight distance from the middle is at most this are within reach.
    pub radius_m: f64,
}

impl Reach {
    /// The reach of stations at (longitude, latitude) in degrees on WGS 84. None if there are none.
    ///
    /// The middle comes within a few percent of the smallest ball around the stations by the core-set steps of
    /// [`BADOIU_CLARKSON_2003`](hillpull_physics::bibliography::BADOIU_CLARKSON_2003); the radius is exact for that middle. Distances are straight lines through the Earth,
    /// never longer than the ground distances the outer radius is measured in, so nothing within it is lost.
    /// Stations that are not finite are left out.
    #[must_use]
    pub fn around(stations: &[(f64, f64)], outer_radius_m: f64) -> Option<Self> {
        const STEPS: usize = 64;
        let feet: Vec<Vec3> = stations
            .iter()
            .filter(|(lon, lat)| lon.is_finite() && lat.is_finite())
            .map(|(lon, lat)| Ellipsoid::WGS84.foot_ecef_m(lon.to_radians(), lat.to_radians()))
            .collect();
        let mut middle = *feet.first()?;
        for step in 1..=STEPS {
            let (far, _) = farthest(&feet, middle);
            let share = 1.0 / (step as f64 + 1.0);
            for k in 0..3 {
                middle[k] += share * (far[k] - middle[k]);
            }
        }
        // stations all round the Earth leave the middle nowhere; any place will do
        let (lon_rad, lat_rad) = Ellipsoid::WGS84.lonlat_rad(middle);
        let foot = Ellipsoid::WGS84.foot_ecef_m(lon_rad, lat_rad);
        let (_, spread_m) = farthest(&feet, foot);
        Some(Self {
            lon_rad,
            lat_rad,
            radius_m: spread_m + outer_radius_m,
        })
    }

    /// The middle in ECEF, metres.
    pub(super) fn middle_ecef_m(&self) -> Vec3 {
        Ellipsoid::WGS84.foot_ecef_m(self.lon_rad, self.lat_rad)
    }
}

/// The point farthest from `middle`, and its distance. The first of equals.
fn farthest(points: &[Vec3], middle: Vec3) -> (Vec3, f64) {
    let mut best = (middle, 0.0);
    for &point in points {
        let distance = norm(sub(point, middle));
        if distance > best.1 {
            best = (point, distance);
        }
    }
    best
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn chord_m(reach: &Reach, lon_deg: f64, lat_deg: f64) -> f64 {
        let foot = Ellipsoid::WGS84.foot_ecef_m(lon_deg.to_radians(), lat_deg.to_radians());
        norm(sub(foot, reach.middle_ecef_m()))
    }

    #[test]
    fn no_stations_no_reach() {
        assert_eq!(Reach::around(&[], 1.0), None);
        assert_eq!(Reach::around(&[(f64::NAN, 3.0)], 1.0), None);
    }

    #[test]
    fn one_station_is_the_middle() {
        let reach = Reach::around(&[(7.5, 46.0)], 5000.0).unwrap();
        assert!((reach.lon_rad.to_degrees() - 7.5).abs() < 1e-12);
        assert!((reach.lat_rad.to_degrees() - 46.0).abs() < 1e-9);
        assert!((reach.radius_m - 5000.0).abs() < 1e-6, "{reach:?}");
    }

    #[test]
    fn across_the_antimeridian_and_over_the_pole() {
        let reach = Reach::around(&[(179.0, 0.0), (-179.0, 0.0)], 0.0).unwrap();
        assert!((reach.lon_rad.to_degrees().abs() - 180.0).abs() < 0.05);
        // half of 2 degrees of the equator, 111 319.5 m each
        assert!((reach.radius_m / 111_319.5 - 1.0).abs() < 0.05, "{reach:?}");
        let reach = Reach::around(
            &[(0.0, 89.0), (90.0, 89.0), (180.0, 89.0), (-90.0, 89.0)],
            0.0,
        );
        assert!((reach.unwrap().lat_rad.to_degrees() - 90.0).abs() < 0.05);
    }

    proptest! {
        #[test]
        fn holds_every_station(
            stations in prop::collection::vec((-180.0..180.0f64, -90.0..90.0f64), 1..30),
            outer in 0.0..2e5f64,
        ) {
            let reach = Reach::around(&stations, outer).unwrap();
            for &(lon, lat) in &stations {
                prop_assert!(chord_m(&reach, lon, lat) + outer <= reach.radius_m * (1.0 + 1e-12));
            }
        }

        #[test]
        fn is_hardly_larger_than_needed(
            lon in -180.0..180.0f64, lat in -80.0..80.0f64,
            offsets in prop::collection::vec((-1.0..1.0f64, -1.0..1.0f64), 2..30),
        ) {
            // no ball is smaller than half the longest distance between two stations, nor need it be
            // larger than that times 2/sqrt(3) in a plane (Jung 1901); 10 % for the steps left out
            let stations: Vec<_> = offsets.iter().map(|(x, y)| (lon + x, lat + y)).collect();
            let reach = Reach::around(&stations, 0.0).unwrap();
            let feet: Vec<_> = stations.iter()
                .map(|(x, y)| Ellipsoid::WGS84.foot_ecef_m(x.to_radians(), y.to_radians())).collect();
            let longest = feet.iter().flat_map(|a| feet.iter().map(move |b| norm(sub(*a, *b))))
                .fold(0.0, f64::max);
            prop_assert!(reach.radius_m <= 0.5 * longest * 2.0 / 3f64.sqrt() * 1.1 + 2000.0);
        }
    }
}
