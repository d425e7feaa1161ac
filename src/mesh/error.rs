//! What can go wrong while faces are cut into panels.

use miette::Diagnostic;
use thiserror::Error;

/// Why there is no mesh.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum MeshError {
    /// An option is not a usable number (the caller).
    #[error("mesh density is {found}, expected a number from {lo} to {hi}")]
    #[diagnostic(
        code(mesh::bad_density),
        help("give a density near 3; every doubling takes four times the panels")
    )]
    BadDensity {
        /// What was given.
        found: f64,
        /// Smallest density allowed.
        lo: f64,
        /// Largest density allowed.
        hi: f64,
    },
    /// A face is no polygon that can be cut: fewer than three corners, coordinates that are not finite, no area
    /// about its normal, or edges that cross (the stage before).
    #[error("face {face} cannot be cut into panels: {problem}")]
    #[diagnostic(
        code(mesh::bad_face),
        help("look for outlines that cross themselves or have no area near the place given")
    )]
    BadFace {
        /// Index of the face.
        face: u32,
        /// What is wrong with it.
        problem: FaceProblem,
    },
    /// More panels than allowed (a limit).
    #[error(
        "the mesh takes {} {needed} panels, the limit is {limit}: a dense matrix of {needed} panels takes {gigabytes:.1} GB",
        if *.at_least { "more than" } else { "" }
    )]
    #[diagnostic(
        code(mesh::too_many_panels),
        help("model a smaller region, loosen the accuracy target, or raise the limit on panels")
    )]
    TooMany {
        /// Panels that the mesh takes.
        needed: usize,
        /// Whether counting was given up at `needed`.
        at_least: bool,
        /// The limit.
        limit: usize,
        /// Memory of a dense matrix of `needed` panels, GB.
        gigabytes: f64,
    },
}

/// What is wrong with a face.
#[derive(Debug, Clone, Copy, PartialEq, Error)]
pub enum FaceProblem {
    /// A ring has fewer than three different corners, or none is given.
    #[error("a ring has fewer than three corners")]
    TooFewCorners,
    /// A coordinate or the normal is not finite, or the normal is not of unit length.
    #[error("a coordinate or the normal is not a finite number")]
    NotFinite,
    /// The rings enclose no area about the normal.
    #[error("its area about the normal is {area:e} m²")]
    NoArea {
        /// Enclosed area, m².
        area: f64,
    },
    /// The cuts did not close: rings that cross or lie outside the outer ring.
    #[error("its rings cross: pieces cover {pieces:e} m² of {area:e} m²")]
    Crossing {
        /// Area of the pieces, m².
        pieces: f64,
        /// Enclosed area, m².
        area: f64,
    },
}
