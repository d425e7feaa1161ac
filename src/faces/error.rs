//! Why a slab model gives no faces.

use crate::slab::Place;
use miette::Diagnostic;
use thiserror::Error;

/// Why a slab model gives no faces.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum FacesError {
    /// Metal of two nets touches.
    #[error("nets `{first}` and `{second}` touch in `{layer}` at {place}")]
    #[diagnostic(
        code(faces::short),
        help("separate the two nets, or list them together under `join` in the job")
    )]
    Short {
        /// One net.
        first: String,
        /// The other net.
        second: String,
        /// Slab in which, or on top of which, they touch.
        layer: String,
        /// Where.
        place: Place,
    },
    /// A cell would reach to infinity.
    #[error("`{slab}` reaches to infinity but holds a part with an outline")]
    #[diagnostic(code(faces::infinite_cell), help("give `{slab}` a finite thickness, or leave the part out"))]
    InfiniteCell {
        /// The slab.
        slab: String,
    },
    /// Leaning walls of one slab do not fit together.
    #[error("leaning walls in `{slab}` at {place} do not meet the same parts at their foot and at their top")]
    #[diagnostic(
        code(faces::leaning_wall),
        help("make the walls of `{slab}` upright: leave out `side_slope`")
    )]
    LeaningWall {
        /// The slab.
        slab: String,
        /// Where.
        place: Place,
    },
    /// There is no metal.
    #[error("the model holds no metal, so there is no charge to find")]
    #[diagnostic(code(faces::no_metal), help("choose a region that holds copper of at least one net"))]
    NoMetal,
}
