//! The board: strokes of the profile layer, centre lines chained into rings; cut-outs are rings inside rings.

use super::gerber::image::{Kind, Object};
use crate::geom::region::{Contour, Fill, Point, Region};
use std::collections::BTreeMap;

/// The board's region; or, in words, why there is none.
///
/// Ends closer than `tolerance` steps are taken as one.
///
/// # Errors
/// A sentence for the user: what does not close, and where (grid steps).
pub(super) fn region(objects: &[Object], tolerance: i64) -> Result<Region, OpenProfile> {
    let mut rings: Vec<Contour> = Vec::new();
    let mut paths: Vec<Vec<Point>> = Vec::new();
    for object in objects.iter().filter(|o| o.dark) {
        match &object.kind {
            Kind::Line { from, to, .. } if from != to => paths.push(vec![*from, *to]),
            Kind::Arc { path, .. } => paths.push(path.to_vec()),
            Kind::Region => rings.extend(object.contours.iter().cloned()),
            Kind::Line { .. } | Kind::Flash { .. } => {}
        }
    }
    let mut seen = std::collections::BTreeSet::new();
    paths.retain(|path| {
        let key = |p: &Point| (p.x, p.y);
        let ends = (path.first().map(key), path.last().map(key), path.get(path.len() / 2).map(key));
        // A line drawn twice, either way round, is one line.
        let turned = (ends.1, ends.0, path.get((path.len() - 1) / 2).map(key));
        path.len() > 2 && seen.insert(ends) || path.len() == 2 && seen.insert(ends.min(turned))
    });
    rings.extend(chain(paths, tolerance)?);
    if rings.is_empty() {
        return Err(OpenProfile::Empty);
    }
    let region = Region::from_contours(&rings, Fill::EvenOdd);
    if region.is_empty() { Err(OpenProfile::Empty) } else { Ok(region) }
}

/// Why a profile encloses nothing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum OpenProfile {
    /// There is nothing to close.
    Empty,
    /// No line goes on from here.
    EndsAt(Point),
}

/// Closed rings from paths whose ends meet.
fn chain(mut paths: Vec<Vec<Point>>, tolerance: i64) -> Result<Vec<Contour>, OpenProfile> {
    let cell = tolerance.max(1) * 2;
    let key = |p: Point| (p.x.div_euclid(cell), p.y.div_euclid(cell));
    let near = |p: Point, q: Point| (p.x - q.x).abs() <= tolerance && (p.y - q.y).abs() <= tolerance;
    let mut ends: BTreeMap<(i64, i64), Vec<usize>> = BTreeMap::new();
    for (k, path) in paths.iter().enumerate() {
        for p in [path[0], path[path.len() - 1]] {
            ends.entry(key(p)).or_default().push(k);
        }
    }
    let mut used = vec![false; paths.len()];
    let mut rings = Vec::new();
    for first in 0..paths.len() {
        if std::mem::replace(&mut used[first], true) {
            continue;
        }
        let mut ring = std::mem::take(&mut paths[first]);
        loop {
            let (start, end) = (ring[0], ring[ring.len() - 1]);
            if ring.len() > 2 && near(start, end) {
                break;
            }
            let (cx, cy) = key(end);
            let around = (-1..=1).flat_map(|dx| (-1..=1).map(move |dy| (cx + dx, cy + dy)));
            let mut next = around.flat_map(|c| ends.get(&c).into_iter().flatten()).copied();
            let next = next.find(|k| {
                !used[*k] && (near(paths[*k][0], end) || near(paths[*k][paths[*k].len() - 1], end))
            });
            let Some(next) = next else { return Err(OpenProfile::EndsAt(end)) };
            used[next] = true;
            let mut path = std::mem::take(&mut paths[next]);
            if !near(path[0], end) {
                path.reverse();
            }
            ring.extend(path.into_iter().skip(1));
        }
        ring.pop();
        rings.push(ring);
    }
    Ok(rings)
}
