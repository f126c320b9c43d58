//! Heights of a window into one vector of f32, in bands of rows.

use std::ops::Range;
use std::sync::atomic::{AtomicBool, Ordering};

use gdal::raster::RasterBand;

use super::decode::{Decoding, LIMIT_M};
use super::gdal_text;
use super::window::Window;
use crate::error::Fault;
use crate::grid::HeightSummary;

/// Posts in one band of rows: large enough for GDAL to decode blocks side by side, small enough to stop soon.
const BAND_POSTS: usize = 8 << 20;
/// What the reader tells while it reads, and what can stop it.
#[derive(Clone, Copy)]
pub(super) struct Watch<'a> {
    pub(super) progress: Option<&'a dyn Fn(f64)>,
    pub(super) stop: Option<&'a AtomicBool>,
}

/// Heights in metres of a window, row-major, NaN for voids, and their range.
///
/// `ring` as in [`super::window::Extent`].
pub(super) fn read(
    band: &RasterBand<'_>,
    window: Window,
    ring: Option<usize>,
    decoding: &Decoding,
    watch: Watch<'_>,
) -> Result<(Vec<f32>, HeightSummary), Fault> {
    let mut summary = HeightSummary::default();
    let mut heights = allocate(window.rows, window.cols)?;
    let pieces = pieces(window, ring);
    let (_, block_rows) = band.block_size();
    let mut scratch = Scratch::default();
    let mut done = 0;
    for rows in row_bands(window, block_rows.max(1)) {
        if watch.stop.is_some_and(|stop| stop.load(Ordering::Relaxed)) {
            return Err(Fault::Stopped);
        }
        let count = rows.len();
        let part = &mut heights[done * window.cols..(done + count) * window.cols];
        if decoding.wide {
            scratch.read_wide(band, &rows, &pieces, window.cols, decoding, part)?;
        } else {
            scratch.read_f32(band, &rows, &pieces, window.cols, part)?;
        }
        // what a mask hides may be anything, so it goes before the heights are looked at
        if decoding.masked {
            scratch.apply_mask(band, &rows, &pieces, window.cols, part)?;
        }
        let found = if decoding.wide {
            HeightSummary::of(part)
        } else {
            decoding.finish(part)
        };
        let absurd = |h: Option<f32>| h.is_some_and(|h| h.abs() > LIMIT_M);
        if (absurd(found.lowest_m) || absurd(found.highest_m))
            && let Some(at) = part.iter().position(|v| v.abs() > LIMIT_M)
        {
            let (row, col) = (rows.start + at / window.cols, at % window.cols);
            let col = (window.first_col + col) % ring.unwrap_or(usize::MAX);
            return Err(absurd_height(band, row, col, part[at]));
        }
        summary = summary.and(found);
        done += count;
        if let Some(progress) = watch.progress {
            progress(done as f64 / window.rows as f64);
        }
    }
    Ok((heights, summary))
}

/// Zeroed memory that is not touched yet, or an error if there is not enough.
fn allocate(rows: usize, cols: usize) -> Result<Vec<f32>, Fault> {
    let too_large = Fault::TooLarge { rows, cols };
    let Some(posts) = rows.checked_mul(cols) else {
        return Err(too_large);
    };
    // asked and given back: `vec!` would end the program instead of saying no
    if Vec::<f32>::new().try_reserve_exact(posts).is_err() {
        return Err(too_large);
    }
    Ok(vec![0.0; posts])
}

/// Rows to read at a time: whole rows of blocks.
fn row_bands(window: Window, block_rows: usize) -> impl Iterator<Item = Range<usize>> {
    let wanted = (BAND_POSTS / window.cols).max(1);
    let step = wanted.div_ceil(block_rows) * block_rows;
    let end = window.first_row + window.rows;
    let mut start = window.first_row;
    std::iter::from_fn(move || {
        let stop = ((start / step + 1) * step).min(end);
        let band = start..stop;
        start = stop;
        (!band.is_empty()).then_some(band)
    })
}

/// Runs of columns that lie side by side in the file: where in the window, where in the file, how many.
fn pieces(window: Window, ring: Option<usize>) -> Vec<[usize; 3]> {
    let Some(ring) = ring else {
        return vec![[0, window.first_col, window.cols]];
    };
    let mut pieces = Vec::new();
    let mut done = 0;
    while done < window.cols {
        let from = (window.first_col + done) % ring;
        let len = (ring - from).min(window.cols - done);
        pieces.push([done, from, len]);
        done += len;
    }
    pieces
}

/// Memory for one band of rows that cannot be read straight into its place.
#[derive(Default)]
struct Scratch {
    narrow: Vec<f32>,
    wide: Vec<f64>,
    mask: Vec<u8>,
}

impl Scratch {
    fn read_f32(
        &mut self,
        band: &RasterBand<'_>,
        rows: &Range<usize>,
        pieces: &[[usize; 3]],
        cols: usize,
        part: &mut [f32],
    ) -> Result<(), Fault> {
        if let &[[0, from, len]] = pieces {
            return fill(band, rows, from, len, part);
        }
        for &[to, from, len] in pieces {
            self.narrow.resize(rows.len() * len, 0.0);
            fill(band, rows, from, len, &mut self.narrow)?;
            for (out, row) in part.chunks_mut(cols).zip(self.narrow.chunks(len)) {
                out[to..to + len].copy_from_slice(row);
            }
        }
        Ok(())
    }

    /// Values with more digits than f32 has, brought to metres before they are rounded.
    fn read_wide(
        &mut self,
        band: &RasterBand<'_>,
        rows: &Range<usize>,
        pieces: &[[usize; 3]],
        cols: usize,
        decoding: &Decoding,
        part: &mut [f32],
    ) -> Result<(), Fault> {
        for &[to, from, len] in pieces {
            self.wide.resize(rows.len() * len, 0.0);
            fill(band, rows, from, len, &mut self.wide)?;
            for (out, row) in part.chunks_mut(cols).zip(self.wide.chunks(len)) {
                for (out, &stored) in out[to..to + len].iter_mut().zip(row) {
                    *out = if decoding.is_void_f64(stored) {
                        f32::NAN
                    } else {
                        decoding.height_m(stored)
                    };
                }
            }
        }
        Ok(())
    }

    fn apply_mask(
        &mut self,
        band: &RasterBand<'_>,
        rows: &Range<usize>,
        pieces: &[[usize; 3]],
        cols: usize,
        part: &mut [f32],
    ) -> Result<(), Fault> {
        let mask = band.open_mask_band().map_err(|error| unreadable(&error))?;
        for &[to, from, len] in pieces {
            self.mask.resize(rows.len() * len, 0);
            fill(&mask, rows, from, len, &mut self.mask)?;
            for (out, row) in part.chunks_mut(cols).zip(self.mask.chunks(len)) {
                for (out, &valid) in out[to..to + len].iter_mut().zip(row) {
                    *out = if valid == 0 { f32::NAN } else { *out };
                }
            }
        }
        Ok(())
    }
}

/// Reads `rows` x `len` values from column `from` on.
fn fill<T: Copy + gdal::raster::GdalType>(
    band: &RasterBand<'_>,
    rows: &Range<usize>,
    from: usize,
    len: usize,
    out: &mut [T],
) -> Result<(), Fault> {
    let size = (len, rows.len());
    // GDAL has checked that the raster's size fits its 32-bit numbers
    band.read_into_slice((from as isize, rows.start as isize), size, size, out, None)
        .map_err(|error| unreadable(&error))
}

fn unreadable(error: &gdal::errors::GdalError) -> Fault {
    Fault::Unreadable {
        detail: gdal_text(error),
    }
}

/// The error for a height that cannot be, with the value as stored.
fn absurd_height(band: &RasterBand<'_>, row: usize, col: usize, height_m: f32) -> Fault {
    let mut stored = [0.0_f64];
    let value = match fill(band, &(row..row + 1), col, 1, &mut stored) {
        Ok(()) => stored[0],
        Err(_) => f64::from(height_m),
    };
    Fault::AbsurdHeight {
        row,
        col,
        value,
        height_m: f64::from(height_m),
        limit_m: f64::from(LIMIT_M),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn row_bands_end_on_block_rows_and_miss_none() {
        let window = Window {
            first_row: 700,
            rows: 5000,
            first_col: 3,
            cols: 10_000,
        };
        let bands: Vec<_> = row_bands(window, 256).collect();
        assert_eq!(bands.first().unwrap().start, 700);
        assert_eq!(bands.last().unwrap().end, 5700);
        for pair in bands.windows(2) {
            assert_eq!(pair[0].end, pair[1].start);
            assert_eq!(pair[0].end % 256, 0);
        }
        assert!(bands.iter().all(|b| !b.is_empty() && b.len() <= 1024));
    }

    #[test]
    fn pieces_go_round_the_ring() {
        let window = Window {
            first_row: 0,
            rows: 1,
            first_col: 350,
            cols: 20,
        };
        assert_eq!(pieces(window, Some(360)), [[0, 350, 10], [10, 0, 10]]);
        assert_eq!(pieces(window, None), [[0, 350, 20]]);
        let whole = Window {
            first_col: 0,
            cols: 361,
            ..window
        };
        assert_eq!(pieces(whole, Some(360)), [[0, 0, 360], [360, 0, 1]]);
    }
}
