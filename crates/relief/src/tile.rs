//! Where a tile of cells lies: its ground points, normals and area element as polynomials of row and column.
//!
//! Posts are carried through PROJ on a lattice of half tiles; between, the position is a quadratic in the tile's own
//! column and row. For a tile of half width w the neglected cubic is about w^3 / 6 R^2: 0.03 mm at 2 km.

use hillpull_physics::ellipsoid::{Ellipsoid, Vec3, cross, dot, norm, sub};

/// A quadratic in (x, y): `c[0] + c[1] x + c[2] y + c[3] x^2 + c[4] x y + c[5] y^2`.
pub type Quadratic<T> = [T; 6];

/// Geometry of one tile. x and y count cells eastward in column and downward in row from the tile's middle.
#[derive(Clone, Debug)]
pub struct TileGeometry {
    /// Foot on the ellipsoid (ECEF, metres) as a quadratic of (x, y).
    pub foot_m: Quadratic<Vec3>,
    /// Ellipsoid normal as a quadratic of (x, y).
    pub normal: Quadratic<Vec3>,
    /// Area on the ellipsoid of one cell, m2, as a quadratic of (x, y).
    pub cell_area_m2: Quadratic<f64>,
    /// 1/M, M the meridian radius of curvature at the middle, 1/m.
    pub inv_meridian_radius: f64,
    /// 1/N, N the prime vertical radius of curvature at the middle, 1/m.
    pub inv_prime_vertical_radius: f64,
}

/// Value of a quadratic of vectors.
#[inline]
#[must_use]
pub fn quadratic_vec(c: &Quadratic<Vec3>, x: f64, y: f64) -> Vec3 {
    let mut out = [0.0; 3];
    for k in 0..3 {
        out[k] = c[0][k]
            + c[1][k] * x
            + c[2][k] * y
            + c[3][k] * x * x
            + c[4][k] * x * y
            + c[5][k] * y * y;
    }
    out
}

/// Value of a quadratic of numbers.
#[inline]
#[must_use]
pub fn quadratic(c: &Quadratic<f64>, x: f64, y: f64) -> f64 {
    c[0] + c[1] * x + c[2] * y + c[3] * x * x + c[4] * x * y + c[5] * y * y
}

/// Derivatives of a quadratic of vectors by x and by y.
#[inline]
#[must_use]
pub fn quadratic_vec_slopes(c: &Quadratic<Vec3>, x: f64, y: f64) -> (Vec3, Vec3) {
    let mut dx = [0.0; 3];
    let mut dy = [0.0; 3];
    for k in 0..3 {
        dx[k] = c[1][k] + 2.0 * c[3][k] * x + c[4][k] * y;
        dy[k] = c[2][k] + c[4][k] * x + 2.0 * c[5][k] * y;
    }
    (dx, dy)
}

/// Least-squares quadratic through samples on the 3 x 3 lattice {-h, 0, h}^2, `f[row][col]`.
fn fit(f: &[[f64; 3]; 3], h: f64) -> Quadratic<f64> {
    let mut mean = 0.0;
    let (mut sx, mut sy, mut sxy) = (0.0, 0.0, 0.0);
    let (mut edge_x, mut edge_y) = (0.0, 0.0);
    for (j, row) in f.iter().enumerate() {
        let y = j as f64 - 1.0;
        for (i, &v) in row.iter().enumerate() {
            let x = i as f64 - 1.0;
            mean += v / 9.0;
            sx += x * v;
            sy += y * v;
            sxy += x * y * v;
            // mean over the two outer columns (rows) minus mean over the middle one
            edge_x += if i == 1 { -v / 3.0 } else { v / 6.0 };
            edge_y += if j == 1 { -v / 3.0 } else { v / 6.0 };
        }
    }
    [
        mean - (edge_x + edge_y) * 2.0 / 3.0,
        sx / (6.0 * h),
        sy / (6.0 * h),
        edge_x / (h * h),
        sxy / (4.0 * h * h),
        edge_y / (h * h),
    ]
}

fn fit_vec(f: &[[Vec3; 3]; 3], h: f64) -> Quadratic<Vec3> {
    let mut out = [[0.0; 3]; 6];
    // about the middle sample, so that the fit works on small numbers
    let origin = f[1][1];
    for k in 0..3 {
        let mut g = [[0.0; 3]; 3];
        for j in 0..3 {
            for i in 0..3 {
                g[j][i] = f[j][i][k] - origin[k];
            }
        }
        let c = fit(&g, h);
        for (m, value) in c.iter().enumerate() {
            out[m][k] = *value;
        }
        out[0][k] += origin[k];
    }
    out
}

/// Lattice coordinates in half widths.
const LATTICE: [f64; 3] = [-1.0, 0.0, 1.0];
/// Near the poles longitude is no coordinate to differentiate in.
const LOWEST_COS_LAT: f64 = 0.05;

/// Area on the ellipsoid of a cell at each lattice point, M N cos(lat) |d(lon, lat)/d(x, y)|: exact for geographic grids,
/// where the slopes of the quadratic through the feet would be short by h^2 / 6 R^2.
fn cell_areas(lonlat_rad: &[[[f64; 2]; 3]; 3], half: f64) -> Option<[[f64; 3]; 3]> {
    let ellipsoid = Ellipsoid::WGS84;
    let middle = lonlat_rad[1][1][0];
    let turn = std::f64::consts::TAU;
    // longitudes from the middle's, so that the antimeridian doesn't cut the tile
    let lon =
        lonlat_rad.map(|row| row.map(|p| p[0] - middle - turn * ((p[0] - middle) / turn).round()));
    let lat = lonlat_rad.map(|row| row.map(|p| p[1]));
    if lat.iter().flatten().any(|v| v.cos() < LOWEST_COS_LAT) {
        return None;
    }
    let (lon, lat_fit) = (fit(&lon, half), fit(&lat, half));
    let slopes = |c: &Quadratic<f64>, x: f64, y: f64| {
        (
            c[1] + 2.0 * c[3] * x + c[4] * y,
            c[2] + c[4] * x + 2.0 * c[5] * y,
        )
    };
    Some(std::array::from_fn(|j| {
        std::array::from_fn(|i| {
            let (x, y) = (LATTICE[i] * half, LATTICE[j] * half);
            let ((lon_x, lon_y), (lat_x, lat_y)) = (slopes(&lon, x, y), slopes(&lat_fit, x, y));
            let phi = lat[j][i];
            let (m, n) = (
                ellipsoid.meridian_radius_m(phi),
                ellipsoid.prime_vertical_radius_m(phi),
            );
            m * n * phi.cos() * (lon_x * lat_y - lon_y * lat_x).abs()
        })
    }))
}

impl TileGeometry {
    /// From the longitudes and latitudes (radians) of the 3 x 3 lattice `[row][col]` of a tile `cells` wide.
    #[must_use]
    pub fn from_lattice(lonlat_rad: &[[[f64; 2]; 3]; 3], cells: usize) -> Self {
        let ellipsoid = Ellipsoid::WGS84;
        let half = cells as f64 / 2.0;
        let mut foot = [[[0.0; 3]; 3]; 3];
        let mut normal = [[[0.0; 3]; 3]; 3];
        for j in 0..3 {
            for i in 0..3 {
                let [lon, lat] = lonlat_rad[j][i];
                foot[j][i] = ellipsoid.foot_ecef_m(lon, lat);
                normal[j][i] = ellipsoid.normal(lon, lat);
            }
        }
        let foot_m = fit_vec(&foot, half);
        let area = cell_areas(lonlat_rad, half).unwrap_or_else(|| {
            LATTICE.map(|y| {
                LATTICE.map(|x| {
                    let (dx, dy) = quadratic_vec_slopes(&foot_m, x * half, y * half);
                    norm(cross(dx, dy))
                })
            })
        });
        let lat = lonlat_rad[1][1][1];
        Self {
            foot_m,
            normal: fit_vec(&normal, half),
            cell_area_m2: fit(&area, half),
            inv_meridian_radius: 1.0 / ellipsoid.meridian_radius_m(lat),
            inv_prime_vertical_radius: 1.0 / ellipsoid.prime_vertical_radius_m(lat),
        }
    }

    /// Foot on the ellipsoid at (x, y) cells from the middle, ECEF metres.
    #[must_use]
    pub fn foot(&self, x: f64, y: f64) -> Vec3 {
        quadratic_vec(&self.foot_m, x, y)
    }

    /// The (x, y) in cells whose foot lies nearest to a point close to the ellipsoid: one Newton step from (x0, y0).
    #[must_use]
    pub fn newton_step(&self, target: Vec3, x0: f64, y0: f64) -> (f64, f64) {
        let (dx, dy) = quadratic_vec_slopes(&self.foot_m, x0, y0);
        let r = sub(target, self.foot(x0, y0));
        let (a, b, c) = (dot(dx, dx), dot(dx, dy), dot(dy, dy));
        let (p, q) = (dot(dx, r), dot(dy, r));
        let det = a * c - b * b;
        (x0 + (c * p - b * q) / det, y0 + (a * q - b * p) / det)
    }

    /// Largest distance in metres between the fit and given lattice positions, for the check of the fit.
    #[must_use]
    pub fn misfit_m(&self, checks: &[(f64, f64, [f64; 2])]) -> f64 {
        let ellipsoid = Ellipsoid::WGS84;
        checks
            .iter()
            .map(|&(x, y, [lon, lat])| norm(sub(self.foot(x, y), ellipsoid.foot_ecef_m(lon, lat))))
            .fold(0.0, f64::max)
    }
}
