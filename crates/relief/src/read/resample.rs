//! Reprojection onto a working grid, for grids that cannot be used where their posts lie.

use gdal::Dataset;
use gdal::spatial_ref::SpatialRef;

use super::{ffi, gdal_text};
use crate::error::Fault;

/// How to resample. Only on request: it smooths the heights, and smoothing loses terrain effect.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Resample {
    /// CRS of the working grid, as "EPSG:32632" or WKT; the UTM zone (or polar grid) of the DEM's middle if None.
    pub crs: Option<String>,
    /// Spacing of the working grid in units of its CRS; about the mean spacing of the DEM's posts if None.
    pub spacing: Option<f64>,
    /// How heights between posts are found.
    pub method: ResampleMethod,
}

/// How heights between posts are found while resampling.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum ResampleMethod {
    /// Bilinear in the four posts around.
    #[default]
    Bilinear,
    /// Cubic convolution over sixteen posts: smooths less, may overshoot at edges.
    Cubic,
}

impl ResampleMethod {
    fn word(self) -> &'static str {
        match self {
            Self::Bilinear => "bilinear",
            Self::Cubic => "cubic",
        }
    }
}

/// The data set on its working grid, to be warped while it is read, and a sentence on what that costs.
pub(super) fn onto_working_grid(
    source: &Dataset,
    band: usize,
    how: &Resample,
) -> Result<(Dataset, String), Fault> {
    let failed = |error: gdal::errors::GdalError| Fault::NotResampled {
        detail: gdal_text(&error),
    };
    if let Some(spacing) = how.spacing
        && !(spacing > 0.0 && spacing.is_finite())
    {
        let detail = format!("a spacing of {spacing} makes no grid");
        return Err(Fault::NotResampled { detail });
    }
    let crs = match &how.crs {
        Some(crs) => crs.clone(),
        None => working_crs(source)?,
    };
    let single = if source.raster_count() > 1 {
        Some(ffi::single_band(source, band).map_err(failed)?)
    } else {
        None
    };
    let spacing = how.spacing.map(|s| s.to_string());
    let mut args = vec![
        "-of",
        "VRT",
        "-ot",
        "Float32",
        "-t_srs",
        &crs,
        "-dstnodata",
        "nan",
    ];
    args.extend(["-r", how.method.word(), "-et", "0.01"]);
    if let Some(spacing) = &spacing {
        args.extend(["-tr", spacing, spacing]);
    }
    let warped = ffi::warped(single.as_ref().unwrap_or(source), &args).map_err(failed)?;
    let affine = warped.geo_transform().map_err(failed)?;
    let name = SpatialRef::from_definition(&crs)
        .ok()
        .and_then(|srs| srs.name())
        .unwrap_or(crs);
    let warning = format!(
        "heights were resampled onto a working grid ({}, spacing {:.6} in {name}); this smooths the ground and loses \
         terrain effect, most near stations in steep relief",
        how.method.word(),
        affine[1].abs(),
    );
    Ok((warped, warning))
}

/// UTM zone of the middle of the data set on WGS 84, or the polar grid beyond latitudes 84 N and 80 S.
fn working_crs(source: &Dataset) -> Result<String, Fault> {
    let no_middle = |detail: String| Fault::NotResampled {
        detail: format!("its middle cannot be found: {detail}"),
    };
    let said = |error| no_middle(gdal_text(&error));
    let in_degrees = ffi::warped(source, &["-of", "VRT", "-t_srs", "EPSG:4326"]).map_err(said)?;
    let affine = in_degrees.geo_transform().map_err(said)?;
    let (cols, rows) = in_degrees.raster_size();
    let lon_deg = affine[0] + affine[1] * cols as f64 / 2.0;
    let lat_deg = affine[3] + affine[5] * rows as f64 / 2.0;
    if !lon_deg.is_finite() || !lat_deg.is_finite() {
        return Err(no_middle("no finite position".to_owned()));
    }
    Ok(format!("EPSG:{}", utm_or_polar(lon_deg, lat_deg)))
}

/// EPSG code of the WGS 84 UTM zone, or of the universal polar stereographic grid.
fn utm_or_polar(lon_deg: f64, lat_deg: f64) -> u32 {
    // EPSG codes 326zz (north), 327zz (south); 5041 and 5042 are the polar grids with east before north
    if lat_deg > 84.0 {
        return 5041;
    }
    if lat_deg < -80.0 {
        return 5042;
    }
    let zone = ((lon_deg + 180.0).rem_euclid(360.0) / 6.0).floor() as u32 + 1;
    if lat_deg >= 0.0 {
        32_600 + zone
    } else {
        32_700 + zone
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn zones() {
        // EPSG dataset: areas of use of 32632 (6 to 12 E), 32760 (174 to 180 E, south), 32601 (180 to 174 W)
        assert_eq!(utm_or_polar(9.0, 47.0), 32_632);
        assert_eq!(utm_or_polar(6.0, 47.0), 32_632);
        assert_eq!(utm_or_polar(175.0, -40.0), 32_760);
        assert_eq!(utm_or_polar(-179.0, 10.0), 32_601);
        assert_eq!(utm_or_polar(181.0, 10.0), 32_601);
        assert_eq!(utm_or_polar(0.0, 88.0), 5041);
        assert_eq!(utm_or_polar(0.0, -85.0), 5042);
    }
}
