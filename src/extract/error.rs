//! What can stop an extraction.

use crate::faces::FacesError;
use crate::mesh::MeshError;
use crate::results::ResultsError;
use crate::solve::SolveError;
use crate::system::SystemError;

/// Why an extraction could not be done.
#[derive(Debug, thiserror::Error, miette::Diagnostic)]
#[non_exhaustive]
pub enum ExtractError {
    /// The slab model has no valid surfaces.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Faces(#[from] FacesError),
    /// The surfaces could not be panelled.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Mesh(#[from] MeshError),
    /// The system could not be assembled.
    #[error(transparent)]
    #[diagnostic(transparent)]
    System(#[from] SystemError),
    /// The system could not be solved.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Solve(#[from] SolveError),
    /// The charge could not be evaluated.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Results(#[from] ResultsError),
    /// A bar needs two meshes, and the second is over the limit.
    #[error(
        "an answer with an error bar needs {panels} panels and {needed} bytes; the limit is {allowed} panels"
    )]
    #[diagnostic(
        code("extract::too_large"),
        help(
            "take a smaller `margin` or `window` in [region], or draw fewer nets into it; {allowed} panels fit"
        )
    )]
    TooLarge {
        /// Panels of the second mesh.
        panels: usize,
        /// Bytes that its matrix and factorisation take.
        needed: u64,
        /// Panels that fit.
        allowed: usize,
    },
    /// A bar needs two meshes, and there is no second.
    #[error("an answer with an error bar needs two meshes, and the faces get no finer than {panels} panels")]
    #[diagnostic(
        code("extract::not_finer"),
        help("begin at another density: more than 0.2 and less than 50")
    )]
    NotFiner {
        /// Panels of the only mesh.
        panels: usize,
    },
    /// Every net is grounded or floating.
    #[error("no net has a row: there is nothing to extract")]
    #[diagnostic(code("extract::no_rows"), help("name at least one net in `rows` of [nets]"))]
    NoRows,
}
