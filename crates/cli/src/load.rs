//! DEMs in: what lies within reach of the stations is read, and what the user should know about it is said.

use crate::config::RunConfig;
use crate::exit::Stop;
use crate::messages::Messages;
use crate::progress::Progress;
use hillpull_engine::Station;
use hillpull_relief::{Fault, Grid, Reach, ReadOptions, ReliefError, Resample, read_grid};
use std::path::Path;
use std::sync::atomic::AtomicBool;

/// Reads the DEMs in the order of the configuration, leaving out those that no station reaches.
///
/// Runs on the current rayon pool where the work is parallel.
pub(crate) fn grids(
    config: &RunConfig,
    stations: &[Station],
    progress: Progress,
    messages: Messages,
    stop: &AtomicBool,
) -> Result<Vec<Grid>, Stop> {
    let places: Vec<(f64, f64)> = stations.iter().map(|s| (s.lon_deg, s.lat_deg)).collect();
    let reach = Reach::around(&places, config.settings.outer_radius_m);
    let mut grids = Vec::with_capacity(config.dems.len());
    let mut away = Vec::new();
    for path in &config.dems {
        match read_one(path, config, reach, progress, stop) {
            Ok(grid) => grids.push(grid),
            Err(error) if error.is_out_of_reach() => away.push(error),
            Err(error) => return Err(from_relief(error)),
        }
    }
    if grids.is_empty() {
        return Err(out_of_reach(config, &places, &away));
    }
    for error in away {
        messages.warning(format!("{error}; it is left out"));
    }
    for grid in &grids {
        for text in &grid.origin.warnings {
            messages.warning(format!("DEM {}: {text}", grid.label));
        }
    }
    if config.below_zero.is_none() {
        ask_about_ground_below_zero(&grids)?;
    }
    Ok(grids)
}

fn read_one(
    path: &Path,
    config: &RunConfig,
    reach: Option<Reach>,
    progress: Progress,
    stop: &AtomicBool,
) -> Result<Grid, ReliefError> {
    let bar = progress.reading(&path.display().to_string());
    let tell = |share: f64| bar.set_position((share * 1000.0) as u64);
    let mut options = ReadOptions {
        reach,
        threads: Some(config.threads),
        progress: Some(&tell),
        stop: Some(stop),
        ..ReadOptions::default()
    };
    let mut grid = read_grid(path, &options);
    if config.resample && grid.as_ref().is_err_and(|e| mended_by_resampling(&e.fault)) {
        options.resample = Some(Resample::default());
        grid = read_grid(path, &options);
    }
    bar.finish_and_clear();
    grid
}

/// No DEM is of use. The commonest reason that can be told is longitude and latitude swapped.
fn out_of_reach(config: &RunConfig, places: &[(f64, f64)], away: &[ReliefError]) -> Stop {
    let all: Vec<String> = away.iter().map(ReliefError::to_string).collect();
    let stop = Stop::bad(format!(
        "no DEM lies within reach of the stations: {}",
        all.join("; ")
    ));
    let swapped: Vec<(f64, f64)> = places
        .iter()
        .take(1)
        .map(|(lon, lat)| (*lat, *lon))
        .collect();
    // A few posts around the first station tell.
    let options = ReadOptions {
        reach: Reach::around(&swapped, 1.0),
        ..ReadOptions::default()
    };
    if config
        .dems
        .iter()
        .any(|path| read_grid(path, &options).is_ok())
    {
        return stop.hint("the stations fit with longitude and latitude swapped: check the two columns, or name them with --x and --y");
    }
    stop.hint("check the CRS of the DEM, and --crs, --x and --y of the stations")
}

/// Whether the posts of a DEM lie in no regular grid, so that only a working grid makes it usable.
fn mended_by_resampling(fault: &Fault) -> bool {
    matches!(fault, Fault::NoPlacement { .. } | Fault::Unplaceable { .. })
}

/// Ground below the datum may be dry or under the sea, and the two differ by the pull of the water: nobody but the
/// user knows.
fn ask_about_ground_below_zero(grids: &[Grid]) -> Result<(), Stop> {
    let mut found = Vec::new();
    for grid in grids {
        let heights = grid.height_summary();
        if let (1.., Some(lowest_m)) = (heights.below_zero, heights.lowest_m) {
            let posts = grid.heights_m.len() - heights.voids;
            found.push(format!(
                "DEM {} has {} of {posts} posts below zero, the lowest at {lowest_m:.1} m",
                grid.label, heights.below_zero
            ));
        }
    }
    if found.is_empty() {
        return Ok(());
    }
    Err(Stop::bad(format!(
        "{}, and nothing says what that ground is",
        found.join("; ")
    ))
    .hint("if it is dry land, say --below-zero land; a sea cannot be filled in this version"))
}

/// An error of the relief crate met before the run.
pub(crate) fn from_relief(error: ReliefError) -> Stop {
    if error.fault == Fault::Stopped {
        return Stop::interrupted();
    }
    let hint = error.hint();
    Stop {
        hint,
        ..Stop::bad_input(error)
    }
}
