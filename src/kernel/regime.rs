//! The one criterion by which a pair of panels is integrated.
//!
//! Far panels go by their radii; what is nearer, by how long each of the four directions is against the distance of the
//! panels: a Gauss rule with n points on a piece of half-length a errs by about ρ^(-2n), with ρ = (1 + sqrt(1 + q²)) / q and
//! q = a / (distance of the nearest singularity): `Trefethen2013`, theorem 19.3. No singularity is nearer than the panels
//! themselves.

use crate::geom::Vec3;
use crate::kernel::flat::Flat;
use crate::kernel::points::{COUNTS, Rule};

/// How a pair is integrated, from dear to cheap.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Regime {
    /// Closed form over one panel, graded Gauss rule or closed form over the other: touching and near pairs.
    Near,
    /// Gauss points on either panel: the rules of the test panel and of the source.
    Points(Rule, Rule),
    /// Centres and variances.
    Far,
}

/// Where the cheaper rules begin. No limit is a round number, which regular meshes would meet to the last bit: then a turn of the
/// body, which changes that bit, would change the rule.
#[derive(Debug, Clone, Copy)]
pub struct Limits {
    /// Largest `(R_t² + R_s²) / d²` of a far pair; R the radii (greatest distance from the centroid), d the distance of
    /// the centroids.
    far: f64,
    /// Largest q that each of [`COUNTS`] may meet.
    largest_q: [f64; COUNTS.len()],
}

/// Limits for the potential: relative error at most 1e-5, measured over squares, triangles, trapezoids and rectangles
/// of aspect 10 and 100, in size ratios up to 3 and all orientations (`oracles::regimes_meet_their_limits`).
pub const POTENTIAL: Limits = Limits { far: 0.00297, largest_q: [0.00607, 0.1013, 0.2817, 0.4817, 0.8623] };

/// Limits for the flux: error at most 2e-5 of A / (4 π ε₀ d²), which a face-to-face pair would have; over the same shapes.
pub const FLUX: Limits = Limits { far: 0.00197, largest_q: [0.00283, 0.0653, 0.2217, 0.4117, 0.7823] };

/// The regime of a pair whose centroids differ by `r` (test minus source), m.
#[must_use]
#[inline]
pub fn regime(test: &Flat, source: &Flat, r: Vec3, limits: &Limits) -> Regime {
    let d2 = r.norm_squared();
    if test.radius * test.radius + source.radius * source.radius < limits.far * d2 {
        return Regime::Far;
    }
    let rules = |distance: f64| Some((limits.rule(test, distance)?, limits.rule(source, distance)?));
    let by_spheres = rules(d2.sqrt() - test.radius - source.radius);
    if let Some((one, two)) = by_spheres
        && one.n_points() * two.n_points() <= CHEAP
    {
        return Regime::Points(one, two);
    }
    rules(distance_at_least(test, source, r))
        .or(by_spheres)
        .map_or(Regime::Near, |(one, two)| Regime::Points(one, two))
}

/// Pairs of points up to which it is not worth the while to find out whether fewer would do.
const CHEAP: usize = 16;

impl Limits {
    /// Points that a panel needs at this distance from the other, m; `None` when more than there are.
    #[inline]
    fn rule(&self, flat: &Flat, distance: f64) -> Option<Rule> {
        let place = |a: f64| self.largest_q.iter().position(|q| a <= q * distance);
        Some(Rule::new(place(flat.half_sides[0])?, place(flat.half_sides[1])?))
    }
}

/// Lower bound of the distance of two panels, m: the widest gap between them along the axes of either frame. At most 0
/// where they may touch.
#[inline]
fn distance_at_least(test: &Flat, source: &Flat, r: Vec3) -> f64 {
    let t = [test.u, test.v, test.normal];
    let s = [source.u, source.v, source.normal];
    let (a, b) = (test.half_widths, source.half_widths);
    let dots = t.map(|t| s.map(|s| t.dot(&s).abs()));
    let mut widest = 0.0;
    for k in 0..3 {
        let by_test = r.dot(&t[k]).abs() - a[k] - (b[0] * dots[k][0] + b[1] * dots[k][1]);
        let by_source = r.dot(&s[k]).abs() - b[k] - (a[0] * dots[0][k] + a[1] * dots[1][k]);
        widest = by_test.max(by_source).max(widest);
    }
    widest
}
