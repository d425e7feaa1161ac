//! Which regions of one layer overlap or touch, and where: exact, on the grid.
//!
//! The plane is cut into vertical strips; inside a strip the edges are swept upward. An edge is compared only with
//! edges of other parts whose boxes it meets, so a plane with thousands of anti-pads costs little.

use crate::geom::region::{Point, Region};

/// One region of the layer; regions of the same `node` are not compared.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Part<'a> {
    /// Whose it is.
    pub(crate) node: u32,
    /// Where it is.
    pub(crate) region: &'a Region,
}

#[derive(Clone, Copy)]
struct Edge {
    a: Point,
    b: Point,
    part: u32,
}

impl Edge {
    fn y_lo(&self) -> i64 {
        self.a.y.min(self.b.y)
    }

    fn y_hi(&self) -> i64 {
        self.a.y.max(self.b.y)
    }
}

/// Calls `found` with the indices of two parts of different nodes and a point that both share; the same two parts may
/// be reported more than once unless `known` says that they need not be looked at again.
pub(crate) fn contacts(
    parts: &[Part<'_>],
    mut known: impl FnMut(usize, usize) -> bool,
    mut found: impl FnMut(usize, usize, Point),
) {
    let strips = Strips::new(parts);
    for strip in 0..strips.strips.len() {
        sweep(parts, &strips, strip, &mut known, &mut found);
    }
    // What lies wholly inside another part shares no edge with it.
    for (k, part) in parts.iter().enumerate() {
        for shape in part.region.shapes() {
            let Some(at) = shape.first().and_then(|ring| ring.first()) else { continue };
            for other in strips.covering(*at) {
                if parts[other].node != part.node && !known(k, other) {
                    found(k, other, *at);
                }
            }
        }
    }
}

struct Strips {
    x_lo: i64,
    width: i64,
    edges: Vec<Edge>,
    strips: Vec<Vec<u32>>,
}

impl Strips {
    fn new(parts: &[Part<'_>]) -> Strips {
        let mut edges = Vec::new();
        for (k, part) in (0u32..).zip(parts) {
            for ring in part.region.contours() {
                let next = ring.iter().cycle().skip(1);
                edges.extend(ring.iter().zip(next).map(|(a, b)| Edge { a: *a, b: *b, part: k }));
            }
        }
        let x_lo = edges.iter().map(|e| e.a.x).min().unwrap_or(0);
        let x_hi = edges.iter().map(|e| e.a.x).max().unwrap_or(0);
        let count = i64::try_from(edges.len() / 128).unwrap_or(0).clamp(1, 2048);
        let width = ((x_hi - x_lo) / count + 1).max(1);
        let mut strips = vec![Vec::new(); usize::try_from(count).unwrap_or(1)];
        for (k, edge) in edges.iter().enumerate() {
            let (first, last) = (edge.a.x.min(edge.b.x), edge.a.x.max(edge.b.x));
            for strip in &mut strips[index(first, x_lo, width)..=index(last, x_lo, width)] {
                strip.push(u32::try_from(k).unwrap_or(u32::MAX));
            }
        }
        for strip in &mut strips {
            strip.sort_by_key(|k| (edges[*k as usize].y_lo(), *k));
        }
        Strips { x_lo, width, edges, strips }
    }

    /// The parts that strictly contain `at`, by the parity of crossings of a ray upward.
    fn covering(&self, at: Point) -> Vec<usize> {
        let mut inside: Vec<u32> = Vec::new();
        for k in &self.strips[index(at.x, self.x_lo, self.width)] {
            let Edge { a, b, part } = self.edges[*k as usize];
            if (a.x > at.x) == (b.x > at.x) {
                continue;
            }
            let side = cross(a, b, at);
            // Above the point: `at` lies to the right of an edge that runs to the right, left of one to the left.
            if (side < 0) == (b.x > a.x) && side != 0 {
                match inside.iter().position(|p| *p == part) {
                    Some(there) => {
                        inside.swap_remove(there);
                    }
                    None => inside.push(part),
                }
            }
        }
        inside.sort_unstable();
        inside.into_iter().map(|p| p as usize).collect()
    }
}

fn index(x: i64, x_lo: i64, width: i64) -> usize {
    usize::try_from((x - x_lo) / width).unwrap_or(0)
}

fn sweep(
    parts: &[Part<'_>],
    strips: &Strips,
    strip: usize,
    known: &mut impl FnMut(usize, usize) -> bool,
    found: &mut impl FnMut(usize, usize, Point),
) {
    let mut active: Vec<Edge> = Vec::new();
    for k in &strips.strips[strip] {
        let edge = strips.edges[*k as usize];
        let (y_lo, node) = (edge.y_lo(), parts[edge.part as usize].node);
        active.retain(|other| other.y_hi() >= y_lo);
        let (x_lo, x_hi) = (edge.a.x.min(edge.b.x), edge.a.x.max(edge.b.x));
        for other in &active {
            if other.part == edge.part
                || other.a.x.max(other.b.x) < x_lo
                || other.a.x.min(other.b.x) > x_hi
                || parts[other.part as usize].node == node
                || known(edge.part as usize, other.part as usize)
            {
                continue;
            }
            if let Some(at) = meet(&edge, other) {
                found(edge.part as usize, other.part as usize, at);
            }
        }
        active.push(edge);
    }
}

/// A point that two edges share, rounded to the grid.
fn meet(e: &Edge, f: &Edge) -> Option<Point> {
    let (fa, fb) = (cross(e.a, e.b, f.a), cross(e.a, e.b, f.b));
    let (ea, eb) = (cross(f.a, f.b, e.a), cross(f.a, f.b, e.b));
    let within = |e: &Edge, p: Point| {
        p.x >= e.a.x.min(e.b.x) && p.x <= e.a.x.max(e.b.x) && p.y >= e.y_lo() && p.y <= e.y_hi()
    };
    for (side, edge, p) in [(fa, e, f.a), (fb, e, f.b), (ea, f, e.a), (eb, f, e.b)] {
        if side == 0 && within(edge, p) {
            return Some(p);
        }
    }
    if fa == 0 || fb == 0 || ea == 0 || eb == 0 || (fa > 0) == (fb > 0) || (ea > 0) == (eb > 0) {
        return None;
    }
    #[expect(
        clippy::cast_precision_loss,
        clippy::cast_possible_truncation,
        reason = "a place to show, no more"
    )]
    let along =
        |from: i64, to: i64| from + ((to - from) as f64 * (ea as f64 / (ea as f64 - eb as f64))) as i64;
    Some(Point::new(along(e.a.x, e.b.x), along(e.a.y, e.b.y)))
}

/// Twice the signed area of the triangle a, b, p: positive when p lies left of the edge.
fn cross(a: Point, b: Point, p: Point) -> i128 {
    i128::from(b.x - a.x) * i128::from(p.y - a.y) - i128::from(b.y - a.y) * i128::from(p.x - a.x)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::region::Bounds;

    fn square(x: i64, y: i64, side: i64) -> Region {
        Bounds { lo: Point::new(x, y), hi: Point::new(x + side, y + side) }.region()
    }

    fn count(regions: &[Region]) -> usize {
        let parts: Vec<Part<'_>> =
            (0u32..).zip(regions).map(|(node, region)| Part { node, region }).collect();
        let mut pairs = std::collections::BTreeSet::new();
        contacts(
            &parts,
            |_, _| false,
            |a, b, _| {
                pairs.insert((a.min(b), a.max(b)));
            },
        );
        pairs.len()
    }

    #[test]
    fn overlap_edge_corner_and_inside_count_and_a_gap_does_not() {
        assert_eq!(count(&[square(0, 0, 10), square(5, 5, 10)]), 1);
        assert_eq!(count(&[square(0, 0, 10), square(10, 0, 10)]), 1);
        assert_eq!(count(&[square(0, 0, 10), square(10, 10, 10)]), 1);
        assert_eq!(count(&[square(0, 0, 10), square(3, 3, 2)]), 1);
        assert_eq!(count(&[square(0, 0, 10), square(11, 0, 10)]), 0);
        let ring = square(0, 0, 100).difference(&square(10, 10, 80));
        assert_eq!(count(&[ring.clone(), square(40, 40, 5)]), 0);
        assert_eq!(count(&[ring, square(40, 40, 50)]), 1);
    }
}
