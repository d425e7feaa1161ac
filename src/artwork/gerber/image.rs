//! Objects in file order to copper per net: dark adds, clear takes away what is there so far.

use crate::diag::Span;
use crate::geom::region::{Bounds, Contour, Fill, Point, Region};
use std::collections::BTreeMap;

/// Index of a name in its file's list; 0 is "no name".
pub(crate) type NameIdx = u32;

/// One object of a file.
#[derive(Debug, Clone)]
pub(crate) struct Object {
    /// Contours on the grid, no point of the plane wound negatively.
    pub(crate) contours: Vec<Contour>,
    /// Dark or clear.
    pub(crate) dark: bool,
    /// Its net.
    pub(crate) net: NameIdx,
    /// What made it.
    pub(crate) kind: Kind,
    /// The bytes that made it.
    pub(crate) span: Span,
}

/// What made an object, for drills and profiles.
#[derive(Debug, Clone, PartialEq)]
pub(crate) enum Kind {
    /// A flash; the diameter when the aperture is a disc.
    Flash {
        /// Where.
        at: Point,
        /// Diameter, steps.
        diameter: Option<f64>,
    },
    /// A straight stroke.
    Line {
        /// Start.
        from: Point,
        /// End.
        to: Point,
        /// Width, steps.
        width: f64,
    },
    /// A curved stroke, as points on it.
    Arc {
        /// Points from start to end.
        path: Box<[Point]>,
        /// Width, steps.
        width: f64,
    },
    /// A region.
    Region,
}

/// The copper of one name.
#[derive(Debug, Clone)]
pub(crate) struct NetImage {
    /// The name.
    pub(crate) net: NameIdx,
    /// Its copper.
    pub(crate) region: Region,
    /// The first object that made it.
    pub(crate) span: Span,
}

struct Batch {
    contours: Vec<Contour>,
    bounds: Bounds,
}

/// The copper that `objects` leave, by net.
///
/// Contours are only collected while the polarity stays dark; a clear batch is taken from the pieces that it meets,
/// and everything of a net is joined once, at the end. So strokes cost one sweep, not one each.
pub(crate) fn compose(objects: Vec<Object>) -> Vec<NetImage> {
    let mut nets: BTreeMap<NameIdx, (Vec<Batch>, Span)> = BTreeMap::new();
    let mut clear: Vec<Contour> = Vec::new();
    for object in objects {
        let Some(bounds) = bounds_of(&object.contours) else { continue };
        if object.dark {
            if !clear.is_empty() {
                take_away(&mut nets, &std::mem::take(&mut clear));
            }
            let net = nets.entry(object.net).or_insert_with(|| (Vec::new(), object.span));
            net.0.push(Batch { contours: object.contours, bounds });
        } else {
            clear.extend(object.contours);
        }
    }
    if !clear.is_empty() {
        take_away(&mut nets, &clear);
    }
    let join = |(net, (batches, span)): (NameIdx, (Vec<Batch>, Span))| {
        let contours: Vec<Contour> = batches.into_iter().flat_map(|b| b.contours).collect();
        NetImage { net, region: Region::from_contours(&contours, Fill::NonZero), span }
    };
    nets.into_iter().map(join).filter(|image| !image.region.is_empty()).collect()
}

fn take_away(nets: &mut BTreeMap<NameIdx, (Vec<Batch>, Span)>, clear: &[Contour]) {
    let clear = Region::from_contours(clear, Fill::NonZero);
    let Some(reach) = clear.bounds() else { return };
    for (batches, _) in nets.values_mut() {
        let (met, mut kept): (Vec<Batch>, Vec<Batch>) =
            std::mem::take(batches).into_iter().partition(|b| b.bounds.meets(&reach));
        let met: Vec<Contour> = met.into_iter().flat_map(|b| b.contours).collect();
        let left = Region::from_contours(&met, Fill::NonZero).difference(&clear);
        for shape in left.shapes() {
            if let Some(bounds) = bounds_of(shape) {
                kept.push(Batch { contours: shape.clone(), bounds });
            }
        }
        *batches = kept;
    }
}

/// Bounds of some contours; `None` when there is no point.
pub(crate) fn bounds_of(contours: &[Contour]) -> Option<Bounds> {
    let mut points = contours.iter().flatten();
    let first = *points.next()?;
    Some(points.fold(Bounds { lo: first, hi: first }, |b, p| Bounds {
        lo: Point::new(b.lo.x.min(p.x), b.lo.y.min(p.y)),
        hi: Point::new(b.hi.x.max(p.x), b.hi.y.max(p.y)),
    }))
}
