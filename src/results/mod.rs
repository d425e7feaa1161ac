//! [`Mesh`] and [`Charge`] to [`Results`]: what the charge says.
//!
//! Floating nets are settled here: their potentials follow from their free charge by superposition.

mod capacitance;
mod check;
mod checks;
mod error;
mod free_charge;
mod groups;
mod tail;

pub use check::{Check, CheckKind, CheckOutcome};
pub use error::ResultsError;

use crate::mesh::Mesh;
use crate::net::NetId;
use crate::results::checks::Solution;
use crate::solve::Charge;
use faer::{Mat, MatRef};

/// Reads capacitances, charges and checks from a solution.
///
/// # Errors
/// - [`ResultsError::AnotherMesh`] when `charge` is not the solution of `mesh`.
/// - [`ResultsError::UndeterminedFloat`] when the charge of the floating nets does not fix their potentials.
pub fn evaluate(mesh: &Mesh, charge: &Charge) -> Result<Results, ResultsError> {
    let (expected, found) = (mesh.panels.len(), charge.density.nrows());
    let known = charge.excited.iter().all(|net| net.idx() < mesh.nets.len());
    if expected != found || charge.excited.len() != charge.density.ncols() || !known {
        return Err(ResultsError::AnotherMesh { expected, found });
    }
    let field = free_charge::normal_field(mesh, charge.density.as_ref());
    let net_free = net_free_charge(mesh, charge.density.as_ref(), field.as_ref());
    let superposition = capacitance::superpose(mesh, charge, net_free.as_ref())?;
    let weights = &superposition.weights;
    let (density, field) = (&charge.density * weights, &field * weights);
    let net_charge = &net_free * weights;
    let mut net_potential = Mat::zeros(mesh.nets.len(), weights.ncols());
    for (k, net) in charge.excited.iter().enumerate() {
        for r in 0..weights.ncols() {
            net_potential[(net.idx(), r)] = weights[(k, r)];
        }
    }
    let rows = superposition.rows;
    let maxwell = Mat::from_fn(rows.len(), rows.len(), |i, j| net_charge[(rows[i].idx(), j)]);
    let idle = |n: usize| superposition.idle.iter().enumerate().map(|(k, v)| net_free[(n, k)] * v).sum();
    let groups = groups::group_charges(mesh, density.as_ref(), field.as_ref());
    let checks = checks::checks(&Solution {
        mesh,
        density: density.as_ref(),
        field: field.as_ref(),
        maxwell: &maxwell,
        net_charge: &net_charge,
        groups: &groups,
    });
    let idle_charge = (0..mesh.nets.len()).map(idle).collect();
    Ok(Results { rows, maxwell, net_charge, net_potential, idle_charge, groups, checks })
}

/// Free charge of every net: `n_nets × n_columns`, C.
///
/// - `density`, `field`: `n_panels × n_columns`, C/m² and V/m.
fn net_free_charge(mesh: &Mesh, density: MatRef<'_, f64>, field: MatRef<'_, f64>) -> Mat<f64> {
    let mut out = Mat::zeros(mesh.nets.len(), density.ncols());
    for (i, panel) in mesh.panels.iter().enumerate() {
        let Some(net) = panel.kind.net() else { continue };
        for c in 0..density.ncols() {
            out[(net.idx(), c)] += free_charge::free_charge(panel, density[(i, c)], field[(i, c)]);
        }
    }
    out
}

/// Everything one solved mesh says, without error bars.
#[derive(Debug, Clone)]
pub struct Results {
    /// Row nets, in row order.
    pub rows: Vec<NetId>,
    /// Maxwell capacitance matrix, `n_rows × n_rows`, F.
    pub maxwell: Mat<f64>,
    /// Free charge of every net, `n_nets × n_rows`, C at 1 V on the row net: the neighbours of each row.
    pub net_charge: Mat<f64>,
    /// Potential of every net, `n_nets × n_rows`, V: of interest for floating nets.
    pub net_potential: Mat<f64>,
    /// Free charge that each net carries with every row at 0 V, C: not zero only beside nets with given charge.
    pub idle_charge: Vec<f64>,
    /// One per face group that holds panels.
    pub groups: Vec<GroupCharge>,
    /// The physical self-checks.
    pub checks: Vec<Check>,
}

/// Charge on one face group.
#[derive(Debug, Clone, PartialEq)]
pub struct GroupCharge {
    /// The group: index into the mesh's list.
    pub group: crate::faces::GroupId,
    /// Panelled area, m².
    pub area: f64,
    /// Free charge per row excitation, C; zero on an interface.
    pub free: Vec<f64>,
    /// Bound charge per row excitation, C, on the panelled part.
    pub bound: Vec<f64>,
    /// Analytic rest of the bound charge from the end of the extent to infinity, per row excitation, C; `None` for a
    /// group that ends inside the model.
    pub tail: Option<Vec<f64>>,
}
