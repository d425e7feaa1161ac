//! Closed forms of one panel at several field points at once, with vector instructions where the machine has them.
//!
//! The same formulas as [`potential`](mod@crate::kernel::potential) and [`flux`](mod@crate::kernel::flux), which hold the
//! explanations, written without branches and run edge by edge over lanes. Which instructions there are is found out when
//! the program runs; sums are the same on all of them, since nothing is fused or reordered.

use crate::kernel::Flat;
use crate::kernel::lanes::{atan2, ln_1p};
use pulp::{Simd, WithSimd};
use std::f64::consts::PI;

/// Points of a batch.
pub const LANES: usize = 16;

type Lane = [f64; LANES];

/// Field points with weights.
#[derive(Debug, Clone, Copy)]
pub struct Batch {
    /// Two in-plane coordinates and the height, m, in the frame of the panel whose charge is felt.
    place: [Lane; 3],
    /// 0 beyond the last point.
    weight: Lane,
    n_points: usize,
}

impl Default for Batch {
    fn default() -> Self {
        Batch { place: [[0.0; LANES]; 3], weight: [0.0; LANES], n_points: 0 }
    }
}

impl Batch {
    /// Adds a point, m, unless the batch is full; whether it is full now.
    #[inline]
    pub fn push(&mut self, at: [f64; 3], weight: f64) -> bool {
        if self.n_points < LANES {
            for (lane, x) in self.place.iter_mut().zip(at) {
                lane[self.n_points] = x;
            }
            self.weight[self.n_points] = weight;
            self.n_points += 1;
        }
        self.n_points == LANES
    }

    /// Forgets all points.
    #[inline]
    pub fn clear(&mut self) {
        self.weight = [0.0; LANES];
        self.n_points = 0;
    }

    /// Whether there is no point.
    #[must_use]
    #[inline]
    pub fn is_empty(&self) -> bool {
        self.n_points == 0
    }

    #[inline(always)]
    fn dot(&self, value: &Lane) -> f64 {
        let mut sum = 0.0;
        for (w, v) in self.weight.iter().zip(value) {
            sum += w * v;
        }
        sum
    }

    /// Weighted sum of a function of the place, one point at a time.
    #[must_use]
    pub fn sum(&self, f: impl Fn([f64; 3]) -> f64) -> f64 {
        (0..self.n_points).map(|l| self.weight[l] * f(self.place.map(|lane| lane[l]))).sum()
    }
}

/// Weighted sum of [`potential::inverse_distance`](crate::kernel::potential::inverse_distance) over the points, m times
/// the weight's unit. Same value to 1e-12 of the perimeter; see `oracles`.
#[must_use]
pub fn inverse_distance(flat: &Flat, points: &Batch) -> f64 {
    pulp::Arch::new().dispatch(InverseDistance(flat, points))
}

/// Weighted sum of [`flux::solid_angle`](crate::kernel::flux::solid_angle()) over the points, sr times the weight's unit. Same
/// value to 1e-12; see `oracles`.
#[must_use]
pub fn solid_angle(flat: &Flat, points: &Batch) -> f64 {
    pulp::Arch::new().dispatch(SolidAngle(flat, points))
}

struct InverseDistance<'a>(&'a Flat, &'a Batch);

impl WithSimd for InverseDistance<'_> {
    type Output = f64;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) -> f64 {
        let InverseDistance(flat, points) = self;
        let mut view = View::new(flat, points);
        let mut value = [0.0; LANES];
        for k in 0..flat.n_corners {
            let edge = Edge::new(flat, k);
            for (l, value) in value.iter_mut().enumerate() {
                *value += view.see(&edge, l).logarithm();
            }
        }
        for (l, value) in value.iter_mut().enumerate() {
            *value -= view.height[l] * view.angle(flat.radius, l);
        }
        points.dot(&value)
    }
}

struct SolidAngle<'a>(&'a Flat, &'a Batch);

impl WithSimd for SolidAngle<'_> {
    type Output = f64;

    #[inline(always)]
    fn with_simd<S: Simd>(self, _: S) -> f64 {
        let SolidAngle(flat, points) = self;
        let mut view = View::new(flat, points);
        for k in 0..flat.n_corners {
            let edge = Edge::new(flat, k);
            for l in 0..LANES {
                view.see(&edge, l);
            }
        }
        let mut value = [0.0; LANES];
        for (l, value) in value.iter_mut().enumerate() {
            *value = view.angle(flat.radius, l);
        }
        points.dot(&value)
    }
}

/// An edge of the panel, from corner `k` to corner `next`.
struct Edge {
    k: usize,
    next: usize,
    tangent: [f64; 2],
    length: f64,
}

impl Edge {
    #[inline(always)]
    fn new(flat: &Flat, k: usize) -> Self {
        let next = if k + 1 == flat.n_corners { 0 } else { k + 1 };
        Edge { k, next, tangent: flat.tangents[k], length: flat.lengths[k] }
    }
}

/// What the points see of the corners, and the product of the edges seen so far.
struct View {
    /// On the side of the normal, m.
    height: Lane,
    from: [[Lane; 2]; 4],
    distance: [Lane; 4],
    re: Lane,
    im: Lane,
    /// Smallest distance of the foot from an edge's line, m, positive inside.
    depth: Lane,
}

/// An edge as one point sees it; letters as in [`EdgeView`](crate::kernel::flux::EdgeView).
struct Seen {
    p: f64,
    lo: f64,
    hi: f64,
    r_lo: f64,
    r_hi: f64,
    line2: f64,
    length: f64,
}

impl View {
    #[inline(always)]
    fn new(flat: &Flat, points: &Batch) -> Self {
        let [x, y, z] = &points.place;
        let (mut from, mut distance) = ([[[0.0; LANES]; 2]; 4], [[0.0; LANES]; 4]);
        for k in 0..4 {
            for l in 0..LANES {
                let (dx, dy) = (flat.corners[k][0] - x[l], flat.corners[k][1] - y[l]);
                from[k][0][l] = dx;
                from[k][1][l] = dy;
                distance[k][l] = (dx * dx + dy * dy + z[l] * z[l]).sqrt();
            }
        }
        let (re, im, depth) = ([1.0; LANES], [0.0; LANES], [f64::INFINITY; LANES]);
        View { height: *z, from, distance, re, im, depth }
    }

    /// The edge as point `l` sees it, after its factor is multiplied into the product.
    #[inline(always)]
    fn see(&mut self, edge: &Edge, l: usize) -> Seen {
        let ([tx, ty], length) = (edge.tangent, edge.length);
        let [ax, ay] = [self.from[edge.k][0][l], self.from[edge.k][1][l]];
        let [bx, by] = [self.from[edge.next][0][l], self.from[edge.next][1][l]];
        let (r_lo, r_hi, h) = (self.distance[edge.k][l], self.distance[edge.next][l], self.height[l].abs());
        let p = ax * ty - ay * tx;
        let (lo, hi) = (ax * tx + ay * ty, bx * tx + by * ty);
        let line2 = p * p + h * h;
        let (a_lo, a_hi) = (line2 + h * r_lo, line2 + h * r_hi);
        let one_side = lo * hi > 0.0;
        let level = if one_side { hi * r_lo + lo * r_hi } else { 1.0 };
        let crossed = if one_side { line2 * length * (lo + hi) / level } else { hi * r_lo - lo * r_hi };
        let (x, y) = (a_lo * a_hi + p * p * lo * hi, p * (line2 * length + h * crossed));
        let size = x.abs() + y.abs();
        let on_corner = size <= 0.0;
        let inverse = 1.0 / if on_corner { 1.0 } else { size };
        let (x, y) = (if on_corner { 1.0 } else { x * inverse }, y * inverse);
        let (re, im) = (self.re[l], self.im[l]);
        self.re[l] = re * x - im * y;
        self.im[l] = re * y + im * x;
        self.depth[l] = if p < self.depth[l] { p } else { self.depth[l] };
        Seen { p, lo, hi, r_lo, r_hi, line2, length }
    }

    /// Solid angle at point `l`, with the turn that the argument of a product leaves out.
    #[inline(always)]
    fn angle(&self, radius: f64, l: usize) -> f64 {
        let (h, depth) = (self.height[l].abs(), self.depth[l]);
        let angle = atan2(self.im[l], self.re[l]);
        let turned = ((angle < 0.0) & (depth > 0.0) & (h < radius)) | ((angle < 0.5) & (depth > h));
        let unturned = if angle > 0.0 { angle } else { 0.0 };
        let angle = if turned { angle + 2.0 * PI } else { unturned };
        let signed = angle.copysign(self.height[l]);
        if h > 0.0 { signed } else { 0.0 }
    }
}

impl Seen {
    /// `p ln((r_hi + hi) / (r_lo + lo))`, m.
    #[inline(always)]
    fn logarithm(&self) -> f64 {
        let Seen { p, lo, hi, r_lo, r_hi, line2, length } = *self;
        let before = if lo >= 0.0 { r_lo + lo } else { line2 / (r_lo + lo.abs()) };
        let after = if hi <= 0.0 { r_hi - hi } else { line2 / (r_hi + hi.abs()) };
        let gap = before + after;
        let on_line = gap <= f64::MIN_POSITIVE;
        let value = p * ln_1p(2.0 * length / if on_line { 1.0 } else { gap });
        if on_line { 0.0 } else { value }
    }
}
