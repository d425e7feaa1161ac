//! The stackup: layers from top to bottom as on a fabrication drawing, every number in SI and checked.

use crate::diag::Origin;
use crate::job::Named;

/// Index of a layer in its stackup, counted from the top.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct LayerId(pub u32);

impl LayerId {
    /// The id as a list index.
    #[must_use]
    pub fn idx(self) -> usize {
        self.0 as usize
    }
}

/// A checked stackup. Guaranteed: layer names are unique; at least one layer is a conductor; open layers stand only
/// first or last; coatings stand only outside the outermost conductors; every dielectric has a positive thickness.
#[derive(Debug, Clone, PartialEq)]
pub struct Stackup {
    /// From top to bottom. An open half-space that the file left out is added as vacuum, so the first and the last
    /// layer are always open.
    pub layers: Vec<Layer>,
    /// Keys that are accepted but have no effect yet.
    pub unused: Vec<Named>,
}

impl Stackup {
    /// The layer called `name`.
    #[must_use]
    pub fn find(&self, name: &str) -> Option<LayerId> {
        self.layers
            .iter()
            .position(|layer| layer.name == name)
            .and_then(|k| u32::try_from(k).ok())
            .map(LayerId)
    }

    /// The layer `id`.
    ///
    /// # Panics
    /// When `id` came from another stackup.
    #[must_use]
    #[track_caller]
    pub fn get(&self, id: LayerId) -> &Layer {
        &self.layers[id.idx()]
    }

    /// Every layer with its id, from top to bottom.
    pub fn iter(&self) -> impl DoubleEndedIterator<Item = (LayerId, &Layer)> {
        self.layers
            .iter()
            .enumerate()
            .map(|(k, layer)| (LayerId(u32::try_from(k).unwrap_or(u32::MAX)), layer))
    }

    /// The conductor layers, from top to bottom.
    pub fn conductors(&self) -> impl DoubleEndedIterator<Item = LayerId> {
        self.iter().filter(|(_, layer)| matches!(layer.kind, LayerKind::Conductor { .. })).map(|(id, _)| id)
    }
}

/// One layer of the stackup.
#[derive(Debug, Clone, PartialEq)]
pub struct Layer {
    /// Unique in the stackup.
    pub name: String,
    /// What it is.
    pub kind: LayerKind,
    /// How far its quantities may be off; empty when the file does not say.
    pub tolerance: Vec<Tolerance>,
    /// Where it stands.
    pub origin: Origin,
}

impl Layer {
    /// A layer without tolerances that was made by a default.
    #[must_use]
    pub fn new(name: impl Into<String>, kind: LayerKind) -> Self {
        Layer { name: name.into(), kind, tolerance: Vec::new(), origin: Origin::default() }
    }

    /// What it is made of; `None` for a conductor.
    #[must_use]
    pub fn material(&self) -> Option<&Material> {
        match &self.kind {
            LayerKind::Open { material }
            | LayerKind::Coating { material, .. }
            | LayerKind::Dielectric { material, .. } => Some(material),
            LayerKind::Conductor { .. } => None,
        }
    }
}

/// How far one quantity of a layer may be off its nominal value, to either side.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tolerance {
    /// Which quantity.
    pub quantity: LayerQuantity,
    /// By how much.
    pub spread: Spread,
}

/// A quantity of a layer that can carry a tolerance.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LayerQuantity {
    /// Relative permittivity.
    Er,
    /// Thickness of a conductor or a dielectric.
    Thickness,
    /// Depth of a coating where there is no copper.
    DepthOnLaminate,
    /// Depth of a coating on the copper's top.
    DepthOnCopper,
    /// Depth of a coating beside the copper's walls.
    DepthBesideCopper,
    /// Angle of the side walls.
    SideSlope,
    /// Shift of the edges.
    EtchBias,
}

/// Half-width of a tolerance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Spread {
    /// As a fraction of the nominal value.
    Relative(f64),
    /// In the unit of the quantity: m, rad or 1.
    Absolute(f64),
}

/// What a layer is. Lengths in m.
#[derive(Debug, Clone, PartialEq)]
pub enum LayerKind {
    /// A half-space; first or last.
    Open {
        /// What fills it.
        material: Material,
    },
    /// A film that follows the copper under it.
    Coating {
        /// What it is made of.
        material: Material,
        /// Film thickness where there is no copper.
        depth_on_laminate: f64,
        /// Film thickness on the copper's top.
        depth_on_copper: f64,
        /// Film thickness beside the copper's walls.
        depth_beside_copper: f64,
    },
    /// Copper patterned by artwork or shapes.
    Conductor {
        /// 0 for a sheet.
        thickness: f64,
        /// Name of the layer whose material lies between the copper; `None`: by the fixed rule.
        fill: Option<Named>,
        /// Angle of the side walls from the horizontal, rad; π/2 is upright.
        side_slope: f64,
        /// Which face has the artwork's width.
        wide_face: WideFace,
        /// Outward shift of every edge of the artwork.
        etch_bias: f64,
    },
    /// A slab.
    Dielectric {
        /// What it is made of.
        material: Material,
        /// Copper face to copper face, positive.
        thickness: f64,
        /// Flows between the copper of the adjoining inner layer.
        prepreg: bool,
        /// Name of the layer whose material lies where the pattern is absent; `None`: by the fixed rule.
        fill: Option<Named>,
        /// Artwork file outside of which the layer is absent; shapes in the job do the same.
        pattern: Option<Named>,
    },
}

/// Which face of a conductor has the width of the artwork.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum WideFace {
    /// The face on the conductor's core: the lower one for the top half of the board, the upper one below.
    #[default]
    OnCore,
    /// The upper face.
    Upper,
    /// The lower face.
    Lower,
}

/// An isotropic dielectric.
#[derive(Debug, Clone, PartialEq)]
pub struct Material {
    /// Name of the material; the layer's name when it has none of its own.
    pub name: String,
    /// Relative permittivity at the job's frequency, positive.
    pub er: f64,
    /// Where `er` comes from, for the head of every report: "stackup", "job", "assumed", "table at 1 GHz".
    pub er_source: String,
    /// Loss tangent.
    pub loss_tangent: Option<f64>,
    /// S/m.
    pub conductivity: Option<f64>,
    /// Dielectric strength, V/m.
    pub strength: Option<f64>,
}

impl Material {
    /// A lossless material of relative permittivity `er` that `er_source` vouches for.
    #[must_use]
    pub fn new(name: impl Into<String>, er: f64, er_source: impl Into<String>) -> Self {
        Material {
            name: name.into(),
            er,
            er_source: er_source.into(),
            loss_tangent: None,
            conductivity: None,
            strength: None,
        }
    }
}
