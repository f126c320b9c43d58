//! Reading a DEM: anything GDAL reads, posts kept where they lie, only the part within reach of the stations.

mod crs;
mod decode;
mod ffi;
mod heights;
mod place;
mod reach;
mod resample;
mod unit;
mod window;
mod wkt;

use std::path::{Path, PathBuf};
use std::sync::atomic::AtomicBool;

use gdal::errors::GdalError;
use gdal::raster::{ColorInterpretation, GdalDataType, RasterBand};
use gdal::{Dataset, DatasetOptions, GdalOpenFlags, Metadata};

pub use reach::Reach;
pub use resample::{Resample, ResampleMethod};

use crate::error::{Fault, ReliefError};
use crate::grid::{Grid, Origin, Placement};
use crs::Crs;
use decode::Decoding;
use heights::Watch;
use window::{Extent, Window};

const ACTION: &str = "reading DEM";

/// How to read a DEM.
#[derive(Clone)]
pub struct ReadOptions<'a> {
    /// Only what lies within this is read; everything if None.
    pub reach: Option<Reach>,
    /// Band that holds the heights, from 1.
    pub band: usize,
    /// Warp onto a working grid first. Only for DEMs that cannot be used as they are.
    pub resample: Option<Resample>,
    /// Threads for decoding where the format allows several; all there are if None.
    pub threads: Option<usize>,
    /// Told the share done, 0 to 1, from the thread that reads.
    pub progress: Option<&'a dyn Fn(f64)>,
    /// Looked at between bands of rows; when it is set, reading ends with [`Fault::Stopped`].
    pub stop: Option<&'a AtomicBool>,
}

impl Default for ReadOptions<'_> {
    fn default() -> Self {
        Self {
            reach: None,
            band: 1,
            resample: None,
            threads: None,
            progress: None,
            stop: None,
        }
    }
}

/// Reads one DEM.
///
/// `path` is a file, or any name GDAL opens (`NETCDF:"file.nc":height`, `/vsizip/...`). Heights come out in metres as
/// f32, voids as NaN. What the user should know about the DEM stands in [`Origin::warnings`].
///
/// # Errors
/// See [`Fault`]; [`Fault::OutOfReach`] says that the DEM is sound but of no use to these stations.
pub fn read_grid(path: &Path, options: &ReadOptions<'_>) -> Result<Grid, ReliefError> {
    let file = path.display().to_string();
    read(path, options).map_err(|error| match error {
        Failure::Fault(fault) => ReliefError::new(ACTION, file, fault),
        Failure::Named(error) => error.named(&file),
    })
}

/// A fault of this file, or an error that says itself what was being done.
enum Failure {
    Fault(Fault),
    Named(ReliefError),
}

impl From<Fault> for Failure {
    fn from(fault: Fault) -> Self {
        Self::Fault(fault)
    }
}

impl From<ReliefError> for Failure {
    fn from(error: ReliefError) -> Self {
        Self::Named(error)
    }
}

fn read(path: &Path, options: &ReadOptions<'_>) -> Result<Grid, Failure> {
    ffi::silence_gdal();
    let threads = options
        .threads
        .map_or_else(|| "ALL_CPUS".to_owned(), |n| n.to_string());
    let _threads = ffi::ThreadOption::set("GDAL_NUM_THREADS", &threads);

    let source = open(path)?;
    check_band(&source, options.band)?;
    let mut warnings = Vec::new();
    if source.raster_count() > 1 {
        let (count, band) = (source.raster_count(), options.band);
        warnings.push(format!(
            "it has {count} bands; band {band} is taken for the heights"
        ));
    }
    let working = match &options.resample {
        Some(how) => {
            let (warped, warning) = resample::onto_working_grid(&source, options.band, how)?;
            warnings.push(warning);
            Some(warped)
        }
        None => None,
    };
    // values, scale and unit mean the same before and after warping; the source states them for sure
    let meaning = source.rasterband(options.band).map_err(unreadable)?;
    let (dataset, band_number) = match &working {
        Some(warped) => (warped, 1),
        None => (&source, options.band),
    };
    let band = dataset.rasterband(band_number).map_err(unreadable)?;
    let (file_cols, file_rows) = dataset.raster_size();
    if file_rows < 2 || file_cols < 2 {
        let (rows, cols) = (file_rows, file_cols);
        return Err(Fault::TooSmall { rows, cols }.into());
    }
    let affine = post_affine(dataset)?;
    let crs = Crs::of(dataset)?;
    let vertical_unit = match &working {
        Some(_) => Crs::of(&source).ok().and_then(|crs| crs.vertical_unit),
        None => crs.vertical_unit.clone(),
    };
    let (height_unit, metres) = decode::unit_of(&meaning.unit(), vertical_unit.as_ref())?;
    let whole = Placement {
        affine,
        crs: crs.definition.clone(),
    };
    check_place(&whole, file_rows, file_cols)?;
    warnings.extend(doubts(&crs, &whole, &meaning));

    let ring = window::ring(&whole, file_cols, crs.full_circle);
    let extent = Extent {
        placement: &whole,
        rows: file_rows,
        cols: file_cols,
        ring,
    };
    let (window, ring) = choose_window(extent, options.reach.as_ref())?;
    let decoding = Decoding::of(&band, &meaning, metres)?;
    let (block_cols, block_rows) = band.block_size();
    ffi::limit_block_cache((file_cols + block_cols) * block_rows * 8);
    let watch = Watch {
        progress: options.progress,
        stop: options.stop,
    };
    let (heights_m, summary) = heights::read(&band, window, ring, &decoding, watch)?;
    decoding.check_voids(&heights_m, &summary, window, ring)?;

    let [x, y] = whole.xy(window.first_row as f64, window.first_col as f64);
    let grid = Grid {
        label: label(path),
        rows: window.rows,
        cols: window.cols,
        heights_m,
        placement: Placement {
            affine: [x, affine[1], affine[2], y, affine[4], affine[5]],
            crs: crs.definition,
        },
        origin: Origin {
            path: path.to_owned(),
            files: source_files(path, &source),
            driver: source.driver().short_name(),
            crs_name: crs.name,
            band: options.band,
            height_unit,
            first_row: window.first_row,
            first_col: window.first_col,
            file_rows,
            file_cols,
            warnings,
        },
    };
    Ok(grid)
}

/// Opens a raster, or says why not.
fn open(path: &Path) -> Result<Dataset, Fault> {
    let open_as = |kind| {
        Dataset::open_ex(
            path,
            DatasetOptions {
                open_flags: kind | GdalOpenFlags::GDAL_OF_VERBOSE_ERROR,
                ..DatasetOptions::default()
            },
        )
    };
    let dataset = match open_as(GdalOpenFlags::GDAL_OF_RASTER) {
        Ok(dataset) => dataset,
        Err(error) => {
            let name = path.to_string_lossy();
            if !path.exists() && !name.contains(':') && !name.starts_with("/vsi") {
                return Err(Fault::Missing);
            }
            if open_as(GdalOpenFlags::GDAL_OF_VECTOR).is_ok() {
                let detail = "it holds vector features or a plain table".to_owned();
                return Err(Fault::NotARaster { detail });
            }
            let detail = gdal_text(&error);
            return Err(if detail.contains("not recognized") {
                Fault::NotARaster {
                    detail: "no format that GDAL knows".to_owned(),
                }
            } else {
                Fault::Unreadable { detail }
            });
        }
    };
    if dataset.raster_count() == 0 {
        let names: Vec<String> = dataset
            .metadata_domain("SUBDATASETS")
            .unwrap_or_default()
            .iter()
            .filter_map(|entry| entry.split_once("_NAME=").map(|(_, name)| name.to_owned()))
            .collect();
        return Err(if names.is_empty() {
            Fault::NotARaster {
                detail: "it has no bands".to_owned(),
            }
        } else {
            Fault::SeveralRasters { names }
        });
    }
    Ok(dataset)
}

/// Refuses bands that cannot hold heights.
fn check_band(dataset: &Dataset, number: usize) -> Result<(), Fault> {
    let count = dataset.raster_count();
    if number == 0 || number > count {
        return Err(Fault::NoSuchBand {
            band: number,
            count,
        });
    }
    let band = dataset.rasterband(number).map_err(unreadable)?;
    let refuse = |detail: &str| {
        Err(Fault::NotHeights {
            band: number,
            detail: detail.to_owned(),
        })
    };
    if band.band_type() == GdalDataType::Unknown {
        return refuse("its values are complex or of a type that is not known here");
    }
    if band
        .metadata_item("PIXELTYPE", "IMAGE_STRUCTURE")
        .as_deref()
        == Some("SIGNEDBYTE")
    {
        return refuse("its values are signed bytes, which GDAL would give as unsigned ones");
    }
    use ColorInterpretation as C;
    match band.color_interpretation() {
        C::PaletteIndex => refuse("its values are numbers of colours in a palette"),
        C::RedBand | C::GreenBand | C::BlueBand => refuse("it is one colour of a picture"),
        C::AlphaBand => refuse("it is the transparency of a picture"),
        _ => Ok(()),
    }
}

/// The affine map of posts: GDAL's is that of pixel edges, and a post is a pixel's centre.
fn post_affine(dataset: &Dataset) -> Result<[f64; 6], Fault> {
    // a file without one gives an error, or the map that maps every pixel to itself
    const NONE: [f64; 6] = [0.0, 1.0, 0.0, 0.0, 0.0, 1.0];
    let edges = match dataset.geo_transform() {
        Ok(affine) if affine != NONE => affine,
        _ => {
            let has = |domain| {
                dataset
                    .metadata_domain(domain)
                    .is_some_and(|d| !d.is_empty())
            };
            return Err(Fault::NoPlacement {
                gcps: dataset.gcps().len(),
                rpc: has("RPC"),
                geolocation: has("GEOLOCATION"),
            });
        }
    };
    let mut affine = edges;
    affine[0] += 0.5 * (edges[1] + edges[2]);
    affine[3] += 0.5 * (edges[4] + edges[5]);
    let area = affine[1] * affine[5] - affine[2] * affine[4];
    if area == 0.0 || !affine.iter().all(|a| a.is_finite()) {
        return Err(Fault::DegeneratePlacement { affine });
    }
    Ok(affine)
}

/// Refuses a grid of which neither the middle nor a corner has a place on the ellipsoid.
fn check_place(placement: &Placement, rows: usize, cols: usize) -> Result<(), ReliefError> {
    let (last_row, last_col) = (rows as f64 - 1.0, cols as f64 - 1.0);
    let middle = [(last_row / 2.0).floor(), (last_col / 2.0).floor()];
    let posts = [
        middle,
        [0.0, 0.0],
        [0.0, last_col],
        [last_row, 0.0],
        [last_row, last_col],
    ];
    let placed = placement.lonlat_rad_or_nan(&posts)?;
    if placed.iter().all(|at| at[0].is_nan()) {
        placement.lonlat_rad(&[middle])?;
    }
    Ok(())
}

/// The window to read, and the ring it may run over the end of.
fn choose_window(
    extent: Extent<'_>,
    reach: Option<&Reach>,
) -> Result<(Window, Option<usize>), Failure> {
    let Some(reach) = reach else {
        // as it stands in the file
        let whole = Window {
            first_row: 0,
            rows: extent.rows,
            first_col: 0,
            cols: extent.cols,
        };
        return Ok((whole, None));
    };
    match window::within(extent, reach)? {
        Ok(window) => Ok((window, extent.ring)),
        Err(distance_m) => {
            let bounds = extent.placement.lonlat_box(extent.rows, extent.cols);
            Err(Fault::OutOfReach {
                distance_km: distance_m / 1000.0,
                extent: bounds.map_or_else(|_| "an unknown area".to_owned(), |b| b.to_string()),
            }
            .into())
        }
    }
}

/// What is read without complaint but may not be meant.
fn doubts(crs: &Crs, placement: &Placement, band: &RasterBand<'_>) -> Vec<String> {
    let mut warnings = Vec::new();
    if let Some(length) = &crs.odd_length
        && band.unit().trim().is_empty()
        && crs.vertical_unit.is_none()
    {
        warnings.push(format!(
            "x and y are in '{length}' and no unit is stated for the heights; they are taken for metres"
        ));
    }
    if placement.datum_is_guessed() {
        warnings.push(format!(
            "no transformation from the datum of '{}' to WGS 84 is known here; it is taken for WGS 84, and posts may \
             lie off by up to some hundred metres",
            crs.name
        ));
    }
    warnings
}

/// Files behind a data set, and behind those it is put together from.
fn source_files(path: &Path, dataset: &Dataset) -> Vec<PathBuf> {
    let mut files = ffi::file_list(dataset);
    let mut next = 0;
    while next < files.len() {
        let file = files[next].clone();
        next += 1;
        // GDAL looks one level deep
        let is_virtual = file
            .extension()
            .is_some_and(|e| e.eq_ignore_ascii_case("vrt"));
        if is_virtual
            && file != path
            && let Ok(inner) = Dataset::open(&file)
        {
            for found in ffi::file_list(&inner) {
                if !files.contains(&found) {
                    files.push(found);
                }
            }
        }
    }
    files
}

fn label(path: &Path) -> String {
    path.file_name().map_or_else(
        || path.display().to_string(),
        |name| name.to_string_lossy().into_owned(),
    )
}

fn unreadable(error: GdalError) -> Fault {
    Fault::Unreadable {
        detail: gdal_text(&error),
    }
}

/// What GDAL says, without the wrapping.
fn gdal_text(error: &GdalError) -> String {
    let text = match error {
        GdalError::CplError { msg, .. } | GdalError::NullPointer { msg, .. } => msg.clone(),
        GdalError::InvalidCoordinateRange { msg, .. } => msg.clone().unwrap_or_default(),
        other => other.to_string(),
    };
    if text.trim().is_empty() {
        "GDAL gives no reason".to_owned()
    } else {
        text.trim().to_owned()
    }
}
