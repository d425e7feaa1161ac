//! Why artwork and stackup give no slab model.

use crate::diag::Origin;
use crate::geom::region::{Grid, Point};
use miette::Diagnostic;
use std::fmt;
use thiserror::Error;

/// A point of the artwork, m; shown in mm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Place {
    /// x, m.
    pub x: f64,
    /// y, m.
    pub y: f64,
}

impl Place {
    /// The point `at` of `grid`.
    #[must_use]
    pub fn new(grid: Grid, at: Point) -> Self {
        Place { x: grid.length(at.x), y: grid.length(at.y) }
    }
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        // Rounded to 1 nm, without trailing zeros.
        let mm = |x: f64| (x * 1e9).round() / 1e6;
        write!(f, "({} mm, {} mm)", mm(self.x), mm(self.y))
    }
}

/// Every reason found, in the order in which they were met.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[error("the slab model cannot be built: {}", .0.first().map_or_else(String::new, ToString::to_string))]
#[diagnostic(code(slab::refused))]
pub struct SlabErrors(
    /// At least one.
    #[related]
    pub Vec<SlabError>,
);

/// Why artwork and stackup give no slab model.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum SlabError {
    /// A rule names a net that the artwork lacks.
    #[error("`{key}` names the net `{name}`, which the artwork lacks")]
    #[diagnostic(code(slab::unknown_net), help("{}", nearest_help(nearest)))]
    UnknownNet {
        /// The key of the job that names it.
        key: &'static str,
        /// The name.
        name: String,
        /// Names of the artwork that are close to it, nearest first.
        nearest: Vec<String>,
        /// Where it is named.
        origin: Origin,
    },
    /// A net has two parts to play.
    #[error("the net `{name}` is listed under `{first}` and under `{second}`")]
    #[diagnostic(code(slab::two_roles), help("leave the net in one of the two lists"))]
    TwoRoles {
        /// The net.
        name: String,
        /// One list.
        first: &'static str,
        /// The other list.
        second: &'static str,
        /// Where it stands in the second.
        origin: Origin,
    },
    /// A listed row has no copper in the window.
    #[error("the row net `{name}` has no copper in the region")]
    #[diagnostic(code(slab::row_outside), help("widen `region`, or take `{name}` out of `rows`"))]
    RowOutside {
        /// The net.
        name: String,
        /// Where it is listed.
        origin: Origin,
    },
    /// No net has a row.
    #[error("no net in the region has a row: {named} named nets, all of them ground or floating")]
    #[diagnostic(code(slab::no_rows), help("list at least one net of the region under `rows`"))]
    NoRows {
        /// How many named nets have copper there.
        named: usize,
    },
    /// There is no copper in the window.
    #[error("the region holds no copper")]
    #[diagnostic(
        code(slab::empty_region),
        help("move or widen `region`; the artwork's copper spans {copper}")
    )]
    EmptyRegion {
        /// Where there is copper.
        copper: String,
    },
    /// A window without area, or beyond the grid.
    #[error("the region's window from {lo} to {hi} has no area that fits the grid")]
    #[diagnostic(code(slab::bad_window), help("give the lower left corner first, then the upper right one"))]
    BadWindow {
        /// Lower left corner.
        lo: Place,
        /// Upper right corner.
        hi: Place,
    },
    /// Two nets touch.
    #[error("nets `{first}` and `{second}` touch in `{layer}` at {place} ({cause})")]
    #[diagnostic(
        code(slab::short),
        help("separate the two, or list them together under `join` when they are tied on purpose")
    )]
    Short {
        /// One net.
        first: String,
        /// The other net.
        second: String,
        /// The layer.
        layer: String,
        /// Where.
        place: Place,
        /// What made them touch.
        cause: &'static str,
        /// The drill or copper that does it.
        origin: Origin,
    },
    /// A fill names a layer that has no material.
    #[error("the fill `{fill}` of `{layer}` is not a dielectric, coating or open layer")]
    #[diagnostic(code(slab::bad_fill), help("name a layer that has a permittivity"))]
    BadFill {
        /// The layer that is to be filled.
        layer: String,
        /// The name given.
        fill: String,
        /// Where it stands.
        origin: Origin,
    },
    /// A number of the stackup cannot be built.
    #[error("`{layer}`: {what} is {value}, which cannot be built")]
    #[diagnostic(code(slab::bad_number), help("give {what} as {expected}"))]
    BadNumber {
        /// The layer.
        layer: String,
        /// Which number.
        what: &'static str,
        /// Its value, SI.
        value: f64,
        /// What would do.
        expected: &'static str,
        /// Where the layer stands.
        origin: Origin,
    },
    /// A ground plane that cannot be one.
    #[error("`ground_plane` names `{name}`, {why}")]
    #[diagnostic(
        code(slab::bad_plane),
        help("name conductor layers, at most one below and one above all rows")
    )]
    BadPlane {
        /// The name given.
        name: String,
        /// What is wrong with it.
        why: &'static str,
        /// Where it stands.
        origin: Origin,
    },
    /// A row net touches a ground plane or lies beyond it.
    #[error("the net `{net}` {how} the ground plane `{plane}` at {place}")]
    #[diagnostic(
        code(slab::plane_short),
        help("list `{net}` under `ground`, or take `{plane}` out of `ground_plane`")
    )]
    PlaneShort {
        /// The net.
        net: String,
        /// The plane's layer.
        plane: String,
        /// "touches" or "has copper beyond".
        how: &'static str,
        /// Where.
        place: Place,
        /// The net's copper.
        origin: Origin,
    },
    /// The model would not fit the grid.
    #[error("the model would reach {size} m, beyond what a grid of {step} m can carry")]
    #[diagnostic(code(slab::too_large), help("choose a smaller region, or check the units of the stackup"))]
    TooLarge {
        /// Largest coordinate, m.
        size: f64,
        /// Grid step, m.
        step: f64,
    },
    /// Two planes or layers leave nothing between them.
    #[error("nothing is left between the ground planes")]
    #[diagnostic(code(slab::nothing_left), help("name planes with at least one layer between them"))]
    NothingLeft,
}

impl SlabError {
    /// The line of the user's files that it is about; the default where it is about the whole.
    #[must_use]
    pub fn origin(&self) -> Origin {
        match self {
            SlabError::UnknownNet { origin, .. }
            | SlabError::TwoRoles { origin, .. }
            | SlabError::RowOutside { origin, .. }
            | SlabError::Short { origin, .. }
            | SlabError::BadFill { origin, .. }
            | SlabError::BadNumber { origin, .. }
            | SlabError::BadPlane { origin, .. }
            | SlabError::PlaneShort { origin, .. } => *origin,
            SlabError::NoRows { .. }
            | SlabError::EmptyRegion { .. }
            | SlabError::BadWindow { .. }
            | SlabError::TooLarge { .. }
            | SlabError::NothingLeft => Origin::default(),
        }
    }
}

fn nearest_help(nearest: &[String]) -> String {
    match nearest {
        [] => "name a net of the artwork".to_owned(),
        names => {
            let quoted: Vec<String> = names.iter().map(|name| format!("`{name}`")).collect();
            format!("the artwork has {}", quoted.join(", "))
        }
    }
}
