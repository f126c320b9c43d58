//! Polygons in grid coordinates: clipping to squares, and moments of what a cell keeps.
//!
//! A region is a set of rings whose signed areas add up: outer rings count positive, holes negative. Rings are clipped
//! one by one; the seams that this leaves along the edges of a square enclose no area, so that every integral stands.

use crate::moments::{Bilinear, Moments};

/// A closed ring of (x, y) points; the last joins the first.
pub type Ring = Vec<[f64; 2]>;

/// Signed area of a ring.
#[must_use]
pub fn ring_area(ring: &[[f64; 2]]) -> f64 {
    let Some(&o) = ring.first() else { return 0.0 };
    let mut twice = 0.0;
    for (p, q) in edges(ring) {
        twice += (p[0] - o[0]) * (q[1] - o[1]) - (q[0] - o[0]) * (p[1] - o[1]);
    }
    0.5 * twice
}

/// The edges of a ring, in order.
pub fn edges(ring: &[[f64; 2]]) -> impl Iterator<Item = ([f64; 2], [f64; 2])> + '_ {
    (0..ring.len()).map(|k| (ring[k], ring[(k + 1) % ring.len()]))
}

/// The square of width `s` about (x, y), as a ring of positive area.
#[must_use]
pub fn square(x: f64, y: f64, s: f64) -> Ring {
    let h = 0.5 * s;
    vec![
        [x - h, y - h],
        [x + h, y - h],
        [x + h, y + h],
        [x - h, y + h],
    ]
}

fn clip_half_plane(ring: &[[f64; 2]], axis: usize, limit: f64, keep_above: bool) -> Ring {
    let inside = |p: [f64; 2]| {
        if keep_above {
            p[axis] >= limit
        } else {
            p[axis] <= limit
        }
    };
    let mut out = Ring::with_capacity(ring.len() + 4);
    for (p, q) in edges(ring) {
        let (p_in, q_in) = (inside(p), inside(q));
        if p_in {
            out.push(p);
        }
        if p_in != q_in {
            let f = (limit - p[axis]) / (q[axis] - p[axis]);
            let mut cut = [p[0] + f * (q[0] - p[0]), p[1] + f * (q[1] - p[1])];
            cut[axis] = limit;
            out.push(cut);
        }
    }
    out
}

/// The part of each ring inside the rectangle (Sutherland & Hodgman 1974), empty ones dropped.
#[must_use]
pub fn clip_rings(rings: &[Ring], x: [f64; 2], y: [f64; 2]) -> Vec<Ring> {
    let mut out = Vec::new();
    for ring in rings {
        let (mut lo, mut hi) = ([f64::INFINITY; 2], [f64::NEG_INFINITY; 2]);
        for p in ring {
            for k in 0..2 {
                lo[k] = lo[k].min(p[k]);
                hi[k] = hi[k].max(p[k]);
            }
        }
        if hi[0] <= x[0] || lo[0] >= x[1] || hi[1] <= y[0] || lo[1] >= y[1] {
            continue;
        }
        if lo[0] >= x[0] && hi[0] <= x[1] && lo[1] >= y[0] && hi[1] <= y[1] {
            out.push(ring.clone());
            continue;
        }
        let mut r = clip_half_plane(ring, 0, x[0], true);
        r = clip_half_plane(&r, 0, x[1], false);
        r = clip_half_plane(&r, 1, y[0], true);
        r = clip_half_plane(&r, 1, y[1], false);
        if r.len() >= 3 {
            out.push(r);
        }
    }
    out
}

/// Barycentric points and weights of the seven-point rule of degree 5 on a triangle (Radon 1948; Stroud 1971, T2:5-1).
const TRIANGLE_RULE: [(f64, f64, f64); 7] = [
    (1.0 / 3.0, 1.0 / 3.0, 0.225),
    (
        0.059_715_871_789_769_82,
        0.470_142_064_105_115_1,
        0.132_394_152_788_506_19,
    ),
    (
        0.470_142_064_105_115_1,
        0.059_715_871_789_769_82,
        0.132_394_152_788_506_19,
    ),
    (
        0.470_142_064_105_115_1,
        0.470_142_064_105_115_1,
        0.132_394_152_788_506_19,
    ),
    (
        0.797_426_985_353_087_3,
        0.101_286_507_323_456_33,
        0.125_939_180_544_827_15,
    ),
    (
        0.101_286_507_323_456_33,
        0.797_426_985_353_087_3,
        0.125_939_180_544_827_15,
    ),
    (
        0.101_286_507_323_456_33,
        0.101_286_507_323_456_33,
        0.125_939_180_544_827_15,
    ),
];

/// Moments of the square of width `s` about the surface's own middle, less the rings (in coordinates about that middle).
#[must_use]
pub fn moments_less_rings(surface: &Bilinear, s: f64, rings: &[Ring]) -> Moments {
    // integrals of 1, x, y, xx, xy, yy, h, hx, hy, hh with h from the middle's height
    let flat = Bilinear { m: 0.0, ..*surface };
    let whole = flat.moments(s);
    let mut sums = [
        whole.area,
        0.0,
        0.0,
        whole.area * whole.mxx,
        0.0,
        whole.area * whole.myy,
        0.0,
        whole.area * whole.cx,
        whole.area * whole.cy,
        whole.area * whole.var,
    ];
    for ring in rings {
        for (p, q) in edges(ring) {
            let area = 0.5 * (p[0] * q[1] - q[0] * p[1]);
            for (l1, l2, w) in TRIANGLE_RULE {
                let x = l1 * p[0] + l2 * q[0];
                let y = l1 * p[1] + l2 * q[1];
                let h = flat.at(x, y);
                let v = area * w;
                for (sum, term) in
                    sums.iter_mut()
                        .zip([1.0, x, y, x * x, x * y, y * y, h, h * x, h * y, h * h])
                {
                    *sum -= v * term;
                }
            }
        }
    }
    let area = sums[0];
    if area <= 1e-9 * s * s {
        return Moments::default();
    }
    let [_, x, y, xx, xy, yy, h, hx, hy, hh] = sums.map(|v| v / area);
    Moments {
        area,
        ox: x,
        oy: y,
        mxx: (xx - x * x).max(0.0),
        mxy: xy - x * y,
        myy: (yy - y * y).max(0.0),
        mean: surface.m + h,
        var: (hh - h * h).max(0.0),
        cx: hx - h * x,
        cy: hy - h * y,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::moments::{CHILD_SIGNS, pool};
    use approx::assert_relative_eq;
    use proptest::prelude::*;

    #[test]
    fn clipping_keeps_the_area() {
        let diamond: Ring = vec![[0.0, -2.0], [2.0, 0.0], [0.0, 2.0], [-2.0, 0.0]];
        assert_relative_eq!(ring_area(&diamond), 8.0);
        let mut sum = 0.0;
        for i in -2..2 {
            for j in -2..2 {
                let (x, y) = (f64::from(i), f64::from(j));
                sum += clip_rings(std::slice::from_ref(&diamond), [x, x + 1.0], [y, y + 1.0])
                    .iter()
                    .map(|r| ring_area(r))
                    .sum::<f64>();
            }
        }
        assert_relative_eq!(sum, 8.0, max_relative = 1e-14);
    }

    proptest! {
        /// What a ring leaves of a cell equals what it leaves of the cell's quarters, pooled.
        #[test]
        fn quarters_pool(cut in proptest::collection::vec((-0.6..0.6f64, 0.05..0.6f64), 3..8), a in -9.0..9.0f64, b in -9.0..9.0f64, t in -5.0..5.0f64) {
            let n = cut.len() as f64;
            let ring: Ring = cut.iter().enumerate().map(|(k, &(_, r))| {
                let w = std::f64::consts::TAU * k as f64 / n;
                [0.2 * cut[0].0 + r * w.cos(), 0.2 * cut[1].0 + r * w.sin()]
            }).collect();
            let surface = Bilinear { m: 100.0, a, b, t };
            let inner = clip_rings(&[ring], [-0.5, 0.5], [-0.5, 0.5]);
            let whole = moments_less_rings(&surface, 1.0, &inner);
            let parts = CHILD_SIGNS.map(|(sx, sy)| {
                let (x, y) = (0.25 * sx, 0.25 * sy);
                let mut rings = clip_rings(&inner, [x - 0.25, x + 0.25], [y - 0.25, y + 0.25]);
                for p in rings.iter_mut().flatten() { p[0] -= x; p[1] -= y; }
                moments_less_rings(&surface.about(x, y), 0.5, &rings)
            });
            let pooled = pool(&parts, 0.5);
            for (p, w) in [(pooled.area, whole.area), (pooled.mean, whole.mean), (pooled.var, whole.var), (pooled.cx, whole.cx),
                (pooled.mxx, whole.mxx), (pooled.mxy, whole.mxy), (pooled.ox, whole.ox)] {
                assert_relative_eq!(p, w, max_relative = 1e-9, epsilon = 1e-9);
            }
        }
    }
}
