//! What the job's `[materials]` say, laid over what the stackup says. Permittivity is never guessed.

use crate::diag::Span;
use crate::job::MaterialPatch;
use crate::job::error::JobProblem;
use crate::job::permittivity::Er;
use crate::job::section::Notes;
use crate::job::stackup::Material;
use crate::job::structure::Patches;

/// The patch for a layer: what is said under the layer's name goes before what is said under its material's.
pub(super) fn patch_for(patches: &Patches, layer: &str, material: Option<&str>) -> Option<MaterialPatch> {
    let of_layer = patches.get(layer);
    let of_material = material.filter(|name| *name != layer).and_then(|name| patches.get(name));
    let (Some(own), Some(shared)) = (of_layer, of_material) else {
        return of_layer.or(of_material).cloned();
    };
    let er_from = if own.er.is_some() { own } else { shared };
    Some(MaterialPatch {
        er: er_from.er,
        er_source: er_from.er_source.clone(),
        loss_tangent: own.loss_tangent.or(shared.loss_tangent),
        strength: own.strength.or(shared.strength),
        thickness: own.thickness.or(shared.thickness),
        depth_on_copper: own.depth_on_copper.or(shared.depth_on_copper),
        prepreg: own.prepreg.or(shared.prepreg),
        origin: own.origin,
    })
}

/// What a stackup says of a layer's material.
#[derive(Debug, Clone)]
pub(super) struct Stated<'s> {
    pub(super) layer: &'s str,
    pub(super) material: Option<&'s str>,
    pub(super) er: Option<Er>,
    pub(super) loss_tangent: Option<f64>,
    /// Whether a missing permittivity means vacuum: only in an open layer.
    pub(super) vacuum_when_unsaid: bool,
    /// Where the layer stands.
    pub(super) at: Span,
}

/// The material as stated, completed and overridden by `patch`.
pub(super) fn complete_material(
    stated: Stated<'_>,
    patch: Option<&MaterialPatch>,
    notes: &mut Notes,
) -> Option<Material> {
    let patched = patch.and_then(|patch| patch.er.map(|value| Er { value, source: patch.er_source.clone() }));
    if let (Some(from_stackup), Some(from_job)) = (&stated.er, &patched)
        && (from_stackup.value - from_job.value).abs() > f64::EPSILON * from_job.value
    {
        let text = format!(
            "`er` of `{}` is {} in the stackup and {} in the job; the job's is used",
            stated.layer, from_stackup.value, from_job.value
        );
        notes.warn(text, stated.at);
    }
    let mut er = patched.or(stated.er);
    if er.is_none() && stated.vacuum_when_unsaid {
        notes.warn(
            format!("`er` of open layer `{}` is not given: vacuum, er 1, assumed", stated.layer),
            stated.at,
        );
        er = Some(Er { value: 1.0, source: "assumed".to_owned() });
    }
    let Some(er) = er else {
        notes.problem(JobProblem::MissingPermittivity {
            layer: stated.layer.to_owned(),
            material: stated.material.unwrap_or(stated.layer).to_owned(),
            what: stated
                .material
                .map_or_else(|| "no material named".to_owned(), |m| format!("material `{m}`")),
            at: stated.at.into(),
        });
        return None;
    };
    Some(Material {
        loss_tangent: patch.and_then(|patch| patch.loss_tangent).or(stated.loss_tangent),
        strength: patch.and_then(|patch| patch.strength),
        ..Material::new(stated.material.unwrap_or(stated.layer), er.value, er.source)
    })
}

/// Warns when the job gives a thickness that the stackup gives as well: it only completes.
pub(super) fn warn_idle_thickness(patch: Option<&MaterialPatch>, layer: &str, notes: &mut Notes) {
    if let Some(patch) = patch.filter(|patch| patch.thickness.is_some()) {
        let text = format!("`thickness` has no effect on `{layer}`: the stackup gives it");
        notes.warn_at(text, patch.origin);
    }
}

/// Warns when the job states a permittivity for a conductor, where it has no effect.
pub(super) fn warn_idle(patch: Option<&MaterialPatch>, layer: &str, notes: &mut Notes) {
    if let Some(patch) = patch.filter(|patch| patch.er.is_some()) {
        notes.warn_at(format!("`er` has no effect on conductor layer `{layer}`"), patch.origin);
    }
}
