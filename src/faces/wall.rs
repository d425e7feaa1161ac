//! Walls: the edges of the cells of one slab, upright or leaning.

use crate::faces::assemble::Assembly;
use crate::faces::body::along_border;
use crate::faces::conform::{CellOutline, Conformed};
use crate::faces::grade::sharp_corners;
use crate::faces::horizontal::Level;
use crate::faces::outline::{merged_chain, reversed, straight};
use crate::faces::rule::{Verdict, verdict};
use crate::faces::{EdgeGrade, FacesError, Ring};
use crate::geom::Vec3;
use crate::geom::region::{Point, Region};
use crate::geom::snap::SnapRing;
use crate::geom::strip::{Strip, left_of, runs, strips};
use crate::net::NetId;
use crate::slab::{Fill, Place, SlabModel};
use std::collections::{BTreeMap, HashMap, HashSet};

/// What the walls of one slab need to know.
struct WallSlab<'a> {
    model: &'a SlabModel,
    j: usize,
    cells: &'a [CellOutline],
    /// Cell left of a directed edge at the foot, and at the top.
    foot: HashMap<(Point, Point), usize>,
    top: HashMap<(Point, Point), usize>,
    /// Levels at the foot and at the top; none at an image plane.
    below: Option<&'a Level>,
    above: Option<&'a Level>,
    /// Convex corners of metal, at the foot.
    sharp: HashSet<Point>,
}

/// Adds every wall to `out`.
///
/// # Errors
/// [`FacesError::Short`] when metal of two nets touches, [`FacesError::LeaningWall`] when the foot and the top of a
/// leaning wall do not meet the same cells, rounding apart.
pub(crate) fn wall_faces(
    model: &SlabModel,
    conformed: &Conformed,
    levels: &[Level],
    out: &mut Assembly<'_>,
) -> Result<(), FacesError> {
    for (j, cells) in conformed.slabs.iter().enumerate() {
        if cells.is_empty() {
            continue;
        }
        let slab = WallSlab {
            model,
            j,
            cells,
            foot: left_of(cells.iter().map(|cell| cell.bottom.as_slice())),
            top: left_of(cells.iter().map(|cell| cell.top.as_slice())),
            below: j.checked_sub(1).and_then(|k| levels.get(k)),
            above: levels.get(j),
            sharp: sharp_metal(cells),
        };
        // Beside one leaning cell an upright one may meet others at its top than at its foot.
        let leaning = cells.iter().any(|cell| cell.leaning);
        for (idx, cell) in cells.iter().enumerate() {
            for (foot, top) in cell.bottom.iter().zip(&cell.top) {
                let pieces =
                    if leaning { slab.leaning_pieces(foot, top)? } else { slab.upright_pieces(&foot.points) };
                for piece in pieces {
                    if piece.neighbour.is_none_or(|other| owns(cells, idx, other)) {
                        slab.add(idx, &piece, out)?;
                    }
                }
            }
        }
    }
    Ok(())
}

/// Whether the wall between two cells is the first one's to make. All around metal it is the metal's, so that its skin is
/// closed whatever rounding has done to its neighbours.
fn owns(cells: &[CellOutline], idx: usize, other: usize) -> bool {
    let rank = |k: usize| (!matches!(cells[k].fill, Fill::Metal(_)), k);
    rank(idx) < rank(other)
}

/// Convex corners of each net's metal, cells of one net united.
fn sharp_metal(cells: &[CellOutline]) -> HashSet<Point> {
    let mut by_net: BTreeMap<NetId, Vec<&CellOutline>> = BTreeMap::new();
    for cell in cells {
        if let Fill::Metal(net) = cell.fill {
            by_net.entry(net).or_default().push(cell);
        }
    }
    let mut sharp = HashSet::new();
    for cells in by_net.values() {
        let rings = cells.iter().flat_map(|cell| cell.bottom.iter().map(|ring| &ring.points));
        if let [_] = cells.as_slice() {
            sharp.extend(sharp_corners(rings));
        } else {
            sharp.extend(sharp_corners(Region::from_rings_keeping(rings).contours()));
        }
    }
    sharp
}

impl WallSlab<'_> {
    /// Maximal straight runs with one neighbour.
    fn upright_pieces(&self, ring: &[Point]) -> Vec<Strip> {
        let n = ring.len();
        let next = |k: usize| ring[(k + 1) % n];
        let across = |k: usize| self.foot.get(&(next(k), ring[k])).copied();
        let starts_here = |k: usize| {
            let before = (k + n - 1) % n;
            across(before) != across(k) || !straight(ring[before], ring[k], next(k))
        };
        let starts: Vec<usize> = (0..n).filter(|k| starts_here(*k)).collect();
        let mut pieces = Vec::with_capacity(starts.len());
        for (i, &start) in starts.iter().enumerate() {
            let end = starts[(i + 1) % starts.len()];
            let steps = if end > start { end - start } else { end + n - start };
            let foot: Vec<Point> = (0..=steps).map(|k| ring[(start + k) % n]).collect();
            let border = along_border(foot[0], foot[steps], &self.model.extent);
            if !border {
                pieces.push(Strip { top: foot.clone(), foot, neighbour: across(start) });
            }
        }
        pieces
    }

    /// One piece per original edge and neighbour.
    fn leaning_pieces(&self, foot: &SnapRing, top: &SnapRing) -> Result<Vec<Strip>, FacesError> {
        let Some(mut pieces) = strips(&runs(foot, &self.foot), &runs(top, &self.top)) else {
            let at = foot.points.first().copied().unwrap_or(self.model.extent.lo);
            let slab = self.model.slabs[self.j].name.clone();
            return Err(FacesError::LeaningWall { slab, place: Place::new(self.model.grid, at) });
        };
        let extent = &self.model.extent;
        let border = |way: &[Point]| along_border(way[0], way[way.len() - 1], extent);
        pieces.retain(|piece| !(border(&piece.foot) && border(&piece.top)));
        Ok(pieces)
    }

    fn add(&self, idx: usize, piece: &Strip, out: &mut Assembly<'_>) -> Result<(), FacesError> {
        let slab = &self.model.slabs[self.j];
        let inside = self.cells[idx].fill;
        let outside = piece.neighbour.map_or(Fill::Dielectric(slab.background), |k| self.cells[k].fill);
        // Interfaces point from the material that is lower in the pile to the higher one, as horizontal ones do.
        let swap = matches!((inside, outside), (Fill::Dielectric(a), Fill::Dielectric(b)) if a > b);
        let (first, second) = if swap { (outside, inside) } else { (inside, outside) };
        let (kind, forward) = match verdict(first, second, &out.bodies) {
            Verdict::Nothing => return Ok(()),
            Verdict::Short(a, b) => return Err(out.short(a, b, &slab.name, piece.foot[0])),
            Verdict::Forward(kind) => (kind, true),
            Verdict::Backward(kind) => (kind, false),
        };
        let (mut points, mut grades) = self.outline(piece, out);
        if forward == swap {
            (points, grades) = reversed(&points, &grades);
        }
        let Some(normal) = newell(&points) else { return Ok(()) };
        let group = if forward {
            out.group_kind(first, second, slab.name.clone())
        } else {
            out.group_kind(second, first, slab.name.clone())
        };
        out.push(kind, normal, vec![Ring { points, edges: grades }], group, false);
        Ok(())
    }

    /// Corners and grades of a wall, counter-clockwise seen from outside of its cell.
    fn outline(&self, piece: &Strip, out: &Assembly<'_>) -> (Vec<Vec3>, Vec<EdgeGrade>) {
        let slab = &self.model.slabs[self.j];
        let chain = |points: &[Point], level: Option<&Level>| {
            let grade = |w: &[Point]| level.map_or(EdgeGrade::Smooth, |level| level.grade(w[0], w[1]));
            merged_chain(points, &points.windows(2).map(grade).collect::<Vec<_>>())
        };
        let (foot, foot_grades) = chain(&piece.foot, self.below);
        let (top, top_grades) = chain(&piece.top, self.above);
        let corner = |p: Point| if self.sharp.contains(&p) { EdgeGrade::Solid } else { EdgeGrade::Smooth };
        let mut points: Vec<Vec3> = foot.iter().map(|p| out.at(*p, slab.z_lo)).collect();
        points.extend(top.iter().rev().map(|p| out.at(*p, slab.z_hi)));
        let mut grades = foot_grades;
        grades.push(corner(piece.foot[piece.foot.len() - 1]));
        grades.extend(top_grades.iter().rev());
        grades.push(corner(piece.foot[0]));
        (points, grades)
    }
}

/// Unit normal of a ring by the sum of its edges' vector areas; `None` when it has no area.
fn newell(points: &[Vec3]) -> Option<Vec3> {
    let origin = *points.first()?;
    let sum = points
        .iter()
        .zip(points.iter().cycle().skip(1))
        .fold(Vec3::zeros(), |sum, (p, q)| sum + (p - origin).cross(&(q - origin)));
    let length = sum.norm();
    (length > 0.0).then(|| sum / length)
}
