//! The stackup as intervals of z, with the material of every layer and of every gap between copper.

use crate::job::{Layer, LayerId, LayerKind, Material, Stackup};
use crate::slab::error::SlabError;
use crate::slab::{MaterialId, SlabMaterial};

/// Layers that take up height, materials, and what fills gaps.
#[derive(Debug, Clone)]
pub(crate) struct Pile {
    /// Every layer but the coatings, from bottom to top; z = 0 at the bottom of the lowest finite one.
    pub(crate) entries: Vec<Entry>,
    /// Every dielectric, from bottom to top, and vacuum at the end.
    pub(crate) materials: Vec<SlabMaterial>,
    /// By layer: its own material.
    material: Vec<Option<MaterialId>>,
    /// By layer: what lies where its copper or its pattern is absent.
    fill: Vec<Option<MaterialId>>,
}

/// A layer that is no coating, and where it lies. m; infinite for half-spaces.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Entry {
    pub(crate) layer: LayerId,
    pub(crate) z_lo: f64,
    pub(crate) z_hi: f64,
    pub(crate) kind: EntryKind,
}

/// What a layer of the pile is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum EntryKind {
    Open,
    Conductor,
    Dielectric,
}

impl Pile {
    /// The material of `layer`, when it has one.
    pub(crate) fn material(&self, layer: LayerId) -> Option<MaterialId> {
        self.material[layer.idx()]
    }

    /// What lies in `layer` where its copper or its pattern is absent: of an open layer, its own material.
    pub(crate) fn fill(&self, layer: LayerId) -> MaterialId {
        self.fill[layer.idx()].or(self.material[layer.idx()]).unwrap_or_else(|| self.vacuum())
    }

    /// What bare holes are filled with.
    pub(crate) fn vacuum(&self) -> MaterialId {
        MaterialId(u32::try_from(self.materials.len() - 1).unwrap_or(u32::MAX))
    }

    /// The entry of `layer`, when it is no coating.
    pub(crate) fn entry(&self, layer: LayerId) -> Option<&Entry> {
        self.entries.iter().find(|entry| entry.layer == layer)
    }

    /// Lower and upper end of the finite layers, m.
    pub(crate) fn span(&self) -> (f64, f64) {
        let lo = self.entries.iter().map(|e| e.z_lo).filter(|z| z.is_finite()).fold(0.0, f64::min);
        let hi = self.entries.iter().map(|e| e.z_hi).filter(|z| z.is_finite()).fold(0.0, f64::max);
        (lo, hi)
    }
}

/// Stacks the layers of `stackup`; problems go to `errors`.
pub(crate) fn pile(stackup: &Stackup, errors: &mut Vec<SlabError>) -> Pile {
    let mut entries = Vec::new();
    let mut materials = Vec::new();
    let mut material = vec![None; stackup.layers.len()];
    let mut z = 0.0;
    for (id, layer) in stackup.iter().rev() {
        let last = id.idx() == 0;
        check_numbers(layer, errors);
        if let Some(found) = layer.material() {
            material[id.idx()] = Some(MaterialId(u32::try_from(materials.len()).unwrap_or(u32::MAX)));
            let Material { er, er_source, .. } = found;
            materials.push(SlabMaterial { name: layer.name.clone(), er: *er, er_source: er_source.clone() });
        }
        let (kind, z_lo, z_hi) = match &layer.kind {
            LayerKind::Open { .. } if last => (EntryKind::Open, z, f64::INFINITY),
            LayerKind::Open { .. } => (EntryKind::Open, f64::NEG_INFINITY, z),
            LayerKind::Coating { .. } => continue,
            LayerKind::Conductor { thickness, .. } => (EntryKind::Conductor, z, z + thickness),
            LayerKind::Dielectric { thickness, .. } => (EntryKind::Dielectric, z, z + thickness),
        };
        entries.push(Entry { layer: id, z_lo, z_hi, kind });
        z = if z_hi.is_finite() { z_hi } else { z };
    }
    materials.push(SlabMaterial { name: "vacuum".to_owned(), er: 1.0, er_source: "bare hole".to_owned() });
    let fill = stackup.iter().map(|(id, layer)| fill_of(stackup, &material, id, layer, errors)).collect();
    Pile { entries, materials, material, fill }
}

fn check_numbers(layer: &Layer, errors: &mut Vec<SlabError>) {
    let mut check = |what, value: f64, good: bool, expected| {
        if !(value.is_finite() && good) {
            let (layer_name, origin) = (layer.name.clone(), layer.origin);
            errors.push(SlabError::BadNumber { layer: layer_name, what, value, expected, origin });
        }
    };
    if let Some(material) = layer.material() {
        check("er", material.er, material.er > 0.0, "a positive number");
    }
    match &layer.kind {
        LayerKind::Open { .. } => {}
        LayerKind::Coating { depth_on_laminate, depth_on_copper, depth_beside_copper, .. } => {
            check(
                "depth_on_laminate",
                *depth_on_laminate,
                *depth_on_laminate >= 0.0,
                "a length of zero or more",
            );
            check("depth_on_copper", *depth_on_copper, *depth_on_copper >= 0.0, "a length of zero or more");
            check(
                "depth_beside_copper",
                *depth_beside_copper,
                *depth_beside_copper >= 0.0,
                "a length of zero or more",
            );
        }
        LayerKind::Conductor { thickness, side_slope, etch_bias, .. } => {
            check("thickness", *thickness, *thickness >= 0.0, "a length of zero or more");
            let leans = (0.17..=std::f64::consts::PI - 0.17).contains(side_slope);
            check("side_slope", *side_slope, leans, "an angle between 10 and 170 degrees");
            check("etch_bias", *etch_bias, true, "a finite length");
        }
        LayerKind::Dielectric { thickness, .. } => {
            check("thickness", *thickness, *thickness > 0.0, "a positive length");
        }
    }
}

/// The fixed rule for gaps: an explicit fill; else, in a layer with no dielectric outside of it, the open medium
/// there; else the neighbouring dielectric marked as prepreg (the upper one when both are); else the one above.
fn fill_of(
    stackup: &Stackup,
    material: &[Option<MaterialId>],
    id: LayerId,
    layer: &Layer,
    errors: &mut Vec<SlabError>,
) -> Option<MaterialId> {
    let explicit = match &layer.kind {
        LayerKind::Conductor { fill, .. } | LayerKind::Dielectric { fill, .. } => fill.as_ref(),
        LayerKind::Open { .. } | LayerKind::Coating { .. } => return None,
    };
    if let Some(named) = explicit {
        let found = stackup.find(&named.name).and_then(|layer| material[layer.idx()]);
        if found.is_none() {
            let (layer, fill) = (layer.name.clone(), named.name.clone());
            errors.push(SlabError::BadFill { layer, fill, origin: named.origin });
        }
        return found;
    }
    let dielectric = |k: &usize| match &stackup.layers[*k].kind {
        LayerKind::Dielectric { prepreg, .. } => Some((*k, *prepreg)),
        _ => None,
    };
    let above = (0..id.idx()).rev().find_map(|k| dielectric(&k));
    let below = (id.idx() + 1..stackup.layers.len()).find_map(|k| dielectric(&k));
    match (above, below) {
        (None, _) => material[0],
        (_, None) => material[stackup.layers.len() - 1],
        (Some((_, false)), Some((k, true))) => material[k],
        (Some((k, _)), _) => material[k],
    }
}
