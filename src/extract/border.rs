//! What ending open interfaces and planes where they end does: the coarsest mesh, once whole and once without its rim.

use crate::extract::error_bar;
use crate::faces::Truncation;
use crate::geom::PanelShape;
use crate::mesh::split::halves;
use crate::mesh::{Mesh, PanelId, SplitDirection};

/// A panel across the moved border may be this part of the rim's width, so that the border is moved by what it should
/// be to half of this.
const FINEST: f64 = 0.5;
/// Rounds of halving; four make 1/16 of a panel.
const MOST_ROUNDS: usize = 4;

/// `mesh` with panels across the moved border cut so small that the border can be moved, and the same without what lies
/// beyond the border moved in by [`error_bar::BORDER_MOVE`]; `None` when nothing is truncated.
pub(crate) fn whole_and_inner(mesh: &Mesh) -> Option<[Mesh; 2]> {
    let truncation = mesh.truncation?;
    let whole = cut_at_border(mesh.clone(), &truncation);
    let inner = inner_part(&whole, &truncation);
    Some([whole, inner])
}

fn inner_part(whole: &Mesh, truncation: &Truncation) -> Mesh {
    let mut inner = whole.clone();
    inner.panels.retain(|panel| {
        let centre = panel.shape.centroid();
        (0..2).all(|axis| (centre[axis] - truncation.centre[axis]).abs() <= moved(truncation, axis))
    });
    inner
}

/// Half-width of what the moved border encloses along an axis, m; the copper stays whole.
fn moved(truncation: &Truncation, axis: usize) -> f64 {
    (truncation.extent[axis] / error_bar::BORDER_MOVE).max(truncation.copper[axis])
}

fn cut_at_border(mut mesh: Mesh, truncation: &Truncation) -> Mesh {
    for _ in 0..MOST_ROUNDS {
        let cuts: Vec<(PanelId, SplitDirection)> = (0u32..)
            .zip(&mesh.panels)
            .filter_map(|(k, panel)| {
                let axis = (0..2).find(|axis| is_across(&panel.shape, truncation, *axis))?;
                Some((PanelId(k), across(&panel.shape, axis)))
            })
            .collect();
        if cuts.is_empty() {
            break;
        }
        mesh = mesh.split(&cuts);
    }
    mesh
}

/// Whether the panel lies on both sides of the moved border and is too long to be on one of them by and large.
fn is_across(shape: &PanelShape, truncation: &Truncation, axis: usize) -> bool {
    let border = moved(truncation, axis);
    let [lo, hi] = range(shape, axis).map(|x| x - truncation.centre[axis]);
    let straddles = (lo < border && border < hi) || (lo < -border && -border < hi);
    straddles && hi - lo > FINEST * (truncation.extent[axis] - border)
}

/// Smallest and largest coordinate along an axis, m.
fn range(shape: &PanelShape, axis: usize) -> [f64; 2] {
    shape.bounds().map(|corner| corner[axis])
}

/// The cut that makes the shape shorter along an axis.
fn across(shape: &PanelShape, axis: usize) -> SplitDirection {
    let longest_part = |direction| {
        let parts = halves(shape, direction).into_iter().flatten();
        parts.map(|part| range(&part, axis)).map(|[lo, hi]| hi - lo).fold(0.0, f64::max)
    };
    if longest_part(SplitDirection::First) <= longest_part(SplitDirection::Second) {
        SplitDirection::First
    } else {
        SplitDirection::Second
    }
}
