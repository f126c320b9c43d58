//! The walk: from the top of each layer's pyramid down to the station, opening what can't yet be taken whole.

use crate::bend::Bend;
use crate::frame::{StationFrame, TileFrame, node_sight};
use crate::kernel::{LANES, Lanes};
use crate::load::{PieceLanes, load_upper};
use crate::near::{NearCell, NearSums};
use crate::prefetch::ask_for;
use crate::zones::{Edges, Whereabouts, share_below};
use hillpull_relief::clip::{edges, square};
use hillpull_relief::layer::{CellState, Layer, morton_decode};
use hillpull_relief::moments::CHILD_SIGNS;

/// Nodes that set the share of the tolerance of each, at a tolerance of `USUAL_TOLERANCE` m (1 uGal in common rock).
///
/// Chosen so that the bound comes to about half the tolerance. A smooth node's remainder goes with the sixth power of its
/// size and the nodes' number with the inverse square, hence the cube root.
const EXPECTED_NODES: f64 = 800.0;
const USUAL_TOLERANCE: f64 = 0.056;
/// Nodes expected across zone edges.
const EXPECTED_CROSSINGS: f64 = 600.0;
/// Part of a node's unevenness by which its two sides of an edge differ: most of it is finer than the sides.
const UNEVEN_SIDES: f64 = 0.5;
/// The bound counts errors that fall either way as this many times the root of their summed squares.
pub(crate) const ROUGH_FACTOR: f64 = 3.0;
/// A node over the bent ground must be smaller than the bending radius by this factor.
const BEND_RESOLUTION: f64 = 8.0;
/// Cells within this distance of the station (in cells) are integrated in polar form.
const NEAR_CELLS: f64 = 0.5;
/// Uncertainty of the share of a node across an edge whose outline isn't known.
const UNKNOWN_OUTLINE: f64 = 0.05;
/// Sub-cells are not split below this width, cells.
const SMALLEST_PIECE: f64 = 1e-6;

/// Sums of a walk; lengths in m (per unit of G rho), areas in m2 at station level.
#[derive(Clone, Debug, Default)]
pub(crate) struct Sums {
    /// Values by zone.
    pub value: Vec<f64>,
    /// Areas by zone.
    pub area: Vec<f64>,
    /// Remainders that add up.
    pub smooth: f64,
    /// Squares of the remainders that fall either way.
    pub rough2: f64,
    /// Kernel evaluations.
    pub evaluations: u64,
}

/// A square of a tile: a node, or below level 0 a part of a cell.
#[derive(Clone, Copy, Debug)]
struct Square {
    level: i32,
    morton: u32,
    /// Middle, tile coordinates.
    x: f64,
    y: f64,
    /// Width, cells.
    size: f64,
}

impl Square {
    /// The child `k`, in child order.
    #[inline]
    fn child(&self, k: usize) -> Self {
        let half = 0.5 * self.size;
        let (sx, sy) = CHILD_SIGNS[k];
        Self {
            level: self.level - 1,
            morton: self.morton.wrapping_mul(4) + k as u32,
            x: self.x + 0.5 * half * sx,
            y: self.y + 0.5 * half * sy,
            size: half,
        }
    }
}

/// A tile on the walk.
struct Visit<'a> {
    layer: &'a Layer,
    tile: usize,
    frame: TileFrame,
    /// The station in the tile's coordinates, if the layer's grid can tell.
    foot: Option<(f64, f64)>,
}

/// What is needed of a node that an edge may cross.
#[derive(Clone, Copy, Debug, Default)]
struct Outline {
    /// Chord to the centroid, m.
    chord: f64,
    /// Half widths along the line of sight of the node's two sides, m.
    halves: [f64; 2],
    /// Relative error of shares.
    share_error: f64,
}

/// What a lane came to.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Verdict {
    Done,
    Open,
}

/// One station's walk over all layers.
pub(crate) struct Walk<'a> {
    station: &'a StationFrame,
    edges: &'a Edges,
    bend: Option<Bend>,
    /// Inverses of the remainders a node may have: one that adds up, 1/m, one that falls either way, 1/m2.
    inv_smooth: f64,
    inv_rough2: f64,
    /// Square of the remainder of a node across an edge, m2.
    largest_crossing2: f64,
    lanes: Lanes,
    sights: PieceLanes,
    /// Lanes that must be opened whatever the estimate.
    forced: [bool; LANES],
    opened: Vec<Square>,
    pub(crate) sums: Sums,
}

impl<'a> Walk<'a> {
    /// `tolerance` is the bound aimed at, m (per unit of G rho).
    pub(crate) fn new(
        station: &'a StationFrame,
        edges: &'a Edges,
        bend: Option<Bend>,
        tolerance: f64,
    ) -> Self {
        let nodes = EXPECTED_NODES * (USUAL_TOLERANCE / tolerance).cbrt();
        let smooth = 0.5 * tolerance / nodes;
        let rough = 0.5 * tolerance / (ROUGH_FACTOR * nodes.sqrt());
        let crossing = 0.3 * tolerance / (ROUGH_FACTOR * EXPECTED_CROSSINGS.sqrt());
        let zones = edges.outer.len();
        Self {
            station,
            edges,
            bend,
            inv_smooth: 1.0 / smooth,
            inv_rough2: 1.0 / (rough * rough),
            largest_crossing2: crossing * crossing,
            lanes: Lanes::default(),
            sights: PieceLanes::default(),
            forced: [false; LANES],
            opened: Vec::new(),
            sums: Sums {
                value: vec![0.0; zones],
                area: vec![0.0; zones],
                ..Sums::default()
            },
        }
    }

    /// Adds a layer.
    pub(crate) fn layer(&mut self, layer: &Layer) {
        let tree = &layer.upper;
        let mut pending = vec![(tree.levels.len() - 1, 0_usize)];
        let mut tiles = Vec::new();
        let mut batch = Vec::with_capacity(LANES);
        while !pending.is_empty() {
            batch.clear();
            while batch.len() < LANES
                && let Some((level, index)) = pending.pop()
            {
                let node = &tree.levels[level][index];
                if node.area_m2 <= 0.0 {
                    continue;
                }
                let sight = node_sight(self.station, node);
                let radius = node.radius_m * self.station.stretch.max(1.0);
                let chord = self.station.chord(sight.d);
                let place = self.edges.place((chord - radius).max(0.0), chord + radius);
                if place == Whereabouts::Zone(self.edges.outer.len()) {
                    continue;
                }
                let i = batch.len();
                load_upper(&mut self.lanes, i, self.station, node, &sight);
                self.forced[i] = self.bend.is_some_and(|b| chord - radius < b.radius);
                batch.push((level, index, place, chord));
            }
            self.evaluate(batch.len());
            for (i, &(level, index, place, chord)) in batch.iter().enumerate() {
                let half = (1.5 * self.lanes.dmd[i] / self.lanes.d2[i]).sqrt();
                let outline = Outline {
                    chord,
                    halves: [half, half],
                    share_error: UNKNOWN_OUTLINE,
                };
                if self.settle(i, place, &outline) == Verdict::Done {
                    continue;
                }
                if level == 0 {
                    tiles.push(index);
                } else {
                    let cols = tree.shapes[level].1;
                    for k in tree.children(level, index / cols, index % cols) {
                        ask_for(&tree.levels[level - 1][k]);
                        pending.push((level - 1, k));
                    }
                }
            }
        }
        let foot = layer.locate(self.station.foot_m);
        for (k, &tile) in tiles.iter().enumerate() {
            if let Some(&next) = tiles.get(k + 1) {
                ask_for(&layer.geometry[next]);
                ask_for_children(layer, next, layer.tile_level(), 0);
            }
            self.tile(layer, tile, foot);
        }
    }

    fn tile(&mut self, layer: &Layer, tile: usize, foot: Option<(f64, f64)>) {
        let frame = TileFrame::new(self.station, &layer.geometry[tile], layer.tile_cells);
        let (mx, my) = layer.tile_middle(tile);
        let nearest = (frame.chord - frame.radius).max(0.0);
        let place = self.edges.place(nearest, frame.chord + frame.radius);
        let bent = self
            .bend
            .is_some_and(|b| frame.chord - frame.radius <= b.radius);
        let foot = foot.map(|(col, row)| (col - mx, row - my));
        let visit = Visit {
            layer,
            tile,
            frame,
            foot,
        };
        let (level, size) = (layer.tile_level() as i32, layer.tile_cells as f64);
        self.opened.clear();
        self.opened.push(Square {
            level,
            morton: 0,
            x: 0.0,
            y: 0.0,
            size,
        });
        let mut batch = [Square {
            level,
            morton: 0,
            x: 0.0,
            y: 0.0,
            size,
        }; LANES / 4];
        while !self.opened.is_empty() {
            let mut used = 0;
            while used < batch.len()
                && let Some(square) = self.opened.pop()
            {
                batch[used] = square;
                self.load_children(&visit, &square, 4 * used);
                used += 1;
            }
            let lanes = 4 * used;
            self.sights
                .see(&visit.frame, self.station.height_m, &mut self.lanes);
            if bent {
                self.bend_lanes(&visit.frame, &batch, lanes);
            }
            self.evaluate(lanes);
            for i in (0..lanes).rev() {
                if self.sights.area[i] <= 0.0 {
                    continue;
                }
                let verdict = if let Whereabouts::Zone(_) = place {
                    self.settle(i, place, &Outline::default())
                } else {
                    let width = 0.5 * batch[i / 4].size;
                    let outline = self.outline(i, width);
                    let (chord, radius) =
                        (outline.chord, self.sights.radius(i, width, &visit.frame));
                    let place = self.edges.place((chord - radius).max(0.0), chord + radius);
                    self.settle(i, place, &outline)
                };
                if verdict == Verdict::Open {
                    let square = batch[i / 4].child(i % 4);
                    if square.level >= 1 {
                        ask_for_children(layer, tile, square.level as u32, square.morton);
                    }
                    self.opened.push(square);
                }
            }
            self.forced = [false; LANES];
        }
    }

    /// Puts a square's children into four lanes, and the cells next to the station into the near sums.
    fn load_children(&mut self, visit: &Visit<'_>, square: &Square, lane: usize) {
        let Visit { layer, tile, .. } = *visit;
        let half = 0.5 * square.size;
        if square.level >= 1 && layer.partial[tile].is_none() {
            match layer.stored_quad(tile, square.level as u32, square.morton) {
                Some(quad) => self.sights.set_quad(lane, square.x, square.y, half, quad),
                None => {
                    let quad = layer.quad_from_posts(tile, square.level as u32, square.morton);
                    self.sights.set_quad(lane, square.x, square.y, half, &quad);
                }
            }
        } else {
            let children = if square.level >= 1 {
                layer.children(tile, square.level as u32, square.morton)
            } else {
                let (row, col, x, y) = cell_of(layer, tile, square);
                CHILD_SIGNS.map(|(sx, sy)| {
                    layer.piece_moments(row, col, x + 0.5 * half * sx, y + 0.5 * half * sy, half)
                })
            };
            for (k, moments) in children.iter().enumerate() {
                let child = square.child(k);
                self.sights.set(lane + k, child.x, child.y, moments);
            }
        }
        if square.level == 1
            && let Some(foot) = visit.foot
        {
            for k in 0..4 {
                let cell = square.child(k);
                let near = (cell.x - foot.0).abs().max((cell.y - foot.1).abs()) < 0.5 + NEAR_CELLS;
                if near && self.sights.area[lane + k] > 0.0 {
                    self.sights.clear(lane + k);
                    self.near_cell(visit, foot, &cell);
                }
            }
        }
    }

    fn near_cell(&mut self, visit: &Visit<'_>, foot: (f64, f64), cell: &Square) {
        let Visit {
            layer, tile, frame, ..
        } = visit;
        let (row, col, ..) = cell_of(layer, *tile, cell);
        // the station from the cell's middle
        let (px, py) = (foot.0 - cell.x, foot.1 - cell.y);
        let near = NearCell {
            station: self.station,
            edges: self.edges,
            bend: self.bend.as_ref(),
            tile: frame,
            foot,
            surface: layer.surface(row, col).about(px, py),
        };
        let mut sums = NearSums {
            value: &mut self.sums.value,
            area: &mut self.sums.area,
            evaluations: &mut self.sums.evaluations,
        };
        near.add_polygon(edges(&square(-px, -py, 1.0)), 1.0, &mut sums);
        if layer.cell_state(row, col) == CellState::Clipped {
            for ring in layer.cell_rings(row, col) {
                let ring: Vec<_> = ring.iter().map(|p| [p[0] - px, p[1] - py]).collect();
                near.add_polygon(edges(&ring), -1.0, &mut sums);
            }
        }
    }

    /// What the bend of the ground adds to the lanes.
    fn bend_lanes(&mut self, frame: &TileFrame, batch: &[Square], lanes: usize) {
        let Some(bend) = self.bend else { return };
        for i in 0..lanes {
            let d2 = self.lanes.d2[i];
            let r = d2.sqrt();
            let width = 0.5 * batch[i / 4].size;
            let radius = self.sights.radius(i, width, frame);
            // an empty lane holds nothing to compare
            if r - radius >= bend.radius || self.sights.area[i] <= 0.0 {
                continue;
            }
            let by_distance = bend.slope_over_distance(r);
            let radial = self.lanes.dmd[i] / d2;
            let bulge = bend.curvature(r) * radial + by_distance * (self.lanes.trace[i] - radial);
            let (var, dc) = self.sights.bent(i, by_distance);
            self.lanes.z[i] += bend.rise(r) + 0.5 * bulge;
            self.lanes.var[i] += var;
            self.lanes.dc[i] += dc;
            self.forced[i] = radius * BEND_RESOLUTION > bend.radius && width > SMALLEST_PIECE;
        }
    }

    /// Outline of a lane's piece: a full square's sides are known, of a part only its spread.
    fn outline(&self, i: usize, width: f64) -> Outline {
        let s = &self.sights;
        let full = s.area[i] >= width * width * (1.0 - 1e-9);
        Outline {
            chord: self.station.chord([s.d[0][i], s.d[1][i], s.d[2][i]]),
            halves: s.halves(i).map(|h| h / self.lanes.d2[i].sqrt()),
            share_error: if full { 0.0 } else { UNKNOWN_OUTLINE },
        }
    }

    /// Evaluates the lanes, of which the first `n` are in use.
    fn evaluate(&mut self, n: usize) {
        self.sums.evaluations += n as u64;
        self.lanes.evaluate(self.inv_smooth, self.inv_rough2);
    }

    /// Takes a lane's result into the sums if it may be taken whole.
    #[inline]
    fn settle(&mut self, i: usize, place: Whereabouts, outline: &Outline) -> Verdict {
        let lanes = &self.lanes;
        let small = lanes.share[i] <= 1.0 && !self.forced[i];
        match place {
            Whereabouts::Zone(zone) => {
                let Some(sum) = self.sums.value.get_mut(zone) else {
                    return Verdict::Done;
                };
                if !small {
                    return Verdict::Open;
                }
                *sum += lanes.value[i];
                self.sums.area[zone] += lanes.area[i];
            }
            Whereabouts::Across(zone) if small => {
                if !self.divide(i, zone, outline) {
                    return Verdict::Open;
                }
            }
            Whereabouts::Across(_) | Whereabouts::Several => return Verdict::Open,
        }
        self.sums.smooth += self.lanes.smooth_error[i];
        self.sums.rough2 += self.lanes.rough_error2[i];
        Verdict::Done
    }

    /// Divides a lane's value at the outer edge of a zone, unless that errs by too much.
    fn divide(&mut self, i: usize, zone: usize, outline: &Outline) -> bool {
        let lanes = &self.lanes;
        let (value, area) = (lanes.value[i], lanes.area[i]);
        let r = lanes.d2[i].sqrt();
        let radial = lanes.dmd[i] / lanes.d2[i];
        // the edge is an arc: its mean over the node's breadth lies nearer than its middle
        let u = self.edges.outer[zone] - outline.chord - 0.5 * (lanes.trace[i] - radial) / r;
        let (share, first) = share_below(u, outline.halves[0], outline.halves[1]);
        let rise = lanes.dc[i] / lanes.dmd[i] * r;
        let gradient = 2.0 * r * lanes.f_s[i] + lanes.f_z[i] * rise;
        let inside = share * value + area * gradient * first;
        let uneven = UNEVEN_SIDES * lanes.f_z[i].abs() * lanes.rough[i].sqrt();
        let error = area * (uneven + lanes.second[i]) * (share * (1.0 - share)).sqrt()
            + outline.share_error * value.abs();
        if error * error > self.largest_crossing2 {
            return false;
        }
        let sums = &mut self.sums;
        sums.rough2 += error * error;
        sums.value[zone] += inside;
        sums.area[zone] += share * area;
        if zone + 1 < sums.value.len() {
            sums.value[zone + 1] += value - inside;
            sums.area[zone + 1] += (1.0 - share) * area;
        }
        true
    }
}

/// Asks for what the children of a node will be loaded from.
#[inline]
fn ask_for_children(layer: &Layer, tile: usize, level: u32, morton: u32) {
    if let Some(quad) = layer.stored_quad(tile, level, morton) {
        ask_for(quad);
    } else if level == 2 {
        let (row0, col0) = layer.tile_origin(tile);
        let (x, y) = morton_decode(morton);
        for row in 0..5 {
            let post = (row0 + 4 * y as usize + row) * layer.cols + col0 + 4 * x as usize;
            if let Some(height) = layer.heights_m.get(post) {
                ask_for(height);
            }
        }
    }
}

/// (row, column) of the cell that a square is or lies in, and its middle from the cell's.
fn cell_of(layer: &Layer, tile: usize, piece: &Square) -> (usize, usize, f64, f64) {
    let half = 0.5 * layer.tile_cells as f64;
    let (row0, col0) = layer.tile_origin(tile);
    if piece.level == 0 {
        let (c, r) = morton_decode(piece.morton);
        return (row0 + r as usize, col0 + c as usize, 0.0, 0.0);
    }
    let (c, r) = ((piece.x + half).floor(), (piece.y + half).floor());
    (
        row0 + r as usize,
        col0 + c as usize,
        piece.x + half - c - 0.5,
        piece.y + half - r - 0.5,
    )
}
