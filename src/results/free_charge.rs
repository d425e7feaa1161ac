//! Free and bound charge of each panel, from its total charge density and the normal field.

use crate::kernel::image::{Mirrors, Source};
use crate::kernel::{EPS0, Flat};
use crate::mesh::{Mesh, Panel, PanelKind};
use faer::{Mat, MatRef};
use rayon::prelude::{IntoParallelRefIterator, ParallelIterator};

/// Principal value of the mean normal field on each panel where it is needed, V/m: `n_panels × n_columns`.
///
/// On an interface its own row gives it, `E_n = -(er1 + er2) σ / (2 ε₀ (er2 - er1))`. On a sheet it is summed over all panels
/// and images, when the two permittivities differ or either side is a finite body. Elsewhere it is not needed and 0.
pub(super) fn normal_field(mesh: &Mesh, density: MatRef<'_, f64>) -> Mat<f64> {
    let mirrors = Mirrors::new(mesh.planes.below, mesh.planes.above);
    let needs_sum: Vec<bool> = mesh.panels.iter().map(|panel| needs_sum(mesh, panel)).collect();
    let sources: Vec<Source> = if needs_sum.contains(&true) {
        mesh.panels.iter().map(|panel| mirrors.source(&panel.shape)).collect()
    } else {
        Vec::new()
    };
    let indices: Vec<usize> = (0..mesh.panels.len()).collect();
    let rows: Vec<Vec<f64>> = indices
        .par_iter()
        .map(|&i| match mesh.panels[i].kind {
            PanelKind::Interface { er_from, er_to, .. } if differ(er_from, er_to) => {
                let factor = -0.5 * (er_from + er_to) / (EPS0 * (er_to - er_from));
                (0..density.ncols()).map(|c| factor * density[(i, c)]).collect()
            }
            _ if needs_sum[i] => field_on(&mirrors, &sources, sources[i].direct(), density),
            _ => vec![0.0; density.ncols()],
        })
        .collect();
    Mat::from_fn(mesh.panels.len(), density.ncols(), |i, c| rows[i][c])
}

/// Whether two permittivities are different at all: equal ones make no interface.
fn differ(er_1: f64, er_2: f64) -> bool {
    (er_1 - er_2).abs() > 0.0
}

fn needs_sum(mesh: &Mesh, panel: &Panel) -> bool {
    let PanelKind::Sheet { below, above, er_below, er_above, .. } = panel.kind else { return false };
    let finite =
        |body: crate::faces::BodyId| mesh.bodies.get(body.0 as usize).is_some_and(|body| body.finite);
    differ(er_below, er_above) || finite(below) || finite(above)
}

fn field_on(mirrors: &Mirrors, sources: &[Source], test: &Flat, density: MatRef<'_, f64>) -> Vec<f64> {
    let mut sum = vec![0.0; density.ncols()];
    for (k, source) in sources.iter().enumerate() {
        let entry = mirrors.flux(test, source);
        for (c, sum) in sum.iter_mut().enumerate() {
            *sum += entry * density[(k, c)];
        }
    }
    sum
}

/// Free charge on a panel, C, from its density (C/m²) and the normal field on it (V/m); the bound rest is σ A minus this.
///
/// Conductor against er: er σ A. Interface: 0. Sheet, normal from below to above, the jump of the displacement:
/// `((er_below + er_above)/2 σ + ε₀ (er_above - er_below) E_n) A`.
pub(super) fn free_charge(panel: &Panel, density: f64, field: f64) -> f64 {
    let per_area = match panel.kind {
        PanelKind::Conductor { er, .. } => er * density,
        PanelKind::Sheet { er_below, er_above, .. } => {
            0.5 * (er_below + er_above) * density + EPS0 * (er_above - er_below) * field
        }
        PanelKind::Interface { .. } => 0.0,
    };
    per_area * panel.shape.area()
}

/// Bound charge on a panel that belongs to the body on the side the normal points away from, and to the body on the other
/// side, C; the side of the metal has none.
pub(super) fn shares(panel: &Panel, density: f64, field: f64) -> (f64, f64) {
    let area = panel.shape.area();
    let both = |er_1: f64, er_2: f64| {
        let one = EPS0 * (er_1 - 1.0) * (field - 0.5 * density / EPS0);
        let two = -EPS0 * (er_2 - 1.0) * (field + 0.5 * density / EPS0);
        (one * area, two * area)
    };
    match panel.kind {
        PanelKind::Conductor { er, .. } => (0.0, (1.0 - er) * density * area),
        PanelKind::Sheet { er_below, er_above, .. } => both(er_below, er_above),
        PanelKind::Interface { er_from, er_to, .. } => both(er_from, er_to),
    }
}
