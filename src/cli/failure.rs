//! Whatever ends a run early, from every stage, and how it is shown.

use miette::Diagnostic;

use crate::artwork::ArtworkErrors;
use crate::cli::error::CliError;
use crate::cli::render::{Colour, render};
use crate::cli::sources::Sources;
use crate::diag::Origin;
use crate::extract::ExtractError;
use crate::job::JobErrors;
use crate::report::ReportError;
use crate::slab::SlabErrors;

/// How many errors are shown one by one.
const MAX_SHOWN: usize = 20;

/// Why a run ended early.
#[derive(Debug)]
#[non_exhaustive]
pub enum Failure {
    /// The command itself; the origin is the line of the job that named the file.
    Command(CliError, Origin),
    /// The job or the stackup is wrong.
    Job(JobErrors),
    /// The artwork is wrong.
    Artwork(ArtworkErrors),
    /// Artwork and stackup give no model.
    Slab(SlabErrors),
    /// The model could not be solved.
    Extract(ExtractError),
    /// A report could not be printed.
    Report(ReportError),
}

impl Failure {
    /// The message for people, with the lines of their files around it.
    #[must_use]
    pub fn render(&self, sources: &Sources, colour: Colour) -> String {
        let in_file = |file| Origin { file, ..Origin::default() };
        let problems: Vec<(&dyn Diagnostic, Origin)> = match self {
            Failure::Command(error, origin) => vec![(error, *origin)],
            Failure::Job(errors) => {
                let origin = in_file(Some(errors.file()));
                errors.problems().iter().map(|problem| (problem as &dyn Diagnostic, origin)).collect()
            }
            Failure::Artwork(errors) => {
                errors.0.iter().map(|error| (error as &dyn Diagnostic, in_file(error.file))).collect()
            }
            Failure::Slab(errors) => {
                errors.0.iter().map(|error| (error as &dyn Diagnostic, error.origin())).collect()
            }
            Failure::Extract(error) => vec![(error, Origin::default())],
            Failure::Report(error) => vec![(error, Origin::default())],
        };
        let shown = problems.iter().take(MAX_SHOWN);
        let mut text: String =
            shown.map(|(problem, origin)| render(*problem, *origin, sources, colour)).collect();
        if MAX_SHOWN < problems.len() {
            text.push_str(&format!("and {} more errors\n", problems.len() - MAX_SHOWN));
        }
        text
    }
}

impl From<CliError> for Failure {
    fn from(error: CliError) -> Self {
        Failure::Command(error, Origin::default())
    }
}

impl From<JobErrors> for Failure {
    fn from(errors: JobErrors) -> Self {
        Failure::Job(errors)
    }
}

impl From<ArtworkErrors> for Failure {
    fn from(errors: ArtworkErrors) -> Self {
        Failure::Artwork(errors)
    }
}

impl From<SlabErrors> for Failure {
    fn from(errors: SlabErrors) -> Self {
        Failure::Slab(errors)
    }
}

impl From<ExtractError> for Failure {
    fn from(error: ExtractError) -> Self {
        Failure::Extract(error)
    }
}

impl From<ReportError> for Failure {
    fn from(error: ReportError) -> Self {
        Failure::Report(error)
    }
}
