//! [`SlabModel`] to [`Faces`]: oriented flat surfaces, by one rule.
//!
//! Metal against a dielectric gives a conductor face, two different permittivities an interface, all else nothing
//! (`rule`). Outlines are first made to meet in common corners only (`conform`), so that horizontal faces and walls
//! close without gaps. What is small where charge crowds is the business of `mesh`; here edges are only marked.

mod assemble;
mod body;
mod conform;
mod error;
mod grade;
mod horizontal;
mod outline;
mod rule;
mod wall;

use crate::diag::Warned;
use crate::faces::assemble::Assembly;
use crate::faces::body::{Bodies, Groups, on_border};
use crate::faces::conform::{Conformed, conform};
use crate::geom::Vec3;
use crate::geom::region::{Bounds, Grid};
use crate::net::{ModelNet, NetId};
use crate::slab::{Fill, ImagePlanes, SlabModel};

pub use error::FacesError;

/// The surfaces of `model` that carry charge.
///
/// Surfaces are closed: the faces of a conductor, and of a finite dielectric body, add up to no vector area (except
/// where copper goes on past the extent). Coordinates are in m from here on.
///
/// # Errors
/// - [`FacesError::Short`] when metal of two nets touches.
/// - [`FacesError::InfiniteCell`] when a half-space holds a cell.
/// - [`FacesError::LeaningWall`] when foot and top of a leaning wall meet different cells, rounding apart.
/// - [`FacesError::NoMetal`] when there is no conductor face at all.
pub fn derive(model: &SlabModel) -> Result<Warned<Faces>, FacesError> {
    let conformed = conform(model)?;
    let bodies = Bodies::new(model, &conformed);
    let levels = horizontal::levels(model, &conformed);
    let mut out = Assembly { model, bodies, groups: Groups::default(), faces: Vec::new() };
    horizontal::horizontal_faces(model, &conformed, &levels, &mut out)?;
    wall::wall_faces(model, &conformed, &levels, &mut out)?;
    if !out.faces.iter().any(|face| matches!(face.kind, FaceKind::Conductor { .. } | FaceKind::Sheet { .. }))
    {
        return Err(FacesError::NoMetal);
    }
    let open = out.groups.list.iter().any(|group| group.open);
    let er = |slab: Option<&crate::slab::Slab>, plane: Option<f64>| match (slab, plane) {
        (Some(slab), None) => Some(model.materials[slab.background.0 as usize].er),
        _ => None,
    };
    Ok(Warned::clean(Faces {
        faces: out.faces,
        groups: out.groups.list,
        nets: model.nets.clone(),
        bodies: out.bodies.list,
        planes: model.planes,
        truncation: open.then(|| truncation(model, &conformed)),
        outer_er: OuterEr {
            above: er(model.slabs.last(), model.planes.above),
            below: er(model.slabs.first(), model.planes.below),
        },
    }))
}

/// The copper that does not go on past the extent, and the extent, as centre and half-widths.
fn truncation(model: &SlabModel, conformed: &Conformed) -> Truncation {
    let cells = conformed.slabs.iter().flatten().filter(|cell| matches!(cell.fill, Fill::Metal(_)));
    let cells = cells.map(|cell| [cell.bottom.as_slice(), cell.top.as_slice()].concat());
    let sheets = conformed.sheets.iter().flatten().map(|sheet| sheet.rings.clone());
    let mut copper: Option<Bounds> = None;
    for rings in cells.chain(sheets) {
        let points = || rings.iter().flat_map(|ring| &ring.points);
        if points().any(|p| on_border(*p, &model.extent)) {
            continue;
        }
        for p in points() {
            let sum = copper.get_or_insert(Bounds { lo: *p, hi: *p });
            (sum.lo.x, sum.lo.y) = (sum.lo.x.min(p.x), sum.lo.y.min(p.y));
            (sum.hi.x, sum.hi.y) = (sum.hi.x.max(p.x), sum.hi.y.max(p.y));
        }
    }
    let copper = copper.unwrap_or(model.window);
    let centre = |lo: i64, hi: i64, grid: Grid| 0.5 * (grid.length(lo) + grid.length(hi));
    let half = |lo: i64, hi: i64| 0.5 * model.grid.length(hi - lo);
    Truncation {
        centre: [centre(copper.lo.x, copper.hi.x, model.grid), centre(copper.lo.y, copper.hi.y, model.grid)],
        copper: [half(copper.lo.x, copper.hi.x), half(copper.lo.y, copper.hi.y)],
        extent: [half(model.extent.lo.x, model.extent.hi.x), half(model.extent.lo.y, model.extent.hi.y)],
    }
}

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
