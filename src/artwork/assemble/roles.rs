//! What each file is, by the best source there is, and what happens when two files claim one layer.

use super::{Parsed, Stage};
use crate::artwork::error::{ArtworkError, Problem};
use crate::artwork::job_file::{Entry, base_name};
use crate::artwork::layer_role::{self, DrillRole, Role, Side};
use crate::job::{FileContent, Layer, LayerId, LayerKind, Stackup};
use std::collections::BTreeMap;

/// Who says what a file is; the earlier, the better.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Source {
    Job,
    File,
    JobFile,
    Guess,
}

impl Stage<'_> {
    /// What file `k` is: the job's word first, then the file's own, then the job file's, then its extension.
    pub(super) fn role(&mut self, k: usize, parsed: &Parsed, entries: &[Entry]) -> Option<(Role, Source)> {
        let file = &self.files[k];
        let own = match parsed {
            Parsed::Gerber(plot) => plot.attribute(".FileFunction").and_then(layer_role::by_function),
            Parsed::Drill(read) => read.function.as_deref().and_then(layer_role::by_function),
            _ => None,
        };
        let stated = match &file.content {
            FileContent::Layer(name) => match self.stackup.find(&name.name) {
                Some(layer) => Some(Role::Layer(layer)),
                None => {
                    let known = self.stackup.layers.iter().map(|l| l.name.clone()).collect();
                    let problem =
                        Problem::UnknownLayer { name: name.name.clone(), known, span: name.origin.span };
                    self.errors.push(ArtworkError::at(name.origin, problem));
                    Some(Role::Ignored("its layer is unknown"))
                }
            },
            FileContent::Profile => Some(Role::Profile),
            FileContent::Drill(_) => match own {
                Some(Role::Drill(role)) => Some(Role::Drill(role)),
                _ => Some(Role::Drill(DrillRole::default())),
            },
            FileContent::Unsaid => None,
        };
        let pattern = || {
            let named = |layer: &(LayerId, &Layer)| match &layer.1.kind {
                LayerKind::Dielectric { pattern: Some(p), .. } => base_name(&p.name) == base_name(&file.name),
                _ => false,
            };
            self.stackup.iter().find(named).map(|(id, _)| Role::Layer(id))
        };
        if let Some(role) = stated.or_else(pattern) {
            return Some((role, Source::Job));
        }
        if let Some(role) = own {
            return Some((role, Source::File));
        }
        if let Some(entry) = entries.iter().find(|e| e.name == base_name(&file.name)) {
            return Some((entry.role.clone(), Source::JobFile));
        }
        layer_role::by_extension(&file.name).map(|role| (role, Source::Guess))
    }

    /// `.G1`, `.G2`: the first inner layer is 1 with some writers and 2 with others; a full set tells.
    pub(super) fn settle_inner(&mut self, roles: &mut [Option<(Role, Source)>]) {
        let mut inner: Vec<(u32, usize)> = Vec::new();
        for (k, role) in roles.iter().enumerate() {
            if let Some((Role::Inner(n), _)) = role {
                inner.push((*n, k));
            }
        }
        inner.sort_unstable();
        let n_conductors = self.stackup.conductors().count();
        for (role, _) in roles.iter_mut().flatten() {
            if let Role::Outer(side) = role {
                let last = u32::try_from(n_conductors).unwrap_or(u32::MAX);
                *role = Role::Conductor(if *side == Side::Top { 1 } else { last });
            }
        }
        if inner.len() + 2 == n_conductors {
            for (place, (_, k)) in (2u32..).zip(&inner) {
                roles[*k] = Some((Role::Conductor(place), Source::Guess));
            }
        } else {
            for (_, k) in inner {
                roles[k] = None;
            }
        }
    }

    /// Two files with one role: a guess yields to a stated role, two stated ones are refused.
    pub(super) fn refuse_doubles(&mut self, roles: &mut [Option<(Role, Source)>]) {
        let mut taken: BTreeMap<String, usize> = BTreeMap::new();
        for k in 0..roles.len() {
            let Some((role, source)) = &roles[k] else { continue };
            let key = match role {
                Role::Conductor(n) => format!("conductor layer {n}"),
                Role::Layer(id) => match layer_number(self.stackup, *id) {
                    Some(n) => format!("conductor layer {n}"),
                    None => continue,
                },
                Role::Profile => "the profile".to_owned(),
                _ => continue,
            };
            let source = *source;
            let Some(other) = taken.insert(key.clone(), k) else { continue };
            let theirs = roles[other].as_ref().map_or(Source::Guess, |r| r.1);
            // A listed file may come in several parts; a folder's files may not.
            if source == Source::Job && theirs == Source::Job {
                continue;
            }
            let weaker = if source == theirs { None } else { Some(if source > theirs { k } else { other }) };
            let (first, second) = (self.files[other].name.clone(), self.files[k].name.clone());
            match weaker {
                None => self.fail(k, Problem::SameRole { first, second, role: key }),
                Some(weak) => {
                    let name = self.files[weak].name.clone();
                    self.warn(
                        weak,
                        format!("`{name}` is left out: another file is {key} by a better source"),
                    );
                    roles[weak] = Some((Role::Ignored("another file has its role"), Source::Job));
                    let kept = if weak == k { other } else { k };
                    taken.insert(key, kept);
                }
            }
        }
    }
}

fn layer_number(stackup: &Stackup, id: LayerId) -> Option<usize> {
    stackup.conductors().position(|layer| layer == id).map(|k| k + 1)
}
