//! Chosen panels cut again as the size function asks for at another density.
//!
//! A panel is a convex piece of its face, so the same bisection that made it (`grade`) goes on from it, and cuts fall
//! where a finer mesh of the whole face would have them.

use crate::faces::Faces;
use crate::mesh::decompose::Piece;
use crate::mesh::density::Density;
use crate::mesh::grade::{self, Counter};
use crate::mesh::split::{halves, shorter};
use crate::mesh::{Mesh, MeshError, Panel, PanelId};
use rayon::prelude::*;
use std::collections::BTreeMap;

/// The mesh with each listed panel cut as at the density listed with it, and at least in two; with the number of panels that
/// each panel of `mesh` has become. The others stay, and the order of panels is kept.
///
/// # Errors
/// [`MeshError::TooMany`] when more than `max_panels` would be made.
pub fn regrade(
    faces: &Faces,
    mesh: &Mesh,
    finer: &[(PanelId, f64)],
    max_panels: usize,
) -> Result<(Mesh, Vec<usize>), MeshError> {
    let mut densities: BTreeMap<u64, Density> = BTreeMap::new();
    let mut wanted: Vec<Option<u64>> = vec![None; mesh.panels.len()];
    for (id, density) in finer {
        densities.entry(density.to_bits()).or_insert_with(|| Density::new(faces, *density));
        if let Some(slot) = wanted.get_mut(id.0 as usize) {
            *slot = Some(density.to_bits());
        }
    }
    let counter = Counter::new(max_panels);
    let parts: Vec<Vec<Panel>> = mesh
        .panels
        .par_iter()
        .zip(&wanted)
        .map(|(panel, wanted)| {
            let density = wanted.and_then(|key| densities.get(&key));
            match density {
                Some(density) => parts_of(panel, density, &counter),
                None => {
                    counter.add();
                    vec![*panel]
                }
            }
        })
        .collect();
    counter.check()?;
    let n_parts = parts.iter().map(Vec::len).collect();
    let panels = parts.into_iter().flatten().collect();
    Ok((Mesh { panels, ..mesh.clone_tables() }, n_parts))
}

fn parts_of(panel: &Panel, density: &Density, counter: &Counter) -> Vec<Panel> {
    let piece =
        Piece { corners: panel.shape.corners().to_vec(), normal: panel.shape.normal(), face: panel.face };
    let mut shapes = grade::refine(&piece, density, counter);
    if shapes.len() < 2 {
        // Nothing crowds here that grading knows of.
        counter.add();
        shapes = halves(&panel.shape, shorter(&panel.shape)).map_or_else(|| vec![panel.shape], Vec::from);
    }
    shapes.into_iter().map(|shape| Panel { shape, ..*panel }).collect()
}
