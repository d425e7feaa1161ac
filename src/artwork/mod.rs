//! File bytes to [`Artwork`]: plane regions per layer and net, holes, the board outline.
//!
//! Gerber and drill files are read by rooms of their own; this room says which file is what and puts the parts
//! together. Etch bias, sloping walls and the heights of things are left to `slab`.

mod assemble;
mod connect;
mod contact;
pub(crate) mod curve;
pub mod drill;
pub mod error;
pub mod gerber;
mod job_file;
mod layer_role;
mod netlist;
mod profile;
mod shape;

pub use assemble::read;
pub use error::{ArtworkError, ArtworkErrors, Problem};

use crate::diag::{FileId, Origin};
use crate::geom::region::{Grid, Point, Region};
use crate::job::{FileContent, LayerId};
use crate::net::{NetId, NetTable};

/// A file as the caller read it.
#[derive(Debug, Clone, PartialEq)]
pub struct InputFile {
    /// The caller's number for it.
    pub file: FileId,
    /// Its path as the user knows it.
    pub name: String,
    /// All of it.
    pub bytes: Vec<u8>,
    /// What the job says that it holds; [`FileContent::Unsaid`] for what was only found in the folder.
    pub content: FileContent,
}

/// How fine to read.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ArtworkOptions {
    /// The grid of all regions: 1 nm, finer where gaps or films are under 100 nm.
    pub grid: Grid,
    /// Greatest distance between a true arc and its chord, m; smaller means more corners on every round thing.
    pub chord_error: f64,
}

impl Default for ArtworkOptions {
    fn default() -> Self {
        ArtworkOptions { grid: Grid::default(), chord_error: 2e-6 }
    }
}

/// What one layer holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LayerFigures {
    /// Area of the copper, m2; drilled holes not subtracted, except bare ones.
    pub area: f64,
    /// Nets that have copper here, numbered islands included.
    pub nets: usize,
    /// Connected pieces of copper.
    pub pieces: usize,
}

impl Artwork {
    /// Area, nets and pieces of the copper of `layer`.
    #[must_use]
    pub fn layer_figures(&self, layer: LayerId) -> LayerFigures {
        let here = self.copper.iter().filter(|copper| copper.layer == layer);
        let mut figures = LayerFigures { area: 0.0, nets: 0, pieces: 0 };
        for copper in here {
            figures.area += self.grid.area(copper.region.area());
            figures.nets += 1;
            figures.pieces += copper.region.shapes().len();
        }
        figures
    }

    /// Area of the copper of `layer`, m2.
    #[must_use]
    pub fn layer_area(&self, layer: LayerId) -> f64 {
        self.layer_figures(layer).area
    }
}

/// Everything the artwork says, on one grid. Guaranteed: regions of different nets in one layer do not overlap or
/// touch; copper that plated holes join is one net; the union of a net's copper in a layer is one [`Copper`].
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Artwork {
    /// The grid of all regions.
    pub grid: Grid,
    /// Every net; ids in this structure point here.
    pub nets: NetTable,
    /// Copper, by layer and net: sorted by layer, then net.
    pub copper: Vec<Copper>,
    /// Patterns of dielectric layers: outside of its pattern such a layer is absent. Layers not listed are everywhere.
    pub patterns: Vec<Pattern>,
    /// Openings of coatings: where the coating is absent.
    pub openings: Vec<Pattern>,
    /// Drilled holes.
    pub holes: Vec<Hole>,
    /// The board; `None`: layers go on for ever.
    pub profile: Option<Region>,
    /// Greatest distance between a true arc and its chord, m.
    pub chord_error: f64,
}

/// The copper of one net in one layer.
#[derive(Debug, Clone, PartialEq)]
pub struct Copper {
    /// A conductor layer, or the dielectric layer that a post stands in.
    pub layer: LayerId,
    /// Whose copper.
    pub net: NetId,
    /// Where it is: at the wide face, before etch bias.
    pub region: Region,
    /// The first object that made it.
    pub origin: Origin,
}

/// A region that belongs to a dielectric or a coating.
#[derive(Debug, Clone, PartialEq)]
pub struct Pattern {
    /// The layer.
    pub layer: LayerId,
    /// Where it is present (pattern) or absent (opening).
    pub region: Region,
}

/// A drilled hole or slot.
#[derive(Debug, Clone, PartialEq)]
pub struct Hole {
    /// Its outline: of the metal for a plated hole.
    pub region: Region,
    /// Its centre (of the first end, for a slot).
    pub at: Point,
    /// Diameter of the outline, m.
    pub diameter: f64,
    /// Uppermost layer it passes.
    pub from: LayerId,
    /// Lowest layer it passes.
    pub to: LayerId,
    /// What it leaves.
    pub lining: Lining,
    /// Where it is drilled.
    pub origin: Origin,
}

/// What a drilled hole leaves behind.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Lining {
    /// A solid barrel of this net.
    Plated(NetId),
    /// Vacuum. It takes all metal in its outline over its span, barrels of plated holes included (back-drills);
    /// the copper of layers is already cut.
    Bare,
}
