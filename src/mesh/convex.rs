//! A convex polygon with many corners, as a row of triangles and quadrilaterals.
//!
//! Of all strip decompositions (each piece shares a side with the next) the cheapest is found by dynamic programming
//! over the chords, in O(n²). The cost of a piece is one plus its perimeter² / 8 area, which is 2 for a square, weighted
//! by its share of the polygon's perimeter: few and fat pieces win, and a sliver matters by its size, so that the
//! straight part of a round-ended trace stays whole.

use crate::mesh::outline::{Corner, area_of};

/// Above this many corners a polygon is halved first.
const MOST: usize = 256;

/// Triangles and quadrilaterals that cover the convex polygon `corners`, which has no straight corners.
pub(super) fn strips(corners: &[Corner]) -> Vec<Vec<Corner>> {
    let n = corners.len();
    if n <= 4 {
        return vec![corners.to_vec()];
    }
    if n > MOST {
        let half = n / 2;
        let mut second = corners[half..].to_vec();
        second.push(corners[0]);
        return [&corners[..=half], &second].into_iter().flat_map(strips).collect();
    }
    let table = Table::fill(corners);
    let start = (0..n).min_by(|i, k| table.cost(*i, n - 1).total_cmp(&table.cost(*k, n - 1))).unwrap_or(0);
    table.pieces(start)
}

fn perimeter_of(ring: &[Corner]) -> f64 {
    let next = ring.iter().cycle().skip(1);
    ring.iter().zip(next).map(|(p, q)| (q.at - p.at).norm()).sum()
}

/// Best cost and choice for the part of the polygon cut off by the chord from corner i to corner i + len.
struct Table<'a> {
    corners: &'a [Corner],
    perimeter: f64,
    best: Vec<(f64, Choice)>,
}

/// The piece next to a chord.
#[derive(Clone, Copy)]
enum Choice {
    /// Nothing is left.
    Edge,
    /// The triangle with the corner after the first.
    First,
    /// The triangle with the corner before the last.
    Last,
    /// The quadrilateral with both.
    Both,
}

impl Table<'_> {
    fn fill(corners: &[Corner]) -> Table<'_> {
        let n = corners.len();
        let mut table =
            Table { corners, perimeter: perimeter_of(corners), best: vec![(0.0, Choice::Edge); n * n] };
        for len in 2..n {
            for i in 0..n {
                let (j, i1, j1) = (i + len, i + 1, i + len - 1);
                let mut best = (table.price(&[i, i1, j]) + table.cost(i1, len - 1), Choice::First);
                let last = table.price(&[i, j1, j]) + table.cost(i, len - 1);
                if last < best.0 {
                    best = (last, Choice::Last);
                }
                if len > 2 {
                    let both = table.price(&[i, i1, j1, j]) + table.cost(i1, len - 2);
                    if both < best.0 {
                        best = (both, Choice::Both);
                    }
                }
                table.best[len * n + i] = best;
            }
        }
        table
    }

    fn cost(&self, i: usize, len: usize) -> f64 {
        self.best[len * self.corners.len() + i % self.corners.len()].0
    }

    fn corner(&self, i: usize) -> Corner {
        self.corners[i % self.corners.len()]
    }

    fn price(&self, piece: &[usize]) -> f64 {
        let mut ring = [self.corner(piece[0]); 4];
        for (to, from) in ring.iter_mut().zip(piece) {
            *to = self.corner(*from);
        }
        let ring = &ring[..piece.len()];
        let perimeter = perimeter_of(ring);
        let shape = perimeter * perimeter / (8.0 * area_of(ring).max(f64::MIN_POSITIVE));
        1.0 + shape * perimeter / self.perimeter
    }

    fn pieces(&self, start: usize) -> Vec<Vec<Corner>> {
        let n = self.corners.len();
        let (mut i, mut len) = (start, n - 1);
        let mut pieces = Vec::new();
        loop {
            let (j, i1, j1) = (i + len, i + 1, i + len - 1);
            let piece = |at: &[usize]| at.iter().map(|k| self.corner(*k)).collect();
            match self.best[len * n + i % n].1 {
                Choice::Edge => return pieces,
                Choice::First => {
                    pieces.push(piece(&[i, i1, j]));
                    (i, len) = (i1, len - 1);
                }
                Choice::Last => {
                    pieces.push(piece(&[i, j1, j]));
                    len -= 1;
                }
                Choice::Both => {
                    pieces.push(piece(&[i, i1, j1, j]));
                    (i, len) = (i1, len - 2);
                }
            }
        }
    }
}
