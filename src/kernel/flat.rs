//! A panel made ready for integration: its own frame, edges, moments and quadrature points.
//!
//! A system meets each panel as often as there are panels, so what depends on one panel alone is worked out once.

use crate::geom::{PanelShape, Vec3};
use crate::kernel::points::Points;
use std::sync::Arc;

/// A panel, ready for integration.
#[derive(Debug, Clone)]
pub struct Flat {
    /// Centre of area, m: origin of the panel's frame.
    pub centroid: Vec3,
    /// Unit normal: third axis of the frame.
    pub normal: Vec3,
    /// First axis of the frame, along the longest edge.
    pub u: Vec3,
    /// Second axis, `normal × u`.
    pub v: Vec3,
    /// Number of corners, 3 or 4.
    pub n_corners: usize,
    /// Corners in the frame, m, counter-clockwise; the fourth repeats the third of a triangle.
    pub corners: [[f64; 2]; 4],
    /// Unit tangent of edge k, which runs from corner k to the next one.
    pub tangents: [[f64; 2]; 4],
    /// Length of edge k, m.
    pub lengths: [f64; 4],
    /// Area, m².
    pub area: f64,
    /// Greatest distance of a corner from the centroid, m.
    pub radius: f64,
    /// Variance of position, m²: ∫ (r - c)(r - c)ᵀ dS over the area; xx, yy, zz, xy, xz, yz.
    pub variance: [f64; 6],
    /// Greatest distance of a corner from the centroid along each axis of the frame, m; 0 along the normal.
    pub half_widths: [f64; 3],
    /// Half-lengths of the longer and of the shorter pair of opposite sides, m.
    pub half_sides: [f64; 2],
    /// Whether the corners are those of a rectangle around the centroid, to rounding.
    pub is_rectangle: bool,
    /// Gauss points.
    pub points: Arc<Points>,
}

impl Flat {
    /// The panel `shape`, made ready.
    #[must_use]
    pub fn new(shape: &PanelShape) -> Self {
        let at = shape.corners();
        let n_corners = at.len();
        let edge = |k: usize| at[(k + 1) % n_corners] - at[k];
        let longest =
            (0..n_corners).map(edge).fold(Vec3::zeros(), |a, b| if b.norm() > a.norm() { b } else { a });
        let normal = shape.normal();
        let u = (longest - normal * normal.dot(&longest)).normalize();
        let v = normal.cross(&u);
        let centroid = shape.centroid();
        let local = |p: &Vec3| [(p - centroid).dot(&u), (p - centroid).dot(&v)];
        let mut corners = [local(&at[n_corners - 1]); 4];
        for (k, p) in at.iter().enumerate() {
            corners[k] = local(p);
        }
        let (mut tangents, mut lengths) = ([[1.0, 0.0]; 4], [0.0; 4]);
        for k in 0..n_corners {
            let (a, b) = (corners[k], corners[(k + 1) % n_corners]);
            let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
            lengths[k] = dx.hypot(dy);
            if lengths[k] > 0.0 {
                tangents[k] = [dx / lengths[k], dy / lengths[k]];
            }
        }
        let half_width = |axis: usize| corners.iter().map(|c| c[axis].abs()).fold(0.0, f64::max);
        let slack = 1e-12 * (half_width(0) + half_width(1));
        let is_rectangle = n_corners == 4
            && corners.iter().all(|c| (0..2).all(|k| (c[k].abs() - half_width(k)).abs() <= slack));
        let m = shape.second_moment() / shape.area();
        Flat {
            centroid,
            normal,
            u,
            v,
            n_corners,
            corners,
            tangents,
            lengths,
            area: shape.area(),
            radius: at.iter().map(|p| (p - centroid).norm()).fold(0.0, f64::max),
            variance: [m[(0, 0)], m[(1, 1)], m[(2, 2)], m[(0, 1)], m[(0, 2)], m[(1, 2)]],
            half_widths: [half_width(0), half_width(1), 0.0],
            is_rectangle,
            half_sides: half_sides(&corners),
            points: Arc::new(Points::new(&corners, u, v)),
        }
    }

    /// `at` (m) in the panel's frame: two in-plane coordinates and the height on the side of the normal, m.
    #[must_use]
    pub fn local(&self, at: Vec3) -> [f64; 3] {
        let d = at - self.centroid;
        [d.dot(&self.u), d.dot(&self.v), d.dot(&self.normal)]
    }

    /// The point of the panel with in-plane coordinates `x`, `y` (m).
    #[must_use]
    pub fn global(&self, x: f64, y: f64) -> Vec3 {
        self.centroid + self.u * x + self.v * y
    }

    /// The same panel displaced by `by`, m.
    #[must_use]
    pub fn displaced(&self, by: Vec3) -> Flat {
        Flat { centroid: self.centroid + by, ..self.clone() }
    }
}

/// Half the longer of two opposite sides, for the longer and the shorter pair of them.
fn half_sides(corners: &[[f64; 2]; 4]) -> [f64; 2] {
    let side =
        |a: usize, b: usize| 0.5 * (corners[b][0] - corners[a][0]).hypot(corners[b][1] - corners[a][1]);
    let (first, second) = (side(0, 1).max(side(3, 2)), side(1, 2).max(side(0, 3)));
    [first.max(second), first.min(second)]
}

/// Place (m) and Jacobian (m²) of the bilinear map at `s`, `t` in [0, 1].
#[must_use]
pub fn bilinear(corners: &[[f64; 2]; 4], s: f64, t: f64) -> ([f64; 2], f64) {
    let [a, b, c, d] = *corners;
    let mix =
        |k: usize| (1.0 - s) * (1.0 - t) * a[k] + s * (1.0 - t) * b[k] + s * t * c[k] + (1.0 - s) * t * d[k];
    let along_s = |k: usize| (1.0 - t) * (b[k] - a[k]) + t * (c[k] - d[k]);
    let along_t = |k: usize| (1.0 - s) * (d[k] - a[k]) + s * (c[k] - b[k]);
    ([mix(0), mix(1)], along_s(0) * along_t(1) - along_s(1) * along_t(0))
}
