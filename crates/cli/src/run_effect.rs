//! `hillpull effect`: from the checked configuration to the written table.
//!
//! What can fail early fails early: options, station table, output and DEMs are all checked before the first
//! station is computed, and the output is written in one go at the end.

use crate::args::EffectArgs;
use crate::config::{RunConfig, from_survey};
use crate::exit::{Exit, Stop};
use crate::interrupt;
use crate::load;
use crate::messages::Messages;
use crate::progress::Progress;
use crate::summary;
use hillpull_engine::Ground;
use hillpull_relief::{Grid, Relief};
use hillpull_survey::{
    Outcome, OutputTarget, Provenance, StationTable, join, read_stations, write_effects,
};
use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicBool, Ordering};
use std::time::Instant;

/// A median misfit between stations and DEM beyond which a mistaken datum or unit is suspected, metres. Geoid heights,
/// the commonest mix-up, reach some tens of metres (common practice, no source).
const SHARED_MISFIT_M: f64 = 20.0;

/// Runs the command.
pub(crate) fn run(args: &EffectArgs, messages: Messages) -> Result<Exit, Stop> {
    let started = Instant::now();
    let config = RunConfig::new(args)?;
    let stop = interrupt::listen().map_err(Stop::failure)?;
    let progress = Progress::new(args.quiet);

    let target = OutputTarget::from_path(&config.out).map_err(from_survey)?;
    let table = read_stations(&config.stations, &config.table).map_err(from_survey)?;
    for note in table.notes() {
        messages.warning(note);
    }
    target
        .check(&table, &config.settings, &inputs(&config))
        .map_err(from_survey)?;

    let pool = rayon::ThreadPoolBuilder::new()
        .num_threads(config.threads)
        .build()
        .map_err(|e| {
            Stop::failure(
                anyhow::Error::new(e).context(format!("start {} threads", config.threads)),
            )
            .hint("give fewer --threads")
        })?;
    let stations = table.engine_stations(config.ground);
    let grids =
        pool.install(|| load::grids(&config, &stations.stations, progress, messages, stop))?;
    let provenance = provenance(&config, &target, &grids, progress, stop)?;
    let relief = {
        let bar = progress.working("building the relief");
        let relief = pool.install(|| Relief::build(grids));
        bar.finish_and_clear();
        relief.map_err(load::from_relief)?
    };
    go_on(stop)?;
    let loading = started.elapsed();

    let started = Instant::now();
    let bar = progress.stations(stations.stations.len());
    let results = pool.install(|| {
        let done = |count: usize| bar.inc(count as u64);
        hillpull_engine::effects(&relief, &stations.stations, &config.settings, &done, stop)
    });
    bar.finish_and_clear();
    go_on(stop)?;
    let computing = started.elapsed();

    let outcomes = join(&table, results, &config.settings, config.ground);
    write(&target, &table, &outcomes, &config, &provenance)?;
    let written = match (target.path(), target.provenance_path()) {
        (None, _) => "standard output".to_owned(),
        (Some(path), None) => path.display().to_string(),
        (Some(path), Some(beside)) => {
            format!("{}, provenance in {}", path.display(), beside.display())
        }
    };
    if let Some(text) = doubt_about_heights(&outcomes, config.ground) {
        messages.warning(text);
    }
    let run = summary::Run {
        table: &table,
        outcomes: &outcomes,
        settings: &config.settings,
        ground: config.ground,
        loading,
        computing,
        written: &written,
    };
    messages.note(run.text());
    let complete = outcomes.iter().all(|o| o.effect.is_some());
    Ok(if complete {
        Exit::Done
    } else {
        Exit::SomeStationsWithout
    })
}

/// Every file the run reads.
fn inputs(config: &RunConfig) -> Vec<PathBuf> {
    config
        .survey
        .iter()
        .chain([&config.stations])
        .chain(&config.dems)
        .cloned()
        .collect()
}

/// Stops here if the user asked to.
pub(crate) fn go_on(stop: &AtomicBool) -> Result<(), Stop> {
    if stop.load(Ordering::SeqCst) {
        Err(Stop::interrupted())
    } else {
        Ok(())
    }
}

/// Options and checksums for the output. Standard output has no room for them, so nothing is read for it.
fn provenance(
    config: &RunConfig,
    target: &OutputTarget,
    grids: &[Grid],
    progress: Progress,
    stop: &AtomicBool,
) -> Result<Provenance, Stop> {
    let mut provenance =
        Provenance::new(env!("CARGO_PKG_VERSION"), &config.settings, config.ground);
    for (name, value) in config.options() {
        provenance.option(name, value);
    }
    if *target == OutputTarget::Stdout {
        return Ok(provenance);
    }
    let mut files: Vec<(&str, &Path)> = config
        .survey
        .iter()
        .map(|path| ("survey", path.as_path()))
        .collect();
    files.push(("stations", &config.stations));
    for path in grids.iter().flat_map(dem_files) {
        if !files.contains(&("dem", path)) {
            files.push(("dem", path));
        }
    }
    let bar = progress.working("checksums of the inputs");
    for (role, path) in files {
        go_on(stop)?;
        provenance.input(role, path).map_err(from_survey)?;
    }
    bar.finish_and_clear();
    Ok(provenance)
}

/// The DEM as named, then what stands behind it, such as the tiles of a VRT.
fn dem_files(grid: &Grid) -> impl Iterator<Item = &Path> {
    let named = &grid.origin.path;
    let behind = grid
        .origin
        .files
        .iter()
        .filter(move |file| *file != named && file.exists());
    std::iter::once(named).chain(behind).map(PathBuf::as_path)
}

/// A misfit that most stations share is no matter of the DEM's resolution.
fn doubt_about_heights(outcomes: &[Outcome], ground: Ground) -> Option<String> {
    if ground == Ground::Given {
        return None;
    }
    let mut misfits_m: Vec<f64> = outcomes
        .iter()
        .filter_map(|o| o.effect.as_ref())
        .map(|e| e.height_misfit_m)
        .collect();
    misfits_m.sort_by(f64::total_cmp);
    let median_m = *misfits_m.get(misfits_m.len() / 2)?;
    (median_m.abs() > SHARED_MISFIT_M).then(|| {
        let side = if median_m > 0.0 { "above" } else { "below" };
        format!(
            "half of the stations lie {:.0} m or more {side} the DEM: check vertical datum and unit of both, and the position of the stations",
            median_m.abs()
        )
    })
}

fn write(
    target: &OutputTarget,
    table: &StationTable,
    outcomes: &[Outcome],
    config: &RunConfig,
    provenance: &Provenance,
) -> Result<(), Stop> {
    let mut stdout = std::io::stdout().lock();
    write_effects(
        target,
        &mut stdout,
        table,
        outcomes,
        &config.settings,
        provenance,
    )
    .map_err(|error| {
        let hint = error.hint();
        Stop {
            hint,
            ..Stop::failure(error)
        }
    })
}
