//! A stackup written as TOML.

use crate::diag::{FileId, Span, Warned};
use crate::job::error::JobErrors;
use crate::job::keys;
use crate::job::read_layer::read_layer;
use crate::job::section::{MOST_LAYERS, Notes, Section, parse_toml, span_of};
use crate::job::stackup::Stackup;
use crate::job::structure::{Patches, check_structure, close_with_vacuum};

/// Reads a stackup file.
///
/// - `patches`: the materials of the job; they complete or override those of the stackup, by layer or material name.
/// - `frequency`: Hz, at which tables of permittivity are read; `None`: at their lowest.
///
/// # Errors
/// Every problem of the file, with its place.
pub fn read_stackup(
    text: &str,
    file: FileId,
    patches: &Patches,
    frequency: Option<f64>,
) -> Result<Warned<Stackup>, JobErrors> {
    let mut notes = Notes::new(file);
    let mut stackup = Stackup { layers: Vec::new(), unused: Vec::new() };
    if let Some(table) = parse_toml(text, &mut notes) {
        // A label on the whole file would bury the message: the first byte stands for it.
        let whole = span_of(0..text.len().min(1));
        let root = Section::open(table.get_ref(), whole, &keys::STACKUP, &mut notes);
        read_layers(root, whole, patches, frequency, &mut stackup, &mut notes);
    }
    stackup.unused = notes.take_unused();
    notes.finish(stackup, "stackup file")
}

fn read_layers(
    root: Section<'_>,
    whole: Span,
    patches: &Patches,
    frequency: Option<f64>,
    stackup: &mut Stackup,
    notes: &mut Notes,
) {
    let Some(list) = root.require("layer", "a `[[layer]]` for each layer, from top to bottom", notes) else {
        return;
    };
    if list.n_entries() > MOST_LAYERS {
        list.list_length(list.n_entries(), "1000 layers at most", notes);
        return;
    }
    let sections = list.sections(&keys::LAYER, notes);
    let n_sections = sections.len();
    for section in sections {
        stackup.layers.extend(read_layer(section, patches, frequency, notes));
    }
    // Rules on the order make sense only when every layer is known.
    if stackup.layers.len() == n_sections {
        check_structure(&stackup.layers, whole, notes);
        close_with_vacuum(&mut stackup.layers, patches);
    }
}
