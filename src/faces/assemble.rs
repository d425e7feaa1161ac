//! The growing list of faces: grid to metres, names to groups.

use crate::faces::body::{Bodies, Groups};
use crate::faces::{Face, FaceKind, FacesError, GroupKind, Ring};
use crate::geom::Vec3;
use crate::geom::region::Point;
use crate::net::NetId;
use crate::slab::{Fill, Place, SlabModel};

/// Faces, bodies and groups made so far.
pub(crate) struct Assembly<'a> {
    pub(crate) model: &'a SlabModel,
    pub(crate) bodies: Bodies,
    pub(crate) groups: Groups,
    pub(crate) faces: Vec<Face>,
}

impl Assembly<'_> {
    /// A grid point at height `z`, m.
    pub(crate) fn at(&self, p: Point, z: f64) -> Vec3 {
        let grid = self.model.grid;
        Vec3::new(grid.length(p.x), grid.length(p.y), z)
    }

    /// Adds a face.
    pub(crate) fn push(
        &mut self,
        kind: FaceKind,
        normal: Vec3,
        rings: Vec<Ring>,
        group: GroupKind,
        open: bool,
    ) {
        let group = self.groups.intern(group, open);
        self.faces.push(Face { kind, normal, rings, group });
    }

    /// Group of a face whose normal points from `from` to `to`; `layer` names the slab that holds the metal, if any.
    pub(crate) fn group_kind(&self, from: Fill, to: Fill, layer: String) -> GroupKind {
        match (from, to) {
            (Fill::Metal(net), _) | (_, Fill::Metal(net)) => GroupKind::Conductor { net, layer },
            (Fill::Dielectric(a), Fill::Dielectric(b)) => {
                let name = |m: crate::slab::MaterialId| self.model.materials[m.0 as usize].name.clone();
                GroupKind::Interface { from: name(a), to: name(b) }
            }
        }
    }

    /// The error for two nets that touch at `at`.
    pub(crate) fn short(&self, a: NetId, b: NetId, layer: &str, at: Point) -> FacesError {
        let name = |net: NetId| self.model.nets[net.idx()].name.clone();
        FacesError::Short {
            first: name(a),
            second: name(b),
            layer: layer.to_owned(),
            place: Place::new(self.model.grid, at),
        }
    }
}
