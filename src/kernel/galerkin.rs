//! Closed form of the double integral of 1/r over two panels in one plane or in parallel planes, of any shape; aligned
//! rectangles are [`rectangles`](mod@crate::kernel::rectangles).
//!
//! With 1/r the plane Laplacian of F = r - h ln(r + h), h the distance of the planes, the divergence theorem applied
//! once per panel leaves edges against edges (`docs/formulation.md`, "Panel integrals"; the idea is that of
//! `Arcioni1997`):
//!
//! ```text
//! ∫∫ 1/r dS dS' = - Σ_e Σ_e' (m . m') ∫∫ F dl dl'      m, m' the outward normals of the edges
//! ```

use crate::kernel::flat::Flat;

/// Largest (distance + both radii)^4 / (both areas) for which the closed form is used: its terms are of the order of
/// the fourth power of the distance, so it loses this factor of digits, ε 1e5 = 2e-11.
const MAX_LOSS: f64 = 1e5;

/// Edges are parallel or at right angles when the sine, or the cosine, of their angle is at most this.
const ALIGNED: f64 = 1e-12;

/// Smallest sine of the angle of two edges for which their lines are intersected: 1 / sine digits are lost.
const MIN_SINE: f64 = 0.02;

/// Mean of 1/r over both panels, 1/m, or `None` where the closed form does not apply or would lose digits: planes not
/// parallel, edges nearly but not quite parallel, parallel planes apart with edges at other than right angles, or
/// panels too far apart for their size.
#[must_use]
pub fn inverse_distance(one: &Flat, two: &Flat) -> Option<f64> {
    let sign = one.normal.dot(&two.normal);
    if one.normal.cross(&two.normal).norm() > ALIGNED {
        return None;
    }
    let offset = two.centroid - one.centroid;
    let reach = offset.norm() + one.radius + two.radius;
    if reach.powi(4) > MAX_LOSS * one.area * two.area {
        return None;
    }
    let height = offset.dot(&one.normal).abs();
    let height = if height <= ALIGNED * reach { 0.0 } else { height };
    let other = in_frame_of(one, two);
    let mut sum = 0.0;
    for k in 0..one.n_corners {
        let e = Segment::of(one, k);
        for other in &other[..two.n_corners] {
            let cosine = e.along[0] * other.along[0] + e.along[1] * other.along[1];
            // Both outward normals are the tangents turned the same way, or opposite ways for opposite normals.
            sum -= sign.signum() * cosine * e.against(other, height)?;
        }
    }
    Some(sum / (one.area * two.area))
}

/// An edge in the plane.
#[derive(Clone, Copy)]
struct Segment {
    from: [f64; 2],
    along: [f64; 2],
    length: f64,
}

/// The edges of `two`, in the frame of `one`.
fn in_frame_of(one: &Flat, two: &Flat) -> [Segment; 4] {
    std::array::from_fn(|k| {
        let [x, y, _] = one.local(two.global(two.corners[k][0], two.corners[k][1]));
        let t = two.u * two.tangents[k][0] + two.v * two.tangents[k][1];
        Segment { from: [x, y], along: [t.dot(&one.u), t.dot(&one.v)], length: two.lengths[k] }
    })
}

impl Segment {
    fn of(flat: &Flat, k: usize) -> Self {
        Segment { from: flat.corners[k], along: flat.tangents[k], length: flat.lengths[k] }
    }

    /// ∫∫ F over both segments, m³; any value where they are at right angles, since its factor vanishes.
    fn against(&self, other: &Segment, height: f64) -> Option<f64> {
        let sine = self.along[0] * other.along[1] - self.along[1] * other.along[0];
        let cosine = self.along[0] * other.along[0] + self.along[1] * other.along[1];
        let d = [other.from[0] - self.from[0], other.from[1] - self.from[1]];
        if cosine.abs() <= ALIGNED || self.length <= 0.0 || other.length <= 0.0 {
            return Some(0.0);
        }
        if sine.abs() <= ALIGNED {
            let p = self.along[0] * d[1] - self.along[1] * d[0];
            let start = self.along[0] * d[0] + self.along[1] * d[1];
            let end = start + other.length * cosine.signum();
            let (lo, hi) = (start.min(end), start.max(end));
            let twice = |u: f64| if height == 0.0 { twice_r(u, p) } else { twice_apart(u, p, height) };
            return Some(twice(self.length - lo) - twice(self.length - hi) - twice(-lo) + twice(-hi));
        }
        if height != 0.0 || sine.abs() < MIN_SINE {
            return None;
        }
        // Both lines from where they meet: r is homogeneous of degree 1 in s and t, so by Euler's theorem
        // 3 ∫∫ r ds dt is the flux of (s, t) r through the border of the rectangle of s and t.
        let s0 = -(d[0] * other.along[1] - d[1] * other.along[0]) / sine;
        let t0 = -(d[0] * self.along[1] - d[1] * self.along[0]) / sine;
        let (s1, t1) = (s0 + self.length, t0 + other.length);
        let line = |place: f64, from: f64, to: f64| {
            let (foot, gap) = (place * cosine, place * sine);
            once_r(to - foot, gap) - once_r(from - foot, gap)
        };
        Some(
            (s1 * line(s1, t0, t1) - s0 * line(s0, t0, t1) + t1 * line(t1, s0, s1) - t0 * line(t0, s0, s1))
                / 3.0,
        )
    }
}

/// asinh(u / d), 0 at d = 0 where its factor vanishes.
fn asinh_ratio(u: f64, d: f64) -> f64 {
    if d <= 0.0 { 0.0 } else { (u / d).asinh() }
}

/// Antiderivative in u of r = sqrt(u² + p²).
fn once_r(u: f64, p: f64) -> f64 {
    0.5 * (u * u.hypot(p) + p * p * asinh_ratio(u, p.abs()))
}

/// Second antiderivative in u of r = sqrt(u² + p²).
fn twice_r(u: f64, p: f64) -> f64 {
    let r2 = u * u + p * p;
    let r = r2.sqrt();
    r * r2 / 6.0 + 0.5 * p * p * (u * asinh_ratio(u, p.abs()) - r)
}

/// Second antiderivative in u of r - h ln(r + h), r = sqrt(u² + p² + h²), h > 0.
fn twice_apart(u: f64, p: f64, h: f64) -> f64 {
    let d2 = p * p + h * h;
    let r2 = u * u + d2;
    let r = r2.sqrt();
    let asinh = (u / d2.sqrt()).asinh();
    let log = (r + h).ln();
    // p (atan(u/p) - atan(u h / (p r))) = p atan(u p (r - h) / (p² r + u² h)), odd in u and even in p.
    let above = (u * u + p * p) / (r + h);
    let angle = if p == 0.0 { 0.0 } else { p * (u * p * above).atan2(p * p * r + u * u * h) };
    let once_log = u * log - u + h * asinh + angle;
    let twice_log = u * once_log - (0.5 * (r2 - h * h) * log - 0.25 * r2 + 0.5 * h * r);
    let twice_r = r * r2 / 6.0 + 0.5 * d2 * (u * asinh - r);
    twice_r - h * twice_log
}
