//! Chains of corners with a grade per edge: merging what is straight, and turning round.

use crate::faces::EdgeGrade;
use crate::geom::region::Point;

/// The ring without corners that lie exactly on a straight run of equal grade.
pub(crate) fn merged_ring(points: &[Point], grades: &[EdgeGrade]) -> (Vec<Point>, Vec<EdgeGrade>) {
    let n = points.len();
    let needed = |k: usize| {
        let before = (k + n - 1) % n;
        grades[before] != grades[k] || !straight(points[before], points[k], points[(k + 1) % n])
    };
    let kept: Vec<usize> = (0..n).filter(|k| needed(*k)).collect();
    if kept.len() < 3 {
        return (points.to_vec(), grades.to_vec());
    }
    kept.iter().map(|k| (points[*k], grades[*k])).unzip()
}

/// The open chain of `points`, one longer than `grades`, without inner corners on a straight run of equal grade.
pub(crate) fn merged_chain(points: &[Point], grades: &[EdgeGrade]) -> (Vec<Point>, Vec<EdgeGrade>) {
    let (mut out, mut kept) = (Vec::with_capacity(points.len()), Vec::with_capacity(grades.len()));
    for (k, grade) in grades.iter().enumerate() {
        if k == 0 || grades[k - 1] != *grade || !straight(points[k - 1], points[k], points[k + 1]) {
            out.push(points[k]);
            kept.push(*grade);
        }
    }
    out.extend(points.last());
    (out, kept)
}

/// The ring run through the other way, each grade with its edge.
pub(crate) fn reversed<P: Copy>(points: &[P], grades: &[EdgeGrade]) -> (Vec<P>, Vec<EdgeGrade>) {
    let n = points.len();
    ((0..n).map(|k| points[n - 1 - k]).collect(), (0..n).map(|k| grades[(2 * n - 2 - k) % n]).collect())
}

/// Whether b lies exactly on the way from a to c.
pub(crate) fn straight(a: Point, b: Point, c: Point) -> bool {
    let (ux, uy) = (i128::from(b.x - a.x), i128::from(b.y - a.y));
    let (vx, vy) = (i128::from(c.x - b.x), i128::from(c.y - b.y));
    ux * vy == uy * vx && ux * vx + uy * vy > 0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn turning_round_keeps_each_grade_on_its_edge() {
        use EdgeGrade::{Rim, Smooth, Solid};
        let (points, grades) = reversed(&[0, 1, 2, 3], &[Smooth, Solid, Rim, Smooth]);
        assert_eq!(points, [3, 2, 1, 0]);
        // Edge 2-1 was the solid one, 3-2 the rim.
        assert_eq!(grades, [Rim, Solid, Smooth, Smooth]);
    }
}
