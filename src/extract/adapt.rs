//! Which panels to refine next, and what that should gain.
//!
//! The error of C is one of energy. Where the charge density σ is replaced by its mean over a panel of area A and width w, the
//! local field keeps an energy of about `(δσ)² A w` too little, δσ the change of σ across the panel:
//!
//! ```text
//! η = er A w (Σ_j |δσ_j| / Q_j)²      er: mean of both sides;  w = A / diameter;  Q_j = Σ |σ_j| A over all panels
//! ```
//! over the excitations j. δσ is taken twice: as the largest jump to a panel of the same face that touches, which finds where
//! charge crowds; and as σ itself, since on graded panels δσ/σ is much the same, which finds what jumps across a corner
//! hide. Either alone was measured to leave out parts (of a plate over a thin film; of a barrel in its anti-pads), so each is scaled to a
//! sum of 1 and both are added. Panels are marked that hold a fixed part of Σ η (`Doerfler1996`), and cut again at twice the density.

use crate::extract::ExtractOptions;
use crate::extract::error::ExtractError;
use crate::extract::stop::NoFiner;
use crate::faces::Faces;
use crate::geom::Vec3;
use crate::mesh::{Mesh, MeshError, Panel, PanelId, PanelKind, regrade};
use crate::solve::Charge;
use rayon::prelude::*;
use std::collections::BTreeMap;

/// Parts of Σ η that are marked, from what is wanted to what is taken where the mesh would not fit else.
const MARKED: [f64; 3] = [0.98, 0.9, 0.7];
/// Panels within this ratio of the least one marked are marked as well, so that equal ones are treated alike.
const ALIKE: f64 = 0.99;
/// By how much denser a marked panel is cut.
const DENSER: f64 = 2.0;
/// Where the whole mesh gets finer, the error is taken to fall by `1 + LINEAR (N / N_before - 1)`: slower than graded meshes
/// converge (N^-1.5).
const LINEAR: f64 = 0.75;
/// Where few panels do, by this factor at least. Measured on the three fixtures, whose error falls by 2 to 3 from level to level.
const LEAST_LEFT: f64 = 5.0 / 3.0;
/// A level must promise to make the error smaller by this factor to say anything about convergence.
const LEAST_GAIN: f64 = 1.3;

/// A mesh whose panels were cut at densities of their own.
#[derive(Debug, Clone)]
pub(crate) struct Graded {
    pub(crate) mesh: Mesh,
    /// The density at which each panel was cut.
    density: Vec<f64>,
    /// Factor by which the error is taken to be smaller than on the mesh before; 1 on the first.
    pub(crate) gain: f64,
}

impl Graded {
    /// The mesh of a first level.
    pub(crate) fn first(mesh: Mesh, density: f64) -> Self {
        let density = vec![density; mesh.panels.len()];
        Graded { mesh, density, gain: 1.0 }
    }

    /// A mesh made anew at `density`, after one of `n_before` panels.
    pub(crate) fn anew(mesh: Mesh, density: f64, n_before: usize) -> Self {
        let gain = ratio(mesh.panels.len(), n_before);
        Graded { gain, ..Graded::first(mesh, density) }
    }

    /// The next mesh, or why there is none.
    ///
    /// - `charge`: the charge on this mesh.
    pub(crate) fn refined(
        &self,
        faces: &Faces,
        charge: &Charge,
        options: &ExtractOptions,
    ) -> Result<Result<Graded, NoFiner>, ExtractError> {
        let (fits, limit) = (options.panels_that_fit(), options.limit());
        let indicator = indicator(&self.mesh, charge);
        let mut room = NoFiner::Faces { panels: self.mesh.panels.len() };
        for part in MARKED {
            let marked = marked(&indicator, part);
            let finer: Vec<(PanelId, f64)> =
                marked.iter().map(|k| (panel_id(*k), DENSER * self.density[*k])).collect();
            let (mesh, n_parts) = match regrade(faces, &self.mesh, &finer, options.most_panels()) {
                Err(MeshError::TooMany { needed, at_least, .. }) => {
                    room = NoFiner::Room { panels: needed, at_least, fits, limit };
                    continue;
                }
                other => other?,
            };
            if mesh.panels.len() > fits {
                room = NoFiner::Room { panels: mesh.panels.len(), at_least: false, fits, limit };
                continue;
            }
            let grown = ratio(mesh.panels.len(), self.mesh.panels.len());
            let gain = gain(&indicator, &n_parts).min(LEAST_LEFT.max(1.0 + LINEAR * (grown - 1.0)));
            if gain < LEAST_GAIN {
                break;
            }
            let mut density = self.density.clone();
            for (id, denser) in finer {
                density[id.0 as usize] = denser;
            }
            let density = density.iter().zip(&n_parts).flat_map(|(n, parts)| vec![*n; *parts]).collect();
            return Ok(Ok(Graded { mesh, density, gain }));
        }
        Ok(Err(room))
    }
}

fn panel_id(k: usize) -> PanelId {
    PanelId(u32::try_from(k).unwrap_or(u32::MAX))
}

/// η of each panel.
fn indicator(mesh: &Mesh, charge: &Charge) -> Vec<f64> {
    let n_excited = charge.density.ncols();
    let sizes: Vec<f64> = (0..n_excited)
        .map(|j| {
            mesh.panels.iter().enumerate().map(|(i, p)| charge.density[(i, j)].abs() * p.shape.area()).sum()
        })
        .collect();
    let beside = beside(mesh);
    let eta = |(i, panel): (usize, &Panel), by_jump: bool| {
        let er = match panel.kind {
            PanelKind::Conductor { er, .. } => er,
            PanelKind::Sheet { er_below, er_above, .. } => 0.5 * (er_below + er_above),
            PanelKind::Interface { er_from, er_to, .. } => 0.5 * (er_from + er_to),
        };
        let change = |j: usize| {
            let own = charge.density[(i, j)];
            let jumps = beside[i].iter().map(|k| (own - charge.density[(*k as usize, j)]).abs());
            if beside[i].is_empty() || !by_jump { own.abs() } else { jumps.fold(0.0, f64::max) }
        };
        let relative: f64 = (0..n_excited).filter(|j| sizes[*j] > 0.0).map(|j| change(j) / sizes[j]).sum();
        er * panel.shape.area().powi(2) / panel.shape.diameter() * relative * relative
    };
    let both = [false, true].map(|by_jump| {
        let all: Vec<f64> = mesh.panels.iter().enumerate().map(|panel| eta(panel, by_jump)).collect();
        let sum: f64 = all.iter().sum();
        all.into_iter().map(move |eta| if sum > 0.0 { eta / sum } else { 0.0 }).collect::<Vec<f64>>()
    });
    both[0].iter().zip(&both[1]).map(|(a, b)| a + b).collect()
}

/// Panels of the same face that touch each panel.
fn beside(mesh: &Mesh) -> Vec<Vec<u32>> {
    let mut by_face: BTreeMap<u32, Vec<u32>> = BTreeMap::new();
    for (panel, k) in mesh.panels.iter().zip(0u32..) {
        by_face.entry(panel.face).or_default().push(k);
    }
    let boxes: Vec<[Vec3; 2]> = mesh.panels.iter().map(|panel| panel.shape.bounds()).collect();
    let touch = |a: &[Vec3; 2], b: &[Vec3; 2], slack: f64| {
        (0..3).all(|c| a[0][c] <= b[1][c] + slack && b[0][c] <= a[1][c] + slack)
    };
    let of_panel = |(k, panel): (usize, &Panel)| {
        let slack = TOUCHING * panel.shape.diameter();
        let face = by_face.get(&panel.face).map_or(&[][..], Vec::as_slice);
        let touching = |other: &u32| {
            let other = *other as usize;
            other != k && touch(&boxes[k], &boxes[other], slack)
        };
        face.iter().copied().filter(touching).collect()
    };
    mesh.panels.par_iter().enumerate().map(of_panel).collect()
}

/// Panels touch when their boxes do, within this part of the diameter.
const TOUCHING: f64 = 1e-6;

/// The fewest panels that hold `part` of the sum, with those that are as good; in order.
fn marked(indicator: &[f64], part: f64) -> Vec<usize> {
    let total: f64 = indicator.iter().sum();
    let mut order: Vec<usize> = (0..indicator.len()).collect();
    order.sort_by(|a, b| indicator[*b].total_cmp(&indicator[*a]));
    let (mut held, mut least) = (0.0, f64::INFINITY);
    for k in order {
        if held >= part * total && indicator[k] < ALIKE * least {
            break;
        }
        if held < part * total {
            least = indicator[k];
        }
        held += indicator[k];
    }
    (0..indicator.len()).filter(|k| indicator[*k] >= ALIKE * least).collect()
}

/// Factor by which the error gets smaller when a panel's share of it falls as 1 / (number of its parts).
fn gain(indicator: &[f64], n_parts: &[usize]) -> f64 {
    let left: f64 = indicator.iter().zip(n_parts).map(|(eta, parts)| eta * ratio(1, *parts)).sum();
    if left > 0.0 { indicator.iter().sum::<f64>() / left } else { 1.0 }
}

#[expect(clippy::cast_precision_loss, reason = "counts of panels are far below 2^53")]
fn ratio(a: usize, b: usize) -> f64 {
    a as f64 / b as f64
}
