//! Boundary-element capacitance and stray-field extraction for printed circuit boards and MEMS.
//!
//! ```text
//! files -> Artwork -> SlabModel -> Faces -> Mesh -> System -> Charge -> Results -> reports
//! ```
//!
//! Every problem is solved as charge in vacuum: free charge on metal and bound charge on the faces of dielectrics.
//! Each stage is a module with one input and one output type; `docs/pipeline.md` says what each type guarantees.

pub mod artwork;
#[cfg(feature = "cli")]
pub mod cli;
pub mod diag;
pub mod extract;
pub mod faces;
pub mod geom;
pub mod job;
pub mod kernel;
pub mod mesh;
pub mod net;
pub mod report;
pub mod results;
pub mod slab;
pub mod solve;
pub mod system;
pub mod units;

pub use artwork::Artwork;
pub use extract::Extraction;
pub use faces::Faces;
pub use job::{Job, Stackup};
pub use mesh::Mesh;
pub use results::Results;
pub use slab::SlabModel;
pub use solve::Charge;
pub use system::System;

/// The snippets of the README, as tests.
#[cfg(doctest)]
#[doc = include_str!("../README.md")]
#[derive(Debug)]
pub struct Readme;
