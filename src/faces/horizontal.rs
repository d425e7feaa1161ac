//! Horizontal faces: the top outlines of a slab laid over the bottom outlines of the next one.

use crate::faces::assemble::Assembly;
use crate::faces::body::along_border;
use crate::faces::conform::{CellOutline, Conformed};
use crate::faces::grade::{Side, horizontal_edge};
use crate::faces::outline::{merged_ring, reversed};
use crate::faces::rule::{Verdict, verdict};
use crate::faces::{EdgeGrade, FaceKind, FacesError, GroupKind, Ring};
use crate::geom::Vec3;
use crate::geom::region::{Bounds, Contour, Point, Region};
use crate::geom::snap::SnapRing;
use crate::net::NetId;
use crate::slab::{Fill, SlabModel};
use std::collections::{BTreeMap, HashMap};

/// A level cut into parts with one fill below, one above and at most one sheet.
pub(crate) struct Level {
    pub(crate) z: f64,
    parts: Vec<(Side, Region)>,
    left_of: HashMap<(Point, Point), u32>,
}

impl Level {
    /// What lies left of the directed edge, if the edge bounds a part.
    fn left(&self, a: Point, b: Point) -> Option<&Side> {
        self.left_of.get(&(a, b)).map(|k| &self.parts[*k as usize].0)
    }

    /// How charge crowds at the edge between `a` and `b` of a face that touches this level there.
    pub(crate) fn grade(&self, a: Point, b: Point) -> EdgeGrade {
        horizontal_edge(self.left(a, b), self.left(b, a))
    }
}

/// The levels of a model, from bottom to top: level j lies between slab j and slab j + 1.
pub(crate) fn levels(model: &SlabModel, conformed: &Conformed) -> Vec<Level> {
    let extent = model.extent.region();
    (1..model.slabs.len())
        .map(|k| {
            let fills = |slab: usize, rings: fn(&CellOutline) -> &[SnapRing]| {
                let background = Fill::Dielectric(model.slabs[slab].background);
                fills_of(&conformed.slabs[slab], background, &extent, rings)
            };
            let below = fills(k - 1, |cell| &cell.top);
            let above = fills(k, |cell| &cell.bottom);
            let sheets: Vec<(_, Region)> = conformed.sheets[k - 1]
                .iter()
                .map(|s| (s.net, Region::from_rings_keeping(s.rings.iter().map(|r| &r.points))))
                .collect();
            let parts = overlaid(below, above)
                .into_iter()
                .flat_map(|(below, above, region)| {
                    under_sheets(Side { below, above, sheet: None }, region, &sheets)
                })
                .collect();
            level(model.slabs[k].z_lo, parts)
        })
        .collect()
}

/// Every pair of a fill below and one above with what they have in common. Both lists tile the extent; equal fills
/// are paired first, for where nothing changes from slab to slab nothing is left to compare after that.
fn overlaid(below: Vec<(Fill, Region)>, above: Vec<(Fill, Region)>) -> Vec<(Fill, Fill, Region)> {
    let pairs = |equal: bool| {
        let above = &above;
        below.iter().enumerate().flat_map(move |(i, low)| {
            above
                .iter()
                .enumerate()
                .filter(move |(_, high)| (low.0 == high.0) == equal)
                .map(move |(j, _)| (i, j))
        })
    };
    let order: Vec<(usize, usize)> = pairs(true).chain(pairs(false)).collect();
    let with_bounds = |fills: Vec<(Fill, Region)>| -> Vec<_> {
        fills.into_iter().map(|(fill, region)| (fill, region.bounds(), region)).collect()
    };
    let (mut below, mut above) = (with_bounds(below), with_bounds(above));
    let mut out = Vec::new();
    for (i, j) in order {
        let ((low_fill, low_bounds, low), (high_fill, high_bounds, high)) = (&mut below[i], &mut above[j]);
        if !low_bounds.zip(*high_bounds).is_some_and(|(a, b)| a.meets(&b)) {
            continue;
        }
        if low == high {
            out.push((*low_fill, *high_fill, std::mem::take(low)));
            *high = Region::empty();
            (*low_bounds, *high_bounds) = (None, None);
            continue;
        }
        let both = low.intersection_keeping(high);
        if both.is_empty() {
            continue;
        }
        *low = low.difference_keeping(&both);
        *high = high.difference_keeping(&both);
        (*low_bounds, *high_bounds) = (low.bounds(), high.bounds());
        out.push((*low_fill, *high_fill, both));
    }
    out
}

/// `region`, cut up by the sheets in it.
fn under_sheets(side: Side, region: Region, sheets: &[(NetId, Region)]) -> Vec<(Side, Region)> {
    let mut parts = Vec::new();
    let mut rest = region;
    for (net, sheet) in sheets {
        let on_sheet = common(&rest, sheet);
        if !on_sheet.is_empty() {
            rest = rest.difference_keeping(sheet);
            parts.push((Side { sheet: Some(*net), ..side }, on_sheet));
        }
    }
    if !rest.is_empty() {
        parts.push((side, rest));
    }
    parts
}

fn level(z: f64, parts: Vec<(Side, Region)>) -> Level {
    let mut left_of = HashMap::new();
    for (idx, (_, region)) in (0u32..).zip(&parts) {
        for ring in region.contours() {
            for (k, a) in ring.iter().enumerate() {
                left_of.insert((*a, ring[(k + 1) % ring.len()]), idx);
            }
        }
    }
    Level { z, parts, left_of }
}

/// The region of each fill at one side of a slab; together they tile the extent.
fn fills_of(
    cells: &[CellOutline],
    background: Fill,
    extent: &Region,
    rings: fn(&CellOutline) -> &[SnapRing],
) -> Vec<(Fill, Region)> {
    let mut by_fill: BTreeMap<Fill, Vec<&Contour>> = BTreeMap::new();
    for cell in cells {
        by_fill.entry(cell.fill).or_default().extend(rings(cell).iter().map(|ring| &ring.points));
    }
    let all: Region = Region::from_rings_keeping(by_fill.values().flatten().copied());
    let mut fills: Vec<(Fill, Region)> =
        by_fill.into_iter().map(|(fill, rings)| (fill, Region::from_rings_keeping(rings))).collect();
    let rest = extent.difference_keeping(&all);
    if rest.is_empty() {
        return fills;
    }
    match fills.iter_mut().find(|(fill, _)| *fill == background) {
        Some((_, region)) => {
            *region = Region::from_rings_keeping(region.contours().chain(rest.contours()));
        }
        None => fills.push((background, rest)),
    }
    fills
}

fn common(a: &Region, b: &Region) -> Region {
    match (a.bounds(), b.bounds()) {
        (Some(x), Some(y)) if x.meets(&y) => a.intersection_keeping(b),
        _ => Region::empty(),
    }
}

/// Adds every horizontal face to `out`.
///
/// # Errors
/// [`FacesError::Short`] when metal of two nets lies on each other.
pub(crate) fn horizontal_faces(
    model: &SlabModel,
    conformed: &Conformed,
    levels: &[Level],
    out: &mut Assembly<'_>,
) -> Result<(), FacesError> {
    for (j, level) in levels.iter().enumerate() {
        for (side, region) in &level.parts {
            let place = || region.corner().unwrap_or(model.extent.lo);
            let Some((kind, group, upward)) = face_kind(model, conformed, j, *side, out, place)? else {
                continue;
            };
            for shape in region.shapes() {
                add(level, shape, (kind, &group, upward), &model.extent, out);
            }
        }
    }
    Ok(())
}

type Oriented = (FaceKind, GroupKind, bool);

/// Kind and group of the face between the two sides of a part, and whether its normal points up.
fn face_kind(
    model: &SlabModel,
    conformed: &Conformed,
    j: usize,
    side: Side,
    out: &Assembly<'_>,
    place: impl Fn() -> Point,
) -> Result<Option<Oriented>, FacesError> {
    if let Some(net) = side.sheet {
        let layer = || {
            let found = conformed.sheets[j].iter().find(|s| s.net == net);
            found.map(|s| s.layer.clone()).unwrap_or_default()
        };
        match (side.below, side.above) {
            (Fill::Dielectric(below), Fill::Dielectric(above)) => {
                let kind = FaceKind::Sheet { net, below: out.bodies.of(below), above: out.bodies.of(above) };
                return Ok(Some((kind, GroupKind::Conductor { net, layer: layer() }, true)));
            }
            (Fill::Metal(other), _) | (_, Fill::Metal(other)) if other != net => {
                return Err(out.short(net, other, &layer(), place()));
            }
            // A sheet on metal of its own net is part of that metal's surface.
            _ => {}
        }
    }
    let slab = |metal_below: bool| model.slabs[if metal_below { j } else { j + 1 }].name.clone();
    Ok(match verdict(side.below, side.above, &out.bodies) {
        Verdict::Nothing => None,
        Verdict::Short(a, b) => return Err(out.short(a, b, &slab(true), place())),
        Verdict::Forward(kind) => Some((kind, out.group_kind(side.below, side.above, slab(true)), true)),
        Verdict::Backward(kind) => Some((kind, out.group_kind(side.above, side.below, slab(false)), false)),
    })
}

fn add(
    level: &Level,
    shape: &[Contour],
    (kind, group, upward): (FaceKind, &GroupKind, bool),
    extent: &Bounds,
    out: &mut Assembly<'_>,
) {
    let mut open = false;
    let mut rings = Vec::with_capacity(shape.len());
    for ring in shape {
        let n = ring.len();
        let edge = |k: usize| (ring[k], ring[(k + 1) % n]);
        open |= (0..n).any(|k| along_border(edge(k).0, edge(k).1, extent));
        let grades: Vec<EdgeGrade> = (0..n).map(|k| level.grade(edge(k).0, edge(k).1)).collect();
        let (mut points, mut grades) = merged_ring(ring, &grades);
        if !upward {
            (points, grades) = reversed(&points, &grades);
        }
        let points = points.iter().map(|p| out.at(*p, level.z)).collect();
        rings.push(Ring { points, edges: grades });
    }
    let normal = Vec3::new(0.0, 0.0, if upward { 1.0 } else { -1.0 });
    out.push(kind, normal, rings, group.clone(), open);
}
