//! Round outlines as polygons: circles, pens, arcs; all with the area of the true shape.
//!
//! Coordinates are grid steps in `f64`, rounded once at the very end, so that outlines that meet in the file meet on
//! the grid. The four axis points of a circle lie on it exactly (pads and straight strokes then share their
//! tangents); the other corners stand slightly outside, by as much as keeps the area. Derivation of the corner
//! radius: `docs/formulation.md` has none, it is four lines, at [`corner_factor`].

use crate::geom::region::{Contour, Point};
use std::f64::consts::{FRAC_PI_2, PI, TAU};

/// A place in grid steps, not yet rounded.
pub(crate) type Xy = [f64; 2];

/// Most corners a circle may get: beyond it the chord error asked for is not met, which no real board comes near.
const MAX_CORNERS: usize = 1 << 16;

/// The factor by which the inner corners of an arc of `sweep` rad in `n_segments` stand outside of it, end points on it.
///
/// ```text
/// (m - 2) f^2 sin d / 2 + 2 f sin d / 2 = sweep / 2,   d = sweep / m
/// ```
/// The triangles between the centre and each chord add up to the sector. Valid for m >= 2.
pub(crate) fn corner_factor(sweep: f64, n_segments: usize) -> f64 {
    #[expect(clippy::cast_precision_loss, reason = "a count of segments")]
    let m = n_segments as f64;
    let sine = (sweep / m).sin();
    let wanted = sweep / sine;
    if n_segments <= 2 { wanted / 2.0 } else { ((1.0 + (m - 2.0) * wanted).sqrt() - 1.0) / (m - 2.0) }
}

/// How many corners a circle of radius `radius` needs for a chord error of `chord_error`, both in steps: a multiple
/// of 4, at least 8.
pub(crate) fn circle_corners(radius: f64, chord_error: f64) -> usize {
    let allowed = chord_error.max(0.5);
    // The corners bulge by about (2 pi / n)^2 / 12 of the radius; start there and go up.
    let start = TAU * (radius / (12.0 * allowed)).sqrt();
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "bounded just before")]
    let mut n = ((start.min(1e5) / 4.0).floor() as usize * 4).clamp(8, MAX_CORNERS);
    while n < MAX_CORNERS && radius * (corner_factor(FRAC_PI_2, n / 4) - 1.0) > allowed {
        n += 4;
    }
    n
}

/// A round pen: the corners of its circle about the origin, counter-clockwise from angle 0.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Pen {
    /// True radius, steps.
    pub(crate) radius: f64,
    /// Corners of the polygon.
    pub(crate) ring: Vec<Xy>,
    chord_error: f64,
}

impl Pen {
    /// A pen of `radius` steps.
    pub(crate) fn new(radius: f64, chord_error: f64) -> Pen {
        let n = circle_corners(radius, chord_error);
        let outer = radius * corner_factor(FRAC_PI_2, n / 4);
        let quarter = n / 4;
        let ring = (0..n)
            .map(|k| match (k % quarter, k / quarter) {
                (0, 0) => [radius, 0.0],
                (0, 1) => [0.0, radius],
                (0, 2) => [-radius, 0.0],
                (0, _) => [0.0, -radius],
                _ => polar(outer, angle_of(k, n)),
            })
            .collect();
        Pen { radius, ring, chord_error }
    }

    /// The dot at `at`.
    pub(crate) fn dot(&self, at: Xy) -> Vec<Xy> {
        self.ring.iter().map(|c| [at[0] + c[0], at[1] + c[1]]).collect()
    }

    /// The straight stroke from `a` to `b`: exact width, round ends.
    pub(crate) fn stroke(&self, a: Xy, b: Xy) -> Vec<Xy> {
        let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
        let length = dx.hypot(dy);
        if length < 0.5 {
            return self.dot(a);
        }
        let aside = [dy / length * self.radius, -dx / length * self.radius];
        let heading = aside[1].atan2(aside[0]);
        let mut outline = Vec::with_capacity(self.ring.len() + 4);
        outline.push([b[0] + aside[0], b[1] + aside[1]]);
        self.half_turn(b, heading, &mut outline);
        outline.push([b[0] - aside[0], b[1] - aside[1]]);
        outline.push([a[0] - aside[0], a[1] - aside[1]]);
        self.half_turn(a, heading + PI, &mut outline);
        outline.push([a[0] + aside[0], a[1] + aside[1]]);
        outline
    }

    /// The stroke along `arc`: contours that together cover it, none of them clockwise except the inside of a ring.
    pub(crate) fn arc_stroke(&self, arc: &Arc) -> Vec<Vec<Xy>> {
        let full = arc.sweep.abs() >= TAU - 1e-12;
        if arc.radius <= self.radius * 1.000_001 || (arc.end_radius - arc.radius).abs() > self.chord_error {
            let path = arc.path(self.chord_error);
            return path.windows(2).map(|pair| self.stroke(pair[0], pair[1])).collect();
        }
        if full {
            let outer = Pen::new(arc.radius + self.radius, self.chord_error).dot(arc.centre);
            let mut inner = Pen::new(arc.radius - self.radius, self.chord_error).dot(arc.centre);
            inner.reverse();
            return vec![outer, inner];
        }
        let arc = arc.counter_clockwise();
        let band = |radius: f64| {
            let (start, end) = (arc.start_angle, arc.start_angle + arc.sweep);
            let at = |angle: f64| add(arc.centre, polar(radius, angle));
            Arc { from: at(start), to: at(end), radius, end_radius: radius, ..arc }.path(self.chord_error)
        };
        let end = arc.start_angle + arc.sweep;
        let mut outline = band(arc.radius + self.radius);
        self.half_turn(add(arc.centre, polar(arc.radius, end)), end, &mut outline);
        outline.extend(band(arc.radius - self.radius).into_iter().rev());
        self.half_turn(arc.from, arc.start_angle + PI, &mut outline);
        vec![outline]
    }

    /// The corners of the dot at `at` that lie within the half turn counter-clockwise from `heading`, ends left out.
    fn half_turn(&self, at: Xy, heading: f64, into: &mut Vec<Xy>) {
        let n = self.ring.len();
        #[expect(clippy::cast_precision_loss, reason = "a count of corners")]
        let step = TAU / n as f64;
        let from = heading.rem_euclid(TAU) / step;
        // A corner that all but coincides with a tangent point would only make a sliver.
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "between 0 and 2 n")]
        let first = (from + 0.05).ceil() as usize;
        #[expect(clippy::cast_precision_loss, reason = "a count of corners")]
        let last = from + n as f64 / 2.0 - 0.05;
        #[expect(clippy::cast_precision_loss, reason = "a count of corners")]
        let corners = (first..).take_while(|k| (*k as f64) < last);
        into.extend(corners.map(|k| add(at, self.ring[k % n])));
    }
}

/// A circular arc; `sweep` is positive counter-clockwise.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Arc {
    /// First point.
    pub(crate) from: Xy,
    /// Last point.
    pub(crate) to: Xy,
    /// Centre.
    pub(crate) centre: Xy,
    /// Distance of `from` to the centre.
    pub(crate) radius: f64,
    /// Distance of `to` to the centre; files round it.
    pub(crate) end_radius: f64,
    /// Direction from the centre to `from`, rad.
    pub(crate) start_angle: f64,
    /// Signed angle, rad.
    pub(crate) sweep: f64,
}

impl Arc {
    /// The arc that starts at `from`, ends at `to` and turns about `centre`; equal ends make a full turn.
    pub(crate) fn about(centre: Xy, from: Xy, to: Xy, counter_clockwise: bool) -> Arc {
        let angle = |p: Xy| (p[1] - centre[1]).atan2(p[0] - centre[0]);
        let radius = |p: Xy| (p[0] - centre[0]).hypot(p[1] - centre[1]);
        let start_angle = angle(from);
        let same = (from[0] - to[0]).abs() < 0.5 && (from[1] - to[1]).abs() < 0.5;
        let turn = if same { 0.0 } else { (angle(to) - start_angle).rem_euclid(TAU) };
        let sweep = match (counter_clockwise, turn < 1e-12) {
            (true, true) => TAU,
            (true, false) => turn,
            (false, true) => -TAU,
            (false, false) => turn - TAU,
        };
        Arc { from, to, centre, radius: radius(from), end_radius: radius(to), start_angle, sweep }
    }

    fn counter_clockwise(&self) -> Arc {
        if self.sweep >= 0.0 {
            return *self;
        }
        Arc {
            from: self.to,
            to: self.from,
            radius: self.end_radius,
            end_radius: self.radius,
            start_angle: self.start_angle + self.sweep,
            sweep: -self.sweep,
            ..*self
        }
    }

    /// The arc as a path from `from` to `to`, both exact, enclosing the area of the true sector.
    pub(crate) fn path(&self, chord_error: f64) -> Vec<Xy> {
        let radius = self.radius.max(self.end_radius);
        // End points on the arc make the inner corners bulge up to twice as far as those of a circle.
        let per_turn = circle_corners(radius, chord_error / 2.0);
        #[expect(clippy::cast_precision_loss, reason = "a count of corners")]
        let wanted = (self.sweep.abs() / TAU * per_turn as f64).ceil().max(2.0);
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "at most MAX_CORNERS")]
        let n = wanted as usize;
        let factor = corner_factor(self.sweep.abs(), n);
        let mut path = Vec::with_capacity(n + 1);
        path.push(self.from);
        for k in 1..n {
            #[expect(clippy::cast_precision_loss, reason = "a count of segments")]
            let part = k as f64 / n as f64;
            let radius = self.radius + (self.end_radius - self.radius) * part;
            path.push(add(self.centre, polar(radius * factor, self.start_angle + self.sweep * part)));
        }
        path.push(self.to);
        path
    }
}

/// The convex outline around `points`, counter-clockwise (monotone chain, Andrew1979).
pub(crate) fn hull(mut points: Vec<Xy>) -> Vec<Xy> {
    points.sort_by(|a, b| a[0].total_cmp(&b[0]).then(a[1].total_cmp(&b[1])));
    let turn = |o: Xy, a: Xy, b: Xy| (a[0] - o[0]) * (b[1] - o[1]) - (a[1] - o[1]) * (b[0] - o[0]);
    let mut outline: Vec<Xy> = Vec::new();
    for pass in 0..2 {
        let base = outline.len();
        for p in &points {
            while outline.len() >= base + 2
                && turn(outline[outline.len() - 2], outline[outline.len() - 1], *p) <= 0.0
            {
                outline.pop();
            }
            outline.push(*p);
        }
        outline.pop();
        if pass == 0 {
            points.reverse();
        }
    }
    outline
}

/// The outline on the grid.
pub(crate) fn snap(outline: &[Xy]) -> Contour {
    let mut ring: Contour = Vec::with_capacity(outline.len());
    for p in outline {
        let p = round(*p);
        if ring.last() != Some(&p) {
            ring.push(p);
        }
    }
    while ring.len() > 1 && ring.first() == ring.last() {
        ring.pop();
    }
    ring
}

/// The nearest grid point. Values out of range saturate; callers check the range where they read it.
#[expect(clippy::cast_possible_truncation, reason = "the range was checked where the number was read")]
pub(crate) fn round(p: Xy) -> Point {
    Point::new(p[0].round() as i64, p[1].round() as i64)
}

pub(crate) fn add(a: Xy, b: Xy) -> Xy {
    [a[0] + b[0], a[1] + b[1]]
}

fn polar(radius: f64, angle: f64) -> Xy {
    [radius * angle.cos(), radius * angle.sin()]
}

#[expect(clippy::cast_precision_loss, reason = "a count of corners")]
fn angle_of(k: usize, n: usize) -> f64 {
    TAU * k as f64 / n as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geom::region::signed_area;

    fn area(outline: &[Xy]) -> f64 {
        signed_area(&snap(outline))
    }

    /// What: a circle has the area of the true circle and keeps the chord error.
    /// Derived: at [`corner_factor`]. Tolerance: rounding of n corners by half a step each, 2 pi r / 2 steps squared.
    #[test]
    fn a_circle_keeps_its_area() {
        for (radius, error) in [(50_000.0, 2_000.0), (150_000.0, 1_000.0), (1e7, 500.0)] {
            let pen = Pen::new(radius, error);
            assert!(pen.ring.len().is_multiple_of(4) && pen.ring.len() >= 8);
            assert!((area(&pen.dot([0.0, 0.0])) - PI * radius * radius).abs() < PI * radius);
            let farthest = pen.ring.iter().map(|c| c[0].hypot(c[1])).fold(0.0, f64::max);
            assert!(farthest - radius <= error);
        }
    }

    /// What: an axis-parallel stroke is a rectangle and a circle. Derived: the cap is two quarter circles.
    /// Tolerance: rounding, as above.
    #[test]
    fn a_stroke_keeps_its_area() {
        let pen = Pen::new(100_000.0, 1_000.0);
        let length = 1e6;
        for b in [[length, 0.0], [0.0, length], [-length, 0.0], [0.0, -length]] {
            let wanted = PI * 1e10 + 2e5 * length;
            assert!((area(&pen.stroke([0.0, 0.0], b)) - wanted).abs() < 1e6);
        }
        // Askew: the partial segments beside the tangents lose at most r^2 d^3 / 6, d = 2 pi / n.
        let d = TAU / 24.0;
        let askew = area(&pen.stroke([0.0, 0.0], [length * 0.28, length * 0.96]));
        assert!((askew - PI * 1e10 - 2e5 * length).abs() < 1e10 * d * d * d / 6.0 + 1e6);
    }

    /// What: a curved stroke covers width x length of the arc and two half dots. Derived: Pappus.
    #[test]
    fn an_arc_stroke_keeps_its_area() {
        let pen = Pen::new(1e5, 500.0);
        for counter in [true, false] {
            let arc = Arc::about([0.0, 0.0], [1e6, 0.0], [0.0, 1e6], counter);
            let outlines = pen.arc_stroke(&arc);
            let wanted = 2e5 * 1e6 * arc.sweep.abs() + PI * 1e10;
            let got: f64 = outlines.iter().map(|o| area(o)).sum();
            assert!((got / wanted - 1.0).abs() < 1e-4, "{got} {wanted}");
        }
    }
}
