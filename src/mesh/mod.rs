//! [`Faces`] to [`Mesh`]: flat convex panels, small where charge crowds.
//!
//! Each face is first cut into convex triangles and quadrilaterals (`decompose`), and these are bisected, lengthwise
//! and crosswise apart, until no panel is longer than the size function allows (`grade`, `density`; the theory is in
//! `docs/formulation.md`, "Grading"). The panels of two pieces need not meet corner to corner.

mod convex;
mod cuts;
pub mod decompose;
mod delaunay;
mod density;
mod edge_tree;
pub mod error;
mod grade;
mod outline;
pub mod panel;
pub mod quality;
pub mod regrade;
pub mod split;

pub use error::{FaceProblem, MeshError};
pub use panel::{Mesh, Panel, PanelId, PanelKind};
pub use quality::{MeshDefect, MeshQuality, check_invariants};
pub use regrade::regrade;
pub use split::SplitDirection;

use crate::diag::Warned;
use crate::faces::{Face, FaceKind, Faces};
use crate::mesh::decompose::Piece;
use crate::mesh::density::Density;
use crate::mesh::grade::Counter;
use rayon::prelude::*;

/// Smallest and largest density accepted.
const DENSITY_RANGE: [f64; 2] = [0.05, 100.0];

/// How finely faces are cut.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeshOptions {
    /// Panels between a graded edge and the middle of its face, a ratio from 0.05 to 100; the number of panels grows
    /// with its square, the error falls with its cube. Default 3.
    pub density: f64,
    /// Most panels that may be made. Default 200 000.
    pub max_panels: usize,
}

impl Default for MeshOptions {
    fn default() -> Self {
        MeshOptions { density: 3.0, max_panels: 200_000 }
    }
}

/// Panels of `faces`, in the order of the faces; same input, same panels, whatever the number of threads.
///
/// # Errors
/// [`MeshError::BadDensity`] when the density is out of range, [`MeshError::BadFace`] when a face is no polygon with
/// area, [`MeshError::TooMany`] when more than `options.max_panels` would be made.
pub fn panelize(faces: &Faces, options: &MeshOptions) -> Result<Warned<Mesh>, MeshError> {
    let [lo, hi] = DENSITY_RANGE;
    if !(lo <= options.density && options.density <= hi) {
        return Err(MeshError::BadDensity { found: options.density, lo, hi });
    }
    let pieces = decompose::decompose_all(&faces.faces)?;
    let density = Density::new(faces, options.density);
    let counter = Counter::new(options.max_panels);
    let shapes: Vec<_> = pieces.par_iter().map(|piece| grade::refine(piece, &density, &counter)).collect();
    counter.check()?;
    let panels = pieces
        .iter()
        .zip(&shapes)
        .flat_map(|(piece, shapes)| shapes.iter().map(move |shape| (piece, *shape)))
        .map(|(piece, shape)| {
            let face = &faces.faces[piece.face as usize];
            Panel { shape, kind: panel_kind(faces, face), group: face.group, face: piece.face }
        })
        .collect();
    Ok(Warned::clean(Mesh {
        panels,
        nets: faces.nets.clone(),
        groups: faces.groups.clone(),
        bodies: faces.bodies.clone(),
        planes: faces.planes,
        truncation: faces.truncation,
        outer_er: faces.outer_er,
    }))
}

/// How many panels [`panelize`] would make; the limit of `options` does not apply.
///
/// # Errors
/// As [`panelize`], except for the limit.
pub fn estimate(faces: &Faces, options: &MeshOptions) -> Result<usize, MeshError> {
    let [lo, hi] = DENSITY_RANGE;
    if !(lo <= options.density && options.density <= hi) {
        return Err(MeshError::BadDensity { found: options.density, lo, hi });
    }
    let pieces: Vec<Piece> = decompose::decompose_all(&faces.faces)?;
    let density = Density::new(faces, options.density);
    Ok(pieces.par_iter().map(|piece| grade::count(piece, &density)).sum())
}

/// The kind of a panel of `face`, with the permittivities from the table of bodies (1 for a body that is not there).
fn panel_kind(faces: &Faces, face: &Face) -> PanelKind {
    let er = |id: crate::faces::BodyId| faces.bodies.get(id.0 as usize).map_or(1.0, |body| body.er);
    match face.kind {
        FaceKind::Conductor { net, body } => PanelKind::Conductor { net, body, er: er(body) },
        FaceKind::Sheet { net, below, above } => {
            PanelKind::Sheet { net, below, above, er_below: er(below), er_above: er(above) }
        }
        FaceKind::Interface { from, to } => {
            PanelKind::Interface { from, to, er_from: er(from), er_to: er(to) }
        }
    }
}
