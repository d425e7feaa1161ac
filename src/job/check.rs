//! The job against its stackup: every layer and material that the job names exists, and is of the right kind.

use crate::diag::FileId;
use crate::job::error::{JobErrors, JobProblem, nearest};
use crate::job::stackup::{LayerId, LayerKind, Stackup};
use crate::job::structure::kind_name;
use crate::job::{DrawnShape, DrillPlan, FileContent, Job, Named};

/// Compares every name in `job` with `stackup`. All labels point into the job file.
///
/// A net on a dielectric layer listed under `through` is metal there (a post or an anchor); the layer in `layer` must
/// be a conductor. A shape without a net is the pattern of a dielectric.
///
/// # Errors
/// Every name that the stackup lacks, and every layer of a kind that cannot be meant.
pub fn check_names(job: &Job, stackup: &Stackup) -> Result<(), JobErrors> {
    let mut names = Names { stackup, problems: Vec::new() };
    for file in &job.artwork.files {
        match &file.content {
            FileContent::Layer(layer) => {
                names.kind(layer, "a layer that artwork can pattern", |kind| {
                    !matches!(kind, LayerKind::Open { .. })
                });
            }
            FileContent::Drill(plan) => names.drill(plan),
            FileContent::Unsaid | FileContent::Profile => {}
        }
    }
    for shape in &job.shapes {
        names.shape(shape);
    }
    for label in &job.nets.labels {
        names.conductor(&label.layer);
    }
    for plane in &job.nets.ground_planes {
        names.conductor(plane);
    }
    names.materials(job);
    if names.problems.is_empty() {
        return Ok(());
    }
    let file = job.stackup.origin.file.unwrap_or(FileId(0));
    Err(JobErrors::new("job file", file, names.problems))
}

struct Names<'s> {
    stackup: &'s Stackup,
    problems: Vec<JobProblem>,
}

impl Names<'_> {
    /// The layer that `name` names; its absence is noted.
    fn layer(&mut self, name: &Named) -> Option<LayerId> {
        let found = self.stackup.find(&name.name);
        if found.is_none() {
            let known: Vec<String> = self.stackup.layers.iter().map(|layer| layer.name.clone()).collect();
            self.problems.push(JobProblem::UnknownLayer {
                name: name.name.clone(),
                nearest: nearest(&name.name, known.iter().map(String::as_str)),
                known,
                at: name.origin.span.into(),
            });
        }
        found
    }

    /// The layer that `name` names, when its kind is one that `is_wanted`.
    fn kind(
        &mut self,
        name: &Named,
        wanted: &'static str,
        is_wanted: impl Fn(&LayerKind) -> bool,
    ) -> Option<LayerId> {
        let id = self.layer(name)?;
        let kind = &self.stackup.get(id).kind;
        if is_wanted(kind) {
            return Some(id);
        }
        self.problems.push(JobProblem::WrongLayerKind {
            name: name.name.clone(),
            is: kind_name(kind),
            wanted,
            at: name.origin.span.into(),
        });
        None
    }

    fn conductor(&mut self, name: &Named) -> Option<LayerId> {
        self.kind(name, "a conductor layer", |kind| matches!(kind, LayerKind::Conductor { .. }))
    }

    fn drill(&mut self, plan: &DrillPlan) {
        let from = plan.from.as_ref().and_then(|name| self.conductor(name));
        let to = plan.to.as_ref().and_then(|name| self.conductor(name));
        if let (Some(from_id), Some(to_id), Some(from), Some(to)) = (from, to, &plan.from, &plan.to)
            && from_id > to_id
        {
            self.problems.push(JobProblem::SpanOrder {
                from: from.name.clone(),
                to: to.name.clone(),
                at: from.origin.span.into(),
            });
        }
    }

    fn shape(&mut self, shape: &DrawnShape) {
        let Some(net) = &shape.net else {
            self.pattern(shape);
            return;
        };
        if let Some(id) = self.layer(&shape.layer) {
            let kind = &self.stackup.get(id).kind;
            if !matches!(kind, LayerKind::Conductor { .. }) {
                self.problems.push(JobProblem::NetOnDielectric {
                    net: net.name.clone(),
                    layer: shape.layer.name.clone(),
                    is: kind_name(kind),
                    at: shape.layer.origin.span.into(),
                });
            }
        }
        for layer in &shape.through {
            self.kind(layer, "a conductor or dielectric layer", |kind| {
                matches!(kind, LayerKind::Conductor { .. } | LayerKind::Dielectric { .. })
            });
        }
    }

    /// A shape without a net.
    fn pattern(&mut self, shape: &DrawnShape) {
        for layer in std::iter::once(&shape.layer).chain(&shape.through) {
            let Some(id) = self.layer(layer) else { continue };
            let kind = &self.stackup.get(id).kind;
            let at = layer.origin.span.into();
            let name = layer.name.clone();
            match kind {
                LayerKind::Dielectric { .. } => {}
                LayerKind::Conductor { .. } => {
                    self.problems.push(JobProblem::ShapeWithoutNet { layer: name, at });
                }
                LayerKind::Open { .. } | LayerKind::Coating { .. } => {
                    let wanted = "a dielectric layer for a shape without a net";
                    self.problems.push(JobProblem::WrongLayerKind { name, is: kind_name(kind), wanted, at });
                }
            }
        }
    }

    fn materials(&mut self, job: &Job) {
        let layers = &self.stackup.layers;
        let mut known: Vec<&str> = layers.iter().map(|layer| layer.name.as_str()).collect();
        known.extend(layers.iter().filter_map(|layer| layer.material()).map(|m| m.name.as_str()));
        known.sort_unstable();
        known.dedup();
        for (name, patch) in &job.materials {
            if known.binary_search(&name.as_str()).is_err() {
                self.problems.push(JobProblem::UnknownMaterial {
                    name: name.clone(),
                    nearest: nearest(name, known.iter().copied()),
                    known: known.iter().map(|k| (*k).to_owned()).collect(),
                    at: patch.origin.span.into(),
                });
            }
        }
    }
}
