//! What can go wrong while a system is solved.

use miette::Diagnostic;
use thiserror::Error;

/// Why there is no solution.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum SolveError {
    /// The content: the matrix is singular or not finite.
    #[error("the system of {panels} panels has no finite solution")]
    #[diagnostic(
        code(solve::singular),
        help("look for panels that lie on one another, or for a conductor that lies in an image plane")
    )]
    Singular {
        /// Number of panels.
        panels: usize,
    },
    /// The solution does not satisfy the system.
    #[error("the relative residual is {residual:e}, above {limit:e}, for {panels} panels")]
    #[diagnostic(
        code(solve::inaccurate),
        help("look for panels that lie on one another, or limit the aspect ratio of the panels")
    )]
    Inaccurate {
        /// Number of panels.
        panels: usize,
        /// |b - A x| / |b|.
        residual: f64,
        /// Largest that passes.
        limit: f64,
    },
}
