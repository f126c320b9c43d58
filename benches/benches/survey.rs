//! The main job on an alpine DEM of 1.9e8 cells to 166.7 km: loading, memory, stations a second, brute force beside it,
//! and how the cost grows with the DEM and with the outer radius. All in one run, as ratios.
//!
//! `cargo bench -p hillpull-benches --bench survey` makes the DEM on first use (some minutes) in `target/bench_data`.

use std::env;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::atomic::AtomicBool;
use std::time::Instant;

use anyhow::{Context, Result, bail};
use gdal::{Dataset, DatasetOptions};
use hillpull_benches::alpine::{Alpine, FULL_HALF_LAT_DEG, FULL_HALF_LON_DEG, alpine_dem};
use hillpull_engine::{Settings, Station, StationEffect, brute_force, effects};
use hillpull_physics::constants::{DENSITY_ROCK_KG_M3, G_CODATA_2018, OUTER_RADIUS_M};
use hillpull_relief::{ReadOptions, Relief, read_grid};

/// Stations of the timed runs and of the brute-force comparison.
const STATIONS: usize = 4000;
const BRUTE_STATIONS: usize = 5;
/// Stations lie within this of the middle, m.
const SCATTER_M: f64 = 10_000.0;

fn main() -> Result<()> {
    let args: Vec<String> = env::args()
        .skip(1)
        .filter(|a| !a.starts_with("--"))
        .collect();
    // a fresh process for each load, so that its peak of memory is its own
    if let [task, path] = &args[..] {
        match task.as_str() {
            "decode" => return decode_alone(Path::new(path)),
            "load" => return load_alone(Path::new(path)),
            _ => {}
        }
    }
    // `-- rates` and the like run one section alone
    let wanted = |section: &str| args.is_empty() || args.iter().any(|a| a == section);
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../target/bench_data");
    say("making the relief (first use only)");
    let alpine = Alpine::new();
    let dem = alpine_dem(&alpine, &folder, FULL_HALF_LAT_DEG, FULL_HALF_LON_DEG)?;
    if wanted("loading") {
        loading(&dem)?;
    }
    if ["rates", "radius", "brute"].into_iter().any(wanted) {
        let relief = load(&dem)?;
        let stations = alpine.scattered_stations(STATIONS, 1, SCATTER_M);
        let cells = relief.layers[0].rows * relief.layers[0].cols;
        say(&format!(
            "{cells} cells, {STATIONS} stations over 20 x 20 km, {} threads",
            rayon::current_num_threads()
        ));
        if wanted("rates") {
            rates(&relief, &stations);
        }
        if wanted("radius") {
            growth_with_radius(&relief, &stations);
        }
        if wanted("brute") {
            against_brute_force(&relief, &stations);
        }
    }
    if wanted("size") {
        growth_with_size(&alpine, &folder)?;
    }
    Ok(())
}

#[expect(clippy::print_stdout, reason = "a bench prints its table")]
fn say(line: &str) {
    println!("{line}");
}

fn settings(outer_radius_m: f64, tolerance_mgal: f64) -> Settings {
    let edges = [230.0, 5240.0, 28_800.0];
    Settings {
        density_kg_m3: DENSITY_ROCK_KG_M3,
        big_g: G_CODATA_2018,
        outer_radius_m,
        zone_edges_m: edges.into_iter().filter(|&e| e < outer_radius_m).collect(),
        tolerance_mgal,
        bend_radius_m: 100.0,
    }
}

/// Results and stations a second.
fn timed(relief: &Relief, stations: &[Station], settings: &Settings) -> (Vec<StationEffect>, f64) {
    let start = Instant::now();
    let results = effects(relief, stations, settings, &|_| (), &AtomicBool::new(false));
    let rate = stations.len() as f64 / start.elapsed().as_secs_f64();
    (results.into_iter().flatten().collect(), rate)
}

fn rates(relief: &Relief, stations: &[Station]) {
    say(
        "tolerance uGal | stations/s | evaluations a station | ns an evaluation and thread | worst bound uGal",
    );
    let threads = rayon::current_num_threads() as f64;
    for tolerance_ugal in [0.1, 1.0, 10.0, 100.0] {
        let (results, rate) = timed(
            relief,
            stations,
            &settings(OUTER_RADIUS_M, 1e-3 * tolerance_ugal),
        );
        let evaluations =
            results.iter().map(|r| r.evaluations).sum::<u64>() as f64 / results.len() as f64;
        let bound = results
            .iter()
            .map(|r| r.numeric_bound_mgal)
            .fold(0.0, f64::max);
        say(&format!(
            "{tolerance_ugal:>14} | {rate:>10.0} | {evaluations:>21.0} | {:>27.1} | {:.3}",
            1e9 * threads / (rate * evaluations),
            1e3 * bound
        ));
    }
}

fn growth_with_radius(relief: &Relief, stations: &[Station]) {
    say("outer radius m | us a station and thread | evaluations a station");
    let threads = rayon::current_num_threads() as f64;
    for radius in [1_300.0, 5_240.0, 20_900.0, 83_400.0, OUTER_RADIUS_M] {
        let (results, rate) = timed(relief, stations, &settings(radius, 1e-3));
        let evaluations = results.iter().map(|r| r.evaluations).sum::<u64>() / results.len() as u64;
        say(&format!(
            "{radius:>14} | {:>23.0} | {evaluations}",
            1e6 * threads / rate
        ));
    }
}

fn growth_with_size(alpine: &Alpine, folder: &Path) -> Result<()> {
    say("cells | us a station and thread (outer radius to the DEM's edge)");
    let threads = rayon::current_num_threads() as f64;
    for part in [16.0, 8.0, 4.0, 2.0] {
        let dem = alpine_dem(
            alpine,
            folder,
            FULL_HALF_LAT_DEG / part,
            FULL_HALF_LON_DEG / part,
        )?;
        let relief = load(&dem)?;
        let stations = alpine.scattered_stations(STATIONS, 2, 1000.0);
        let (_, rate) = timed(&relief, &stations, &settings(OUTER_RADIUS_M, 1e-3));
        let cells = relief.layers[0].rows * relief.layers[0].cols;
        say(&format!("{cells:>12} | {:.0}", 1e6 * threads / rate));
    }
    Ok(())
}

fn against_brute_force(relief: &Relief, stations: &[Station]) {
    let settings = settings(OUTER_RADIUS_M, 1e-3);
    let (_, rate) = timed(relief, stations, &settings);
    let threads = rayon::current_num_threads() as f64;
    let (mut worst, mut seconds) = (0.0_f64, 0.0);
    say("brute force: station | error uGal | bound uGal | core seconds");
    for (k, station) in stations.iter().take(BRUTE_STATIONS).enumerate() {
        let (fast, _) = timed(relief, std::slice::from_ref(station), &settings);
        let start = Instant::now();
        let Ok(zones) = brute_force(relief, station, &settings) else {
            continue;
        };
        let took = threads * start.elapsed().as_secs_f64();
        seconds += took;
        let error = 1e3 * (fast[0].terrain_effect_mgal - zones.iter().sum::<f64>()).abs();
        worst = worst.max(error);
        say(&format!(
            "{k:>21} | {error:>10.4} | {:>10.4} | {took:.1}",
            1e3 * fast[0].numeric_bound_mgal
        ));
    }
    let ratio = seconds / BRUTE_STATIONS as f64 * rate / threads;
    say(&format!(
        "brute force takes {ratio:.0} times as long; largest true error {worst:.4} uGal"
    ));
}

// Loading

fn load(dem: &Path) -> Result<Relief> {
    let grid = read_grid(dem, &ReadOptions::default())?;
    Ok(Relief::build(vec![grid])?)
}

fn loading(dem: &Path) -> Result<()> {
    // once unmeasured, so that the file is in the page cache for both
    run_task("decode", dem)?;
    let (decode_s, _, posts) = run_task("decode", dem)?;
    let (load_s, peak_bytes, _) = run_task("load", dem)?;
    say(&format!(
        "GDAL alone decodes {posts} posts in {decode_s:.2} s; loading with the pyramid takes {load_s:.2} s: {:.2} times",
        load_s / decode_s
    ));
    say(&format!(
        "peak memory of loading: {:.2} times the DEM as f32",
        peak_bytes / (4.0 * posts)
    ));
    Ok(())
}

/// Runs one task in a process of its own: (seconds, peak bytes, posts).
fn run_task(task: &str, dem: &Path) -> Result<(f64, f64, f64)> {
    let output = Command::new(env::current_exe()?)
        .args([task])
        .arg(dem)
        .output()?;
    let text = String::from_utf8(output.stdout)?;
    let v: Vec<f64> = text
        .split_whitespace()
        .map(str::parse)
        .collect::<Result<_, _>>()
        .context("task's figures")?;
    match v[..] {
        [seconds, peak, posts] => Ok((seconds, peak, posts)),
        _ => bail!(
            "task {task} failed: {}",
            String::from_utf8_lossy(&output.stderr)
        ),
    }
}

/// GDAL alone: the whole file into one f32 array, with two decoding threads as the loader has.
fn decode_alone(dem: &Path) -> Result<()> {
    let start = Instant::now();
    let options = DatasetOptions {
        open_options: Some(&["NUM_THREADS=ALL_CPUS"]),
        ..DatasetOptions::default()
    };
    let dataset = Dataset::open_ex(dem, options)?;
    let band = dataset.rasterband(1)?;
    let (cols, rows) = dataset.raster_size();
    let mut all = vec![0.0_f32; cols * rows];
    band.read_into_slice((0, 0), (cols, rows), (cols, rows), &mut all, None)?;
    report(start.elapsed().as_secs_f64(), all.len());
    Ok(())
}

fn load_alone(dem: &Path) -> Result<()> {
    let start = Instant::now();
    let relief = load(dem)?;
    report(
        start.elapsed().as_secs_f64(),
        relief.layers[0].rows * relief.layers[0].cols,
    );
    Ok(())
}

/// Prints seconds, the process's peak of resident memory in bytes, and the number of posts.
fn report(seconds: f64, posts: usize) {
    let status = std::fs::read_to_string("/proc/self/status").unwrap_or_default();
    let kib: f64 = status
        .lines()
        .find_map(|l| l.strip_prefix("VmHWM:"))
        .and_then(|v| v.split_whitespace().next()?.parse().ok())
        .unwrap_or(f64::NAN);
    say(&format!("{seconds} {} {posts}", 1024.0 * kib));
}
