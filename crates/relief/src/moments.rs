//! Moments of a piece of surface: what the far field needs of all the posts in it.
//!
//! Lengths in the plane are in cells of the grid, heights in metres. Pooling is exact: the moments of a union are those
//! of its parts, whatever their number.

/// Moments of a piece of a grid's surface, by area.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Moments {
    /// Area in cells.
    pub area: f64,
    /// Centroid, from the middle of the node's square: column direction, cells.
    pub ox: f64,
    /// Centroid, row direction, cells.
    pub oy: f64,
    /// Second moments of position about the centroid, cells^2.
    pub mxx: f64,
    /// Mixed second moment of position, cells^2.
    pub mxy: f64,
    /// Second moment of position in row direction, cells^2.
    pub myy: f64,
    /// Mean height, m.
    pub mean: f64,
    /// Variance of height, m2.
    pub var: f64,
    /// Covariance of height with column, m cells.
    pub cx: f64,
    /// Covariance of height with row, m cells.
    pub cy: f64,
}

impl Moments {
    /// Those of a full square of width `s` about its middle.
    #[inline]
    #[must_use]
    pub fn of_square(s: f64, mean: f64, var: f64, cx: f64, cy: f64) -> Self {
        let q = s * s / 12.0;
        Self {
            area: s * s,
            ox: 0.0,
            oy: 0.0,
            mxx: q,
            mxy: 0.0,
            myy: q,
            mean,
            var,
            cx,
            cy,
        }
    }
}

/// The surface of one cell: h = m + a x + b y + t x y, with x (column) and y (row) in cells from the cell's middle.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Bilinear {
    /// Height at the middle, m.
    pub m: f64,
    /// Slope along the row (by column), m per cell.
    pub a: f64,
    /// Slope along the column (by row), m per cell.
    pub b: f64,
    /// Twist, m per cell^2.
    pub t: f64,
}

impl Bilinear {
    /// From the corner heights, `h[row][col]`.
    #[inline]
    #[must_use]
    pub fn from_corners(h: [[f64; 2]; 2]) -> Self {
        Self {
            m: 0.25 * (h[0][0] + h[0][1] + h[1][0] + h[1][1]),
            a: 0.5 * ((h[0][1] - h[0][0]) + (h[1][1] - h[1][0])),
            b: 0.5 * ((h[1][0] - h[0][0]) + (h[1][1] - h[0][1])),
            t: (h[1][1] - h[1][0]) - (h[0][1] - h[0][0]),
        }
    }

    /// Height at (x, y) cells from the middle.
    #[inline]
    #[must_use]
    pub fn at(&self, x: f64, y: f64) -> f64 {
        self.m + self.a * x + self.b * y + self.t * x * y
    }

    /// The same surface about another middle.
    #[inline]
    #[must_use]
    pub fn about(&self, x: f64, y: f64) -> Self {
        Self {
            m: self.at(x, y),
            a: self.a + self.t * y,
            b: self.b + self.t * x,
            t: self.t,
        }
    }

    /// Moments of the square of width `s` about the middle.
    #[inline]
    #[must_use]
    pub fn moments(&self, s: f64) -> Moments {
        let q = s * s / 12.0;
        let var = q * (self.a * self.a + self.b * self.b) + q * q * self.t * self.t;
        Moments::of_square(s, self.m, var, q * self.a, q * self.b)
    }
}

/// Offsets of the four children of a node of width `2 half`, in child order (x fastest), in units of `half / 2`.
pub const CHILD_SIGNS: [(f64, f64); 4] = [(-1.0, -1.0), (1.0, -1.0), (-1.0, 1.0), (1.0, 1.0)];

/// Moments of four full squares of width `s` that make one of width `2 s`.
#[inline]
#[must_use]
pub fn pool_full(children: &[Moments; 4], s: f64) -> Moments {
    let o = 0.5 * s;
    let [c0, c1, c2, c3] = children;
    let mean = 0.25 * (c0.mean + c1.mean + c2.mean + c3.mean);
    let (d0, d1, d2, d3) = (
        c0.mean - mean,
        c1.mean - mean,
        c2.mean - mean,
        c3.mean - mean,
    );
    let q = s * s / 3.0;
    Moments {
        area: 4.0 * s * s,
        ox: 0.0,
        oy: 0.0,
        mxx: q,
        mxy: 0.0,
        myy: q,
        mean,
        var: 0.25 * (c0.var + c1.var + c2.var + c3.var + d0 * d0 + d1 * d1 + d2 * d2 + d3 * d3),
        cx: 0.25 * (c0.cx + c1.cx + c2.cx + c3.cx + o * (d1 - d0 + d3 - d2)),
        cy: 0.25 * (c0.cy + c1.cy + c2.cy + c3.cy + o * (d2 - d0 + d3 - d1)),
    }
}

/// Moments of four children of width `s`, any of which may be empty or partly covered.
#[must_use]
pub fn pool(children: &[Moments; 4], s: f64) -> Moments {
    let mut out = Moments::default();
    for (c, sign) in children.iter().zip(CHILD_SIGNS) {
        out.area += c.area;
        out.ox += c.area * (0.5 * s * sign.0 + c.ox);
        out.oy += c.area * (0.5 * s * sign.1 + c.oy);
        out.mean += c.area * c.mean;
    }
    if out.area <= 0.0 {
        return Moments::default();
    }
    let inv = 1.0 / out.area;
    out.ox *= inv;
    out.oy *= inv;
    out.mean *= inv;
    for (c, sign) in children.iter().zip(CHILD_SIGNS) {
        let w = c.area * inv;
        let dx = 0.5 * s * sign.0 + c.ox - out.ox;
        let dy = 0.5 * s * sign.1 + c.oy - out.oy;
        let dh = c.mean - out.mean;
        out.mxx += w * (c.mxx + dx * dx);
        out.mxy += w * (c.mxy + dx * dy);
        out.myy += w * (c.myy + dy * dy);
        out.var += w * (c.var + dh * dh);
        out.cx += w * (c.cx + dh * dx);
        out.cy += w * (c.cy + dh * dy);
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use proptest::prelude::*;

    fn quarters(b: &Bilinear) -> [Moments; 4] {
        CHILD_SIGNS.map(|(sx, sy)| b.about(0.25 * sx, 0.25 * sy).moments(0.5))
    }

    proptest! {
        /// A cell's moments are those of its quarters, pooled either way.
        #[test]
        fn quarters_pool_to_the_cell(m in -1e3..4e3f64, a in -50.0..50.0f64, b in -50.0..50.0f64, t in -20.0..20.0f64) {
            let cell = Bilinear { m, a, b, t };
            let whole = cell.moments(1.0);
            for pooled in [pool_full(&quarters(&cell), 0.5), pool(&quarters(&cell), 0.5)] {
                assert_relative_eq!(pooled.area, whole.area, max_relative = 1e-14);
                assert_relative_eq!(pooled.mean, whole.mean, max_relative = 1e-12, epsilon = 1e-9);
                assert_relative_eq!(pooled.var, whole.var, max_relative = 1e-10, epsilon = 1e-9);
                assert_relative_eq!(pooled.cx, whole.cx, max_relative = 1e-10, epsilon = 1e-9);
                assert_relative_eq!(pooled.cy, whole.cy, max_relative = 1e-10, epsilon = 1e-9);
                assert_relative_eq!(pooled.mxx, whole.mxx, max_relative = 1e-12);
                assert_relative_eq!(pooled.mxy, 0.0, epsilon = 1e-14);
            }
        }
    }

    #[test]
    fn corners_are_met() {
        let b = Bilinear::from_corners([[1.0, 2.0], [4.0, 9.0]]);
        assert_relative_eq!(b.at(-0.5, -0.5), 1.0);
        assert_relative_eq!(b.at(0.5, -0.5), 2.0);
        assert_relative_eq!(b.at(-0.5, 0.5), 4.0);
        assert_relative_eq!(b.at(0.5, 0.5), 9.0);
    }
}
