//! From rows and columns to longitude and latitude on WGS 84.
//!
//! PROJ is called through GDAL's transformation objects: they honour GDAL's axis order, keep what could be
//! transformed when a part could not, and answer a CRS they do not know with an error.

use gdal::spatial_ref::{AxisMappingStrategy, CoordTransform, CoordTransformOptions, SpatialRef};

use super::ffi::silence_gdal;
use super::{gdal_text, wkt};
use crate::error::{Fault, ReliefError};
use crate::grid::{LonLatBox, Placement};

const ACTION: &str = "placing posts of";

impl Placement {
    /// CRS coordinates (x, y) of a fractional post position, x toward east for a geographic CRS.
    #[must_use]
    #[inline]
    pub fn xy(&self, row: f64, col: f64) -> [f64; 2] {
        let a = &self.affine;
        [
            a[0] + a[1] * col + a[2] * row,
            a[3] + a[4] * col + a[5] * row,
        ]
    }

    /// Geodetic (longitude, latitude) on WGS 84, radians, of fractional post positions (row, column), from 0.
    ///
    /// One call makes one PROJ transformation (some ms), so give it many positions at once. May be called from any
    /// thread. Longitudes are on the branch the CRS gives: they may pass pi for a grid in longitude and latitude, and
    /// may jump by 2 pi at the antimeridian for a projected one.
    ///
    /// # Errors
    /// If the CRS is unknown, or a position has no place on the ellipsoid; the grid is not named
    /// ([`ReliefError::named`]).
    pub fn lonlat_rad(&self, row_col: &[[f64; 2]]) -> Result<Vec<[f64; 2]>, ReliefError> {
        let (placed, said) = self.place(row_col)?;
        let Some(at) = placed.iter().position(|p| p[0].is_nan()) else {
            return Ok(placed);
        };
        let [row, col] = row_col[at];
        let [x, y] = self.xy(row, col);
        let detail = said.unwrap_or_else(|| "not a longitude and latitude".to_owned());
        let fault = Fault::Unplaceable {
            row,
            col,
            x,
            y,
            detail,
        };
        Err(ReliefError::new(ACTION, "", fault))
    }

    /// As [`Self::lonlat_rad`], with NaN for positions that have no place.
    pub(crate) fn lonlat_rad_or_nan(
        &self,
        row_col: &[[f64; 2]],
    ) -> Result<Vec<[f64; 2]>, ReliefError> {
        Ok(self.place(row_col)?.0)
    }

    /// Positions, NaN where there is none, and what PROJ says of those.
    fn place(&self, row_col: &[[f64; 2]]) -> Result<(Vec<[f64; 2]>, Option<String>), ReliefError> {
        let xy = row_col.iter().map(|&[row, col]| self.xy(row, col));
        let Some(definition) = self.projection() else {
            return Ok((xy.map(from_degrees).collect(), None));
        };
        silence_gdal();
        let transform = to_wgs84(definition, false).map_err(|said| {
            let detail = format!("cannot be used: {said}");
            let crs = wkt::name(definition);
            ReliefError::new(ACTION, "", Fault::UnusableCrs { crs, detail })
        })?;
        let (mut x, mut y): (Vec<f64>, Vec<f64>) = xy.map(|p| (p[0], p[1])).unzip();
        // on failure the points that could be transformed are, the others are infinite
        let said = transform
            .transform_coords(&mut x, &mut y, &mut [])
            .err()
            .map(|error| gdal_text(&error));
        let placed = x.iter().zip(&y).map(|(&x, &y)| from_degrees([x, y]));
        Ok((placed.collect(), said))
    }

    /// The CRS, unless it is WGS 84 longitude and latitude in degrees.
    fn projection(&self) -> Option<&str> {
        match self.crs.as_deref() {
            None | Some("EPSG:4326" | "OGC:CRS84") => None,
            other => other,
        }
    }

    /// Whether no better way from this CRS to WGS 84 is known than to take its datum for WGS 84.
    pub(crate) fn datum_is_guessed(&self) -> bool {
        silence_gdal();
        self.projection()
            .is_some_and(|definition| to_wgs84(definition, true).is_err())
    }

    /// Box around `rows` x `cols` posts, from a lattice of them.
    pub(crate) fn lonlat_box(&self, rows: usize, cols: usize) -> Result<LonLatBox, ReliefError> {
        const STEPS: usize = 64;
        let (last_row, last_col) = (rows as f64 - 1.0, cols as f64 - 1.0);
        let middle = self.lonlat_rad(&[[last_row / 2.0, last_col / 2.0]])?[0];
        let fraction = |k: usize| k as f64 / STEPS as f64;
        let lattice: Vec<_> = (0..=STEPS)
            .flat_map(|i| {
                (0..=STEPS).map(move |k| [fraction(i) * last_row, fraction(k) * last_col])
            })
            .collect();
        let placed = self.lonlat_rad_or_nan(&lattice)?;
        let at = |i: usize, k: usize| placed[i * (STEPS + 1) + k];
        let edge: Vec<_> = (0..STEPS)
            .map(|k| at(0, k))
            .chain((0..STEPS).map(|i| at(i, STEPS)))
            .chain((0..STEPS).map(|k| at(STEPS, STEPS - k)))
            .chain((0..STEPS).map(|i| at(STEPS - i, 0)))
            .collect();
        // the edge goes once round a pole that lies inside
        let turns: f64 = (0..edge.len())
            .map(|k| wrapped(edge[(k + 1) % edge.len()][0] - edge[k][0]))
            .filter(|step| !step.is_nan())
            .sum();
        let mut out = LonLatBox {
            west_deg: f64::INFINITY,
            south_deg: f64::INFINITY,
            east_deg: f64::NEG_INFINITY,
            north_deg: f64::NEG_INFINITY,
        };
        let straight = self.projection().is_none();
        for [lon, lat] in placed {
            if lon.is_nan() {
                continue;
            }
            // a grid in degrees says itself how far it goes round; any other is cut opposite to its middle
            let step = lon - middle[0];
            let from_middle = if straight { step } else { wrapped(step) };
            let lon_deg = (middle[0] + from_middle).to_degrees();
            out.west_deg = out.west_deg.min(lon_deg);
            out.east_deg = out.east_deg.max(lon_deg);
            out.south_deg = out.south_deg.min(lat.to_degrees());
            out.north_deg = out.north_deg.max(lat.to_degrees());
        }
        if turns.abs() > std::f64::consts::PI {
            (out.west_deg, out.east_deg) = (-180.0, 180.0);
            if middle[1] > 0.0 {
                out.north_deg = 90.0;
            } else {
                out.south_deg = -90.0;
            }
        }
        let shift = 360.0 * ((out.west_deg + 180.0) / 360.0).floor();
        out.west_deg -= shift;
        out.east_deg -= shift;
        Ok(out)
    }
}

/// Angle brought into [-pi, pi].
fn wrapped(angle: f64) -> f64 {
    let tau = std::f64::consts::TAU;
    angle - tau * (angle / tau).round()
}

/// Degrees to radians; NaN for what is no longitude and latitude.
fn from_degrees([lon, lat]: [f64; 2]) -> [f64; 2] {
    // half a post beyond a pole is rounding; longitudes may run on past 180, but not round and round
    if lat.abs() <= 90.0 + 1e-9 && lon.abs() <= 720.0 {
        [lon.to_radians(), lat.clamp(-90.0, 90.0).to_radians()]
    } else {
        [f64::NAN, f64::NAN]
    }
}

/// Transformation to WGS 84 longitude and latitude in degrees, x and longitude first.
fn to_wgs84(definition: &str, exact_datum: bool) -> Result<CoordTransform, String> {
    let said = |error| gdal_text(&error);
    let mut from = SpatialRef::from_definition(definition).map_err(said)?;
    from.set_axis_mapping_strategy(AxisMappingStrategy::TraditionalGisOrder);
    let mut to = SpatialRef::from_epsg(4326).map_err(said)?;
    to.set_axis_mapping_strategy(AxisMappingStrategy::TraditionalGisOrder);
    let mut options = CoordTransformOptions::new().map_err(said)?;
    if exact_datum {
        options.set_ballpark_allowed(false).map_err(said)?;
    }
    CoordTransform::new_with_options(&from, &to, &options).map_err(said)
}
