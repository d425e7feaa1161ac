//! One interval of z cut into materials: who takes which part of the plane, in a fixed order.
//!
//! Bare holes take their space first, then metal, then what lies outside of the board's profile, then coatings, then
//! the layer itself (a pattern, or everything), then its fill.

use crate::artwork::{Artwork, Pattern};
use crate::diag::Warning;
use crate::geom::offset::length;
use crate::geom::region::{Bounds, Contour, Region};
use crate::geom::snap::{Outline, SnapRing, snap};
use crate::geom::strip::{Run, alike, edge_left_of, left_of, runs};
use crate::job::{LayerId, Stackup};
use crate::net::{ModelNet, NetId, Role};
use crate::slab::coating::{Coat, Reach};
use crate::slab::copper::{Lean, Metal, lean, leaning, mean_outline};
use crate::slab::pile::{Entry, EntryKind, Pile};
use crate::slab::{Cell, Fill, Sheet, Slab};
use std::collections::{BTreeMap, BTreeSet};

/// All that the partition of a slab draws on, settled and clipped.
pub(crate) struct Scene<'a> {
    pub(crate) artwork: &'a Artwork,
    pub(crate) stackup: &'a Stackup,
    pub(crate) pile: &'a Pile,
    pub(crate) nets: &'a [ModelNet],
    pub(crate) window: Region,
    pub(crate) extent: Region,
    pub(crate) bounds: Bounds,
    /// Inside the extent; `None` when the board covers all of it.
    pub(crate) profile: Option<Region>,
    pub(crate) coats: Vec<Coat>,
    /// Plated barrels and bare holes, clipped.
    pub(crate) barrels: Vec<Barrel>,
    pub(crate) bare: Vec<Barrel>,
    /// Openings of coatings; those beyond the window stand over copper that is not modelled and are left out.
    pub(crate) openings: Vec<Pattern>,
}

/// A hole with the interval of z that it passes, m. `net` is `None` for a bare one.
pub(crate) struct Barrel {
    pub(crate) net: Option<NetId>,
    pub(crate) region: Region,
    pub(crate) z_lo: f64,
    pub(crate) z_hi: f64,
}

/// The clipped metal of one net in one layer, at its foot and at its top, and upright at the mean width.
pub(crate) struct LayerMetal {
    net: NetId,
    wide: Region,
    foot: Region,
    top: Region,
    mean: Region,
}

/// Copper of one layer, ready to be laid into slabs.
pub(crate) struct LayerCopper {
    metals: Vec<LayerMetal>,
    lean: Option<Lean>,
}

/// How often nets that cannot lean are made upright before the whole layer is.
const LEAN_ATTEMPTS: usize = 5;

type Parts = Vec<(Fill, Region)>;

/// `region` as far as a net with this role is modelled: rows and floating nets to the window, of ground the pieces
/// that enter the window up to the extent. What stood in holes beyond the window is not modelled, so these are filled.
pub(crate) fn clipped(region: &Region, role: Role, window: &Region, extent: &Region) -> Region {
    if role != Role::Ground {
        return within(region, window);
    }
    let enters = |piece: &Region| !within(piece, window).is_empty();
    let pieces: Vec<Region> = region.pieces().into_iter().filter(enters).collect();
    let going_on = within(&Region::gathered(&pieces), extent);
    match window.bounds() {
        Some(frame) => going_on.with_far_holes_filled(&frame),
        None => going_on,
    }
}

/// `region` clipped by a rectangle, untouched when it lies inside.
fn within(region: &Region, rectangle: &Region) -> Region {
    match (region.bounds(), rectangle.bounds()) {
        (Some(b), Some(r)) if !b.meets(&r) => Region::empty(),
        (Some(b), Some(r))
            if r.lo.x <= b.lo.x && r.lo.y <= b.lo.y && b.hi.x <= r.hi.x && b.hi.y <= r.hi.y =>
        {
            region.clone()
        }
        (Some(_), Some(_)) => region.intersection_keeping(rectangle),
        _ => Region::empty(),
    }
}

impl Scene<'_> {
    /// The copper of `layer`, etched, leaning and clipped.
    pub(crate) fn layer_copper(
        &self,
        layer: LayerId,
        metals: &[Metal],
        model_id: &[Option<NetId>],
        warnings: &mut Vec<Warning>,
    ) -> LayerCopper {
        let mut leans = lean(self.stackup, layer, self.artwork.grid);
        let mut list = Vec::new();
        for metal in metals.iter().filter(|m| m.layer == layer) {
            let Some(net) = model_id[metal.net.idx()] else { continue };
            let role = self.nets[net.idx()].role;
            let clip = |region: &Region| clipped(region, role, &self.window, &self.extent);
            let wide = clip(&metal.wide);
            if wide.is_empty() {
                continue;
            }
            let Some(slope) = leans else {
                let same = || wide.clone();
                list.push(LayerMetal { net, foot: same(), top: same(), mean: same(), wide });
                continue;
            };
            let what = format!("`{}` in `{}`", self.nets[net.idx()].name, self.stackup.get(layer).name);
            let near = Metal { wide: metal.wide.pieces_meeting(&self.bounds), ..metal.clone() };
            let (foot, top) = leaning(&near, slope, &what, self.artwork.grid, warnings);
            let mean = clip(&mean_outline(&near.wide, slope));
            let (foot, top) = (clip(&foot), clip(&top));
            match foot.aligned(&top, reach_of(slope)) {
                Some(top) => list.push(LayerMetal { net, wide, foot, top, mean }),
                None => {
                    warnings.push(Warning::new(
                        format!("the border of the region cuts leaning walls of {what} at a corner; it has upright walls at the mean width instead"),
                        metal.origin,
                    ));
                    list.push(LayerMetal { net, wide, foot: mean.clone(), top: mean.clone(), mean });
                }
            }
        }
        if list.iter().all(|m| m.foot == m.top) {
            leans = None;
        }
        LayerCopper { metals: list, lean: leans }
    }

    /// The sheets of an entry of no thickness, at the bottom of slab `slab`.
    pub(crate) fn sheets(&self, entry: &Entry, copper: &LayerCopper, slab: usize) -> Vec<Sheet> {
        let bare = self.bare_at(entry.z_lo, entry.z_hi);
        let layer = self.stackup.get(entry.layer).name.clone();
        copper
            .metals
            .iter()
            .map(|m| Sheet { net: m.net, layer: layer.clone(), slab, region: m.wide.difference(&bare) })
            .filter(|sheet| !sheet.region.is_empty())
            .collect()
    }

    fn bare_at(&self, z_lo: f64, z_hi: f64) -> Region {
        let mid = 0.5 * (z_lo + z_hi);
        let holes = self.bare.iter().filter(|hole| hole.z_lo <= mid && mid <= hole.z_hi);
        Region::union_all(holes.map(|hole| &hole.region))
    }

    /// The slab between `z_lo` and `z_hi`, part of `entry`.
    ///
    /// `coated`: the copper that each coating follows, as `coats` lists them.
    pub(crate) fn slab(
        &self,
        entry: &Entry,
        (z_lo, z_hi): (f64, f64),
        copper: &LayerCopper,
        coated: &[Region],
        warnings: &mut Vec<Warning>,
    ) -> Slab {
        let name = self.stackup.get(entry.layer).name.clone();
        let at = |z: f64| (z - entry.z_lo) / (entry.z_hi - entry.z_lo);
        let parts_with = |metals: BTreeMap<NetId, Region>| self.parts(entry, (z_lo, z_hi), &metals, coated);
        let outline = |t: f64, stiff: &BTreeSet<NetId>| {
            let region = |m: &LayerMetal| match (stiff.contains(&m.net), m.foot == m.top) {
                (true, _) => m.mean.clone(),
                (false, true) => m.foot.clone(),
                (false, false) => m.foot.between(&m.top, t),
            };
            copper.metals.iter().map(|m| (m.net, region(m))).collect::<BTreeMap<_, _>>()
        };
        if let Some(slope) = copper.lean {
            let mut stiff = BTreeSet::new();
            for _ in 0..LEAN_ATTEMPTS {
                let foot = parts_with(outline(at(z_lo), &stiff));
                let top = parts_with(outline(at(z_hi), &stiff));
                let background = background(&foot, &self.bounds);
                let Fill::Dielectric(material) = background else { break };
                match leaning_cells(&foot, &top, background, reach_of(slope)) {
                    Ok(cells) => {
                        self.warn_of_stiff(&stiff, entry, warnings);
                        return Slab { name, z_lo, z_hi, background: material, cells };
                    }
                    Err(nets) if nets.is_empty() || nets.is_subset(&stiff) => break,
                    Err(nets) => stiff.extend(nets),
                }
            }
            self.warn_of_stiff(&copper.metals.iter().map(|m| m.net).collect(), entry, warnings);
        }
        let upright = copper.metals.iter().map(|m| (m.net, m.mean.clone())).collect();
        let parts = parts_with(upright);
        let chosen = background(&parts, &self.bounds);
        let Fill::Dielectric(material) = chosen else {
            // Metal along the whole border: the fill is as good as any, for none of it shows.
            let cells = parts.into_iter().map(|(fill, r)| Cell { fill, bottom: r.clone(), top: r }).collect();
            return Slab { name, z_lo, z_hi, background: self.pile.fill(entry.layer), cells };
        };
        let cells = parts
            .into_iter()
            .filter(|(fill, _)| *fill != chosen)
            .map(|(fill, r)| Cell { fill, bottom: r.clone(), top: r })
            .collect();
        Slab { name, z_lo, z_hi, background: material, cells }
    }

    /// One warning for each net whose walls could not lean in a layer.
    fn warn_of_stiff(&self, stiff: &BTreeSet<NetId>, entry: &Entry, warnings: &mut Vec<Warning>) {
        for net in stiff {
            let (net, layer) = (&self.nets[net.idx()], self.stackup.get(entry.layer));
            let text = format!(
                "leaning walls of `{}` in `{}` meet a drill, a film or an opening at a corner; between two heights of \
                 this layer they stand upright at the mean width instead",
                net.name, layer.name
            );
            let warning = Warning::new(text, net.origin);
            if !warnings.contains(&warning) {
                warnings.push(warning);
            }
        }
    }

    /// The whole extent, cut up by fill.
    fn parts(
        &self,
        entry: &Entry,
        (z_lo, z_hi): (f64, f64),
        metals: &BTreeMap<NetId, Region>,
        coated: &[Region],
    ) -> Parts {
        let mid = if z_lo.is_infinite() || z_hi.is_infinite() { f64::NAN } else { 0.5 * (z_lo + z_hi) };
        let bare = if mid.is_nan() { Region::empty() } else { self.bare_at(z_lo, z_hi) };
        let mut metals = metals.clone();
        for barrel in self.barrels.iter().filter(|b| b.z_lo < mid && mid < b.z_hi) {
            if let Some(net) = barrel.net {
                let region = metals.entry(net).or_default();
                *region = region.union_keeping(&barrel.region);
            }
        }
        let mut claims = Claims { rest: self.extent.clone(), parts: BTreeMap::new() };
        claims.take(Fill::Dielectric(self.pile.vacuum()), &bare);
        let all_metal = Region::union_all(metals.values());
        for (net, region) in &metals {
            let region = if bare.is_empty() { region.clone() } else { region.difference_keeping(&bare) };
            claims.put(Fill::Metal(*net), region);
        }
        if !all_metal.is_empty() {
            claims.rest = claims.rest.difference_keeping(&all_metal);
        }
        let base = Fill::Dielectric(self.pile.fill(entry.layer));
        if let Some(profile) = self.profile.as_ref().filter(|_| !mid.is_nan()) {
            let outside = self.extent.difference_keeping(profile);
            claims.take(Fill::Dielectric(self.outside()), &outside);
        }
        for (coat, copper) in self.coats.iter().zip(coated) {
            let openings = pattern_of(&self.openings, coat.layer);
            let reach = match coat.at(mid, copper) {
                Reach::Nowhere => continue,
                Reach::Everywhere => self.extent.clone(),
                Reach::Within(region) => within(&region, &self.extent),
            };
            let reach = openings.map_or(reach.clone(), |open| reach.difference_keeping(open));
            claims.take(Fill::Dielectric(coat.material), &reach);
        }
        if let (EntryKind::Dielectric, Some(own)) = (entry.kind, self.pile.material(entry.layer)) {
            match pattern_of(&self.artwork.patterns, entry.layer) {
                Some(pattern) => claims.take(Fill::Dielectric(own), &within(pattern, &self.extent)),
                None => claims.take(Fill::Dielectric(own), &self.extent),
            }
        }
        let rest = std::mem::take(&mut claims.rest);
        claims.put(base, rest);
        claims.parts.into_iter().collect()
    }

    /// What lies beside the board: the open medium above it.
    fn outside(&self) -> crate::slab::MaterialId {
        self.pile.entries.last().map_or_else(|| self.pile.vacuum(), |entry| self.pile.fill(entry.layer))
    }

    /// The copper of `layer` in plan, barrels included, bare holes not.
    pub(crate) fn plan_copper(&self, entry: &Entry, copper: &LayerCopper) -> Region {
        let mid = 0.5 * (entry.z_lo + entry.z_hi);
        let barrels = self.barrels.iter().filter(|b| b.z_lo <= mid && mid <= b.z_hi).map(|b| &b.region);
        let all = Region::union_all(copper.metals.iter().map(|m| &m.wide).chain(barrels));
        let bare = self.bare_at(entry.z_lo, entry.z_hi);
        if bare.is_empty() { all } else { all.difference(&bare) }
    }
}

/// What is still to be given away, and what has been.
struct Claims {
    rest: Region,
    parts: BTreeMap<Fill, Region>,
}

impl Claims {
    /// Gives `fill` what `claim` and the rest have in common.
    fn take(&mut self, fill: Fill, claim: &Region) {
        if claim.is_empty() || self.rest.is_empty() {
            return;
        }
        let part = self.rest.intersection_keeping(claim);
        if !part.is_empty() {
            self.rest = self.rest.difference_keeping(claim);
            self.put(fill, part);
        }
    }

    /// Adds `part` to what `fill` has.
    fn put(&mut self, fill: Fill, part: Region) {
        if part.is_empty() {
            return;
        }
        match self.parts.get_mut(&fill) {
            Some(old) => *old = old.union_keeping(&part),
            None => {
                self.parts.insert(fill, part);
            }
        }
    }
}

fn pattern_of(patterns: &[Pattern], layer: LayerId) -> Option<&Region> {
    patterns.iter().find(|pattern| pattern.layer == layer).map(|pattern| &pattern.region)
}

/// How far a corner may move between foot and top, steps: the inset at the sharpest corner that is mitred.
fn reach_of(lean: Lean) -> f64 {
    8.0 * lean.inset.abs() + 4.0
}

/// The fill that has most of the border, metal only when there is nothing else.
fn background(parts: &Parts, extent: &Bounds) -> Fill {
    let share = |region: &Region| region.contours().map(|ring| along(ring, extent)).sum::<f64>();
    let rank = |(fill, region): &&(Fill, Region)| (matches!(fill, Fill::Dielectric(_)), share(region));
    let best = parts.iter().max_by(|a, b| {
        let (x, y) = (rank(a), rank(b));
        x.0.cmp(&y.0).then(x.1.total_cmp(&y.1)).then(b.0.cmp(&a.0))
    });
    best.map_or(Fill::Dielectric(crate::slab::MaterialId(0)), |(fill, _)| *fill)
}

/// The length of `ring` that runs along the border of `extent`.
fn along(ring: &Contour, extent: &Bounds) -> f64 {
    (0..ring.len())
        .map(|k| [ring[k], ring[(k + 1) % ring.len()]])
        .filter(|[a, b]| {
            (a.x == b.x && (a.x == extent.lo.x || a.x == extent.hi.x))
                || (a.y == b.y && (a.y == extent.lo.y || a.y == extent.hi.y))
        })
        .map(|edge| 0.5 * length(&edge))
        .sum()
}

/// Cells of a slab with leaning walls.
///
/// # Errors
/// The nets whose foot and top do not match corner by corner or do not meet the same neighbours; empty when that
/// cannot be told.
fn leaning_cells(
    foot: &Parts,
    top: &Parts,
    background: Fill,
    reach: f64,
) -> Result<Vec<Cell>, BTreeSet<NetId>> {
    let fills = |parts: &Parts| parts.iter().map(|(fill, _)| *fill).collect::<Vec<_>>();
    if fills(foot) != fills(top) {
        return Err(BTreeSet::new());
    }
    let mut cells: Vec<Cell> = Vec::new();
    for ((fill, bottom), (_, top)) in foot.iter().zip(top).filter(|((fill, _), _)| *fill != background) {
        match (bottom.aligned(top, reach), fill) {
            (Some(top), _) => cells.push(Cell { fill: *fill, bottom: bottom.clone(), top }),
            (None, Fill::Metal(net)) => return Err(BTreeSet::from([*net])),
            (None, Fill::Dielectric(_)) => return Err(BTreeSet::new()),
        }
    }
    let snapped = |rings: fn(&Cell) -> &Region| {
        let outline = |cell: &Cell| Outline {
            rings: rings(cell).contours().map(|ring| SnapRing::new(ring.clone())).collect(),
            lo: 0,
            hi: 0,
            keep_corners: true,
        };
        let mut outlines: Vec<Outline> = cells.iter().map(outline).collect();
        snap(&mut outlines, 1);
        outlines
    };
    let (feet, tops) = (snapped(|cell| &cell.bottom), snapped(|cell| &cell.top));
    let cell_at = (left_of(rings_of(&feet)), left_of(rings_of(&tops)));
    let edge_at = (edge_left_of(rings_of(&feet)), edge_left_of(rings_of(&tops)));
    let mut culprits = BTreeSet::new();
    let mut corners: Vec<(Contour, Contour)> = Vec::new();
    for (cell, (foot, top)) in cells.iter().zip(feet.iter().zip(&tops)) {
        for (foot, top) in foot.rings.iter().zip(&top.rings) {
            let by_edge = (runs(foot, &edge_at.0), runs(top, &edge_at.1));
            let by_cell = (runs(foot, &cell_at.0), runs(top, &cell_at.1));
            if alike(&by_edge.0, &by_edge.1) {
                corners.push((starts(&by_edge.0), starts(&by_edge.1)));
            } else if alike(&by_cell.0, &by_cell.1) {
                corners.push((starts(&by_cell.0), starts(&by_cell.1)));
            } else {
                let across = by_cell.0.iter().chain(&by_cell.1).filter_map(|run| run.neighbour);
                let fills = std::iter::once(cell.fill).chain(across.map(|k| cells[k].fill));
                culprits.extend(fills.filter_map(|fill| match fill {
                    Fill::Metal(net) => Some(net),
                    Fill::Dielectric(_) => None,
                }));
            }
        }
    }
    if culprits.is_empty() { Ok(with_shared_corners(cells, corners)) } else { Err(culprits) }
}

fn rings_of(outlines: &[Outline]) -> impl Iterator<Item = &[SnapRing]> {
    outlines.iter().map(|outline| outline.rings.as_slice())
}

fn starts<T>(runs: &[Run<T>]) -> Contour {
    runs.iter().map(|run| run.points[0]).collect()
}

/// `cells` with these corners at the foot and at the top, ring by ring: where a neighbour begins, both cells have a corner,
/// lest a later rounding at one height part them by a step.
fn with_shared_corners(mut cells: Vec<Cell>, corners: Vec<(Contour, Contour)>) -> Vec<Cell> {
    let (feet, tops): (Vec<Contour>, Vec<Contour>) = corners.into_iter().unzip();
    let (mut feet, mut tops) = (feet.into_iter(), tops.into_iter());
    for cell in &mut cells {
        cell.bottom = cell.bottom.with_corners(feet.by_ref());
        cell.top = cell.top.with_corners(tops.by_ref());
    }
    cells
}
