//! Rules on the stackup as a whole, the same for both file forms: unique names, half-spaces at the ends, coatings
//! outside, a conductor somewhere, fills that exist. The half-spaces left out are added here.

use crate::diag::{Origin, Span};
use crate::job::error::{JobProblem, nearest};
use crate::job::section::Notes;
use crate::job::stackup::{Layer, LayerKind, Material};
use crate::job::{MaterialPatch, Named};
use std::collections::BTreeMap;

/// What the job says about layers and materials.
pub(super) type Patches = BTreeMap<String, MaterialPatch>;

/// Checks the order and the names of `layers`; `whole` is where a missing conductor is reported.
pub(super) fn check_structure(layers: &[Layer], whole: Span, notes: &mut Notes) {
    check_unique(layers, notes);
    check_order(layers, whole, notes);
    check_fills(layers, notes);
}

fn check_unique(layers: &[Layer], notes: &mut Notes) {
    let mut first: BTreeMap<&str, Span> = BTreeMap::new();
    for layer in layers {
        if let Some(earlier) = first.get(layer.name.as_str()) {
            notes.problem(JobProblem::DuplicateLayer {
                name: layer.name.clone(),
                first: (*earlier).into(),
                at: layer.origin.span.into(),
            });
        } else {
            first.insert(&layer.name, layer.origin.span);
        }
    }
}

fn check_order(layers: &[Layer], whole: Span, notes: &mut Notes) {
    let is_conductor = |layer: &Layer| matches!(layer.kind, LayerKind::Conductor { .. });
    let top = layers.iter().position(is_conductor);
    let bottom = layers.iter().rposition(is_conductor);
    if top.is_none() {
        notes.problem(JobProblem::NoConductor { at: whole.into() });
    }
    for (k, layer) in layers.iter().enumerate() {
        let at = layer.origin.span.into();
        match layer.kind {
            LayerKind::Open { .. } if k != 0 && k + 1 != layers.len() => {
                notes.problem(JobProblem::OpenInside { name: layer.name.clone(), at });
            }
            LayerKind::Coating { .. } if top.is_some_and(|t| t < k) && bottom.is_some_and(|b| k < b) => {
                notes.problem(JobProblem::CoatingInside { name: layer.name.clone(), at });
            }
            _ => {}
        }
    }
}

fn check_fills(layers: &[Layer], notes: &mut Notes) {
    for layer in layers {
        let (LayerKind::Conductor { fill, .. } | LayerKind::Dielectric { fill, .. }) = &layer.kind else {
            continue;
        };
        let Some(fill) = fill else { continue };
        let at = fill.origin.span.into();
        match find(layers, fill) {
            None if matches!(fill.name.as_str(), "above" | "below") => {}
            None => {
                let known: Vec<String> = layers
                    .iter()
                    .filter(|other| other.material().is_some() && other.name != layer.name)
                    .map(|other| other.name.clone())
                    .collect();
                notes.problem(JobProblem::UnknownLayer {
                    name: fill.name.clone(),
                    nearest: nearest(&fill.name, known.iter().map(String::as_str)),
                    known,
                    at,
                });
            }
            Some(other) if other.material().is_none() || other.name == layer.name => {
                notes.problem(JobProblem::WrongLayerKind {
                    name: fill.name.clone(),
                    is: if other.name == layer.name { "the layer itself" } else { kind_name(&other.kind) },
                    wanted: "another layer that is not a conductor",
                    at,
                });
            }
            Some(_) => {}
        }
    }
}

fn find<'l>(layers: &'l [Layer], name: &Named) -> Option<&'l Layer> {
    layers.iter().find(|layer| layer.name == name.name)
}

/// The kind of a layer with its article, for messages.
pub(super) fn kind_name(kind: &LayerKind) -> &'static str {
    match kind {
        LayerKind::Open { .. } => "an open layer",
        LayerKind::Coating { .. } => "a coating layer",
        LayerKind::Conductor { .. } => "a conductor layer",
        LayerKind::Dielectric { .. } => "a dielectric layer",
    }
}

/// Adds the half-spaces that were left out: vacuum, or what the job says about `above` and `below`.
pub(super) fn close_with_vacuum(layers: &mut Vec<Layer>, patches: &Patches) {
    let is_open = |layer: Option<&Layer>| matches!(layer.map(|l| &l.kind), Some(LayerKind::Open { .. }));
    if !is_open(layers.first()) {
        let layer = vacuum("above", layers, patches);
        layers.insert(0, layer);
    }
    if layers.len() == 1 || !is_open(layers.last()) {
        let layer = vacuum("below", layers, patches);
        layers.push(layer);
    }
}

fn vacuum(name: &str, layers: &[Layer], patches: &Patches) -> Layer {
    let patch = patches.get(name).filter(|_| layers.iter().all(|layer| layer.name != name));
    let name = unique_name(name, |taken| layers.iter().any(|layer| layer.name == taken));
    let mut material = Material::new("vacuum", 1.0, "vacuum, layer left out");
    let mut origin = Origin::default();
    if let Some((patch, er)) = patch.and_then(|patch| patch.er.map(|er| (patch, er))) {
        material = Material::new(&name, er, &patch.er_source);
        material.loss_tangent = patch.loss_tangent;
        material.strength = patch.strength;
        origin = patch.origin;
    }
    Layer { origin, ..Layer::new(name, LayerKind::Open { material }) }
}

/// `name`, or `name-2` and so on when it is taken.
pub(super) fn unique_name(name: &str, is_taken: impl Fn(&str) -> bool) -> String {
    let mut unique = name.to_owned();
    let mut count = 2;
    while is_taken(&unique) {
        unique = format!("{name}-{count}");
        count += 1;
    }
    unique
}
