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
    /// Four by four points on each panel.
    Finest,
    /// Three by three points on each panel.
    Fine,
    /// Two by two points on each panel.
    Coarse,
    /// Centres and variances.
    Far,
}

/// Largest x² of the four cheap regimes.
#[derive(Debug, Clone, Copy)]
pub struct Limits {
    finest: f64,
    fine: f64,
    coarse: f64,
    far: f64,
}

/// Limits for the potential: relative error at most 1e-5, measured over squares, triangles, trapezoids and rectangles
/// of aspect 10, in size ratios up to 3 and all orientations (`oracles::regimes_meet_their_limits`).
pub const POTENTIAL: Limits = Limits { finest: 0.2, fine: 0.08, coarse: 0.007, far: 0.003 };

/// Limits for the flux: error at most 2e-5 of A / (4 π ε₀ d²), which a face-to-face pair would have; over the same shapes.
pub const FLUX: Limits = Limits { finest: 0.15, fine: 0.06, coarse: 0.005, far: 0.002 };

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
    } else if size2 < limits.finest * d2 {
        Regime::Finest
    } else {
        Regime::Near
    }
}
