//! The configuration of a run: survey file and command line merged (the command line wins) and checked.

use crate::args::{BelowZeroArg, EffectArgs, GroundArg};
use crate::exit::Stop;
use hillpull_engine::{Ground, Settings};
use hillpull_physics::constants;
use hillpull_survey::{BelowZero, FileProblem, SurveyError, SurveyFile, TableOptions, ground_word};
use std::path::PathBuf;

/// Outer edges of Hayford-Bowie zones C, H and L.
const DEFAULT_ZONES_M: [f64; 3] = [230.0, 5240.0, 28_800.0];
const DEFAULT_TOLERANCE_UGAL: f64 = 1.0;
const BEND_RADIUS_M: f64 = 100.0;

/// No rock is lighter than this; a smaller number is most likely a density in g/cm3. 1 is let through: effects per
/// unit density are worth having.
const LEAST_DENSITY_KG_M3: f64 = 100.0;
/// Nothing on Earth is denser than osmium (22 590 kg/m3).
const GREATEST_DENSITY_KG_M3: f64 = 23_000.0;
/// Beyond this a disc around a station is no longer a matter of terrain.
const GREATEST_OUTER_M: f64 = 2_000_000.0;
const GREATEST_THREADS: usize = 4096;

/// A checked run configuration.
#[derive(Debug)]
pub(crate) struct RunConfig {
    pub(crate) survey: Option<PathBuf>,
    pub(crate) stations: PathBuf,
    pub(crate) table: TableOptions,
    pub(crate) dems: Vec<PathBuf>,
    pub(crate) out: PathBuf,
    pub(crate) settings: Settings,
    pub(crate) ground: Ground,
    pub(crate) below_zero: Option<BelowZero>,
    pub(crate) threads: usize,
    pub(crate) resample: bool,
}

impl RunConfig {
    /// Merges and checks.
    pub(crate) fn new(args: &EffectArgs) -> Result<Self, Stop> {
        if args.below_zero == Some(BelowZeroArg::Sea) {
            return Err(no_sea());
        }
        let file = match &args.survey {
            Some(path) => SurveyFile::read(path).map_err(from_survey_file)?,
            None => SurveyFile::default(),
        };
        let path = |flag: &Option<PathBuf>, key: Option<PathBuf>| flag.clone().or(key);
        let text = |flag: &Option<String>, key: Option<String>| flag.clone().or(key);
        let stations = path(&args.stations, file.stations);
        let dems = if args.dem.is_empty() {
            file.dem
        } else {
            args.dem.clone()
        };
        let out = path(&args.out, file.out);
        let missing: Vec<&str> = [
            ("--stations", stations.is_none()),
            ("--dem", dems.is_empty()),
            ("--out", out.is_none()),
        ]
        .iter()
        .filter_map(|(name, is_missing)| is_missing.then_some(*name))
        .collect();
        let (Some(stations), Some(out), false) = (stations, out, dems.is_empty()) else {
            return Err(Stop::bad(format!("missing: {}", missing.join(", ")))
                .hint("give it on the command line, or as a key of the survey file; `hillpull effect --help` lists all options"));
        };
        let settings = settings(
            args.density.or(file.density_kg_m3),
            args.big_g.or(file.big_g),
            args.outer.or(file.outer_m),
            args.zones.clone().or(file.zones_m),
            args.tolerance.or(file.tolerance_ugal),
        )?;
        let ground = match args.ground {
            Some(GroundArg::Bend) => Ground::Bend,
            Some(GroundArg::Settle) => Ground::Settle,
            Some(GroundArg::Given) => Ground::Given,
            None => file.ground.unwrap_or(Ground::Bend),
        };
        let below_zero = match args.below_zero {
            Some(BelowZeroArg::Land) => Some(BelowZero::Land),
            _ => file.below_zero,
        };
        Ok(Self {
            survey: args.survey.clone(),
            stations,
            table: TableOptions {
                crs: text(&args.crs, file.crs),
                id: text(&args.id, file.id),
                x: text(&args.x, file.x),
                y: text(&args.y, file.y),
                height: text(&args.height, file.height),
            },
            dems,
            out,
            settings,
            ground,
            below_zero,
            threads: threads(args.threads.or(file.threads))?,
            resample: args.resample || file.resample.unwrap_or(false),
        })
    }

    /// The options in force, under the names the user knows them by.
    pub(crate) fn options(&self) -> Vec<(&'static str, String)> {
        let s = &self.settings;
        let mut options: Vec<(&'static str, String)> = Vec::new();
        let mut named = |name, value: &Option<String>| {
            if let Some(value) = value {
                options.push((name, value.clone()));
            }
        };
        named("crs", &self.table.crs);
        named("id", &self.table.id);
        named("x", &self.table.x);
        named("y", &self.table.y);
        named("height", &self.table.height);
        options.extend([
            ("density", s.density_kg_m3.to_string()),
            ("big-g", format!("{:e}", s.big_g)),
            ("outer", s.outer_radius_m.to_string()),
            (
                "zones",
                s.zone_edges_m
                    .iter()
                    .map(f64::to_string)
                    .collect::<Vec<_>>()
                    .join(","),
            ),
            ("tolerance", (s.tolerance_mgal * 1000.0).to_string()),
            ("ground", ground_word(self.ground).to_owned()),
        ]);
        if self.below_zero == Some(BelowZero::Land) {
            options.push(("below-zero", "land".to_owned()));
        }
        if self.resample {
            options.push(("resample", "true".to_owned()));
        }
        options
    }
}

/// An error of the survey crate met before the run: the input or the options are to be mended.
pub(crate) fn from_survey(error: SurveyError) -> Stop {
    let hint = error.hint();
    Stop {
        hint,
        ..Stop::bad_input(error)
    }
}

/// The same for the survey file, where a sea is asked for under another name than on the command line.
fn from_survey_file(error: SurveyError) -> Stop {
    if let SurveyError::SurveyFile {
        problem:
            FileProblem::WrongWord {
                key: "below-zero",
                found,
                ..
            },
        ..
    } = &error
        && found == "sea"
    {
        let hint = no_sea().hint;
        return Stop {
            hint,
            ..Stop::bad_input(error)
        };
    }
    from_survey(error)
}

fn no_sea() -> Stop {
    Stop::bad("--below-zero sea: filling the sea is not available in this version").hint(
        "use a DEM that covers land only, or whose sea surface is given as 0 m; if all ground below the datum is dry, say --below-zero land",
    )
}

fn settings(
    density: Option<f64>,
    big_g: Option<f64>,
    outer: Option<f64>,
    zones: Option<Vec<f64>>,
    tolerance: Option<f64>,
) -> Result<Settings, Stop> {
    let density_kg_m3 = density.unwrap_or(constants::DENSITY_ROCK_KG_M3);
    positive("--density", density_kg_m3, "kg/m3; rock is usually 2670")?;
    if density_kg_m3 != 1.0
        && !(LEAST_DENSITY_KG_M3..=GREATEST_DENSITY_KG_M3).contains(&density_kg_m3)
    {
        return Err(Stop::bad(format!(
            "--density {density_kg_m3} kg/m3 is no density of rock"
        ))
        .hint("densities are in kg/m3: 2.67 g/cm3 is 2670; for effects per unit density use 1"));
    }
    let big_g = big_g.unwrap_or(constants::G_CODATA_2018);
    positive(
        "--big-g",
        big_g,
        "m3 kg-1 s-2; leave it out for CODATA 2018",
    )?;
    if !(6e-11..7e-11).contains(&big_g) {
        return Err(Stop::bad(format!(
            "--big-g {big_g:e} is not the gravitational constant in m3 kg-1 s-2"
        ))
        .hint("CODATA 2018 gives 6.6743e-11, the default"));
    }
    let outer_radius_m = outer.unwrap_or(constants::OUTER_RADIUS_M);
    positive(
        "--outer",
        outer_radius_m,
        "m along the ground; usual is 166735",
    )?;
    if outer_radius_m > GREATEST_OUTER_M {
        return Err(Stop::bad(format!(
            "--outer {outer_radius_m} m is beyond {GREATEST_OUTER_M} m"
        ))
        .hint("the radius is in metres along the ground; usual is 166735"));
    }
    let tolerance_ugal = tolerance.unwrap_or(DEFAULT_TOLERANCE_UGAL);
    positive("--tolerance", tolerance_ugal, "µGal; usual is 1")?;
    Ok(Settings {
        density_kg_m3,
        big_g,
        outer_radius_m,
        zone_edges_m: zone_edges(zones, outer_radius_m)?,
        tolerance_mgal: tolerance_ugal / 1000.0,
        bend_radius_m: BEND_RADIUS_M,
    })
}

fn positive(option: &str, value: f64, unit: &str) -> Result<(), Stop> {
    if value.is_finite() && value > 0.0 {
        return Ok(());
    }
    Err(
        Stop::bad(format!("{option} {value}: a number above zero is needed"))
            .hint(format!("{option} is in {unit}")),
    )
}

fn zone_edges(given: Option<Vec<f64>>, outer_radius_m: f64) -> Result<Vec<f64>, Stop> {
    let Some(edges) = given else {
        return Ok(DEFAULT_ZONES_M
            .into_iter()
            .filter(|e| *e < outer_radius_m)
            .collect());
    };
    for edge in &edges {
        positive(
            "--zones",
            *edge,
            "m along the ground; usual is 230,5240,28800",
        )?;
        if *edge >= outer_radius_m {
            return Err(Stop::bad(format!("--zones: the edge {edge} m is not inside the outer radius of {outer_radius_m} m"))
                .hint("leave that edge out (the outer radius closes the last zone by itself), or give a larger --outer"));
        }
    }
    if let Some(pair) = edges.windows(2).find(|pair| pair[0] >= pair[1]) {
        return Err(
            Stop::bad(format!("--zones: {} m comes before {} m", pair[0], pair[1]))
                .hint("give the edges in ascending order, each once"),
        );
    }
    Ok(edges)
}

fn threads(asked: Option<usize>) -> Result<usize, Stop> {
    match asked {
        None => Ok(std::thread::available_parallelism().map_or(1, usize::from)),
        Some(n) if (1..=GREATEST_THREADS).contains(&n) => Ok(n),
        Some(n) => Err(Stop::bad(format!(
            "--threads {n}: a number from 1 to {GREATEST_THREADS} is needed"
        ))
        .hint("leave --threads out to use all cores")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn default_edges_stay_inside_the_outer_radius() {
        assert_eq!(
            zone_edges(None, 166_735.0).unwrap(),
            [230.0, 5240.0, 28_800.0]
        );
        assert_eq!(zone_edges(None, 5240.0).unwrap(), [230.0]);
        assert!(zone_edges(None, 100.0).unwrap().is_empty());
    }

    #[test]
    fn edges_given_are_taken_as_they_are_or_refused() {
        assert_eq!(
            zone_edges(Some(vec![10.0, 20.0]), 30.0).unwrap(),
            [10.0, 20.0]
        );
        assert!(zone_edges(Some(Vec::new()), 30.0).unwrap().is_empty());
        for bad in [
            vec![30.0],
            vec![20.0, 10.0],
            vec![10.0, 10.0],
            vec![0.0],
            vec![f64::NAN],
        ] {
            assert_eq!(
                zone_edges(Some(bad), 30.0).unwrap_err().exit,
                crate::exit::Exit::BadInput
            );
        }
    }

    #[test]
    fn a_density_in_grams_is_refused_and_unit_density_is_not() {
        let with = |density| settings(Some(density), None, None, None, None);
        assert!(with(2.67).is_err());
        assert!(with(f64::INFINITY).is_err());
        assert_eq!(with(1.0).unwrap().density_kg_m3, 1.0);
    }
}
