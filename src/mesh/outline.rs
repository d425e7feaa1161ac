//! A face in its own plane: two coordinates per corner, checked, with the way back to space.

use crate::faces::Face;
use crate::geom::Vec3;
use crate::mesh::FaceProblem;

/// A point of the plane, m.
pub(super) type P2 = nalgebra::Vector2<f64>;

/// z of the cross product.
pub(super) fn cross(a: P2, b: P2) -> f64 {
    a.x * b.y - a.y * b.x
}

/// A corner in the plane and, where it is a corner of the face, its index among them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Corner {
    /// Coordinates in the plane, m.
    pub(super) at: P2,
    /// Index into [`Outline::corners`], `u32::MAX` for a point made by a cut.
    pub(super) source: u32,
}

/// The rings of a face in its plane.
#[derive(Debug, Clone)]
pub(super) struct Outline {
    /// Rings, outer first, without doubled corners.
    pub(super) rings: Vec<Vec<Corner>>,
    /// Enclosed area, m².
    pub(super) area: f64,
    /// Greatest side of the bounds, m.
    pub(super) extent: f64,
    corners: Vec<Vec3>,
    origin: Vec3,
    axes: [Vec3; 2],
}

impl Outline {
    /// The outline of `face`.
    pub(super) fn new(face: &Face) -> Result<Outline, FaceProblem> {
        let corners: Vec<Vec3> = face.rings.iter().flat_map(|ring| ring.points.iter().copied()).collect();
        let finite = |v: &Vec3| v.iter().all(|c| c.is_finite());
        if !corners.iter().all(finite) || !finite(&face.normal) || (face.normal.norm() - 1.0).abs() > 1e-6 {
            return Err(FaceProblem::NotFinite);
        }
        let origin = *corners.first().ok_or(FaceProblem::TooFewCorners)?;
        let axes = axes(face);
        let mut source = 0u32;
        let mut rings = Vec::new();
        for ring in &face.rings {
            let mut flat: Vec<Corner> = Vec::with_capacity(ring.points.len());
            for point in &ring.points {
                let offset = point - origin;
                let corner = Corner { at: P2::new(offset.dot(&axes[0]), offset.dot(&axes[1])), source };
                source += 1;
                if flat.last().is_none_or(|last| last.at != corner.at) {
                    flat.push(corner);
                }
            }
            while flat.len() > 1 && flat.first().map(|c| c.at) == flat.last().map(|c| c.at) {
                flat.pop();
            }
            if flat.len() < 3 {
                return Err(FaceProblem::TooFewCorners);
            }
            rings.push(flat);
        }
        let area = rings.iter().map(|ring| area_of(ring)).sum();
        let all = || rings.iter().flatten().map(|corner| corner.at);
        let lo = all().fold(P2::repeat(f64::INFINITY), |m, p| m.inf(&p));
        let hi = all().fold(P2::repeat(f64::NEG_INFINITY), |m, p| m.sup(&p));
        let extent = (hi - lo).max();
        // Below rounding of the coordinates no area can be told from none.
        if area <= extent * extent * 1e-14 {
            return Err(FaceProblem::NoArea { area });
        }
        Ok(Outline { rings, area, extent, corners, origin, axes })
    }

    /// The point in space; corners of the face come back bit for bit.
    pub(super) fn lift(&self, corner: &Corner) -> Vec3 {
        match self.corners.get(corner.source as usize) {
            Some(point) => *point,
            None => self.origin + corner.at.x * self.axes[0] + corner.at.y * self.axes[1],
        }
    }
}

/// Area of a ring about the origin of its first corner, positive counter-clockwise.
pub(super) fn area_of(ring: &[Corner]) -> f64 {
    let first = ring[0].at;
    0.5 * ring.windows(2).map(|pair| cross(pair[0].at - first, pair[1].at - first)).sum::<f64>()
}

/// Two unit vectors in the plane, the first along the longest edge of the outer ring.
fn axes(face: &Face) -> [Vec3; 2] {
    let points = &face.rings[0].points;
    let mut longest = Vec3::zeros();
    for (k, p) in points.iter().enumerate() {
        let edge = points[(k + 1) % points.len()] - p;
        // A later edge must be longer by more than rounding, so that equal faces get equal axes.
        if edge.norm_squared() > longest.norm_squared() * (1.0 + 1e-9) {
            longest = edge;
        }
    }
    let u = longest - longest.dot(&face.normal) * face.normal;
    let u = if u.norm() > 0.0 { u.normalize() } else { Vec3::x() };
    [u, face.normal.cross(&u)]
}
