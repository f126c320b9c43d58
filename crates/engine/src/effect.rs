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
/// What the quadrature of the cells next to the station may miss, m per unit of G rho: 0.002 uGal in common rock.
const NEAR_FLOOR: f64 = 1e-4;

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
    // neighbours one after the other, so that they find their nodes in the cache
    let order = along_a_curve(stations);
    let computed: Vec<(usize, Result<StationEffect, StationProblem>)> = order
        .into_par_iter()
        .map(|k| {
            if stop.load(Ordering::Relaxed) {
                return (k, Err(StationProblem::Interrupted));
            }
            let result = effect(relief, &stations[k], settings);
            done(1);
            (k, result)
        })
        .collect();
    let mut results = vec![Err(StationProblem::Interrupted); stations.len()];
    for (k, result) in computed {
        results[k] = result;
    }
    results
}

/// Indices of the stations along a space-filling (Morton) curve.
fn along_a_curve(stations: &[Station]) -> Vec<usize> {
    let range = |value: fn(&Station) -> f64| {
        let (low, high) = stations
            .iter()
            .map(value)
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
                (low.min(v), high.max(v))
            });
        (low, 65_535.0 / (high - low).max(1e-9))
    };
    let ((lon, lon_scale), (lat, lat_scale)) = (range(|s| s.lon_deg), range(|s| s.lat_deg));
    let spread =
        |v: f64| (0..16).fold(0_u32, |sum, bit| sum | ((v as u32 >> bit & 1) << (2 * bit)));
    let key = |s: &Station| {
        spread((s.lon_deg - lon) * lon_scale) | spread((s.lat_deg - lat) * lat_scale) << 1
    };
    let mut order: Vec<usize> = (0..stations.len()).collect();
    order.sort_by_cached_key(|&k| (key(&stations[k]), k));
    order
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
    let bend = (station.ground == Ground::Bend && misfit_m != 0.0)
        .then(|| Bend::new(misfit_m, settings.bend_radius_m, spacing_m, frame.stretch));
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
            let mut out = result(&walk.sums, unit);
            let gap_m = relief.nearest_gap_m(frame.foot_m);
            fill_covered(&mut out, &walk.sums.area, &edges, frame.stretch, gap_m);
            let (outer_m, density) = (settings.outer_radius_m, settings.density_kg_m3);
            out.topography_mgal += cap_mgal(frame.height_m, outer_m, density, settings.big_g);
            out.numeric_bound_mgal = bound * unit.abs();
            out.dem_height_m = surface.height_m;
            out.height_misfit_m = misfit_m;
            out.layer = surface.layer;
            out.evaluations = evaluations;
            return Ok(out);
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
    sums.smooth + ROUGH_FACTOR * sums.rough2.sqrt() + FLOOR * size + NEAR_FLOOR
}

/// The effects by zone and in total; the topography still lacks its cap.
fn result(sums: &Sums, unit: f64) -> StationEffect {
    let zone_effect_mgal: Vec<f64> = sums.value.iter().map(|v| v * unit).collect();
    let total: f64 = zone_effect_mgal.iter().sum();
    StationEffect {
        terrain_effect_mgal: total,
        zone_effect_mgal,
        topography_mgal: total,
        numeric_bound_mgal: 0.0,
        dem_height_m: 0.0,
        height_misfit_m: 0.0,
        covered: 1.0,
        zone_covered: Vec::new(),
        layer: 0,
        evaluations: 0,
    }
}

/// Shares covered: exactly 1 where the nearest gap lies beyond, else the area met over the area of the ring.
fn fill_covered(out: &mut StationEffect, areas: &[f64], edges: &Edges, stretch: f64, gap_m: f64) {
    let (mut inner, mut met) = (0.0, 0.0);
    for (area, edge) in areas.iter().zip(&edges.outer) {
        // the area within chord c on a sphere is pi c^2
        let whole = PI * (edge * stretch) * (edge * stretch);
        let share = if *edge < gap_m {
            1.0
        } else {
            (area / (whole - inner)).clamp(0.0, 1.0)
        };
        out.zone_covered.push(share);
        met += share * (whole - inner);
        inner = whole;
    }
    out.covered = if out.zone_covered.iter().all(|&share| share == 1.0) {
        1.0
    } else {
        met / inner
    };
}
