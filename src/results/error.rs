//! What can go wrong while a solution is read.

use miette::Diagnostic;
use thiserror::Error;

/// Why there are no results.
#[derive(Debug, Clone, PartialEq, Eq, Error, Diagnostic)]
#[non_exhaustive]
pub enum ResultsError {
    /// The caller: the charge belongs to another mesh.
    #[error("the charge has {found} densities, but the mesh has {expected} panels")]
    #[diagnostic(code(results::another_mesh), help("solve the system of the same mesh"))]
    AnotherMesh {
        /// Panels of the mesh.
        expected: usize,
        /// Rows of the solution.
        found: usize,
    },
    /// The content: floating nets whose potential nothing fixes.
    #[error("the potential of the floating nets {nets:?} is not determined by their charge")]
    #[diagnostic(
        code(results::undetermined_float),
        help("ground the net, or leave it out: it has no copper in the modelled region")
    )]
    UndeterminedFloat {
        /// Names of the floating nets.
        nets: Vec<String>,
    },
}
