//! Integral of 1/r over a flat panel, seen from a point: the potential of a uniform charge but for 1/(4 π ε₀).

use crate::geom::Vec3;
use crate::kernel::flat::Flat;
use crate::kernel::flux::{EdgeView, View, angle_of_view};

/// Integral of 1/r over a panel.
///
/// ```text
/// I(x) = ∫ dS(y) / |x - y|  =  Σ_edges p ln((r_hi + hi) / (r_lo + lo))  -  h Ω(x)
/// ```
/// Closed form, one logarithm per edge: `Wilton1984`, eq. (5). The logarithm is taken of
/// `1 + 2 L / ((r_lo + lo) + (r_hi - hi))`, each bracket free of cancellation.
///
/// - `at`: field point in the panel's frame ([`Flat::local`]), m; may lie on the panel, an edge or an edge's line.
///
/// Returns m; finite everywhere.
///
/// # Accuracy
/// Absolute error of a few ε times the panel's perimeter, hence relative error of about ε (distance / width);
/// checked by quadrature to aspect 1e6.
#[must_use]
pub fn inverse_distance(flat: &Flat, at: [f64; 3]) -> f64 {
    let view = View::new(flat, at);
    let mut sum = -view.height * angle_of_view(flat, &view);
    for k in 0..flat.n_corners {
        let edge = view.edge(flat, k);
        sum += edge.p * log_ratio(&edge);
    }
    sum
}

/// `ln((r_hi + hi) / (r_lo + lo))`; 0 where it is infinite, since its factor p vanishes there.
#[inline]
fn log_ratio(e: &EdgeView) -> f64 {
    let before = if e.lo >= 0.0 { e.r_lo + e.lo } else { e.line2 / (e.r_lo - e.lo) };
    let after = if e.hi <= 0.0 { e.r_hi - e.hi } else { e.line2 / (e.r_hi + e.hi) };
    let gap = before + after;
    if gap <= f64::MIN_POSITIVE {
        return 0.0;
    }
    let x = 2.0 * (e.hi - e.lo) / gap;
    // The plain logarithm is faster; its rounding matters only when x is small.
    if x > 0.5 { (1.0 + x).ln() } else { x.ln_1p() }
}

/// [`inverse_distance`] at a point of space, m.
#[must_use]
pub fn inverse_distance_at(flat: &Flat, at: Vec3) -> f64 {
    inverse_distance(flat, flat.local(at))
}
