//! Plane regions on an integer grid, and the Boolean operations on them.
//!
//! Artwork, slabs and faces all work on one grid (1 nm, finer for very thin gaps), so that outlines which touch
//! share their points exactly. The overlay itself is the work of `i_overlay`; this room fixes the number type,
//! the orientation (outer rings counter-clockwise, holes clockwise) and what a result may contain.

use i_overlay::core::fill_rule::FillRule;
use i_overlay::core::overlay::{Overlay, ShapeType};
use i_overlay::core::overlay_rule::OverlayRule;
use i_overlay::i_float::int::point::IntPoint;

/// A point in grid steps.
pub type Point = IntPoint<i64>;

/// A closed ring of points, the last joined to the first; no point twice in a row.
pub type Contour = Vec<Point>;

/// Largest coordinate in grid steps that the overlay can carry without overflow: 2^61, the safe range stated by
/// `i_overlay` for 64-bit integers, halved for offsets.
pub const MAX_COORDINATE: i64 = 1 << 60;

/// The size of one grid step.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Grid {
    step: f64,
}

impl Default for Grid {
    fn default() -> Self {
        Grid { step: 1e-9 }
    }
}

impl Grid {
    /// A grid of `step` m; `None` unless the step is a positive finite number.
    #[must_use]
    pub fn new(step: f64) -> Option<Self> {
        (step.is_finite() && step > 0.0).then_some(Grid { step })
    }

    /// The step, m.
    #[must_use]
    pub fn step(self) -> f64 {
        self.step
    }

    /// The nearest grid coordinate to `length` m; `None` when it is not finite or out of range.
    #[must_use]
    pub fn snap(self, length: f64) -> Option<i64> {
        let steps = (length / self.step).round();
        #[expect(clippy::cast_precision_loss, reason = "2^60 is exact in f64")]
        let limit = MAX_COORDINATE as f64;
        #[expect(clippy::cast_possible_truncation, reason = "bounded by the limit just above")]
        (steps.abs() <= limit).then_some(steps as i64)
    }

    /// The length of `steps` grid steps, m.
    #[must_use]
    #[expect(clippy::cast_precision_loss, reason = "coordinates stay far below 2^53 steps in practice")]
    pub fn length(self, steps: i64) -> f64 {
        steps as f64 * self.step
    }

    /// The area of `steps2` square steps, m².
    #[must_use]
    pub fn area(self, steps2: f64) -> f64 {
        steps2 * self.step * self.step
    }
}

/// Which points of overlapping input contours are inside.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Fill {
    /// Winding number other than zero.
    NonZero,
    /// Odd winding number.
    EvenOdd,
}

/// Bounds of a region, grid steps, both ends inside.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Bounds {
    /// Lower left corner.
    pub lo: Point,
    /// Upper right corner.
    pub hi: Point,
}

impl Bounds {
    /// Bounds of `points`, `None` when there are none.
    pub(in crate::geom) fn of<'a>(points: impl IntoIterator<Item = &'a Point>) -> Option<Bounds> {
        let mut points = points.into_iter();
        let first = *points.next()?;
        Some(points.fold(Bounds { lo: first, hi: first }, |b, p| Bounds {
            lo: Point::new(b.lo.x.min(p.x), b.lo.y.min(p.y)),
            hi: Point::new(b.hi.x.max(p.x), b.hi.y.max(p.y)),
        }))
    }

    /// Whether the two share a point.
    #[must_use]
    pub fn meets(&self, other: &Bounds) -> bool {
        self.lo.x <= other.hi.x
            && other.lo.x <= self.hi.x
            && self.lo.y <= other.hi.y
            && other.lo.y <= self.hi.y
    }

    /// The bounds moved out by `by` steps on all sides.
    #[must_use]
    pub fn grown(&self, by: i64) -> Bounds {
        Bounds {
            lo: Point::new(self.lo.x - by, self.lo.y - by),
            hi: Point::new(self.hi.x + by, self.hi.y + by),
        }
    }

    /// The rectangle as a region.
    #[must_use]
    pub fn region(&self) -> Region {
        let (lo, hi) = (self.lo, self.hi);
        Region::from_contours(&[vec![lo, Point::new(hi.x, lo.y), hi, Point::new(lo.x, hi.y)]], Fill::NonZero)
    }
}

/// One connected piece of a region: `[0]` is its outer ring, counter-clockwise; the rest are its holes, clockwise.
pub type Shape = Vec<Contour>;

/// A set of disjoint shapes, each with its holes.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Region {
    shapes: Vec<Shape>,
}

impl Region {
    /// The empty region.
    #[must_use]
    pub fn empty() -> Self {
        Region::default()
    }

    /// The region with these shapes: disjoint, outer rings counter-clockwise, holes clockwise.
    pub(in crate::geom) fn from_shapes(shapes: Vec<Shape>) -> Self {
        Region { shapes }
    }

    /// What `contours`, which may overlap and cross, cover under `fill`.
    #[must_use]
    pub fn from_contours(contours: &[Contour], fill: Fill) -> Self {
        if contours.is_empty() {
            return Region::empty();
        }
        let rule = match fill {
            Fill::NonZero => FillRule::NonZero,
            Fill::EvenOdd => FillRule::EvenOdd,
        };
        let mut overlay = Overlay::new(contours.iter().map(Vec::len).sum());
        overlay.add_source(contours, ShapeType::Subject);
        Region { shapes: overlay.overlay(OverlayRule::Subject, rule) }
    }

    /// Points in this region or in `other`.
    #[must_use]
    pub fn union(&self, other: &Region) -> Region {
        self.combine(other, OverlayRule::Union)
    }

    /// Points in both.
    #[must_use]
    pub fn intersection(&self, other: &Region) -> Region {
        self.combine(other, OverlayRule::Intersect)
    }

    /// Points in this region that are not in `other`.
    #[must_use]
    pub fn difference(&self, other: &Region) -> Region {
        self.combine(other, OverlayRule::Difference)
    }

    /// The union of many regions in one sweep.
    #[must_use]
    pub fn union_all<'a>(regions: impl IntoIterator<Item = &'a Region>) -> Region {
        let contours: Vec<Contour> =
            regions.into_iter().flat_map(|region| region.shapes.iter().flatten().cloned()).collect();
        Region::from_contours(&contours, Fill::NonZero)
    }

    fn combine(&self, other: &Region, rule: OverlayRule) -> Region {
        let mut overlay = Overlay::from_subj_and_clip(&self.shapes, &other.shapes);
        Region { shapes: overlay.overlay(rule, FillRule::NonZero) }
    }

    /// The connected pieces.
    #[must_use]
    pub fn shapes(&self) -> &[Shape] {
        &self.shapes
    }

    /// Each connected piece as a region of its own.
    #[must_use]
    pub fn pieces(&self) -> Vec<Region> {
        self.shapes.iter().map(|shape| Region { shapes: vec![shape.clone()] }).collect()
    }

    /// Every ring, outer rings and holes alike.
    pub fn contours(&self) -> impl Iterator<Item = &Contour> {
        self.shapes.iter().flatten()
    }

    /// Whether nothing is inside.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.shapes.is_empty()
    }

    /// Area in square grid steps.
    #[must_use]
    pub fn area(&self) -> f64 {
        self.contours().map(|ring| signed_area(ring)).sum()
    }

    /// Bounds, `None` for the empty region.
    #[must_use]
    pub fn bounds(&self) -> Option<Bounds> {
        Bounds::of(self.contours().flatten())
    }

    /// Whether `at` is strictly inside; a point on the border may go either way.
    #[must_use]
    pub fn contains(&self, at: Point) -> bool {
        self.contours().map(|ring| crossings(ring, at)).sum::<usize>() % 2 == 1
    }

    /// The region moved by (`dx`, `dy`) steps.
    #[must_use]
    pub fn translated(&self, dx: i64, dy: i64) -> Region {
        self.map_points(|p| Point::new(p.x + dx, p.y + dy))
    }

    /// The same rings with `map`, which must be one to one and keep orientation, on every point.
    fn map_points(&self, map: impl Fn(Point) -> Point) -> Region {
        let ring = |ring: &Contour| ring.iter().map(|p| map(*p)).collect();
        Region { shapes: self.shapes.iter().map(|shape| shape.iter().map(ring).collect()).collect() }
    }
}

/// Signed area of a ring in square steps: positive counter-clockwise.
#[must_use]
pub fn signed_area(ring: &[Point]) -> f64 {
    let mut twice: i128 = 0;
    for (k, p) in ring.iter().enumerate() {
        let q = ring[(k + 1) % ring.len()];
        twice += i128::from(p.x) * i128::from(q.y) - i128::from(q.x) * i128::from(p.y);
    }
    #[expect(clippy::cast_precision_loss, reason = "the sum is exact; only the result is rounded")]
    {
        twice as f64 / 2.0
    }
}

/// How often the ray from `at` to the right crosses `ring`.
fn crossings(ring: &[Point], at: Point) -> usize {
    let mut count = 0;
    for (k, p) in ring.iter().enumerate() {
        let q = ring[(k + 1) % ring.len()];
        if (p.y > at.y) == (q.y > at.y) {
            continue;
        }
        // Exact sign of the cross product (q - p) x (at - p).
        let cross =
            i128::from(q.x - p.x) * i128::from(at.y - p.y) - i128::from(q.y - p.y) * i128::from(at.x - p.x);
        if (cross > 0) == (q.y > p.y) {
            count += 1;
        }
    }
    count
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(x: i64, y: i64, side: i64) -> Region {
        Bounds { lo: Point::new(x, y), hi: Point::new(x + side, y + side) }.region()
    }

    #[test]
    fn areas_of_the_four_operations_add_up() {
        let (a, b) = (square(0, 0, 10), square(5, 5, 10));
        let (union, both, rest) = (a.union(&b).area(), a.intersection(&b).area(), a.difference(&b).area());
        assert!((union - 175.0).abs() < 1e-9 && (both - 25.0).abs() < 1e-9 && (rest - 75.0).abs() < 1e-9);
    }

    #[test]
    fn a_hole_is_outside() {
        let ring = square(0, 0, 10).difference(&square(3, 3, 4));
        assert_eq!(ring.shapes().len(), 1);
        assert_eq!(ring.shapes()[0].len(), 2);
        assert!(signed_area(&ring.shapes()[0][0]) > 0.0 && signed_area(&ring.shapes()[0][1]) < 0.0);
        assert!(ring.contains(Point::new(1, 1)) && !ring.contains(Point::new(5, 5)));
    }

    #[test]
    fn a_length_off_the_number_line_does_not_snap() {
        let grid = Grid::default();
        assert_eq!(grid.snap(1e300), None);
        assert_eq!(grid.snap(f64::NAN), None);
        assert_eq!(grid.snap(35e-6), Some(35_000));
    }
}
