//! The next mesh of a small model: every face panelled anew at a higher density.

use crate::extract::error::ExtractError;
use crate::extract::stop::NoFiner;
use crate::extract::{ExtractOptions, level};
use crate::faces::{EdgeGrade, Faces};
use crate::mesh::split::shorter;
use crate::mesh::{Mesh, MeshError, PanelId, SplitDirection};

/// Density ratio of neighbouring levels: doubles the panels, whose number grows as the square of the density.
const DENSITY_RATIO: f64 = std::f64::consts::SQRT_2;
/// A level must have at least this many times the panels of the one before to say anything about convergence.
const LEAST_GROWTH: f64 = 1.3;
/// Densities tried for one level before the faces are taken to be as fine as grading makes them.
const MOST_TRIES: usize = 4;

/// The mesh after one of `n_panels` panels at this level, with at least [`LEAST_GROWTH`] times as many, or why there is
/// none.
pub(crate) fn finer(
    faces: &Faces,
    (n_panels, level): (usize, usize),
    density: &mut f64,
    options: &ExtractOptions,
) -> Result<Result<Mesh, NoFiner>, ExtractError> {
    let (fits, limit) = (options.panels_that_fit(), options.limit());
    let no_room = |panels, at_least| Ok(Err(NoFiner::Room { panels, at_least, fits, limit }));
    #[expect(clippy::cast_precision_loss, reason = "panel counts are far below 2^53")]
    let grown = |mesh: &Mesh| mesh.panels.len() as f64 >= LEAST_GROWTH * n_panels as f64;
    let mut tried = *density;
    let mut ungrown = Vec::with_capacity(MOST_TRIES);
    for _ in 0..MOST_TRIES {
        tried *= DENSITY_RATIO;
        let mesh = match level::panelize(faces, tried, options.most_panels(), &mut Vec::new()) {
            Err(ExtractError::Mesh(MeshError::TooMany { needed, at_least, .. })) => {
                return no_room(needed, at_least);
            }
            // Denser than a mesh may be.
            Err(ExtractError::Mesh(MeshError::BadDensity { .. })) => break,
            other => other?,
        };
        if mesh.panels.len() > fits {
            return no_room(mesh.panels.len(), false);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Ok(mesh));
        }
        ungrown.push((tried, mesh));
    }
    // A model of smooth faces only has nothing that grading could refine.
    for (tried, mesh) in ungrown {
        let mesh = halve_smooth(mesh, faces, level);
        if mesh.panels.len() > fits {
            return no_room(mesh.panels.len(), false);
        }
        if grown(&mesh) {
            *density = tried;
            return Ok(Ok(mesh));
        }
    }
    Ok(Err(NoFiner::Faces { panels: n_panels }))
}

/// The mesh with the panels of smooth faces cut in two `halvings` times.
///
/// Grading leaves faces alone at whose edges no charge crowds, such as the facets of smooth bodies. A model of nothing else
/// gets finer from level to level in this way.
fn halve_smooth(mut mesh: Mesh, faces: &Faces, halvings: usize) -> Mesh {
    let smooth: Vec<bool> = faces
        .faces
        .iter()
        .map(|face| face.rings.iter().flat_map(|ring| &ring.edges).all(|edge| *edge == EdgeGrade::Smooth))
        .collect();
    for _ in 0..halvings {
        let cuts: Vec<(PanelId, SplitDirection)> = (0u32..)
            .zip(&mesh.panels)
            .filter(|(_, panel)| smooth.get(panel.face as usize).copied().unwrap_or(false))
            .map(|(k, panel)| (PanelId(k), shorter(&panel.shape)))
            .collect();
        if cuts.is_empty() {
            break;
        }
        mesh = mesh.split(&cuts);
    }
    mesh
}
