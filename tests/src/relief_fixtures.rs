//! Reliefs made in memory about a site, and what a flat closed form lacks on the ellipsoid.
//!
//! Local coordinates are a transverse Mercator projection about the site, x east and y north in metres: within 2 km of it
//! distances are true to x^2 / 2 R^2, 5e-8.

use gauss_quad::GaussLegendre;
use hillpull_engine::{Ground, Settings, Station, StationEffect, effects};
use hillpull_physics::constants::{DENSITY_ROCK_KG_M3, G_CODATA_2018, MGAL_PER_M_S2};
use hillpull_physics::ellipsoid::Ellipsoid;
use hillpull_relief::{Grid, Placement, Relief};
use std::f64::consts::TAU;
use std::num::NonZeroUsize;
use std::sync::atomic::AtomicBool;

/// mGal for each metre of a value per unit of `G rho`, at 2670 kg/m3.
pub const UNIT_MGAL: f64 = G_CODATA_2018 * DENSITY_ROCK_KG_M3 * MGAL_PER_M_S2;

/// The middle of a local system of coordinates.
#[derive(Clone, Copy, Debug)]
pub struct Site {
    /// Longitude, degrees.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
}

/// A place in the mountains, for what does not depend on the place.
pub const SITE: Site = Site {
    lon_deg: 11.0,
    lat_deg: 46.5,
};

/// Rows and columns of posts in local metres.
#[derive(Clone, Copy, Debug)]
pub struct Posts {
    /// Rows.
    pub rows: usize,
    /// Columns.
    pub cols: usize,
    /// `x = a[0] + a[1] col + a[2] row`, `y = a[3] + a[4] col + a[5] row`.
    pub affine: [f64; 6],
}

impl Posts {
    /// North-up posts that cover x and y within the ranges, on the multiples of the spacing.
    #[must_use]
    pub fn over([x0, x1]: [f64; 2], [y0, y1]: [f64; 2], spacing_m: f64) -> Self {
        let down = |v: f64| (v / spacing_m + 1e-9).floor();
        let (c0, r0) = (down(x0), -down(-y1));
        let (c1, r1) = (-down(-x1), down(y0));
        Self {
            rows: (r0 - r1) as usize + 1,
            cols: (c1 - c0) as usize + 1,
            affine: [
                c0 * spacing_m,
                spacing_m,
                0.0,
                r0 * spacing_m,
                0.0,
                -spacing_m,
            ],
        }
    }

    /// North-up posts out to a distance from the site in each direction, one of them at the site.
    #[must_use]
    pub fn out_to(half_width_m: f64, spacing_m: f64) -> Self {
        Self::over(
            [-half_width_m, half_width_m],
            [-half_width_m, half_width_m],
            spacing_m,
        )
    }

    /// The posts moved by (x, y), m.
    #[must_use]
    pub fn moved(mut self, x: f64, y: f64) -> Self {
        self.affine[0] += x;
        self.affine[3] += y;
        self
    }

    /// The posts turned about the site, counterclockwise.
    #[must_use]
    pub fn turned(self, angle_rad: f64) -> Self {
        let (s, c) = angle_rad.sin_cos();
        let a = self.affine;
        let x = |k: usize| c * a[k] - s * a[k + 3];
        let y = |k: usize| s * a[k] + c * a[k + 3];
        Self {
            affine: [x(0), x(1), x(2), y(0), y(1), y(2)],
            ..self
        }
    }

    /// Local (x, y) of a post position, m.
    #[must_use]
    pub fn xy(&self, row: f64, col: f64) -> (f64, f64) {
        let a = &self.affine;
        (
            a[0] + a[1] * col + a[2] * row,
            a[3] + a[4] * col + a[5] * row,
        )
    }
}

impl Site {
    /// The local CRS.
    #[must_use]
    pub fn crs(&self) -> String {
        format!(
            "+proj=tmerc +lat_0={} +lon_0={} +k=1 +x_0=0 +y_0=0 +datum=WGS84 +units=m +no_defs +type=crs",
            self.lat_deg, self.lon_deg
        )
    }

    /// A grid whose heights are a function of local (x, y); NaN makes a void.
    #[must_use]
    pub fn grid(&self, posts: &Posts, height_m: impl Fn(f64, f64) -> f64) -> Grid {
        self.grid_of_posts(posts, |row, col| {
            let (x, y) = posts.xy(row as f64, col as f64);
            height_m(x, y)
        })
    }

    /// A grid whose heights are a function of (row, column).
    #[must_use]
    pub fn grid_of_posts(&self, posts: &Posts, height_m: impl Fn(usize, usize) -> f64) -> Grid {
        let mut heights = Vec::with_capacity(posts.rows * posts.cols);
        for row in 0..posts.rows {
            heights.extend((0..posts.cols).map(|col| height_m(row, col) as f32));
        }
        let placement = Placement {
            affine: posts.affine,
            crs: Some(self.crs()),
        };
        Grid::new("fixture", posts.rows, posts.cols, heights, placement)
    }

    /// Longitudes and latitudes of local (x, y), degrees.
    ///
    /// # Panics
    /// When PROJ does not place them.
    #[must_use]
    pub fn lonlat_deg(&self, xy: &[(f64, f64)]) -> Vec<(f64, f64)> {
        let placement = Placement {
            affine: [0.0, 1.0, 0.0, 0.0, 0.0, 1.0],
            crs: Some(self.crs()),
        };
        let row_col: Vec<_> = xy.iter().map(|&(x, y)| [y, x]).collect();
        let places = placement.lonlat_rad(&row_col).expect("places of stations");
        places
            .into_iter()
            .map(|[lon, lat]| (lon.to_degrees(), lat.to_degrees()))
            .collect()
    }

    /// Stations at local (x, y, height).
    #[must_use]
    pub fn stations(&self, xyh: &[(f64, f64, f64)], ground: Ground) -> Vec<Station> {
        let xy: Vec<_> = xyh.iter().map(|&(x, y, _)| (x, y)).collect();
        self.lonlat_deg(&xy)
            .into_iter()
            .zip(xyh)
            .map(|((lon_deg, lat_deg), &(.., height_m))| Station {
                lon_deg,
                lat_deg,
                height_m,
                ground,
            })
            .collect()
    }

    /// Mean curvature of the ellipsoid, 1/m.
    #[must_use]
    pub fn mean_curvature(&self) -> f64 {
        let lat = self.lat_deg.to_radians();
        let (m, n) = (
            Ellipsoid::WGS84.meridian_radius_m(lat),
            Ellipsoid::WGS84.prime_vertical_radius_m(lat),
        );
        0.5 * (1.0 / m + 1.0 / n)
    }

    /// What a flat terrain effect lacks on the ellipsoid, to first order in 1/R, per unit of `G rho`, m.
    ///
    /// `dh` is the surface above station level at (distance, azimuth), `panels` cut the distance where `dh` bends. A column
    /// at distance s stands with its foot s^2 / 2R below the station's horizon, leans outward by s / R and widens upward
    /// by 1 + 2z / R. With c0 = b = s^2 / 2R, c1 = -1, l^2 = s^2 + z^2 the column integral is, to first order,
    ///
    /// ```text
    /// -z/l^3 + (1/R) [ s^2 / 2l^3 - 2 z^2 / l^3 + 3 s^2 z^2 / 2l^5 ]     from z = 0 to dh
    /// ```
    ///
    /// and the bracket's integral is `dh/2l - 2 (asinh(dh/s) - dh/l) + dh^3 / 2l^3` with l taken at dh. The station must
    /// stand near height 0 of the DEM: at height H everything is wider by 1 + H / R.
    #[must_use]
    pub fn curvature_m(&self, panels: &[f64], dh: impl Fn(f64, f64) -> f64) -> f64 {
        const AZIMUTHS: usize = 240;
        let rule = gauss(16);
        let mut sum = 0.0;
        for k in 0..AZIMUTHS {
            let azimuth = TAU * (k as f64 + 0.5) / AZIMUTHS as f64;
            let mut from = 0.0;
            for &to in panels {
                sum += rule.integrate(from, to, |s| {
                    let z = dh(s, azimuth);
                    let l = s.hypot(z);
                    s * (0.5 * z / l - 2.0 * ((z / s).asinh() - z / l) + 0.5 * (z / l).powi(3))
                });
                from = to;
            }
        }
        sum * TAU / AZIMUTHS as f64 * self.mean_curvature()
    }
}

/// Gauss-Legendre rule.
///
/// # Panics
/// For no points.
#[must_use]
pub fn gauss(points: usize) -> GaussLegendre {
    GaussLegendre::new(NonZeroUsize::new(points).expect("some points"))
}

/// Settings with the usual constants.
#[must_use]
pub fn settings(outer_radius_m: f64, zone_edges_m: &[f64], tolerance_ugal: f64) -> Settings {
    Settings {
        density_kg_m3: DENSITY_ROCK_KG_M3,
        big_g: G_CODATA_2018,
        outer_radius_m,
        zone_edges_m: zone_edges_m.to_vec(),
        tolerance_mgal: 1e-3 * tolerance_ugal,
        bend_radius_m: 100.0,
    }
}

/// The relief of these grids.
///
/// # Panics
/// When they can't be placed.
#[must_use]
pub fn relief(grids: Vec<Grid>) -> Relief {
    Relief::build(grids).expect("a relief")
}

/// Effects at stations that must all have one.
///
/// # Panics
/// When one has not.
#[must_use]
pub fn run(relief: &Relief, stations: &[Station], settings: &Settings) -> Vec<StationEffect> {
    let results = effects(relief, stations, settings, &|_| (), &AtomicBool::new(false));
    results
        .into_iter()
        .enumerate()
        .map(|(k, r)| r.unwrap_or_else(|e| panic!("station {k} {:?}: {e}", stations[k])))
        .collect()
}

/// Puts stations on the surface of the relief, `above_m` higher than it.
///
/// # Panics
/// When no layer covers a station.
pub fn put_on_surface(relief: &Relief, stations: &mut [Station], above_m: f64) {
    for station in stations {
        let foot = Ellipsoid::WGS84
            .foot_ecef_m(station.lon_deg.to_radians(), station.lat_deg.to_radians());
        let surface = relief.surface_at(foot).expect("a covered station");
        station.height_m = surface.height_m + above_m;
    }
}

/// Random numbers that are the same on every machine (Steele, Lea and Flood 2014, SplitMix64; constants recalled from
/// memory).
#[derive(Clone, Debug)]
pub struct Random(pub u64);

impl Random {
    /// The next 64 bits.
    pub fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Even between two numbers.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * (self.bits() >> 11) as f64 / (1_u64 << 53) as f64
    }

    /// One of `count` numbers from 0.
    pub fn below(&mut self, count: usize) -> usize {
        (self.bits() % count as u64) as usize
    }
}

/// Rough relief: octaves of noise on lattices of halving width, heights falling by `roughness` an octave (0.5 gives the
/// same slope at every scale, more is rougher the closer one looks). `size` is the widest lattice, of posts.
#[must_use]
pub fn fractal(seed: u64, size: f64, octaves: u32, roughness: f64, row: f64, col: f64) -> f64 {
    let corner = |octave: u32, i: i64, j: i64| {
        let mut random = Random(
            seed ^ (u64::from(octave) << 56)
                ^ (i as u64).wrapping_mul(0x9e37_79b9)
                ^ (j as u64).wrapping_mul(0x85eb_ca6b_0000),
        );
        random.bits();
        random.between(-1.0, 1.0)
    };
    let (mut sum, mut width, mut height) = (0.0, size, 1.0);
    for octave in 0..octaves {
        let (y, x) = (row / width, col / width);
        let (i, j) = (y.floor(), x.floor());
        let smooth = |t: f64| t * t * (3.0 - 2.0 * t);
        let (v, u) = (smooth(y - i), smooth(x - j));
        let at = |di: i64, dj: i64| corner(octave, i as i64 + di, j as i64 + dj);
        sum += height
            * ((1.0 - v) * ((1.0 - u) * at(0, 0) + u * at(0, 1))
                + v * ((1.0 - u) * at(1, 0) + u * at(1, 1)));
        width *= 0.5;
        height *= roughness;
    }
    sum
}

/// Order of convergence: slope of the least-squares line through (log spacing, log |error|).
#[must_use]
pub fn order(spacings: &[f64], errors: &[f64]) -> f64 {
    let n = spacings.len() as f64;
    let x: Vec<f64> = spacings.iter().map(|s| s.ln()).collect();
    let y: Vec<f64> = errors.iter().map(|e| e.abs().ln()).collect();
    let (mx, my) = (x.iter().sum::<f64>() / n, y.iter().sum::<f64>() / n);
    let xy: f64 = x.iter().zip(&y).map(|(a, b)| (a - mx) * (b - my)).sum();
    let xx: f64 = x.iter().map(|a| (a - mx) * (a - mx)).sum();
    xy / xx
}
