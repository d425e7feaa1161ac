//! What can be wrong with a Gerber file.

use crate::diag::Span;
use miette::Diagnostic;
use thiserror::Error;

/// A Gerber file that cannot be represented exactly.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum GerberError {
    /// The file ends too early (a file ends with `M02`).
    #[error("the file is cut off: {what}")]
    #[diagnostic(
        code(artwork::gerber::truncated),
        help("export the file again, or copy it again: its end is missing")
    )]
    Truncated {
        /// What is open.
        what: &'static str,
        /// Where.
        #[label("here")]
        span: Span,
    },
    /// A construct we know and do not represent.
    #[error("{construct} is not supported")]
    #[diagnostic(
        code(artwork::gerber::unsupported),
        help("export the layer without it; docs/unsupported.md lists what is refused and why")
    )]
    Unsupported {
        /// Its name.
        construct: String,
        /// Where.
        #[label("this")]
        span: Span,
    },
    /// A word that the format does not allow.
    #[error("{construct} is malformed: expected {expected}")]
    #[diagnostic(code(artwork::gerber::malformed), help("mend the word, or export the file again"))]
    Malformed {
        /// What was being read.
        construct: String,
        /// What should stand there.
        expected: &'static str,
        /// Where.
        #[label("this")]
        span: Span,
    },
    /// A setting is used before it is made.
    #[error("{what} is not declared before the first coordinate")]
    #[diagnostic(
        code(artwork::gerber::undeclared),
        help("add `{cure}` at the head of the file, with the values it was written in")
    )]
    Undeclared {
        /// Which setting.
        what: &'static str,
        /// The command that declares it.
        cure: &'static str,
        /// Where it is needed.
        #[label("needed here")]
        span: Span,
    },
    /// `Dnn` without `%ADDnn...%`.
    #[error("aperture `D{code}` is not defined")]
    #[diagnostic(
        code(artwork::gerber::undefined_aperture),
        help("define it with `%ADD{code}...*%` before its first use")
    )]
    UndefinedAperture {
        /// The number.
        code: u32,
        /// Where it is used.
        #[label("used here")]
        span: Span,
    },
    /// An aperture names a macro that is not there.
    #[error("aperture macro `{name}` is not defined")]
    #[diagnostic(
        code(artwork::gerber::undefined_macro),
        help("define it with `%AM{name}*...*%` before its first use")
    )]
    UndefinedMacro {
        /// The name.
        name: String,
        /// Where it is used.
        #[label("used here")]
        span: Span,
    },
    /// A draw or a flash before any aperture is selected.
    #[error("an object is drawn before an aperture is selected")]
    #[diagnostic(code(artwork::gerber::no_aperture), help("select one with `D10` or above first"))]
    NoAperture {
        /// Where.
        #[label("drawn here")]
        span: Span,
    },
    /// A length or coordinate off the table.
    #[error("{what} is out of range: expected at most 10 m, and a finite number")]
    #[diagnostic(
        code(artwork::gerber::out_of_range),
        help("check the coordinate format and the unit of the file")
    )]
    OutOfRange {
        /// Which number.
        what: &'static str,
        /// Where.
        #[label("this")]
        span: Span,
    },
    /// More objects than we are willing to make.
    #[error("{what} would make {count} {unit}, more than {limit}")]
    #[diagnostic(code(artwork::gerber::too_many), help("split the panel or the file; one board is enough"))]
    TooMany {
        /// What multiplies them.
        what: &'static str,
        /// How many it would be.
        count: u64,
        /// Of what.
        unit: &'static str,
        /// The limit.
        limit: u64,
        /// Where.
        #[label("here")]
        span: Span,
    },
    /// An arc whose ends do not fit its centre.
    #[error("an arc's ends lie at different distances from its centre: {start_mm} mm and {end_mm} mm")]
    #[diagnostic(
        code(artwork::gerber::bad_arc),
        help("check that the quadrant mode (G74, G75) stands before the arc, and the digits of I and J")
    )]
    BadArc {
        /// Distance of the start.
        start_mm: f64,
        /// Distance of the end.
        end_mm: f64,
        /// Where.
        #[label("this arc")]
        span: Span,
    },
    /// A block, region or step-repeat that is closed without being open, or left open.
    #[error("{what} is not properly nested")]
    #[diagnostic(code(artwork::gerber::nesting), help("each opening needs its closing command, in order"))]
    Nesting {
        /// Which construct.
        what: &'static str,
        /// Where.
        #[label("here")]
        span: Span,
    },
}
