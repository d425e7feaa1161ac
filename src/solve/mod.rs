//! [`System`](crate::system::System) to [`Charge`]: total charge density per panel and excitation.

use crate::net::NetId;
use faer::Mat;

/// What the solver found.
#[derive(Debug, Clone)]
pub struct Charge {
    /// `n_panels × n_excited`, C/m² per V: total charge density with net `excited[k]` at 1 V, every other net at 0 V.
    pub density: Mat<f64>,
    /// Which nets: as in the system.
    pub excited: Vec<NetId>,
    /// How well it was solved.
    pub info: SolveInfo,
}

/// How well a system was solved.
#[derive(Debug, Clone, PartialEq)]
pub struct SolveInfo {
    /// For people and for the report: "dense LU".
    pub method: String,
    /// Largest of |b - A x| over |b|, over the excitations.
    pub relative_residual: f64,
}
