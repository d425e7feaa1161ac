//! What an extraction makes before it solves: the faces and the coarsest mesh. From these follows what it will take.

use std::time::Instant;

use crate::diag::Warning;
use crate::extract::error::ExtractError;
use crate::extract::{ExtractOptions, level};
use crate::faces::Faces;
use crate::mesh::Mesh;
use crate::slab::SlabModel;

/// A model panelled as coarsely as an extraction begins; nothing is solved.
#[derive(Debug, Clone)]
pub struct Prepared {
    pub(crate) faces: Faces,
    pub(crate) coarsest: Mesh,
    /// In the order in which they arose.
    pub(crate) warnings: Vec<Warning>,
    /// Time that the faces took, s.
    pub(crate) faces_seconds: f64,
}

/// What an extraction is expected to take, up to its second level: the least that gives a bar.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Expectation {
    /// Panels of the second level.
    pub panels: usize,
    /// Peak memory, bytes.
    pub memory: u64,
    /// Time, s.
    pub seconds: f64,
    /// Panels that fit the limits.
    pub allowed: usize,
}

/// Derives the faces of `model` and panels them at the density of `options`.
///
/// # Errors
/// What the stages report.
pub fn prepare(model: &SlabModel, options: &ExtractOptions) -> Result<Prepared, ExtractError> {
    let started = Instant::now();
    let mut warnings = Vec::new();
    let faces = crate::faces::derive(model)?.drain(&mut warnings);
    let faces_seconds = started.elapsed().as_secs_f64();
    let coarsest = level::panelize(&faces, options.density, options.most_panels(), &mut warnings)?;
    Ok(Prepared { faces, coarsest, warnings, faces_seconds })
}

impl Prepared {
    /// What the extraction will take.
    #[must_use]
    pub fn expectation(&self, options: &ExtractOptions) -> Expectation {
        let coarse = self.coarsest.panels.len();
        let panels = 2 * coarse;
        // With open interfaces the coarse mesh is solved twice, to see what their truncation does.
        let coarse_solves = if self.coarsest.truncation.is_some() { 2.0 } else { 1.0 };
        Expectation {
            panels,
            memory: ExtractOptions::memory_of(panels),
            seconds: coarse_solves * options.seconds_of(coarse) + options.seconds_of(panels),
            allowed: options.panels_that_fit(),
        }
    }
}
