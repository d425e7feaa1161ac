//! A flat convex triangle or quadrilateral in space, with the moments that far formulas need.

use crate::geom::Vec3;

/// A flat convex panel shape: corners counter-clockwise seen from the tip of the normal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PanelShape {
    corners: [Vec3; 4],
    n_corners: u8,
    normal: Vec3,
    centroid: Vec3,
    area: f64,
    diameter: f64,
    second_moment: nalgebra::Matrix3<f64>,
}

impl PanelShape {
    /// The shape with these three or four corners, m, counter-clockwise about `normal` (unit length).
    ///
    /// Returns `None` for another number of corners, a coordinate that is not finite, or an area that is not
    /// positive about the given normal. Flatness and convexity are the caller's promise.
    #[must_use]
    pub fn new(corners: &[Vec3], normal: Vec3) -> Option<Self> {
        let n_corners = match corners.len() {
            3 => 3u8,
            4 => 4u8,
            _ => return None,
        };
        let mut four = [corners[0]; 4];
        four[..corners.len()].copy_from_slice(corners);
        let (mut area, mut first) = (0.0, Vec3::zeros());
        // Fan of triangles from corner 0; `second` is the sum of ∫ (r - r0)(r - r0)ᵀ dS.
        let mut second = nalgebra::Matrix3::zeros();
        for k in 1..corners.len() - 1 {
            let (a, b) = (corners[k] - corners[0], corners[k + 1] - corners[0]);
            let part = 0.5 * normal.dot(&a.cross(&b));
            area += part;
            first += part * (a + b) / 3.0;
            second += part / 12.0
                * (2.0 * a * a.transpose() + 2.0 * b * b.transpose() + a * b.transpose() + b * a.transpose());
        }
        if !(area.is_finite() && area > 0.0) {
            return None;
        }
        let offset = first / area;
        let diameter =
            corners.iter().flat_map(|p| corners.iter().map(move |q| (p - q).norm())).fold(0.0, f64::max);
        Some(PanelShape {
            corners: four,
            n_corners,
            normal,
            centroid: corners[0] + offset,
            area,
            diameter,
            second_moment: second - area * offset * offset.transpose(),
        })
    }

    /// The corners, m: three or four.
    #[must_use]
    pub fn corners(&self) -> &[Vec3] {
        &self.corners[..usize::from(self.n_corners)]
    }

    /// Unit normal.
    #[must_use]
    pub fn normal(&self) -> Vec3 {
        self.normal
    }

    /// Centre of area, m.
    #[must_use]
    pub fn centroid(&self) -> Vec3 {
        self.centroid
    }

    /// Area, m².
    #[must_use]
    pub fn area(&self) -> f64 {
        self.area
    }

    /// Smallest and largest coordinates, m.
    #[must_use]
    pub fn bounds(&self) -> [Vec3; 2] {
        let first = self.corners[0];
        self.corners.iter().fold([first; 2], |[lo, hi], corner| [lo.inf(corner), hi.sup(corner)])
    }

    /// Greatest distance between two corners, m.
    #[must_use]
    pub fn diameter(&self) -> f64 {
        self.diameter
    }

    /// ∫ (r - c)(r - c)ᵀ dS about the centroid c, m⁴.
    #[must_use]
    pub fn second_moment(&self) -> &nalgebra::Matrix3<f64> {
        &self.second_moment
    }

    /// The mirror image in the plane z = `plane`; the normal is mirrored too.
    #[must_use]
    pub fn mirrored(&self, plane: f64) -> PanelShape {
        let flip = |p: Vec3| Vec3::new(p.x, p.y, 2.0 * plane - p.z);
        let mut corners = [flip(self.corners[0]); 4];
        // Mirroring reverses the turn, so the order of the corners is reversed as well.
        for (k, corner) in self.corners().iter().rev().enumerate() {
            corners[k] = flip(*corner);
        }
        let mirror = nalgebra::Matrix3::from_diagonal(&Vec3::new(1.0, 1.0, -1.0));
        PanelShape {
            corners,
            n_corners: self.n_corners,
            normal: mirror * self.normal,
            centroid: flip(self.centroid),
            area: self.area,
            diameter: self.diameter,
            second_moment: mirror * self.second_moment * mirror,
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn moments_of_a_rectangle_are_those_of_the_textbook() {
        // Derived: a rectangle a x b has ∫ x² = a³ b / 12 about its centre.
        let (a, b) = (3.0, 2.0);
        let z = Vec3::new(0.0, 0.0, 1.0);
        let at = [(1.0, 1.0), (1.0 + a, 1.0), (1.0 + a, 1.0 + b), (1.0, 1.0 + b)]
            .map(|(x, y)| Vec3::new(x, y, 5.0));
        let shape = PanelShape::new(&at, z).unwrap();
        assert!((shape.area() - a * b).abs() < 1e-14);
        assert!((shape.centroid() - Vec3::new(2.5, 2.0, 5.0)).norm() < 1e-14);
        assert!((shape.second_moment()[(0, 0)] - a.powi(3) * b / 12.0).abs() < 1e-13);
        assert!(shape.second_moment()[(0, 1)].abs() < 1e-13);
        assert!(PanelShape::new(&at, -z).is_none(), "the wrong turn is refused");
    }

    #[test]
    fn a_mirror_image_turns_the_right_way() {
        let z = Vec3::new(0.0, 0.0, 1.0);
        let at = [Vec3::new(0.0, 0.0, 1.0), Vec3::new(1.0, 0.0, 1.0), Vec3::new(0.0, 1.0, 1.0)];
        let image = PanelShape::new(&at, z).unwrap().mirrored(0.0);
        assert!(PanelShape::new(image.corners(), image.normal()).is_some());
        assert!((image.centroid().z + 1.0).abs() < 1e-15);
    }
}
