//! What a data set's CRS says: where x and y lie, and what its heights are.

use gdal::Dataset;
use gdal::spatial_ref::SpatialRef;

use super::ffi::ThreadOption;
use super::wkt;
use crate::error::Fault;

/// A CRS as the reader needs it.
pub(super) struct Crs {
    /// For [`Placement`](crate::Placement): None for WGS 84 longitude and latitude in degrees.
    pub(super) definition: Option<String>,
    /// Name for messages.
    pub(super) name: String,
    /// Length of the parallel in CRS units of x, where x is longitude.
    pub(super) full_circle: Option<f64>,
    /// Unit of a stated vertical CRS and metres in it.
    pub(super) vertical_unit: Option<(String, f64)>,
    /// Name of the unit of x and y where it is a length other than the metre.
    pub(super) odd_length: Option<String>,
}

impl Crs {
    /// Reads the CRS of a data set.
    pub(super) fn of(dataset: &Dataset) -> Result<Self, Fault> {
        let srs = dataset.spatial_ref().map_err(|_| Fault::NoCrs)?;
        let name = srs.name().unwrap_or_default();
        let unusable = |detail: &str| Fault::UnusableCrs {
            crs: name.clone(),
            detail: detail.to_owned(),
        };
        if srs.is_local() {
            return Err(unusable("is local: it is not tied to the Earth"));
        }
        if srs.is_geocentric() {
            return Err(unusable("is geocentric: it has no horizontal axes"));
        }
        if !(srs.is_geographic() || srs.is_projected() || srs.is_derived_geographic()) {
            return Err(unusable("is neither geographic nor projected"));
        }
        let full = {
            // WKT 1 cannot hold every CRS
            let _format = ThreadOption::set("OSR_WKT_FORMAT", "WKT2_2019");
            srs.to_wkt()
                .map_err(|_| unusable("cannot be written as WKT"))?
        };
        let (horizontal, vertical) = wkt::horizontal_and_vertical(&full);
        if vertical.is_some_and(wkt::counts_down) {
            return Err(unusable("counts depths downward"));
        }
        let geographic = srs.is_geographic() && !srs.is_derived_geographic();
        let plain = is_wgs84_degrees(&srs);
        let odd_length = (srs.is_projected() && (srs.linear_units() - 1.0).abs() > 1e-9)
            .then(|| srs.linear_units_name())
            .flatten();
        Ok(Self {
            definition: (!plain).then(|| horizontal.to_owned()),
            full_circle: geographic.then(|| std::f64::consts::TAU / srs.angular_units()),
            vertical_unit: vertical.and_then(wkt::vertical_unit),
            odd_length,
            name,
        })
    }
}

/// Whether coordinates in this CRS are WGS 84 longitude and latitude in degrees already.
fn is_wgs84_degrees(srs: &SpatialRef) -> bool {
    let attribute = |path, child| srs.get_attr_value(path, child).ok().flatten();
    let degree = std::f64::consts::PI / 180.0;
    srs.is_geographic()
        && !srs.is_derived_geographic()
        && attribute("DATUM", 0).is_some_and(|name| name == "WGS_1984")
        && attribute("TOWGS84", 0).is_none()
        && attribute("PRIMEM", 1).is_some_and(|lon| lon.parse() == Ok(0.0))
        && (srs.angular_units() / degree - 1.0).abs() < 1e-12
}
