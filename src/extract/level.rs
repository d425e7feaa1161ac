//! One level of refinement: faces to results at one density, timed stage by stage.

use std::time::Instant;

use crate::diag::Warning;
use crate::extract::error::ExtractError;
use crate::extract::{MeshCount, Progress};
use crate::faces::Faces;
use crate::job::Accuracy;
use crate::mesh::{Mesh, MeshOptions, PanelKind};
use crate::results::Results;
use crate::solve::Charge;

/// One solved mesh.
#[derive(Debug, Clone)]
pub(crate) struct Level {
    /// What it says.
    pub(crate) results: Results,
    /// Its panels.
    pub(crate) count: MeshCount,
    /// The charge on it, and how well it was solved.
    pub(crate) charge: Charge,
    /// Stage and seconds.
    pub(crate) seconds: Vec<(&'static str, f64)>,
}

impl Level {
    /// Raises the thresholds of the checks to what an answer at this accuracy may show.
    pub(crate) fn allow(&mut self, accuracy: Accuracy) {
        for check in &mut self.results.checks {
            check.allow(accuracy.target, accuracy.floor);
        }
    }
}

/// Panels the faces at `density`; warnings are appended to `warnings`.
pub(crate) fn panelize(
    faces: &Faces,
    density: f64,
    max_panels: usize,
    warnings: &mut Vec<Warning>,
) -> Result<Mesh, ExtractError> {
    Ok(crate::mesh::panelize(faces, &MeshOptions { density, max_panels })?.drain(warnings))
}

/// Solves one mesh and evaluates it.
pub(crate) fn solve(
    mesh: &Mesh,
    level: usize,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Level, ExtractError> {
    let count = count(mesh);
    let tell = |stage| progress(Progress { level, stage, panels: count.panels });
    let mut seconds = Vec::new();
    let mut clock = Instant::now();
    let mut lap = |stage| {
        seconds.push((stage, clock.elapsed().as_secs_f64()));
        clock = Instant::now();
    };
    tell("assembling");
    let system = crate::system::assemble(mesh)?;
    lap("assemble");
    tell("solving");
    let charge = crate::solve::solve_dense(system)?;
    lap("solve");
    tell("evaluating");
    let results = crate::results::evaluate(mesh, &charge)?;
    lap("evaluate");
    Ok(Level { results, count, charge, seconds })
}

/// Counts the panels of a mesh by kind.
pub(crate) fn count(mesh: &Mesh) -> MeshCount {
    let interface_panels =
        mesh.panels.iter().filter(|panel| matches!(panel.kind, PanelKind::Interface { .. })).count();
    MeshCount {
        panels: mesh.panels.len(),
        conductor_panels: mesh.panels.len() - interface_panels,
        interface_panels,
        levels: 0,
    }
}
