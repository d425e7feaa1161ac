//! Superposition: from one volt on each excited net to one volt on each row net with the floating nets settled.

use crate::mesh::Mesh;
use crate::net::{NetId, Role};
use crate::results::ResultsError;
use crate::solve::Charge;
use faer::linalg::solvers::Solve;
use faer::{Mat, MatRef};

/// How the excitations combine.
#[derive(Debug, Clone)]
pub(super) struct Superposition {
    /// Row nets, in row order.
    pub(super) rows: Vec<NetId>,
    /// `n_excited × n_rows`: volts of each excited net when the row net has 1 V and floating nets no charge.
    pub(super) weights: Mat<f64>,
    /// `n_excited`: volts of each excited net when every row has 0 V and floating nets carry their given charge.
    pub(super) idle: Vec<f64>,
}

/// Settles the floating nets: with Q the free charge of the nets at one volt on each excited net,
/// `Q_ff v = -Q_fr` for a row r and `Q_ff v = q` for the given charges (`docs/formulation.md`, "Floating nets").
///
/// - `net_free`: `n_nets × n_excited`, C per V.
pub(super) fn superpose(
    mesh: &Mesh,
    charge: &Charge,
    net_free: MatRef<'_, f64>,
) -> Result<Superposition, ResultsError> {
    let role = |k: usize| mesh.nets[charge.excited[k].idx()].role;
    let count = charge.excited.len();
    let rows: Vec<usize> = (0..count).filter(|&k| role(k) == Role::Row).collect();
    let floats: Vec<usize> = (0..count).filter(|&k| matches!(role(k), Role::Float { .. })).collect();
    let mut weights = Mat::zeros(count, rows.len());
    for (r, &k) in rows.iter().enumerate() {
        weights[(k, r)] = 1.0;
    }
    let mut idle = vec![0.0; count];
    if !floats.is_empty() {
        let n = floats.len();
        let net = |k: usize| charge.excited[k].idx();
        let among = Mat::from_fn(n, n, |i, j| net_free[(net(floats[i]), floats[j])]);
        let given = |k: usize| if let Role::Float { charge } = role(k) { charge } else { 0.0 };
        // The last column is for the given charges.
        let sides = Mat::from_fn(n, rows.len() + 1, |i, c| {
            rows.get(c).map_or_else(|| given(floats[i]), |&row| -net_free[(net(floats[i]), row)])
        });
        let volts = among.partial_piv_lu().solve(&sides);
        if !(0..n).all(|i| among[(i, i)] > 0.0 && (0..volts.ncols()).all(|c| volts[(i, c)].is_finite())) {
            let nets = floats.iter().map(|&k| mesh.nets[net(k)].name.clone()).collect();
            return Err(ResultsError::UndeterminedFloat { nets });
        }
        for (i, &k) in floats.iter().enumerate() {
            for r in 0..rows.len() {
                weights[(k, r)] = volts[(i, r)];
            }
            idle[k] = volts[(i, rows.len())];
        }
    }
    Ok(Superposition { rows: rows.iter().map(|&k| charge.excited[k]).collect(), weights, idle })
}
