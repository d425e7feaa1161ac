//! [`Artwork`](crate::artwork::Artwork) and [`Stackup`](crate::job::Stackup) to [`SlabModel`]: in each interval of
//! z the plane is partitioned into materials.

use crate::geom::region::{Bounds, Grid, Region};
use crate::net::{ModelNet, NetId};

/// A pile of slabs. Guaranteed: slabs are contiguous from bottom to top, the first reaches down to -∞ and the last up
/// to +∞ unless an image plane bounds it there; cells of one slab do not overlap; roles and joins are settled.
#[derive(Debug, Clone, PartialEq)]
pub struct SlabModel {
    /// The grid of all regions.
    pub grid: Grid,
    /// Every conductor; `NetId` in this structure points here.
    pub nets: Vec<ModelNet>,
    /// Every dielectric.
    pub materials: Vec<SlabMaterial>,
    /// From bottom to top.
    pub slabs: Vec<Slab>,
    /// Conductors of no thickness, each at the bottom of the slab with this index.
    pub sheets: Vec<Sheet>,
    /// Infinite planes at 0 V, done by images.
    pub planes: ImagePlanes,
    /// Where copper is modelled.
    pub window: Bounds,
    /// How far interfaces and planes are panelled; contains `window`. Edges on its border are no walls.
    pub extent: Bounds,
    /// Greatest distance between a true arc and its chord, m.
    pub chord_error: f64,
}

/// Index of a material in its model.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct MaterialId(pub u32);

/// A dielectric of the model.
#[derive(Debug, Clone, PartialEq)]
pub struct SlabMaterial {
    /// Name for reports: the layer's name.
    pub name: String,
    /// Relative permittivity, positive.
    pub er: f64,
    /// Where the permittivity comes from.
    pub er_source: String,
}

/// What fills a cell.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Fill {
    /// A conductor.
    Metal(NetId),
    /// A dielectric.
    Dielectric(MaterialId),
}

/// An interval of z.
#[derive(Debug, Clone, PartialEq)]
pub struct Slab {
    /// Stackup layer it belongs to, for group names.
    pub name: String,
    /// Lower end, m; -∞ for the lowest slab of an open model.
    pub z_lo: f64,
    /// Upper end, m; +∞ for the highest slab of an open model.
    pub z_hi: f64,
    /// What fills the rest of the plane, to infinity.
    pub background: MaterialId,
    /// Disjoint parts of the plane that hold something else.
    pub cells: Vec<Cell>,
}

/// A part of a slab. Where walls lean, `bottom` and `top` differ but have the same rings with the same number of
/// points in the same order, and wall k runs from edge k of one to edge k of the other.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// What is in it.
    pub fill: Fill,
    /// Outline at `z_lo`.
    pub bottom: Region,
    /// Outline at `z_hi`.
    pub top: Region,
}

/// A conductor of no thickness.
#[derive(Debug, Clone, PartialEq)]
pub struct Sheet {
    /// Its net.
    pub net: NetId,
    /// Stackup layer it belongs to.
    pub layer: String,
    /// It lies at the bottom of this slab, counted from the bottom.
    pub slab: usize,
    /// Where it is.
    pub region: Region,
}

/// Infinite planes at 0 V parallel to the slabs. z in m.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ImagePlanes {
    /// Everything modelled lies above this plane.
    pub below: Option<f64>,
    /// Everything modelled lies below this plane.
    pub above: Option<f64>,
}
