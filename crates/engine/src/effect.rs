//! The terrain effect at stations: ground policy, the walk, and its result.

use crate::bend::Bend;
use crate::frame::StationFrame;
use crate::types::{Ground, Settings, Station, StationEffect, StationProblem};
use crate::walk::{ROUGH_FACTOR, Sums, Walk};
use crate::zones::Edges;
use hillpull_physics::bodies::cap::cap_mgal;
use hillpull_physics::constants::MGAL_PER_M_S2;
use hillpull_relief::Relief;
use rayon::prelude::*;
use std::f64::consts::PI;
use std::sync::atomic::{AtomicBool, Ordering};

/// Times that a walk is repeated with smaller shares when its bound stays above the tolerance.
const MOST_WALKS: usize = 6;
/// Part of the value that formulas and rounding may miss: the kernel's 1e-8, positions, single-precision moments.
const FLOOR: f64 = 2e-8;
/// The bending radius is at least this many posts of the DEM under the station.
const BEND_POSTS: f64 = 3.0;

/// Computes the terrain effect at every station, in parallel on the current rayon pool, in the order given.
///
/// `done` is called with 1 after each station (from any thread); `stop` set to true ends the run early. A station's result
/// depends on nothing but the relief, the station and the settings.
pub fn effects(
    relief: &Relief,
    stations: &[Station],
    settings: &Settings,
    done: &(dyn Fn(usize) + Sync),
    stop: &AtomicBool,
) -> Vec<Result<StationEffect, StationProblem>> {
    stations
        .par_iter()
        .map(|station| {
            if stop.load(Ordering::Relaxed) {
                return Err(StationProblem::Interrupted);
            }
            let result = effect(relief, station, settings);
            done(1);
            result
        })
        .collect()
}

/// The terrain effect at one station.
///
/// # Errors
/// No layer under the station, or a tolerance below what double precision gives.
pub fn effect(
    relief: &Relief,
    station: &Station,
    settings: &Settings,
) -> Result<StationEffect, StationProblem> {
    let given = StationFrame::new(station.lon_deg, station.lat_deg, station.height_m);
    let surface = relief
        .surface_at(given.foot_m)
        .ok_or(StationProblem::NotCovered)?;
    let misfit_m = station.height_m - surface.height_m;
    let frame = match station.ground {
        Ground::Settle => StationFrame::new(station.lon_deg, station.lat_deg, surface.height_m),
        Ground::Bend | Ground::Given => given,
    };
    let spacing_m = relief.layers[surface.layer].post_spacing_m;
    let bend = (station.ground == Ground::Bend && misfit_m != 0.0).then(|| Bend {
        rise_m: misfit_m,
        radius: settings.bend_radius_m.max(BEND_POSTS * spacing_m) * frame.stretch,
    });
    let zones_m = settings.zones_m();
    let edges = Edges::new(&zones_m);
    // mGal per metre of the walk's values
    let unit = settings.big_g * settings.density_kg_m3 * MGAL_PER_M_S2;
    let tolerance = settings.tolerance_mgal / unit.abs();
    let mut aim = tolerance;
    let mut evaluations = 0;
    for _ in 0..MOST_WALKS {
        let mut walk = Walk::new(&frame, &edges, bend, aim);
        for layer in &relief.layers {
            walk.layer(layer);
        }
        evaluations += walk.sums.evaluations;
        let bound = bound(&walk.sums);
        if bound <= tolerance {
            let cap = cap_mgal(
                frame.height_m,
                settings.outer_radius_m,
                settings.density_kg_m3,
                settings.big_g,
            );
            return Ok(result(&walk.sums, &edges, frame.stretch, unit, bound, cap, |out| {
                out.dem_height_m = surface.height_m;
                out.height_misfit_m = misfit_m;
                out.layer = surface.layer;
                out.evaluations = evaluations;
            }));
        }
        aim *= 0.6 * tolerance / bound;
        if aim < 1e-3 * tolerance {
            return Err(StationProblem::ToleranceNotMet {
                bound_mgal: bound * unit.abs(),
            });
        }
    }
    Err(StationProblem::ToleranceNotMet {
        bound_mgal: f64::NAN,
    })
}

fn bound(sums: &Sums) -> f64 {
    let size: f64 = sums.value.iter().map(|v| v.abs()).sum();
    sums.smooth + ROUGH_FACTOR * sums.rough2.sqrt() + FLOOR * size
}

fn result(
    sums: &Sums,
    edges: &Edges,
    stretch: f64,
    unit: f64,
    bound: f64,
    cap_mgal: f64,
    fill: impl FnOnce(&mut StationEffect),
) -> StationEffect {
    let zone_effect_mgal: Vec<f64> = sums.value.iter().map(|v| v * unit).collect();
    let total: f64 = zone_effect_mgal.iter().sum();
    let mut inner = 0.0;
    let mut zone_covered = Vec::with_capacity(edges.outer.len());
    for (area, edge) in sums.area.iter().zip(&edges.outer) {
        // the area within chord c on a sphere is pi c^2
        let whole = PI * (edge * stretch) * (edge * stretch);
        zone_covered.push((area / (whole - inner)).clamp(0.0, 1.0));
        inner = whole;
    }
    let mut out = StationEffect {
        terrain_effect_mgal: total,
        zone_effect_mgal,
        topography_mgal: cap_mgal + total,
        numeric_bound_mgal: bound * unit.abs(),
        dem_height_m: 0.0,
        height_misfit_m: 0.0,
        covered: (sums.area.iter().sum::<f64>() / inner).clamp(0.0, 1.0),
        zone_covered,
        layer: 0,
        evaluations: 0,
    };
    fill(&mut out);
    out
}
