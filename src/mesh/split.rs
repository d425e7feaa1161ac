//! Bisection of chosen panels in one of their two directions, for adaptive refinement.

use crate::geom::{PanelShape, Vec3};
use crate::mesh::{Mesh, Panel, PanelId};
use std::collections::BTreeMap;

/// In which of its two directions a panel is made shorter.
///
/// For corners 0 to 3 of a quadrilateral: `First` cuts the sides 0-1 and 2-3 at their midpoints, so the parts are
/// half as long from side 3-0 to side 1-2; `Second` cuts the other two sides. For a triangle: `First` joins the
/// midpoint of its longest side to the corner opposite; `Second` joins the midpoints of the other two sides, which
/// leaves a triangle and a quadrilateral.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum SplitDirection {
    /// Shorter along side 0-1; of a triangle, along its longest side.
    First,
    /// Shorter along side 1-2; of a triangle, square to its longest side.
    Second,
}

/// The two parts of a shape, cut in `direction`.
///
/// ```text
/// psi = +1 on the first part and -1 on the second: the trial function of the two-level indicator
/// ```
/// `None` when the parts are too small to have an area in rounding.
#[must_use]
pub fn halves(shape: &PanelShape, direction: SplitDirection) -> Option<[PanelShape; 2]> {
    let mid = |a: Vec3, b: Vec3| 0.5 * (a + b);
    let make = |corners: &[Vec3]| PanelShape::new(corners, shape.normal());
    match *shape.corners() {
        [a, b, c, d] => {
            let [a, b, c, d] = match direction {
                SplitDirection::First => [a, b, c, d],
                SplitDirection::Second => [b, c, d, a],
            };
            let (low, high) = (mid(a, b), mid(c, d));
            Some([make(&[a, low, high, d])?, make(&[low, b, c, high])?])
        }
        [a, b, c] => {
            let sides = [(b - a).norm(), (c - b).norm(), (a - c).norm()];
            let longest = (0..3).fold(0, |k, i| if sides[i] > sides[k] * (1.0 + 1e-9) { i } else { k });
            let [a, b, c] = [[a, b, c], [b, c, a], [c, a, b]][longest];
            match direction {
                SplitDirection::First => {
                    let foot = mid(a, b);
                    Some([make(&[a, foot, c])?, make(&[foot, b, c])?])
                }
                SplitDirection::Second => {
                    let (left, right) = (mid(a, c), mid(b, c));
                    Some([make(&[a, b, right, left])?, make(&[left, right, c])?])
                }
            }
        }
        _ => None,
    }
}

/// The direction that cuts the longer sides of a quadrilateral; the longest side of a triangle.
#[must_use]
pub fn shorter(shape: &PanelShape) -> SplitDirection {
    match *shape.corners() {
        [a, b, c, d]
            if (c - b).norm() + (a - d).norm() > (1.0 + 1e-9) * ((b - a).norm() + (d - c).norm()) =>
        {
            SplitDirection::Second
        }
        _ => SplitDirection::First,
    }
}

impl Mesh {
    /// The mesh with each listed panel cut in two, or in four when it is listed with both directions.
    ///
    /// The parts take the place of their panel, so the order of faces stays and all other panels keep their order;
    /// ids change. Kind, group and face are kept. A panel too small to cut, or an id that is not there, is left out.
    #[must_use]
    pub fn split(&self, splits: &[(PanelId, SplitDirection)]) -> Mesh {
        let mut wanted: BTreeMap<u32, [bool; 2]> = BTreeMap::new();
        for (id, direction) in splits {
            wanted.entry(id.0).or_default()[usize::from(*direction == SplitDirection::Second)] = true;
        }
        let mut panels = Vec::with_capacity(self.panels.len() + splits.len());
        for (panel, id) in self.panels.iter().zip(0u32..) {
            let [first, second] = wanted.get(&id).copied().unwrap_or_default();
            let parts = parts_of(&panel.shape, first, second);
            panels.extend(parts.into_iter().map(|shape| Panel { shape, ..*panel }));
        }
        Mesh { panels, ..self.clone_tables() }
    }

    /// Everything but the panels.
    pub(super) fn clone_tables(&self) -> Mesh {
        Mesh {
            panels: Vec::new(),
            nets: self.nets.clone(),
            groups: self.groups.clone(),
            bodies: self.bodies.clone(),
            planes: self.planes,
            truncation: self.truncation,
            outer_er: self.outer_er,
        }
    }
}

fn parts_of(shape: &PanelShape, first: bool, second: bool) -> Vec<PanelShape> {
    let cut = |shapes: Vec<PanelShape>, direction: SplitDirection| -> Vec<PanelShape> {
        shapes
            .into_iter()
            .flat_map(|shape| halves(&shape, direction).map_or_else(|| vec![shape], |two| two.to_vec()))
            .collect()
    };
    let mut shapes = vec![*shape];
    if first {
        shapes = cut(shapes, SplitDirection::First);
    }
    if second {
        shapes = cut(shapes, SplitDirection::Second);
    }
    shapes
}
