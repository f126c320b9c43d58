//! The result columns: names, order and digits.
use hillpull_engine::{Settings, StationEffect};
use std::fmt::Write;

/// Name of the column with remarks.
pub(crate) const NOTES: &str = "notes";
/// Its name where the station table has a column `notes` of its own.
pub(crate) const NOTES_BESIDE_USERS: &str = "terrain_notes";

/// Decimals of heights in metres: 1 mm, the last digit surveyed heights are given with.
const HEIGHT_DECIMALS: usize = 3;
const COVERED_DECIMALS: usize = 4;
/// Decimals of mGal: never fewer than 1 µGal.
const MGAL_DECIMALS: usize = 3;
const MOST_DECIMALS: usize = 9;

/// A number with the decimals it is entitled to.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Rounded {
    value: f64,
    decimals: usize,
}

impl Rounded {
    fn nearest(value: f64, decimals: usize) -> Self {
        Self { value, decimals }
    }

    /// The smallest printable number not below `value`.
    fn up(value: f64, decimals: usize) -> Self {
        let printed: f64 = format!("{value:.decimals$}").parse().unwrap_or(value);
        if printed >= value {
            return Self {
                value: printed,
                decimals,
            };
        }
        let scale = 10f64.powi(i32::try_from(decimals).unwrap_or(0));
        Self {
            value: ((printed * scale).round() + 1.0) / scale,
            decimals,
        }
    }

    /// A share between 0 and 1 that prints as 1 only if it is 1.
    fn share(value: f64, decimals: usize) -> Self {
        let below_one = 1.0 - 10f64.powi(-i32::try_from(decimals).unwrap_or(0));
        Self {
            value: if value < 1.0 {
                value.min(below_one)
            } else {
                value
            },
            decimals,
        }
    }

    /// Appends the number, never as a negative zero.
    pub(crate) fn print(self, text: &mut String) {
        let start = text.len();
        // Writing to a String cannot fail.
        let _ = write!(text, "{:.*}", self.decimals, self.value);
        if text[start..].starts_with('-')
            && text[start..]
                .bytes()
                .all(|b| matches!(b, b'-' | b'0' | b'.'))
        {
            text.remove(start);
        }
    }

    /// The number as printed.
    pub(crate) fn value(self) -> f64 {
        let mut text = String::new();
        self.print(&mut text);
        text.parse().unwrap_or(self.value)
    }
}

/// Which result columns there are and with how many digits.
#[derive(Clone, Debug)]
pub(crate) struct Layout {
    /// Names of the number columns, in order; the notes follow them.
    pub(crate) numbers: Vec<String>,
    mgal_decimals: usize,
}

impl Layout {
    pub(crate) fn new(settings: &Settings) -> Self {
        let mut numbers: Vec<String> = [
            "terrain_effect_mgal",
            "terrain_correction_mgal",
            "topography_mgal",
        ]
        .map(str::to_owned)
        .to_vec();
        numbers.extend(
            settings
                .zones_m()
                .iter()
                .map(|(from, to)| format!("zone_{from}_{to}_m_mgal")),
        );
        numbers.extend(
            [
                "numeric_bound_mgal",
                "dem_height_m",
                "height_misfit_m",
                "covered",
            ]
            .map(str::to_owned),
        );
        Self {
            numbers,
            mgal_decimals: mgal_decimals(settings.tolerance_mgal),
        }
    }

    /// The numbers of a result, in the order of the columns.
    pub(crate) fn values(&self, effect: &StationEffect, out: &mut Vec<Rounded>) {
        let mgal = |v| Rounded::nearest(v, self.mgal_decimals);
        out.clear();
        out.extend([
            mgal(effect.terrain_effect_mgal),
            mgal(-effect.terrain_effect_mgal),
            mgal(effect.topography_mgal),
        ]);
        out.extend(effect.zone_effect_mgal.iter().map(|&v| mgal(v)));
        out.extend([
            // One decimal more: a bound of 0.0003 mGal that prints as 0.001 would say nothing.
            Rounded::up(effect.numeric_bound_mgal, self.mgal_decimals + 1),
            Rounded::nearest(effect.dem_height_m, HEIGHT_DECIMALS),
            Rounded::nearest(effect.height_misfit_m, HEIGHT_DECIMALS),
            Rounded::share(effect.covered, COVERED_DECIMALS),
        ]);
    }
}

/// Decimals that a tolerance in mGal supports: 3 down to 1 µGal, 4 at 0.1 µGal, 5 at 0.01 µGal.
fn mgal_decimals(tolerance_mgal: f64) -> usize {
    (MGAL_DECIMALS..MOST_DECIMALS)
        .find(|&d| 10f64.powi(-i32::try_from(d).unwrap_or(0)) <= tolerance_mgal * (1.0 + 1e-9))
        .unwrap_or(MOST_DECIMALS)
}

/// Names of the result columns, in order.
///
/// | column | unit | holds |
/// |---|---|---|
/// | `terrain_effect_mgal` | mGal, positive down | attraction of the body between the station's level and the surface |
/// | `terrain_correction_mgal` | mGal | minus the terrain effect |
/// | `topography_mgal` | mGal, positive down | attraction of everything between the datum and the surface |
/// | `zone_<from>_<to>_m_mgal` | mGal, positive down | the terrain effect of one zone; edges in metres along the ground |
/// | `numeric_bound_mgal` | mGal | bound of the numeric error of the terrain effect |
/// | `dem_height_m` | m | height of the DEM at the station |
/// | `height_misfit_m` | m | height of the station minus that of the DEM |
/// | `covered` | 1 | share of the disc to the outer radius that has a DEM, 0 to 1 |
/// | `notes` | | remarks; why there is no result |
///
/// mGal columns have 3 decimals (1 µGal), more only if the tolerance asked for is finer (4 at 0.1 µGal, 5 at
/// 0.01 µGal). The bound has one decimal more and is rounded up. Heights have 3 decimals. `covered` has 4 and is 1.0000
/// only where nothing is missing. Zones are rounded one by one, so their printed sum may differ from the printed total
/// in the last digit.
#[must_use]
pub fn result_columns(settings: &Settings) -> Vec<String> {
    let mut names = Layout::new(settings).numbers;
    names.push(NOTES.to_owned());
    names
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    fn printed(r: Rounded) -> String {
        let mut text = String::new();
        r.print(&mut text);
        text
    }

    #[test]
    fn decimals_follow_the_tolerance() {
        for (tolerance_ugal, decimals) in [
            (100.0, 3),
            (1.0, 3),
            (0.5, 4),
            (0.1, 4),
            (0.01, 5),
            (0.001, 6),
            (1e-30, MOST_DECIMALS),
        ] {
            assert_eq!(
                mgal_decimals(tolerance_ugal * 1e-3),
                decimals,
                "{tolerance_ugal} µGal"
            );
        }
    }

    #[test]
    fn no_negative_zero() {
        assert_eq!(printed(Rounded::nearest(-0.0004, 3)), "0.000");
        assert_eq!(printed(Rounded::nearest(-0.0, 3)), "0.000");
        assert_eq!(printed(Rounded::nearest(-0.0006, 3)), "-0.001");
        assert!(Rounded::nearest(-0.0, 3).value().is_sign_positive());
    }

    #[test]
    fn bounds_round_up() {
        assert_eq!(printed(Rounded::up(0.000_31, 4)), "0.0004");
        assert_eq!(printed(Rounded::up(0.001, 4)), "0.0010");
        assert_eq!(printed(Rounded::up(0.0, 4)), "0.0000");
        assert_eq!(printed(Rounded::up(1e-12, 4)), "0.0001");
    }

    #[test]
    fn a_gap_is_never_full_cover() {
        assert_eq!(printed(Rounded::share(1.0, 4)), "1.0000");
        assert_eq!(printed(Rounded::share(1.0 - 1e-9, 4)), "0.9999");
        assert_eq!(printed(Rounded::share(0.5, 4)), "0.5000");
    }

    proptest! {
        #[test]
        fn a_printed_bound_holds(bound in 0f64..2.0, decimals in 4usize..8) {
            let up: f64 = printed(Rounded::up(bound, decimals)).parse().unwrap();
            prop_assert!(up >= bound);
            prop_assert!(up - bound <= 1.000_001 * 10f64.powi(-(decimals as i32)));
        }

        #[test]
        fn a_share_below_one_prints_below_one(gap in 1e-15f64..1.0) {
            let text = printed(Rounded::share(1.0 - gap, 4));
            prop_assert!(text.parse::<f64>().unwrap() < 1.0, "{}", text);
        }
    }
}
