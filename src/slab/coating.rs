//! Coatings: films that follow the laminate and the copper on it.

use crate::geom::region::{Grid, Region};
use crate::job::{LayerId, LayerKind, Stackup};
use crate::slab::MaterialId;
use crate::slab::pile::{Entry, EntryKind, Pile};

/// One film, its depths counted from the laminate and from the copper through all films under it. z in m.
#[derive(Debug, Clone)]
pub(crate) struct Coat {
    pub(crate) layer: LayerId,
    pub(crate) material: MaterialId,
    /// The interval of z that it fills everywhere (less what inner films fill).
    pub(crate) on_laminate: (f64, f64),
    /// The interval of z that it fills over and beside the copper.
    pub(crate) on_copper: (f64, f64),
    /// How far it goes beside the copper, grid steps.
    pub(crate) beside: i64,
    /// The layer whose copper it follows; `None` when it lies on bare laminate.
    pub(crate) copper: Option<LayerId>,
}

/// The coatings of both sides, on each side from the laminate outwards.
pub(crate) fn coats(stackup: &Stackup, pile: &Pile, grid: Grid) -> Vec<Coat> {
    let finite: Vec<&Entry> = pile.entries.iter().filter(|e| e.kind != EntryKind::Open).collect();
    let (Some(lowest), Some(highest)) = (finite.first(), finite.last()) else { return Vec::new() };
    let is_coating = |id: LayerId| matches!(stackup.get(id).kind, LayerKind::Coating { .. });
    // Layers are counted from the top: those above the highest finite layer, from it outwards, and the mirror image.
    let upper = stackup.iter().rev().map(|(id, _)| id).filter(|id| *id < highest.layer && is_coating(*id));
    let lower = stackup.iter().map(|(id, _)| id).filter(|id| *id > lowest.layer && is_coating(*id));
    let mut coats = side(stackup, pile, grid, highest, upper, 1.0);
    coats.extend(side(stackup, pile, grid, lowest, lower, -1.0));
    coats
}

fn side(
    stackup: &Stackup,
    pile: &Pile,
    grid: Grid,
    outer: &Entry,
    layers: impl Iterator<Item = LayerId>,
    sign: f64,
) -> Vec<Coat> {
    let (inner_face, outer_face) =
        if sign > 0.0 { (outer.z_lo, outer.z_hi) } else { (outer.z_hi, outer.z_lo) };
    let on_conductor = outer.kind == EntryKind::Conductor;
    let laminate = if on_conductor { inner_face } else { outer_face };
    let (mut deep, mut over, mut beside) = (0.0, 0.0, 0.0);
    let mut coats = Vec::new();
    for layer in layers {
        let LayerKind::Coating { depth_on_laminate, depth_on_copper, depth_beside_copper, .. } =
            &stackup.get(layer).kind
        else {
            continue;
        };
        deep += depth_on_laminate;
        over += depth_on_copper;
        beside += depth_beside_copper;
        let interval = |to: f64| if sign > 0.0 { (laminate, to) } else { (to, laminate) };
        coats.push(Coat {
            layer,
            material: pile.material(layer).unwrap_or_else(|| pile.vacuum()),
            on_laminate: interval(laminate + sign * deep),
            on_copper: interval(outer_face + sign * over),
            beside: grid.snap(beside).unwrap_or(0),
            copper: on_conductor.then_some(outer.layer),
        });
    }
    coats
}

impl Coat {
    /// Where the film is at height `z`, given the copper that it follows: everywhere, in a region, or nowhere.
    pub(crate) fn at(&self, z: f64, copper: &Region) -> Reach {
        let within = |(lo, hi): (f64, f64)| lo < z && z < hi;
        if within(self.on_laminate) {
            Reach::Everywhere
        } else if self.copper.is_some() && within(self.on_copper) {
            Reach::Within(copper.offset(self.beside))
        } else {
            Reach::Nowhere
        }
    }
}

/// Where something is.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Reach {
    Everywhere,
    Within(Region),
    Nowhere,
}
