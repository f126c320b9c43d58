//! The terrain effect the slow way: every cell to the outer radius, no pyramid, columns in full closed form.
//!
//! Gauss-Legendre in every bilinear cell, with more points the nearer it is; cells close to the station or across a zone
//! edge are quartered first. This is the other code path that the walk is held against.

use crate::bend::Bend;
use crate::frame::StationFrame;
use crate::types::{Ground, Settings, Station, StationProblem};
use hillpull_physics::bodies::column::column_per_area;
use hillpull_physics::constants::MGAL_PER_M_S2;
use hillpull_physics::ellipsoid::{arc_from_chord_m, dot, norm, sub};
use hillpull_relief::Relief;
use hillpull_relief::clip::{Ring, edges};
use hillpull_relief::layer::{CellState, Layer};
use hillpull_relief::tile::{quadratic, quadratic_vec};
use rayon::prelude::*;

/// Gauss-Legendre on [-1/2, 1/2]: two, four points (Abramowitz & Stegun 1964, table 25.4).
const GAUSS_2: [(f64, f64); 2] = [
    (-0.288_675_134_594_812_9, 0.5),
    (0.288_675_134_594_812_9, 0.5),
];
const GAUSS_4: [(f64, f64); 4] = [
    (-0.430_568_155_797_026_3, 0.173_927_422_568_726_93),
    (-0.169_990_521_792_428_13, 0.326_072_577_431_273_07),
    (0.169_990_521_792_428_13, 0.326_072_577_431_273_07),
    (0.430_568_155_797_026_3, 0.173_927_422_568_726_93),
];
/// Beyond this many widths two points a side do; nearer four; and nearer than the second number the piece is quartered.
const FEW_POINTS_BEYOND: f64 = 40.0;
const QUARTER_WITHIN: f64 = 4.0;
/// Smallest piece at the station and at zone edges, in widths of the cell.
const SMALLEST_AT_STATION: f64 = 1.0 / (1 << 18) as f64;
const SMALLEST_AT_EDGE: f64 = 1.0 / 128.0;

/// The effect at one station by brute force, mGal by zone, innermost first.
///
/// # Errors
/// No layer under the station.
pub fn brute_force(
    relief: &Relief,
    station: &Station,
    settings: &Settings,
) -> Result<Vec<f64>, StationProblem> {
    let mut frame = StationFrame::new(station.lon_deg, station.lat_deg, station.height_m);
    let surface = relief
        .surface_at(frame.foot_m)
        .ok_or(StationProblem::NotCovered)?;
    let misfit_m = station.height_m - surface.height_m;
    if station.ground == Ground::Settle {
        frame = StationFrame::new(station.lon_deg, station.lat_deg, surface.height_m);
    }
    let spacing_m = relief.layers[surface.layer].post_spacing_m;
    let bend = (station.ground == Ground::Bend)
        .then(|| Bend::new(misfit_m, settings.bend_radius_m, spacing_m, frame.stretch));
    let zones_m: Vec<f64> = settings.zones_m().iter().map(|z| z.1).collect();
    let mut sums = vec![0.0; zones_m.len()];
    for layer in &relief.layers {
        let context = Context {
            layer,
            station: &frame,
            bend,
            zones_m: &zones_m,
        };
        let rows: Vec<Vec<f64>> = (0..layer.rows - 1)
            .into_par_iter()
            .map(|row| context.row(row))
            .collect();
        for row in rows {
            for (sum, v) in sums.iter_mut().zip(row) {
                *sum += v;
            }
        }
    }
    let unit = settings.big_g * settings.density_kg_m3 * MGAL_PER_M_S2;
    Ok(sums.into_iter().map(|v| v * unit).collect())
}

struct Context<'a> {
    layer: &'a Layer,
    station: &'a StationFrame,
    bend: Option<Bend>,
    zones_m: &'a [f64],
}

impl Context<'_> {
    fn row(&self, row: usize) -> Vec<f64> {
        let mut sums = vec![0.0; self.zones_m.len()];
        for col in 0..self.layer.cols - 1 {
            match self.layer.cell_state(row, col) {
                CellState::None => {}
                CellState::Full => self.piece(row, col, (0.0, 0.0), 1.0, 1.0, &mut sums),
                CellState::Clipped => {
                    self.piece(row, col, (0.0, 0.0), 1.0, 1.0, &mut sums);
                    for ring in self.layer.cell_rings(row, col) {
                        self.ring(row, col, ring, &mut sums);
                    }
                }
            }
        }
        sums
    }

    /// Column per area times the area of a cell, at (x, y) cells from the cell's middle, and the ground distance, m.
    fn density(&self, row: usize, col: usize, x: f64, y: f64) -> (f64, f64) {
        let layer = self.layer;
        let (tile, _, _) = layer.tile_of(row, col);
        let (mx, my) = layer.tile_middle(tile);
        let (u, v) = (col as f64 + 0.5 + x - mx, row as f64 + 0.5 + y - my);
        let geometry = &layer.geometry[tile];
        let (foot, normal) = (
            quadratic_vec(&geometry.foot_m, u, v),
            quadratic_vec(&geometry.normal, u, v),
        );
        let h = self.station.height_m;
        let up = self.station.axes.up;
        let offset = sub(foot, self.station.foot_m);
        let lean = sub(normal, up);
        let d: [f64; 3] = std::array::from_fn(|k| offset[k] + h * lean[k]);
        let (im, ip) = (
            geometry.inv_meridian_radius,
            geometry.inv_prime_vertical_radius,
        );
        let (fm, fp) = (1.0 + h * im, 1.0 + h * ip);
        let rise = self.bend.map_or(0.0, |b| b.rise(norm(d)));
        let dh = layer.surface(row, col).at(x, y) + rise - h;
        let column = column_per_area(
            -dot(up, d),
            -dot(up, normal),
            dot(d, normal),
            dot(d, d),
            im / fm,
            ip / fp,
            dh,
        );
        let area = quadratic(&geometry.cell_area_m2, u, v) * fm * fp;
        (column * area, arc_from_chord_m(norm(offset)))
    }

    fn zone(&self, distance_m: f64) -> usize {
        self.zones_m
            .iter()
            .position(|&edge| distance_m < edge)
            .unwrap_or(self.zones_m.len())
    }

    fn add(&self, sums: &mut [f64], distance_m: f64, value: f64) {
        if let Some(sum) = sums.get_mut(self.zone(distance_m)) {
            *sum += value;
        }
    }

    fn piece(
        &self,
        row: usize,
        col: usize,
        (x, y): (f64, f64),
        size: f64,
        sign: f64,
        sums: &mut [f64],
    ) {
        let (_, distance) = self.density(row, col, x, y);
        let width = size * self.layer.post_spacing_m * 1.5; // generous: posts need not be square
        let (near, far) = (
            self.zone((distance - width).max(0.0)),
            self.zone(distance + width),
        );
        if near == self.zones_m.len() {
            return;
        }
        let close = distance < QUARTER_WITHIN * width;
        if (close && size > SMALLEST_AT_STATION) || (near != far && size > SMALLEST_AT_EDGE) {
            for (sx, sy) in [(-0.25, -0.25), (0.25, -0.25), (-0.25, 0.25), (0.25, 0.25)] {
                self.piece(
                    row,
                    col,
                    (x + sx * size, y + sy * size),
                    0.5 * size,
                    sign,
                    sums,
                );
            }
            return;
        }
        let rule: &[(f64, f64)] = if distance > FEW_POINTS_BEYOND * width {
            &GAUSS_2
        } else {
            &GAUSS_4
        };
        for &(v, wv) in rule {
            for &(u, wu) in rule {
                let (value, at) = self.density(row, col, x + u * size, y + v * size);
                self.add(sums, at, sign * wu * wv * size * size * value);
            }
        }
    }

    /// Takes a ring out of a cell: signed triangles from the ring's first point, each quartered where that is called for.
    fn ring(&self, row: usize, col: usize, ring: &Ring, sums: &mut [f64]) {
        let apex = ring[0];
        for (p, q) in edges(ring) {
            self.triangle(row, col, [apex, p, q], 0, sums);
        }
    }

    fn triangle(&self, row: usize, col: usize, t: [[f64; 2]; 3], depth: usize, sums: &mut [f64]) {
        let area = 0.5
            * ((t[1][0] - t[0][0]) * (t[2][1] - t[0][1])
                - (t[2][0] - t[0][0]) * (t[1][1] - t[0][1]));
        if area == 0.0 {
            return;
        }
        let middle = [0, 1].map(|k| (t[0][k] + t[1][k] + t[2][k]) / 3.0);
        let (_, distance) = self.density(row, col, middle[0], middle[1]);
        let mid = |a: [f64; 2], b: [f64; 2]| [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
        let reach = t
            .iter()
            .map(|p| (p[0] - middle[0]).hypot(p[1] - middle[1]))
            .fold(0.0, f64::max);
        let width = 1.5 * reach * self.layer.post_spacing_m;
        let (near, far) = (
            self.zone((distance - width).max(0.0)),
            self.zone(distance + width),
        );
        let close = distance < 2.0 * QUARTER_WITHIN * width;
        if depth < 2 || (close && depth < 14) || (near != far && depth < 7) {
            let (a, b, c) = (mid(t[0], t[1]), mid(t[1], t[2]), mid(t[2], t[0]));
            for part in [[t[0], a, c], [a, t[1], b], [c, b, t[2]], [a, b, c]] {
                self.triangle(row, col, part, depth + 1, sums);
            }
            return;
        }
        // three-point rule of degree 2
        for k in 0..3 {
            let p = mid(t[k], t[(k + 1) % 3]);
            let (value, at) = self.density(row, col, p[0], p[1]);
            self.add(sums, at, -area / 3.0 * value);
        }
    }
}
