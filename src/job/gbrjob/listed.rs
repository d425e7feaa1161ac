//! The entries of the layer list as the file states them, before anything is completed.

use crate::diag::Span;
use crate::job::MaterialPatch;
use crate::job::error::{JobProblem, nearest};
use crate::job::gbrjob::fields::{Fields, plain};
use crate::job::patch::patch_for;
use crate::job::permittivity::{Er, LARGEST_ER};
use crate::job::section::Notes;
use crate::job::structure::{Patches, unique_name};
use crate::units::{Unit, brief};

/// What an entry is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum EntryKind {
    Copper,
    Dielectric,
    SolderMask,
    /// Legend or paste, which carry no electrostatics worth the name.
    Ignored,
}

/// Words for the kinds, in the plain form of [`plain`].
const KINDS: [(&str, EntryKind); 12] = [
    ("copper", EntryKind::Copper),
    ("conductor", EntryKind::Copper),
    ("dielectric", EntryKind::Dielectric),
    ("core", EntryKind::Dielectric),
    ("prepreg", EntryKind::Dielectric),
    ("soldermask", EntryKind::SolderMask),
    ("mask", EntryKind::SolderMask),
    ("legend", EntryKind::Ignored),
    ("silkscreen", EntryKind::Ignored),
    ("solderpaste", EntryKind::Ignored),
    ("paste", EntryKind::Ignored),
    ("gluepaste", EntryKind::Ignored),
];

/// The types that the Gerber job format names, for messages.
const TYPES: [&str; 5] = ["Copper", "Dielectric", "SolderMask", "SolderPaste", "Legend"];

/// One layer as the file states it.
#[derive(Debug, Clone)]
pub(super) struct Listed {
    pub(super) kind: EntryKind,
    /// Unique.
    pub(super) name: String,
    pub(super) material: Option<String>,
    /// m.
    pub(super) thickness: Option<f64>,
    pub(super) er: Option<Er>,
    pub(super) loss_tangent: Option<f64>,
    pub(super) prepreg: bool,
    /// Whether a value is there that cannot be used; the problem is noted.
    pub(super) is_unusable: bool,
    /// What the job says of it.
    pub(super) patch: Option<MaterialPatch>,
    pub(super) span: Span,
}

/// The material that `[materials]` may name for every mask that names none.
const MASK_MATERIAL: &str = "SolderMask";

/// The copper, dielectric and mask layers among `entries`, top to bottom, with unique names.
pub(super) fn read_listed(
    entries: &[Fields<'_>],
    patches: &Patches,
    frequency: Option<f64>,
    notes: &mut Notes,
) -> Vec<Listed> {
    let kinds: Vec<Option<EntryKind>> = entries.iter().map(|entry| read_kind(entry, notes)).collect();
    let n_copper = kinds.iter().filter(|kind| **kind == Some(EntryKind::Copper)).count();
    let mut listed: Vec<Listed> = Vec::new();
    let mut left_out: Vec<String> = Vec::new();
    let mut count = Count::default();
    for (entry, kind) in entries.iter().zip(kinds) {
        let Some(kind) = kind else { continue };
        if kind == EntryKind::Ignored {
            let name = entry.text("Name").or_else(|| entry.text("Type")).unwrap_or_default();
            left_out.push(format!("`{name}`"));
            continue;
        }
        let made = count.next_name(kind, n_copper);
        let given = entry.text("Name").unwrap_or(made);
        let name = unique_name(&given, |taken| listed.iter().any(|other| other.name == taken));
        if name != given {
            notes.warn(format!("a second layer `{given}` is called `{name}` here"), entry.place("Name"));
        }
        let mut layer = name_entry(entry, kind, name, patches);
        read_values(entry, &mut layer, frequency, notes);
        listed.push(layer);
    }
    if let Some(first) = entries.first().filter(|_| !left_out.is_empty()) {
        let text = format!("legend and paste are not modelled, left out: {}", left_out.join(", "));
        notes.warn(text, first.span());
    }
    listed
}

fn read_kind(entry: &Fields<'_>, notes: &mut Notes) -> Option<EntryKind> {
    let Some(word) = entry.text("Type") else {
        notes.problem(JobProblem::MissingKey {
            key: "Type",
            section: "an entry of `MaterialStackup`",
            example: "`\"Type\": \"Dielectric\"` or another type",
            at: Span { start: entry.span().start, end: entry.span().start + 1 }.into(),
        });
        return None;
    };
    let kind = KINDS.iter().find(|(name, _)| *name == plain(&word)).map(|(_, kind)| *kind);
    if kind.is_none() {
        notes.problem(JobProblem::UnknownWord {
            key: "Type",
            nearest: nearest(&word, TYPES),
            known: TYPES.map(str::to_owned).to_vec(),
            found: word,
            at: entry.place("Type").into(),
        });
    }
    kind
}

/// Counts layers, to name those that the file does not.
#[derive(Debug, Default)]
struct Count {
    copper: usize,
    dielectric: usize,
}

impl Count {
    fn next_name(&mut self, kind: EntryKind, n_copper: usize) -> String {
        match kind {
            EntryKind::Copper => {
                self.copper += 1;
                match self.copper {
                    1 => "top".to_owned(),
                    n if n == n_copper => "bottom".to_owned(),
                    n => format!("inner-{}", n - 1),
                }
            }
            EntryKind::SolderMask if self.copper == 0 => "mask-top".to_owned(),
            EntryKind::SolderMask => "mask-bottom".to_owned(),
            EntryKind::Dielectric | EntryKind::Ignored => {
                self.dielectric += 1;
                format!("dielectric-{}", self.dielectric)
            }
        }
    }
}

/// What an entry is called and made of.
fn name_entry(entry: &Fields<'_>, kind: EntryKind, name: String, patches: &Patches) -> Listed {
    let usual = (kind == EntryKind::SolderMask).then(|| MASK_MATERIAL.to_owned());
    let material = entry.text("Material").or(usual);
    let says_prepreg = ["Type", "Material", "Notes", "Name"]
        .iter()
        .filter_map(|key| entry.text(key))
        .any(|text| plain(&text).contains("prepreg"));
    Listed {
        kind,
        thickness: None,
        er: None,
        loss_tangent: None,
        prepreg: kind == EntryKind::Dielectric && says_prepreg,
        is_unusable: false,
        patch: patch_for(patches, &name, material.as_deref()),
        span: entry.span(),
        material,
        name,
    }
}

/// The numbers of an entry. One that makes no sense is a problem, unless the job gives the value.
fn read_values(entry: &Fields<'_>, layer: &mut Listed, frequency: Option<f64>, notes: &mut Notes) {
    let count = notes.n_problems();
    layer.thickness = entry.length("Thickness", notes);
    if layer.thickness.is_some_and(|t| t <= 0.0) {
        let text = format!("the thickness 0 of `{}` is taken as not given", layer.name);
        notes.warn(text, entry.place("Thickness"));
        layer.thickness = None;
    }
    let is_patched = layer.patch.as_ref().is_some_and(|patch| patch.thickness.is_some());
    forgive_patched(entry, "Thickness", is_patched, count, notes);
    if layer.kind != EntryKind::Copper {
        let count = notes.n_problems();
        layer.er = read_er(entry, &layer.name, frequency, notes);
        let is_patched = layer.patch.as_ref().is_some_and(|patch| patch.er.is_some());
        forgive_patched(entry, "DielectricConstant", is_patched, count, notes);
        layer.loss_tangent = read_loss(entry, notes);
    }
    layer.is_unusable = notes.n_problems() > count;
}

/// Turns the problems after the first `count` into a warning when the job gives the value.
fn forgive_patched(entry: &Fields<'_>, key: &str, is_patched: bool, count: usize, notes: &mut Notes) {
    if is_patched && notes.n_problems() > count {
        notes.forgive(count);
        notes.warn(format!("`{key}` cannot be used, the job's value is"), entry.place(key));
    }
}

fn read_er(entry: &Fields<'_>, name: &str, frequency: Option<f64>, notes: &mut Notes) -> Option<Er> {
    let key = "DielectricConstant";
    let value = entry.number(key, notes)?;
    if value <= 0.0 || value > LARGEST_ER {
        let at = entry.place(key).into();
        notes.problem(JobProblem::Permittivity { key, found: value.to_string(), at });
        return None;
    }
    let stated = entry.number("Frequency", notes).filter(|f| *f > 0.0);
    let Some(stated) = stated else {
        return Some(Er { value, source: "stackup".to_owned() });
    };
    let at = brief(stated, Unit::Frequency);
    if let Some(wanted) = frequency.filter(|wanted| (wanted - stated).abs() > 0.01 * stated) {
        let wanted = brief(wanted, Unit::Frequency);
        notes.warn(format!("`er` of `{name}` holds at {at}, the job asks for {wanted}"), entry.place(key));
    }
    Some(Er { value, source: format!("stackup, at {at}") })
}

fn read_loss(entry: &Fields<'_>, notes: &mut Notes) -> Option<f64> {
    let key = "LossTangent";
    let value = entry.number(key, notes)?;
    if (0.0..=100.0).contains(&value) {
        return Some(value);
    }
    notes.problem(JobProblem::OutOfRange {
        key,
        found: value.to_string(),
        allowed: "0 to 100",
        at: entry.place(key).into(),
    });
    None
}
