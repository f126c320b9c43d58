//! Rivers carve an uplifted block: drainage that joins downstream, sharp crests, valleys of every size.
//!
//! Detachment-limited stream power with m = 1/2 and n = 1 (Howard 1994, Water Resources Research 30, 2261-2285),
//! solved implicitly along the drainage tree (Braun and Willett 2013, Geomorphology 180-181, 170-179); slopes are
//! capped at the angle at which rock stands. With K = 1 the uplift is given as steepness `U/K` in metres, so that at
//! equilibrium slope = steepness / sqrt(drained area). Arithmetic is `+ - * / sqrt` only: the same bits everywhere.

use std::{cmp::Reverse, collections::BinaryHeap, f64::consts::SQRT_2};

use crate::{
    field::Field,
    noise::{hash, signed_unit},
};

/// What the ground is made of, node by node.
#[derive(Clone, Debug)]
pub struct Ground {
    /// Steepness `U/K`, metres.
    pub steepness_m: Vec<f64>,
    /// Steepest slope that stands, as a tangent.
    pub steepest: Vec<f64>,
    /// Nodes that keep their height and take water in: the rim at least.
    pub fixed: Vec<bool>,
}

impl Ground {
    /// Ground from functions of (east, north) in metres; the field's rim is fixed.
    #[must_use]
    pub fn new(
        field: &Field,
        steepness_m: impl Fn(f64, f64) -> f64,
        steepest: impl Fn(f64, f64) -> f64,
    ) -> Self {
        let count = field.values.len();
        let each = |f: &dyn Fn(f64, f64) -> f64| -> Vec<f64> {
            (0..count)
                .map(|index| {
                    let (x, y) = field.position(index);
                    f(x, y)
                })
                .collect()
        };
        let fixed = (0..count).map(|index| {
            let (row, column) = (index / field.columns, index % field.columns);
            row == 0 || column == 0 || row + 1 == field.rows || column + 1 == field.columns
        });
        Self {
            steepness_m: each(&steepness_m),
            steepest: each(&steepest),
            fixed: fixed.collect(),
        }
    }
}

/// Where the water goes.
#[derive(Clone, Debug)]
pub struct Drainage {
    /// Node that each node drains to: itself where it is fixed.
    pub receiver: Vec<usize>,
    /// Distance to the receiver, metres.
    pub length_m: Vec<f64>,
    /// Nodes in an order in which every node comes after its receiver.
    pub downstream_first: Vec<usize>,
    /// Area drained through the node, its own included, m2.
    pub area_m2: Vec<f64>,
}

const NEIGHBOURS: [(isize, isize, f64); 8] = [
    (-1, 0, 1.0),
    (1, 0, 1.0),
    (0, -1, 1.0),
    (0, 1, 1.0),
    (-1, -1, SQRT_2),
    (1, -1, SQRT_2),
    (-1, 1, SQRT_2),
    (1, 1, SQRT_2),
];

/// Least rise from a node to one that drains to it, metres.
const RISE_M: f64 = 1e-3;

/// Fills every hollow so that each node has a way down to a fixed one (priority flood: Barnes, Lehman and Mulla 2014,
/// Computers and Geosciences 62, 117-127, with a small rise). Heights must not be negative.
fn fill_hollows(field: &mut Field, fixed: &[bool]) {
    let mut done = fixed.to_vec();
    // Heights that are not negative sort as their bits do.
    let key = |height: f64, index: usize| Reverse((height.max(0.0).to_bits(), index));
    let mut open: BinaryHeap<_> = (0..done.len())
        .filter(|&index| fixed[index])
        .map(|index| key(field.values[index], index))
        .collect();
    while let Some(Reverse((_, index))) = open.pop() {
        let (row, column) = (
            (index / field.columns) as isize,
            (index % field.columns) as isize,
        );
        for (dx, dy, _) in NEIGHBOURS {
            let (c, r) = (column + dx, row + dy);
            if c < 0 || r < 0 || c >= field.columns as isize || r >= field.rows as isize {
                continue;
            }
            let next = r as usize * field.columns + c as usize;
            if !done[next] {
                done[next] = true;
                field.values[next] = field.values[next].max(field.values[index] + RISE_M);
                open.push(key(field.values[next], next));
            }
        }
    }
}

/// The drainage of a surface without hollows: each node to its steepest lower neighbour.
///
/// Each node weighs its eight directions by a fixed chance of its own, or rivers would run for miles along them.
fn drainage(field: &Field, fixed: &[bool]) -> Drainage {
    let count = field.values.len();
    let columns = field.columns as isize;
    let mut receiver: Vec<usize> = (0..count).collect();
    let mut length = vec![field.step_m; count];
    for row in 1..field.rows - 1 {
        for column in 1..field.columns - 1 {
            let index = row * field.columns + column;
            if fixed[index] {
                continue;
            }
            let mut best = 0.0;
            let mut chances = hash(column as i64, row as i64, 77);
            for (dx, dy, distance) in NEIGHBOURS {
                let next = (index as isize + dy * columns + dx) as usize;
                let drop = field.values[index] - field.values[next];
                let slope = drop / distance * (1.0 + 0.25 * signed_unit(chances << 24));
                chances >>= 8;
                if slope > best {
                    best = slope;
                    receiver[index] = next;
                    length[index] = distance * field.step_m;
                }
            }
        }
    }
    // Donors of each node, one node after the other, then a walk upstream from every outlet.
    let mut first = vec![0_usize; count + 1];
    for (index, &to) in receiver.iter().enumerate() {
        if to != index {
            first[to + 1] += 1;
        }
    }
    for index in 0..count {
        first[index + 1] += first[index];
    }
    let mut next = first.clone();
    let mut donors = vec![0_usize; count];
    for (index, &to) in receiver.iter().enumerate() {
        if to != index {
            donors[next[to]] = index;
            next[to] += 1;
        }
    }
    let mut order: Vec<usize> = (0..count)
        .filter(|&index| receiver[index] == index)
        .collect();
    order.reserve(count);
    let mut at = 0;
    while at < order.len() {
        let index = order[at];
        order.extend_from_slice(&donors[first[index]..first[index + 1]]);
        at += 1;
    }
    let mut area = vec![field.step_m * field.step_m; count];
    for &index in order.iter().rev() {
        let to = receiver[index];
        if to != index {
            area[to] += area[index];
        }
    }
    Drainage {
        receiver,
        length_m: length,
        downstream_first: order,
        area_m2: area,
    }
}

/// Carves the field in place in `steps` steps, each raising the ground by `pace` times its steepness.
pub fn carve(field: &mut Field, ground: &Ground, steps: usize, pace: f64) -> Drainage {
    fill_hollows(field, &ground.fixed);
    for _ in 0..steps {
        let rivers = drainage(field, &ground.fixed);
        for &index in &rivers.downstream_first {
            let to = rivers.receiver[index];
            if to == index {
                continue;
            }
            let length = rivers.length_m[index];
            let power = pace * rivers.area_m2[index].sqrt() / length;
            let raised = field.values[index] + ground.steepness_m[index] * pace;
            let carved = (raised + power * field.values[to]) / (1.0 + power);
            // Where soft rock rises less than the hard rock downstream, the water still gets out.
            let least = field.values[to] + RISE_M;
            field.values[index] = carved
                .min(field.values[to] + ground.steepest[index] * length)
                .max(least);
        }
    }
    drainage(field, &ground.fixed)
}

/// Turns V-shaped valleys into troughs with flat floors, as glaciers and their outwash leave them.
///
/// The height of a node above the channel it drains to is squeezed where it is small beside the depth of the trough,
/// `depth_m` times the fourth root of the channel's area in km2. Channels drain more than `channel_km2`. Returns a field
/// that is 1 on valley floors and 0 elsewhere.
pub fn trough(field: &mut Field, rivers: &Drainage, channel_km2: f64, depth_m: f64) -> Field {
    let mut floors = Field {
        values: vec![0.0; field.values.len()],
        ..*field
    };
    let mut channel: Vec<usize> = (0..field.values.len()).collect();
    let mut shaped = field.values.clone();
    for &index in &rivers.downstream_first {
        let to = rivers.receiver[index];
        if to != index && rivers.area_m2[index] < channel_km2 * 1e6 {
            channel[index] = channel[to];
        }
        let floor = field.values[channel[index]];
        let area_km2 = rivers.area_m2[channel[index]] / 1e6;
        if area_km2 < channel_km2 {
            continue;
        }
        let depth = depth_m * area_km2.sqrt().sqrt();
        let above = field.values[index] - floor;
        let t = (above / (2.0 * depth)).min(1.0);
        floors.values[index] = if t < 0.4 { 1.0 } else { 0.0 };
        shaped[index] = floor + above * (0.04 + 0.96 * t * t * (3.0 - 2.0 * t));
    }
    field.values = shaped;
    floors
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::noise::noise;

    fn block(steepest: f64) -> (Field, Ground) {
        let field = Field::from_fn(0.0, 0.0, 100.0, 60, 50, |x, y| {
            100.0 + 20.0 * noise(x / 700.0, y / 700.0, 4)
        });
        let ground = Ground::new(&field, |_, _| 100.0, |_, _| steepest);
        (field, ground)
    }

    #[test]
    fn every_node_drains_to_the_rim_and_areas_add_up() {
        let (mut field, ground) = block(0.8);
        let rivers = carve(&mut field, &ground, 30, 0.3);
        assert_eq!(rivers.downstream_first.len(), field.values.len());
        let outlets: Vec<usize> = (0..field.values.len())
            .filter(|&i| rivers.receiver[i] == i)
            .collect();
        let drained: f64 = outlets.iter().map(|&i| rivers.area_m2[i]).sum();
        assert_eq!(drained, 3000.0 * 1e4, "all the water leaves");
        assert!(
            outlets.iter().all(|&i| ground.fixed[i]),
            "no hollow is left inside"
        );
    }

    /// Howard 1994: at equilibrium slope = (U/K) / sqrt(area), here where no slope stands at its cap. Some streams
    /// go on switching between two ways down and never settle.
    #[test]
    fn equilibrium_slope_follows_the_drained_area() {
        let (mut field, ground) = block(10.0);
        let rivers = carve(&mut field, &ground, 4000, 1.0);
        let (mut inner, mut settled) = (0, 0);
        for index in (0..field.values.len()).filter(|&index| rivers.receiver[index] != index) {
            let slope = (field.values[index] - field.values[rivers.receiver[index]])
                / rivers.length_m[index];
            let expected = 100.0 / rivers.area_m2[index].sqrt();
            inner += 1;
            settled += i32::from((slope - expected).abs() < 1e-6 * expected);
        }
        assert!(
            inner == 58 * 48 && settled > inner * 3 / 4,
            "{settled} of {inner} nodes"
        );
    }
}
