//! What stored values mean: voids, scale and offset, unit.

use gdal::raster::{GdalDataType, RasterBand};
use rayon::prelude::*;

use super::unit;
use super::window::Window;
use crate::error::Fault;
use crate::grid::HeightSummary;

/// No ground is farther from the datum than this, metres (highest 8849 m, deepest about -10 935 m; common knowledge,
/// no source).
pub(super) const LIMIT_M: f32 = 12_000.0;
/// Values beyond this are a nodata value written with few digits, if the nodata value is beyond it too.
const HUGE: f64 = 1e30;

/// Stored values that often mark missing data and may pass for heights, in metres or in feet.
const VOID_MARKS: [f64; 3] = [-9999.0, -32_768.0, -32_767.0];
/// No ground falls by this much from one post to the next, metres.
const CLIFF_M: f32 = 2000.0;

/// How stored values become heights.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Decoding {
    nodata: Nodata,
    scale: f64,
    offset: f64,
    metres: f64,
    /// Whether f32 would lose digits before scale and offset are applied.
    pub(super) wide: bool,
    /// Whether a mask band says which posts are valid.
    pub(super) masked: bool,
}

#[derive(Clone, Copy, Debug, PartialEq)]
enum Nodata {
    /// None, or NaN, which needs no test.
    None,
    /// This value.
    Value(f64),
    /// Anything above 1e30, or below -1e30.
    Above,
    /// Anything below -1e30.
    Below,
}

impl Decoding {
    /// Of `band`; scale and offset are those `meaning` states, `metres` is the unit of its heights.
    pub(super) fn of(
        band: &RasterBand<'_>,
        meaning: &RasterBand<'_>,
        metres: f64,
    ) -> Result<Self, Fault> {
        let stored = band.band_type();
        let nodata = match stored {
            GdalDataType::Int64 => band.no_data_value_i64().map(|v| v as f64),
            GdalDataType::UInt64 => band.no_data_value_u64().map(|v| v as f64),
            _ => band.no_data_value(),
        };
        let nodata = match nodata {
            Some(value) if value > HUGE => Nodata::Above,
            Some(value) if value < -HUGE => Nodata::Below,
            Some(value) if !value.is_nan() => Nodata::Value(value),
            _ => Nodata::None,
        };
        let (scale, offset) = (
            meaning.scale().unwrap_or(1.0),
            meaning.offset().unwrap_or(0.0),
        );
        if scale == 0.0 || !scale.is_finite() || !offset.is_finite() {
            return Err(Fault::BadScale { scale, offset });
        }
        let exact_in_f32 = matches!(
            stored,
            GdalDataType::UInt8
                | GdalDataType::UInt16
                | GdalDataType::Int16
                | GdalDataType::Float32
        );
        // a stated nodata value is part of the mask already, unless the mask is a band of its own
        let masked = band
            .mask_flags()
            .is_ok_and(|flags| flags.is_per_dataset() || flags.is_alpha());
        Ok(Self {
            nodata,
            scale,
            offset,
            metres,
            wide: !exact_in_f32 && (scale, offset) != (1.0, 0.0),
            masked,
        })
    }

    fn is_plain(&self) -> bool {
        (self.scale, self.offset, self.metres) == (1.0, 0.0, 1.0)
    }

    /// Height in metres of a stored value that is not nodata.
    pub(super) fn height_m(&self, stored: f64) -> f32 {
        ((stored * self.scale + self.offset) * self.metres) as f32
    }

    /// Stored values to heights, in place, and their range.
    pub(super) fn finish(&self, values: &mut [f32]) -> HeightSummary {
        match self.nodata {
            Nodata::None => self.finish_with(values, |_| false),
            Nodata::Above => self.finish_with(values, |v| v > HUGE as f32),
            Nodata::Below => self.finish_with(values, |v| v < -HUGE as f32),
            Nodata::Value(nodata) => {
                let nodata = nodata as f32;
                self.finish_with(values, |v| v == nodata)
            }
        }
    }

    fn finish_with(
        &self,
        values: &mut [f32],
        is_void: impl Fn(f32) -> bool + Sync,
    ) -> HeightSummary {
        let plain = self.is_plain();
        values
            .par_chunks_mut(1 << 16)
            .map(|chunk| {
                // no branches inside, so that the loops vectorise
                for v in &mut *chunk {
                    let height_m = if plain {
                        *v
                    } else {
                        self.height_m(f64::from(*v))
                    };
                    *v = if is_void(*v) { f32::NAN } else { height_m };
                }
                HeightSummary::of(chunk)
            })
            .reduce(HeightSummary::default, HeightSummary::and)
    }

    /// Refuses a window of voids only, and one with a mark of missing data that is not stated as such: a post of that
    /// very value beside one that is thousands of metres higher.
    pub(super) fn check_voids(
        &self,
        heights_m: &[f32],
        summary: &HeightSummary,
        window: Window,
        ring: Option<usize>,
    ) -> Result<(), Fault> {
        let Some(lowest_m) = summary.lowest_m else {
            let posts = heights_m.len();
            return Err(Fault::AllVoid { posts });
        };
        for value in VOID_MARKS {
            let mark = self.height_m(value);
            // most DEMs go nowhere near
            if mark > -CLIFF_M || lowest_m > mark {
                continue;
            }
            let found = (0..heights_m.len())
                .filter(|&at| heights_m[at] == mark)
                .find_map(|at| {
                    let beside = neighbours(at, window).find(|&k| heights_m[k] > mark + CLIFF_M)?;
                    Some((at, heights_m[beside]))
                });
            if let Some((at, beside_m)) = found {
                let col = window.first_col + at % window.cols;
                return Err(Fault::UnstatedVoid {
                    row: window.first_row + at / window.cols,
                    col: col % ring.unwrap_or(usize::MAX),
                    value,
                    beside_m: f64::from(beside_m),
                });
            }
        }
        Ok(())
    }

    pub(super) fn is_void_f64(&self, value: f64) -> bool {
        match self.nodata {
            Nodata::None => value.is_nan(),
            Nodata::Above => value > HUGE,
            Nodata::Below => value < -HUGE,
            Nodata::Value(nodata) => value == nodata,
        }
    }
}

/// Posts right, left, below and above one, within the window.
fn neighbours(at: usize, window: Window) -> impl Iterator<Item = usize> {
    let (row, col) = (at / window.cols, at % window.cols);
    [
        (col + 1 < window.cols).then_some(at + 1),
        (col > 0).then(|| at - 1),
        (row + 1 < window.rows).then_some(at + window.cols),
        (row > 0).then(|| at - window.cols),
    ]
    .into_iter()
    .flatten()
}

/// Unit of the heights: its name and the metres in it, from the band or else from the vertical CRS.
pub(super) fn unit_of(
    band_unit: &str,
    vertical: Option<&(String, f64)>,
) -> Result<(String, f64), Fault> {
    if band_unit.trim().is_empty() {
        return Ok(vertical.map_or_else(|| ("m".to_owned(), 1.0), Clone::clone));
    }
    let Some(metres) = unit::metres_in(band_unit) else {
        return Err(Fault::UnknownUnit {
            unit: band_unit.to_owned(),
        });
    };
    if let Some((crs_unit, crs_metres)) = vertical
        && (crs_metres / metres - 1.0).abs() > 1e-9
    {
        return Err(Fault::TwoUnits {
            band_unit: band_unit.to_owned(),
            crs_unit: crs_unit.clone(),
        });
    }
    Ok((band_unit.trim().to_owned(), metres))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unit_of_band_or_vertical_crs() {
        let feet = ("US survey foot".to_owned(), 1200.0 / 3937.0);
        assert_eq!(unit_of("", None).unwrap(), ("m".to_owned(), 1.0));
        assert_eq!(unit_of("", Some(&feet)).unwrap(), feet);
        assert_eq!(unit_of("us-ft", Some(&feet)).unwrap().1, feet.1);
        assert!(matches!(
            unit_of("m", Some(&feet)),
            Err(Fault::TwoUnits { .. })
        ));
        // the two feet differ by 2 parts in a million: 6 mm at 3000 m, and a sign that something is wrong
        assert!(matches!(
            unit_of("ft", Some(&feet)),
            Err(Fault::TwoUnits { .. })
        ));
        assert!(matches!(unit_of("K", None), Err(Fault::UnknownUnit { .. })));
    }
}
