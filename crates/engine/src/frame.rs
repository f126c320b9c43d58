//! The station's frame, and tiles as seen from it.

use hillpull_physics::ellipsoid::{Ellipsoid, Frame, Vec3, dot, sub};
use hillpull_relief::tile::{Quadratic, TileGeometry, quadratic};
use hillpull_relief::upper::UpperNode;

/// A station's place: foot, axes, and the height at which it is computed.
#[derive(Clone, Debug)]
pub(crate) struct StationFrame {
    /// Foot on the ellipsoid, ECEF m.
    pub foot_m: Vec3,
    /// East, north, up.
    pub axes: Frame,
    /// Height, m.
    pub height_m: f64,
    /// D at station level is longer than the chord between the feet by this factor (mean over azimuths).
    pub stretch: f64,
    /// Inverse squares of that factor eastward, northward and upward.
    shrink2: Vec3,
    /// 1/R at the station, 1/m, R the Gaussian mean radius.
    pub inv_radius: f64,
}

impl StationFrame {
    pub(crate) fn new(lon_deg: f64, lat_deg: f64, height_m: f64) -> Self {
        let (lon, lat) = (lon_deg.to_radians(), lat_deg.to_radians());
        let ellipsoid = Ellipsoid::WGS84;
        let (m, n) = (
            ellipsoid.meridian_radius_m(lat),
            ellipsoid.prime_vertical_radius_m(lat),
        );
        let inv_radius = 1.0 / (m * n).sqrt();
        Self {
            foot_m: ellipsoid.foot_ecef_m(lon, lat),
            axes: ellipsoid.local_frame(lon, lat),
            height_m,
            stretch: 1.0 + height_m * inv_radius,
            shrink2: [n, m, 1.0 / inv_radius].map(|r| (1.0 + height_m / r).powi(-2)),
            inv_radius,
        }
    }

    /// Chord between the feet, m, of a D given in east, north, up: what distances along the ground are measured by.
    #[inline]
    pub(crate) fn chord(&self, d: Vec3) -> f64 {
        let [e, n, u] = self.shrink2;
        (d[0] * d[0] * e + d[1] * d[1] * n + d[2] * d[2] * u).sqrt()
    }

    /// East, north, up components of an ECEF vector.
    #[inline]
    pub(crate) fn components(&self, v: Vec3) -> Vec3 {
        [
            dot(v, self.axes.east),
            dot(v, self.axes.north),
            dot(v, self.axes.up),
        ]
    }
}

/// The scalars of a column as the kernel wants them.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Sight {
    /// D in east, north, up, m.
    pub d: Vec3,
    /// D.D, m2.
    pub d2: f64,
    /// -u.D, m.
    pub c0: f64,
    /// D.n, m.
    pub b: f64,
    /// -u.n.
    pub c1: f64,
}

/// A tile seen from a station: D as a quadratic of the tile's (x, y), in the station's east, north, up.
#[derive(Clone, Debug)]
pub(crate) struct TileFrame {
    d: [Quadratic<f64>; 3],
    /// Area of a cell at station level, m2.
    pub cell_area: Quadratic<f64>,
    /// Relative change of a cell's area with x and with y, 1/cell.
    pub area_slope: [f64; 2],
    /// Tangents by x and by y at the middle, m per cell.
    pub tangents: [Vec3; 2],
    /// Products of the tangents: xx, xy, yy, m2 per cell^2.
    pub metric: [f64; 3],
    /// b / c0.
    b_ratio: f64,
    /// (1 + c1) / d2.
    c1_rate: f64,
    /// 1/M' + 1/N'.
    pub k1: f64,
    /// Chord from the station's foot to the middle, m.
    pub chord: f64,
    /// No ground of the tile lies farther from the middle than this, m.
    pub radius: f64,
    /// The same by cell of width.
    pub radius_per_cell: f64,
}

impl TileFrame {
    pub(crate) fn new(station: &StationFrame, tile: &TileGeometry, cells: usize) -> Self {
        let h = station.height_m;
        let mut d = [[0.0; 6]; 3];
        for k in 0..6 {
            let mut foot = tile.foot_m[k];
            let mut normal = tile.normal[k];
            if k == 0 {
                foot = sub(foot, station.foot_m);
                normal = sub(normal, station.axes.up);
            }
            let foot = station.components(foot);
            let normal = station.components(normal);
            for axis in 0..3 {
                d[axis][k] = foot[axis] + h * normal[axis];
            }
        }
        let tangents = [1, 2].map(|k| [d[0][k], d[1][k], d[2][k]]);
        let middle = [d[0][0], d[1][0], d[2][0]];
        let d2 = dot(middle, middle);
        let half = 0.5 * cells as f64;
        let (tx, ty) = (tangents[0], tangents[1]);
        let corner = |s: f64| {
            let v: Vec3 = std::array::from_fn(|k| half * (tx[k] + s * ty[k]));
            dot(v, v).sqrt()
        };
        let radius = corner(1.0).max(corner(-1.0)) * 1.001;
        let n = station.components(tile.normal[0]);
        // far tiles by their own normal; near ones by the sphere, where the quotients are not defined
        let (b_ratio, c1_rate) = if d2 > 4.0 * radius * radius {
            let lean = [n[0], n[1], n[2] - 1.0];
            (dot(middle, n) / -middle[2], 0.5 * dot(lean, lean) / d2)
        } else {
            (1.0, 0.5 * station.inv_radius * station.inv_radius)
        };
        let (im, ip) = (tile.inv_meridian_radius, tile.inv_prime_vertical_radius);
        let (fm, fp) = (1.0 + h * im, 1.0 + h * ip);
        let c = tile.cell_area_m2;
        Self {
            d,
            cell_area: c.map(|v| v * fm * fp),
            area_slope: [c[1] / c[0], c[2] / c[0]],
            tangents,
            metric: [dot(tx, tx), dot(tx, ty), dot(ty, ty)],
            b_ratio,
            c1_rate,
            k1: im / fm + ip / fp,
            chord: station.chord(middle),
            radius,
            radius_per_cell: radius / cells as f64,
        }
    }

    /// The column over (x, y).
    #[inline(always)]
    pub(crate) fn sight(&self, x: f64, y: f64) -> Sight {
        let (xx, xy, yy) = (x * x, x * y, y * y);
        let at =
            |c: &Quadratic<f64>| c[0] + c[1] * x + c[2] * y + c[3] * xx + c[4] * xy + c[5] * yy;
        let d = [at(&self.d[0]), at(&self.d[1]), at(&self.d[2])];
        let d2 = d[0] * d[0] + d[1] * d[1] + d[2] * d[2];
        Sight {
            d,
            d2,
            c0: -d[2],
            b: -self.b_ratio * d[2],
            c1: self.c1_rate * d2 - 1.0,
        }
    }

    /// Area of a cell at (x, y), m2.
    #[inline(always)]
    pub(crate) fn area_at(&self, x: f64, y: f64) -> f64 {
        quadratic(&self.cell_area, x, y)
    }

    /// Tangents at (x, y), east and north parts, m per cell.
    pub(crate) fn tangents_at(&self, x: f64, y: f64) -> [[f64; 2]; 2] {
        let by_x = |c: &Quadratic<f64>| c[1] + 2.0 * c[3] * x + c[4] * y;
        let by_y = |c: &Quadratic<f64>| c[2] + c[4] * x + 2.0 * c[5] * y;
        [
            [by_x(&self.d[0]), by_x(&self.d[1])],
            [by_y(&self.d[0]), by_y(&self.d[1])],
        ]
    }
}

/// An upper node seen from a station.
pub(crate) fn node_sight(station: &StationFrame, node: &UpperNode) -> Sight {
    let lean = sub(node.normal, station.axes.up);
    let offset = sub(node.foot_m, station.foot_m);
    let d_ecef: Vec3 = std::array::from_fn(|k| offset[k] + station.height_m * lean[k]);
    let d = station.components(d_ecef);
    Sight {
        d,
        d2: dot(d_ecef, d_ecef),
        c0: -d[2],
        b: dot(d_ecef, node.normal),
        c1: 0.5 * dot(lean, lean) - 1.0,
    }
}
