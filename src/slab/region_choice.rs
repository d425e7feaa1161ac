//! The window in which copper is modelled, and the extent up to which interfaces and planes go on past it.

use crate::artwork::{Artwork, Lining};
use crate::geom::region::{Bounds, MAX_COORDINATE, Point};
use crate::job::{Job, LayerId, RegionChoice};
use crate::net::NetId;
use crate::slab::copper::Metal;
use crate::slab::error::{Place, SlabError};
use crate::slab::options::SlabOptions;
use crate::slab::pile::{EntryKind, Pile};
use crate::slab::roles::{NetPlan, find};

/// The default margin around nets, in heights to the nearest other conductor layer. Common practice: the coupling of
/// two traces over a plane falls off as (height / distance)^2, so what lies farther than this matters in per mille.
const MARGIN_HEIGHTS: f64 = 3.0;

/// Bounds of the copper of the nets that `keep` accepts, barrels included.
fn copper_bounds(
    artwork: &Artwork,
    metals: &[Metal],
    plan: &NetPlan,
    keep: impl Fn(NetId) -> bool,
) -> Option<Bounds> {
    let holes = artwork.holes.iter().filter_map(|hole| match hole.lining {
        Lining::Plated(net) if keep(plan.stands_for[net.idx()]) => hole.region.bounds(),
        _ => None,
    });
    let copper = metals.iter().filter(|m| keep(m.net)).filter_map(|m| m.wide.bounds());
    copper.chain(holes).reduce(joined)
}

/// The smallest rectangle that holds both.
pub(crate) fn joined(a: Bounds, b: Bounds) -> Bounds {
    Bounds {
        lo: Point::new(a.lo.x.min(b.lo.x), a.lo.y.min(b.lo.y)),
        hi: Point::new(a.hi.x.max(b.hi.x), a.hi.y.max(b.hi.y)),
    }
}

/// The window of `job`; problems go to `errors`.
pub(crate) fn window(
    artwork: &Artwork,
    pile: &Pile,
    job: &Job,
    (metals, plan): (&[Metal], &NetPlan),
    errors: &mut Vec<SlabError>,
) -> Option<Bounds> {
    let grid = artwork.grid;
    let Some(all) = copper_bounds(artwork, metals, plan, |_| true) else {
        errors.push(SlabError::EmptyRegion { copper: "nothing: no layer has any".to_owned() });
        return None;
    };
    match &job.region {
        RegionChoice::Whole => Some(all),
        RegionChoice::Window { lo, hi } => {
            let corner = |at: &[f64; 2]| Some(Point::new(grid.snap(at[0])?, grid.snap(at[1])?));
            let window = corner(lo).zip(corner(hi)).filter(|(lo, hi)| lo.x < hi.x && lo.y < hi.y);
            let Some((lo_corner, hi_corner)) = window else {
                let place = |at: &[f64; 2]| Place { x: at[0], y: at[1] };
                errors.push(SlabError::BadWindow { lo: place(lo), hi: place(hi) });
                return None;
            };
            let window = Bounds { lo: lo_corner, hi: hi_corner };
            if !window.meets(&all) {
                let span = format!("from {} to {}", Place::new(grid, all.lo), Place::new(grid, all.hi));
                errors.push(SlabError::EmptyRegion { copper: span });
                return None;
            }
            Some(window)
        }
        RegionChoice::Around { nets, margin } => {
            let ids: Vec<NetId> = nets
                .iter()
                .filter_map(|named| find(&artwork.nets, named, "around", errors))
                .map(|net| plan.stands_for[net.idx()])
                .collect();
            if !errors.is_empty() {
                return None;
            }
            let Some(bounds) = copper_bounds(artwork, metals, plan, |net| ids.contains(&net)) else {
                let span = format!("from {} to {}", Place::new(grid, all.lo), Place::new(grid, all.hi));
                errors.push(SlabError::EmptyRegion { copper: span });
                return None;
            };
            let margin = margin.unwrap_or_else(|| default_margin(pile, metals, &ids));
            match grid.snap(margin.max(0.0)).filter(|steps| *steps < MAX_COORDINATE / 8) {
                Some(steps) => Some(bounds.grown(steps)),
                None => {
                    errors.push(SlabError::TooLarge { size: margin, step: grid.step() });
                    None
                }
            }
        }
    }
}

/// Three times the height from the layers of `nets` to other conductors.
fn default_margin(pile: &Pile, metals: &[Metal], nets: &[NetId]) -> f64 {
    let layers: Vec<LayerId> = metals.iter().filter(|m| nets.contains(&m.net)).map(|m| m.layer).collect();
    MARGIN_HEIGHTS * near_height(pile, &layers)
}

/// The largest height from one of `layers` to the nearest other conductor layer, m; with one conductor layer only, the height
/// of the finite stack.
pub(crate) fn near_height(pile: &Pile, layers: &[LayerId]) -> f64 {
    let conductors: Vec<_> = pile.entries.iter().filter(|e| e.kind == EntryKind::Conductor).collect();
    let (lo, hi) = pile.span();
    let mut height: f64 = 0.0;
    for entry in conductors.iter().filter(|entry| layers.contains(&entry.layer)) {
        let gaps = conductors
            .iter()
            .filter(|other| other.layer != entry.layer)
            .map(|other| (other.z_lo - entry.z_hi).max(entry.z_lo - other.z_hi));
        height = height.max(gaps.reduce(f64::min).unwrap_or(hi - lo));
    }
    if height > 0.0 { height } else { hi - lo }
}

/// The extent: `base` grown by the reach that `height` asks for: that of the finite part of the model over an image
/// plane, else [`near_height`] of the row nets, m.
pub(crate) fn extent(
    artwork: &Artwork,
    (base, window): (Bounds, Bounds),
    height: f64,
    with_plane: bool,
    options: &SlabOptions,
    errors: &mut Vec<SlabError>,
) -> Option<Bounds> {
    let grid = artwork.grid;
    let half = 0.5 * grid.length((window.hi.x - window.lo.x).max(window.hi.y - window.lo.y));
    let reach = if with_plane {
        options.reach_heights * height
    } else {
        (options.open_reach_heights * height).max(half)
    };
    let size =
        [base.lo.x, base.lo.y, base.hi.x, base.hi.y].iter().map(|x| grid.length(x.abs())).fold(0.0, f64::max);
    // Two bits are left for the sums of the overlay.
    let limit = MAX_COORDINATE / 4;
    let steps = grid.snap(reach).filter(|_| grid.snap(size + reach).is_some_and(|steps| steps <= limit));
    if steps.is_none() {
        errors.push(SlabError::TooLarge { size: size + reach, step: grid.step() });
    }
    steps.map(|steps| base.grown(steps.max(1)))
}
