//! Errors as text: the stage's message with the lines of the user's file around it.

use miette::{
    Diagnostic, GraphicalReportHandler, GraphicalTheme, LabeledSpan, NamedSource, Severity, SourceCode,
};
use std::fmt;

use crate::cli::sources::Sources;
use crate::diag::{FileId, Origin};

/// Longest line that is shown from a file; whole images can stand in one line.
const LINE_LIMIT: usize = 400;

/// Whether escape sequences for colour are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Colour {
    /// They are.
    On,
    /// They are not.
    Off,
}

/// Renders `diagnostic` with its related ones. Labels point into `file`; a diagnostic without labels is shown at
/// `origin`.
pub(crate) fn render(
    diagnostic: &dyn Diagnostic,
    origin: Origin,
    sources: &Sources,
    colour: Colour,
) -> String {
    let theme = match colour {
        Colour::On => GraphicalTheme::unicode(),
        Colour::Off => GraphicalTheme::unicode_nocolor(),
    };
    let handler = GraphicalReportHandler::new_themed(theme).with_width(100);
    let located = Located::new(diagnostic, origin, sources);
    let mut text = String::new();
    if handler.render_report(&mut text, &located).is_err() {
        text = format!("error: {diagnostic}\n");
    }
    if let Some(place) = located.place {
        text = format!("{}\n  at {place}\n", text.trim_end());
    }
    text
}

/// A diagnostic of a stage, with the file that the stage does not have.
struct Located<'a> {
    inner: &'a dyn Diagnostic,
    source: Option<NamedSource<String>>,
    label: Option<LabeledSpan>,
    /// Written below, where the source is not shown.
    place: Option<String>,
}

impl<'a> Located<'a> {
    fn new(inner: &'a dyn Diagnostic, origin: Origin, sources: &Sources) -> Self {
        let own = inner.labels().and_then(|mut labels| labels.next());
        let spans_text = origin.span.start < origin.span.end;
        let label = (own.is_none() && spans_text).then(|| {
            LabeledSpan::new_with_span(Some("here".to_owned()), miette::SourceSpan::from(origin.span))
        });
        let spot = own.as_ref().or(label.as_ref()).map(LabeledSpan::offset);
        let shown = origin.file.zip(spot).filter(|(id, at)| fits(sources, *id, *at)).map(|(id, _)| id);
        let place = match (origin.file, shown, spot) {
            (Some(id), None, Some(at)) => sources.place(Origin::new(id, at..at)),
            (Some(id), None, None) => Some(sources.name(id)),
            _ => None,
        };
        let source = shown.map(|id| NamedSource::new(sources.name(id), sources.text(id)));
        Located { inner, label: label.filter(|_| source.is_some()), source, place }
    }
}

/// Whether the line around `offset` is short enough to show.
fn fits(sources: &Sources, id: FileId, offset: usize) -> bool {
    let bytes = sources.bytes(id);
    let at = offset.min(bytes.len());
    // The line before and the line after are shown as well.
    let nearby = &bytes[at.saturating_sub(3 * LINE_LIMIT)..(at + 3 * LINE_LIMIT).min(bytes.len())];
    nearby.split(|b| *b == b'\n').all(|line| line.len() <= LINE_LIMIT)
}

impl fmt::Debug for Located<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Debug::fmt(self.inner, f)
    }
}

impl fmt::Display for Located<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Display::fmt(self.inner, f)
    }
}

impl std::error::Error for Located<'_> {}

impl Diagnostic for Located<'_> {
    fn code<'b>(&'b self) -> Option<Box<dyn fmt::Display + 'b>> {
        self.inner.code()
    }

    fn severity(&self) -> Option<Severity> {
        self.inner.severity()
    }

    fn help<'b>(&'b self) -> Option<Box<dyn fmt::Display + 'b>> {
        self.inner.help()
    }

    fn source_code(&self) -> Option<&dyn SourceCode> {
        self.source.as_ref().map(|source| source as &dyn SourceCode)
    }

    fn labels(&self) -> Option<Box<dyn Iterator<Item = LabeledSpan> + '_>> {
        match &self.label {
            Some(label) => Some(Box::new(std::iter::once(label.clone()))),
            None => self.inner.labels(),
        }
    }

    fn related<'b>(&'b self) -> Option<Box<dyn Iterator<Item = &'b dyn Diagnostic> + 'b>> {
        self.inner.related()
    }
}
