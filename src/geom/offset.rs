//! Regions grown or shrunk by a distance, regions clipped with every corner kept, and corner-by-corner insets.
//!
//! Growth with mitred joins is the work of `i_overlay`; the inset that keeps the corners, which leaning walls need,
//! is made here.

use crate::geom::region::{Bounds, Contour, Fill, Point, Region, Shape};
use i_overlay::core::fill_rule::FillRule;
use i_overlay::core::overlay::{IntOverlayOptions, Overlay, ShapeType};
use i_overlay::core::overlay_rule::OverlayRule;
use i_overlay::core::solver::{Precision, Solver};
use i_overlay::i_float::int::angle::Angle;
use i_overlay::mesh::int::outline::offset::IntOutlineOffset;
use i_overlay::mesh::int::style::{IntLineJoin, IntOutlineStyle};

/// Corners sharper than this (interior angle, rad) are cut instead of mitred.
const SHARPEST_MITRE: f64 = 0.5;

impl Region {
    /// The region with every edge moved out by `by` steps (in, when negative), corners mitred, the result united.
    /// Corners with an interior angle below 0.5 rad are cut.
    #[must_use]
    pub fn offset(&self, by: i64) -> Region {
        if by == 0 || self.is_empty() {
            return self.clone();
        }
        let join = Angle::from_radians(SHARPEST_MITRE).map_or(IntLineJoin::Bevel, IntLineJoin::Miter);
        let style = IntOutlineStyle::new(by).line_join(join).miter_min_turn(Angle::from_bits(0));
        self.shapes().outline(&style).map(Region::from_shapes).unwrap_or_default()
    }

    /// What `rings` (outer ones counter-clockwise, holes clockwise, disjoint) cover, with every corner kept.
    #[must_use]
    pub fn from_rings_keeping<'a>(rings: impl IntoIterator<Item = &'a Contour>) -> Region {
        let mut overlay = keeping();
        for ring in rings {
            overlay.add_contour(ring, ShapeType::Subject);
        }
        Region::from_shapes(overlay.overlay(OverlayRule::Subject, FillRule::NonZero))
    }

    /// Points in both, with every corner of both kept.
    #[must_use]
    pub fn intersection_keeping(&self, other: &Region) -> Region {
        self.combine_keeping(other, OverlayRule::Intersect)
    }

    /// Points in this region that are not in `other`, with every corner of both kept.
    #[must_use]
    pub fn difference_keeping(&self, other: &Region) -> Region {
        self.combine_keeping(other, OverlayRule::Difference)
    }

    fn combine_keeping(&self, other: &Region, rule: OverlayRule) -> Region {
        let mut overlay = keeping();
        overlay.add_source(self.shapes(), ShapeType::Subject);
        overlay.add_source(other.shapes(), ShapeType::Clip);
        Region::from_shapes(overlay.overlay(rule, FillRule::NonZero))
    }

    /// Points in this region or in `other`, with every corner of both kept.
    #[must_use]
    pub fn union_keeping(&self, other: &Region) -> Region {
        self.combine_keeping(other, OverlayRule::Union)
    }

    /// The leftmost corner, the lowest of those: a name for the place.
    #[must_use]
    pub fn corner(&self) -> Option<Point> {
        self.contours().flatten().copied().min_by_key(|p| (p.x, p.y))
    }

    /// The shapes of `regions`, which must not overlap, as one region.
    #[must_use]
    pub fn gathered(regions: &[Region]) -> Region {
        Region::from_shapes(regions.iter().flat_map(|region| region.shapes().iter().cloned()).collect())
    }

    /// The region with those holes filled whose bounds do not meet `frame`.
    #[must_use]
    pub fn with_far_holes_filled(&self, frame: &Bounds) -> Region {
        let near = |ring: &Contour| Bounds::of(ring).is_some_and(|bounds| bounds.meets(frame));
        let kept = |shape: &Shape| {
            let rings = shape.iter().enumerate().filter(|(k, ring)| *k == 0 || near(ring));
            rings.map(|(_, ring)| ring.clone()).collect()
        };
        Region::from_shapes(self.shapes().iter().map(kept).collect())
    }

    /// The pieces whose bounds meet `frame`.
    #[must_use]
    pub fn pieces_meeting(&self, frame: &Bounds) -> Region {
        let meets =
            |shape: &&Shape| Bounds::of(shape.iter().flatten()).is_some_and(|bounds| bounds.meets(frame));
        Region::from_shapes(self.shapes().iter().filter(meets).cloned().collect())
    }

    /// The region a fraction `t` of the way, corner by corner, to `other`, which must have the same rings.
    #[must_use]
    pub fn between(&self, other: &Region, t: f64) -> Region {
        #[expect(
            clippy::cast_precision_loss,
            clippy::cast_possible_truncation,
            reason = "between two coordinates"
        )]
        let mix = |a: i64, b: i64| a + (t * (b - a) as f64).round() as i64;
        let ring = |(a, b): (&Contour, &Contour)| -> Contour {
            a.iter().zip(b).map(|(p, q)| Point::new(mix(p.x, q.x), mix(p.y, q.y))).collect()
        };
        let shape = |(a, b): (&Shape, &Shape)| -> Shape { a.iter().zip(b).map(ring).collect() };
        Region::from_shapes(self.shapes().iter().zip(other.shapes()).map(shape).collect())
    }

    /// The same shapes with each ring's corners given anew, in the order of [`Region::contours`].
    #[must_use]
    pub fn with_corners(&self, rings: impl IntoIterator<Item = Contour>) -> Region {
        let mut rings = rings.into_iter();
        let shape =
            |shape: &Shape| shape.iter().map(|old| rings.next().unwrap_or_else(|| old.clone())).collect();
        Region::from_shapes(self.shapes().iter().map(shape).collect())
    }

    /// `other` with its shapes, rings and corners put into the order of this region's, so that corner k of one
    /// belongs to corner k of the other; `None` unless both have the same rings with as many corners and each
    /// corner's partner lies within `reach` steps.
    #[must_use]
    pub fn aligned(&self, other: &Region, reach: f64) -> Option<Region> {
        if self.shapes().len() != other.shapes().len() {
            return None;
        }
        let mut free: Vec<&Shape> = other.shapes().iter().collect();
        let mut shapes = Vec::with_capacity(free.len());
        for shape in self.shapes() {
            let found =
                free.iter().enumerate().find_map(|(k, to)| Some((k, aligned_shape(shape, to, reach)?)));
            let (k, partner) = found?;
            free.remove(k);
            shapes.push(partner);
        }
        Some(Region::from_shapes(shapes))
    }

    /// Every corner moved to where its two edges meet after each has moved out by `by` steps: the same rings with
    /// the same number of corners in the same order.
    ///
    /// Returns `None` where that collapses: an edge would turn round, or rings would cross or touch.
    #[must_use]
    pub fn offset_by_corner(&self, by: f64) -> Option<Region> {
        let mut shapes: Vec<Shape> = Vec::with_capacity(self.shapes().len());
        for shape in self.shapes() {
            shapes.push(shape.iter().map(|ring| moved_ring(ring, by)).collect::<Option<Shape>>()?);
        }
        let moved = Region::from_shapes(shapes);
        moved.is_simple().then_some(moved)
    }

    /// Whether no two rings cross, touch or overlap and none crosses itself.
    #[must_use]
    pub fn is_simple(&self) -> bool {
        let contours: Vec<Contour> = self.contours().cloned().collect();
        let united = Region::from_contours(&contours, Fill::NonZero);
        let perimeter: f64 = contours.iter().map(|ring| length(ring)).sum();
        // Rings that cross change the area by far more than rounding of corners can: one step times the outline.
        let same_area = (united.area() - self.area()).abs() <= perimeter;
        same_area
            && united.contours().count() == contours.len()
            && united.shapes().len() == self.shapes().len()
    }
}

fn aligned_shape(shape: &Shape, other: &Shape, reach: f64) -> Option<Shape> {
    if shape.len() != other.len() {
        return None;
    }
    let mut free: Vec<&Contour> = other.iter().skip(1).collect();
    let mut rings = vec![aligned_ring(&shape[0], &other[0], reach)?];
    for ring in &shape[1..] {
        let found = free.iter().enumerate().find_map(|(k, to)| Some((k, aligned_ring(ring, to, reach)?)));
        let (k, partner) = found?;
        free.remove(k);
        rings.push(partner);
    }
    Some(rings)
}

fn aligned_ring(ring: &Contour, other: &Contour, reach: f64) -> Option<Contour> {
    let n = ring.len();
    if n != other.len() {
        return None;
    }
    let first =
        (0..n).min_by(|a, b| distance(ring[0], other[*a]).total_cmp(&distance(ring[0], other[*b])))?;
    let turned: Contour = (0..n).map(|k| other[(first + k) % n]).collect();
    let close = ring.iter().zip(&turned).all(|(p, q)| distance(*p, *q) <= reach);
    close.then_some(turned)
}

fn keeping() -> Overlay<i64> {
    let options = IntOverlayOptions {
        preserve_input_collinear: true,
        preserve_output_collinear: true,
        ..IntOverlayOptions::default()
    };
    Overlay::new_custom(0, options, Solver::with_precision(Precision::ABSOLUTE))
}

#[expect(clippy::cast_precision_loss, reason = "coordinates stay far below 2^53 steps in practice")]
fn vector(a: Point, b: Point) -> (f64, f64) {
    ((b.x - a.x) as f64, (b.y - a.y) as f64)
}

/// Length of a ring, steps.
#[must_use]
pub fn length(ring: &[Point]) -> f64 {
    let closing = ring.last().zip(ring.first()).map_or(0.0, |(last, first)| distance(*last, *first));
    length_of_way(ring) + closing
}

/// Length of an open chain of corners, steps.
#[must_use]
pub fn length_of_way(way: &[Point]) -> f64 {
    way.windows(2).map(|pair| distance(pair[0], pair[1])).sum()
}

fn distance(a: Point, b: Point) -> f64 {
    let (x, y) = vector(a, b);
    x.hypot(y)
}

fn moved_ring(ring: &Contour, by: f64) -> Option<Contour> {
    let n = ring.len();
    let mut moved = Vec::with_capacity(n);
    for k in 0..n {
        let (before, at, after) = (ring[(k + n - 1) % n], ring[k], ring[(k + 1) % n]);
        let (ux, uy) = unit(before, at)?;
        let (vx, vy) = unit(at, after)?;
        // Outward is to the right of the direction of travel; the corner moves along the sum of both normals.
        let (nx, ny) = (uy + vy, -ux - vx);
        let scale = 1.0 + ux * vx + uy * vy;
        if scale < 0.5 * SHARPEST_MITRE * SHARPEST_MITRE {
            return None;
        }
        moved.push(Point::new(at.x + rounded(by * nx / scale)?, at.y + rounded(by * ny / scale)?));
    }
    let keeps_course = (0..n).all(|k| {
        let (old, new) = (vector(ring[k], ring[(k + 1) % n]), vector(moved[k], moved[(k + 1) % n]));
        old.0 * new.0 + old.1 * new.1 > 0.0
    });
    keeps_course.then_some(moved)
}

fn unit(a: Point, b: Point) -> Option<(f64, f64)> {
    let (x, y) = vector(a, b);
    let length = x.hypot(y);
    (length > 0.0).then(|| (x / length, y / length))
}

#[expect(clippy::cast_possible_truncation, reason = "bounded by the check just before")]
fn rounded(x: f64) -> Option<i64> {
    (x.abs() < 1e15).then(|| x.round() as i64)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::region::Bounds;

    fn square(x: i64, y: i64, side: i64) -> Region {
        Bounds { lo: Point::new(x, y), hi: Point::new(x + side, y + side) }.region()
    }

    #[test]
    fn a_square_grows_with_sharp_corners() {
        let close = |a: f64, b: f64| assert!((a - b).abs() < 1e-9, "{a} {b}");
        close(square(0, 0, 1000).offset(100).area(), 1_440_000.0);
        close(square(0, 0, 1000).offset(-100).area(), 640_000.0);
        let ring = square(0, 0, 1000).difference(&square(400, 400, 200));
        close(ring.offset(50).area(), 1_210_000.0 - 10_000.0);
    }

    #[test]
    fn corners_are_kept_by_an_inset() {
        let ring = square(0, 0, 1000).difference(&square(400, 400, 200));
        let inset = ring.offset_by_corner(-100.0).unwrap();
        assert!((inset.area() - (640_000.0 - 160_000.0)).abs() < 1e-9);
        assert_eq!(inset.contours().map(Vec::len).collect::<Vec<_>>(), [4, 4]);
        assert_eq!(ring.offset_by_corner(-200.0), None, "the hole would reach the rim");
        assert_eq!(ring.offset_by_corner(-210.0), None, "the hole would pass the rim");
        assert_eq!(square(0, 0, 100).offset_by_corner(-60.0), None, "it would turn inside out");
    }
}
