//! Solid angle of a flat panel at a point: the flux of a unit charge there through the panel.
//!
//! One complex factor per edge, whose argument is the edge's share, and a single arctangent of their product: the
//! arctangents of `Wilton1984` with each difference taken in closed form, so that no digits are lost beside long
//! edges. The formula per triangle of `VanOosterom1983` is the oracle of the tests.

use crate::geom::Vec3;
use crate::kernel::flat::Flat;

/// A point as the corners of a panel see it.
#[derive(Debug, Clone, Copy)]
pub(crate) struct View {
    /// Height over the plane, m, on the side of the normal.
    pub(crate) height: f64,
    /// Corner k minus the point's foot, m, in the panel's frame.
    pub(crate) from: [[f64; 2]; 4],
    /// Distance to corner k, m.
    pub(crate) distance: [f64; 4],
}

/// An edge as a point sees it; letters as in `Wilton1984`.
#[derive(Debug, Clone, Copy)]
pub(crate) struct EdgeView {
    /// Distance of the point's foot from the edge's line, m, positive on the panel's side.
    pub(crate) p: f64,
    /// Coordinates of the ends along the edge, m.
    pub(crate) lo: f64,
    /// See `lo`.
    pub(crate) hi: f64,
    /// Distances to the ends, m.
    pub(crate) r_lo: f64,
    /// See `r_lo`.
    pub(crate) r_hi: f64,
    /// Squared distance to the edge's line, m².
    pub(crate) line2: f64,
}

impl View {
    /// The view of `at`, given in the panel's frame, m.
    #[inline]
    pub(crate) fn new(flat: &Flat, at: [f64; 3]) -> Self {
        let (mut from, mut distance) = ([[0.0; 2]; 4], [0.0; 4]);
        for k in 0..4 {
            from[k] = [flat.corners[k][0] - at[0], flat.corners[k][1] - at[1]];
            distance[k] = (from[k][0] * from[k][0] + from[k][1] * from[k][1] + at[2] * at[2]).sqrt();
        }
        View { height: at[2], from, distance }
    }

    /// Edge `k` of `flat`.
    #[inline]
    pub(crate) fn edge(&self, flat: &Flat, k: usize) -> EdgeView {
        let next = if k + 1 == flat.n_corners { 0 } else { k + 1 };
        let ([tx, ty], a, b) = (flat.tangents[k], self.from[k], self.from[next]);
        let p = a[0] * ty - a[1] * tx;
        EdgeView {
            p,
            lo: a[0] * tx + a[1] * ty,
            hi: b[0] * tx + b[1] * ty,
            r_lo: self.distance[k],
            r_hi: self.distance[next],
            line2: p * p + self.height * self.height,
        }
    }
}

/// Solid angle of a panel at a point.
///
/// ```text
/// Ω(x) = ∫ n . (x - y) / |x - y|^3 dS(y)      over the panel
/// ```
/// - `at`: field point in the panel's frame ([`Flat::local`]), m.
///
/// Returns sr, positive when the point is on the side that the normal points to, 0 on the plane itself (the principal
/// value), at most 2 π in size.
///
/// # Accuracy
/// Absolute error of a few ε, for aspect ratios to 1e6 too; checked against `VanOosterom1983` and by quadrature.
#[must_use]
pub fn solid_angle(flat: &Flat, at: [f64; 3]) -> f64 {
    angle_of_view(flat, &View::new(flat, at))
}

/// [`solid_angle`] of a view.
#[inline]
pub(crate) fn angle_of_view(flat: &Flat, view: &View) -> f64 {
    if view.height == 0.0 {
        return 0.0;
    }
    let h = view.height.abs();
    let (mut re, mut im, mut depth) = (1.0, 0.0, f64::INFINITY);
    for k in 0..flat.n_corners {
        let edge = view.edge(flat, k);
        depth = edge.p.min(depth);
        let (x, y) = share(&edge, h);
        let size = x.abs() + y.abs();
        if size > 0.0 {
            let inv = 1.0 / size;
            (re, im) = ((re * x - im * y) * inv, (re * y + im * x) * inv);
        }
    }
    // The sum of the arguments lies between 0 and 2 π: above π only when the foot lies inside, and above 1.8, that of
    // a disc of radius h, when the foot lies inside by more than h. Else a negative argument is 0 but for rounding.
    let angle = im.atan2(re);
    let turned = (angle < 0.0 && depth > 0.0 && h < flat.radius) || (angle < 0.5 && depth > h);
    let angle = if turned { angle + 2.0 * std::f64::consts::PI } else { angle.max(0.0) };
    angle.copysign(view.height)
}

/// Real and imaginary part of a number whose argument is the edge's share:
/// `atan(p hi / (line2 + h r_hi)) - atan(p lo / (line2 + h r_lo))`.
#[inline]
fn share(e: &EdgeView, h: f64) -> (f64, f64) {
    let (a_lo, a_hi) = (e.line2 + h * e.r_lo, e.line2 + h * e.r_hi);
    let length = e.hi - e.lo;
    // hi r_lo - lo r_hi, without its cancellation when both ends lie on one side.
    let crossed = if e.lo * e.hi > 0.0 {
        e.line2 * length * (e.lo + e.hi) / (e.hi * e.r_lo + e.lo * e.r_hi)
    } else {
        e.hi * e.r_lo - e.lo * e.r_hi
    };
    (a_lo * a_hi + e.p * e.p * e.lo * e.hi, e.p * (e.line2 * length + h * crossed))
}

/// Solid angle of a panel at a point of space, m: see [`solid_angle`].
#[must_use]
pub fn solid_angle_at(flat: &Flat, at: Vec3) -> f64 {
    solid_angle(flat, flat.local(at))
}
