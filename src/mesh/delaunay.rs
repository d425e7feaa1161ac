//! Faces with very many corners to convex pieces: constrained Delaunay triangles, merged in pairs.
//!
//! `cuts` makes better pieces, but its search grows faster than the square of the number of corners and it wants clean rings.
//! Here any set of rings is accepted: where edges meet or cross, the triangulation (`spade`) puts a corner.

use crate::mesh::outline::{Corner, Outline, P2, cross};
use spade::handles::FixedVertexHandle;
use spade::{ConstrainedDelaunayTriangulation, Point2, Triangulation};
use std::collections::BTreeMap;

/// A merged quadrilateral may turn by no less than this at a corner: the sine of the angle between its sides.
const MIN_TURN: f64 = 0.02;

/// Triangles and convex quadrilaterals, counter-clockwise, that cover the outline; `None` when a coordinate is out of range.
pub(super) fn pieces(outline: &Outline) -> Option<Vec<Vec<Corner>>> {
    let mut mesh = ConstrainedDelaunayTriangulation::<Point2<f64>>::new();
    let mut corners: BTreeMap<usize, Corner> = BTreeMap::new();
    let mut edges: Vec<[FixedVertexHandle; 2]> = Vec::new();
    for ring in &outline.rings {
        let mut handles = Vec::with_capacity(ring.len());
        for corner in ring {
            let handle = mesh.insert(Point2::new(corner.at.x, corner.at.y)).ok()?;
            corners.entry(handle.index()).or_insert(*corner);
            handles.push(handle);
        }
        edges.extend((0..handles.len()).map(|k| [handles[k], handles[(k + 1) % handles.len()]]));
    }
    for [from, to] in edges {
        if from != to {
            mesh.add_constraint_and_split(from, to, |at| at);
        }
    }
    let sides = Sides::new(outline);
    let mut triangles: Vec<[usize; 3]> = Vec::new();
    let mut number: BTreeMap<usize, usize> = BTreeMap::new();
    let at = |index: usize| {
        let position = mesh.vertex(FixedVertexHandle::from_index(index)).position();
        P2::new(position.x, position.y)
    };
    for face in mesh.inner_faces() {
        let ids = face.vertices().map(|vertex| vertex.fix().index());
        let centre = ids.iter().map(|k| at(*k)).sum::<P2>() / 3.0;
        if sides.inside(centre) {
            number.insert(face.fix().index(), triangles.len());
            triangles.push(ids);
        }
    }
    let mut pairs: Vec<(f64, usize, usize, [usize; 4])> = Vec::new();
    for edge in mesh.undirected_edges().filter(|edge| !edge.is_constraint_edge()) {
        let half = edge.as_directed();
        let [one, two] = [half, half.rev()].map(|half| number.get(&half.face().fix().index()).copied());
        let (Some(one), Some(two)) = (one, two) else { continue };
        let [Some(apex), Some(other)] = [half, half.rev()].map(|half| half.opposite_vertex()) else {
            continue;
        };
        let quad = [half.from(), other, half.to(), apex].map(|vertex| vertex.fix().index());
        if is_convex(&quad.map(at)) {
            pairs.push((half.length_2(), one, two, quad));
        }
    }
    // The longest shared edges go first; ties by number, so that the result is the same every time.
    pairs.sort_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)).then(a.2.cmp(&b.2)));
    let mut merged = vec![false; triangles.len()];
    let mut pieces: Vec<Vec<usize>> = Vec::new();
    for (_, one, two, quad) in pairs {
        if !merged[one] && !merged[two] {
            (merged[one], merged[two]) = (true, true);
            pieces.push(quad.to_vec());
        }
    }
    pieces.extend(triangles.iter().zip(&merged).filter(|(_, merged)| !**merged).map(|(ids, _)| ids.to_vec()));
    let corner = |k: &usize| corners.get(k).copied().unwrap_or(Corner { at: at(*k), source: u32::MAX });
    Some(pieces.iter().map(|piece| piece.iter().map(corner).collect()).collect())
}

fn is_convex(quad: &[P2; 4]) -> bool {
    (0..4).all(|k| {
        let (a, b) = (quad[(k + 1) % 4] - quad[k], quad[(k + 2) % 4] - quad[(k + 1) % 4]);
        cross(a, b) > MIN_TURN * a.norm() * b.norm()
    })
}

/// The sides of all rings, sorted into bands of y, for the question what is inside.
struct Sides {
    lo: f64,
    step: f64,
    bands: Vec<Vec<[P2; 2]>>,
}

impl Sides {
    fn new(outline: &Outline) -> Sides {
        let all = || outline.rings.iter().flatten().map(|corner| corner.at.y);
        let (lo, hi) = all().fold((f64::INFINITY, f64::NEG_INFINITY), |(lo, hi), y| (lo.min(y), hi.max(y)));
        let n_bands = outline.rings.iter().map(Vec::len).sum::<usize>().clamp(1, 4096);
        #[expect(clippy::cast_precision_loss, reason = "at most 4096")]
        let step = ((hi - lo) / n_bands as f64).max(f64::MIN_POSITIVE);
        let mut sides = Sides { lo, step, bands: vec![Vec::new(); n_bands] };
        for ring in &outline.rings {
            for (k, corner) in ring.iter().enumerate() {
                let (p, q) = (corner.at, ring[(k + 1) % ring.len()].at);
                for band in sides.band(p.y.min(q.y))..=sides.band(p.y.max(q.y)) {
                    sides.bands[band].push([p, q]);
                }
            }
        }
        sides
    }

    fn band(&self, y: f64) -> usize {
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to the bands")]
        let band = ((y - self.lo) / self.step).max(0.0) as usize;
        band.min(self.bands.len() - 1)
    }

    /// Whether a ray to the right crosses an odd number of sides.
    fn inside(&self, at: P2) -> bool {
        let crossed =
            |[p, q]: &&[P2; 2]| (p.y > at.y) != (q.y > at.y) && (cross(q - p, at - p) > 0.0) == (q.y > p.y);
        self.bands[self.band(at.y)].iter().filter(crossed).count() % 2 == 1
    }
}
