//! The two entries of a pair of panels: the only place where rules are chosen and put to use.

use std::borrow::Cow;

use crate::geom::Vec3;
use crate::kernel::flat::Flat;
use crate::kernel::outer::{self, Effort};
use crate::kernel::regime::{self, Regime, regime};
use crate::kernel::{COULOMB, EPS0, batch, galerkin, moment, points, rectangles};

/// Two panels lie in one plane when no corner of the source is farther from the test panel's plane than this, as a
/// fraction of the sum of the radii. Rounding of coordinates stays below it, any gap that is meant stays above.
const COPLANAR: f64 = 1e-9;

/// Mean potential over `test` due to unit total charge density on `source`.
///
/// ```text
/// P = 1/A_test ∫_test ∫_source 1/(4π ε₀ r) dS dS'
/// ```
/// - `shift`: the source is displaced by this, m; zero but for images.
///
/// Returns V per C/m². `A_test P(test, source)` over the area of the source is symmetric to the accuracy of the rules.
///
/// # Accuracy
/// Relative error at most 1e-5, 1e-10 for near aligned rectangles; see [`regime`](mod@crate::kernel::regime).
#[must_use]
#[inline]
pub fn potential(test: &Flat, source: &Flat, shift: Vec3) -> f64 {
    let r = test.centroid - source.centroid - shift;
    let mean = match regime(test, source, r, &regime::POTENTIAL) {
        Regime::Far => moment::inverse_distance(test, source, r),
        Regime::Points(a, b) => points::inverse_distance(&test.points, &source.points, [a, b], r),
        Regime::Near => near_inverse(test, &at_its_place(source, shift)),
    };
    COULOMB * source.area * mean
}

/// Mean of 1/r over both panels when they are near each other.
fn near_inverse(test: &Flat, source: &Flat) -> f64 {
    let closed =
        rectangles::inverse_distance(test, source).or_else(|| galerkin::inverse_distance(test, source));
    closed.unwrap_or_else(|| {
        // The smaller panel is the outer one, whatever its part, so that the entry is symmetric.
        let (outer, inner) =
            if test.radius <= outer::TIE * source.radius { (test, source) } else { (source, test) };
        outer::mean(outer, inner, &Effort::POTENTIAL, |at| batch::inverse_distance(inner, at)) / inner.area
    })
}

/// Mean over `test` of the normal field, along the normal of `test`, due to unit total charge density on `source`; the
/// principal value where the source lies in the plane of the test panel, which is 0.
///
/// ```text
/// F = 1/A_test ∫_test E . n dS = -1/(4π ε₀ A_test) ∫_source Ω_test(y) dS(y)
/// ```
/// Ω > 0 on the side that the normal points to: charge behind the panel gives a positive flux.
///
/// - `shift`: the source is displaced by this, m; zero but for images.
///
/// Returns V/m per C/m².
///
/// # Accuracy
/// Error at most 2e-5 of the largest entry at that distance, 1 / (4 π ε₀ d²) times the area; see [`regime`](mod@crate::kernel::regime).
#[must_use]
#[inline]
pub fn flux(test: &Flat, source: &Flat, shift: Vec3) -> f64 {
    let r = test.centroid - source.centroid - shift;
    if in_one_plane(test, source, r) {
        return 0.0;
    }
    let mean = match regime(test, source, r, &regime::FLUX) {
        Regime::Far => moment::flux(test, source, r),
        Regime::Points(a, b) => points::flux(&test.points, &source.points, [a, b], r, test.normal),
        Regime::Near => near_flux(test, &at_its_place(source, shift)),
    };
    COULOMB * source.area * mean
}

/// Mean of n.r/r³ over both panels when they are near each other.
fn near_flux(test: &Flat, source: &Flat) -> f64 {
    rectangles::flux(test, source).unwrap_or_else(|| {
        -outer::mean(source, test, &Effort::FLUX, |at| batch::solid_angle(test, at)) / test.area
    })
}

/// Whether the source, whose centroid lies `r` before that of the test panel, lies in the plane of the test panel.
#[inline]
fn in_one_plane(test: &Flat, source: &Flat, r: Vec3) -> bool {
    let slack = COPLANAR * (test.radius + source.radius);
    if r.dot(&test.normal).abs() > slack {
        return false;
    }
    let height = |c: &[f64; 2]| (r - source.u * c[0] - source.v * c[1]).dot(&test.normal).abs();
    source.corners[..source.n_corners].iter().all(|c| height(c) <= slack)
}

/// The source displaced by `shift`; itself where there is nothing to displace.
fn at_its_place(source: &Flat, shift: Vec3) -> Cow<'_, Flat> {
    if shift == Vec3::zeros() { Cow::Borrowed(source) } else { Cow::Owned(source.displaced(shift)) }
}

/// Field of the surface's own charge on either side, per unit density: 1 / (2 ε₀), V/m per C/m². Not part of
/// [`flux()`], which is the principal value.
pub const OWN_SIDE: f64 = 0.5 / EPS0;
