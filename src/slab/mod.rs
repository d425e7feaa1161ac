//! [`Artwork`] and [`Stackup`] to [`SlabModel`]: in each interval of z the plane is partitioned into materials.
//!
//! Layers are stacked (`pile`), nets get their parts (`roles`), copper is etched (`copper`), the region is chosen
//! (`region_choice`), planes done by images cut the pile (`plane`), and every interval of z is divided up
//! (`partition`, with the films of `coating`). What charge sits on is the business of `faces`.

mod coating;
mod copper;
mod error;
mod options;
mod partition;
mod pile;
mod plane;
mod region_choice;
mod roles;

use crate::artwork::{Artwork, Lining, Pattern};
use crate::diag::{Warned, Warning};
use crate::geom::region::{Bounds, Grid, Region};
use crate::job::{Job, LayerId, RegionChoice, Stackup};
use crate::net::{ModelNet, NetId, Role};
use crate::slab::copper::Metal;
use crate::slab::partition::{Barrel, Scene, clipped};
use crate::slab::pile::{Entry, EntryKind, Pile};
use crate::slab::roles::{NetPlan, Presence};

pub use error::{Place, SlabError, SlabErrors};
pub use options::SlabOptions;

/// The pile of slabs that `artwork` and `stackup` make, as far as `job` asks for it.
///
/// # Errors
/// [`SlabErrors`] holds everything that was found wrong; each [`SlabError`] says what it means.
pub fn build(
    artwork: &Artwork,
    stackup: &Stackup,
    job: &Job,
    options: &SlabOptions,
) -> Result<Warned<SlabModel>, SlabErrors> {
    let (mut errors, mut warnings) = (Vec::new(), Vec::new());
    let pile = pile::pile(stackup, &mut errors);
    let plan = roles::plan(artwork, job, &mut errors);
    refuse(&mut errors)?;
    let metals = copper::etched(artwork, stackup, &plan.stands_for, &mut errors, &mut warnings);
    copper::check_barrels(artwork, stackup, &plan.stands_for, &metals, &mut errors);
    let window = region_choice::window(artwork, &pile, job, (&metals, &plan), &mut errors);
    let Some(window) = window else { return Err(SlabErrors(errors)) };
    let presence = presence(artwork, &metals, &plan, &window);
    if !presence.iter().any(|p| p.inside) {
        let copper = "no place within the window".to_owned();
        errors.push(SlabError::EmptyRegion { copper });
    }
    refuse(&mut errors)?;
    let (mut nets, model_id) = plan.settle(&artwork.nets, &presence, &mut errors);
    let row_layers = row_layers(artwork, &metals, &nets, &model_id);
    let planes = plane::planes(stackup, &pile, job, &row_layers, &mut errors);
    let touching = (metals.as_slice(), model_id.as_slice());
    plane::check_contact(
        (artwork, stackup, &pile),
        &planes,
        touching,
        &mut nets,
        (&mut errors, &mut warnings),
    );
    refuse(&mut errors)?;

    let images = planes.images();
    let coats = coating::coats(stackup, &pile, artwork.grid);
    let cuts = coats.iter().flat_map(|c| [c.on_laminate.0, c.on_laminate.1, c.on_copper.0, c.on_copper.1]);
    let levels = heights(&pile, images, cuts, 1e-3 * artwork.grid.step());
    let (Some(lowest), Some(highest)) = (levels.first(), levels.last()) else {
        return Err(SlabErrors(vec![SlabError::NothingLeft]));
    };
    let bounded = images.below.is_some() || images.above.is_some();
    if bounded && highest - lowest <= 0.0 && images.below.is_some() && images.above.is_some() {
        return Err(SlabErrors(vec![SlabError::NothingLeft]));
    }
    let base = modelled_bounds(artwork, job, window);
    let frames = (base, window);
    let height = if bounded { highest - lowest } else { region_choice::near_height(&pile, &row_layers) };
    let extent = region_choice::extent(artwork, frames, height, bounded, options, &mut errors);
    let Some(extent) = extent else { return Err(SlabErrors(errors)) };
    let scene = scene((artwork, stackup, &pile), &nets, &model_id, (window, extent), coats);
    warn_of_outline(&scene, images, &metals, &mut warnings);
    let (slabs, sheets) = slice(&scene, &levels, images, (&metals, &model_id), &mut warnings);
    let (chord_error, grid) = (artwork.chord_error, artwork.grid);
    let materials = pile.materials.clone();
    let value =
        SlabModel { grid, nets, materials, slabs, sheets, planes: images, window, extent, chord_error };
    Ok(Warned { value, warnings })
}

fn refuse(errors: &mut Vec<SlabError>) -> Result<(), SlabErrors> {
    if errors.is_empty() { Ok(()) } else { Err(SlabErrors(std::mem::take(errors))) }
}

/// What part of each joined net's copper and barrels lies in the window.
fn presence(artwork: &Artwork, metals: &[Metal], plan: &NetPlan, window: &Bounds) -> Vec<Presence> {
    let mut presence = vec![Presence::default(); artwork.nets.len()];
    let frame = window.region();
    let mut see = |net: NetId, region: &Region| {
        let Some(bounds) = region.bounds() else { return };
        let entry = &mut presence[net.idx()];
        if bounds.meets(window) && !(entry.inside && entry.outside) {
            entry.inside |= !region.intersection(&frame).is_empty();
            entry.outside |= !region.difference(&frame).is_empty();
        } else {
            entry.outside = true;
        }
    };
    metals.iter().for_each(|metal| see(metal.net, &metal.wide));
    for hole in &artwork.holes {
        if let Lining::Plated(net) = hole.lining {
            see(plan.stands_for[net.idx()], &hole.region);
        }
    }
    presence
}

/// The conductor layers on which row nets have copper or that their barrels pass.
fn row_layers(
    artwork: &Artwork,
    metals: &[Metal],
    nets: &[ModelNet],
    model_id: &[Option<NetId>],
) -> Vec<LayerId> {
    let is_row = |net: NetId| model_id[net.idx()].is_some_and(|id| nets[id.idx()].role == Role::Row);
    let mut layers: Vec<LayerId> = metals.iter().filter(|m| is_row(m.net)).map(|m| m.layer).collect();
    for hole in &artwork.holes {
        if matches!(hole.lining, Lining::Plated(net) if is_row(net)) {
            layers.extend([hole.from, hole.to]);
        }
    }
    layers
}

/// The levels at which slabs meet, from bottom to top, planes included; levels closer than `tolerance` are one.
fn heights(pile: &Pile, planes: ImagePlanes, cuts: impl Iterator<Item = f64>, tolerance: f64) -> Vec<f64> {
    let (lo, hi) = (planes.below.unwrap_or(f64::NEG_INFINITY), planes.above.unwrap_or(f64::INFINITY));
    let ends = pile.entries.iter().flat_map(|entry| [entry.z_lo, entry.z_hi]);
    let mut levels: Vec<f64> = ends.chain(cuts).filter(|z| z.is_finite() && lo <= *z && *z <= hi).collect();
    levels.sort_by(f64::total_cmp);
    levels.dedup_by(|later, earlier| *later - *earlier <= tolerance);
    levels
}

/// The window; for the whole artwork also patterns and the board, so that finite bodies are not cut.
fn modelled_bounds(artwork: &Artwork, job: &Job, window: Bounds) -> Bounds {
    if job.region != RegionChoice::Whole {
        return window;
    }
    let patterns = artwork.patterns.iter().map(|p| &p.region).chain(&artwork.profile);
    patterns.filter_map(Region::bounds).fold(window, region_choice::joined)
}

fn scene<'a>(
    (artwork, stackup, pile): (&'a Artwork, &'a Stackup, &'a Pile),
    nets: &'a [ModelNet],
    model_id: &[Option<NetId>],
    (frame, bounds): (Bounds, Bounds),
    coats: Vec<coating::Coat>,
) -> Scene<'a> {
    let (window, extent) = (frame.region(), bounds.region());
    let opening = |open: &Pattern| Pattern { region: open.region.pieces_meeting(&frame), ..*open };
    let openings = artwork.openings.iter().map(opening).collect();
    let profile = artwork.profile.as_ref().map(|profile| profile.intersection(&extent));
    let profile = profile.filter(|inside| *inside != extent);
    let (mut barrels, mut bare) = (Vec::new(), Vec::new());
    // A bare hole through the outermost conductor goes on through the film on it.
    let through = |layer: LayerId, upper: bool| {
        let outer = if upper { stackup.conductors().next() } else { stackup.conductors().next_back() };
        let open = if upper { f64::INFINITY } else { f64::NEG_INFINITY };
        (outer == Some(layer)).then_some(open)
    };
    for hole in &artwork.holes {
        let (Some(from), Some(to)) = (pile.entry(hole.from), pile.entry(hole.to)) else { continue };
        match hole.lining {
            Lining::Plated(net) => {
                let Some(id) = model_id[net.idx()] else { continue };
                let region = clipped(&hole.region, nets[id.idx()].role, &window, &extent);
                barrels.push(Barrel { net: Some(id), region, z_lo: to.z_lo, z_hi: from.z_hi });
            }
            Lining::Bare => {
                let region = hole.region.pieces_meeting(&frame).intersection(&extent);
                let z_lo = through(hole.to, false).unwrap_or(to.z_lo);
                let z_hi = through(hole.from, true).unwrap_or(from.z_hi);
                bare.push(Barrel { net: None, region, z_lo, z_hi });
            }
        }
    }
    barrels.retain(|barrel| !barrel.region.is_empty());
    bare.retain(|hole| !hole.region.is_empty());
    Scene { artwork, stackup, pile, nets, window, extent, bounds, profile, coats, barrels, bare, openings }
}

/// Warns of copper outside of the board, and of a board between two different open media.
fn warn_of_outline(scene: &Scene<'_>, planes: ImagePlanes, metals: &[Metal], warnings: &mut Vec<Warning>) {
    let (Some(profile), Some(inside)) = (&scene.artwork.profile, &scene.profile) else { return };
    for metal in metals {
        let outside = metal.wide.intersection(&scene.window).difference(profile);
        if let Some(at) = outside.corner() {
            let layer = &scene.stackup.get(metal.layer).name;
            let (net, place) = (&scene.artwork.nets.get(metal.net).name, Place::new(scene.artwork.grid, at));
            let text =
                format!("copper of `{net}` in `{layer}` lies outside of the board at {place}; it is kept");
            warnings.push(Warning::new(text, metal.origin));
        }
    }
    let (Some(first), Some(last)) = (scene.pile.entries.first(), scene.pile.entries.last()) else { return };
    let er = |entry: &Entry| scene.pile.materials[scene.pile.fill(entry.layer).0 as usize].er;
    let differ = er(first).to_bits() != er(last).to_bits() && planes == ImagePlanes::default();
    if differ && !inside.is_empty() {
        let text = "the media above and below the board differ; beside the board the upper one is modelled, down to \
                    the lower face";
        warnings.push(Warning::new(text, scene.stackup.get(last.layer).origin));
    }
}

/// The slabs between `levels`, the half-spaces where no plane bounds them, and the sheets.
fn slice(
    scene: &Scene<'_>,
    levels: &[f64],
    planes: ImagePlanes,
    (metals, model_id): (&[Metal], &[Option<NetId>]),
    warnings: &mut Vec<Warning>,
) -> (Vec<Slab>, Vec<Sheet>) {
    let mut ends = levels.to_vec();
    if planes.below.is_none() {
        ends.insert(0, f64::NEG_INFINITY);
    }
    if planes.above.is_none() {
        ends.push(f64::INFINITY);
    }
    let entries = &scene.pile.entries;
    let copper: Vec<_> =
        entries.iter().map(|entry| scene.layer_copper(entry.layer, metals, model_id, warnings)).collect();
    let followed = |layer: Option<LayerId>| {
        let found = entries.iter().position(|entry| Some(entry.layer) == layer);
        found.map_or_else(Region::empty, |k| scene.plan_copper(&entries[k], &copper[k]))
    };
    let coated: Vec<Region> = scene.coats.iter().map(|coat| followed(coat.copper)).collect();
    let tolerance = 1e-3 * scene.artwork.grid.step();
    let holds =
        |entry: &Entry, lo: f64, hi: f64| entry.z_lo <= lo + tolerance && hi <= entry.z_hi + tolerance;
    let mut slabs = Vec::with_capacity(ends.len());
    for pair in ends.windows(2) {
        let found = entries.iter().position(|e| e.z_hi - e.z_lo > tolerance && holds(e, pair[0], pair[1]));
        if let Some(k) = found {
            slabs.push(scene.slab(&entries[k], (pair[0], pair[1]), &copper[k], &coated, warnings));
        }
    }
    let mut sheets = Vec::new();
    for (entry, copper) in entries.iter().zip(&copper) {
        let is_sheet = entry.kind == EntryKind::Conductor && entry.z_hi - entry.z_lo <= tolerance;
        let on_plane = |plane: Option<f64>| plane.is_some_and(|z| (z - entry.z_lo).abs() <= tolerance);
        let slab = slabs.iter().position(|slab: &Slab| (slab.z_lo - entry.z_lo).abs() <= tolerance);
        if let (true, false, Some(slab)) = (is_sheet, on_plane(planes.below) || on_plane(planes.above), slab)
        {
            sheets.extend(scene.sheets(entry, copper, slab));
        }
    }
    (slabs, sheets)
}

/// A pile of slabs. Guaranteed: slabs are contiguous from bottom to top, the first reaches down to -∞ and the last up
/// to +∞ unless an image plane bounds it there; cells of one slab do not overlap; roles and joins are settled.
#[derive(Debug, Clone, PartialEq)]
pub struct SlabModel {
    /// The grid of all regions.
    pub grid: Grid,
    /// Every conductor; `NetId` in this structure points here.
    pub nets: Vec<ModelNet>,
    /// Every dielectric.
    pub materials: Vec<SlabMaterial>,
    /// From bottom to top.
    pub slabs: Vec<Slab>,
    /// Conductors of no thickness, each at the bottom of the slab with this index.
    pub sheets: Vec<Sheet>,
    /// Infinite planes at 0 V, done by images.
    pub planes: ImagePlanes,
    /// Where copper is modelled.
    pub window: Bounds,
    /// How far interfaces and planes are panelled; contains `window`. Edges on its border are no walls.
    pub extent: Bounds,
    /// Greatest distance between a true arc and its chord, m.
    pub chord_error: f64,
}

/// Index of a material in its model.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct MaterialId(pub u32);

/// A dielectric of the model.
#[derive(Debug, Clone, PartialEq)]
pub struct SlabMaterial {
    /// Name for reports: the layer's name.
    pub name: String,
    /// Relative permittivity, positive.
    pub er: f64,
    /// Where the permittivity comes from.
    pub er_source: String,
}

/// What fills a cell.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Fill {
    /// A conductor.
    Metal(NetId),
    /// A dielectric.
    Dielectric(MaterialId),
}

/// An interval of z.
#[derive(Debug, Clone, PartialEq)]
pub struct Slab {
    /// Stackup layer it belongs to, for group names.
    pub name: String,
    /// Lower end, m; -∞ for the lowest slab of an open model.
    pub z_lo: f64,
    /// Upper end, m; +∞ for the highest slab of an open model.
    pub z_hi: f64,
    /// What fills the rest of the plane, to infinity.
    pub background: MaterialId,
    /// Disjoint parts of the plane that hold something else.
    pub cells: Vec<Cell>,
}

/// A part of a slab. Where walls lean, `bottom` and `top` differ but have the same rings with the same number of
/// points in the same order, and wall k runs from edge k of one to edge k of the other.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// What is in it.
    pub fill: Fill,
    /// Outline at `z_lo`.
    pub bottom: Region,
    /// Outline at `z_hi`.
    pub top: Region,
}

/// A conductor of no thickness.
#[derive(Debug, Clone, PartialEq)]
pub struct Sheet {
    /// Its net.
    pub net: NetId,
    /// Stackup layer it belongs to.
    pub layer: String,
    /// It lies at the bottom of this slab, counted from the bottom.
    pub slab: usize,
    /// Where it is.
    pub region: Region,
}

/// Infinite planes at 0 V parallel to the slabs. z in m.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ImagePlanes {
    /// Everything modelled lies above this plane.
    pub below: Option<f64>,
    /// Everything modelled lies below this plane.
    pub above: Option<f64>,
}
