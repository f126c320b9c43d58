//! The kernel: a node's column integral with its second-order terms and an estimate of what they leave out.
//!
//! All values are per unit of G rho: column integrals in 1/m, node values in m. Formulas for one node, with
//! r = |D|, l^2 = r^2 + 2 b z + z^2 and s = r^2:
//!
//! * the column itself in the cancellation-free form of [`hillpull_physics::bodies::column`],
//! * second derivatives of F(s, z) = -(1/r - 1/l) + (c0/s) z / l, the flat kernel and the leading term of the Earth's
//!   curvature: mean of F over the node = F + F_s tr M + 2 F_ss D'MD + 2 F_sz D'c + F_zz var / 2, with M the second
//!   moments of position and c the covariance of height with position.

use multiversion::multiversion;

/// Nodes evaluated at a time.
pub(crate) const LANES: usize = 8;

/// One number a lane.
pub(crate) type Lane = [f64; LANES];

/// Largest (rms radius / distance)^2 of a node that may be taken whole.
pub(crate) const LARGEST_SPREAD: f64 = 0.08;

/// The mean of the fourth-order terms, in units of (second-order terms) x (spread).
///
/// For heights small against the distance the kernel is -(z + h')^2 / 2 r^3. With w = r^-3 (so that its Laplacian is 9 r^-5 and
/// the double one 225 r^-7), a square's moments E[x^2] = q, E[x^4] = 1.8 q^2, E[x^2 y^2] = q^2 and spread = 2 q / r^2, the
/// terms in h'^2, in z^2 and in z h' come to 2.25, 2.2 and 1.75 times the spread, averaged over azimuths.
const FOURTH_ORDER: f64 = 2.1;
/// The same where the column is far longer than its distance: the kernel is 1/r, and the term 0.8 times the spread.
const FOURTH_ORDER_STEEP: f64 = 0.8;
/// What is left of a smooth node's remainder in the same units, of the terms' sizes, for gentle columns and for steep ones;
/// calibrated against brute force.
const SMOOTH_REMAINDER: f64 = 0.15;
const SMOOTH_REMAINDER_STEEP: f64 = 0.7;
/// The same for the spread of heights, in units of (variance) / l^2.
const HEIGHT_REMAINDER: f64 = 1.2;
/// Third-order remainder of a rough node in units of its leading terms, calibrated against brute force.
const ROUGH_REMAINDER: f64 = 0.6;

/// The column integral per area, in 1/m, from station level to `z`, for the walk.
///
/// Within 3e-7 of its leading terms' size for |z| to 9 km out to 167 km, within 1e-7 for |z| to 1 km.
///
/// c0, c1, b, d2 as in design: offset of the column's foot against the station's vertical, cosine, component along the
/// column's normal and squared length of D; k1 = 1/M' + 1/N', whose half squared stands for 1/M'N'.
#[inline(always)]
pub(crate) fn column(d2: f64, c0: f64, b: f64, c1: f64, k1: f64, z: f64) -> f64 {
    column_with(d2, c0, b, c1, k1, z, atanh_less_t)
}

#[inline(always)]
fn column_with(
    d2: f64,
    c0: f64,
    b: f64,
    c1: f64,
    k1: f64,
    z: f64,
    atanh_less_t: impl Fn(f64, f64) -> f64,
) -> f64 {
    let r = d2.sqrt();
    let l = (d2 + 2.0 * b * z + z * z).sqrt();
    column_of(
        d2,
        (r, l),
        c0,
        b,
        c1,
        k1,
        z,
        (1.0 / r, 1.0 / l, 1.0 / (l + r)),
        atanh_less_t,
    )
    .0
}

/// The column, and (z + b) / l. Takes r, l and the inverses of r, l and l + r.
#[inline(always)]
fn column_of(
    d2: f64,
    (r, l): (f64, f64),
    c0: f64,
    b: f64,
    c1: f64,
    k1: f64,
    z: f64,
    (inv_r, inv_l, inv_sum): (f64, f64, f64),
    atanh_less_t: impl Fn(f64, f64) -> f64,
) -> (f64, f64) {
    let rise = z * (2.0 * b + z) * inv_sum; // l - r
    let g = (r - b * (2.0 * b + z) * inv_sum) * inv_l / (d2 - b * b);
    // integrals of dz / l^3, z dz / l^3 and z^3 dz / l^3
    let j0 = z * g * inv_r;
    let j1 = z * z * g * inv_sum;
    let flat_rise = z * z * inv_sum;
    let j3 = flat_rise * flat_rise * inv_l;
    // integral of z^2 dz / l^3 with z = (z + b) - b, up to terms in b^2
    let t = (z + b) * inv_l;
    let lean = b * inv_r;
    let exp_atanh = ((z + b).abs() + l) * inv_r;
    let j2 = atanh_less_t(t, exp_atanh)
        - lean * lean * lean * (1.0 / 3.0 + 0.2 * lean * lean)
        - 2.0 * b * rise * inv_r * inv_l
        + b * b * j0;
    (
        c0 * j0 + (c1 + c0 * k1) * j1 + c1 * k1 * (j2 + 0.25 * k1 * j3),
        t,
    )
}

/// Below this the series of atanh serves.
const STEEP: f64 = 0.5;

/// atanh(t) - t, with e^atanh|t| given: t alone doesn't tell how near it is to 1.
#[inline(always)]
fn atanh_less_t(t: f64, exp_atanh: f64) -> f64 {
    if t.abs() < STEEP {
        small_atanh_less_t(t, exp_atanh)
    } else {
        (exp_atanh.ln() - t.abs()).copysign(t)
    }
}

#[inline(always)]
fn small_atanh_less_t(t: f64, _exp_atanh: f64) -> f64 {
    let q = t * t;
    t * q
        * (1.0 / 3.0
            + q * (1.0 / 5.0
                + q * (1.0 / 7.0
                    + q * (1.0 / 9.0
                        + q * (1.0 / 11.0 + q * (1.0 / 13.0 + q * (1.0 / 15.0 + q / 17.0)))))))
}

/// Inputs and results of a batch of nodes.
#[derive(Clone, Debug, Default)]
pub(crate) struct Lanes {
    /// D.D, m2.
    pub d2: Lane,
    /// -u.D, m.
    pub c0: Lane,
    /// D.n, m.
    pub b: Lane,
    /// -u.n.
    pub c1: Lane,
    /// 1/M' + 1/N', 1/m.
    pub k1: Lane,
    /// Area at station level, m2.
    pub area: Lane,
    /// D'MD, m4.
    pub dmd: Lane,
    /// tr M, m2.
    pub trace: Lane,
    /// D'c, m3.
    pub dc: Lane,
    /// Mean height less station height, m.
    pub z: Lane,
    /// Variance of height, m2.
    pub var: Lane,
    /// Variance of height about the node's best plane, m2.
    pub rough: Lane,
    /// Node values, m.
    pub value: Lane,
    /// Estimated remainder that adds up, m.
    pub smooth_error: Lane,
    /// Square of the estimated remainder that falls either way, m2.
    pub rough_error2: Lane,
    /// F_s, 1/m3.
    pub f_s: Lane,
    /// F_z, 1/m2.
    pub f_z: Lane,
    /// Sum of the second-order terms' sizes, 1/m.
    pub second: Lane,
    /// Share of what a node may err by; above 1 the node must be opened.
    pub share: Lane,
    /// (z + b) / l.
    pub tangent: Lane,
}

impl Lanes {
    /// Evaluates all lanes. `inv_smooth` and `inv_rough2` are the inverses of the remainders a node may have.
    pub(crate) fn evaluate(&mut self, inv_smooth: f64, inv_rough2: f64) {
        evaluate_lanes(self, inv_smooth, inv_rough2);
        for i in 0..LANES {
            // the series of atanh is for gentle columns; steep ones take the logarithm
            if self.tangent[i].abs() >= STEEP {
                self.mend_steep(i);
            }
        }
    }

    #[cold]
    fn mend_steep(&mut self, i: usize) {
        let (d2, c0, b, c1, k1, z) = (
            self.d2[i], self.c0[i], self.b[i], self.c1[i], self.k1[i], self.z[i],
        );
        let bare = column(d2, c0, b, c1, k1, z);
        let series = column_with(d2, c0, b, c1, k1, z, small_atanh_less_t);
        self.value[i] += self.area[i] * (bare - series);
    }
}

/// One loop for all lanes, without branches, so that it compiles to vector instructions at every level of the CPU;
/// no fused multiply-add, so that all levels give the same bits.
#[multiversion(targets = "simd")]
fn evaluate_lanes(lanes: &mut Lanes, inv_smooth: f64, inv_rough2: f64) {
    for i in 0..LANES {
        evaluate_lane(lanes, i, inv_smooth, inv_rough2);
    }
}

#[inline(always)]
fn evaluate_lane(lanes: &mut Lanes, i: usize, inv_smooth: f64, inv_rough2: f64) {
    let (d2, z, var, trace) = (lanes.d2[i], lanes.z[i], lanes.var[i], lanes.trace[i]);
    let (c0, c1, k1, b) = (lanes.c0[i], lanes.c1[i], lanes.k1[i], lanes.b[i]);
    let r = d2.sqrt();
    let l = (d2 + 2.0 * b * z + z * z).sqrt();
    let (ir, il, inv_sum) = (1.0 / r, 1.0 / l, 1.0 / (l + r));
    let (f, tangent) = column_of(
        d2,
        (r, l),
        c0,
        b,
        c1,
        k1,
        z,
        (ir, il, inv_sum),
        small_atanh_less_t,
    );

    let (ir2, il2) = (ir * ir, il * il);
    let il3 = il * il2;
    let il5 = il3 * il2;
    // 1/r - 1/l without cancellation, and from it 1/r^3 - 1/l^3 and 1/r^5 - 1/l^5
    let d1 = z * z * inv_sum * ir * il;
    let d3 = d1 * (ir2 + ir * il + il2);
    let d5 = d3 * ir2 + il3 * d1 * (ir + il);
    let zc = z * c0 * ir2;
    let f_s = 0.5 * d3 - 0.5 * zc * il3;
    let f_ss = -0.75 * d5 + 0.75 * zc * il5;
    let f_sz = 1.5 * z * il5 + 0.5 * c0 * ir2 * il3 * (3.0 * z * z * il2 - 1.0);
    let f_zz = -il3 + 3.0 * z * z * il5 - 3.0 * z * c0 * il5;
    let f_z = -z * il3 + c0 * il3;

    // what the flat kernel leaves out of each, to first order in z / R (columns widen upward, l lengthens)
    let wide = k1 * z;
    let t_zz = 0.5 * f_zz * var * (1.0 + 1.25 * wide);
    let t_s = f_s * trace * (1.0 + 0.8 * wide);
    let t_ss = 2.0 * f_ss * lanes.dmd[i] * (1.0 + 1.05 * wide);
    let t_sz = 2.0 * f_sz * lanes.dc[i] * (1.0 + 1.5 * wide);
    let second = t_zz.abs() + t_s.abs() + t_ss.abs() + t_sz.abs();
    let area = lanes.area[i];
    let spread = trace * ir2;
    let rough = lanes.rough[i];
    let steep = z * z * il2;
    let fourth = FOURTH_ORDER + (FOURTH_ORDER_STEEP - FOURTH_ORDER) * steep;
    let remainder = SMOOTH_REMAINDER + (SMOOTH_REMAINDER_STEEP - SMOOTH_REMAINDER) * steep;
    let smooth_error = area * second * (remainder * spread + HEIGHT_REMAINDER * var * il2);
    // E[h'h'x], E[h'xx], E[h'h'h'] of what is not plane, times third derivatives of about 1/l^4
    let curved = c0 * ir2 * l * trace;
    let third = var * trace + (z * z * il2) * (trace * trace + var * var) + curved * curved;
    let unit = area * ROUGH_REMAINDER * il2 * il2;
    let rough_error2 = unit * unit * rough * third;
    let share = smooth_error * inv_smooth + rough_error2 * inv_rough2;
    lanes.value[i] = area * (f + ((t_zz + t_sz) + (t_s + t_ss)) * (1.0 + fourth * spread));
    lanes.smooth_error[i] = smooth_error;
    lanes.rough_error2[i] = rough_error2;
    lanes.share[i] = if spread < LARGEST_SPREAD {
        share
    } else {
        f64::INFINITY
    };
    lanes.f_s[i] = f_s;
    lanes.f_z[i] = f_z;
    lanes.second[i] = second;
    lanes.tangent[i] = tangent;
}

#[cfg(test)]
mod tests {
    use super::*;
    use approx::assert_relative_eq;
    use hillpull_physics::bodies::column::column_per_area;

    /// The walk's column against the full closed form, over all that can occur.
    #[test]
    fn column_against_the_full_form() {
        let radius = 6.37e6;
        let (mut worst, mut worst_low) = (0.0_f64, 0.0_f64);
        for r in [1.0, 30.0, 300.0, 3e3, 1e4, 3e4, 1e5, 1.667e5] {
            for z in [
                -9000.0, -3000.0, -300.0, -10.0, 0.1, 50.0, 1000.0, 8000.0_f64,
            ] {
                let c0 = r * r / (2.0 * radius);
                let c1 = -1.0 + r * r / (2.0 * radius * radius);
                let full = column_per_area(c0, c1, c0, r * r, 1.0 / radius, 1.0 / radius, z);
                let ours = column(r * r, c0, c0, c1, 2.0 / radius, z);
                // where the two leading terms nearly cancel, their size is the measure
                let size = full.abs().max(0.5 * z * z / (r * (r * r + z * z)));
                let error = (ours - full).abs() / size;
                worst = worst.max(error);
                if z.abs() <= 1000.0 {
                    worst_low = worst_low.max(error);
                }
            }
        }
        println!("largest relative error of the walk's column: {worst:e}");
        assert!(worst < 3e-7, "{worst}");
        assert!(worst_low < 1e-7, "{worst_low}");
    }

    /// Node of a plane surface through the station against a fine sum of columns.
    #[test]
    fn plane_node_against_fine_sum() {
        let (slope, x0, s) = (0.4, 1000.0, 100.0);
        let n = 400;
        let step = s / f64::from(n);
        let mut sum = 0.0;
        for i in 0..n {
            for j in 0..n {
                let x = x0 - 0.5 * s + (f64::from(i) + 0.5) * step;
                let y = -0.5 * s + (f64::from(j) + 0.5) * step;
                sum += column(x * x + y * y, 0.0, 0.0, -1.0, 0.0, slope * x) * step * step;
            }
        }
        let q = s * s / 12.0;
        let mut lanes = Lanes {
            d2: [x0 * x0; LANES],
            c1: [-1.0; LANES],
            area: [s * s; LANES],
            dmd: [x0 * x0 * q; LANES],
            trace: [2.0 * q; LANES],
            dc: [x0 * slope * q; LANES],
            z: [slope * x0; LANES],
            var: [slope * slope * q; LANES],
            ..Lanes::default()
        };
        lanes.evaluate(1.0, 1.0);
        // second order: remainder of fourth order in 100 m / 1000 m
        assert_relative_eq!(lanes.value[3], sum, max_relative = 3e-6);
        assert!((lanes.value[3] - sum).abs() <= lanes.smooth_error[3]);
        // and without the second-order terms it is off by far more
        let bare = column(x0 * x0, 0.0, 0.0, -1.0, 0.0, slope * x0) * s * s;
        assert!((bare - sum).abs() > 100.0 * (lanes.value[3] - sum).abs());
    }
}
