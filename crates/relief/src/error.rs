//! What can go wrong with a DEM, in words a user can act on.

/// An error of this crate: what was being done, to which file, and what is wrong with it.
///
/// ```
/// use hillpull_relief::{Fault, ReliefError};
/// let error = ReliefError::new("reading DEM", "massif.tif", Fault::NoCrs);
/// assert_eq!(error.to_string(), "reading DEM massif.tif: it states no coordinate reference system");
/// assert!(error.hint().is_some());
/// ```
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error("{action}{}{file}: {fault}", if file.is_empty() { "" } else { " " })]
pub struct ReliefError {
    /// What was being done, as "reading DEM".
    pub action: &'static str,
    /// The file, or the grid's label; empty where there is none.
    pub file: String,
    /// What is wrong.
    pub fault: Fault,
}

/// What is wrong with a DEM.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Fault {
    /// No such file.
    #[error("no such file")]
    Missing,
    /// The file is there but cannot be read, or only in part.
    #[error("it cannot be read: {detail}")]
    Unreadable {
        /// What GDAL says.
        detail: String,
    },
    /// Not a raster.
    #[error("it is not a raster: {detail}")]
    NotARaster {
        /// What it is instead, as far as can be told.
        detail: String,
    },
    /// A container of several rasters.
    #[error("it holds several rasters: {}", names.join(", "))]
    SeveralRasters {
        /// Their names, each of which can be given in place of the file.
        names: Vec<String>,
    },
    /// No such band.
    #[error("it has {count} bands, so there is no band {band}")]
    NoSuchBand {
        /// Band asked for, from 1.
        band: usize,
        /// Bands present.
        count: usize,
    },
    /// The band does not hold heights.
    #[error("band {band} does not hold heights: {detail}")]
    NotHeights {
        /// Band, from 1.
        band: usize,
        /// What it holds.
        detail: String,
    },
    /// Too few posts for a surface.
    #[error("{rows} rows and {cols} columns of posts make no surface")]
    TooSmall {
        /// Rows of posts.
        rows: usize,
        /// Columns of posts.
        cols: usize,
    },
    /// No coordinate reference system.
    #[error("it states no coordinate reference system")]
    NoCrs,
    /// A CRS that does not tie the grid to the Earth's surface.
    #[error("its coordinate reference system '{crs}' {detail}")]
    UnusableCrs {
        /// Name of the CRS.
        crs: String,
        /// Why it cannot be used.
        detail: String,
    },
    /// Rows and columns are tied to the CRS by no affine map.
    #[error("{}", no_placement_text(*gcps, *rpc, *geolocation))]
    NoPlacement {
        /// Number of ground control points.
        gcps: usize,
        /// Whether it has rational polynomial coefficients.
        rpc: bool,
        /// Whether it has geolocation arrays.
        geolocation: bool,
    },
    /// An affine map that maps the grid to a line or to nowhere.
    #[error("its geotransform {affine:?} does not span a surface")]
    DegeneratePlacement {
        /// The map, post-centre based.
        affine: [f64; 6],
    },
    /// A post could not be placed on the ellipsoid.
    #[error(
        "the post at row {row}, column {col} (x {x}, y {y}) has no place on the ellipsoid: {detail}"
    )]
    Unplaceable {
        /// Row of the grid, from 0.
        row: f64,
        /// Column of the grid, from 0.
        col: f64,
        /// First CRS coordinate.
        x: f64,
        /// Second CRS coordinate.
        y: f64,
        /// What PROJ says, or which bound is passed.
        detail: String,
    },
    /// Heights in a unit that is not known.
    #[error("its heights are in '{unit}', which is no unit of length known here")]
    UnknownUnit {
        /// The unit as the file gives it.
        unit: String,
    },
    /// Two different units for the same heights.
    #[error("its heights are in '{band_unit}' by the band and in '{crs_unit}' by the vertical CRS")]
    TwoUnits {
        /// Unit of the band.
        band_unit: String,
        /// Unit of the vertical CRS.
        crs_unit: String,
    },
    /// Scale or offset that make no heights.
    #[error("its scale {scale} and offset {offset} make no heights")]
    BadScale {
        /// Scale.
        scale: f64,
        /// Offset.
        offset: f64,
    },
    /// A height outside what the Earth has.
    #[error(
        "the value {value} at row {row}, column {col} of the file (from 0) is {height_m} m, beyond {limit_m} m"
    )]
    AbsurdHeight {
        /// Row of the file, from 0.
        row: usize,
        /// Column of the file, from 0.
        col: usize,
        /// Value as stored.
        value: f64,
        /// The same after scale, offset and unit, metres.
        height_m: f64,
        /// Limit of the absolute height, metres.
        limit_m: f64,
    },
    /// A usual mark of missing data, stated nowhere, among heights far from it.
    #[error(
        "the value {value} at row {row}, column {col} of the file (from 0) stands beside a height of {beside_m} m: \
         it looks like a mark of missing data, but the file states none such"
    )]
    UnstatedVoid {
        /// Row of the file, from 0.
        row: usize,
        /// Column of the file, from 0.
        col: usize,
        /// Value as stored.
        value: f64,
        /// Height of a neighbour, metres.
        beside_m: f64,
    },
    /// Only voids where heights are needed.
    #[error("all {posts} posts within reach of the stations are voids")]
    AllVoid {
        /// Posts looked at.
        posts: usize,
    },
    /// Nothing of the grid lies within reach of the stations: the DEM is of no use to them, the others may be.
    #[error("it ends {distance_km:.1} km short of the reach of the stations; it covers {extent}")]
    OutOfReach {
        /// From the reach to the nearest part of the grid, km, to within a lattice cell.
        distance_km: f64,
        /// Where the grid lies.
        extent: String,
    },
    /// More posts than memory.
    #[error("{rows} x {cols} posts do not fit in memory")]
    TooLarge {
        /// Rows of posts wanted.
        rows: usize,
        /// Columns of posts wanted.
        cols: usize,
    },
    /// Reprojection onto a working grid failed.
    #[error("it cannot be resampled: {detail}")]
    NotResampled {
        /// What GDAL says.
        detail: String,
    },
    /// Stopped by the stop flag.
    #[error("stopped")]
    Stopped,
}

impl ReliefError {
    /// From what was being done, the file and the fault.
    #[must_use]
    pub fn new(action: &'static str, file: impl Into<String>, fault: Fault) -> Self {
        Self {
            action,
            file: file.into(),
            fault,
        }
    }

    /// The same with the name of the grid, where none is given yet.
    #[must_use]
    pub fn named(mut self, label: &str) -> Self {
        if self.file.is_empty() {
            label.clone_into(&mut self.file);
        }
        self
    }

    /// True if the DEM is sound but lies out of reach of the stations.
    #[must_use]
    pub fn is_out_of_reach(&self) -> bool {
        matches!(self.fault, Fault::OutOfReach { .. })
    }

    /// The next step, where there is one to recommend.
    #[must_use]
    pub fn hint(&self) -> Option<String> {
        let file = &self.file;
        let text = match &self.fault {
            Fault::Missing => "check the path and the working directory".to_owned(),
            Fault::Unreadable { .. } => format!(
                "`gdalinfo -checksum {file}` shows whether the file is whole; fetch or copy it again if it is not"
            ),
            Fault::NotARaster { .. } => {
                format!("`gdalinfo {file}` tells what GDAL makes of it; give a grid of heights")
            }
            Fault::SeveralRasters { names } => match names.first() {
                Some(first) => format!("name the one with the heights, as {first}"),
                None => return None,
            },
            Fault::NoSuchBand { count, .. } => format!("choose a band from 1 to {count}"),
            Fault::NotHeights { .. } => {
                "give the band that holds heights, in metres or feet".to_owned()
            }
            Fault::TooSmall { .. } => "a surface needs 2 rows and 2 columns of posts".to_owned(),
            Fault::NoCrs => format!(
                "if you know its CRS, assign it: gdal_edit.py -a_srs EPSG:<code> {file}"
            ),
            Fault::UnusableCrs { .. } => format!(
                "a geographic or projected CRS with heights positive up is needed; assign the right one: \
                 gdal_edit.py -a_srs EPSG:<code> {file}"
            ),
            Fault::NoPlacement {
                gcps: 0,
                rpc: false,
                geolocation: false,
            } => format!(
                "if you know where it lies, assign its corners: gdal_edit.py -a_ullr <west> <north> <east> <south> {file}"
            ),
            Fault::NoPlacement { .. } => {
                "--resample puts it onto a working grid, at the cost of some smoothing".to_owned()
            }
            Fault::DegeneratePlacement { .. } => {
                format!("assign its corners: gdal_edit.py -a_ullr <west> <north> <east> <south> {file}")
            }
            Fault::Unplaceable { .. } => format!(
                "check its CRS and corners with `gdalinfo {file}`; posts outside the domain of a projection must be cut off"
            ),
            Fault::UnknownUnit { .. } => {
                "set the band's unit to 'm', 'ft' or 'US survey foot': gdal_translate to VRT and edit its UnitType"
                    .to_owned()
            }
            Fault::TwoUnits { .. } => {
                "one of the two is wrong; correct the band's unit or the vertical CRS".to_owned()
            }
            Fault::BadScale { .. } => {
                format!("set them right: gdal_edit.py -scale <scale> -offset <offset> {file}")
            }
            Fault::AbsurdHeight { value, .. } | Fault::UnstatedVoid { value, .. } => format!(
                "if this value marks missing data, say so: gdal_edit.py -a_nodata {value} {file}"
            ),
            Fault::AllVoid { .. } => {
                "leave this DEM out, or check its nodata value and mask".to_owned()
            }
            Fault::OutOfReach { .. } => {
                "leave it out, or check its CRS and that of the stations".to_owned()
            }
            Fault::TooLarge { .. } => {
                "use a coarser DEM for the far zone, or cut it to the area of the survey".to_owned()
            }
            Fault::NotResampled { .. } => {
                "warp the DEM to a CRS in metres with GDAL's own tools, and give the result".to_owned()
            }
            Fault::Stopped => return None,
        };
        Some(text)
    }
}

fn no_placement_text(gcps: usize, rpc: bool, geolocation: bool) -> String {
    let by = match (gcps, rpc, geolocation) {
        (1.., _, _) => format!("only by {gcps} ground control points"),
        (_, true, _) => "only by rational polynomial coefficients".to_owned(),
        (_, _, true) => "only by geolocation arrays".to_owned(),
        _ => return "it does not say where its rows and columns lie (no geotransform)".to_owned(),
    };
    format!("it says where its posts lie {by}, not by a regular grid")
}
