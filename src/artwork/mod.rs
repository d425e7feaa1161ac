//! File bytes to [`Artwork`]: plane regions per layer and net, holes, the board outline.

use crate::diag::Origin;
use crate::geom::region::{Grid, Point, Region};
use crate::job::LayerId;
use crate::net::{NetId, NetTable};

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
    /// A conductor layer.
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
    /// Vacuum.
    Bare,
}
