//! Shapes drawn in the job, as regions.

use super::curve::{Pen, Xy, snap};
use super::error::{ArtworkError, Problem};
use crate::geom::region::{Contour, Fill, Grid, Region};
use crate::job::{DrawnShape, Outline};

/// Largest coordinate, m.
const MAX_LENGTH_M: f64 = 10.0;

/// The region of a drawn shape, holes cut out.
///
/// # Errors
/// [`Problem::Shape`] when a number is out of range or nothing is left.
pub(super) fn region(shape: &DrawnShape, grid: Grid, chord_error: f64) -> Result<Region, ArtworkError> {
    let fail = |reason| ArtworkError::at(shape.origin, Problem::Shape { reason, span: shape.origin.span });
    let drawn = |outline: &Outline| {
        let contours =
            contours(outline, grid, chord_error).ok_or_else(|| fail("a coordinate is out of range"))?;
        let region = Region::from_contours(&contours, Fill::NonZero);
        if region.is_empty() { Err(fail("it has no area")) } else { Ok(region) }
    };
    let mut region = drawn(&shape.outline)?;
    if !shape.holes.is_empty() {
        let holes = shape.holes.iter().map(drawn).collect::<Result<Vec<_>, _>>()?;
        region = region.difference(&Region::union_all(&holes));
    }
    if region.is_empty() { Err(fail("its holes leave nothing")) } else { Ok(region) }
}

fn contours(outline: &Outline, grid: Grid, chord_error: f64) -> Option<Vec<Contour>> {
    let step = grid.step();
    let place = |p: &[f64; 2]| -> Option<Xy> {
        let fits = p.iter().all(|c| c.is_finite() && c.abs() <= MAX_LENGTH_M);
        fits.then_some([p[0] / step, p[1] / step])
    };
    let pen = |diameter: f64| {
        let fits = diameter > 0.0 && diameter <= MAX_LENGTH_M;
        fits.then(|| Pen::new(diameter / 2.0 / step, chord_error / step))
    };
    Some(match outline {
        Outline::Rectangle { from, to } => {
            let (a, b) = (place(from)?, place(to)?);
            let (lo, hi) = ([a[0].min(b[0]), a[1].min(b[1])], [a[0].max(b[0]), a[1].max(b[1])]);
            vec![snap(&[lo, [hi[0], lo[1]], hi, [lo[0], hi[1]]])]
        }
        Outline::Circle { at, diameter } => vec![snap(&pen(*diameter)?.dot(place(at)?))],
        Outline::Polygon(corners) => vec![snap(&corners.iter().map(place).collect::<Option<Vec<_>>>()?)],
        Outline::Stroke { path, width } => {
            let pen = pen(*width)?;
            let path = path.iter().map(place).collect::<Option<Vec<_>>>()?;
            match path.as_slice() {
                [one] => vec![snap(&pen.dot(*one))],
                several => several.windows(2).map(|p| snap(&pen.stroke(p[0], p[1]))).collect(),
            }
        }
    })
}
