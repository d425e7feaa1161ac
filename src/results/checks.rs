//! Physical self-checks: how far this solution is from what every true one satisfies. How far it may be says `check`.

use crate::mesh::{Mesh, PanelKind};
use crate::results::free_charge::shares;
use crate::results::{Check, CheckKind, CheckOutcome, GroupCharge};
use faer::{Mat, MatRef};

/// What the checks look at.
pub(super) struct Solution<'a> {
    pub(super) mesh: &'a Mesh,
    /// `n_panels × n_rows`, C/m².
    pub(super) density: MatRef<'a, f64>,
    /// `n_panels × n_rows`, V/m.
    pub(super) field: MatRef<'a, f64>,
    pub(super) maxwell: &'a Mat<f64>,
    /// `n_nets × n_rows`, C.
    pub(super) net_charge: &'a Mat<f64>,
    pub(super) groups: &'a [GroupCharge],
}

/// All checks, in a fixed order, at the thresholds of [`CheckKind::threshold`].
pub(super) fn checks(solution: &Solution<'_>) -> Vec<Check> {
    let check = |kind, outcome| Check { kind, outcome };
    vec![
        check(CheckKind::Reciprocity, reciprocity(solution.maxwell)),
        check(CheckKind::Signs, signs(solution.maxwell)),
        check(CheckKind::Dominance, dominance(solution.maxwell)),
        check(CheckKind::ChargeAtInfinity, at_infinity(solution)),
        check(CheckKind::Neutrality, neutrality(solution)),
    ]
}

fn made(value: f64, kind: CheckKind) -> CheckOutcome {
    CheckOutcome::Made { value, threshold: kind.threshold() }
}

fn not_applicable(why: &str) -> CheckOutcome {
    CheckOutcome::NotApplicable(why.to_owned())
}

/// `sqrt(C_ii C_jj)`.
fn scale(c: &Mat<f64>, i: usize, j: usize) -> f64 {
    (c[(i, i)].abs() * c[(j, j)].abs()).sqrt().max(f64::MIN_POSITIVE)
}

/// Largest of `value` over all ordered pairs of rows; not-a-number is kept, so that it fails.
fn largest(n: usize, value: impl Fn(usize, usize) -> f64) -> f64 {
    let pairs = (0..n).flat_map(|i| (0..n).map(move |j| (i, j)));
    pairs.map(|(i, j)| value(i, j)).fold(0.0, |a: f64, b| if a >= b { a } else { b })
}

fn reciprocity(c: &Mat<f64>) -> CheckOutcome {
    if c.nrows() < 2 {
        return not_applicable("there is only one row");
    }
    made(largest(c.nrows(), |i, j| (c[(i, j)] - c[(j, i)]).abs() / scale(c, i, j)), CheckKind::Reciprocity)
}

fn signs(c: &Mat<f64>) -> CheckOutcome {
    let wrong = |i: usize, j: usize| if i == j { -c[(i, i)] } else { c[(i, j)] };
    made(largest(c.nrows(), |i, j| wrong(i, j) / scale(c, i, j)), CheckKind::Signs)
}

fn dominance(c: &Mat<f64>) -> CheckOutcome {
    let sum = |i: usize| (0..c.ncols()).map(|j| c[(i, j)]).sum::<f64>();
    made(largest(c.nrows(), |i, _| -sum(i) / scale(c, i, i)), CheckKind::Dominance)
}

/// Free charge against er times total charge, er that of the medium through which all flux ends (`docs/formulation.md`,
/// "Open interfaces").
fn at_infinity(s: &Solution<'_>) -> CheckOutcome {
    let er = match far_permittivity(s.mesh) {
        Ok(er) => er,
        Err(why) => return not_applicable(why),
    };
    let base = CheckKind::ChargeAtInfinity.threshold();
    let mut worst: Option<(f64, f64)> = None;
    for r in 0..s.density.ncols() {
        let free: f64 = (0..s.net_charge.nrows()).map(|n| s.net_charge[(n, r)]).sum();
        let size: f64 = (0..s.net_charge.nrows()).map(|n| s.net_charge[(n, r)].abs()).sum();
        let panels = s.mesh.panels.iter().enumerate();
        let total: f64 = panels.map(|(i, panel)| s.density[(i, r)] * panel.shape.area()).sum();
        let tail: f64 = s.groups.iter().filter_map(|group| group.tail.as_ref()).map(|tail| tail[r]).sum();
        // The tail is an estimate: it may be wrong by its own size before the check fails.
        let value = (free - er * (total + tail)).abs() / size.max(f64::MIN_POSITIVE);
        let threshold = base + er * tail.abs() / size.max(f64::MIN_POSITIVE);
        // By the excess, whose order stays when all thresholds are raised alike.
        if value.is_nan() || worst.is_none_or(|(v, t)| value - threshold >= v - t) {
            worst = Some((value, threshold));
        }
    }
    worst.map_or_else(
        || not_applicable("there is no row"),
        |(value, threshold)| CheckOutcome::Made { value, threshold },
    )
}

/// Permittivity by which free charge exceeds the total charge seen from far away, or why there is none.
fn far_permittivity(mesh: &Mesh) -> Result<f64, &'static str> {
    let open = |k: usize| mesh.groups[mesh.panels[k].group.0 as usize].open;
    let any_open = (0..mesh.panels.len()).any(open);
    if any_open && mesh.truncation.is_none() {
        return Err("where the open interfaces end is not known");
    }
    let plane = match (mesh.planes.below, mesh.planes.above) {
        (None, None) => {
            return match (mesh.outer_er.above, mesh.outer_er.below) {
                (Some(above), Some(below)) => Ok(0.5 * (above + below)),
                _ => Err("the permittivity at infinity is not known"),
            };
        }
        (Some(_), Some(_)) => {
            return Err("how the charge divides between two planes is not known beforehand");
        }
        (Some(plane), None) | (None, Some(plane)) => plane,
    };
    if mesh.panels.iter().enumerate().any(|(k, panel)| !open(k) && touches(panel, plane)) {
        return Err("more than one medium may touch the image plane");
    }
    let nearest = mesh
        .panels
        .iter()
        .enumerate()
        .filter(|(k, panel)| open(*k) && matches!(panel.kind, PanelKind::Interface { .. }))
        .min_by(|(_, a), (_, b)| {
            (a.shape.centroid().z - plane).abs().total_cmp(&(b.shape.centroid().z - plane).abs())
        });
    match nearest {
        Some((_, panel)) => match panel.kind {
            PanelKind::Interface { er_from, er_to, .. } => {
                let away = panel.shape.normal().z * (panel.shape.centroid().z - plane) > 0.0;
                Ok(if away { er_from } else { er_to })
            }
            _ => Err("the medium at the image plane is not known"),
        },
        None => {
            mesh.outer_er.above.or(mesh.outer_er.below).ok_or("the medium at the image plane is not known")
        }
    }
}

/// Whether a panel reaches a plane, within rounding.
fn touches(panel: &crate::mesh::Panel, plane: f64) -> bool {
    panel.shape.corners().iter().any(|corner| (corner.z - plane).abs() <= 1e-9 * panel.shape.diameter())
}

/// Net bound charge of each finite body, over the sum of the sizes of its panels' shares; the worst body counts.
fn neutrality(s: &Solution<'_>) -> CheckOutcome {
    let n_rows = s.density.ncols();
    let planes = [s.mesh.planes.below, s.mesh.planes.above];
    // Bound charge in an image plane is on no panel.
    let mut closed: Vec<bool> =
        s.mesh.bodies.iter().map(|body| body.finite && (body.er - 1.0).abs() > 0.0).collect();
    let mut sums = vec![vec![(0.0, 0.0); n_rows]; closed.len()];
    for (i, panel) in s.mesh.panels.iter().enumerate() {
        let (from, to) = match panel.kind {
            PanelKind::Conductor { body, .. } => (None, Some(body)),
            PanelKind::Sheet { below, above, .. } => (Some(below), Some(above)),
            PanelKind::Interface { from, to, .. } => (Some(from), Some(to)),
        };
        let on_plane = planes.iter().flatten().any(|plane| touches(panel, *plane));
        for body in [from, to].into_iter().flatten() {
            if let Some(closed) = closed.get_mut(body.0 as usize) {
                *closed &= !on_plane;
            }
        }
        for r in 0..n_rows {
            let (one, two) = shares(panel, s.density[(i, r)], s.field[(i, r)]);
            for (body, share) in [(from, one), (to, two)] {
                if let Some(sum) = body.and_then(|body| sums.get_mut(body.0 as usize)) {
                    sum[r].0 += share;
                    sum[r].1 += share.abs();
                }
            }
        }
    }
    let worst = sums
        .iter()
        .zip(&closed)
        .filter(|(_, closed)| **closed)
        .flat_map(|(sum, _)| sum.iter())
        .filter(|(_, size)| *size > 0.0)
        .map(|(net, size)| net.abs() / size);
    let worst = worst.fold(None, |a: Option<f64>, b| Some(a.map_or(b, |a| if a >= b { a } else { b })));
    worst.map_or_else(
        || not_applicable("no dielectric body lies wholly inside the model"),
        |w| made(w, CheckKind::Neutrality),
    )
}
