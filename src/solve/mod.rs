//! [`System`] to [`Charge`]: total charge density per panel and excitation.

pub mod direct;
mod error;

pub use direct::Factor;
pub use error::SolveError;

use crate::net::NetId;
use crate::system::System;
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
    /// Largest of |b - A x| over |b|, over the excitations; estimated from random projections by the dense solver.
    pub relative_residual: f64,
}

/// Largest relative residual of a dense solution that is believed. Rounding leaves about ε times the growth of the
/// factors and the square root of the number of panels: 1e-13 on every mesh measured. A thousandth of the finest
/// accuracy target that makes sense, 1e-6, leaves room for both.
pub const MAX_RESIDUAL: f64 = 1e-9;

/// Solves by dense LU, in the memory of the system's own matrix.
///
/// # Errors
/// Those of [`solve_and_keep`].
pub fn solve_dense(system: System) -> Result<Charge, SolveError> {
    solve_and_keep(system).map(|(charge, _)| charge)
}

/// As [`solve_dense`], and keeps the factors for further right-hand sides and for the transposed system.
///
/// # Errors
/// - [`SolveError::Singular`] when there is no finite solution.
/// - [`SolveError::Inaccurate`] when the residual is above [`MAX_RESIDUAL`].
pub fn solve_and_keep(system: System) -> Result<(Charge, Factor), SolveError> {
    let System { matrix, right_sides, excited, .. } = system;
    let panels = matrix.nrows();
    let factor = Factor::new(matrix)?;
    let density = factor.solve(right_sides.as_ref());
    let info = factor.info(right_sides.as_ref(), density.as_ref());
    let residual = info.relative_residual;
    if residual.is_nan() {
        return Err(SolveError::Singular { panels });
    }
    if residual > MAX_RESIDUAL {
        return Err(SolveError::Inaccurate { panels, residual, limit: MAX_RESIDUAL });
    }
    Ok((Charge { density, excited, info }, factor))
}
