//! Charge that open interfaces carry beyond the end of their panelled extent.
//!
//! Far from the copper the charge induced on a layer that goes on to infinity is that of dipoles: its density falls as
//! 1/ρ³. The copper is modelled as a uniform layer of such dipoles over its rectangle, whose density outside is known in
//! closed form; its strength follows from the charge found on the panels of the outer ring, and the rest is integrated
//! (`docs/formulation.md`, "Open interfaces").

use crate::faces::Truncation;
use crate::kernel::quadrature::gauss;

/// The ring begins at this fraction of the way from the copper's edge to the end of the extent.
const RING: f64 = 0.5;

/// What the charge on the ring says about the charge beyond.
#[derive(Debug, Clone, Copy)]
pub(super) struct Tail<'a> {
    truncation: &'a Truncation,
    beyond: f64,
}

impl<'a> Tail<'a> {
    pub(super) fn new(truncation: &'a Truncation) -> Self {
        Tail { truncation, beyond: beyond(truncation) }
    }

    /// Whether a place, m, belongs to the ring.
    pub(super) fn in_ring(&self, x: f64, y: f64) -> bool {
        let t = self.truncation;
        let along = |k: usize, at: f64| {
            ((at - t.centre[k]).abs() - t.copper[k]) / (t.extent[k] - t.copper[k]).max(f64::MIN_POSITIVE)
        };
        along(0, x).max(along(1, y)) > RING
    }

    /// Density of the model at a place outside the copper, 1/m: ∫ dA / ρ³ over the copper.
    pub(super) fn model(&self, x: f64, y: f64) -> f64 {
        model(self.truncation, x, y)
    }

    /// Charge beyond the extent, C, when the ring holds `charge` (C) and the model has `modelled` (1/m · m²) there.
    pub(super) fn rest(&self, charge: f64, modelled: f64) -> f64 {
        if modelled > 0.0 { charge * self.beyond / modelled } else { 0.0 }
    }
}

/// ∫∫ dx dy / (x² + y²)^(3/2) = -r/(x y) over the copper's rectangle, seen from a place outside it; where the place is
/// in line with an edge, the singular parts of two corners cancel and the place is moved aside a little.
fn model(t: &Truncation, x: f64, y: f64) -> f64 {
    let aside = |d: f64, size: f64| if d.abs() < 1e-6 * size { 1e-6 * size } else { d };
    let size = t.extent[0].max(t.extent[1]);
    let corner = |sx: f64, sy: f64| {
        let dx = aside(t.centre[0] + sx * t.copper[0] - x, size);
        let dy = aside(t.centre[1] + sy * t.copper[1] - y, size);
        -dx.hypot(dy) / (dx * dy)
    };
    corner(1.0, 1.0) - corner(1.0, -1.0) - corner(-1.0, 1.0) + corner(-1.0, -1.0)
}

/// The model integrated over the plane outside the extent, in rectangles λ times the extent, u = 1/λ from 1 to 0:
/// `dA = λ dλ db e_x e_y = u⁻³ du db e_x e_y`, on which the density falls as u³.
fn beyond(t: &Truncation) -> f64 {
    const PIECES: usize = 8;
    let (nodes, weights) = gauss(6);
    let mut sum = 0.0;
    for piece_u in 0..PIECES {
        for piece_b in 0..PIECES {
            for (node_u, weight_u) in nodes.iter().zip(weights) {
                for (node_b, weight_b) in nodes.iter().zip(weights) {
                    let u = (piece_u as f64 + node_u) / PIECES as f64;
                    let b = 2.0 * (piece_b as f64 + node_b) / PIECES as f64 - 1.0;
                    let weight = 2.0 * weight_u * weight_b / (PIECES * PIECES) as f64;
                    for (bx, by) in [(1.0, b), (-1.0, b), (b, 1.0), (b, -1.0)] {
                        let (x, y) = (t.centre[0] + bx * t.extent[0] / u, t.centre[1] + by * t.extent[1] / u);
                        sum += weight * model(t, x, y) / (u * u * u);
                    }
                }
            }
        }
    }
    sum * t.extent[0] * t.extent[1]
}
