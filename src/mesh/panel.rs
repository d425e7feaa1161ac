//! Panels and the mesh that holds them.

use crate::faces::{Body, BodyId, FaceGroup, GroupId, OuterEr, Truncation};
use crate::geom::PanelShape;
use crate::net::{ModelNet, NetId};
use crate::slab::ImagePlanes;

/// Index of a panel in its mesh, and of its unknown in the system.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct PanelId(pub u32);

/// One flat convex piece of surface with one unknown: its total charge density.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Panel {
    /// Its shape; the normal is that of its face.
    pub shape: PanelShape,
    /// What it is part of.
    pub kind: PanelKind,
    /// The set that reports add it to.
    pub group: GroupId,
    /// Index of the face it was cut from.
    pub face: u32,
}

/// What a panel is part of, with the permittivities that its row needs.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PanelKind {
    /// Metal against a dielectric of permittivity `er`; the normal points out of the metal.
    Conductor {
        /// Whose metal.
        net: NetId,
        /// The dielectric that touches it.
        body: BodyId,
        /// Its permittivity.
        er: f64,
    },
    /// A conductor of no thickness; the normal points from `below` to `above`.
    Sheet {
        /// Whose metal.
        net: NetId,
        /// The dielectric the normal points away from.
        below: BodyId,
        /// The dielectric the normal points to.
        above: BodyId,
        /// Permittivity of `below`.
        er_below: f64,
        /// Permittivity of `above`.
        er_above: f64,
    },
    /// Two dielectrics; the normal points from `from` to `to`.
    Interface {
        /// Medium 1.
        from: BodyId,
        /// Medium 2.
        to: BodyId,
        /// Permittivity of medium 1.
        er_from: f64,
        /// Permittivity of medium 2.
        er_to: f64,
    },
}

impl PanelKind {
    /// The net, of a conductor or a sheet.
    #[must_use]
    pub fn net(&self) -> Option<NetId> {
        match *self {
            PanelKind::Conductor { net, .. } | PanelKind::Sheet { net, .. } => Some(net),
            PanelKind::Interface { .. } => None,
        }
    }
}

/// Every panel, with the tables that its ids point into.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Mesh {
    /// The panels: `PanelId(k)` is entry `k`.
    pub panels: Vec<Panel>,
    /// Every conductor.
    pub nets: Vec<ModelNet>,
    /// Named sets of panels that reports add up.
    pub groups: Vec<FaceGroup>,
    /// Dielectric bodies.
    pub bodies: Vec<Body>,
    /// Infinite planes at 0 V.
    pub planes: ImagePlanes,
    /// Where the interfaces end although in truth they go on.
    pub truncation: Option<Truncation>,
    /// Permittivity at infinity.
    pub outer_er: OuterEr,
}
