//! Dielectric bodies and face groups: what reports add up.

use crate::faces::conform::Conformed;
use crate::faces::{Body, BodyId, FaceGroup, GroupId, GroupKind};
use crate::geom::region::{Bounds, Point};
use crate::slab::{Fill, MaterialId, SlabModel};

/// The bodies, and which one each material belongs to.
pub(crate) struct Bodies {
    pub(crate) list: Vec<Body>,
    of_material: Vec<BodyId>,
}

impl Bodies {
    /// One body per permittivity among the materials in use. A body is finite when it is the background of no slab
    /// and none of its cells reaches the border of the extent.
    pub(crate) fn new(model: &SlabModel, conformed: &Conformed) -> Self {
        let mut used = vec![false; model.materials.len()];
        let mut endless = vec![false; model.materials.len()];
        for (slab, cells) in model.slabs.iter().zip(&conformed.slabs) {
            used[slab.background.0 as usize] = true;
            endless[slab.background.0 as usize] = true;
            for cell in cells {
                let Fill::Dielectric(m) = cell.fill else { continue };
                used[m.0 as usize] = true;
                let mut rings = cell.bottom.iter().chain(&cell.top);
                let at_border = rings.any(|r| r.points.iter().any(|p| on_border(*p, &model.extent)));
                endless[m.0 as usize] |= at_border;
            }
        }
        let mut list: Vec<Body> = Vec::new();
        let mut of_material = Vec::with_capacity(model.materials.len());
        for (k, material) in model.materials.iter().enumerate() {
            let known = list.iter().position(|body| body.er.to_bits() == material.er.to_bits());
            let idx = known.unwrap_or_else(|| {
                list.push(Body { name: String::new(), er: material.er, finite: true });
                list.len() - 1
            });
            let body = &mut list[idx];
            if used[k] {
                if !body.name.is_empty() {
                    body.name.push('+');
                }
                body.name.push_str(&material.name);
            }
            body.finite &= !endless[k];
            of_material.push(BodyId(u32::try_from(idx).unwrap_or(u32::MAX)));
        }
        for body in &mut list {
            if body.name.is_empty() {
                body.name.push_str("unused");
            }
        }
        Bodies { list, of_material }
    }

    /// The body of `material`.
    pub(crate) fn of(&self, material: MaterialId) -> BodyId {
        self.of_material[material.0 as usize]
    }
}

/// The groups met so far.
#[derive(Default)]
pub(crate) struct Groups {
    pub(crate) list: Vec<FaceGroup>,
}

impl Groups {
    /// The group of this kind, made when it is new; `open` adds to what is known.
    pub(crate) fn intern(&mut self, kind: GroupKind, open: bool) -> GroupId {
        let known = self.list.iter().position(|group| group.kind == kind);
        let idx = known.unwrap_or_else(|| {
            self.list.push(FaceGroup { kind, open: false });
            self.list.len() - 1
        });
        self.list[idx].open |= open;
        GroupId(u32::try_from(idx).unwrap_or(u32::MAX))
    }
}

/// Whether `p` lies on the border of `extent`.
pub(crate) fn on_border(p: Point, extent: &Bounds) -> bool {
    p.x == extent.lo.x || p.x == extent.hi.x || p.y == extent.lo.y || p.y == extent.hi.y
}

/// Whether the edge from `a` to `b` runs along the border of `extent`.
pub(crate) fn along_border(a: Point, b: Point, extent: &Bounds) -> bool {
    (a.x == b.x && (a.x == extent.lo.x || a.x == extent.hi.x))
        || (a.y == b.y && (a.y == extent.lo.y || a.y == extent.hi.y))
}
