//! Where a thing came from, and warnings that travel beside a value.
//!
//! Every net, layer and shape keeps an [`Origin`], so that an error found late in the pipeline still points at a
//! line of the user's file. Only `cli` turns a [`FileId`] back into a name and a text.

/// Index of an input file in the list that the caller keeps.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct FileId(pub u32);

/// Half-open range of bytes in one file.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Span {
    /// Offset of the first byte.
    pub start: usize,
    /// Offset just past the last byte.
    pub end: usize,
}

impl From<std::ops::Range<usize>> for Span {
    fn from(range: std::ops::Range<usize>) -> Self {
        Span { start: range.start, end: range.end }
    }
}

impl From<Span> for miette::SourceSpan {
    fn from(span: Span) -> Self {
        (span.start, span.end.saturating_sub(span.start)).into()
    }
}

/// The place in the user's files that a thing was made from; `None` where it was made by a default.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash, Default)]
pub struct Origin {
    /// The file, when the thing came from one.
    pub file: Option<FileId>,
    /// The bytes in that file; empty when `file` is `None`.
    pub span: Span,
}

impl Origin {
    /// The bytes `span` of file `file`.
    #[must_use]
    pub fn new(file: FileId, span: impl Into<Span>) -> Self {
        Origin { file: Some(file), span: span.into() }
    }
}

/// Something the user should know that does not stop the run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Warning {
    /// One line for people: lower case, no full stop, names in backticks.
    pub text: String,
    /// The place it is about.
    pub origin: Origin,
}

impl Warning {
    /// A warning about the place `origin`.
    #[must_use]
    pub fn new(text: impl Into<String>, origin: Origin) -> Self {
        Warning { text: text.into(), origin }
    }
}

/// A value and the warnings that arose while it was made.
#[derive(Debug, Clone, PartialEq)]
pub struct Warned<T> {
    /// The value.
    pub value: T,
    /// In the order in which they arose.
    pub warnings: Vec<Warning>,
}

impl<T> Warned<T> {
    /// A value without warnings.
    #[must_use]
    pub fn clean(value: T) -> Self {
        Warned { value, warnings: Vec::new() }
    }

    /// The value; its warnings are appended to `into`.
    pub fn drain(self, into: &mut Vec<Warning>) -> T {
        into.extend(self.warnings);
        self.value
    }
}
