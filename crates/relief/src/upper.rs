//! The pyramid above the tiles: nodes with a place of their own on the ellipsoid.

use crate::moments::Moments;
use crate::tile::{TileGeometry, quadratic, quadratic_vec_slopes};
use hillpull_physics::ellipsoid::{Ellipsoid, Vec3, add, dot, norm, scale, sub};

/// Moments of the surface of one or many tiles, in metres, about the centroid and in its east-north axes.
#[derive(Clone, Debug, Default)]
pub struct UpperNode {
    /// Foot of the centroid on the ellipsoid, ECEF metres.
    pub foot_m: Vec3,
    /// Ellipsoid normal there.
    pub normal: Vec3,
    /// Unit vector east there.
    pub east: Vec3,
    /// Unit vector north there.
    pub north: Vec3,
    /// Area on the ellipsoid, m2; 0 marks an empty node.
    pub area_m2: f64,
    /// Second moments of position, m2: east-east, east-north, north-north.
    pub position_m2: [f64; 3],
    /// Mean height, m.
    pub mean_m: f64,
    /// Variance of height, m2.
    pub var_m2: f64,
    /// Covariance of height with east and with north, m2.
    pub covariance_m2: [f64; 2],
    /// No ground of the node lies farther from the centroid than this, m.
    pub radius_m: f64,
    /// 1/M at the centroid, 1/m.
    pub inv_meridian_radius: f64,
    /// 1/N at the centroid, 1/m.
    pub inv_prime_vertical_radius: f64,
}

impl UpperNode {
    fn at(foot: Vec3) -> Self {
        let ellipsoid = Ellipsoid::WGS84;
        let (lon, lat) = ellipsoid.lonlat_rad(foot);
        let frame = ellipsoid.local_frame(lon, lat);
        Self {
            foot_m: ellipsoid.foot_ecef_m(lon, lat),
            normal: frame.up,
            east: frame.east,
            north: frame.north,
            inv_meridian_radius: 1.0 / ellipsoid.meridian_radius_m(lat),
            inv_prime_vertical_radius: 1.0 / ellipsoid.prime_vertical_radius_m(lat),
            ..Self::default()
        }
    }

    /// The node of one tile `cells` wide, from the moments of its surface in cells.
    #[must_use]
    pub fn of_tile(geometry: &TileGeometry, m: &Moments, cells: usize) -> Self {
        if m.area <= 0.0 {
            return Self::default();
        }
        // a cell's area changes slowly across the tile: first order
        let area = &geometry.cell_area_m2;
        let (gx, gy) = (area[1] / area[0], area[2] / area[0]);
        let x = m.ox + gx * m.mxx + gy * m.mxy;
        let y = m.oy + gx * m.mxy + gy * m.myy;
        let mut node = Self::at(geometry.foot(x, y));
        let (dx, dy) = quadratic_vec_slopes(&geometry.foot_m, x, y);
        let (xe, xn) = (dot(dx, node.east), dot(dx, node.north));
        let (ye, yn) = (dot(dy, node.east), dot(dy, node.north));
        node.area_m2 = m.area * quadratic(area, m.ox, m.oy);
        node.position_m2 = [
            m.mxx * xe * xe + 2.0 * m.mxy * xe * ye + m.myy * ye * ye,
            m.mxx * xe * xn + m.mxy * (xe * yn + ye * xn) + m.myy * ye * yn,
            m.mxx * xn * xn + 2.0 * m.mxy * xn * yn + m.myy * yn * yn,
        ];
        node.mean_m = m.mean + gx * m.cx + gy * m.cy;
        node.var_m2 = m.var;
        node.covariance_m2 = [m.cx * xe + m.cy * ye, m.cx * xn + m.cy * yn];
        let half = 0.5 * cells as f64;
        node.radius_m = norm(add(scale(dx, half + x.abs()), scale(dy, half + y.abs()))).max(norm(
            sub(scale(dx, half + x.abs()), scale(dy, half + y.abs())),
        ));
        node
    }

    /// The node that holds all of `children`.
    #[must_use]
    pub fn pool(children: &[&Self]) -> Self {
        let area: f64 = children.iter().map(|c| c.area_m2).sum();
        if area <= 0.0 {
            return Self::default();
        }
        let weight = |c: &Self| c.area_m2 / area;
        let mut foot = [0.0; 3];
        for c in children {
            foot = add(foot, scale(c.foot_m, weight(c)));
        }
        let mut node = Self::at(foot);
        node.area_m2 = area;
        node.mean_m = children.iter().map(|c| weight(c) * c.mean_m).sum();
        for c in children.iter().filter(|c| c.area_m2 > 0.0) {
            let w = weight(c);
            let offset = sub(c.foot_m, node.foot_m);
            let (e, n) = (dot(offset, node.east), dot(offset, node.north));
            let dh = c.mean_m - node.mean_m;
            // the child's axes in ours
            let (ee, en) = (dot(c.east, node.east), dot(c.east, node.north));
            let (ne, nn) = (dot(c.north, node.east), dot(c.north, node.north));
            let [p, q, r] = c.position_m2;
            node.position_m2[0] += w * (p * ee * ee + 2.0 * q * ee * ne + r * ne * ne + e * e);
            node.position_m2[1] +=
                w * (p * ee * en + q * (ee * nn + ne * en) + r * ne * nn + e * n);
            node.position_m2[2] += w * (p * en * en + 2.0 * q * en * nn + r * nn * nn + n * n);
            let [ce, cn] = c.covariance_m2;
            node.covariance_m2[0] += w * (ce * ee + cn * ne + dh * e);
            node.covariance_m2[1] += w * (ce * en + cn * nn + dh * n);
            node.var_m2 += w * (c.var_m2 + dh * dh);
            node.radius_m = node.radius_m.max(norm(offset) + c.radius_m);
        }
        node
    }
}

/// The levels above the tiles: level 0 has one node a tile (row-major), each further level one for 2 x 2 of the level below.
#[derive(Clone, Debug, Default)]
pub struct UpperTree {
    /// Nodes by level, row-major.
    pub levels: Vec<Vec<UpperNode>>,
    /// (rows, columns) of each level.
    pub shapes: Vec<(usize, usize)>,
}

impl UpperTree {
    /// Pools the tiles' nodes up to a single root.
    #[must_use]
    pub fn build(tiles: Vec<UpperNode>, rows: usize, cols: usize) -> Self {
        let mut tree = Self {
            levels: vec![tiles],
            shapes: vec![(rows, cols)],
        };
        loop {
            let (r, c) = tree.shapes[tree.shapes.len() - 1];
            if r * c <= 1 {
                return tree;
            }
            let below = &tree.levels[tree.levels.len() - 1];
            let (up_r, up_c) = (r.div_ceil(2), c.div_ceil(2));
            let mut level = Vec::with_capacity(up_r * up_c);
            for i in 0..up_r {
                for j in 0..up_c {
                    let children: Vec<&UpperNode> =
                        child_indices((i, j), (r, c)).map(|k| &below[k]).collect();
                    level.push(UpperNode::pool(&children));
                }
            }
            tree.levels.push(level);
            tree.shapes.push((up_r, up_c));
        }
    }

    /// Indices, in the level below, of the children of node (row, col).
    pub fn children(
        &self,
        level: usize,
        row: usize,
        col: usize,
    ) -> impl Iterator<Item = usize> + use<> {
        child_indices((row, col), self.shapes[level - 1])
    }
}

fn child_indices(
    (i, j): (usize, usize),
    (rows, cols): (usize, usize),
) -> impl Iterator<Item = usize> {
    (0..4).filter_map(move |k| {
        let (r, c) = (2 * i + k / 2, 2 * j + k % 2);
        (r < rows && c < cols).then_some(r * cols + c)
    })
}
