//! The invented country's relief: one surface that all DEMs and stations are taken from.
//!
//! Plane coordinates here are metres east and north of [`CENTRE_LON_DEG`], [`CENTRE_LAT_DEG`], with fixed metres per
//! degree: the shape of the relief is invented anyhow, so only the way from longitude and latitude to the plane must be
//! the same for all DEMs.

use crate::{
    erosion::{Ground, carve, trough},
    field::Field,
    noise::{fractal, noise, ridged},
};

/// Longitude of the middle of the massif, degrees.
pub const CENTRE_LON_DEG: f64 = -29.1;
/// Latitude of the middle of the massif, degrees.
pub const CENTRE_LAT_DEG: f64 = 46.5;
/// Plane metres per degree of longitude.
pub const EAST_M_PER_DEG: f64 = 76_765.0;
/// Plane metres per degree of latitude.
pub const NORTH_M_PER_DEG: f64 = 111_160.0;

/// Half width of the country, metres: the mesh of 1 km.
const COUNTRY_M: f64 = 200_000.0;
/// Half width of the massif, metres: the mesh of 100 m.
const MASSIF_M: f64 = 36_000.0;
/// Middle of the core, metres in the wandering plane, and its half width: the mesh of 12.5 m.
const CORE_M: (f64, f64, f64) = (550.0, -2_500.0, 4_700.0);
/// The massif's highest rock, metres in the wandering plane.
const SUMMIT_M: (f64, f64) = (1_500.0, -700.0);

/// The cirque's middle in the plane, its radius and the height of its floor, metres.
const CIRQUE_M: (f64, f64, f64, f64) = (760.0, -1_240.0, 360.0, 1_950.0);
/// The landfill's middle in the plane, metres.
const LANDFILL_M: (f64, f64) = (-290.0, -5_290.0);
/// Height of the valley floor under the landfill, metres.
const LANDFILL_FOOT_M: f64 = 1_214.0;

/// The relief, carved once and then asked for heights.
#[derive(Clone, Debug)]
pub struct Relief {
    country: Field,
    massif: Field,
    core: Field,
}

impl Default for Relief {
    fn default() -> Self {
        Self::new()
    }
}

/// 1 at the middle, 1/2 at `width`, falling with the fourth power.
fn swell(distance: f64, width: f64) -> f64 {
    let q = distance / width;
    1.0 / (1.0 + q * q * q * q)
}

/// Steepness U/K of the ground, metres: ranges and lowlands, hard and soft rock.
fn steepness_m(x: f64, y: f64) -> f64 {
    // The main range runs east-north-east through the massif, a second one far in the south-east.
    let bend = 16_000.0 * noise(x / 90_000.0, y / 90_000.0, 11);
    let main = swell(0.94 * y - 0.34 * x + bend, 30_000.0) * swell(0.94 * x + 0.34 * y, 140_000.0);
    let second = swell(0.8 * y + 0.6 * x + 100_000.0 + 2.0 * bend, 26_000.0)
        * swell(0.8 * x - 0.6 * y, 120_000.0);
    let massif = swell((x * x + y * y).sqrt(), 15_000.0);
    let hills = 0.14 + 0.3 * (0.4 + noise(x / 40_000.0, y / 40_000.0, 12)).max(0.0);
    let rock = 1.0 + 0.8 * fractal(x, y, 8_000.0, 3, 0.6, 13);
    let summit = swell(
        ((x - SUMMIT_M.0) * (x - SUMMIT_M.0) + (y - SUMMIT_M.1) * (y - SUMMIT_M.1)).sqrt(),
        2_600.0,
    );
    180.0
        * ((0.8 * main + 0.65 * second + 0.3 * massif + hills).min(1.2) * rock.max(0.35)
            + 0.7 * summit)
}

/// Steepest slope that stands (tangent): scree, sound rock, walls.
fn steepest(x: f64, y: f64) -> f64 {
    let summit = swell(
        ((x - SUMMIT_M.0) * (x - SUMMIT_M.0) + (y - SUMMIT_M.1) * (y - SUMMIT_M.1)).sqrt(),
        2_000.0,
    );
    (0.8 + 0.3 * summit + 0.7 * fractal(x, y, 1_300.0, 6, 0.7, 14)).clamp(0.5, 1.5)
}

/// Where the meshes are read for a place in the plane: rivers wander instead of following the mesh.
fn wander(x: f64, y: f64) -> (f64, f64) {
    let swing = |seed: u64| {
        2_600.0 * noise(x / 21_000.0, y / 21_000.0, seed)
            + 900.0 * noise(x / 6_500.0, y / 6_500.0, seed + 1)
            + 260.0 * noise(x / 1_900.0, y / 1_900.0, seed + 2)
            + 60.0 * noise(x / 520.0, y / 520.0, seed + 3)
    };
    (x + swing(31), y + swing(36))
}

/// A finer mesh of a smoother field's middle, with a grain for the water to find its ways.
fn refine(coarser: &Field, middle: (f64, f64), half_width_m: f64, step_m: f64) -> Field {
    let nodes = (2.0 * half_width_m / step_m) as usize + 1;
    Field::from_fn(
        middle.0 - half_width_m,
        middle.1 - half_width_m,
        step_m,
        nodes,
        nodes,
        |x, y| coarser.smooth(x, y).0 + 0.06 * step_m * fractal(x, y, 4.3 * step_m, 2, 0.7, 22),
    )
}

impl Relief {
    /// Carves country, massif and core; takes a few seconds.
    #[must_use]
    pub fn new() -> Self {
        let nodes = (2.0 * COUNTRY_M / 1_000.0) as usize + 1;
        let mut country = Field::from_fn(-COUNTRY_M, -COUNTRY_M, 1_000.0, nodes, nodes, |x, y| {
            300.0 + 90.0 * (1.0 + fractal(x, y, 50_000.0, 6, 0.7, 21))
        });
        // The mesh of 1 km lacks the steep first kilometre of every stream: more steepness stands in for it.
        let ground = Ground::new(&country, |x, y| 1.4 * steepness_m(x, y), |_, _| 0.5);
        carve(&mut country, &ground, 140, 0.25);

        let mut massif = country.clone();
        let mut floors = massif.clone();
        for (step, steps) in [(400.0, 60), (200.0, 30), (100.0, 14)] {
            massif = refine(&massif, (0.0, 0.0), MASSIF_M, step);
            let ground = Ground::new(&massif, steepness_m, steepest);
            let rivers = carve(&mut massif, &ground, steps, 0.25);
            if step == 100.0 {
                floors = trough(&mut massif, &rivers, 2.0, 75.0);
            }
        }

        let (east, north, half_width) = CORE_M;
        let mut core = massif.clone();
        for (step, steps, pace) in [(50.0, 6, 0.06), (25.0, 6, 0.04), (12.5, 5, 0.03)] {
            core = refine(&core, (east, north), half_width, step);
            let mut ground = Ground::new(&core, steepness_m, steepest);
            // Valley floors stay as the massif has them: the core sees only a part of the area that drains to them.
            for (index, fixed) in ground.fixed.iter_mut().enumerate() {
                let (x, y) = core.position(index);
                *fixed |= floors.smooth(x, y).0 > 0.4;
            }
            carve(&mut core, &ground, steps, pace);
        }
        Self {
            country,
            massif,
            core,
        }
    }

    /// Height of the ground without anything smaller than the mesh, its slope (tangent) and the share of the core.
    fn bare(&self, x: f64, y: f64) -> (f64, f64, f64) {
        let (x, y) = wander(x, y);
        let share = |x: f64, y: f64, half_width: f64, belt: f64| {
            let t = ((half_width - x.abs()).min(half_width - y.abs()) / belt).clamp(0.0, 1.0);
            t * t * (3.0 - 2.0 * t)
        };
        let mix = |a: (f64, f64, f64), b: (f64, f64, f64), t: f64| {
            (
                a.0 + t * (b.0 - a.0),
                a.1 + t * (b.1 - a.1),
                a.2 + t * (b.2 - a.2),
            )
        };
        let in_massif = share(x, y, MASSIF_M, 5_000.0);
        let in_core = share(x - CORE_M.0, y - CORE_M.1, CORE_M.2, 600.0);
        let mut ground = if in_massif > 0.0 {
            self.massif.smooth(x, y)
        } else {
            self.country.smooth(x, y)
        };
        if in_massif > 0.0 && in_massif < 1.0 {
            ground = mix(self.country.smooth(x, y), ground, in_massif);
        }
        if in_core > 0.0 {
            ground = mix(ground, self.core.smooth(x, y), in_core);
        }
        let (height, east, north) = ground;
        (height, (east * east + north * north).sqrt(), in_core)
    }

    /// Height of the ground averaged over about a kilometre, metres: what the far DEM shows.
    #[must_use]
    pub fn mean_height_m(&self, x: f64, y: f64) -> f64 {
        if x.abs().max(y.abs()) > MASSIF_M + 4_000.0 {
            return self.bare(x, y).0;
        }
        let mut sum = 0.0;
        for i in 0..8 {
            for j in 0..8 {
                sum += self
                    .bare(
                        x + 115.0 * (f64::from(i) - 3.5),
                        y + 115.0 * (f64::from(j) - 3.5),
                    )
                    .0;
            }
        }
        sum / 64.0
    }

    /// Height of the ground without blocks and other things of metres, metres, at plane coordinates in metres.
    #[must_use]
    pub fn soft_height_m(&self, x: f64, y: f64) -> f64 {
        self.soft(x, y).0
    }

    /// Height of the ground, metres, at plane coordinates in metres.
    #[must_use]
    pub fn height_m(&self, x: f64, y: f64) -> f64 {
        let (height, rough) = self.soft(x, y);
        height
            + 2.5 * rough * fractal(x, y, 60.0, 5, 0.6, 51)
            + 0.2 * fractal(x, y, 70.0, 3, 0.6, 61)
    }

    /// Soft height, and how rough the ground is, 0 (meadow) to 1 (wall).
    fn soft(&self, x: f64, y: f64) -> (f64, f64) {
        let (height, slope, in_core) = self.bare(x, y);
        let mut rough = slope * slope / (slope * slope + 0.2);
        let mut height = height;
        if in_core < 1.0 {
            // Outside the core crags stand in for the gullies that the mesh is too coarse for.
            height += rough * 20.0 * (1.0 - in_core) * (ridged(x, y, 210.0, 3, 0.5, 42) - 0.6);
        }
        let (dx, dy) = (x - CIRQUE_M.0, y - CIRQUE_M.1);
        if dx.abs().max(dy.abs()) < 1.5 * CIRQUE_M.2 {
            let q = (dx * dx + 0.7 * dy * dy) / (CIRQUE_M.2 * CIRQUE_M.2)
                + 0.9 * fractal(x, y, 330.0, 3, 0.5, 43);
            let t = (1.25 - 1.25 * q).clamp(0.0, 1.0);
            let share = t * t * (3.0 - 2.0 * t);
            let floor = CIRQUE_M.3 + 0.05 * dy + 9.0 * fractal(x, y, 150.0, 3, 0.5, 44);
            height += share * (floor - height);
            rough *= 1.0 - 0.6 * share;
        }
        let mound = landfill_m(x, y);
        if mound > 0.0 {
            height = height.max(LANDFILL_FOOT_M + mound);
            rough *= 0.1;
        }
        (height, rough)
    }
}

/// Height of the landfill above its foot, metres, negative outside: a flat top and margins of one in two.
fn landfill_m(x: f64, y: f64) -> f64 {
    let (dx, dy) = (x - LANDFILL_M.0, y - LANDFILL_M.1);
    // An oval: distances across count double.
    let distance = (dx * dx + 3.0 * dy * dy).sqrt();
    (24.0f64).min(0.5 * (165.0 - distance))
}
