//! Figures that sum up a run.
use crate::output::Outcome;
use hillpull_engine::{Settings, StationEffect};

/// Share of a zone in the terrain effect of the survey.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ZoneShare {
    /// Inner edge, metres.
    pub from_m: f64,
    /// Outer edge, metres.
    pub to_m: f64,
    /// Sum of |effect| of the zone over all stations, divided by the same sum over all zones; 0 to 1.
    pub share: f64,
}

/// Figures that sum up a run.
#[derive(Clone, Debug, PartialEq)]
pub struct Summary {
    /// Rows of the table.
    pub stations: usize,
    /// Stations with a result.
    pub computed: usize,
    /// Stations with a note.
    pub with_notes: usize,
    /// Index in the table and terrain effect, mGal, of the station whose effect is smallest in size.
    pub smallest: Option<(usize, f64)>,
    /// Median of the terrain effect, mGal.
    pub median_mgal: Option<f64>,
    /// Index in the table and terrain effect, mGal, of the station whose effect is largest in size.
    pub largest: Option<(usize, f64)>,
    /// Zones, innermost first.
    pub zones: Vec<ZoneShare>,
    /// Index in the table and bound, mGal, of the station with the worst bound.
    pub worst_bound: Option<(usize, f64)>,
    /// Index in the table and share of the disc covered at the station where it is lowest.
    pub lowest_covered: Option<(usize, f64)>,
}

impl Summary {
    /// Sums up the outcomes of a table, in table order.
    #[must_use]
    pub fn of(outcomes: &[Outcome], settings: &Settings) -> Self {
        let results: Vec<(usize, &StationEffect)> = outcomes
            .iter()
            .enumerate()
            .filter_map(|(i, o)| Some((i, o.effect.as_ref()?)))
            .collect();
        let effects: Vec<(usize, f64)> = results
            .iter()
            .map(|&(i, e)| (i, e.terrain_effect_mgal))
            .collect();
        let by_size = |a: &&(usize, f64), b: &&(usize, f64)| a.1.abs().total_cmp(&b.1.abs());
        let by_value = |a: &(usize, f64), b: &(usize, f64)| a.1.total_cmp(&b.1);
        Self {
            stations: outcomes.len(),
            computed: results.len(),
            with_notes: outcomes.iter().filter(|o| !o.notes.is_empty()).count(),
            // The first of equals, in both directions.
            smallest: effects.iter().min_by(by_size).copied(),
            median_mgal: median(effects.iter().map(|e| e.1).collect()),
            largest: effects.iter().rev().max_by(by_size).copied(),
            zones: zone_shares(&results, settings),
            worst_bound: results
                .iter()
                .map(|&(i, e)| (i, e.numeric_bound_mgal))
                .rev()
                .max_by(by_value),
            lowest_covered: results
                .iter()
                .map(|&(i, e)| (i, e.covered))
                .min_by(by_value),
        }
    }
}

fn median(mut values: Vec<f64>) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    let n = values.len();
    let upper = *values.get(n / 2)?;
    Some(if n % 2 == 1 {
        upper
    } else {
        values[n / 2 - 1].midpoint(upper)
    })
}

fn zone_shares(results: &[(usize, &StationEffect)], settings: &Settings) -> Vec<ZoneShare> {
    let zones = settings.zones_m();
    let mut sums = vec![0.0; zones.len()];
    for (_, effect) in results {
        for (sum, zone) in sums.iter_mut().zip(&effect.zone_effect_mgal) {
            *sum += zone.abs();
        }
    }
    let all: f64 = sums.iter().sum();
    let share = |sum: f64| if all > 0.0 { sum / all } else { 0.0 };
    zones
        .iter()
        .zip(sums)
        .map(|(&(from_m, to_m), sum)| ZoneShare {
            from_m,
            to_m,
            share: share(sum),
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    fn outcome(zones: [f64; 2], bound: f64, covered: f64) -> Outcome {
        let effect = StationEffect {
            terrain_effect_mgal: zones[0] + zones[1],
            zone_effect_mgal: zones.to_vec(),
            topography_mgal: 100.0,
            numeric_bound_mgal: bound,
            dem_height_m: 1000.0,
            height_misfit_m: 0.0,
            covered,
            zone_covered: vec![1.0, covered],
            layer: 0,
            evaluations: 1,
        };
        Outcome {
            effect: Some(effect),
            notes: Vec::new(),
        }
    }

    fn settings() -> Settings {
        Settings {
            density_kg_m3: 2670.0,
            big_g: 6.674_30e-11,
            outer_radius_m: 1000.0,
            zone_edges_m: vec![100.0],
            tolerance_mgal: 0.001,
            bend_radius_m: 100.0,
        }
    }

    #[test]
    fn figures_of_four_rows() {
        let failed = Outcome {
            effect: None,
            notes: vec!["height missing".into()],
        };
        let outcomes = [
            failed,
            outcome([-1.0, -2.0], 3e-4, 1.0),
            outcome([-0.5, 0.25], 5e-4, 0.9),
            outcome([-4.0, -2.0], 1e-4, 1.0),
        ];
        let s = Summary::of(&outcomes, &settings());
        assert_eq!((s.stations, s.computed, s.with_notes), (4, 3, 1));
        assert_eq!(s.smallest, Some((2, -0.25)));
        assert_eq!(s.median_mgal, Some(-3.0));
        assert_eq!(s.largest, Some((3, -6.0)));
        assert_eq!(s.worst_bound, Some((2, 5e-4)));
        assert_eq!(s.lowest_covered, Some((2, 0.9)));
        // |1| + |0.5| + |4| = 5.5 inside, 2 + 0.25 + 2 = 4.25 outside.
        assert_relative_eq!(s.zones[0].share, 5.5 / 9.75, epsilon = 1e-15);
        assert_relative_eq!(s.zones[1].share, 4.25 / 9.75, epsilon = 1e-15);
        assert_eq!((s.zones[1].from_m, s.zones[1].to_m), (100.0, 1000.0));
    }

    #[test]
    fn nothing_computed_gives_no_figures() {
        let s = Summary::of(&[Outcome::default()], &settings());
        assert_eq!((s.stations, s.computed), (1, 0));
        assert_eq!((s.smallest, s.median_mgal, s.largest), (None, None, None));
        assert!(s.zones.iter().all(|z| z.share == 0.0));
    }

    #[test]
    fn the_median_of_an_even_number_lies_between() {
        assert_eq!(median(vec![4.0, 1.0, 3.0, 2.0]), Some(2.5));
        assert_eq!(median(Vec::new()), None);
    }
}
