//! Job and stackup files: every key, real Gerber job files, and what is said when something is wrong.

mod bad;
mod board_files;
mod complete;
mod page;

use chargeskin::diag::{FileId, Warned};
use chargeskin::job::{Job, JobErrors, Stackup, read_job, read_stackup};
use miette::{GraphicalReportHandler, GraphicalTheme, NamedSource, Report};
use std::collections::BTreeMap;

const FILE: FileId = FileId(0);

/// What a user sees, without colour and at a fixed width.
fn render(errors: JobErrors, name: &str, text: &str) -> String {
    let report = Report::new(errors).with_source_code(NamedSource::new(name, text.to_owned()));
    let handler = GraphicalReportHandler::new_themed(GraphicalTheme::unicode_nocolor()).with_width(110);
    let mut out = String::new();
    handler.render_report(&mut out, report.as_ref()).unwrap();
    // Trailing blanks would be lost in an editor.
    out.lines().map(str::trim_end).collect::<Vec<_>>().join("\n")
}

fn job(text: &str) -> Warned<Job> {
    read_job(text, FILE).unwrap_or_else(|errors| panic!("{}", render(errors, "job.toml", text)))
}

fn stackup(text: &str) -> Warned<Stackup> {
    read_stackup(text, FILE, &BTreeMap::new(), None)
        .unwrap_or_else(|errors| panic!("{}", render(errors, "stackup.toml", text)))
}
