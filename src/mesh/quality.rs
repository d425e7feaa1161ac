//! What every mesh must satisfy, checked; and how its panels are shaped.

use crate::faces::Faces;
use crate::geom::{PanelShape, Vec3};
use crate::mesh::{Mesh, PanelId};
use thiserror::Error;

/// Relative tolerance on a face's area: rounding of cut points along its longest edges.
const AREA_TOLERANCE: f64 = 1e-9;

/// A promise of [`Mesh`] that does not hold.
#[derive(Debug, Clone, PartialEq, Error)]
#[non_exhaustive]
pub enum MeshDefect {
    /// A corner is out of the panel's plane, or turns the wrong way.
    #[error("panel {} is not convex and flat about its normal", .panel.0)]
    NotConvex {
        /// The panel.
        panel: PanelId,
    },
    /// The normal is not of unit length or not that of the face.
    #[error("panel {} has a normal that is not its face's", .panel.0)]
    Normal {
        /// The panel.
        panel: PanelId,
    },
    /// The panel is of a face or a group that is not there.
    #[error("panel {} is of face {face}, which is not there", .panel.0)]
    NoSuchFace {
        /// The panel.
        panel: PanelId,
        /// The face that it names.
        face: u32,
    },
    /// The panels of a face do not add up to it.
    #[error("panels of face {face} cover {panels:e} m² of {area:e} m²")]
    Coverage {
        /// The face.
        face: u32,
        /// Area of its panels, m².
        panels: f64,
        /// Its area, m².
        area: f64,
    },
}

/// How the panels are shaped.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct MeshQuality {
    /// Number of panels.
    pub panels: usize,
    /// How many are triangles.
    pub triangles: usize,
    /// Area of all, m².
    pub area: f64,
    /// Median of diameter² / (2 area): 1 for a square, about half the aspect ratio of a long rectangle.
    pub median_aspect: f64,
    /// Its largest value.
    pub worst_aspect: f64,
    /// Smallest and largest diameter, m.
    pub diameters: [f64; 2],
}

/// Shape statistics of `mesh`, or everything about it that is broken.
///
/// Convexity and flatness are meant to 1e-9 of the panel's diameter; coverage to 1e-9 of the face's area.
///
/// # Errors
/// Every [`MeshDefect`] found, in the order of the panels, then of the faces.
pub fn check_invariants(mesh: &Mesh, faces: &Faces) -> Result<MeshQuality, Vec<MeshDefect>> {
    let mut defects = Vec::new();
    let mut covered = vec![0.0; faces.faces.len()];
    for (panel, id) in mesh.panels.iter().zip(0u32..) {
        let id = PanelId(id);
        let Some(face) = faces.faces.get(panel.face as usize) else {
            defects.push(MeshDefect::NoSuchFace { panel: id, face: panel.face });
            continue;
        };
        covered[panel.face as usize] += panel.shape.area();
        if (panel.shape.normal() - face.normal).norm() > 1e-12 {
            defects.push(MeshDefect::Normal { panel: id });
        }
        if !is_convex(&panel.shape) {
            defects.push(MeshDefect::NotConvex { panel: id });
        }
    }
    for ((face, panels), id) in faces.faces.iter().zip(covered).zip(0u32..) {
        let area = face_area(face);
        if (panels - area).abs() > AREA_TOLERANCE * area.abs() {
            defects.push(MeshDefect::Coverage { face: id, panels, area });
        }
    }
    if defects.is_empty() { Ok(quality(mesh)) } else { Err(defects) }
}

/// Enclosed area of a face about its normal, m².
#[must_use]
pub fn face_area(face: &crate::faces::Face) -> f64 {
    let mut twice = 0.0;
    for ring in &face.rings {
        let first = ring.points.first().copied().unwrap_or_default();
        for pair in ring.points.windows(2) {
            twice += face.normal.dot(&(pair[0] - first).cross(&(pair[1] - first)));
        }
    }
    0.5 * twice
}

fn is_convex(shape: &PanelShape) -> bool {
    let corners = shape.corners();
    let n = corners.len();
    let slack = 1e-9 * shape.diameter();
    (0..n).all(|k| {
        let (a, b, c) = (corners[k], corners[(k + 1) % n], corners[(k + 2) % n]);
        let turn: Vec3 = (b - a).cross(&(c - b));
        let flat = (b - a).dot(&shape.normal()).abs() <= slack;
        flat && turn.dot(&shape.normal()) >= -slack * (c - a).norm()
    })
}

fn quality(mesh: &Mesh) -> MeshQuality {
    let shapes = || mesh.panels.iter().map(|panel| panel.shape);
    let mut aspects: Vec<f64> = shapes().map(|s| s.diameter() * s.diameter() / (2.0 * s.area())).collect();
    aspects.sort_by(f64::total_cmp);
    MeshQuality {
        panels: aspects.len(),
        triangles: shapes().filter(|s| s.corners().len() == 3).count(),
        area: shapes().map(|s| s.area()).sum(),
        median_aspect: aspects.get(aspects.len() / 2).copied().unwrap_or_default(),
        worst_aspect: aspects.last().copied().unwrap_or_default(),
        diameters: shapes()
            .map(|s| s.diameter())
            .fold([f64::INFINITY, 0.0], |[lo, hi], d| [lo.min(d), hi.max(d)]),
    }
}
