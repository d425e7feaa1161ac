//! What an extraction makes before it solves: the faces and the coarsest mesh. From these follows what it will take at least.

use std::time::Instant;

use crate::diag::Warning;
use crate::extract::error::ExtractError;
use crate::extract::{ExtractOptions, border, level};
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

/// What an extraction takes at least: its first two levels, without which there is no bar.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Expectation {
    /// Panels of the second level.
    pub panels: usize,
    /// Peak memory, bytes.
    pub memory: u64,
    /// Time, s: of both levels, and of the solves with and without a rim when there is one.
    pub seconds: f64,
    /// Whether the coarse mesh is solved once more with the border of the open interfaces moved in.
    pub moves_border: bool,
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
    /// What the extraction will take at least; a third level, if the target asks for one, takes several times as long.
    #[must_use]
    pub fn expectation(&self, options: &ExtractOptions) -> Expectation {
        let coarse = self.coarsest.panels.len();
        let panels = 2 * coarse;
        let moved = border::whole_and_inner(&self.coarsest);
        let border = moved.iter().flatten().map(|mesh| mesh.panels.len());
        let solves = border.chain([coarse, panels]);
        Expectation {
            panels,
            memory: ExtractOptions::memory_of(panels),
            seconds: solves.map(|n| options.seconds_of(n)).sum(),
            moves_border: moved.is_some(),
            allowed: options.panels_that_fit(),
        }
    }
}
