//! How charge crowds at the edges of faces, read from what fills the four quadrants around an edge.

use crate::faces::EdgeGrade;
use crate::geom::region::{Contour, Point};
use crate::net::NetId;
use crate::slab::Fill;
use std::collections::HashSet;

/// Turns below this are facets of an arc, rad: 30 degrees, as the corners of a twelve-sided polygon.
const FACET_TURN: f64 = std::f64::consts::PI / 6.0;

/// What lies below and above a level at one side of an edge in it.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct Side {
    pub(crate) below: Fill,
    pub(crate) above: Fill,
    pub(crate) sheet: Option<NetId>,
}

fn is_metal(fill: Fill) -> bool {
    matches!(fill, Fill::Metal(_))
}

/// Grade of a horizontal edge between `left` and `right`; `None` is beyond the border of the extent.
pub(crate) fn horizontal_edge(left: Option<&Side>, right: Option<&Side>) -> EdgeGrade {
    let (Some(left), Some(right)) = (left, right) else { return EdgeGrade::Smooth };
    let count = |side: &Side| usize::from(is_metal(side.below)) + usize::from(is_metal(side.above));
    let (n_left, n_right) = (count(left), count(right));
    match (n_left, n_right) {
        (0, 0) if left.sheet.is_some() != right.sheet.is_some() => EdgeGrade::Rim,
        // A sheet that goes on from the metal's edge takes the crowding with it to its own rim.
        (1, 0) if right.sheet.is_none() => EdgeGrade::Solid,
        (0, 1) if left.sheet.is_none() => EdgeGrade::Solid,
        // Metal meets metal across the edge only.
        (1, 1) if is_metal(left.below) != is_metal(right.below) => EdgeGrade::Solid,
        _ => EdgeGrade::Smooth,
    }
}

/// The corners at which the metal bounded by `rings` turns by more than a facet of an arc would.
pub(crate) fn sharp_corners<'a>(rings: impl Iterator<Item = &'a Contour>) -> HashSet<Point> {
    let mut sharp = HashSet::new();
    for ring in rings {
        let n = ring.len();
        for k in 0..n {
            if turn(ring[(k + n - 1) % n], ring[k], ring[(k + 1) % n]) > FACET_TURN {
                sharp.insert(ring[k]);
            }
        }
    }
    sharp
}

/// The angle by which the way a, b, c turns left at b, rad.
#[expect(clippy::cast_precision_loss, reason = "an angle needs no more")]
fn turn(a: Point, b: Point, c: Point) -> f64 {
    let (ux, uy) = ((b.x - a.x) as f64, (b.y - a.y) as f64);
    let (vx, vy) = ((c.x - b.x) as f64, (c.y - b.y) as f64);
    (ux * vy - uy * vx).atan2(ux * vx + uy * vy)
}
