//! The summary at the end of a run, for stderr: aligned, short, readable without colour.

use hillpull_engine::{Ground, Settings};
use hillpull_survey::{Outcome, StationTable, Summary, ground_word};
use std::fmt::Write;
use std::time::Duration;

/// At most this many stations are named in one line.
const NAMES_SHOWN: usize = 5;

/// What the summary is about.
pub(crate) struct Run<'a> {
    pub(crate) table: &'a StationTable,
    pub(crate) outcomes: &'a [Outcome],
    pub(crate) settings: &'a Settings,
    pub(crate) ground: Ground,
    /// Time to read the inputs and to build the relief.
    pub(crate) loading: Duration,
    /// Time for all stations.
    pub(crate) computing: Duration,
    /// Where the results are.
    pub(crate) written: &'a str,
}

impl Run<'_> {
    /// The text, one line a fact, without a final line break.
    pub(crate) fn text(&self) -> String {
        let figures = Summary::of(self.outcomes, self.settings);
        let mut lines = Lines::default();
        lines.add(
            "stations",
            &format!("{} of {} have a result", figures.computed, figures.stations),
        );
        self.sizes(&mut lines, &figures);
        for (i, zone) in figures.zones.iter().enumerate() {
            let range = format!("{} to {} m", zone.from_m, zone.to_m);
            lines.add(
                if i == 0 { "zones" } else { "" },
                &format!("{range:<18} {:>5.1} %", 100.0 * zone.share),
            );
        }
        self.trust(&mut lines, &figures);
        lines.add("notes", &self.notes());
        lines.add("model", &self.model());
        lines.add("time", &self.time());
        lines.add("written", self.written);
        lines.text
    }

    fn sizes(&self, lines: &mut Lines, figures: &Summary) {
        let mut add = |label: &str, what: &str, mgal: f64, name: &str| {
            lines.add(
                label,
                format!("{what:<8} {mgal:>9.3} mGal  {name}").trim_end(),
            );
        };
        if let Some((index, mgal)) = figures.smallest {
            add("effect", "smallest", mgal, &self.table.id(index));
        }
        if let Some(mgal) = figures.median_mgal {
            add("", "median", mgal, "");
        }
        if let Some((index, mgal)) = figures.largest {
            add("", "largest", mgal, &self.table.id(index));
        }
    }

    fn trust(&self, lines: &mut Lines, figures: &Summary) {
        if let Some((index, mgal)) = figures.worst_bound {
            let asked = ugal(self.settings.tolerance_mgal);
            lines.add(
                "bound",
                &format!(
                    "worst {} µGal, at {}; asked {asked} µGal",
                    ugal(mgal),
                    self.table.id(index)
                ),
            );
        }
        if let Some((index, share)) = figures.lowest_covered {
            let text = if share >= 1.0 {
                "the whole disc at every station".to_owned()
            } else {
                format!(
                    "lowest {} of the disc, at {}",
                    percent(share),
                    self.table.id(index)
                )
            };
            lines.add("coverage", &text);
        }
    }

    fn notes(&self) -> String {
        let noted: Vec<_> = (0..self.outcomes.len())
            .filter(|i| !self.outcomes[*i].notes.is_empty())
            .collect();
        if noted.is_empty() {
            return "none".to_owned();
        }
        let names: Vec<_> = noted
            .iter()
            .take(NAMES_SHOWN)
            .map(|i| self.table.id(*i))
            .collect();
        let word = if noted.len() == 1 {
            "station"
        } else {
            "stations"
        };
        let more = if noted.len() > NAMES_SHOWN {
            ", ..."
        } else {
            ""
        };
        format!("{} {word}: {}{more}", noted.len(), names.join(", "))
    }

    fn model(&self) -> String {
        let s = self.settings;
        format!(
            "density {} kg/m3, G {:e} m3 kg-1 s-2, outer radius {} m, ground {}",
            s.density_kg_m3,
            s.big_g,
            s.outer_radius_m,
            ground_word(self.ground)
        )
    }

    fn time(&self) -> String {
        let seconds = self.computing.as_secs_f64();
        let mut text = format!(
            "loading {:.1} s, stations {seconds:.1} s",
            self.loading.as_secs_f64()
        );
        if seconds > 0.0 {
            let rate = self.table.len() as f64 / seconds;
            let _ = write!(text, ", {rate:.*} stations/s", usize::from(rate < 10.0));
        }
        text
    }
}

/// mGal as µGal with three significant digits at most.
fn ugal(mgal: f64) -> String {
    let value = 1000.0 * mgal;
    let digits = if value == 0.0 {
        0
    } else {
        (2 - value.abs().log10().floor() as i32).clamp(0, 6)
    };
    let text = format!("{value:.*}", digits as usize);
    if text.contains('.') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// A share in percent; 100 is said only of a whole.
fn percent(share: f64) -> String {
    let shown = if share < 1.0 {
        (100.0 * share).min(99.9)
    } else {
        100.0
    };
    format!("{shown:.1} %")
}

/// Lines of a label and a text.
#[derive(Default)]
struct Lines {
    text: String,
}

impl Lines {
    fn add(&mut self, label: &str, text: &str) {
        if !self.text.is_empty() {
            self.text.push('\n');
        }
        let _ = write!(self.text, "{label:<9} {text}");
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_carry_no_false_digits() {
        assert_eq!(ugal(0.001), "1");
        assert_eq!(ugal(0.000_612_34), "0.612");
        assert_eq!(ugal(0.1), "100");
        assert_eq!(ugal(0.0), "0");
        assert_eq!(ugal(1.234_567e-5), "0.0123");
    }

    #[test]
    fn only_the_whole_is_100_percent() {
        assert_eq!(percent(1.0), "100.0 %");
        assert_eq!(percent(0.999_999), "99.9 %");
        assert_eq!(percent(0.5), "50.0 %");
    }
}
