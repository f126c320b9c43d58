//! From moments to what the kernel takes: pieces of tiles, many at a time, and upper nodes.

use crate::frame::{Sight, StationFrame, TileFrame};
use crate::kernel::{LANES, Lane, Lanes};
use hillpull_relief::layer::Quad;
use hillpull_relief::moments::{CHILD_SIGNS, Moments};
use hillpull_relief::upper::UpperNode;
use multiversion::multiversion;

/// Moments of pieces of one tile, and on evaluation what they look like from the station.
#[derive(Clone, Debug, Default)]
pub(crate) struct PieceLanes {
    /// Centroid, tile coordinates.
    x: Lane,
    y: Lane,
    /// Distance of the centroid from the square's middle along the farther axis, cells.
    offset: Lane,
    /// Area, cells; 0 in a lane that holds nothing.
    pub area: Lane,
    mxx: Lane,
    mxy: Lane,
    myy: Lane,
    mean: Lane,
    var: Lane,
    cx: Lane,
    cy: Lane,
    /// D by the tile's tangents, m2 per cell.
    pub dx: Lane,
    pub dy: Lane,
    /// D in east, north and up, m.
    pub d: [Lane; 3],
}

impl PieceLanes {
    /// Puts a piece, whose square has its middle at (x, y), into a lane.
    #[inline]
    pub(crate) fn set(&mut self, i: usize, x: f64, y: f64, m: &Moments) {
        self.x[i] = x + m.ox;
        self.y[i] = y + m.oy;
        self.offset[i] = m.ox.abs().max(m.oy.abs());
        self.area[i] = m.area;
        self.mxx[i] = m.mxx;
        self.mxy[i] = m.mxy;
        self.myy[i] = m.myy;
        self.mean[i] = m.mean;
        self.var[i] = m.var;
        self.cx[i] = m.cx;
        self.cy[i] = m.cy;
    }

    /// Puts the four full children, `s` wide, of a square about (x, y) into lanes from `i`.
    #[inline]
    pub(crate) fn set_quad(&mut self, i: usize, x: f64, y: f64, s: f64, quad: &Quad) {
        let q = s * s / 12.0;
        for (k, (sx, sy)) in CHILD_SIGNS.into_iter().enumerate() {
            self.x[i + k] = x + 0.5 * s * sx;
            self.y[i + k] = y + 0.5 * s * sy;
            self.offset[i + k] = 0.0;
            self.area[i + k] = s * s;
            self.mxx[i + k] = q;
            self.mxy[i + k] = 0.0;
            self.myy[i + k] = q;
            self.mean[i + k] = f64::from(quad.mean[k]);
            self.var[i + k] = f64::from(quad.var[k]);
            self.cx[i + k] = f64::from(quad.cx[k]);
            self.cy[i + k] = f64::from(quad.cy[k]);
        }
    }

    /// Empties a lane.
    pub(crate) fn clear(&mut self, i: usize) {
        self.area[i] = 0.0;
    }

    /// No ground of the square of the given width lies farther from its centroid, m.
    #[inline]
    pub(crate) fn radius(&self, i: usize, width: f64, tile: &TileFrame) -> f64 {
        tile.radius_per_cell * (width + 2.0 * self.offset[i])
    }

    /// Half widths of a piece's two sides by the line of sight, m2: those of even spreads with the piece's moments.
    pub(crate) fn halves(&self, i: usize) -> [f64; 2] {
        [
            (3.0 * self.mxx[i]).sqrt() * self.dx[i].abs(),
            (3.0 * self.myy[i]).sqrt() * self.dy[i].abs(),
        ]
    }

    /// What a rise of the ground adds to variance and D'c, its slope by distance over the distance given.
    pub(crate) fn bent(&self, i: usize, by_distance: f64) -> (f64, f64) {
        let (dx, dy) = (self.dx[i], self.dy[i]);
        // gradient of the rise per cell
        let (wx, wy) = (by_distance * dx, by_distance * dy);
        let (mxx, mxy, myy) = (self.mxx[i], self.mxy[i], self.myy[i]);
        (
            2.0 * (wx * self.cx[i] + wy * self.cy[i])
                + wx * wx * mxx
                + 2.0 * wx * wy * mxy
                + wy * wy * myy,
            dx * (mxx * wx + mxy * wy) + dy * (mxy * wx + myy * wy),
        )
    }

    /// Fills the kernel's lanes.
    pub(crate) fn see(&mut self, tile: &TileFrame, height_m: f64, lanes: &mut Lanes) {
        see(self, tile, height_m, lanes);
    }
}

#[multiversion(targets = "simd")]
fn see(p: &mut PieceLanes, tile: &TileFrame, height_m: f64, lanes: &mut Lanes) {
    let [gx, gy] = tile.area_slope;
    let [tx, ty] = tile.tangents;
    let [txx, txy, tyy] = tile.metric;
    for i in 0..LANES {
        let (mxx, mxy, myy) = (p.mxx[i], p.mxy[i], p.myy[i]);
        let (cx, cy) = (p.cx[i], p.cy[i]);
        // the cells' area changes slowly across the tile: first order
        let x = p.x[i] + gx * mxx + gy * mxy;
        let y = p.y[i] + gx * mxy + gy * myy;
        let mean = p.mean[i] + gx * cx + gy * cy;
        let Sight { d, d2, c0, b, c1 } = tile.sight(x, y);
        let dx = d[0] * tx[0] + d[1] * tx[1] + d[2] * tx[2];
        let dy = d[0] * ty[0] + d[1] * ty[1] + d[2] * ty[2];
        let det = mxx * myy - mxy * mxy;
        let plane = (cx * cx * myy - 2.0 * cx * cy * mxy + cy * cy * mxx) / det;
        let rough = p.var[i] - plane;
        lanes.d2[i] = d2;
        lanes.c0[i] = c0;
        lanes.b[i] = b;
        lanes.c1[i] = c1;
        lanes.k1[i] = tile.k1;
        lanes.area[i] = p.area[i] * tile.area_at(p.x[i], p.y[i]);
        lanes.dmd[i] = mxx * dx * dx + 2.0 * mxy * dx * dy + myy * dy * dy;
        lanes.trace[i] = mxx * txx + 2.0 * mxy * txy + myy * tyy;
        lanes.dc[i] = dx * cx + dy * cy;
        lanes.z[i] = mean - height_m;
        lanes.var[i] = p.var[i];
        // not a number where the piece is a line or a point
        lanes.rough[i] = if rough > 0.0 { rough } else { 0.0 };
        p.dx[i] = dx;
        p.dy[i] = dy;
        for k in 0..3 {
            p.d[k][i] = d[k];
        }
    }
}

/// Puts an upper node into a lane.
pub(crate) fn load_upper(
    lanes: &mut Lanes,
    i: usize,
    station: &StationFrame,
    node: &UpperNode,
    sight: &Sight,
) {
    let h = station.height_m;
    let (im, ip) = (node.inv_meridian_radius, node.inv_prime_vertical_radius);
    let (fm, fp) = (1.0 + h * im, 1.0 + h * ip);
    let east = station.components(node.east);
    let north = station.components(node.north);
    let d = sight.d;
    let de = d[0] * east[0] + d[1] * east[1] + d[2] * east[2];
    let dn = d[0] * north[0] + d[1] * north[1] + d[2] * north[2];
    let [p, q, r] = node.position_m2;
    let [ce, cn] = node.covariance_m2;
    let stretch = fm * fp;
    lanes.d2[i] = sight.d2;
    lanes.c0[i] = sight.c0;
    lanes.b[i] = sight.b;
    lanes.c1[i] = sight.c1;
    lanes.k1[i] = im / fm + ip / fp;
    lanes.area[i] = node.area_m2 * stretch;
    lanes.dmd[i] = (p * de * de + 2.0 * q * de * dn + r * dn * dn) * stretch;
    lanes.trace[i] = (p + r) * stretch;
    lanes.dc[i] = (de * ce + dn * cn) * stretch.sqrt();
    lanes.z[i] = node.mean_m - h;
    lanes.var[i] = node.var_m2;
    let det = p * r - q * q;
    let plane = if det > 0.0 {
        (ce * ce * r - 2.0 * ce * cn * q + cn * cn * p) / det
    } else {
        0.0
    };
    lanes.rough[i] = (node.var_m2 - plane).max(0.0);
}
