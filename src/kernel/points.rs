//! Double integrals over two separate panels by product Gauss rules, with as few points along each direction as its length
//! asks for.
//!
//! Each panel keeps its points for every pair of counts that may be wanted. The sums run four lanes at a time, with vector
//! instructions where the machine has them.

use crate::geom::Vec3;
use crate::kernel::flat::bilinear;
use crate::kernel::quadrature::gauss;
use pulp::{Simd, WithSimd};

/// Counts of points along one direction that are kept.
pub const COUNTS: [usize; 5] = [1, 2, 3, 4, 6];
/// Pairs of counts, the longer direction having no fewer points than the shorter.
const N_RULES: usize = COUNTS.len() * (COUNTS.len() + 1) / 2;
/// Points are padded to a multiple of this, with weight 0.
const LANES: usize = 4;

/// How many points along the longer and along the shorter direction: places in [`COUNTS`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Rule(usize);

impl Rule {
    /// The rule with `COUNTS[longer]` points along the longer direction and `COUNTS[shorter]` along the other, which
    /// is at most as many.
    #[must_use]
    #[inline]
    pub fn new(longer: usize, shorter: usize) -> Self {
        Rule(longer * (longer + 1) / 2 + shorter.min(longer))
    }

    /// Number of points.
    #[must_use]
    #[inline]
    pub fn n_points(self) -> usize {
        SIZES[self.0]
    }

    #[inline(always)]
    fn n_padded(self) -> usize {
        SIZES[self.0].next_multiple_of(LANES)
    }

    /// Where the numbers of this rule are.
    #[inline(always)]
    fn range(self) -> std::ops::Range<usize> {
        4 * LANES * STARTS[self.0]..4 * LANES * STARTS[self.0 + 1]
    }
}

/// Points of each rule.
const SIZES: [usize; N_RULES] = {
    let mut sizes = [0; N_RULES];
    let mut longer = 0;
    while longer < COUNTS.len() {
        let mut shorter = 0;
        while shorter <= longer {
            sizes[longer * (longer + 1) / 2 + shorter] = COUNTS[longer] * COUNTS[shorter];
            shorter += 1;
        }
        longer += 1;
    }
    sizes
};

/// Where each rule begins, in lanes' worth of points, and where the last one ends.
const STARTS: [usize; N_RULES + 1] = {
    let mut starts = [0; N_RULES + 1];
    let mut k = 0;
    while k < N_RULES {
        starts[k + 1] = starts[k] + SIZES[k].div_ceil(LANES);
        k += 1;
    }
    starts
};

/// Points of a panel for every rule: for each in turn the places from the panel's centroid, x, y and z, m, and the weights;
/// the weights of a rule sum to 1.
#[derive(Debug, Clone)]
pub struct Points(Box<[f64]>);

impl Points {
    /// Points on the panel with these corners, m, in its frame `u`, `v`.
    #[must_use]
    pub fn new(corners: &[[f64; 2]; 4], u: Vec3, v: Vec3) -> Self {
        let mut all = vec![0.0; 4 * LANES * STARTS[N_RULES]];
        let side = |a: usize, b: usize| (corners[b][0] - corners[a][0]).hypot(corners[b][1] - corners[a][1]);
        let first_is_longer = side(0, 1).max(side(3, 2)) >= side(1, 2).max(side(0, 3));
        for longer in 0..COUNTS.len() {
            for shorter in 0..=longer {
                let (s, t) = if first_is_longer { (longer, shorter) } else { (shorter, longer) };
                let out = &mut all[Rule::new(longer, shorter).range()];
                fill(out, corners, [u, v], [COUNTS[s], COUNTS[t]]);
            }
        }
        Points(all.into_boxed_slice())
    }

    /// x, y, z and weight.
    #[inline(always)]
    fn of(&self, rule: Rule) -> [&[f64]; 4] {
        let (xy, zw) = self.0[rule.range()].split_at(2 * rule.n_padded());
        let ((x, y), (z, w)) = (xy.split_at(rule.n_padded()), zw.split_at(rule.n_padded()));
        [x, y, z, w]
    }
}

/// Product rule on the bilinear map of the unit square; a triangle is a quadrilateral with a repeated corner, whose
/// Jacobian takes one degree of exactness in one direction.
fn fill(out: &mut [f64], corners: &[[f64; 2]; 4], [u, v]: [Vec3; 2], [n_s, n_t]: [usize; 2]) {
    let ((s, ws), (t, wt)) = (gauss(n_s), gauss(n_t));
    let n_padded = out.len() / 4;
    let mut total = 0.0;
    for k in 0..n_padded {
        // Padding repeats the last point without weight.
        let point = k.min(n_s * n_t - 1);
        let (i, j) = (point / n_t, point % n_t);
        let (place, jacobian) = bilinear(corners, s[i], t[j]);
        let at = u * place[0] + v * place[1];
        let weight = if k == point { ws[i] * wt[j] * jacobian } else { 0.0 };
        total += weight;
        for (c, value) in [at.x, at.y, at.z, weight].into_iter().enumerate() {
            out[c * n_padded + k] = value;
        }
    }
    for w in &mut out[3 * n_padded..] {
        *w /= total;
    }
}

/// Mean of 1/r over two panels by these rules.
///
/// - `r`: centroid of the first minus that of the second, m.
#[must_use]
#[inline]
pub fn inverse_distance(one: &Points, two: &Points, rules: [Rule; 2], r: Vec3) -> f64 {
    pulp::Arch::new().dispatch(InverseDistance(Sum::new(one, two, rules, r)))
}

/// Mean of n . r / r³ over two panels by these rules, r from the second to the first.
///
/// - `r`: centroid of the first minus that of the second, m.
#[must_use]
#[inline]
pub fn flux(one: &Points, two: &Points, rules: [Rule; 2], r: Vec3, n: Vec3) -> f64 {
    let sum = Sum::new(one, two, rules, r);
    // The sum may have exchanged the panels, which turns every vector round.
    let n = if sum.exchanged { -n } else { n };
    pulp::Arch::new().dispatch(Flux(sum, [n.x, n.y, n.z]))
}

/// Points of one panel against points of the other, which has no fewer of them.
struct Sum<'a> {
    few: [&'a [f64]; 4],
    n_few: usize,
    many: [&'a [f64]; 4],
    /// Centroid of the first minus that of the second, m.
    r: [f64; 3],
    exchanged: bool,
}

impl<'a> Sum<'a> {
    #[inline(always)]
    fn new(one: &'a Points, two: &'a Points, [a, b]: [Rule; 2], r: Vec3) -> Self {
        if a.n_points() <= b.n_points() {
            Sum { few: one.of(a), n_few: a.n_points(), many: two.of(b), r: [r.x, r.y, r.z], exchanged: false }
        } else {
            Sum {
                few: two.of(b),
                n_few: b.n_points(),
                many: one.of(a),
                r: [-r.x, -r.y, -r.z],
                exchanged: true,
            }
        }
    }

    /// Weighted sum of 1/r or of n.r/r³; `n` is `None` for the former.
    #[inline(always)]
    fn run<S: Simd>(&self, simd: S, n: Option<[f64; 3]>) -> f64 {
        let lanes = |values: &'a [f64]| S::as_simd_f64s(values);
        let [(x, x_rest), (y, y_rest), (z, z_rest), (w, w_rest)] = self.many.map(lanes);
        let mut total = 0.0;
        for k in 0..self.n_few {
            let at: [f64; 3] = std::array::from_fn(|c| self.r[c] + self.few[c][k]);
            let splat = at.map(|c| simd.splat_f64s(c));
            let mut sum = simd.splat_f64s(0.0);
            for l in 0..x.len().min(y.len()).min(z.len()).min(w.len()) {
                let [dx, dy, dz] =
                    [(splat[0], x[l]), (splat[1], y[l]), (splat[2], z[l])].map(|(a, b)| simd.sub_f64s(a, b));
                let dot = |a: [S::f64s; 3]| {
                    let [ax, ay, az] = [(a[0], dx), (a[1], dy), (a[2], dz)].map(|(a, d)| simd.mul_f64s(a, d));
                    simd.add_f64s(simd.add_f64s(ax, ay), az)
                };
                let r2 = dot([dx, dy, dz]);
                let r = simd.sqrt_f64s(r2);
                let value = match n {
                    None => simd.div_f64s(w[l], r),
                    Some(n) => {
                        let along = dot(n.map(|c| simd.splat_f64s(c)));
                        simd.div_f64s(simd.mul_f64s(w[l], along), simd.mul_f64s(r2, r))
                    }
                };
                sum = simd.add_f64s(sum, value);
            }
            let mut sum = simd.reduce_sum_f64s(sum);
            // What is left where the machine's lanes are wider than the padding.
            for l in 0..x_rest.len() {
                let d = [at[0] - x_rest[l], at[1] - y_rest[l], at[2] - z_rest[l]];
                let r2 = d[0] * d[0] + d[1] * d[1] + d[2] * d[2];
                sum += w_rest[l]
                    * n.map_or(1.0 / r2.sqrt(), |n| {
                        (n[0] * d[0] + n[1] * d[1] + n[2] * d[2]) / (r2 * r2.sqrt())
                    });
            }
            total += self.few[3][k] * sum;
        }
        total
    }
}

struct InverseDistance<'a>(Sum<'a>);

impl WithSimd for InverseDistance<'_> {
    type Output = f64;

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) -> f64 {
        self.0.run(simd, None)
    }
}

struct Flux<'a>(Sum<'a>, [f64; 3]);

impl WithSimd for Flux<'_> {
    type Output = f64;

    #[inline(always)]
    fn with_simd<S: Simd>(self, simd: S) -> f64 {
        self.0.run(simd, Some(self.1))
    }
}
