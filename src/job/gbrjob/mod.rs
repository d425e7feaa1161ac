//! The stackup inside a Gerber job file: tolerant of how it is written, loud about everything that was assumed.
//!
//! Real files give numbers as text, with a decimal comma, or not at all. What is missing comes from the job's
//! `[materials]`; a thickness of copper or mask that nobody states is assumed and warned about, a permittivity never.

mod fields;
mod layer;
mod listed;

use crate::diag::{FileId, Span, Warned};
use crate::job::error::{JobErrors, JobProblem};
use crate::job::section::{MOST_LAYERS, Notes};
use crate::job::stackup::{Layer, Stackup};
use crate::job::structure::{Patches, check_structure, close_with_vacuum};
use fields::Fields;
use layer::build_layers;
use listed::read_listed;

/// Reads the `MaterialStackup` of a Gerber job file.
///
/// - `patches`: the materials of the job; they complete or override those of the file, by layer or material name.
/// - `frequency`: Hz, compared with the one that the file states for a permittivity.
///
/// # Errors
/// Every problem of the file, with its place.
pub fn read_gbrjob_stackup(
    text: &str,
    file: FileId,
    patches: &Patches,
    frequency: Option<f64>,
) -> Result<Warned<Stackup>, JobErrors> {
    let mut notes = Notes::new(file);
    let mut stackup = Stackup { layers: Vec::new(), unused: Vec::new() };
    // Some exporters write a byte order mark, which JSON does not have.
    let json = text.trim_start_matches('\u{feff}');
    let start = text.len() - json.len();
    match Fields::parse(json, text) {
        Ok(root) => stackup.layers = read_layers(&root, patches, frequency, &mut notes),
        Err(error) => {
            let at = start + offset_of(json, error.line(), error.column());
            let message = error.to_string();
            // The place is shown by the label.
            let message = message.split(" at line ").next().unwrap_or_default().to_owned();
            notes.problem(JobProblem::Syntax { format: "JSON", message, at: (at, 0).into() });
        }
    }
    stackup.unused = notes.take_unused();
    notes.finish(stackup, "Gerber job file")
}

fn read_layers(
    root: &Fields<'_>,
    patches: &Patches,
    frequency: Option<f64>,
    notes: &mut Notes,
) -> Vec<Layer> {
    let whole = Span { start: root.span().start, end: root.span().start + 1 };
    let entries = root.list("MaterialStackup").unwrap_or_default();
    if entries.is_empty() {
        notes.problem(JobProblem::NoStackup { at: whole.into() });
        return Vec::new();
    }
    if entries.len() > MOST_LAYERS {
        notes.problem(JobProblem::ListLength {
            key: "MaterialStackup",
            found: entries.len(),
            expected: "1000 layers at most",
            at: whole.into(),
        });
        return Vec::new();
    }
    let list_start = entries.first().map_or(whole, |entry| entry.span());
    let board = root.table("GeneralSpecs").and_then(|specs| specs.length("BoardThickness", notes));
    let listed = read_listed(&entries, patches, frequency, notes);
    let n_listed = listed.len();
    let mut layers = build_layers(listed, board, notes);
    // Rules on the order make sense only when every layer is known.
    if layers.len() == n_listed {
        check_structure(&layers, Span { start: list_start.start, end: list_start.start + 1 }, notes);
        close_with_vacuum(&mut layers, patches);
    }
    layers
}

/// The byte that line and column, both counted from 1, stand for.
fn offset_of(text: &str, line: usize, column: usize) -> usize {
    let before: usize = text.split_inclusive('\n').take(line.saturating_sub(1)).map(str::len).sum();
    let mut offset = (before + column.saturating_sub(1)).min(text.len());
    while !text.is_char_boundary(offset) {
        offset -= 1;
    }
    offset
}
