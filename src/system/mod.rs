//! [`Mesh`](crate::mesh::Mesh) to [`System`]: one row per panel, the physics of `docs/formulation.md`.

use faer::Mat;

/// The linear system for the total charge density.
#[derive(Debug, Clone)]
pub struct System {
    /// `n_panels × n_panels`; row = field panel, column = source panel. Rows are scaled so that the diagonal is near 1.
    pub matrix: Mat<f64>,
    /// `n_panels × n_excited`: column k is the right-hand side with net `excited[k]` at 1 V and every other at 0 V.
    pub right_sides: Mat<f64>,
    /// Nets that get a right-hand side: rows and floating nets, by net id.
    pub excited: Vec<crate::net::NetId>,
}
