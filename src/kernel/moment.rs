//! Two panels far apart: one term for their centres and one for the variance of position in both.
//!
//! The mean of 1/|R + δ| over both panels, with δ the difference of the places in them, needs to second order only
//! the sum of the two variances: the expansion of `Jackson1999`, section 4.1, for two distributions.

use crate::geom::Vec3;
use crate::kernel::flat::Flat;

/// Mean of 1/r over two panels whose centres differ by `r` (test minus source, m); 1/m.
///
/// ```text
/// 1/R + (3 R.M.R / R^2 - tr M) / (2 R^3),   M = sum of both variances
/// ```
#[must_use]
#[inline]
pub fn inverse_distance(test: &Flat, source: &Flat, r: Vec3) -> f64 {
    let inv2 = 1.0 / r.norm_squared();
    let inv = inv2.sqrt();
    let (_, quadratic, trace) = contract(test, source, r);
    inv * (1.0 + 0.5 * inv2 * (3.0 * quadratic * inv2 - trace))
}

/// Mean of n . r / r^3 over two panels, n the normal of the test panel; 1/m².
///
/// ```text
/// - n . grad of the above = n.R/R^3 (1 + (15/2 R.M.R/R^2 - 3/2 tr M) / R^2) - 3 n.M.R / R^5
/// ```
#[must_use]
#[inline]
pub fn flux(test: &Flat, source: &Flat, r: Vec3) -> f64 {
    let inv2 = 1.0 / r.norm_squared();
    let inv3 = inv2 * inv2.sqrt();
    let (m_r, quadratic, trace) = contract(test, source, r);
    let along = test.normal.dot(&r);
    inv3 * (along * (1.0 + inv2 * (7.5 * quadratic * inv2 - 1.5 * trace))
        - 3.0 * inv2 * test.normal.dot(&m_r))
}

/// M R, R.M.R and tr M.
#[inline]
fn contract(test: &Flat, source: &Flat, r: Vec3) -> (Vec3, f64, f64) {
    let (a, b) = (&test.variance, &source.variance);
    let m = [a[0] + b[0], a[1] + b[1], a[2] + b[2], a[3] + b[3], a[4] + b[4], a[5] + b[5]];
    let m_r = Vec3::new(
        m[0] * r.x + m[3] * r.y + m[4] * r.z,
        m[3] * r.x + m[1] * r.y + m[5] * r.z,
        m[4] * r.x + m[5] * r.y + m[2] * r.z,
    );
    (m_r, m_r.dot(&r), m[0] + m[1] + m[2])
}
