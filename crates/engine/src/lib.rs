//! The terrain effect of a relief at a station.
mod types;

pub use types::{Ground, Settings, Station, StationEffect, StationProblem};

use hillpull_relief::Relief;
use std::sync::atomic::AtomicBool;

/// Computes the terrain effect at every station, in parallel on the current rayon pool, in the order given.
///
/// `done` is called with 1 after each station (from any thread); `stop` set to true ends the run early.
pub fn effects(
    _relief: &Relief,
    stations: &[Station],
    settings: &Settings,
    done: &(dyn Fn(usize) + Sync),
    _stop: &AtomicBool,
) -> Vec<Result<StationEffect, StationProblem>> {
    // TRANSITIONAL body, replaced by the walk.
    stations
        .iter()
        .map(|s| {
            done(1);
            let n = settings.zone_edges_m.len() + 1;
            Ok(StationEffect {
                terrain_effect_mgal: 0.0,
                zone_effect_mgal: vec![0.0; n],
                topography_mgal: 0.0,
                numeric_bound_mgal: 0.0,
                dem_height_m: s.height_m,
                height_misfit_m: 0.0,
                covered: 1.0,
                zone_covered: vec![1.0; n],
                layer: 0,
                evaluations: 0,
            })
        })
        .collect()
}
