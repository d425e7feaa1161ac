//! Copper as it comes out of the etching bath: bias on every edge, leaning walls, and plated barrels.

use crate::artwork::{Artwork, Copper, Lining};
use crate::diag::{Origin, Warning};
use crate::geom::region::{Grid, Point, Region};
use crate::job::{LayerId, LayerKind, Stackup, WideFace};
use crate::net::NetId;
use crate::slab::error::{Place, SlabError};

/// The metal of one net in one layer; `net` is that of the artwork's representative.
#[derive(Debug, Clone)]
pub(crate) struct Metal {
    pub(crate) layer: LayerId,
    pub(crate) net: NetId,
    /// In plan, at the wide face.
    pub(crate) wide: Region,
    pub(crate) origin: Origin,
}

/// A layer's leaning walls.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Lean {
    /// How far the narrow face is set in, grid steps; negative when it is the wider one.
    pub(crate) inset: f64,
    /// Whether the artwork's width is that of the lower face.
    pub(crate) wide_below: bool,
}

/// The artwork's copper with etch bias, one entry per layer and joined net; shorts go to `errors`, copper that the
/// bias removes or breaks in two to `warnings`.
pub(crate) fn etched(
    artwork: &Artwork,
    stackup: &Stackup,
    stands_for: &[NetId],
    errors: &mut Vec<SlabError>,
    warnings: &mut Vec<Warning>,
) -> Vec<Metal> {
    let mut metals: Vec<Metal> = Vec::new();
    let mut biased = vec![false; stackup.layers.len()];
    // Walls that widen away from the artwork's face close gaps as well, grid steps.
    let widening: Vec<i64> = stackup.iter().map(|(id, _)| widening(stackup, id, artwork.grid)).collect();
    for copper in &artwork.copper {
        let bias = match &stackup.get(copper.layer).kind {
            LayerKind::Conductor { etch_bias, .. } => artwork.grid.snap(*etch_bias).unwrap_or(0),
            _ => 0,
        };
        let wide = copper.region.offset(bias);
        if bias < 0 {
            warn_of_losses(artwork, stackup, copper, bias, warnings);
        }
        biased[copper.layer.idx()] |= bias > 0;
        let net = stands_for[copper.net.idx()];
        match metals.iter_mut().find(|m| m.layer == copper.layer && m.net == net) {
            Some(metal) => metal.wide = metal.wide.union(&wide),
            None if wide.is_empty() => {}
            None => metals.push(Metal { layer: copper.layer, net, wide, origin: copper.origin }),
        }
    }
    for (k, metal) in metals.iter().enumerate() {
        let growth = widening[metal.layer.idx()];
        if !biased[metal.layer.idx()] && growth == 0 {
            continue;
        }
        let cause = if growth > 0 { "walls that widen" } else { "etch bias" };
        let wide = metal.wide.offset(growth);
        for other in metals[k + 1..].iter().filter(|other| other.layer == metal.layer) {
            if let Some(at) = overlap(&wide, &other.wide.offset(growth)) {
                errors.push(short(
                    artwork,
                    stackup,
                    (metal.net, other.net),
                    (metal.layer, at, metal.origin),
                    cause,
                ));
            }
        }
    }
    metals
}

fn widening(stackup: &Stackup, layer: LayerId, grid: Grid) -> i64 {
    let inset = lean(stackup, layer, grid).map_or(0.0, |lean| lean.inset);
    #[expect(
        clippy::cast_possible_truncation,
        reason = "an inset is at most a few thousand steps per micrometre"
    )]
    {
        (-inset).max(0.0).round() as i64
    }
}

/// A warning for each piece of `copper` that an inward `bias` removes or breaks up.
fn warn_of_losses(
    artwork: &Artwork,
    stackup: &Stackup,
    copper: &Copper,
    bias: i64,
    warnings: &mut Vec<Warning>,
) {
    for piece in copper.region.pieces() {
        let what = match piece.offset(bias).shapes().len() {
            0 => "removes copper",
            1 => continue,
            _ => "breaks up copper",
        };
        let place = Place::new(artwork.grid, piece.corner().unwrap_or(Point::new(0, 0)));
        let (net, layer) = (&artwork.nets.get(copper.net).name, &stackup.get(copper.layer).name);
        let text = format!("the etch bias {what} of `{net}` in `{layer}` at {place}");
        warnings.push(Warning::new(text, copper.origin));
    }
}

/// Barrels of plated holes against copper of other nets: shorts go to `errors`.
pub(crate) fn check_barrels(
    artwork: &Artwork,
    stackup: &Stackup,
    stands_for: &[NetId],
    metals: &[Metal],
    errors: &mut Vec<SlabError>,
) {
    let plated = artwork.holes.iter().filter_map(|hole| match hole.lining {
        Lining::Plated(net) => Some((hole, stands_for[net.idx()])),
        Lining::Bare => None,
    });
    let plated: Vec<_> = plated.collect();
    for (k, (hole, net)) in plated.iter().enumerate() {
        for metal in metals {
            let spanned = hole.from <= metal.layer && metal.layer <= hole.to;
            let near = || hole.region.bounds().zip(metal.wide.bounds()).is_some_and(|(a, b)| a.meets(&b));
            if !spanned || metal.net == *net || !near() {
                continue;
            }
            if let Some(at) = still_there(artwork, metal.layer, &hole.region.intersection(&metal.wide)) {
                let place = (metal.layer, at, hole.origin);
                errors.push(short(
                    artwork,
                    stackup,
                    (*net, metal.net),
                    place,
                    "a plated hole runs through copper",
                ));
            }
        }
        for (other, other_net) in &plated[k + 1..] {
            let both = (hole.from.max(other.from), hole.to.min(other.to));
            if net == other_net || both.0 > both.1 {
                continue;
            }
            if let Some(at) = overlap(&hole.region, &other.region) {
                let place = (both.0, at, other.origin);
                errors.push(short(artwork, stackup, (*net, *other_net), place, "two plated holes overlap"));
            }
        }
    }
}

/// A corner of what is left of `overlap` once bare holes have been drilled.
fn still_there(artwork: &Artwork, layer: LayerId, overlap: &Region) -> Option<Point> {
    let bare = artwork.holes.iter().filter(|h| h.lining == Lining::Bare && h.from <= layer && layer <= h.to);
    let near =
        bare.filter(|hole| hole.region.bounds().zip(overlap.bounds()).is_some_and(|(a, b)| a.meets(&b)));
    near.fold(overlap.clone(), |rest, hole| rest.difference(&hole.region)).corner()
}

/// A point common to both, when they overlap.
pub(crate) fn overlap(a: &Region, b: &Region) -> Option<Point> {
    if !a.bounds()?.meets(&b.bounds()?) {
        return None;
    }
    a.intersection(b).corner()
}

pub(crate) fn short(
    artwork: &Artwork,
    stackup: &Stackup,
    (first, second): (NetId, NetId),
    (layer, at, origin): (LayerId, Point, Origin),
    cause: &'static str,
) -> SlabError {
    SlabError::Short {
        first: artwork.nets.get(first).name.clone(),
        second: artwork.nets.get(second).name.clone(),
        layer: stackup.get(layer).name.clone(),
        place: Place::new(artwork.grid, at),
        cause,
        origin,
    }
}

/// How the walls of `layer` lean; `None` when they are upright or the layer is a sheet.
pub(crate) fn lean(stackup: &Stackup, layer: LayerId, grid: Grid) -> Option<Lean> {
    let LayerKind::Conductor { thickness, side_slope, wide_face, .. } = &stackup.get(layer).kind else {
        return None;
    };
    let inset = thickness / side_slope.tan() / grid.step();
    // A shift below half a step rounds to nothing.
    if *thickness <= 0.0 || inset.abs() < 0.5 {
        return None;
    }
    let wide_below = match wide_face {
        WideFace::Lower => true,
        WideFace::Upper => false,
        WideFace::OnCore => {
            let order: Vec<LayerId> = stackup.conductors().collect();
            let place = order.iter().position(|id| *id == layer).unwrap_or(0);
            2 * place < order.len()
        }
    };
    Some(Lean { inset, wide_below })
}

/// Outlines of `metal` at the foot and at the top of its layer, corner by corner alike.
///
/// A piece whose narrow face would collapse gets upright walls at the mean inset, and a warning that names it.
pub(crate) fn leaning(
    metal: &Metal,
    lean: Lean,
    what: &str,
    grid: Grid,
    warnings: &mut Vec<Warning>,
) -> (Region, Region) {
    let (mut foot, mut top) = (Vec::new(), Vec::new());
    for piece in metal.wide.pieces() {
        if let Some(narrow) = piece.offset_by_corner(-lean.inset) {
            let (low, high) = if lean.wide_below { (piece, narrow) } else { (narrow, piece) };
            foot.push(low);
            top.push(high);
            continue;
        }
        let mean = mean_outline(&piece, lean);
        let at = piece.corner().unwrap_or(Point::new(0, 0));
        let place = Place::new(grid, at);
        warnings.push(Warning::new(
            format!(
                "leaning walls of {what} at {place} would meet across a narrow neck or a small arc; this piece of \
                 copper has upright walls at the mean width instead"
            ),
            metal.origin,
        ));
        foot.push(mean.clone());
        top.push(mean);
    }
    let (foot, top) = (Region::gathered(&foot), Region::gathered(&top));
    if foot.is_simple() && top.is_simple() {
        return (foot, top);
    }
    // Pieces of one net that widen may run into each other.
    let text =
        format!("leaning walls of {what} run into each other; they are upright at the mean width instead");
    warnings.push(Warning::new(text, metal.origin));
    let mean = mean_outline(&metal.wide, lean);
    (mean.clone(), mean)
}

/// Upright outline half way between the wide and the narrow face.
pub(crate) fn mean_outline(wide: &Region, lean: Lean) -> Region {
    #[expect(
        clippy::cast_possible_truncation,
        reason = "an inset is at most a few thousand steps per micrometre"
    )]
    let half = (0.5 * lean.inset).round() as i64;
    wide.offset(-half)
}
