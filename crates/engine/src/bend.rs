//! Bending the surface through a station.

/// The surface is raised by `rise_m * w(distance / radius)`, w(t) = (1 - t)^2 (1 + 2 t) below 1, 0 beyond.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Bend {
    /// Station height less surface height, m.
    pub rise_m: f64,
    /// Radius, m at station level.
    pub radius: f64,
}

/// The bending radius is at least this many posts of the DEM under the station.
const SMALLEST_POSTS: f64 = 3.0;

impl Bend {
    /// For a radius asked along the ground and the post spacing under the station, m; `stretch` takes it to station level.
    pub(crate) fn new(rise_m: f64, asked_m: f64, spacing_m: f64, stretch: f64) -> Self {
        Self {
            rise_m,
            radius: asked_m.max(SMALLEST_POSTS * spacing_m) * stretch,
        }
    }

    /// Rise at a distance, m.
    #[inline]
    pub(crate) fn rise(&self, distance: f64) -> f64 {
        let t = distance / self.radius;
        if t >= 1.0 {
            0.0
        } else {
            self.rise_m * (1.0 - t) * (1.0 - t) * (1.0 + 2.0 * t)
        }
    }

    /// First derivative of the rise by distance, divided by the distance (finite at 0), 1/m.
    #[inline]
    pub(crate) fn slope_over_distance(&self, distance: f64) -> f64 {
        let t = distance / self.radius;
        if t >= 1.0 {
            0.0
        } else {
            -6.0 * self.rise_m * (1.0 - t) / (self.radius * self.radius)
        }
    }

    /// Second derivative of the rise by distance, 1/m.
    #[inline]
    pub(crate) fn curvature(&self, distance: f64) -> f64 {
        let t = distance / self.radius;
        if t >= 1.0 {
            0.0
        } else {
            self.rise_m * (12.0 * t - 6.0) / (self.radius * self.radius)
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;

    #[test]
    fn derivatives_against_differences() {
        let bend = Bend {
            rise_m: 3.0,
            radius: 100.0,
        };
        assert_relative_eq!(bend.rise(0.0), 3.0);
        assert_relative_eq!(bend.rise(100.0), 0.0);
        for r in [1.0, 20.0, 55.0, 99.0] {
            let h = 1e-3;
            let d1 = (bend.rise(r + h) - bend.rise(r - h)) / (2.0 * h);
            let d2 = (bend.rise(r + h) - 2.0 * bend.rise(r) + bend.rise(r - h)) / (h * h);
            assert_relative_eq!(bend.slope_over_distance(r) * r, d1, max_relative = 1e-6);
            assert_relative_eq!(bend.curvature(r), d2, max_relative = 1e-4, epsilon = 1e-7);
        }
    }
}
