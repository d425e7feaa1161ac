//! Listed entries completed to layers: from the job's `[materials]`, from the board's thickness, by common practice.

use crate::diag::Span;
use crate::job::MaterialPatch;
use crate::job::error::JobProblem;
use crate::job::gbrjob::listed::{EntryKind, Listed};
use crate::job::patch::{Stated, complete_material, warn_idle, warn_idle_thickness};
use crate::job::section::Notes;
use crate::job::stackup::{Layer, LayerKind, Material, WideFace};
use crate::units::{Unit, brief};

/// Copper of one ounce per square foot, m. Common practice; the finished thickness of plated outer layers is more.
const COPPER: f64 = 35e-6;
/// Liquid solder mask on laminate, m. Common practice, 15 to 30 um.
const MASK: f64 = 20e-6;

/// The layers; those that lack something that cannot be assumed are left out, and a problem is noted.
///
/// - `board`: thickness of the whole board in m, if stated.
pub(super) fn build_layers(mut listed: Vec<Listed>, board: Option<f64>, notes: &mut Notes) -> Vec<Layer> {
    for entry in listed.iter_mut().filter(|entry| !entry.is_unusable) {
        complete_thickness(entry, notes);
    }
    deduce_thickness(&mut listed, board, notes);
    listed.into_iter().filter_map(|entry| build_layer(entry, notes)).collect()
}

/// From the job, else by common practice where there is one.
fn complete_thickness(entry: &mut Listed, notes: &mut Notes) {
    if entry.thickness.is_some() {
        warn_idle_thickness(entry.patch.as_ref(), &entry.name, notes);
        return;
    }
    entry.thickness = entry.patch.as_ref().and_then(|patch| patch.thickness);
    let usual = match entry.kind {
        EntryKind::Copper => COPPER,
        EntryKind::SolderMask => MASK,
        EntryKind::Dielectric | EntryKind::Ignored => return,
    };
    if entry.thickness.is_none() {
        let text = format!(
            "the thickness of `{}` is not given: {} assumed (common practice)",
            entry.name,
            brief(usual, Unit::Length)
        );
        notes.warn(text, start_of(entry.span));
        entry.thickness = Some(usual);
    }
}

/// One missing dielectric is what the others leave of the board. Real files show that the board's thickness counts
/// copper and masks.
fn deduce_thickness(listed: &mut [Listed], board: Option<f64>, notes: &mut Notes) {
    let known: f64 = listed.iter().filter_map(|entry| entry.thickness).sum();
    let mut missing = listed.iter_mut().filter(|entry| entry.thickness.is_none());
    let (Some(entry), None, Some(board)) = (missing.next(), missing.next(), board) else {
        return;
    };
    // Rounded to the nanometre, as sums of decimal fractions leave a trail of digits.
    let rest = ((board - known) * 1e9).round() / 1e9;
    if rest > 0.0 {
        let text = format!(
            "the thickness of `{}` is not given: {} assumed, the board's {} less copper and masks",
            entry.name,
            brief(rest, Unit::Length),
            brief(board, Unit::Length)
        );
        notes.warn(text, start_of(entry.span));
        entry.thickness = Some(rest);
    }
}

fn build_layer(entry: Listed, notes: &mut Notes) -> Option<Layer> {
    if entry.is_unusable {
        return None;
    }
    let patch = entry.patch.clone();
    let at = start_of(entry.span);
    if entry.thickness.is_none() {
        notes.problem(JobProblem::MissingThickness { layer: entry.name.clone(), at: at.into() });
    }
    let kind = if entry.kind == EntryKind::Copper {
        warn_idle(patch.as_ref(), &entry.name, notes);
        LayerKind::Conductor {
            thickness: entry.thickness?,
            fill: None,
            side_slope: std::f64::consts::FRAC_PI_2,
            wide_face: WideFace::OnCore,
            etch_bias: 0.0,
        }
    } else {
        if entry.loss_tangent.is_some_and(|loss| loss > 0.0) {
            notes.unused(format!("LossTangent of layer `{}`", entry.name), at);
        }
        let stated = Stated {
            layer: &entry.name,
            material: entry.material.as_deref(),
            er: entry.er.clone(),
            loss_tangent: entry.loss_tangent,
            vacuum_when_unsaid: false,
            at,
        };
        let material = complete_material(stated, patch.as_ref(), notes);
        dielectric_kind(&entry, material?, entry.thickness?, patch.as_ref(), notes)
    };
    Some(Layer { origin: notes.origin(at), ..Layer::new(entry.name, kind) })
}

fn dielectric_kind(
    entry: &Listed,
    material: Material,
    thickness: f64,
    patch: Option<&MaterialPatch>,
    notes: &mut Notes,
) -> LayerKind {
    if entry.kind == EntryKind::Dielectric {
        let prepreg = patch.and_then(|patch| patch.prepreg).unwrap_or(entry.prepreg);
        return LayerKind::Dielectric { material, thickness, prepreg, fill: None, pattern: None };
    }
    let depth = patch.and_then(|patch| patch.depth_on_copper).unwrap_or_else(|| {
        let text = format!(
            "the depth of `{}` on copper is not given: {} assumed, half of that on laminate",
            entry.name,
            brief(0.5 * thickness, Unit::Length)
        );
        notes.warn(text, start_of(entry.span));
        0.5 * thickness
    });
    LayerKind::Coating {
        material,
        depth_on_laminate: thickness,
        depth_on_copper: depth,
        depth_beside_copper: depth,
    }
}

/// The first byte of an entry: a label on all of it would bury the message.
fn start_of(span: Span) -> Span {
    Span { start: span.start, end: (span.start + 1).min(span.end) }
}
