//! The engine's results back to the rows of the table, with the notes that follow from them.
use super::Outcome;
use crate::table::StationTable;
use hillpull_engine::{Ground, Settings, StationEffect, StationProblem};

/// A misfit between station and DEM that gets a note, metres: more than the error of common DEMs in steep ground, less
/// than a mistaken datum, unit or position gives (common practice, no source).
const MISFIT_NOTED_M: f64 = 30.0;

/// Brings the engine's results, given for the stations of [`StationTable::engine_stations`] in that order, back to
/// the rows of the table, and writes the notes that follow from them: why there is no result, ground without DEM, and
/// heights far from the DEM's (not for [`Ground::Given`], where stations may stand anywhere).
///
/// # Panics
/// If `results` is not as long as the list of usable stations.
#[must_use]
pub fn join(
    table: &StationTable,
    results: Vec<Result<StationEffect, StationProblem>>,
    settings: &Settings,
    ground: Ground,
) -> Vec<Outcome> {
    let mut results = results.into_iter();
    let outcomes = table
        .stations()
        .iter()
        .map(|station| match station.fault {
            Some(fault) => Outcome {
                effect: None,
                notes: vec![fault.to_string()],
            },
            None => match results.next().expect("a result for each usable station") {
                Ok(effect) => outcome(effect, settings, ground),
                Err(problem) => Outcome {
                    effect: None,
                    notes: vec![problem.to_string()],
                },
            },
        })
        .collect();
    assert!(
        results.next().is_none(),
        "more results than usable stations"
    );
    outcomes
}

fn outcome(effect: StationEffect, settings: &Settings, ground: Ground) -> Outcome {
    let finite = [
        effect.terrain_effect_mgal,
        effect.topography_mgal,
        effect.numeric_bound_mgal,
        effect.dem_height_m,
    ]
    .iter()
    .chain(&effect.zone_effect_mgal)
    .all(|v| v.is_finite());
    if !finite {
        return Outcome {
            effect: None,
            notes: vec!["the result is not a number".to_owned()],
        };
    }
    let mut notes = Vec::new();
    if effect.covered < 1.0 {
        notes.push(gap_note(&effect, settings));
    }
    if ground != Ground::Given && effect.height_misfit_m.abs() > MISFIT_NOTED_M {
        let side = if effect.height_misfit_m > 0.0 {
            "above"
        } else {
            "below"
        };
        notes.push(format!(
            "station height is {:.1} m {side} the DEM",
            effect.height_misfit_m.abs()
        ));
    }
    Outcome {
        effect: Some(effect),
        notes,
    }
}

fn gap_note(effect: &StationEffect, settings: &Settings) -> String {
    let zones: Vec<String> = settings
        .zones_m()
        .iter()
        .zip(&effect.zone_covered)
        .filter(|(_, covered)| **covered < 1.0)
        .map(|((from, to), covered)| format!("{} of zone {from} to {to} m", percent(1.0 - covered)))
        .collect();
    if zones.is_empty() {
        return format!("no DEM for {} of the ground", percent(1.0 - effect.covered));
    }
    format!("no DEM for {}", zones.join(", "))
}

/// A share in percent with one decimal, never 0.0 for something and never 100.0 for less than all.
fn percent(share: f64) -> String {
    let p = share * 100.0;
    if p < 0.1 {
        "under 0.1 %".to_owned()
    } else if share < 1.0 {
        format!("{:.1} %", p.min(99.9))
    } else {
        "100 %".to_owned()
    }
}
