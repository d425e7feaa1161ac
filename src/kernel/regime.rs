//! The one criterion by which a pair of panels is integrated.
//!
//! All rules but the near one err by a power of x, with `x² = (R_t² + R_s²) / d²`, R the radii of both panels (greatest
//! distance from the centroid) and d the distance of the centroids.

use crate::geom::Vec3;
use crate::kernel::flat::Flat;

/// How a pair is integrated, from dear to cheap.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Regime {
    /// Closed form over one panel, graded Gauss rule or closed form over the other: touching and near pairs.
    Near,
    /// Three by three points on each panel.
    Fine,
    /// Two by two points on each panel.
    Coarse,
    /// Centres and variances.
    Far,
}

/// Largest x² of the three cheap regimes.
#[derive(Debug, Clone, Copy)]
pub struct Limits {
    fine: f64,
    coarse: f64,
    far: f64,
}

/// Limits for the potential: relative error at most 1e-6, measured over squares, triangles, trapezoids and rectangles
/// of aspect 10, in size ratios up to 3 and all orientations (`oracles::regimes_meet_their_limits`).
pub const POTENTIAL: Limits = Limits { fine: 0.04, coarse: 0.0015, far: 0.0006 };

/// Limits for the flux: error at most 4e-6 of A / (4 π ε₀ d²), which a face-to-face pair would have; over the same shapes.
pub const FLUX: Limits = Limits { fine: 0.025, coarse: 0.001, far: 0.0004 };

/// The regime of a pair whose centroids differ by `r`, m.
#[must_use]
#[inline]
pub fn regime(test: &Flat, source: &Flat, r: Vec3, limits: &Limits) -> Regime {
    let size2 = test.radius * test.radius + source.radius * source.radius;
    let d2 = r.norm_squared();
    if size2 < limits.far * d2 {
        Regime::Far
    } else if size2 < limits.coarse * d2 {
        Regime::Coarse
    } else if size2 < limits.fine * d2 {
        Regime::Fine
    } else {
        Regime::Near
    }
}
