//! Outlines that share a level made to meet only in common corners: snap rounding on the grid.
//!
//! A crossing of two slanted edges seldom falls on the grid. If every Boolean operation rounded it on its own, walls
//! and horizontal faces would part by a step. Here all outlines of a level get the rounded crossing and every corner
//! that lies on (within a step of) an edge as a corner of their own, until nothing changes; after that overlays are
//! exact. Method: snap rounding, Hobby1999, with the pixel widened to one step so that crossings which an earlier
//! operation rounded are caught as well.

use crate::geom::region::{Contour, Point};
use std::collections::HashMap;

/// An upper limit on passes; two or three are usual.
const MAX_ROUNDS: usize = 12;

/// A ring with, for each edge, the edge of the original ring that it is part of.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SnapRing {
    /// Corners.
    pub points: Contour,
    /// `source[k]`: index of the original edge that edge k is part of.
    pub source: Vec<u32>,
}

impl SnapRing {
    /// The ring as it comes.
    #[must_use]
    pub fn new(points: Contour) -> Self {
        let source = (0..u32::try_from(points.len()).unwrap_or(u32::MAX)).collect();
        SnapRing { points, source }
    }
}

/// Rings that are seen at the levels `lo..=hi`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Outline {
    /// Rings, outer and holes alike.
    pub rings: Vec<SnapRing>,
    /// Lowest level at which they are seen.
    pub lo: usize,
    /// Highest level at which they are seen.
    pub hi: usize,
    /// Whether every original corner must stay, even in a spike.
    pub keep_corners: bool,
}

/// Adds corners to `outlines` until outlines that share one of `n_levels` levels meet in corners only; rings that
/// collapse to nothing are removed.
pub fn snap(outlines: &mut [Outline], n_levels: usize) {
    let mut unsettled = vec![true; n_levels];
    for _ in 0..MAX_ROUNDS {
        let mut any = false;
        for level in 0..n_levels {
            if std::mem::take(&mut unsettled[level]) {
                any |= snap_level(outlines, level, &mut unsettled);
            }
        }
        if !any {
            break;
        }
    }
}

fn key(a: Point, b: Point) -> (Point, Point) {
    if (a.x, a.y) <= (b.x, b.y) { (a, b) } else { (b, a) }
}

/// One pass over a level; every level that sees a changed outline becomes unsettled. Returns whether any changed.
fn snap_level(outlines: &mut [Outline], level: usize, unsettled: &mut [bool]) -> bool {
    let mut edges: Vec<(Point, Point)> = Vec::new();
    for outline in outlines.iter().filter(|o| o.lo <= level && level <= o.hi) {
        for ring in &outline.rings {
            let n = ring.points.len();
            edges.extend((0..n).map(|k| key(ring.points[k], ring.points[(k + 1) % n])));
        }
    }
    edges.sort_unstable_by_key(|(a, b)| (a.x, a.y, b.x, b.y));
    edges.dedup();
    let inserts = new_corners(&edges);
    if inserts.is_empty() {
        return false;
    }
    let mut any = false;
    for outline in outlines.iter_mut().filter(|o| o.lo <= level && level <= o.hi) {
        let mut changed = false;
        for ring in &mut outline.rings {
            changed |= insert(ring, &inserts, outline.keep_corners);
        }
        if changed {
            outline.rings.retain(|ring| ring.points.len() >= 3);
            unsettled[outline.lo..=outline.hi].fill(true);
        }
        any |= changed;
    }
    any
}

/// For each edge that needs it, the corners to add, in order along the edge.
fn new_corners(edges: &[(Point, Point)]) -> HashMap<(Point, Point), Vec<Point>> {
    let Some(buckets) = Buckets::new(edges) else { return HashMap::new() };
    let mut found: Vec<Vec<Point>> = vec![Vec::new(); edges.len()];
    let mut hot: Vec<Point> = edges.iter().flat_map(|&(a, b)| [a, b]).collect();
    for bucket in &buckets.lists {
        for (k, &i) in bucket.iter().enumerate() {
            for &j in &bucket[k + 1..] {
                if let Some(at) = crossing(edges[i as usize], edges[j as usize]) {
                    found[i as usize].push(at);
                    found[j as usize].push(at);
                    hot.push(at);
                }
            }
        }
    }
    hot.sort_unstable_by_key(|p| (p.x, p.y));
    hot.dedup();
    for &p in &hot {
        for &i in &buckets.lists[buckets.at(p)] {
            if touches(edges[i as usize], p) {
                found[i as usize].push(p);
            }
        }
    }
    let mut inserts = HashMap::new();
    for (&(a, b), mut corners) in edges.iter().zip(found) {
        corners.retain(|p| *p != a && *p != b);
        if corners.is_empty() {
            continue;
        }
        let along = |p: &Point| {
            i128::from(p.x - a.x) * i128::from(b.x - a.x) + i128::from(p.y - a.y) * i128::from(b.y - a.y)
        };
        corners.sort_unstable_by_key(|p| (along(p), p.x, p.y));
        corners.dedup();
        inserts.insert((a, b), corners);
    }
    inserts
}

fn cross(o: Point, a: Point, b: Point) -> i128 {
    i128::from(a.x - o.x) * i128::from(b.y - o.y) - i128::from(b.x - o.x) * i128::from(a.y - o.y)
}

/// The grid point nearest to where two edges cross properly.
fn crossing((a, b): (Point, Point), (c, d): (Point, Point)) -> Option<Point> {
    let (c_side, d_side) = (cross(a, b, c), cross(a, b, d));
    let (a_side, b_side) = (cross(c, d, a), cross(c, d, b));
    if c_side.signum() * d_side.signum() >= 0 || a_side.signum() * b_side.signum() >= 0 {
        return None;
    }
    #[expect(
        clippy::cast_precision_loss,
        reason = "a relative error of 1e-16 of an edge is far below a step"
    )]
    let t = a_side as f64 / (a_side - b_side) as f64;
    #[expect(
        clippy::cast_precision_loss,
        clippy::cast_possible_truncation,
        reason = "between two coordinates"
    )]
    let mix = |lo: i64, hi: i64| lo + (t * (hi - lo) as f64).round() as i64;
    Some(Point::new(mix(a.x, b.x), mix(a.y, b.y)))
}

/// Whether `p` is within a step of the inside of the edge.
fn touches((a, b): (Point, Point), p: Point) -> bool {
    let (dx, dy) = ((b.x - a.x).abs(), (b.y - a.y).abs());
    let inside = if dx >= dy {
        a.x.min(b.x) < p.x && p.x < a.x.max(b.x)
    } else {
        a.y.min(b.y) < p.y && p.y < a.y.max(b.y)
    };
    #[expect(clippy::cast_precision_loss, reason = "a step more or less is not at stake")]
    let (offset, length) = (cross(a, b, p).unsigned_abs() as f64, (dx as f64).hypot(dy as f64));
    inside && offset <= length
}

fn insert(ring: &mut SnapRing, inserts: &HashMap<(Point, Point), Vec<Point>>, keep_corners: bool) -> bool {
    let n = ring.points.len();
    let mut grown = SnapRing { points: Vec::with_capacity(n), source: Vec::with_capacity(n) };
    for k in 0..n {
        let (a, b) = (ring.points[k], ring.points[(k + 1) % n]);
        grown.points.push(a);
        grown.source.push(ring.source[k]);
        let edge = key(a, b);
        let Some(corners) = inserts.get(&edge) else { continue };
        let mut add = |p: Point| {
            grown.points.push(p);
            grown.source.push(ring.source[k]);
        };
        if edge.0 == a {
            corners.iter().for_each(|p| add(*p));
        } else {
            corners.iter().rev().for_each(|p| add(*p));
        }
    }
    if grown.points.len() == n {
        return false;
    }
    *ring = if keep_corners { grown } else { without_spikes(&grown) };
    true
}

/// The ring without edges that run back on themselves.
fn without_spikes(ring: &SnapRing) -> SnapRing {
    let mut kept: Vec<(Point, u32)> = Vec::with_capacity(ring.points.len());
    for (&p, &source) in ring.points.iter().zip(&ring.source) {
        if kept.last().is_some_and(|(q, _)| *q == p) {
            continue;
        }
        if kept.len() >= 2 && kept[kept.len() - 2].0 == p {
            kept.pop();
            if let Some(last) = kept.last_mut() {
                last.1 = source;
            }
            continue;
        }
        kept.push((p, source));
    }
    while kept.len() >= 3 {
        let n = kept.len();
        if kept[n - 1].0 == kept[0].0 || kept[n - 2].0 == kept[0].0 {
            kept.pop();
        } else if kept[n - 1].0 == kept[1].0 {
            kept.remove(0);
        } else {
            break;
        }
    }
    let (points, source) = kept.into_iter().unzip();
    SnapRing { points, source }
}

/// A square grid of lists of the edges that pass through each of its cells.
struct Buckets {
    lo: Point,
    size: i64,
    n: i64,
    lists: Vec<Vec<u32>>,
}

impl Buckets {
    /// About one edge per cell; `None` without edges.
    fn new(edges: &[(Point, Point)]) -> Option<Self> {
        let xs = || edges.iter().flat_map(|(a, b)| [a.x, b.x]);
        let ys = || edges.iter().flat_map(|(a, b)| [a.y, b.y]);
        let (lo, hi) = (Point::new(xs().min()?, ys().min()?), Point::new(xs().max()?, ys().max()?));
        let span = (hi.x - lo.x).max(hi.y - lo.y) + 1;
        let n = i64::try_from(edges.len().isqrt()).unwrap_or(1).clamp(1, 1024);
        let size = span / n + 1;
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "between 1 and 1024 squared"
        )]
        let mut buckets = Buckets { lo, size, n, lists: vec![Vec::new(); (n * n) as usize] };
        for (idx, &(a, b)) in (0u32..).zip(edges) {
            buckets.add(idx, a, b);
        }
        Some(buckets)
    }

    fn cell(&self, offset: i64) -> i64 {
        (offset / self.size).clamp(0, self.n - 1)
    }

    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the table")]
    fn at(&self, p: Point) -> usize {
        (self.cell(p.y - self.lo.y) * self.n + self.cell(p.x - self.lo.x)) as usize
    }

    /// Adds an edge, `a` left of `b`, to every cell within two steps of it.
    #[expect(clippy::cast_precision_loss, clippy::cast_possible_truncation, reason = "within the bounds")]
    #[expect(clippy::cast_sign_loss, reason = "clamped to the table")]
    fn add(&mut self, idx: u32, a: Point, b: Point) {
        let slope = if b.x > a.x { (b.y - a.y) as f64 / (b.x - a.x) as f64 } else { 0.0 };
        for column in self.cell(a.x - 2 - self.lo.x)..=self.cell(b.x + 2 - self.lo.x) {
            let from = (self.lo.x + column * self.size - 2).clamp(a.x, b.x);
            let to = (self.lo.x + (column + 1) * self.size + 2).clamp(a.x, b.x);
            let (mut y0, mut y1) = if b.x > a.x {
                let at = |x: i64| a.y + (slope * (x - a.x) as f64).round() as i64;
                (at(from), at(to))
            } else {
                (a.y, b.y)
            };
            if y0 > y1 {
                std::mem::swap(&mut y0, &mut y1);
            }
            for row in self.cell(y0 - 3 - self.lo.y)..=self.cell(y1 + 3 - self.lo.y) {
                self.lists[(row * self.n + column) as usize].push(idx);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn outline(points: &[(i64, i64)]) -> Outline {
        let points = points.iter().map(|&(x, y)| Point::new(x, y)).collect();
        Outline { rings: vec![SnapRing::new(points)], lo: 0, hi: 0, keep_corners: false }
    }

    #[test]
    fn a_crossing_off_the_grid_becomes_one_corner_of_both() {
        let mut two = [outline(&[(0, 0), (10, 7), (0, 7)]), outline(&[(0, 5), (9, 0), (9, 5)])];
        snap(&mut two, 1);
        let shared: Vec<_> =
            two[0].rings[0].points.iter().filter(|p| two[1].rings[0].points.contains(p)).collect();
        assert!(!shared.is_empty(), "{two:?}");
        let edges = |o: &Outline| -> Vec<(Point, Point)> {
            let ring = &o.rings[0].points;
            (0..ring.len()).map(|k| (ring[k], ring[(k + 1) % ring.len()])).collect()
        };
        for e in edges(&two[0]) {
            for f in edges(&two[1]) {
                assert_eq!(crossing(e, f), None, "{e:?} {f:?}");
            }
        }
    }

    #[test]
    fn a_sliver_collapses() {
        let mut two =
            [outline(&[(0, 0), (100, 0), (50, 1)]), outline(&[(0, 0), (100, 0), (100, 100), (0, 100)])];
        snap(&mut two, 1);
        assert!(two[0].rings.is_empty(), "{two:?}");
        assert_eq!(two[1].rings[0].points.len(), 5);
    }
}
