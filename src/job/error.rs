//! What can be wrong with a job, a stackup or the two together. All problems of one file are reported at once.

use crate::diag::FileId;
use crate::units::{Unit, UnitError};
use miette::{Diagnostic, SourceSpan};
use thiserror::Error;

/// How many problems are rendered; the rest are counted.
const N_RENDERED: usize = 50;

/// Every problem of one file, in the order of the text. Never empty.
#[derive(Debug, Clone, PartialEq, Error)]
#[error("{}", summary(what, problems.len()))]
pub struct JobErrors {
    what: &'static str,
    file: FileId,
    problems: Vec<JobProblem>,
}

impl JobErrors {
    /// - `what`: "job file" or the like, for the head line.
    /// - `problems`: one or more, in any order.
    pub(super) fn new(what: &'static str, file: FileId, mut problems: Vec<JobProblem>) -> Self {
        problems.sort_by_key(|problem| problem.place().offset());
        JobErrors { what, file, problems }
    }

    /// The problems, in the order of the text.
    #[must_use]
    pub fn problems(&self) -> &[JobProblem] {
        &self.problems
    }

    /// The file that every label points into.
    #[must_use]
    pub fn file(&self) -> FileId {
        self.file
    }
}

impl Diagnostic for JobErrors {
    fn related<'a>(&'a self) -> Option<Box<dyn Iterator<Item = &'a dyn Diagnostic> + 'a>> {
        Some(Box::new(self.problems.iter().take(N_RENDERED).map(|problem| problem as &dyn Diagnostic)))
    }
}

fn summary(what: &str, count: usize) -> String {
    match count {
        1 => format!("the {what} has a problem"),
        n if n > N_RENDERED => format!("the {what} has {n} problems, the first {N_RENDERED} are"),
        n => format!("the {what} has {n} problems"),
    }
}

/// One problem. Each code has a section in `docs/errors.md`.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
#[expect(missing_docs, reason = "the fields are what the message of each variant names")]
pub enum JobProblem {
    /// The text is not well-formed.
    #[error("not valid {format}: {message}")]
    #[diagnostic(code(job::syntax), help("mend the {format} syntax here, then run again for the rest"))]
    Syntax {
        format: &'static str,
        message: String,
        #[label("here")]
        at: SourceSpan,
    },
    /// A key that its section does not take.
    #[error("`{key}` is not a key of {section}")]
    #[diagnostic(code(job::unknown_key), help("{}", spelling(nearest.as_deref(), known)))]
    UnknownKey {
        key: String,
        section: &'static str,
        nearest: Option<String>,
        known: Vec<String>,
        #[label("unknown key")]
        at: SourceSpan,
    },
    /// A key that its section cannot do without.
    #[error("{section} lacks `{key}`")]
    #[diagnostic(code(job::missing_key), help("add {example}"))]
    MissingKey {
        key: &'static str,
        section: &'static str,
        example: &'static str,
        #[label("add it here")]
        at: SourceSpan,
    },
    /// A value of another type.
    #[error("`{key}` is {found}, expected {expected}")]
    #[diagnostic(code(job::wrong_type), help("write {expected}"))]
    WrongType {
        key: &'static str,
        expected: &'static str,
        found: &'static str,
        #[label("{found}")]
        at: SourceSpan,
    },
    /// A number without a unit.
    #[error("`{key}` has no unit: {found}")]
    #[diagnostic(code(job::missing_unit), help("write {} such as `{key} = \"{}\"`", unit.what(), unit.example()))]
    MissingUnit {
        key: &'static str,
        found: String,
        unit: Unit,
        #[label("no unit")]
        at: SourceSpan,
    },
    /// A text that is not the quantity wanted.
    #[error("`{key}`: {reason}")]
    #[diagnostic(code(job::bad_quantity), help("write {} such as `{key} = \"{}\"`", unit.what(), unit.example()))]
    BadQuantity {
        key: &'static str,
        reason: UnitError,
        unit: Unit,
        #[label("not {}", unit.what())]
        at: SourceSpan,
    },
    /// A number of the Gerber job file that is none.
    #[error("`{key}` is not a number: `{found}`")]
    #[diagnostic(
        code(job::bad_number),
        help("write a plain number, or give the value under `[materials]` in the job")
    )]
    BadNumber {
        key: &'static str,
        found: String,
        #[label("not a number")]
        at: SourceSpan,
    },
    /// A value outside of what makes sense.
    #[error("`{key}` is {found}, allowed: {allowed}")]
    #[diagnostic(code(job::out_of_range), help("choose another value: {allowed}"))]
    OutOfRange {
        key: &'static str,
        found: String,
        allowed: &'static str,
        #[label("out of range")]
        at: SourceSpan,
    },
    /// A relative permittivity that no material has.
    #[error("`{key}` is {found}, expected a relative permittivity above 0 and up to 1e9")]
    #[diagnostic(
        code(job::permittivity),
        help("give the relative permittivity: 1 for air or vacuum, more for matter")
    )]
    Permittivity {
        key: &'static str,
        found: String,
        #[label("not a permittivity")]
        at: SourceSpan,
    },
    /// A slab of no thickness.
    #[error("`{layer}` is a dielectric of thickness {found}")]
    #[diagnostic(
        code(job::zero_thickness),
        help(
            "give the finished thickness, copper face to copper face; only a conductor may be a sheet of `0 um`"
        )
    )]
    ZeroThickness {
        layer: String,
        found: String,
        #[label("must be positive")]
        at: SourceSpan,
    },
    /// A length beyond the reach of the program.
    #[error("`{key}` is {found}, beyond the lengths that are modelled (1 pm to 10 m)")]
    #[diagnostic(code(job::absurd_length), help("check the number and its unit"))]
    AbsurdLength {
        key: &'static str,
        found: String,
        #[label("absurd length")]
        at: SourceSpan,
    },
    /// A word that is none of the choices.
    #[error("`{key}` is `{found}`, expected one of: {}", known.join(", "))]
    #[diagnostic(code(job::unknown_word), help("{}", spelling(nearest.as_deref(), known)))]
    UnknownWord {
        key: &'static str,
        found: String,
        nearest: Option<String>,
        known: Vec<String>,
        #[label("not one of them")]
        at: SourceSpan,
    },
    /// A name without letters.
    #[error("`{key}` is empty")]
    #[diagnostic(code(job::empty_name), help("write a name, or leave the key out"))]
    EmptyName {
        key: &'static str,
        #[label("empty")]
        at: SourceSpan,
    },
    /// A list that needs more entries.
    #[error("`{key}` has {}, expected {expected}", entries(*found))]
    #[diagnostic(code(job::list_length), help("list {expected}, or leave the key out"))]
    ListLength {
        key: &'static str,
        found: usize,
        expected: &'static str,
        #[label("{}", entries(*found))]
        at: SourceSpan,
    },
    /// Two keys that exclude each other.
    #[error("{section} has both `{first}` and `{second}`")]
    #[diagnostic(code(job::conflicting_keys), help("keep one of the two"))]
    ConflictingKeys {
        section: &'static str,
        first: &'static str,
        second: &'static str,
        #[label("this one")]
        first_at: SourceSpan,
        #[label("or this one")]
        at: SourceSpan,
    },
    /// A key that belongs to another kind of layer.
    #[error("`{key}` has no meaning on a layer of kind `{kind}`")]
    #[diagnostic(code(job::key_of_other_kind), help("remove it; it belongs to: {}", takers.join(", ")))]
    KeyOfOtherKind {
        key: String,
        kind: &'static str,
        takers: Vec<&'static str>,
        #[label("of another kind")]
        at: SourceSpan,
    },
    /// Two layers of one name.
    #[error("two layers are called `{name}`")]
    #[diagnostic(code(job::duplicate_layer), help("give each layer a name of its own"))]
    DuplicateLayer {
        name: String,
        #[label("first")]
        first: SourceSpan,
        #[label("again")]
        at: SourceSpan,
    },
    /// A half-space between other layers.
    #[error("open layer `{name}` stands between other layers")]
    #[diagnostic(
        code(job::open_inside),
        help("move it to the top or the bottom; an air gap is a `dielectric` with `er = 1` and a thickness")
    )]
    OpenInside {
        name: String,
        #[label("neither first nor last")]
        at: SourceSpan,
    },
    /// A coating between conductors.
    #[error("coating `{name}` stands between conductor layers")]
    #[diagnostic(
        code(job::coating_inside),
        help("move it above the top conductor or below the bottom one, or make it a `dielectric`")
    )]
    CoatingInside {
        name: String,
        #[label("between conductors")]
        at: SourceSpan,
    },
    /// Nothing that could carry a net.
    #[error("the stackup has no conductor layer")]
    #[diagnostic(code(job::no_conductor), help("add a `[[layer]]` with `kind = \"conductor\"`"))]
    NoConductor {
        #[label("no conductor in here")]
        at: SourceSpan,
    },
    /// A name that the stackup lacks.
    #[error("the stackup has no layer `{name}`")]
    #[diagnostic(code(job::unknown_layer), help("{}", spelling(nearest.as_deref(), known)))]
    UnknownLayer {
        name: String,
        nearest: Option<String>,
        known: Vec<String>,
        #[label("unknown layer")]
        at: SourceSpan,
    },
    /// A layer in a place that is for another kind.
    #[error("`{name}` is {is}, expected {wanted}")]
    #[diagnostic(code(job::wrong_layer_kind), help("name {wanted} here"))]
    WrongLayerKind {
        name: String,
        is: &'static str,
        wanted: &'static str,
        #[label("{is}")]
        at: SourceSpan,
    },
    /// A span of layers that runs upwards.
    #[error("`from` is `{from}`, which lies below `to`, `{to}`")]
    #[diagnostic(code(job::span_order), help("name the upper layer in `from` and the lower one in `to`"))]
    SpanOrder {
        from: String,
        to: String,
        #[label("below `{to}`")]
        at: SourceSpan,
    },
    /// Metal that belongs to no net.
    #[error("a shape on conductor layer `{layer}` has no net")]
    #[diagnostic(
        code(job::shape_without_net),
        help("add `net = \"...\"`; list the net under `float` if it floats")
    )]
    ShapeWithoutNet {
        layer: String,
        #[label("needs a net")]
        at: SourceSpan,
    },
    /// A net in the layer of a dielectric.
    #[error("net `{net}` is drawn on `{layer}`, which is {is}")]
    #[diagnostic(
        code(job::net_on_dielectric),
        help(
            "draw it on a conductor layer, and list `{layer}` under `through` if the metal goes through it"
        )
    )]
    NetOnDielectric {
        net: String,
        layer: String,
        is: &'static str,
        #[label("not a conductor layer")]
        at: SourceSpan,
    },
    /// A net that is to do two things.
    #[error("net `{net}` is listed under `{earlier}` and again under `{role}`")]
    #[diagnostic(
        code(job::net_with_two_roles),
        help("keep one of the two; nets that are joined play one part")
    )]
    NetWithTwoRoles {
        net: String,
        earlier: &'static str,
        role: &'static str,
        #[label("`{earlier}`")]
        earlier_at: SourceSpan,
        #[label("`{role}`")]
        at: SourceSpan,
    },
    /// A net that no shape draws, in a job without artwork.
    #[error("no shape draws net `{name}`, and the job has no artwork")]
    #[diagnostic(code(job::unknown_net), help("{}", spelling(nearest.as_deref(), known)))]
    UnknownNet {
        name: String,
        nearest: Option<String>,
        known: Vec<String>,
        #[label("unknown net")]
        at: SourceSpan,
    },
    /// A material that the stackup does not use.
    #[error("the stackup has no layer or material `{name}`")]
    #[diagnostic(code(job::unknown_material), help("{}", spelling(nearest.as_deref(), known)))]
    UnknownMaterial {
        name: String,
        nearest: Option<String>,
        known: Vec<String>,
        #[label("completes nothing")]
        at: SourceSpan,
    },
    /// A dielectric whose permittivity nobody states.
    #[error("the relative permittivity of `{layer}` ({what}) is not given")]
    #[diagnostic(
        code(job::missing_permittivity),
        help(
            "give it in the stackup, or add to the job:\n[materials]\n{} = {{ er = ... }}",
            toml_key(material)
        )
    )]
    MissingPermittivity {
        layer: String,
        material: String,
        what: String,
        #[label("no permittivity")]
        at: SourceSpan,
    },
    /// A layer whose thickness nobody states.
    #[error("the thickness of `{layer}` is not given")]
    #[diagnostic(
        code(job::missing_thickness),
        help(
            "give it in the stackup, or add to the job:\n[materials]\n{} = {{ thickness = \"...\" }}",
            toml_key(layer)
        )
    )]
    MissingThickness {
        layer: String,
        #[label("no thickness")]
        at: SourceSpan,
    },
    /// A Gerber job file without layers.
    #[error("the Gerber job file has no usable `MaterialStackup`")]
    #[diagnostic(code(job::no_stackup), help("write the stackup as TOML and name that file in the job"))]
    NoStackup {
        #[label("no list of layers")]
        at: SourceSpan,
    },
    /// A job without artwork and without shapes.
    #[error("the job names no artwork and draws no shape")]
    #[diagnostic(
        code(job::nothing_to_model),
        help("add `[artwork]` with `folder` or `files`, or a `[[shape]]`")
    )]
    NothingToModel {
        #[label("nothing to model")]
        at: SourceSpan,
    },
    /// An outline that encloses nothing.
    #[error("the {what} has no area")]
    #[diagnostic(code(job::no_area), help("check its points: they coincide or lie on one line"))]
    NoArea {
        what: &'static str,
        #[label("no area")]
        at: SourceSpan,
    },
}

impl JobProblem {
    /// The bytes that the problem is about.
    #[must_use]
    pub fn place(&self) -> SourceSpan {
        let labels = self.labels();
        let last = labels.and_then(Iterator::last);
        last.map_or_else(|| (0, 0).into(), |label| *label.inner())
    }
}

fn entries(count: usize) -> String {
    if count == 1 { "1 entry".to_owned() } else { format!("{count} entries") }
}

/// "write `x`", or the whole list when nothing comes near.
fn spelling(nearest: Option<&str>, known: &[String]) -> String {
    match nearest {
        Some(name) => format!("write `{name}`"),
        None if known.is_empty() => "remove it; there is none to choose from".to_owned(),
        None => format!("write one of: {}", known.join(", ")),
    }
}

/// `name` as a TOML key, quoted where it must be.
fn toml_key(name: &str) -> String {
    let bare = |c: char| c.is_ascii_alphanumeric() || c == '-' || c == '_';
    if !name.is_empty() && name.chars().all(bare) { name.to_owned() } else { format!("{name:?}") }
}

/// The entry of `known` that `name` was probably meant to be.
pub(super) fn nearest<'k>(name: &str, known: impl IntoIterator<Item = &'k str>) -> Option<String> {
    let lower = name.to_lowercase();
    let mut best: Option<(f64, &str)> = None;
    for candidate in known {
        let likeness = strsim::jaro_winkler(&lower, &candidate.to_lowercase());
        // Common practice for suggestions; a wrong one costs a glance.
        if likeness > 0.75 && best.is_none_or(|(most, _)| likeness > most) {
            best = Some((likeness, candidate));
        }
    }
    best.map(|(_, candidate)| candidate.to_owned())
}
