//! The part of every bar that covers arcs drawn as chords.

use crate::geom::region::{Contour, Region, signed_area};
use crate::net::Role;
use crate::slab::{Fill, SlabModel};

/// Relative error per (chord error / feature size) of an outline that is all chords. A polygon of 48 corners with the
/// area of a disk has a chord error of 0.0021 radii; its capacitance is within 0.0005 of the disk's 8 eps0 r (the
/// suite's `references::thin_disks`).
const PER_RATIO: f64 = 0.25;
/// Edges up to this many times the longest chord of a circle of the feature size count as chords.
const LONGEST_CHORD: f64 = 3.0;

/// Relative error allowed for chords in the outlines of the row nets: [`PER_RATIO`] times the chord error over the feature size
/// 2 area / perimeter, times the part of the outline that is made of edges short enough to be chords.
pub(crate) fn share(model: &SlabModel) -> f64 {
    let is_row = |net: crate::net::NetId| model.nets.get(net.idx()).is_some_and(|net| net.role == Role::Row);
    let solid = model.slabs.iter().flat_map(|slab| &slab.cells).filter_map(|cell| match cell.fill {
        Fill::Metal(net) if is_row(net) => Some(&cell.bottom),
        _ => None,
    });
    let sheets = model.sheets.iter().filter(|sheet| is_row(sheet.net)).map(|sheet| &sheet.region);
    let rings: Vec<&Contour> = solid.chain(sheets).flat_map(Region::contours).collect();
    let step = model.grid.step();
    let lengths: Vec<f64> =
        rings.iter().flat_map(|ring| edge_lengths(ring)).map(|steps| steps * step).collect();
    let perimeter: f64 = lengths.iter().sum();
    let area: f64 = model.grid.area(rings.iter().map(|ring| signed_area(ring)).sum());
    if !(perimeter > 0.0 && area > 0.0) {
        return 0.0;
    }
    let feature = 2.0 * area / perimeter;
    // The chord of a circle of radius R with sagitta e is sqrt(8 R e) long, for e much below R.
    let longest = LONGEST_CHORD * (8.0 * feature * model.chord_error).sqrt();
    let chords: f64 = lengths.iter().filter(|length| **length <= longest).sum();
    PER_RATIO * model.chord_error / feature * chords / perimeter
}

#[expect(clippy::cast_precision_loss, reason = "lengths of edges, far below 2^53 steps")]
fn edge_lengths(ring: &Contour) -> impl Iterator<Item = f64> {
    (0..ring.len()).map(|k| {
        let (p, q) = (ring[k], ring[(k + 1) % ring.len()]);
        ((q.x - p.x) as f64).hypot((q.y - p.y) as f64)
    })
}
