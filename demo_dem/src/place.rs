//! From the survey's map grid to the plane of the relief.
//!
//! The fine DEM and the stations are in UTM zone 26 north (EPSG:32626), the relief in its own plane of longitude and
//! latitude. So that heights come out with the same bits everywhere, the way is not asked of a library whose sines may
//! differ between machines: it is a polynomial, fitted to PROJ 9.1 over 24 km x 24 km, where it holds to a millimetre
//! (checked against PROJ in the tests). Whoever reads the DEMs goes through PROJ as with any other DEM.

use crate::relief::{CENTRE_LAT_DEG, CENTRE_LON_DEG, EAST_M_PER_DEG, NORTH_M_PER_DEG};

/// The survey's map grid.
pub const SURVEY_EPSG: u32 = 32626;

/// Origin of the polynomial, easting and northing in metres.
const ORIGIN_M: (f64, f64) = (339_000.0, 5_152_000.0);

/// Coefficients of 1, x, y, xx, xy, yy, xxx, xxy, xyy, yyy (x, y in km from the origin) for longitude in degrees.
const LON_DEG: [f64; 10] = [
    -29.0983281727327,
    1.302419303378e-02,
    -3.461589708056e-04,
    8.285887351092e-08,
    2.144743618973e-06,
    -8.285887176293e-08,
    -1.708115524138e-10,
    4.941815661725e-11,
    5.124276097170e-10,
    -1.647239521490e-11,
];

/// The same for latitude in degrees.
const LAT_DEG: [f64; 10] = [
    46.5023181945070,
    2.390307757911e-04,
    8.993506531697e-03,
    -7.410263446438e-07,
    7.463942640785e-08,
    -8.096892250875e-09,
    -8.098474234343e-12,
    -2.310654145257e-10,
    1.220907670713e-11,
    -1.684606584774e-13,
];

/// Longitude and latitude in degrees of a place in the survey's map grid, metres.
#[must_use]
pub fn lon_lat_deg(easting_m: f64, northing_m: f64) -> (f64, f64) {
    let (x, y) = (
        (easting_m - ORIGIN_M.0) / 1000.0,
        (northing_m - ORIGIN_M.1) / 1000.0,
    );
    let terms = [
        1.0,
        x,
        y,
        x * x,
        x * y,
        y * y,
        x * x * x,
        x * x * y,
        x * y * y,
        y * y * y,
    ];
    let sum = |coefficients: &[f64; 10]| {
        let mut sum = 0.0;
        for (c, term) in coefficients.iter().zip(terms) {
            sum += c * term;
        }
        sum
    };
    (sum(&LON_DEG), sum(&LAT_DEG))
}

/// Plane coordinates of the relief in metres from longitude and latitude in degrees.
#[must_use]
pub fn plane_from_lon_lat(lon_deg: f64, lat_deg: f64) -> (f64, f64) {
    (
        (lon_deg - CENTRE_LON_DEG) * EAST_M_PER_DEG,
        (lat_deg - CENTRE_LAT_DEG) * NORTH_M_PER_DEG,
    )
}

/// Plane coordinates of the relief in metres from the survey's map grid in metres.
#[must_use]
pub fn plane_from_survey(easting_m: f64, northing_m: f64) -> (f64, f64) {
    let (lon, lat) = lon_lat_deg(easting_m, northing_m);
    plane_from_lon_lat(lon, lat)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn polynomial_agrees_with_proj() {
        let proj =
            proj::Proj::new_known_crs(&format!("EPSG:{SURVEY_EPSG}"), "EPSG:4326", None).unwrap();
        for (east, north) in [
            (0.0, 0.0),
            (12e3, -12e3),
            (-12e3, -11e3),
            (7e3, 12e3),
            (-3e3, 5e3),
        ] {
            let (easting, northing) = (ORIGIN_M.0 + east, ORIGIN_M.1 + north);
            // The crate puts longitude first, whatever the axis order of the CRS.
            let (lon, lat) = proj.convert((easting, northing)).unwrap();
            let ours = lon_lat_deg(easting, northing);
            assert!(
                (ours.0 - lon).abs() * EAST_M_PER_DEG < 1e-3,
                "{ours:?} against {lon} {lat}"
            );
            assert!(
                (ours.1 - lat).abs() * NORTH_M_PER_DEG < 1e-3,
                "{ours:?} against {lon} {lat}"
            );
        }
    }
}
