//! From the table's coordinates to longitude and latitude on WGS 84.
use super::TableStation;
use crate::error::TableProblem;
use crate::gdal_log;
use gdal::spatial_ref::SpatialRef;
use proj::Proj;

/// WGS 84, longitude and latitude in degrees.
pub(crate) const WGS_84: &str = "EPSG:4326";

const LON_RANGE: (f64, f64) = (-180.0, 360.0);
const LAT_RANGE: (f64, f64) = (-90.0, 90.0);

/// A coordinate reference system that has been looked at.
#[derive(Debug)]
pub(crate) struct Crs {
    /// As given: an EPSG code, a PROJ string or WKT.
    pub(crate) definition: String,
    pub(crate) projected: bool,
    /// Its coordinates are degrees.
    degrees: bool,
}

impl Crs {
    /// Looks a system up.
    pub(crate) fn new(definition: &str) -> Result<Self, TableProblem> {
        let gdal = gdal_log::listen();
        let bad = |detail: String| TableProblem::BadCrs {
            crs: definition.to_owned(),
            detail,
        };
        let srs = SpatialRef::from_definition(definition).map_err(|e| bad(gdal.detail(&e)))?;
        let geographic = srs.is_geographic();
        if !geographic && !srs.is_projected() {
            return Err(bad("it is neither geographic nor projected".to_owned()));
        }
        // One degree in radians, as GDAL states the unit of a geographic system.
        let degrees = geographic && (srs.angular_units() - 1f64.to_radians()).abs() < 1e-9;
        Ok(Self {
            definition: definition.to_owned(),
            projected: !geographic,
            degrees,
        })
    }
}

/// Gives every station with coordinates its longitude and latitude. `name` names a station for messages.
pub(crate) fn place(
    stations: &mut [TableStation],
    crs: &Crs,
    name: impl Fn(usize) -> String,
) -> Result<(), TableProblem> {
    let placed: Vec<usize> = (0..stations.len())
        .filter(|&i| stations[i].x.is_finite())
        .collect();
    if crs.degrees {
        check_degrees(stations, &placed, |s| (s.x, s.y), &name)?;
    }
    let mut points: Vec<(f64, f64)> = placed
        .iter()
        .map(|&i| (stations[i].x, stations[i].y))
        .collect();
    if crs.definition != WGS_84 {
        carry(&mut points, crs, |k| {
            let s = &stations[placed[k]];
            TableProblem::OutsideCrs {
                row: s.row,
                station: name(placed[k]),
                x: s.x,
                y: s.y,
                crs: crs.definition.clone(),
            }
        })?;
    }
    for (&i, (lon, lat)) in placed.iter().zip(points) {
        stations[i].lon_deg = if lon > 180.0 { lon - 360.0 } else { lon };
        stations[i].lat_deg = lat;
    }
    check_degrees(stations, &placed, |s| (s.lon_deg, s.lat_deg), &name)
}

/// Carries points to WGS 84 in one go; if PROJ refuses, one by one to find the point it refuses.
fn carry(
    points: &mut [(f64, f64)],
    crs: &Crs,
    outside: impl Fn(usize) -> TableProblem,
) -> Result<(), TableProblem> {
    let proj =
        Proj::new_known_crs(&crs.definition, WGS_84, None).map_err(|e| TableProblem::BadCrs {
            crs: crs.definition.clone(),
            detail: e.to_string(),
        })?;
    let before = points.to_vec();
    if proj.convert_array(points).is_err() {
        for (k, &p) in before.iter().enumerate() {
            points[k] = proj.convert(p).map_err(|_| outside(k))?;
        }
    }
    match points
        .iter()
        .position(|p| !(p.0.is_finite() && p.1.is_finite()))
    {
        Some(k) => Err(outside(k)),
        None => Ok(()),
    }
}

fn check_degrees(
    stations: &[TableStation],
    placed: &[usize],
    of: impl Fn(&TableStation) -> (f64, f64),
    name: &impl Fn(usize) -> String,
) -> Result<(), TableProblem> {
    let within = |v: f64, range: (f64, f64)| (range.0..=range.1).contains(&v);
    let Some(&first) = placed.iter().find(|&&i| {
        let (lon, lat) = of(&stations[i]);
        !within(lon, LON_RANGE) || !within(lat, LAT_RANGE)
    }) else {
        return Ok(());
    };
    let (lon, lat) = of(&stations[first]);
    let (row, station) = (stations[first].row, name(first));
    let fits_swapped = placed.iter().all(|&i| {
        let (lon, lat) = of(&stations[i]);
        within(lat, LON_RANGE) && within(lon, LAT_RANGE)
    });
    Err(if fits_swapped {
        TableProblem::Swapped {
            row,
            station,
            lat_deg: lat,
        }
    } else if within(lat, LAT_RANGE) {
        TableProblem::OutOfRange {
            row,
            station,
            what: "longitude",
            value: lon,
            range: "-180 to 360",
        }
    } else {
        TableProblem::OutOfRange {
            row,
            station,
            what: "latitude",
            value: lat,
            range: "-90 to 90",
        }
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_abs_diff_eq;

    fn stations(xy: &[(f64, f64)]) -> Vec<TableStation> {
        let new = |(i, &(x, y)): (usize, &(f64, f64))| TableStation {
            row: i as u64 + 2,
            x,
            y,
            lon_deg: f64::NAN,
            lat_deg: f64::NAN,
            height_m: 0.0,
            fault: None,
        };
        xy.iter().enumerate().map(new).collect()
    }

    fn placed(xy: &[(f64, f64)], crs: &str) -> Result<Vec<TableStation>, TableProblem> {
        let mut s = stations(xy);
        place(&mut s, &Crs::new(crs)?, |i| format!("S{i}"))?;
        Ok(s)
    }

    #[test]
    fn utm_to_degrees() {
        // On the central meridian of zone 32 the easting is 500 000 m and the northing 0.9996 times the length of
        // the meridian arc; from the equator to 45 degrees on WGS 84 that arc is 4 984 944.378 m (the meridian
        // quadrant series of Helmert 1880, in any geodesy handbook; value from memory).
        let s = placed(
            &[(500_000.0, 0.9996 * 4_984_944.378), (500_000.0, 0.0)],
            "EPSG:32632",
        )
        .unwrap();
        assert_abs_diff_eq!(s[0].lon_deg, 9.0, epsilon = 1e-9);
        assert_abs_diff_eq!(s[0].lat_deg, 45.0, epsilon = 1e-8);
        assert_abs_diff_eq!(s[1].lat_deg, 0.0, epsilon = 1e-9);
    }

    #[test]
    fn geographic_systems_keep_the_order_lon_lat() {
        // ETRS89 and WGS 84 agree within a metre, which is what PROJ takes them for (null transformation).
        let s = placed(&[(9.5, 46.5)], "EPSG:4258").unwrap();
        assert_abs_diff_eq!(s[0].lon_deg, 9.5, epsilon = 1e-5);
        assert_abs_diff_eq!(s[0].lat_deg, 46.5, epsilon = 1e-5);
    }

    #[test]
    fn longitudes_to_360_come_back_west() {
        assert_eq!(placed(&[(350.0, 10.0)], WGS_84).unwrap()[0].lon_deg, -10.0);
    }

    #[test]
    fn swapped_and_out_of_range() {
        assert!(matches!(
            placed(&[(45.0, 120.0), (46.0, 80.0)], WGS_84),
            Err(TableProblem::Swapped { row: 2, .. })
        ));
        // One station fits neither way: not a swap.
        assert!(matches!(
            placed(&[(45.0, 120.0), (100.0, 46.0)], WGS_84),
            Err(TableProblem::OutOfRange {
                row: 2,
                what: "latitude",
                ..
            })
        ));
        assert!(matches!(
            placed(&[(9.0, 46.0), (500_000.0, 46.0)], WGS_84),
            Err(TableProblem::OutOfRange {
                row: 3,
                what: "longitude",
                ..
            })
        ));
    }

    #[test]
    fn what_proj_refuses_is_named() {
        assert!(matches!(
            placed(&[(500_000.0, 5e6), (1e30, 5e6)], "EPSG:32632"),
            Err(TableProblem::OutsideCrs { row: 3, .. })
        ));
        assert!(matches!(
            placed(&[(0.0, 0.0)], "EPSG:999999"),
            Err(TableProblem::BadCrs { .. })
        ));
        assert!(matches!(
            placed(&[(0.0, 0.0)], "nonsense"),
            Err(TableProblem::BadCrs { .. })
        ));
        // A vertical system is no system for x and y.
        assert!(matches!(
            placed(&[(0.0, 0.0)], "EPSG:5773"),
            Err(TableProblem::BadCrs { .. })
        ));
    }
}
