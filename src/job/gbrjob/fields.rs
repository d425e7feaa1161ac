//! A JSON object read tolerantly: keys in any case, numbers as text, every value with its place in the file.

use crate::diag::Span;
use crate::job::error::JobProblem;
use crate::job::section::{LARGEST_LENGTH, Notes};
use crate::units::{Unit, brief, parse};
use serde_json::value::RawValue;
use std::collections::BTreeMap;

/// The fields of one object.
#[derive(Debug)]
pub(super) struct Fields<'t> {
    /// By key in lower case without blanks and marks.
    values: BTreeMap<String, &'t RawValue>,
    span: Span,
    whole: &'t str,
}

impl<'t> Fields<'t> {
    /// Parses `json`, a part of `whole`, that must be an object.
    pub(super) fn parse(json: &'t str, whole: &'t str) -> serde_json::Result<Self> {
        let values: BTreeMap<String, &'t RawValue> = serde_json::from_str(json)?;
        let values = values.into_iter().map(|(key, value)| (plain(&key), value)).collect();
        Ok(Fields { values, span: span_in(json.trim(), whole), whole })
    }

    /// Where the object stands.
    pub(super) fn span(&self) -> Span {
        self.span
    }

    /// The objects of the list under `key`; `None` when it is no list of objects.
    pub(super) fn list(&self, key: &str) -> Option<Vec<Fields<'t>>> {
        let entries: Vec<&'t RawValue> = serde_json::from_str(self.values.get(&plain(key))?.get()).ok()?;
        entries.into_iter().map(|raw| Fields::parse(raw.get(), self.whole).ok()).collect()
    }

    /// The object under `key`.
    pub(super) fn table(&self, key: &str) -> Option<Fields<'t>> {
        Fields::parse(self.values.get(&plain(key))?.get(), self.whole).ok()
    }

    /// The text under `key`, unless it is blank.
    pub(super) fn text(&self, key: &str) -> Option<String> {
        let text: String = serde_json::from_str(self.values.get(&plain(key))?.get()).ok()?;
        let text = text.trim();
        (!text.is_empty()).then(|| text.to_owned())
    }

    /// Where the value of `key` stands; the whole object when it is absent.
    pub(super) fn place(&self, key: &str) -> Span {
        self.values.get(&plain(key)).map_or(self.span, |raw| span_in(raw.get(), self.whole))
    }

    /// The number under `key`, unless it is absent or blank; what is no number is noted.
    pub(super) fn number(&self, key: &'static str, notes: &mut Notes) -> Option<f64> {
        let digits = self.digits(key)?;
        let number = digits.parse().ok().filter(|n: &f64| n.is_finite());
        if number.is_none() {
            self.bad_number(key, digits, notes);
        }
        number
    }

    /// The length under `key` in m: in mm unless its text has a unit. What is none, or absurd, is noted.
    pub(super) fn length(&self, key: &'static str, notes: &mut Notes) -> Option<f64> {
        let digits = self.digits(key)?;
        let value = parse(&digits, Unit::Length).or_else(|_| parse(&format!("{digits} mm"), Unit::Length));
        match value {
            Ok(value) if (0.0..=LARGEST_LENGTH).contains(&value) => Some(value),
            Ok(value) => {
                let found = brief(value, Unit::Length);
                notes.problem(JobProblem::AbsurdLength { key, found, at: self.place(key).into() });
                None
            }
            Err(_) => {
                self.bad_number(key, digits, notes);
                None
            }
        }
    }

    /// The value as it stands, with a decimal point for a comma and without quotes; `None` when absent, null or blank.
    fn digits(&self, key: &str) -> Option<String> {
        let raw = self.values.get(&plain(key))?.get();
        let text = serde_json::from_str::<String>(raw).unwrap_or_else(|_| raw.to_owned());
        let text = text.trim().replace(',', ".");
        (!text.is_empty() && text != "null").then_some(text)
    }

    fn bad_number(&self, key: &'static str, found: String, notes: &mut Notes) {
        notes.problem(JobProblem::BadNumber { key, found, at: self.place(key).into() });
    }
}

/// `text` in lower case, letters and digits only.
pub(super) fn plain(text: &str) -> String {
    text.chars().filter(|c| c.is_alphanumeric()).flat_map(char::to_lowercase).collect()
}

/// The place of `part` in `whole`, of which it is a slice.
fn span_in(part: &str, whole: &str) -> Span {
    let start = (part.as_ptr() as usize).saturating_sub(whole.as_ptr() as usize).min(whole.len());
    Span { start, end: (start + part.len()).min(whole.len()) }
}
