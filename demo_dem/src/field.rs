//! A square-meshed field of heights with smooth interpolation.

/// Values on a mesh: row 0 lies south, column 0 west.
#[derive(Clone, Debug)]
pub struct Field {
    /// Easting of column 0, metres.
    pub west_m: f64,
    /// Northing of row 0, metres.
    pub south_m: f64,
    /// Mesh size, metres.
    pub step_m: f64,
    /// Number of columns.
    pub columns: usize,
    /// Number of rows.
    pub rows: usize,
    /// The values, row by row.
    pub values: Vec<f64>,
}

impl Field {
    /// A field filled from a function of (east, north) in metres.
    #[must_use]
    pub fn from_fn(
        west_m: f64,
        south_m: f64,
        step_m: f64,
        columns: usize,
        rows: usize,
        f: impl Fn(f64, f64) -> f64,
    ) -> Self {
        let mut values = Vec::with_capacity(columns * rows);
        for row in 0..rows {
            for column in 0..columns {
                values.push(f(
                    west_m + column as f64 * step_m,
                    south_m + row as f64 * step_m,
                ));
            }
        }
        Self {
            west_m,
            south_m,
            step_m,
            columns,
            rows,
            values,
        }
    }

    /// Position of a node, metres.
    #[must_use]
    pub fn position(&self, index: usize) -> (f64, f64) {
        let (row, column) = (index / self.columns, index % self.columns);
        (
            self.west_m + column as f64 * self.step_m,
            self.south_m + row as f64 * self.step_m,
        )
    }

    /// Value and gradient (per metre, east and north) of the cubic B-spline with the field's values as coefficients:
    /// smooth to the second derivative, and softening the mesh a little, which hides the eight directions of the
    /// drainage. Outside the mesh the rim's values go on.
    #[must_use]
    #[inline]
    pub fn smooth(&self, east_m: f64, north_m: f64) -> (f64, f64, f64) {
        let x = ((east_m - self.west_m) / self.step_m)
            .max(0.0)
            .min((self.columns - 1) as f64);
        let y = ((north_m - self.south_m) / self.step_m)
            .max(0.0)
            .min((self.rows - 1) as f64);
        let (column, row) = (x.floor(), y.floor());
        let ((wx, dx), (wy, dy)) = (spline(x - column), spline(y - row));
        let clamp = |centre: f64, k: usize, count: usize| {
            (centre as usize + k).saturating_sub(1).min(count - 1)
        };
        let columns = [0, 1, 2, 3].map(|k| clamp(column, k, self.columns));
        let (mut value, mut east, mut north) = (0.0, 0.0, 0.0);
        for k in 0..4 {
            let line = clamp(row, k, self.rows) * self.columns;
            let (mut across, mut slope) = (0.0, 0.0);
            for l in 0..4 {
                let v = self.values[line + columns[l]];
                across += wx[l] * v;
                slope += dx[l] * v;
            }
            value += wy[k] * across;
            east += wy[k] * slope;
            north += dy[k] * across;
        }
        (value, east / self.step_m, north / self.step_m)
    }
}

/// Weights of the uniform cubic B-spline and their derivatives.
#[inline]
fn spline(t: f64) -> ([f64; 4], [f64; 4]) {
    let s = 1.0 - t;
    let (t2, s2) = (t * t, s * s);
    (
        [
            s2 * s / 6.0,
            (3.0 * t2 * t - 6.0 * t2 + 4.0) / 6.0,
            (3.0 * s2 * s - 6.0 * s2 + 4.0) / 6.0,
            t2 * t / 6.0,
        ],
        [
            -s2 / 2.0,
            (3.0 * t2 - 4.0 * t) / 2.0,
            (-3.0 * s2 + 4.0 * s) / 2.0,
            t2 / 2.0,
        ],
    )
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A cubic B-spline reproduces a plane exactly (de Boor 1978): value and slope.
    #[test]
    fn plane_is_reproduced() {
        let field = Field::from_fn(-50.0, 20.0, 10.0, 12, 9, |x, y| 3.0 + 0.25 * x - 0.5 * y);
        let (value, east, north) = field.smooth(3.3, 57.1);
        assert!((value - (3.0 + 0.25 * 3.3 - 0.5 * 57.1)).abs() < 1e-12);
        assert!((east - 0.25).abs() < 1e-12 && (north + 0.5).abs() < 1e-12);
    }
}
