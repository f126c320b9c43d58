//! DEMs in: reading, with what there is to say about each.

use crate::config::RunConfig;
use crate::exit::Stop;
use crate::messages::Messages;
use crate::progress::Progress;
use hillpull_engine::Station;
use hillpull_relief::Grid;
use std::sync::atomic::AtomicBool;

pub(crate) fn grids(
    config: &RunConfig,
    _stations: &[Station],
    progress: Progress,
    _messages: Messages,
    stop: &AtomicBool,
) -> Result<Vec<Grid>, Stop> {
    for dem in &config.dems {
        let bar = progress.reading(&dem.display().to_string());
        crate::run_effect::go_on(stop)?;
        bar.finish_and_clear();
    }
    Ok(Vec::new())
}
