//! [`SlabModel`](crate::slab::SlabModel) to [`Faces`]: oriented flat surfaces, by one rule.

use crate::geom::Vec3;
use crate::net::{ModelNet, NetId};
use crate::slab::ImagePlanes;

/// Every surface that carries charge. Tests build bodies that are not slabs directly as `Faces`.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Faces {
    /// The surfaces.
    pub faces: Vec<Face>,
    /// Named sets of faces that reports add up.
    pub groups: Vec<FaceGroup>,
    /// Every conductor; `NetId` in this structure points here.
    pub nets: Vec<ModelNet>,
    /// Dielectric bodies: all material of one permittivity is one body.
    pub bodies: Vec<Body>,
    /// Infinite planes at 0 V.
    pub planes: ImagePlanes,
    /// Where the interfaces end although in truth they go on.
    pub truncation: Option<Truncation>,
    /// Relative permittivity far above and far below; equal for a homogeneous exterior.
    pub outer_er: OuterEr,
}

/// Permittivity of the two half-spaces at infinity. A half-space behind an image plane is `None`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct OuterEr {
    /// Far above.
    pub above: Option<f64>,
    /// Far below.
    pub below: Option<f64>,
}

impl Default for OuterEr {
    fn default() -> Self {
        OuterEr { above: Some(1.0), below: Some(1.0) }
    }
}

/// Index of a face group.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct GroupId(pub u32);

/// Index of a dielectric body.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct BodyId(pub u32);

/// A flat polygon with holes, its kind, and how charge crowds at its edges.
#[derive(Debug, Clone, PartialEq)]
pub struct Face {
    /// What it is a face of.
    pub kind: FaceKind,
    /// Unit normal: out of the conductor; from medium 1 into medium 2 on an interface; from below to above on a sheet.
    pub normal: Vec3,
    /// `[0]` is the outer ring, counter-clockwise about the normal; the rest are holes, clockwise.
    pub rings: Vec<Ring>,
    /// The set that reports add it to.
    pub group: GroupId,
}

/// A closed ring of edges; edge k runs from point k to point k + 1.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Ring {
    /// Corners, m.
    pub points: Vec<Vec3>,
    /// How charge crowds at edge k.
    pub edges: Vec<EdgeGrade>,
}

/// How charge crowds at an edge of a face.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum EdgeGrade {
    /// Not at all: a seam, a facet of a smooth body, or the end of the modelled extent.
    Smooth,
    /// As at a solid conductor's edge, or where an interface meets one: σ ~ d^(-1/3) for a right angle.
    Solid,
    /// As at the rim of a sheet: σ ~ d^(-1/2).
    Rim,
}

/// What a face separates.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FaceKind {
    /// Metal of `net` against a dielectric.
    Conductor {
        /// Whose metal.
        net: NetId,
        /// The dielectric that touches it.
        body: BodyId,
    },
    /// A conductor of no thickness.
    Sheet {
        /// Whose metal.
        net: NetId,
        /// The dielectric on the side that the normal points away from.
        below: BodyId,
        /// The dielectric on the side that the normal points to.
        above: BodyId,
    },
    /// Two dielectrics.
    Interface {
        /// Medium 1: the side that the normal points away from.
        from: BodyId,
        /// Medium 2: the side that the normal points to.
        to: BodyId,
    },
}

/// A dielectric body: all material of one permittivity.
#[derive(Debug, Clone, PartialEq)]
pub struct Body {
    /// Names of the layers that it consists of, joined by "+".
    pub name: String,
    /// Relative permittivity.
    pub er: f64,
    /// Whether all of it lies inside the model, so that its bound charge must sum to zero.
    pub finite: bool,
}

/// A set of faces that reports add up.
#[derive(Debug, Clone, PartialEq)]
pub struct FaceGroup {
    /// What it is.
    pub kind: GroupKind,
    /// Whether the surface goes on to infinity beyond its modelled part.
    pub open: bool,
}

/// What a face group is.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum GroupKind {
    /// The faces of a net that belong to one stackup layer.
    Conductor {
        /// The net.
        net: NetId,
        /// The layer.
        layer: String,
    },
    /// The faces between two materials.
    Interface {
        /// Medium 1 of the normal.
        from: String,
        /// Medium 2 of the normal.
        to: String,
    },
}

/// A rectangle at which open interfaces were ended.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Truncation {
    /// Centre of the copper, m.
    pub centre: [f64; 2],
    /// Half-width of the copper in x and y, m.
    pub copper: [f64; 2],
    /// Half-width of the panelled extent in x and y, m.
    pub extent: [f64; 2],
}
