//! Zones by ground distance, and the share of a node on either side of an edge.

use hillpull_physics::ellipsoid::chord_from_arc_m;

/// Zone edges as chords between feet on the ellipsoid.
#[derive(Clone, Debug)]
pub(crate) struct Edges {
    /// Outer edge of each zone, innermost first, m.
    pub outer: Vec<f64>,
}

/// Where a node lies.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) enum Whereabouts {
    /// In one zone (its index; the number of zones means beyond the outer radius).
    Zone(usize),
    /// Across the outer edge of this zone.
    Across(usize),
    /// Across more than one edge.
    Several,
}

impl Edges {
    pub(crate) fn new(zones_m: &[(f64, f64)]) -> Self {
        Self {
            outer: zones_m.iter().map(|z| chord_from_arc_m(z.1)).collect(),
        }
    }

    /// Zone of a distance; the number of zones if beyond.
    #[inline]
    pub(crate) fn zone(&self, distance: f64) -> usize {
        self.outer
            .iter()
            .position(|&edge| distance < edge)
            .unwrap_or(self.outer.len())
    }

    /// Where everything between two distances lies.
    #[inline]
    pub(crate) fn place(&self, nearest: f64, farthest: f64) -> Whereabouts {
        let (a, b) = (self.zone(nearest), self.zone(farthest));
        match b - a {
            0 => Whereabouts::Zone(a),
            1 => Whereabouts::Across(a),
            _ => Whereabouts::Several,
        }
    }
}

/// Share of a parallelogram nearer than a straight edge, and its mean offset.
///
/// The offset along the line of sight is the sum of two independent even spreads of half widths `a` and `b`; the edge lies
/// `u` beyond the centroid. Returns (share, mean over the whole of the offset where it is below `u`).
#[must_use]
pub(crate) fn share_below(u: f64, a: f64, b: f64) -> (f64, f64) {
    let (a, b) = (a.max(b), a.min(b).max(1e-3 * a.max(b)));
    if u >= a + b {
        return (1.0, 0.0);
    }
    if u <= -(a + b) {
        return (0.0, 0.0);
    }
    let plus = |x: f64| x.max(0.0);
    let corners = [
        (plus(u + a + b), 1.0),
        (plus(u + a - b), -1.0),
        (plus(u - a + b), -1.0),
        (plus(u - a - b), 1.0),
    ];
    let square: f64 = corners.iter().map(|(x, s)| s * x * x).sum();
    let cube: f64 = corners.iter().map(|(x, s)| s * x * x * x).sum();
    let share = (square / (8.0 * a * b)).clamp(0.0, 1.0);
    (share, u * share - cube / (24.0 * a * b))
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn share_of_a_rotated_rectangle() {
        // against counting on a fine grid
        for (u, a, b) in [
            (0.3, 1.0, 0.5),
            (-0.9, 0.7, 0.6),
            (0.0, 1.0, 1.0),
            (0.2, 0.4, 2.0),
            (0.1, 1.0, 0.0),
        ] {
            let n = 1000;
            let (mut share, mut first) = (0.0, 0.0);
            for i in 0..n {
                for j in 0..n {
                    let x = a * ((f64::from(i) + 0.5) / f64::from(n) * 2.0 - 1.0)
                        + b * ((f64::from(j) + 0.5) / f64::from(n) * 2.0 - 1.0);
                    if x < u {
                        share += 1.0;
                        first += x;
                    }
                }
            }
            let total = f64::from(n) * f64::from(n);
            let (s, m) = share_below(u, a, b);
            assert_relative_eq!(s, share / total, epsilon = 2e-3);
            assert_relative_eq!(m, first / total, epsilon = 2e-3);
        }
        assert_eq!(share_below(5.0, 1.0, 1.0), (1.0, 0.0));
        assert_eq!(share_below(-5.0, 1.0, 1.0), (0.0, 0.0));
    }
}
