//! [`Mesh`](crate::mesh::Mesh) and [`Charge`](crate::solve::Charge) to [`Results`]: what the charge says.
//!
//! Floating nets are settled here: their potentials follow from their free charge by superposition.

use crate::net::NetId;
use faer::Mat;

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

/// A physical self-check.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    /// Stable name for `result.json`.
    pub name: String,
    /// What it compares, for people.
    pub meaning: String,
    /// Its value and what follows from it.
    pub outcome: CheckOutcome,
}

/// The outcome of a check.
#[derive(Debug, Clone, PartialEq)]
pub enum CheckOutcome {
    /// It was made.
    Made {
        /// The measured defect, a ratio.
        value: f64,
        /// Largest defect that passes.
        threshold: f64,
    },
    /// It says nothing about this model.
    NotApplicable(
        /// Why.
        String,
    ),
}

impl Check {
    /// Whether the check passed; `None` when it does not apply.
    #[must_use]
    pub fn passed(&self) -> Option<bool> {
        match self.outcome {
            CheckOutcome::Made { value, threshold } => Some(value <= threshold),
            CheckOutcome::NotApplicable(_) => None,
        }
    }
}
