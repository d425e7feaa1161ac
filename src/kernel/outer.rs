//! Mean over one panel of a function that another panel makes: graded product Gauss rules.
//!
//! The potential and the solid angle of a flat panel are analytic away from its edges, so a Gauss rule with n points
//! on a piece of half-length a errs by about ρ^(-2n), with ρ = (1 + sqrt(1 + q^2)) / q and q = a / (distance of the
//! nearest singularity in the complex plane of that direction): `Trefethen2013`, theorem 19.3. Along a line parallel to an
//! edge the edge is no singularity, only its ends are; at an angle, the distance grows by 1 / sin. Pieces with q too
//! large are halved in that direction alone, so that long thin panels need few pieces.

use crate::kernel::batch::Batch;
use crate::kernel::flat::{Flat, bilinear};
use crate::kernel::quadrature::gauss;

/// How accurate a mean has to be: largest q for one to six points. No round numbers; see [`Limits`](crate::kernel::regime::Limits).
#[derive(Debug, Clone, Copy)]
pub struct Effort {
    /// Entry n - 1: largest q that n points may meet.
    largest_q: [f64; 6],
    /// Halvings of a length that touches a singularity.
    halvings: i32,
    /// Most halvings of one panel in all.
    most: u32,
}

impl Effort {
    /// ρ^(-2n) of about 2e-5; for the potential, whose singularities at edges are weak (d ln d).
    pub const POTENTIAL: Effort = Effort {
        largest_q: [0.00807, 0.1213, 0.3117, 0.5217, 0.7317, 0.9023],
        halvings: 5,
        most: MOST_HALVINGS,
    };
    /// ρ^(-2n) of about 1e-5; for the solid angle, whose errors the row of a dense dielectric magnifies.
    pub const FLUX: Effort = Effort {
        largest_q: [0.00507, 0.1013, 0.2817, 0.4817, 0.6817, 0.8623],
        halvings: 6,
        most: MOST_HALVINGS,
    };
    /// ρ^(-2n) of about 1e-9; the measure for the other two.
    pub const REFERENCE: Effort =
        Effort { largest_q: [1e-5, 0.005, 0.04, 0.12, 0.24, 0.37], halvings: 18, most: u32::MAX };
}

/// Most halvings of one panel. Graded pieces towards an edge and its ends need a few dozen; touching triangles reach 1e-5
/// with 400 (`oracles::closed_double_integrals_are_those_of_quadrature`), not with 150. Only long thin triangles side by side
/// want more: halving goes depth first, so what is left of their error sits in the pieces that come last.
const MOST_HALVINGS: u32 = 400;

/// Lengths within this ratio count as equal, so that a choice between them does not depend on rounding.
pub(crate) const TIE: f64 = 1.0 + 1e-9;

/// An edge whose direction has a sine below this with a side runs along it. The sine of two directions that are the same but for rounding is
/// near 1e-16, and over a distance that is 0 but for rounding it would be noise.
const ALONG: f64 = 1e-9;

/// Mean over `outer` of a function that is analytic but at the edges of `inner`.
///
/// - `f`: weighted sum of the function over field points in the frame of `inner`, m.
pub fn mean(outer: &Flat, inner: &Flat, effort: &Effort, f: impl Fn(&Batch) -> f64) -> f64 {
    let mut corners = [[0.0; 3]; 4];
    let n = inner.n_corners;
    for (k, c) in corners.iter_mut().enumerate().take(n) {
        *c = outer.local(inner.global(inner.corners[k][0], inner.corners[k][1]));
    }
    let along = |t: [f64; 2]| {
        let d = inner.u * t[0] + inner.v * t[1];
        [d.dot(&outer.u), d.dot(&outer.v), d.dot(&outer.normal)]
    };
    let mut task = Task {
        halved: 0,
        points: Batch::default(),
        sum: 0.0,
        corners,
        tangents: inner.tangents.map(along),
        n,
        effort,
        shortest: [0.5f64.powi(effort.halvings) * inner.area / (2.0 * inner.radius); 2],
        origin: inner.local(outer.centroid),
        columns: [inner.local(inner.centroid + outer.u), inner.local(inner.centroid + outer.v)],
        f,
    };
    let patch = if outer.n_corners == 3 { task.turned_triangle(&outer.corners) } else { outer.corners };
    let sides = extents(&patch);
    for (shortest, side) in task.shortest.iter_mut().zip(sides) {
        // Between two halvings, so that rounding does not decide whether there is one more.
        *shortest = shortest.min(1.4 * side.0 * 0.5f64.powi(effort.halvings));
    }
    task.integrate(&patch);
    task.flush();
    task.sum / outer.area
}

struct Task<'a, F> {
    /// Halvings made so far.
    halved: u32,
    /// Points whose values are not in the sum yet.
    points: Batch,
    sum: f64,
    /// Corners of the inner panel in the frame of the outer one.
    corners: [[f64; 3]; 4],
    /// Its edges' directions there.
    tangents: [[f64; 3]; 4],
    n: usize,
    effort: &'a Effort,
    /// Half-lengths that are halved no more.
    shortest: [f64; 2],
    /// Maps the outer frame to the inner one.
    origin: [f64; 3],
    columns: [[f64; 3]; 2],
    f: F,
}

/// Half-length and unit direction along s and t of a patch.
fn extents(p: &[[f64; 2]; 4]) -> [(f64, [f64; 2]); 2] {
    let side = |a: [f64; 2], b: [f64; 2]| [b[0] - a[0], b[1] - a[1]];
    let pair = |e: [f64; 2], g: [f64; 2]| {
        let (x, y) = (e[0] + g[0], e[1] + g[1]);
        let norm = x.hypot(y).max(f64::MIN_POSITIVE);
        (0.5 * e[0].hypot(e[1]).max(g[0].hypot(g[1])), [x / norm, y / norm])
    };
    [pair(side(p[0], p[1]), side(p[3], p[2])), pair(side(p[0], p[3]), side(p[1], p[2]))]
}

impl<F: Fn(&Batch) -> f64> Task<'_, F> {
    /// A triangle as a quadrilateral with a repeated corner, so turned that lines of constant t run along the edge that
    /// touches the inner panel, or shrink to the only corner that does.
    fn turned_triangle(&self, corners: &[[f64; 2]; 4]) -> [[f64; 2]; 4] {
        let nearest = |at: [f64; 2]| {
            let edges = (0..self.n)
                .map(|k| segment_distance(&self.corners[k], &self.corners[(k + 1) % self.n], at, at));
            edges.fold(f64::INFINITY, f64::min)
        };
        let far = [0, 1, 2].map(|k| nearest(corners[k]));
        let touching = 1e-6 * (far[0] + far[1] + far[2]);
        let apex = match [0, 1, 2].map(|k| far[k] <= touching) {
            [true, false, false] => 0,
            [false, true, false] => 1,
            [false, false, true] => 2,
            _ if TIE * far[0] >= far[1] && TIE * far[0] >= far[2] => 0,
            _ if TIE * far[1] >= far[2] => 1,
            _ => 2,
        };
        let [a, b, c] = [1, 2, 0].map(|k| corners[(apex + k) % 3]);
        [a, b, c, c]
    }

    fn integrate(&mut self, patch: &[[f64; 2]; 4]) {
        let sides = extents(patch);
        let q = self.sharpness(patch, &sides);
        let may = [sides[0].0 > self.shortest[0], sides[1].0 > self.shortest[1]];
        let most = self.effort.largest_q[5];
        let worst =
            usize::from(q[1] * f64::from(u8::from(may[1])) > TIE * q[0] * f64::from(u8::from(may[0])));
        if q[worst] > most && may[worst] && self.halved < self.effort.most {
            self.halved += 1;
            let (one, two) = halves(patch, worst);
            self.integrate(&one);
            self.integrate(&two);
            return;
        }
        let effort = self.effort;
        let count = |q: f64| 1 + effort.largest_q[..5].iter().take_while(|most| **most < q).count();
        self.product(patch, count(q[0]), count(q[1]));
    }

    /// Adds the waiting points to the sum.
    fn flush(&mut self) {
        if !self.points.is_empty() {
            self.sum += (self.f)(&self.points);
            self.points.clear();
        }
    }

    /// q along s and along t.
    fn sharpness(&self, patch: &[[f64; 2]; 4], sides: &[(f64, [f64; 2]); 2]) -> [f64; 2] {
        let axis = sides[0].1;
        let turn = |x: f64, y: f64| [x * axis[0] + y * axis[1], y * axis[0] - x * axis[1]];
        let first = turn(patch[0][0], patch[0][1]);
        let (mut lo, mut hi) = (first, first);
        for c in &patch[1..] {
            let c = turn(c[0], c[1]);
            for k in 0..2 {
                lo[k] = lo[k].min(c[k]);
                hi[k] = hi[k].max(c[k]);
            }
        }
        let seen: [[f64; 3]; 4] = std::array::from_fn(|k| {
            let [x, y] = turn(self.corners[k][0], self.corners[k][1]);
            [x, y, self.corners[k][2]]
        });
        let mut q: [f64; 2] = [0.0; 2];
        for k in 0..self.n {
            let next = (k + 1) % self.n;
            let at_corner = norm(gap(&seen[k], lo, hi));
            let at_edge = segment_distance(&seen[k], &seen[next], lo, hi);
            let e = self.tangents[k];
            for d in 0..2 {
                let (a, t) = sides[d];
                let across = t[0] * e[1] - t[1] * e[0];
                let sine = (across * across + e[2] * e[2]).sqrt();
                let sine = if sine <= ALONG { 0.0 } else { sine };
                q[d] = q[d].max(a / at_corner).max(a * sine / at_edge);
            }
        }
        q
    }

    fn product(&mut self, patch: &[[f64; 2]; 4], n_s: usize, n_t: usize) {
        let ((s, ws), (t, wt)) = (gauss(n_s), gauss(n_t));
        for i in 0..n_s {
            for j in 0..n_t {
                let ([x, y], jacobian) = bilinear(patch, s[i], t[j]);
                let at =
                    std::array::from_fn(|k| self.origin[k] + self.columns[0][k] * x + self.columns[1][k] * y);
                if self.points.push(at, ws[i] * wt[j] * jacobian) {
                    self.flush();
                }
            }
        }
    }
}

/// From the box `lo` to `hi` in the plane z = 0 to a point; zero inside.
fn gap(at: &[f64; 3], lo: [f64; 2], hi: [f64; 2]) -> [f64; 3] {
    [at[0] - at[0].clamp(lo[0], hi[0]), at[1] - at[1].clamp(lo[1], hi[1]), at[2]]
}

fn norm(g: [f64; 3]) -> f64 {
    (g[0] * g[0] + g[1] * g[1] + g[2] * g[2]).sqrt().max(f64::MIN_POSITIVE)
}

/// Distance of the segment from `a` to `b` and the box. Its square is convex and piecewise quadratic along the segment,
/// so Newton's method on the slope, kept in its bracket, ends after a step or two per piece.
fn segment_distance(a: &[f64; 3], b: &[f64; 3], lo: [f64; 2], hi: [f64; 2]) -> f64 {
    let d = [b[0] - a[0], b[1] - a[1], b[2] - a[2]];
    let at = |s: f64| [a[0] + s * d[0], a[1] + s * d[1], a[2] + s * d[2]];
    let slope = |s: f64| {
        let g = gap(&at(s), lo, hi);
        let curvature: f64 = (0..3).filter(|k| g[*k] != 0.0).map(|k| d[k] * d[k]).sum();
        (g[0] * d[0] + g[1] * d[1] + g[2] * d[2], curvature)
    };
    if slope(0.0).0 >= 0.0 {
        return norm(gap(a, lo, hi));
    }
    if slope(1.0).0 <= 0.0 {
        return norm(gap(b, lo, hi));
    }
    let (mut from, mut to, mut s) = (0.0, 1.0, 0.5);
    for _ in 0..6 {
        let (rise, curvature) = slope(s);
        if rise == 0.0 {
            break;
        }
        if rise > 0.0 {
            to = s
        } else {
            from = s
        }
        let newton = s - rise / curvature;
        s = if newton > from && newton < to { newton } else { 0.5 * (from + to) };
    }
    norm(gap(&at(s), lo, hi))
}

/// The patch halved across direction `side`: 0 for s, 1 for t.
fn halves(p: &[[f64; 2]; 4], side: usize) -> ([[f64; 2]; 4], [[f64; 2]; 4]) {
    let mid = |a: [f64; 2], b: [f64; 2]| [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
    if side == 0 {
        let (low, high) = (mid(p[0], p[1]), mid(p[3], p[2]));
        ([p[0], low, high, p[3]], [low, p[1], p[2], high])
    } else {
        let (left, right) = (mid(p[0], p[3]), mid(p[1], p[2]));
        ([p[0], p[1], right, left], [left, right, p[2], p[3]])
    }
}
