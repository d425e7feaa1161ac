//! Apertures: what a flash leaves, and which of them can draw.

use super::command::{Definition, Hole};
use super::error::GerberError;
use super::image::Object;
use super::macros::{Macro, rectangle, regular, turn};
use crate::artwork::curve::{Pen, Xy, snap};
use crate::diag::Span;
use crate::geom::region::{Fill, Grid, Region};
use std::collections::HashMap;
use std::sync::Arc as Shared;

/// A defined aperture.
#[derive(Debug, Clone)]
pub(super) enum Aperture {
    /// Contours about the origin, in steps; holes clockwise.
    Shape { contours: Shared<Vec<Vec<Xy>>>, pen: PenShape },
    /// Objects of a block aperture.
    Block(Shared<Vec<Object>>),
}

/// What an aperture draws with, in steps.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum PenShape {
    /// A disc of this radius.
    Round(f64),
    /// A rectangle of this width and height.
    Rectangle(f64, f64),
    /// The format gives its strokes no meaning.
    None(&'static str),
}

/// The aperture of `definition`; `unit` is the file's unit in steps, `chord_error` in steps too.
///
/// # Errors
/// What the macro refuses, an unknown macro, and lengths out of range.
pub(super) fn build(
    definition: &Definition,
    macros: &HashMap<String, Macro>,
    unit: f64,
    (grid, chord_error): (Grid, f64),
    span: Span,
) -> Result<Aperture, GerberError> {
    let limit = super::max_steps(grid);
    let check = |lengths: &[f64]| {
        if lengths.iter().any(|l| !l.is_finite() || *l < 0.0 || l * unit > limit) {
            return Err(GerberError::OutOfRange { what: "an aperture's size", span });
        }
        Ok(())
    };
    let circle = |d: f64| Pen::new(d * unit / 2.0, chord_error);
    let (outline, pen, hole) = match definition {
        Definition::Circle { diameter, hole } => {
            check(&[*diameter])?;
            let outline = if *diameter > 0.0 { circle(*diameter).ring } else { Vec::new() };
            (outline, PenShape::Round(diameter * unit / 2.0), *hole)
        }
        Definition::Rectangle { x, y, hole } => {
            check(&[*x, *y])?;
            let (w, h) = (x * unit, y * unit);
            (rectangle([-w / 2.0, -h / 2.0], w, h), PenShape::Rectangle(w, h), *hole)
        }
        Definition::Obround { x, y, hole } => {
            check(&[*x, *y])?;
            let (w, h) = (x * unit, y * unit);
            let reach = (w - h).abs() / 2.0;
            let tip = if w > h { [reach, 0.0] } else { [0.0, reach] };
            let pen = Pen::new(w.min(h) / 2.0, chord_error);
            let round = (w - h).abs() < 0.5;
            let outline = pen.stroke([-tip[0], -tip[1]], tip);
            // An obround as wide as high is a circle, and may draw.
            let shape = if round { PenShape::Round(w / 2.0) } else { PenShape::None("an obround aperture") };
            (outline, shape, *hole)
        }
        Definition::Polygon { diameter, corners, rotation, hole } => {
            check(&[*diameter])?;
            let outline = regular(diameter * unit / 2.0, *corners, rotation.to_radians());
            (outline, PenShape::None("a polygon aperture"), *hole)
        }
        Definition::Macro { name, values } => {
            let found =
                macros.get(name).ok_or_else(|| GerberError::UndefinedMacro { name: name.clone(), span })?;
            let region = found.region(values, unit, chord_error)?;
            return Ok(shape(&region, PenShape::None("a macro aperture")));
        }
    };
    let cut = match hole {
        Hole::None => {
            let contours = if outline.is_empty() { Vec::new() } else { vec![outline] };
            return Ok(Aperture::Shape { contours: Shared::new(contours), pen });
        }
        Hole::Round(d) => {
            check(&[d])?;
            circle(d).ring
        }
        Hole::Rectangular(x, y) => {
            check(&[x, y])?;
            rectangle([-x * unit / 2.0, -y * unit / 2.0], x * unit, y * unit)
        }
    };
    let area = |ring: &[Xy]| Region::from_contours(&[snap(ring)], Fill::NonZero);
    Ok(shape(&area(&outline).difference(&area(&cut)), PenShape::None("an aperture with a hole")))
}

fn shape(region: &Region, pen: PenShape) -> Aperture {
    #[expect(clippy::cast_precision_loss, reason = "apertures are far smaller than 2^53 steps")]
    let ring = |ring: &crate::geom::Contour| ring.iter().map(|p| [p.x as f64, p.y as f64]).collect();
    Aperture::Shape { contours: Shared::new(region.contours().map(ring).collect()), pen }
}

/// Mirroring, rotation and scale of apertures (`LM`, `LR`, `LS`), applied in this order: scale, mirror, rotate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Placement {
    pub(super) mirror_x: bool,
    pub(super) mirror_y: bool,
    /// rad, counter-clockwise.
    pub(super) rotation: f64,
    pub(super) scale: f64,
}

impl Placement {
    pub(super) const IDENTITY: Placement =
        Placement { mirror_x: false, mirror_y: false, rotation: 0.0, scale: 1.0 };

    pub(super) fn flips(&self) -> bool {
        self.mirror_x != self.mirror_y
    }

    /// `points` about the origin, placed; order of points kept.
    pub(super) fn apply(&self, points: Vec<Xy>) -> Vec<Xy> {
        if *self == Placement::IDENTITY {
            return points;
        }
        let sign = |mirror: bool| if mirror { -self.scale } else { self.scale };
        let (sx, sy) = (sign(self.mirror_x), sign(self.mirror_y));
        turn(points.into_iter().map(|p| [p[0] * sx, p[1] * sy]).collect(), self.rotation)
    }
}
