//! Lattice noise that gives the same bits on every machine.
//!
//! Only integer arithmetic and `+ - * /` and `floor` of f64 are used: all of them are exact or correctly rounded
//! everywhere, so no result depends on the machine, its mathematics library or the number of threads.

/// Mixes a lattice point and a seed into 64 well-spread bits (finaliser of SplitMix64, Steele, Lea and Flood 2014).
#[must_use]
#[inline]
pub fn hash(column: i64, row: i64, seed: u64) -> u64 {
    let mut bits = (column as u64)
        .wrapping_mul(0x9E37_79B9_7F4A_7C15)
        .wrapping_add((row as u64).wrapping_mul(0xD1B5_4A32_D192_ED03))
        .wrapping_add(seed.wrapping_mul(0x8CB9_2BA7_2F3D_8DD7));
    bits = (bits ^ (bits >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    bits = (bits ^ (bits >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    bits ^ (bits >> 31)
}

/// A number in [-1, 1) from 32 of the hash's bits.
#[must_use]
#[inline]
pub fn signed_unit(bits: u64) -> f64 {
    f64::from(bits as u32 as i32) / 2_147_483_648.0
}

/// A number near the normal distribution (mean 0, variance 1): the sum of four uniform ones.
#[must_use]
#[inline]
pub fn near_normal(column: i64, row: i64, seed: u64) -> f64 {
    let bits = hash(column, row, seed);
    let more = hash(column, row, seed ^ 0x5bd1_e995);
    // Each uniform number on [-1, 1) has variance 1/3, four of them 4/3.
    const SCALE: f64 = 0.866_025_403_784_438_6;
    (signed_unit(bits) + signed_unit(bits >> 32) + signed_unit(more) + signed_unit(more >> 32))
        * SCALE
}

/// Gradient noise with lattice spacing 1 (Perlin 2002: quintic fade), roughly within [-0.7, 0.7].
#[must_use]
#[inline]
pub fn noise(x: f64, y: f64, seed: u64) -> f64 {
    let (column, row) = (x.floor(), y.floor());
    let (u, v) = (x - column, y - row);
    let (i, j) = (column as i64, row as i64);
    let corner = |di: i64, dj: i64| {
        let bits = hash(i + di, j + dj, seed);
        signed_unit(bits) * (u - di as f64) + signed_unit(bits >> 32) * (v - dj as f64)
    };
    let fade = |t: f64| t * t * t * (t * (t * 6.0 - 15.0) + 10.0);
    let (fu, fv) = (fade(u), fade(v));
    let south = corner(0, 0) + fu * (corner(1, 0) - corner(0, 0));
    let north = corner(0, 1) + fu * (corner(1, 1) - corner(0, 1));
    south + fv * (north - south)
}

/// Fractal sum of [`noise`]: octave k has wavelength `wavelength / 2^k` and amplitude `gain^k`.
#[must_use]
#[inline]
pub fn fractal(x: f64, y: f64, wavelength: f64, octaves: u32, gain: f64, seed: u64) -> f64 {
    let mut frequency = 1.0 / wavelength;
    let mut amplitude = 1.0;
    let mut sum = 0.0;
    for octave in 0..octaves {
        sum += amplitude * noise(x * frequency, y * frequency, seed + u64::from(octave));
        frequency *= 2.0;
        amplitude *= gain;
    }
    sum
}

/// Ridged fractal sum in [0, 1 + gain + ...): sharp crests where the noise changes sign (Musgrave 1994), each octave
/// weighted by the one before so that hollows stay smooth and crests get rough.
#[must_use]
#[inline]
pub fn ridged(x: f64, y: f64, wavelength: f64, octaves: u32, gain: f64, seed: u64) -> f64 {
    let mut frequency = 1.0 / wavelength;
    let mut amplitude = 1.0;
    let mut weight = 1.0;
    let mut sum = 0.0;
    for octave in 0..octaves {
        let n = noise(x * frequency, y * frequency, seed + u64::from(octave));
        let crest = (1.0 - 2.0 * n.abs()).max(0.0);
        let crest = crest * crest * weight;
        sum += amplitude * crest;
        weight = (1.6 * crest).min(1.0);
        frequency *= 2.0;
        amplitude *= gain;
    }
    sum
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn noise_is_zero_on_the_lattice_and_continuous_across_it() {
        for (i, j) in [(0, 0), (3, -7), (-1_000_003, 12)] {
            assert_eq!(noise(f64::from(i), f64::from(j), 9), 0.0);
            let (x, y) = (f64::from(i), f64::from(j) + 0.4);
            assert!((noise(x - 1e-9, y, 9) - noise(x + 1e-9, y, 9)).abs() < 1e-8);
        }
    }

    #[test]
    fn near_normal_has_mean_zero_and_variance_one() {
        let n = 40_000;
        let values: Vec<f64> = (0..n).map(|i| near_normal(i, 7 * i + 1, 3)).collect();
        let mean = values.iter().sum::<f64>() / n as f64;
        let variance = values.iter().map(|v| v * v).sum::<f64>() / n as f64;
        // Five standard errors: 1/sqrt(n) = 0.005 for the mean, below sqrt(2/n) = 0.007 for the variance.
        assert!(mean.abs() < 0.025, "mean {mean}");
        assert!((variance - 1.0).abs() < 0.035, "variance {variance}");
    }
}
