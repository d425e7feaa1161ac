//! The entries of the layer list as the file states them, before anything is completed.

use crate::diag::Span;
use crate::job::error::{JobProblem, nearest};
use crate::job::gbrjob::fields::{Fields, plain};
use crate::job::permittivity::{Er, LARGEST_ER};
use crate::job::section::Notes;
use crate::job::structure::unique_name;
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
    pub(super) span: Span,
}

/// The copper, dielectric and mask layers among `entries`, top to bottom, with unique names.
pub(super) fn read_listed(entries: &[Fields<'_>], frequency: Option<f64>, notes: &mut Notes) -> Vec<Listed> {
    let kinds: Vec<Option<EntryKind>> = entries.iter().map(|entry| read_kind(entry, notes)).collect();
    let n_copper = kinds.iter().filter(|kind| **kind == Some(EntryKind::Copper)).count();
    let mut listed: Vec<Listed> = Vec::new();
    let mut count = Count::default();
    for (entry, kind) in entries.iter().zip(kinds) {
        let Some(kind) = kind else { continue };
        if kind == EntryKind::Ignored {
            let name = entry.text("Name").or_else(|| entry.text("Type")).unwrap_or_default();
            notes.warn(format!("`{name}` is left out: legend and paste are not modelled"), entry.span());
            continue;
        }
        let made = count.next_name(kind, n_copper);
        let given = entry.text("Name").unwrap_or(made);
        let name = unique_name(&given, |taken| listed.iter().any(|other| other.name == taken));
        if name != given {
            notes.warn(format!("a second layer `{given}` is called `{name}` here"), entry.place("Name"));
        }
        listed.push(read_entry(entry, kind, name, frequency, notes));
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

fn read_entry(
    entry: &Fields<'_>,
    kind: EntryKind,
    name: String,
    frequency: Option<f64>,
    notes: &mut Notes,
) -> Listed {
    let mut thickness = entry.length("Thickness", notes);
    if thickness.is_some_and(|t| t <= 0.0) {
        notes.warn(format!("the thickness 0 of `{name}` is taken as not given"), entry.place("Thickness"));
        thickness = None;
    }
    let says_prepreg =
        ["Type", "Material", "Notes", "Name"].iter().filter_map(|key| entry.text(key)).any(|text| {
            let text = plain(&text);
            text.contains("prepreg")
        });
    Listed {
        kind,
        material: entry.text("Material"),
        thickness,
        er: if kind == EntryKind::Copper { None } else { read_er(entry, &name, frequency, notes) },
        loss_tangent: read_loss(entry, notes),
        prepreg: kind == EntryKind::Dielectric && says_prepreg,
        span: entry.span(),
        name,
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
