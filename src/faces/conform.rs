//! All outlines of a model made to meet in common corners only, level by level.

use crate::faces::FacesError;
use crate::geom::region::{Contour, Region};
use crate::geom::snap::{Outline, SnapRing, snap};
use crate::net::NetId;
use crate::slab::{Fill, SlabModel};

/// The outlines of a model, conforming. Level j lies between slab j and slab j + 1.
pub(crate) struct Conformed {
    /// Per slab, per cell.
    pub(crate) slabs: Vec<Vec<CellOutline>>,
    /// Per level: the sheets that lie there.
    pub(crate) sheets: Vec<Vec<SheetOutline>>,
}

/// A cell whose rings share corners with all they meet.
pub(crate) struct CellOutline {
    pub(crate) fill: Fill,
    pub(crate) bottom: Vec<SnapRing>,
    /// The same as `bottom` for upright walls.
    pub(crate) top: Vec<SnapRing>,
    pub(crate) leaning: bool,
}

/// A sheet whose rings share corners with all they meet.
pub(crate) struct SheetOutline {
    pub(crate) net: NetId,
    pub(crate) layer: String,
    pub(crate) rings: Vec<SnapRing>,
}

fn rings(region: &Region) -> Vec<SnapRing> {
    region.contours().map(|ring: &Contour| SnapRing::new(ring.clone())).collect()
}

/// Conforming outlines of `model`.
pub(crate) fn conform(model: &SlabModel) -> Result<Conformed, FacesError> {
    let n_levels = model.slabs.len().saturating_sub(1).max(1);
    let mut outlines = Vec::new();
    outlines.push(Outline {
        rings: rings(&model.extent.region()),
        lo: 0,
        hi: n_levels - 1,
        keep_corners: true,
    });
    for (j, slab) in model.slabs.iter().enumerate() {
        let endless = slab.z_lo.is_infinite() || slab.z_hi.is_infinite();
        if endless && !slab.cells.is_empty() {
            return Err(FacesError::InfiniteCell { slab: slab.name.clone() });
        }
        // The levels below and above; at an image plane there is only one, at two planes none but level 0 stands in.
        let (below, above) = (j.saturating_sub(1), j.min(n_levels - 1));
        for cell in &slab.cells {
            let leaning = cell.bottom != cell.top;
            let mut add = |region: &Region, lo: usize, hi: usize| {
                outlines.push(Outline { rings: rings(region), lo, hi, keep_corners: leaning });
            };
            if leaning {
                add(&cell.bottom, below, below);
                add(&cell.top, above, above);
            } else {
                add(&cell.bottom, below, above);
            }
        }
    }
    for sheet in &model.sheets {
        let level = sheet.slab.saturating_sub(1).min(n_levels - 1);
        outlines.push(Outline { rings: rings(&sheet.region), lo: level, hi: level, keep_corners: false });
    }
    snap(&mut outlines, n_levels);
    Ok(collect(model, outlines, n_levels))
}

fn collect(model: &SlabModel, outlines: Vec<Outline>, n_levels: usize) -> Conformed {
    let mut done = outlines.into_iter().map(|outline| outline.rings).skip(1);
    let mut next = || done.next().unwrap_or_default();
    let mut slabs = Vec::with_capacity(model.slabs.len());
    for slab in &model.slabs {
        let mut cells = Vec::with_capacity(slab.cells.len());
        for cell in &slab.cells {
            let leaning = cell.bottom != cell.top;
            let bottom = next();
            let top = if leaning { next() } else { bottom.clone() };
            cells.push(CellOutline { fill: cell.fill, bottom, top, leaning });
        }
        slabs.push(cells);
    }
    let mut sheets: Vec<Vec<SheetOutline>> = (0..n_levels).map(|_| Vec::new()).collect();
    for sheet in &model.sheets {
        let level = sheet.slab.saturating_sub(1).min(n_levels - 1);
        sheets[level].push(SheetOutline { net: sheet.net, layer: sheet.layer.clone(), rings: next() });
    }
    Conformed { slabs, sheets }
}
