//! What can be wrong with a drill file.

use crate::diag::Span;
use miette::Diagnostic;
use thiserror::Error;

/// A drill file that cannot be represented exactly.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum DrillError {
    /// No `M30` or `M00` at the end.
    #[error("the drill file is cut off: it does not end with `M30`")]
    #[diagnostic(
        code(artwork::drill::truncated),
        help("export the file again, or copy it again: its end is missing")
    )]
    Truncated {
        /// The end of the file.
        #[label("ends here")]
        span: Span,
    },
    /// A construct we know and do not represent.
    #[error("{construct} in a drill file is not supported")]
    #[diagnostic(
        code(artwork::drill::unsupported),
        help("export the drills without it; docs/unsupported.md lists what is refused and why")
    )]
    Unsupported {
        /// Its name.
        construct: String,
        /// Where.
        #[label("this")]
        span: Span,
    },
    /// A line that no dialect we know allows.
    #[error("drill line `{line}` is malformed: expected {expected}")]
    #[diagnostic(code(artwork::drill::malformed), help("mend the line, or export the file again"))]
    Malformed {
        /// The line, shortened.
        line: String,
        /// What should stand there.
        expected: &'static str,
        /// Where.
        #[label("this line")]
        span: Span,
    },
    /// `METRIC`, `INCH`, `M71` or `M72` is missing.
    #[error("the unit of the drill file is not declared")]
    #[diagnostic(code(artwork::drill::no_unit), help("add a line `METRIC` or `INCH` after `M48`"))]
    NoUnit {
        /// Where it is needed.
        #[label("needed here")]
        span: Span,
    },
    /// Coordinates without a decimal point, and nothing says how many decimals they have.
    #[error(
        "the digits of the drill coordinates are not declared, and the copper does not settle them: {found}"
    )]
    #[diagnostic(
        code(artwork::drill::digits),
        help(
            "add a line such as `;FILE_FORMAT=3:3` (digits before and after the point), and `LZ` or `TZ` behind the unit"
        )
    )]
    Digits {
        /// What was tried.
        found: String,
        /// The first such coordinate.
        #[label("read as what?")]
        span: Span,
    },
    /// A tool that has no diameter.
    #[error("tool `T{tool}` has no diameter")]
    #[diagnostic(code(artwork::drill::undefined_tool), help("define it in the header, as in `T{tool}C0.3`"))]
    UndefinedTool {
        /// Its number.
        tool: u32,
        /// Where it is used.
        #[label("used here")]
        span: Span,
    },
    /// A coordinate off the table.
    #[error("{what} of a drill file is out of range: expected at most 10 m, and a finite number")]
    #[diagnostic(code(artwork::drill::out_of_range), help("check the unit and the digits of the file"))]
    OutOfRange {
        /// Which number.
        what: &'static str,
        /// Where.
        #[label("this")]
        span: Span,
    },
    /// More holes than we are willing to make.
    #[error("the drill file makes more than {limit} holes")]
    #[diagnostic(code(artwork::drill::too_many), help("split the panel; one board is enough"))]
    TooMany {
        /// The limit.
        limit: usize,
        /// Where it was passed.
        #[label("here")]
        span: Span,
    },
}
