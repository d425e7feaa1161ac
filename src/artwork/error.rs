//! What can be wrong with artwork.

use super::drill::DrillError;
use super::gerber::GerberError;
use crate::diag::{FileId, Origin, Span};
use miette::Diagnostic;
use thiserror::Error;

/// Everything wrong with the artwork, at once.
#[derive(Debug, Clone, PartialEq)]
pub struct ArtworkErrors(
    /// At least one, in the order of the files.
    pub Vec<ArtworkError>,
);

impl std::fmt::Display for ArtworkErrors {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self.0.as_slice() {
            [one] => write!(f, "{one}"),
            several => {
                write!(f, "{} problems with the artwork", several.len())?;
                several.iter().try_for_each(|error| write!(f, "\n  {error}"))
            }
        }
    }
}

impl std::error::Error for ArtworkErrors {}

/// One problem with the artwork: what, and in which file. Labels are byte ranges of that file.
#[derive(Debug, Clone, PartialEq)]
pub struct ArtworkError {
    /// The file, when the problem lies in one.
    pub file: Option<FileId>,
    /// What is wrong.
    pub problem: Problem,
}

impl ArtworkError {
    /// A problem at `origin`.
    #[must_use]
    pub fn at(origin: Origin, problem: Problem) -> Self {
        ArtworkError { file: origin.file, problem }
    }
}

impl std::fmt::Display for ArtworkError {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        self.problem.fmt(f)
    }
}

impl std::error::Error for ArtworkError {
    fn source(&self) -> Option<&(dyn std::error::Error + 'static)> {
        self.problem.source()
    }
}

impl Diagnostic for ArtworkError {
    fn code<'a>(&'a self) -> Option<Box<dyn std::fmt::Display + 'a>> {
        self.problem.code()
    }

    fn help<'a>(&'a self) -> Option<Box<dyn std::fmt::Display + 'a>> {
        self.problem.help()
    }

    fn labels(&self) -> Option<Box<dyn Iterator<Item = miette::LabeledSpan> + '_>> {
        self.file.and_then(|_| self.problem.labels())
    }
}

/// What is wrong.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum Problem {
    /// A Gerber file breaks its format or holds what we do not represent.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Gerber(
        /// What exactly.
        #[from]
        GerberError,
    ),
    /// A drill file breaks its format or holds what we do not represent.
    #[error(transparent)]
    #[diagnostic(transparent)]
    Drill(
        /// What exactly.
        #[from]
        DrillError,
    ),
    /// Two nets share metal.
    #[error("nets `{a}` and `{b}` are shorted in layer `{layer}` at ({:.4} mm, {:.4} mm)", at_mm[0], at_mm[1])]
    #[diagnostic(
        code(artwork::short),
        help(
            "move the copper apart, or tie the two outside the region with `join` under the `[nets]` of the job and give them one name here"
        )
    )]
    Short {
        /// One net.
        a: String,
        /// The other.
        b: String,
        /// Layer where they meet.
        layer: String,
        /// A point that both share, mm.
        at_mm: [f64; 2],
        /// One of the two objects.
        #[label("one of the two")]
        span: Span,
    },
    /// A layer that the stackup lacks.
    #[error("layer `{name}` is not in the stackup, which has {}", list(known))]
    #[diagnostic(
        code(artwork::unknown_layer),
        help("use one of the stackup's names, or add the layer to it")
    )]
    UnknownLayer {
        /// The name.
        name: String,
        /// The stackup's layers.
        known: Vec<String>,
        /// Where it is named.
        #[label("named here")]
        span: Span,
    },
    /// A layer number that the stackup lacks.
    #[error("`{file}` is conductor layer {number}, and the stackup has {known} conductor layers")]
    #[diagnostic(
        code(artwork::layer_number),
        help("check that stackup and artwork belong together, or map the file with `files` in the job")
    )]
    LayerNumber {
        /// The file.
        file: String,
        /// Its layer number, from 1 at the top.
        number: u32,
        /// How many the stackup has.
        known: usize,
    },
    /// A layer that is of the wrong kind for its use.
    #[error("layer `{name}` is not {expected}")]
    #[diagnostic(code(artwork::layer_kind), help("choose a layer of the right kind"))]
    LayerKind {
        /// The layer.
        name: String,
        /// What it should be.
        expected: &'static str,
        /// Where it is named.
        #[label("named here")]
        span: Span,
    },
    /// A Gerber file whose layer cannot be told.
    #[error("nothing says which layer `{file}` is")]
    #[diagnostic(
        code(artwork::unknown_role),
        help("list it under `[artwork] files` with `layer = ...`, `profile = true` or the like")
    )]
    UnknownRole {
        /// The file.
        file: String,
    },
    /// Two files for one layer.
    #[error("`{first}` and `{second}` both say that they are {role}")]
    #[diagnostic(
        code(artwork::same_role),
        help("list the right one under `[artwork] files`, or take the other out of the folder")
    )]
    SameRole {
        /// One file.
        first: String,
        /// The other.
        second: String,
        /// What both are.
        role: String,
    },
    /// A file whose polarity means more than we represent.
    #[error("`{file}` has {found} polarity: expected {expected}")]
    #[diagnostic(
        code(artwork::polarity),
        help("export the layer with the usual polarity; docs/unsupported.md says why")
    )]
    Polarity {
        /// The file.
        file: String,
        /// Its polarity.
        found: String,
        /// The usual one for its layer.
        expected: &'static str,
    },
    /// A label that hits no copper.
    #[error("the label `{net}` hits no copper of layer `{layer}` at ({:.4} mm, {:.4} mm)", at_mm[0], at_mm[1])]
    #[diagnostic(code(artwork::label_misses), help("choose a point on the copper that the name belongs to"))]
    LabelMisses {
        /// The name.
        net: String,
        /// The layer.
        layer: String,
        /// The point, mm.
        at_mm: [f64; 2],
        /// The label.
        #[label("this label")]
        span: Span,
    },
    /// A drawn shape that has no area or crosses itself.
    #[error("a drawn shape is unusable: {reason}")]
    #[diagnostic(code(artwork::shape), help("give it a positive size, within 10 m of the origin"))]
    Shape {
        /// Why.
        reason: &'static str,
        /// The shape.
        #[label("this shape")]
        span: Span,
    },
    /// A file that should be artwork and is none we know.
    #[error("`{file}` is neither Gerber nor a drill file")]
    #[diagnostic(
        code(artwork::not_artwork),
        help("export it as Gerber (layers) or as XNC or Excellon (drills)")
    )]
    NotArtwork {
        /// The file.
        file: String,
    },
    /// A pattern file that the stackup names and nobody gave.
    #[error("pattern file `{file}` of layer `{layer}` is not among the files read")]
    #[diagnostic(
        code(artwork::pattern_file),
        help("put it into the artwork folder, or list it under `[artwork] files`")
    )]
    PatternFile {
        /// The file.
        file: String,
        /// The layer.
        layer: String,
        /// Where it is named.
        #[label("named here")]
        span: Span,
    },
    /// A line of the netlist breaks its format.
    #[error("the netlist `{file}` has a line that is malformed: expected {expected}")]
    #[diagnostic(code(artwork::netlist), help("export it as IPC-D-356A again, or leave it out"))]
    Netlist {
        /// The file.
        file: String,
        /// What should stand there.
        expected: &'static str,
        /// The line.
        #[label("this line")]
        span: Span,
    },
    /// The job file cannot be read.
    #[error("`{file}` is not a Gerber job file: {reason}")]
    #[diagnostic(
        code(artwork::job_file),
        help("export it again, or leave it out and list the files in the job")
    )]
    JobFile {
        /// The file.
        file: String,
        /// What the reader says.
        reason: String,
    },
    /// A setting that no run can use.
    #[error("the chord error is {found} m: expected a positive number of at most 1 mm")]
    #[diagnostic(code(artwork::chord_error), help("ask for a chord error between the grid step and 1 mm"))]
    ChordError {
        /// What was asked for.
        found: f64,
    },
}

fn list(names: &[String]) -> String {
    names.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ")
}
