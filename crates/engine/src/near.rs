//! Cells next to the station, in polar form about it.
//!
//! A polygon's integral is the signed sum over its edges of the triangle from the station to the edge. Along a ray from
//! the station the point is P + t (E - P), the area element carries a factor t that takes away the kernel's 1/r, and what
//! is left is smooth: Gauss-Legendre in t, and in s with (distance along the edge) = p sinh s, p the station's distance
//! from the edge's line, so that a station almost on an edge costs nothing in accuracy.

use crate::bend::Bend;
use crate::frame::{StationFrame, TileFrame};
use crate::kernel::column;
use crate::zones::Edges;
use hillpull_relief::moments::Bilinear;

/// Gauss-Legendre nodes and weights on [-1, 1] (Abramowitz & Stegun 1964, table 25.4).
const GAUSS_6: [(f64, f64); 6] = [
    (-0.932_469_514_203_152, 0.171_324_492_379_170_36),
    (-0.661_209_386_466_264_5, 0.360_761_573_048_138_6),
    (-0.238_619_186_083_196_9, 0.467_913_934_572_691),
    (0.238_619_186_083_196_9, 0.467_913_934_572_691),
    (0.661_209_386_466_264_5, 0.360_761_573_048_138_6),
    (0.932_469_514_203_152, 0.171_324_492_379_170_36),
];
const GAUSS_4: [(f64, f64); 4] = [
    (-0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
    (-0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.339_981_043_584_856_26, 0.652_145_154_862_546_1),
    (0.861_136_311_594_052_6, 0.347_854_845_137_453_85),
];

/// Widest panel in s, on slopes up to 45 degrees; narrower by the slope on steeper ones.
const PANEL: f64 = 1.0;
/// Ratio of successive panels along a ray away from where the surface comes nearest to the station's level.
const GRADING: f64 = 3.0;

/// Closer to the station than this nothing needs to be resolved, m: at most 2 pi G rho r, 1e-4 uGal.
const SMALLEST_FEATURE_M: f64 = 1e-6;

/// Sums of the near zone by zone.
pub(crate) struct NearSums<'a> {
    /// Values by zone, m.
    pub value: &'a mut [f64],
    /// Areas by zone, m2 at station level.
    pub area: &'a mut [f64],
    /// Kernel evaluations.
    pub evaluations: &'a mut u64,
}

/// One cell next to the station, seen from it.
pub(crate) struct NearCell<'a> {
    pub station: &'a StationFrame,
    pub edges: &'a Edges,
    pub bend: Option<&'a Bend>,
    pub tile: &'a TileFrame,
    /// The station in the tile's coordinates.
    pub foot: (f64, f64),
    /// The cell's surface about the station.
    pub surface: Bilinear,
}

/// An edge of a polygon, from the station.
struct Edge {
    /// Start, cells.
    start: [f64; 2],
    /// End less start, cells.
    along: [f64; 2],
    /// Distance of the station from the edge's line, m.
    p: f64,
    /// Offset of the start along the edge, m.
    from: f64,
    /// Length, m.
    length: f64,
    /// Twice the signed area of the triangle from the station, cells^2.
    cross: f64,
}

impl NearCell<'_> {
    /// Adds a polygon of the cell, given by edges in cells from the station that are summed with `sign`.
    pub(crate) fn add_polygon(
        &self,
        edges: impl Iterator<Item = ([f64; 2], [f64; 2])>,
        sign: f64,
        sums: &mut NearSums<'_>,
    ) {
        let (x, y) = self.foot;
        let [tx, ty] = self.tile.tangents_at(x, y);
        let metric = |p: [f64; 2]| [p[0] * tx[0] + p[1] * ty[0], p[0] * tx[1] + p[1] * ty[1]];
        // the steeper the cell, the faster the integrand changes with azimuth
        let spacing = tx[0].hypot(tx[1]).min(ty[0].hypot(ty[1]));
        let panel = PANEL / (self.surface.a.hypot(self.surface.b) / spacing).max(1.0);
        let mut breaks = Vec::new();
        for (e0, e1) in edges {
            let (v0, v1) = (metric(e0), metric(e1));
            let along = [v1[0] - v0[0], v1[1] - v0[1]];
            let length = along[0].hypot(along[1]);
            let p = (v0[0] * along[1] - v0[1] * along[0]).abs() / length;
            // not if the station lies on the edge's line, or the edge has no length: there is no area
            if p > 1e-9 * length {
                let from = (v0[0] * along[0] + v0[1] * along[1]) / length;
                let edge = Edge {
                    start: e0,
                    along: [e1[0] - e0[0], e1[1] - e0[1]],
                    p,
                    from,
                    length,
                    cross: sign * (e0[0] * e1[1] - e1[0] * e0[1]),
                };
                self.add_edge(&edge, panel, &mut breaks, sums);
            }
        }
    }

    fn add_edge(&self, edge: &Edge, panel: f64, breaks: &mut Vec<f64>, sums: &mut NearSums<'_>) {
        let Edge {
            p, from, length, ..
        } = *edge;
        let (s0, s1) = ((from / p).asinh(), ((from + length) / p).asinh());
        breaks.clear();
        breaks.push(s0);
        // the integrand has a kink where a zone's edge crosses the side of the cell
        for zone_edge in &self.edges.outer {
            let ratio = zone_edge * self.station.stretch / p;
            if ratio > 1.0 {
                breaks.extend(
                    [-ratio.acosh(), ratio.acosh()]
                        .into_iter()
                        .filter(|s| s0 < *s && *s < s1),
                );
            }
        }
        breaks.push(s1);
        breaks.sort_by(f64::total_cmp);
        for span in breaks.windows(2) {
            let panels = ((span[1] - span[0]) / panel).ceil().max(1.0) as usize;
            let half = 0.5 * (span[1] - span[0]) / panels as f64;
            for k in 0..panels {
                let middle = span[0] + half * (2 * k + 1) as f64;
                for (node, weight) in GAUSS_4 {
                    let s = middle + half * node;
                    let f = (p * s.sinh() - from) / length;
                    let rho = p * s.cosh();
                    let end = [0, 1].map(|k| edge.start[k] + f * edge.along[k]);
                    // cells^2 per unit of s, still to be multiplied by t dt
                    self.add_ray(end, rho, edge.cross * weight * half * rho / length, sums);
                }
            }
        }
    }

    fn add_ray(&self, end: [f64; 2], rho: f64, scale: f64, sums: &mut NearSums<'_>) {
        let (surface, tile) = (&self.surface, self.tile);
        let (x, y) = self.foot;
        let slope = surface.a * end[0] + surface.b * end[1];
        let twist = surface.t * end[0] * end[1];
        let base = surface.m - self.station.height_m;
        let height = |t: f64| {
            let rise = self.bend.map_or(0.0, |b| b.rise(t * rho));
            base + rise + t * (slope + t * twist)
        };
        // the tile's quadratic may pass the station by a fraction of a millimetre, which counts this near to it
        let at_foot = tile.sight(x, y);
        let mut cuts = Cuts::new();
        let chord = self.station.chord(tile.sight(x + end[0], y + end[1]).d);
        for (zone, &edge) in self.edges.outer.iter().enumerate() {
            if edge < chord {
                cuts.push(edge / chord, zone + 1);
            }
        }
        grade(&mut cuts, height(0.0), slope, rho);
        cuts.sort();
        let mut from = 0.0;
        let mut zone = 0;
        for k in 0..=cuts.len {
            let (to, next) = if k < cuts.len {
                cuts.at[k]
            } else {
                (1.0, KEEP_ZONE)
            };
            if to > from {
                let half = 0.5 * (to - from);
                let (mut value, mut area) = (0.0, 0.0);
                for (node, weight) in GAUSS_6 {
                    let t = from + half * (1.0 + node);
                    let (px, py) = (x + t * end[0], y + t * end[1]);
                    let sight = tile.sight(px, py);
                    let (c0, b) = (sight.c0 - at_foot.c0, sight.b - at_foot.b);
                    let da = weight * half * t * tile.area_at(px, py);
                    area += da;
                    value += da * column(sight.d2, c0, b, sight.c1, tile.k1, height(t));
                }
                *sums.evaluations += GAUSS_6.len() as u64;
                if zone < sums.value.len() {
                    sums.value[zone] += scale * value;
                    sums.area[zone] += scale * area;
                }
                from = to;
            }
            if next != KEEP_ZONE {
                zone = next;
            }
        }
    }
}

/// Marks a cut at which no other zone begins.
const KEEP_ZONE: usize = usize::MAX;
const MOST_CUTS: usize = 64;

/// Places along a ray where the integrand is cut, with the zone that begins there.
struct Cuts {
    at: [(f64, usize); MOST_CUTS],
    len: usize,
}

impl Cuts {
    fn new() -> Self {
        Self {
            at: [(0.0, 0); MOST_CUTS],
            len: 0,
        }
    }

    fn push(&mut self, t: f64, zone: usize) {
        if self.len < MOST_CUTS {
            self.at[self.len] = (t, zone);
            self.len += 1;
        }
    }

    fn sort(&mut self) {
        self.at[..self.len].sort_by(|a, b| a.0.total_cmp(&b.0));
    }
}

/// Cuts a ray where the surface, `offset` above the station and rising by `slope` over the length `rho`, comes nearest to
/// the station's level: the kernel varies there over |offset| / (1 + slope^2).
fn grade(cuts: &mut Cuts, offset: f64, slope: f64, rho: f64) {
    let g = slope / rho;
    let (middle, width) = (
        -offset * g / (1.0 + g * g) / rho,
        (offset / (1.0 + g * g) / rho).abs(),
    );
    // a feature this near to the station weighs less than 1e-4 uGal
    let smallest = SMALLEST_FEATURE_M / rho;
    if width < smallest || width > 2.0 {
        return;
    }
    for direction in [-1.0, 1.0] {
        let mut reach = width;
        for _ in 0..24 {
            let t = middle + direction * reach;
            if !(0.0..1.0).contains(&t) && direction * t > 0.0_f64.max(direction) {
                break; // past the end of the ray on this side
            }
            if t > smallest && t < 0.999 {
                cuts.push(t, KEEP_ZONE);
            }
            reach *= GRADING;
        }
    }
}
