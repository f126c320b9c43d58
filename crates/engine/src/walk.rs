//! The walk: from the top of each layer's pyramid down to the station, opening what can't yet be taken whole.

use crate::bend::Bend;
use crate::frame::{Sight, StationFrame, TileFrame, node_sight};
use crate::kernel::{LANES, LARGEST_SPREAD, Lanes};
use crate::near::{NearContext, NearSums, add_polygon};
use crate::zones::{Edges, Whereabouts, share_below};
use hillpull_relief::clip::{edges, square};
use hillpull_relief::layer::{CellState, Layer, morton_decode};
use hillpull_relief::moments::{CHILD_SIGNS, Moments};

/// Nodes that a walk is expected to take: sets the share of the tolerance of each.
const EXPECTED_NODES: f64 = 2000.0;
/// Nodes expected across zone edges.
const EXPECTED_CROSSINGS: f64 = 1500.0;
/// The bound counts errors that fall either way as this many times the root of their summed squares.
pub(crate) const ROUGH_FACTOR: f64 = 4.0;
/// A node over the bent ground must be smaller than the bending radius by this factor.
const BEND_RESOLUTION: f64 = 8.0;
/// Cells within this distance of the station (in cells) are integrated in polar form.
const NEAR_CELLS: f64 = 0.5;
/// Uncertainty of the share of an upper node across an edge, whose outline isn't known.
const UPPER_SHARE_ERROR: f64 = 0.05;
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

/// A piece of a tile waiting to be evaluated.
#[derive(Clone, Copy, Debug)]
struct Piece {
    /// Level of a node; below 0 a part of a cell.
    level: i32,
    morton: u32,
    /// Middle of the square, tile coordinates.
    x: f64,
    y: f64,
    /// Width of the square, cells.
    size: f64,
    moments: Moments,
}

/// What a lane still needs after evaluation, besides the kernel's results.
#[derive(Clone, Copy, Debug, Default)]
struct Outline {
    /// Chord to the centroid, m.
    chord: f64,
    /// No ground of the node lies farther from the centroid, m.
    radius: f64,
    /// Half widths along the line of sight of the node's two sides, m.
    halves: [f64; 2],
    /// Relative error of shares.
    share_error: f64,
    /// Must be opened whatever the estimate.
    open: bool,
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
    /// Largest remainders of a node: one that adds up, one that falls either way, one across an edge, all m.
    inv_smooth: f64,
    inv_rough2: f64,
    largest_crossing2: f64,
    lanes: Lanes,
    outlines: [Outline; LANES],
    pieces: Vec<Piece>,
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
        let smooth = 0.5 * tolerance / EXPECTED_NODES;
        let rough = 0.5 * tolerance / (ROUGH_FACTOR * EXPECTED_NODES.sqrt());
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
            outlines: [Outline::default(); LANES],
            pieces: Vec::new(),
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
                let distance = self.station.chord(sight.d);
                let place = self
                    .edges
                    .place((distance - radius).max(0.0), distance + radius);
                if place == Whereabouts::Zone(self.edges.outer.len()) {
                    continue;
                }
                self.load_upper(batch.len(), node, &sight, radius);
                batch.push((level, index, place));
            }
            self.finish_batch(batch.len());
            for (i, &(level, index, place)) in batch.iter().enumerate() {
                if self.settle(i, place) == Verdict::Done {
                    continue;
                }
                if level == 0 {
                    tiles.push(index);
                } else {
                    let cols = tree.shapes[level].1;
                    let children = tree.children(level, index / cols, index % cols);
                    pending.extend(children.map(|k| (level - 1, k)));
                }
            }
        }
        let foot = layer.locate(self.station.foot_m);
        for tile in tiles {
            self.tile(layer, tile, foot);
        }
    }

    fn load_upper(
        &mut self,
        i: usize,
        node: &hillpull_relief::upper::UpperNode,
        sight: &Sight,
        radius: f64,
    ) {
        let h = self.station.height_m;
        let (im, ip) = (node.inv_meridian_radius, node.inv_prime_vertical_radius);
        let (fm, fp) = (1.0 + h * im, 1.0 + h * ip);
        let east = self.station.components(node.east);
        let north = self.station.components(node.north);
        let d = sight.d;
        let de = d[0] * east[0] + d[1] * east[1] + d[2] * east[2];
        let dn = d[0] * north[0] + d[1] * north[1] + d[2] * north[2];
        let [p, q, r] = node.position_m2;
        let [ce, cn] = node.covariance_m2;
        let stretch = fm * fp;
        let dmd = (p * de * de + 2.0 * q * de * dn + r * dn * dn) * stretch;
        let lanes = &mut self.lanes;
        lanes.d2[i] = sight.d2;
        lanes.c0[i] = sight.c0;
        lanes.b[i] = sight.b;
        lanes.c1[i] = sight.c1;
        lanes.k1[i] = im / fm + ip / fp;
        lanes.area[i] = node.area_m2 * stretch;
        lanes.dmd[i] = dmd;
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
        let half = (1.5 * dmd / sight.d2).sqrt();
        let bent = self
            .bend
            .is_some_and(|b| sight.d2.sqrt() - radius < b.radius);
        self.outlines[i] = Outline {
            chord: self.station.chord(d),
            radius,
            halves: [half, half],
            share_error: UPPER_SHARE_ERROR,
            open: bent,
        };
    }

    fn tile(&mut self, layer: &Layer, tile: usize, foot: Option<(f64, f64)>) {
        let frame = TileFrame::new(self.station, &layer.geometry[tile], layer.tile_cells);
        let (mx, my) = layer.tile_middle(tile);
        let foot = foot.map(|(col, row)| (col - mx, row - my));
        let place = self.edges.place(
            (frame.chord - frame.radius).max(0.0),
            frame.chord + frame.radius,
        );
        let level = layer.tile_level() as i32;
        let root = Piece {
            level,
            morton: 0,
            x: 0.0,
            y: 0.0,
            size: layer.tile_cells as f64,
            moments: Moments::default(),
        };
        self.pieces.clear();
        self.open(layer, tile, &frame, foot, &root);
        let mut batch: Vec<Piece> = Vec::with_capacity(LANES);
        while !self.pieces.is_empty() {
            batch.clear();
            while batch.len() < LANES
                && let Some(piece) = self.pieces.pop()
            {
                self.load_piece(batch.len(), &frame, &piece);
                batch.push(piece);
            }
            self.finish_batch(batch.len());
            for i in 0..batch.len() {
                let place = match place {
                    Whereabouts::Zone(_) => place,
                    _ => {
                        let Outline { chord: r, radius, .. } = self.outlines[i];
                        self.edges.place((r - radius).max(0.0), r + radius)
                    }
                };
                if self.settle(i, place) == Verdict::Open {
                    let piece = batch[i];
                    self.open(layer, tile, &frame, foot, &piece);
                }
            }
        }
    }

    /// Puts a piece's children on the list, and the cells next to the station into the near sums.
    fn open(
        &mut self,
        layer: &Layer,
        tile: usize,
        frame: &TileFrame,
        foot: Option<(f64, f64)>,
        piece: &Piece,
    ) {
        let half = 0.5 * piece.size;
        let children = if piece.level >= 1 {
            layer.children(tile, piece.level as u32, piece.morton)
        } else {
            let (row, col, x, y) = cell_of(layer, tile, piece);
            CHILD_SIGNS.map(|(sx, sy)| {
                layer.piece_moments(row, col, x + 0.5 * half * sx, y + 0.5 * half * sy, half)
            })
        };
        for (k, (moments, sign)) in children.into_iter().zip(CHILD_SIGNS).enumerate().rev() {
            if moments.area <= 0.0 {
                continue;
            }
            let child = Piece {
                level: piece.level - 1,
                morton: 4 * piece.morton + k as u32,
                x: piece.x + 0.5 * half * sign.0,
                y: piece.y + 0.5 * half * sign.1,
                size: half,
                moments,
            };
            if child.level == 0
                && let Some(foot) = foot
                && (child.x - foot.0).abs().max((child.y - foot.1).abs()) < 0.5 + NEAR_CELLS
            {
                self.near_cell(layer, tile, frame, foot, &child);
            } else {
                self.pieces.push(child);
            }
        }
    }

    fn near_cell(
        &mut self,
        layer: &Layer,
        tile: usize,
        frame: &TileFrame,
        foot: (f64, f64),
        cell: &Piece,
    ) {
        let (row, col, ..) = cell_of(layer, tile, cell);
        // the station from the cell's middle
        let (px, py) = (foot.0 - cell.x, foot.1 - cell.y);
        let surface = layer.surface(row, col).about(px, py);
        let context = NearContext {
            station: self.station,
            edges: self.edges,
            bend: self.bend.as_ref(),
        };
        let mut sums = NearSums {
            value: &mut self.sums.value,
            area: &mut self.sums.area,
            evaluations: &mut self.sums.evaluations,
        };
        let outline = square(-px, -py, 1.0);
        add_polygon(
            &context,
            frame,
            foot,
            &surface,
            edges(&outline),
            1.0,
            &mut sums,
        );
        if layer.cell_state(row, col) == CellState::Clipped {
            for ring in layer.cell_rings(row, col) {
                let ring: Vec<_> = ring.iter().map(|p| [p[0] - px, p[1] - py]).collect();
                add_polygon(
                    &context,
                    frame,
                    foot,
                    &surface,
                    edges(&ring),
                    -1.0,
                    &mut sums,
                );
            }
        }
    }

    fn load_piece(&mut self, i: usize, frame: &TileFrame, piece: &Piece) {
        let m = &piece.moments;
        let [gx, gy] = frame.area_slope;
        let (x0, y0) = (piece.x + m.ox, piece.y + m.oy);
        // the cells' area changes slowly across the tile: first order
        let x = x0 + gx * m.mxx + gy * m.mxy;
        let y = y0 + gx * m.mxy + gy * m.myy;
        let mut mean = m.mean + gx * m.cx + gy * m.cy;
        let sight = frame.sight(x, y);
        let [tx, ty] = &frame.tangents;
        let d = sight.d;
        let dx = d[0] * tx[0] + d[1] * tx[1] + d[2] * tx[2];
        let dy = d[0] * ty[0] + d[1] * ty[1] + d[2] * ty[2];
        let txx = tx[0] * tx[0] + tx[1] * tx[1] + tx[2] * tx[2];
        let txy = tx[0] * ty[0] + tx[1] * ty[1] + tx[2] * ty[2];
        let tyy = ty[0] * ty[0] + ty[1] * ty[1] + ty[2] * ty[2];
        let dmd = m.mxx * dx * dx + 2.0 * m.mxy * dx * dy + m.myy * dy * dy;
        let trace = m.mxx * txx + 2.0 * m.mxy * txy + m.myy * tyy;
        let det = m.mxx * m.myy - m.mxy * m.mxy;
        let plane = (m.cx * m.cx * m.myy - 2.0 * m.cx * m.cy * m.mxy + m.cy * m.cy * m.mxx) / det;
        let r = sight.d2.sqrt();
        let width = piece.size;
        let radius =
            frame.radius_per_cell * width * (1.0 + 2.0 * m.ox.abs().max(m.oy.abs()) / width);
        let mut outline = Outline {
            chord: self.station.chord(d),
            radius,
            halves: [0.5 * width * dx.abs() / r, 0.5 * width * dy.abs() / r],
            share_error: 0.0,
            open: false,
        };
        let (mut var, mut cx, mut cy) = (m.var, m.cx, m.cy);
        if let Some(bend) = &self.bend
            && r - radius < bend.radius
        {
            let by_distance = bend.slope_over_distance(r);
            let radial = dmd / sight.d2;
            mean +=
                bend.rise(r) + 0.5 * (bend.curvature(r) * radial + by_distance * (trace - radial));
            // gradient of the rise per cell
            let (wx, wy) = (by_distance * dx, by_distance * dy);
            var += 2.0 * (wx * cx + wy * cy)
                + wx * wx * m.mxx
                + 2.0 * wx * wy * m.mxy
                + wy * wy * m.myy;
            cx += m.mxx * wx + m.mxy * wy;
            cy += m.mxy * wx + m.myy * wy;
            outline.open = radius * BEND_RESOLUTION > bend.radius;
        }
        if width < SMALLEST_PIECE {
            outline.open = false;
        }
        let lanes = &mut self.lanes;
        lanes.d2[i] = sight.d2;
        lanes.c0[i] = sight.c0;
        lanes.b[i] = sight.b;
        lanes.c1[i] = sight.c1;
        lanes.k1[i] = frame.k1;
        lanes.area[i] = m.area * frame.area_at(x0, y0);
        lanes.dmd[i] = dmd;
        lanes.trace[i] = trace;
        lanes.dc[i] = dx * cx + dy * cy;
        lanes.z[i] = mean - self.station.height_m;
        lanes.var[i] = var;
        lanes.rough[i] = if det > 0.0 {
            (m.var - plane).max(0.0)
        } else {
            0.0
        };
        self.outlines[i] = outline;
    }

    /// Evaluates the first `n` lanes (the rest repeat the first, so that no lane holds nonsense).
    fn finish_batch(&mut self, n: usize) {
        self.sums.evaluations += n as u64;
        self.lanes.evaluate();
    }

    /// Takes a lane's result into the sums if it may be taken whole.
    fn settle(&mut self, i: usize, place: Whereabouts) -> Verdict {
        let lanes = &self.lanes;
        let outline = &self.outlines[i];
        let zones = self.edges.outer.len();
        if place == Whereabouts::Zone(zones) {
            return Verdict::Done;
        }
        let (value, area) = (lanes.value[i], lanes.area[i]);
        let (smooth, rough2) = (lanes.smooth_error[i], lanes.rough_error2[i]);
        let small = smooth * self.inv_smooth + rough2 * self.inv_rough2 <= 1.0;
        if outline.open || !(small && lanes.spread[i] < LARGEST_SPREAD) {
            return Verdict::Open;
        }
        match place {
            Whereabouts::Several => return Verdict::Open,
            Whereabouts::Zone(zone) => {
                self.sums.value[zone] += value;
                self.sums.area[zone] += area;
            }
            Whereabouts::Across(zone) => {
                let d2 = lanes.d2[i];
                let r = d2.sqrt();
                let radial = lanes.dmd[i] / d2;
                // the edge is an arc: its mean over the node's breadth lies nearer than its middle
                let u = self.edges.outer[zone] - outline.chord - 0.5 * (lanes.trace[i] - radial) / r;
                let (share, first) = share_below(u, outline.halves[0], outline.halves[1]);
                let rise = lanes.dc[i] / lanes.dmd[i] * r;
                let gradient = 2.0 * r * lanes.f_s[i] + lanes.f_z[i] * rise;
                let inside = share * value + area * gradient * first;
                let spread = area * (lanes.f_z[i].abs() * lanes.rough[i].sqrt() + lanes.second[i]);
                let error =
                    spread * (share * (1.0 - share)).sqrt() + outline.share_error * value.abs();
                if error * error > self.largest_crossing2 {
                    return Verdict::Open;
                }
                self.sums.rough2 += error * error;
                self.sums.value[zone] += inside;
                self.sums.area[zone] += share * area;
                if zone + 1 < zones {
                    self.sums.value[zone + 1] += value - inside;
                    self.sums.area[zone + 1] += (1.0 - share) * area;
                }
            }
        }
        self.sums.smooth += smooth;
        self.sums.rough2 += rough2;
        Verdict::Done
    }
}

/// (row, column) of the cell that a piece is or lies in, and the piece's middle from the cell's.
fn cell_of(layer: &Layer, tile: usize, piece: &Piece) -> (usize, usize, f64, f64) {
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
