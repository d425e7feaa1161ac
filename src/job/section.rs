//! A TOML table as a checked section: keys against their list, values against their type, every problem noted with
//! its place. The readers above this know what the keys mean; here is only how a value is written.

use crate::diag::{FileId, Origin, Span, Warned, Warning};
use crate::job::Named;
use crate::job::error::{JobErrors, JobProblem, nearest};
use crate::job::keys::KeySet;
use crate::units::{Unit, UnitError, brief, parse};
use std::ops::Range;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// Lengths beyond this are taken for slips of the unit, m.
pub(super) const LARGEST_LENGTH: f64 = 10.0;
/// Sizes below this are taken for slips of the unit, m: smaller than an atom.
const SMALLEST_SIZE: f64 = 1e-12;
/// Problems beyond this are not kept: a file of noise must not fill the memory.
const MOST_PROBLEMS: usize = 1000;
/// More layers than this are taken for noise; no process makes a tenth of them.
pub(super) const MOST_LAYERS: usize = 1000;

/// What is noted while one file is read.
#[derive(Debug)]
pub(super) struct Notes {
    file: FileId,
    problems: Vec<JobProblem>,
    warnings: Vec<Warning>,
    unused: Vec<Named>,
}

impl Notes {
    pub(super) fn new(file: FileId) -> Self {
        Notes { file, problems: Vec::new(), warnings: Vec::new(), unused: Vec::new() }
    }

    pub(super) fn problem(&mut self, problem: JobProblem) {
        if self.problems.len() < MOST_PROBLEMS {
            self.problems.push(problem);
        }
    }

    /// How many problems are noted so far.
    pub(super) fn n_problems(&self) -> usize {
        self.problems.len()
    }

    /// Takes back the problems after the first `count`.
    pub(super) fn forgive(&mut self, count: usize) {
        self.problems.truncate(count);
    }

    pub(super) fn warn(&mut self, text: String, span: Span) {
        self.warnings.push(Warning::new(text, Origin::new(self.file, span)));
    }

    /// A warning about a place in another file.
    pub(super) fn warn_at(&mut self, text: String, origin: Origin) {
        self.warnings.push(Warning::new(text, origin));
    }

    /// Notes that `what` is understood but has no effect yet.
    pub(super) fn unused(&mut self, what: String, span: Span) {
        self.unused.push(Named { name: what, origin: Origin::new(self.file, span) });
    }

    pub(super) fn take_unused(&mut self) -> Vec<Named> {
        std::mem::take(&mut self.unused)
    }

    pub(super) fn origin(&self, span: Span) -> Origin {
        Origin::new(self.file, span)
    }

    pub(super) fn named(&self, name: &str, span: Span) -> Named {
        Named { name: name.to_owned(), origin: self.origin(span) }
    }

    /// The value when nothing was wrong, else everything that was.
    pub(super) fn finish<T>(self, value: T, what: &'static str) -> Result<Warned<T>, JobErrors> {
        if self.problems.is_empty() {
            Ok(Warned { value, warnings: self.warnings })
        } else {
            Err(JobErrors::new(what, self.file, self.problems))
        }
    }
}

/// Parses `text`; syntax errors are noted, and then the table is not to be used.
pub(super) fn parse_toml<'t>(text: &'t str, notes: &mut Notes) -> Option<Spanned<DeTable<'t>>> {
    let (table, errors) = DeTable::parse_recoverable(text);
    if errors.is_empty() {
        return Some(table);
    }
    for error in errors {
        let at = span_of(error.span().unwrap_or(text.len()..text.len()));
        notes.problem(JobProblem::Syntax {
            format: "TOML",
            message: error.message().to_owned(),
            at: at.into(),
        });
    }
    None
}

/// A table whose keys have been checked.
#[derive(Debug, Clone, Copy)]
pub(super) struct Section<'t> {
    table: &'t DeTable<'t>,
    span: Span,
    set: &'static KeySet,
}

impl<'t> Section<'t> {
    /// Checks every key of `table` against `set`.
    pub(super) fn open(
        table: &'t DeTable<'t>,
        span: Span,
        set: &'static KeySet,
        notes: &mut Notes,
    ) -> Section<'t> {
        for key in table.keys() {
            let name: &str = key.get_ref();
            if !set.keys.contains(&name) {
                notes.problem(JobProblem::UnknownKey {
                    key: name.to_owned(),
                    section: set.name,
                    nearest: nearest(name, set.keys.iter().copied()),
                    known: set.keys.iter().map(|k| (*k).to_owned()).collect(),
                    at: span_of(key.span()).into(),
                });
            }
        }
        Section { table, span, set }
    }

    /// The bytes that the section is known by.
    pub(super) fn span(self) -> Span {
        self.span
    }

    /// The value of `key`, which must be in the section's list.
    pub(super) fn get(self, key: &'static str) -> Option<Item<'t>> {
        debug_assert!(self.set.keys.contains(&key), "`{key}` is not listed for {}", self.set.name);
        let (found, value) = self.table.get_key_value(key)?;
        Some(Item { key, key_span: span_of(found.span()), value })
    }

    /// The value of `key`; its absence is a problem. `example` is what to add.
    pub(super) fn require(
        self,
        key: &'static str,
        example: &'static str,
        notes: &mut Notes,
    ) -> Option<Item<'t>> {
        let item = self.get(key);
        if item.is_none() {
            let at = self.span.into();
            notes.problem(JobProblem::MissingKey { key, section: self.set.name, example, at });
        }
        item
    }

    /// Notes a problem when both keys are there.
    pub(super) fn exclude(self, first: &'static str, second: &'static str, notes: &mut Notes) {
        if let (Some(a), Some(b)) = (self.get(first), self.get(second)) {
            notes.problem(JobProblem::ConflictingKeys {
                section: self.set.name,
                first,
                second,
                first_at: a.key_span.into(),
                at: b.key_span.into(),
            });
        }
    }

    /// The keys that are there, with their places.
    pub(super) fn keys(self) -> impl Iterator<Item = (&'t str, Span)> {
        self.table.keys().map(|key| (key.get_ref().as_ref(), span_of(key.span())))
    }
}

/// What sign a length may have.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Size {
    /// A coordinate or a shift.
    Signed,
    /// Zero or more.
    NotNegative,
    /// More than zero.
    Positive,
}

/// A value, and the key that it belongs to.
#[derive(Debug, Clone, Copy)]
pub(super) struct Item<'t> {
    /// The key.
    pub(super) key: &'static str,
    /// Where the key stands.
    pub(super) key_span: Span,
    value: &'t Spanned<DeValue<'t>>,
}

impl<'t> Item<'t> {
    /// Where the value stands.
    pub(super) fn span(self) -> Span {
        span_of(self.value.span())
    }

    /// The string that the value is, if it is one.
    pub(super) fn text(self) -> Option<&'t str> {
        self.value.get_ref().as_str()
    }

    /// How many entries the list has; 0 when the value is no list.
    pub(super) fn n_entries(self) -> usize {
        self.value.get_ref().as_array().map_or(0, |array| array.len())
    }

    pub(super) fn is_list(self) -> bool {
        self.value.get_ref().is_array()
    }

    pub(super) fn is_empty_list(self) -> bool {
        self.is_list() && self.n_entries() == 0
    }

    /// A string, as it stands.
    pub(super) fn raw_text(self, expected: &'static str, notes: &mut Notes) -> Option<&'t str> {
        let text = self.value.get_ref().as_str();
        if text.is_none() {
            self.wrong_type(expected, notes);
        }
        text
    }

    /// A name or a path: a string that is not blank.
    pub(super) fn name(self, notes: &mut Notes) -> Option<Named> {
        let text = self.raw_text("a string", notes)?;
        if text.trim().is_empty() {
            notes.problem(JobProblem::EmptyName { key: self.key, at: self.span().into() });
            return None;
        }
        Some(notes.named(text, self.span()))
    }

    /// `true` or `false`.
    pub(super) fn flag(self, notes: &mut Notes) -> Option<bool> {
        let flag = self.value.get_ref().as_bool();
        if flag.is_none() {
            self.wrong_type("true or false", notes);
        }
        flag
    }

    /// One of a few words.
    pub(super) fn word<T: Copy>(self, choices: &[(&'static str, T)], notes: &mut Notes) -> Option<T> {
        let text = self.raw_text("a string", notes)?;
        let found = choices.iter().find(|(word, _)| *word == text).map(|(_, value)| *value);
        if found.is_none() {
            notes.problem(JobProblem::UnknownWord {
                key: self.key,
                found: text.to_owned(),
                nearest: nearest(text, choices.iter().map(|(word, _)| *word)),
                known: choices.iter().map(|(word, _)| (*word).to_owned()).collect(),
                at: self.span().into(),
            });
        }
        found
    }

    /// A pure number, finite.
    pub(super) fn number(self, notes: &mut Notes) -> Option<f64> {
        let Some(number) = self.as_number() else {
            self.wrong_type("a number", notes);
            return None;
        };
        if number.is_finite() {
            return Some(number);
        }
        self.out_of_range(number.to_string(), "a finite number", notes);
        None
    }

    /// The number that the value is, if it is one.
    pub(super) fn as_number(self) -> Option<f64> {
        match self.value.get_ref() {
            DeValue::Float(float) => float.as_str().parse().ok(),
            DeValue::Integer(whole) if whole.radix() == 10 => whole.as_str().parse().ok(),
            #[expect(clippy::cast_precision_loss, reason = "no quantity needs more than 53 bits")]
            DeValue::Integer(whole) => {
                i64::from_str_radix(whole.as_str(), whole.radix()).ok().map(|n| n as f64)
            }
            _ => None,
        }
    }

    /// A string with a unit, in SI.
    pub(super) fn quantity(self, unit: Unit, notes: &mut Notes) -> Option<f64> {
        let at = self.span().into();
        let missing = |found: String| JobProblem::MissingUnit { key: self.key, found, unit, at };
        if let Some(number) = self.as_number() {
            notes.problem(missing(format!("the bare number {number}")));
            return None;
        }
        let text = self.raw_text("a string with a unit", notes)?;
        match parse(text, unit) {
            Ok(value) => Some(value),
            Err(UnitError::NoUnit { text, .. }) => {
                notes.problem(missing(format!("`{text}`")));
                None
            }
            Err(reason) => {
                notes.problem(JobProblem::BadQuantity { key: self.key, reason, unit, at });
                None
            }
        }
    }

    /// A length in m, of a size that makes sense.
    pub(super) fn length(self, size: Size, notes: &mut Notes) -> Option<f64> {
        let value = self.quantity(Unit::Length, notes)?;
        let small = size != Size::Signed && value.abs() > 0.0 && value.abs() < SMALLEST_SIZE;
        if value.abs() > LARGEST_LENGTH || small {
            let found = brief(value, Unit::Length);
            notes.problem(JobProblem::AbsurdLength { key: self.key, found, at: self.span().into() });
            return None;
        }
        let allowed = match size {
            Size::NotNegative if value < 0.0 => "zero or more",
            Size::Positive if value <= 0.0 => "more than zero",
            _ => return Some(value),
        };
        self.out_of_range(brief(value, Unit::Length), allowed, notes);
        None
    }

    /// Two lengths, m.
    pub(super) fn point(self, notes: &mut Notes) -> Option<[f64; 2]> {
        let list = self.list("a point such as [\"1 mm\", \"2 mm\"]", notes)?;
        let [x, y] = list.as_slice() else {
            self.list_length(list.len(), "two lengths, x and y", notes);
            return None;
        };
        let x = x.length(Size::Signed, notes);
        let y = y.length(Size::Signed, notes);
        Some([x?, y?])
    }

    /// The entries of a list.
    pub(super) fn list(self, expected: &'static str, notes: &mut Notes) -> Option<Vec<Item<'t>>> {
        let Some(array) = self.value.get_ref().as_array() else {
            self.wrong_type(expected, notes);
            return None;
        };
        Some(array.iter().map(|value| Item { value, ..self }).collect())
    }

    /// A list of names, each once.
    pub(super) fn names(self, notes: &mut Notes) -> Option<Vec<Named>> {
        let list = self.list("a list of names", notes)?;
        Some(list.into_iter().filter_map(|entry| entry.name(notes)).collect())
    }

    /// A table whose keys are in `set`.
    pub(super) fn section(self, set: &'static KeySet, notes: &mut Notes) -> Option<Section<'t>> {
        let Some(table) = self.value.get_ref().as_table() else {
            self.wrong_type("a table", notes);
            return None;
        };
        Some(Section::open(table, self.span(), set, notes))
    }

    /// A list of tables whose keys are in `set`.
    pub(super) fn sections(self, set: &'static KeySet, notes: &mut Notes) -> Vec<Section<'t>> {
        let list = self.list("a list of tables", notes).unwrap_or_default();
        list.into_iter().filter_map(|entry| entry.section(set, notes)).collect()
    }

    /// A table with keys of the user's choice.
    pub(super) fn entries(self, notes: &mut Notes) -> Vec<(&'t str, Item<'t>)> {
        let Some(table) = self.value.get_ref().as_table() else {
            self.wrong_type("a table", notes);
            return Vec::new();
        };
        table
            .iter()
            .map(|(key, value)| {
                let key_span = span_of(key.span());
                (key.get_ref().as_ref(), Item { key: self.key, key_span, value })
            })
            .collect()
    }

    pub(super) fn out_of_range(self, found: String, allowed: &'static str, notes: &mut Notes) {
        notes.problem(JobProblem::OutOfRange { key: self.key, found, allowed, at: self.span().into() });
    }

    pub(super) fn list_length(self, found: usize, expected: &'static str, notes: &mut Notes) {
        notes.problem(JobProblem::ListLength { key: self.key, found, expected, at: self.span().into() });
    }

    pub(super) fn wrong_type(self, expected: &'static str, notes: &mut Notes) {
        let found = match self.value.get_ref() {
            DeValue::String(_) => "a string",
            DeValue::Integer(_) | DeValue::Float(_) => "a number",
            DeValue::Boolean(_) => "true or false",
            DeValue::Datetime(_) => "a date",
            DeValue::Array(_) => "a list",
            DeValue::Table(_) => "a table",
        };
        notes.problem(JobProblem::WrongType { key: self.key, expected, found, at: self.span().into() });
    }
}

/// A byte range as a span.
pub(super) fn span_of(range: Range<usize>) -> Span {
    range.into()
}
