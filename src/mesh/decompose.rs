//! A face with holes to convex triangles and quadrilaterals.
//!
//! Re-entrant corners are cut away first (`cuts`), then the convex pieces are cut into strips (`convex`). A face that
//! is a convex triangle or quadrilateral comes back as it is, bit for bit. Faces with very many corners, and those that
//! `cuts` cannot manage, are triangulated (`delaunay`).

use crate::faces::Face;
use crate::geom::Vec3;
use crate::mesh::outline::{Corner, Outline, area_of};
use crate::mesh::{FaceProblem, MeshError, convex, cuts, delaunay};
use rayon::prelude::*;

/// Pieces may miss or double this part of a face, relative: rounding of cut points along the longest edges.
const AREA_TOLERANCE: f64 = 1e-9;

/// Faces with more corners are triangulated at once: the search for cuts takes seconds there.
const MANY_CORNERS: usize = 400;

/// A convex part of a face.
#[derive(Debug, Clone, PartialEq)]
pub struct Piece {
    /// Three or four corners, m, counter-clockwise about `normal`.
    pub corners: Vec<Vec3>,
    /// Unit normal of the face.
    pub normal: Vec3,
    /// Index of the face.
    pub face: u32,
}

/// Pieces of every face, in order.
///
/// # Errors
/// [`MeshError::BadFace`] for the first face that is no polygon with area.
pub fn decompose_all(faces: &[Face]) -> Result<Vec<Piece>, MeshError> {
    let per_face: Vec<_> = faces
        .par_iter()
        .zip(0u32..u32::try_from(faces.len()).unwrap_or(u32::MAX))
        .map(|(face, id)| decompose(face, id).map_err(|problem| MeshError::BadFace { face: id, problem }))
        .collect::<Result<_, _>>()?;
    Ok(per_face.into_iter().flatten().collect())
}

/// Pieces of `face`, which is number `id`: convex, disjoint, together the face.
///
/// # Errors
/// The [`FaceProblem`], when the rings do not bound an area.
pub fn decompose(face: &Face, id: u32) -> Result<Vec<Piece>, FaceProblem> {
    let outline = Outline::new(face)?;
    let crossing = |pieces| FaceProblem::Crossing { pieces, area: outline.area };
    let n_corners: usize = outline.rings.iter().map(Vec::len).sum();
    let covered = |flat: &[Vec<Corner>]| flat.iter().map(|piece| area_of(piece)).sum::<f64>();
    let covers =
        |flat: &Vec<Vec<Corner>>| (covered(flat) - outline.area).abs() <= AREA_TOLERANCE * outline.area;
    let cut = if n_corners <= MANY_CORNERS { cut(&outline).filter(covers) } else { None };
    let flat = match cut {
        Some(flat) => flat,
        None => {
            let mut flat = delaunay::pieces(&outline).ok_or(crossing(0.0))?;
            flat.retain(|piece| area_of(piece) > 0.0);
            if !covers(&flat) {
                return Err(crossing(covered(&flat)));
            }
            flat
        }
    };
    Ok(flat
        .iter()
        .map(|piece| Piece {
            corners: piece.iter().map(|corner| outline.lift(corner)).collect(),
            normal: face.normal,
            face: id,
        })
        .collect())
}

/// Strips of the convex rings that cuts from re-entrant corners leave; `None` when the cuts do not come out.
fn cut(outline: &Outline) -> Option<Vec<Vec<Corner>>> {
    let rings = cuts::convex_rings(outline)?;
    let strips = rings.iter().filter(|ring| ring.len() >= 3).flat_map(|ring| convex::strips(ring));
    Some(strips.filter(|piece| area_of(piece) > 0.0).collect())
}
