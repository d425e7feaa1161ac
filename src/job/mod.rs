//! Job and stackup text to [`Job`] and [`Stackup`]: SI units, defaults filled in, every problem reported at once.

mod check;
mod error;
mod gbrjob;
mod keys;
mod patch;
mod permittivity;
mod read;
mod read_artwork;

mod read_layer;
mod read_nets;
mod read_shape;
mod read_stackup;
mod schema;
mod section;
pub mod stackup;
mod structure;
mod tolerance;

use crate::diag::Origin;
use std::collections::BTreeMap;

pub use check::check_names;
pub use error::{JobErrors, JobProblem};
pub use gbrjob::read_gbrjob_stackup;
pub use read::read_job;
pub use read_stackup::read_stackup;
pub use schema::{SchemaKind, schema};
pub use stackup::{Layer, LayerId, LayerKind, LayerQuantity, Material, Spread, Stackup, Tolerance, WideFace};

/// A name as the user wrote it, and where.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Named {
    /// The name.
    pub name: String,
    /// Where it stands.
    pub origin: Origin,
}

/// A checked job file.
#[derive(Debug, Clone, PartialEq)]
pub struct Job {
    /// Free text.
    pub title: String,
    /// Path of the stackup (TOML or `.gbrjob`), relative to the job file.
    pub stackup: Named,
    /// Frequency at which tables of permittivity are read, Hz.
    pub frequency: Option<f64>,
    /// Where the artwork lies.
    pub artwork: ArtworkPlan,
    /// Artwork drawn in the job itself.
    pub shapes: Vec<DrawnShape>,
    /// What part of the artwork is modelled.
    pub region: RegionChoice,
    /// What each net does.
    pub nets: NetRules,
    /// Completes or overrides the materials of the stackup, by material or layer name.
    pub materials: BTreeMap<String, MaterialPatch>,
    /// When to stop refining.
    pub accuracy: Accuracy,
    /// Keys that are accepted but have no effect yet.
    pub unused: Vec<Named>,
}

/// Where the artwork lies; paths are relative to the job file.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ArtworkPlan {
    /// Folder whose files are found by their own attributes.
    pub folder: Option<Named>,
    /// Files listed one by one.
    pub files: Vec<PlannedFile>,
    /// IPC-D-356A netlist.
    pub netlist: Option<Named>,
}

/// A file listed in the job.
#[derive(Debug, Clone, PartialEq)]
pub struct PlannedFile {
    /// Path relative to the job file.
    pub path: Named,
    /// What it holds.
    pub content: FileContent,
}

/// What a listed file holds, when the job says so.
#[derive(Debug, Clone, PartialEq)]
pub enum FileContent {
    /// The job does not say; the file's own attributes decide.
    Unsaid,
    /// Artwork of this stackup layer.
    Layer(Named),
    /// The board outline.
    Profile,
    /// Drilled holes.
    Drill(DrillPlan),
}

/// How a drill file is to be read.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct DrillPlan {
    /// Whether the holes are plated; `None`: as the file says.
    pub plated: Option<bool>,
    /// Uppermost layer of the span; `None`: as the file says, else the top.
    pub from: Option<Named>,
    /// Lowest layer of the span; `None`: as the file says, else the bottom.
    pub to: Option<Named>,
    /// What the tool diameter means.
    pub hole: HoleMeaning,
    /// Whether this entry removes metal over its span (a back-drill).
    pub removes_metal: bool,
}

/// What the diameter of a drill tool means.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum HoleMeaning {
    /// The drilled diameter: the metal of a plated hole fills it.
    #[default]
    Drilled,
    /// The finished diameter: the metal is wider by twice the plating, m.
    Finished {
        /// Plating thickness, m.
        plating: f64,
    },
}

/// A shape drawn in the job.
#[derive(Debug, Clone, PartialEq)]
pub struct DrawnShape {
    /// Its net; `None` on a dielectric layer, where it is the layer's pattern.
    pub net: Option<Named>,
    /// The layer it lies in.
    pub layer: Named,
    /// Further layers that carry the same outline.
    pub through: Vec<Named>,
    /// The outline.
    pub outline: Outline,
    /// Outlines cut out of it.
    pub holes: Vec<Outline>,
    /// Where it is drawn.
    pub origin: Origin,
}

/// A drawn outline; lengths in m, points as [x, y].
#[derive(Debug, Clone, PartialEq)]
pub enum Outline {
    /// Two opposite corners.
    Rectangle {
        /// One corner.
        from: [f64; 2],
        /// The opposite corner.
        to: [f64; 2],
    },
    /// A full circle.
    Circle {
        /// Centre.
        at: [f64; 2],
        /// Diameter.
        diameter: f64,
    },
    /// A closed polygon.
    Polygon(
        /// Corners in order.
        Vec<[f64; 2]>,
    ),
    /// A path drawn with a round pen.
    Stroke {
        /// Points of the path.
        path: Vec<[f64; 2]>,
        /// Diameter of the pen.
        width: f64,
    },
}

/// What part of the artwork is modelled.
#[derive(Debug, Clone, PartialEq, Default)]
pub enum RegionChoice {
    /// All of it.
    #[default]
    Whole,
    /// These nets and everything within `margin` of them.
    Around {
        /// The nets.
        nets: Vec<Named>,
        /// m; `None`: chosen from the accuracy target and the height to the nearest plane.
        margin: Option<f64>,
    },
    /// A rectangle: lower left and upper right corner, m.
    Window {
        /// Lower left corner.
        lo: [f64; 2],
        /// Upper right corner.
        hi: [f64; 2],
    },
}

/// What each net does.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct NetRules {
    /// Nets at 0 V.
    pub ground: Vec<Named>,
    /// Nets with a row each, in this order; `None`: every net of the region that has no other role.
    pub rows: Option<Vec<Named>>,
    /// What named nets do that no rule mentions.
    pub others: Others,
    /// Floating nets and their free charge.
    pub floating: Vec<FloatingNet>,
    /// Groups of nets tied together outside the region.
    pub join: Vec<Vec<Named>>,
    /// Names for copper that carries none.
    pub labels: Vec<Label>,
    /// Layers that are unbroken infinite planes at 0 V, done by images: at most two.
    pub ground_planes: Vec<Named>,
}

/// What named nets outside every list do.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Others {
    /// Held at 0 V.
    #[default]
    Ground,
    /// Floating with no free charge.
    Float,
    /// A row each.
    Rows,
}

/// A net with given free charge and unknown potential.
#[derive(Debug, Clone, PartialEq)]
pub struct FloatingNet {
    /// The net.
    pub net: Named,
    /// Net free charge, C.
    pub charge: f64,
}

/// A name for the copper at a point.
#[derive(Debug, Clone, PartialEq)]
pub struct Label {
    /// The name to give.
    pub net: Named,
    /// The layer to look at.
    pub layer: Named,
    /// The point, m.
    pub at: [f64; 2],
}

/// What the job knows about a material that the stackup may not.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct MaterialPatch {
    /// Relative permittivity.
    pub er: Option<f64>,
    /// Loss tangent.
    pub loss_tangent: Option<f64>,
    /// Where `er` comes from, when it is given: "job", or "job, table at 1 GHz".
    pub er_source: String,
    /// Dielectric strength, V/m.
    pub strength: Option<f64>,
    /// Thickness of a layer that has none of its own, m.
    pub thickness: Option<f64>,
    /// Depth of a coating on the copper's top, m; its `thickness` is the depth on the laminate.
    pub depth_on_copper: Option<f64>,
    /// Whether the dielectric flows between the copper of the adjoining inner layer.
    pub prepreg: Option<bool>,
    /// Where it stands.
    pub origin: Origin,
}

/// When to stop refining.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Accuracy {
    /// Relative error bar wanted on each entry of the Maxwell matrix.
    pub target: f64,
    /// An entry smaller than `floor` times the geometric mean of its diagonal entries is judged against that.
    pub floor: f64,
}

impl Default for Accuracy {
    fn default() -> Self {
        Accuracy { target: 0.01, floor: 0.01 }
    }
}
