//! A panel made ready for integration: its own frame, edges, moments and quadrature points.
//!
//! A system meets each panel as often as there are panels, so what depends on one panel alone is worked out once.

use crate::geom::{PanelShape, Vec3};
use crate::kernel::quadrature::{GAUSS_2, GAUSS_3, GAUSS_4, GaussRule};

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
    /// Two points per direction.
    pub coarse: Points<4>,
    /// Three points per direction.
    pub fine: Points<9>,
    /// Four points per direction.
    pub finest: Points<16>,
}

/// Quadrature points of a panel, as a structure of arrays; the weights sum to 1.
#[derive(Debug, Clone, Copy)]
pub struct Points<const N: usize> {
    /// m, from the panel's centroid.
    pub x: [f64; N],
    /// m, from the panel's centroid.
    pub y: [f64; N],
    /// m, from the panel's centroid.
    pub z: [f64; N],
    /// Fraction of the area.
    pub weight: [f64; N],
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
            coarse: points(&corners, u, v, &GAUSS_2),
            fine: points(&corners, u, v, &GAUSS_3),
            finest: points(&corners, u, v, &GAUSS_4),
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

/// Product rule on the bilinear map of the unit square; a triangle is a quadrilateral with a repeated corner, whose
/// Jacobian takes one degree of exactness in one direction.
fn points<const M: usize, const N: usize>(
    corners: &[[f64; 2]; 4],
    u: Vec3,
    v: Vec3,
    rule: &GaussRule<M>,
) -> Points<N> {
    let mut out = Points { x: [0.0; N], y: [0.0; N], z: [0.0; N], weight: [0.0; N] };
    let mut total = 0.0;
    for i in 0..M {
        for j in 0..M {
            let (place, jacobian) = bilinear(corners, rule.nodes[i], rule.nodes[j]);
            let at = u * place[0] + v * place[1];
            let k = i * M + j;
            (out.x[k], out.y[k], out.z[k]) = (at.x, at.y, at.z);
            out.weight[k] = rule.weights[i] * rule.weights[j] * jacobian;
            total += out.weight[k];
        }
    }
    for w in &mut out.weight {
        *w /= total;
    }
    out
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
