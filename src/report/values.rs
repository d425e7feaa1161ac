//! What several reports derive from the matrix: two-terminal values, and the neighbours of a row net.

use crate::extract::Extraction;
use crate::net::{NetId, Role};

/// A number and the half-width of its bar, SI.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Barred {
    pub(crate) value: f64,
    pub(crate) bar: f64,
}

/// Names of the row nets, in row order.
pub(crate) fn row_names(extraction: &Extraction) -> Vec<&str> {
    extraction.results.rows.iter().map(|row| name(extraction, *row)).collect()
}

/// The name of a net.
pub(crate) fn name(extraction: &Extraction, net: NetId) -> &str {
    extraction.nets.get(net.idx()).map_or("?", |net| net.name.as_str())
}

/// Entry (`i`, `j`) of the Maxwell matrix, F.
pub(crate) fn maxwell(extraction: &Extraction, i: usize, j: usize) -> Barred {
    Barred { value: extraction.results.maxwell[(i, j)], bar: extraction.bars.maxwell[(i, j)] }
}

/// Mutual capacitance of row nets `i` and `j`, or, for `i` = `j`, capacitance of row net `i` to the reference, F.
///
/// The matrix is symmetric only within its bars, a pair of nets has one capacitance: the mean of both entries, with the
/// larger of their bars.
pub(crate) fn mutual(extraction: &Extraction, i: usize, j: usize) -> Barred {
    if i == j {
        let n_rows = extraction.results.rows.len();
        let value = (0..n_rows).map(|k| extraction.results.maxwell[(i, k)]).sum();
        return Barred { value, bar: extraction.bars.to_reference.get(i).copied().unwrap_or(f64::NAN) };
    }
    let (a, b) = (maxwell(extraction, i, j), maxwell(extraction, j, i));
    Barred { value: -0.5 * (a.value + b.value), bar: a.bar.max(b.bar) }
}

/// What entry (`i`, `j`) is measured against: `sqrt(C_ii C_jj)`, F.
pub(crate) fn scale(extraction: &Extraction, i: usize, j: usize) -> f64 {
    (extraction.results.maxwell[(i, i)] * extraction.results.maxwell[(j, j)]).abs().sqrt()
}

/// The largest relative bar under the rule of the accuracy target: `bar / max(|C_ij|, floor * sqrt(C_ii C_jj))`.
pub(crate) fn worst_relative_bar(extraction: &Extraction) -> f64 {
    let n_rows = extraction.results.rows.len();
    let floor = extraction.accuracy.floor;
    (0..n_rows)
        .flat_map(|i| (0..n_rows).map(move |j| (i, j)))
        .map(|(i, j)| {
            let entry = maxwell(extraction, i, j);
            entry.bar / entry.value.abs().max(floor * scale(extraction, i, j))
        })
        .fold(0.0, f64::max)
}

/// One neighbour of a row net.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Neighbour<'a> {
    pub(crate) name: String,
    /// `None` for the rest of the reference: infinity and image planes.
    pub(crate) role: Option<&'a Role>,
    /// Minus the charge on it at 1 V on the row net: F.
    pub(crate) capacitance: Barred,
}

/// Every other net and the rest of the reference, the most charged first. Their sum is the self capacitance of the row
/// net within the bars.
pub(crate) fn neighbours(extraction: &Extraction, row: usize) -> Vec<Neighbour<'_>> {
    let own = extraction.results.rows[row];
    let charge = |k: usize| extraction.results.net_charge[(k, row)];
    let bar = |k: usize| extraction.bars.net_charge[(k, row)];
    let mut found: Vec<Neighbour<'_>> = extraction
        .nets
        .iter()
        .enumerate()
        .filter(|(k, _)| *k != own.idx())
        .map(|(k, net)| Neighbour {
            name: net.name.clone(),
            role: Some(&net.role),
            // Not -q alone: that would print a net without charge as minus zero.
            capacitance: Barred { value: 0.0 - charge(k), bar: bar(k) },
        })
        .collect();
    let grounded = |net: &crate::net::ModelNet| matches!(net.role, Role::Ground);
    let ground_bars: f64 =
        extraction.nets.iter().enumerate().filter(|(_, net)| grounded(net)).map(|(k, _)| bar(k)).sum();
    found.push(Neighbour {
        name: rest_of_reference(extraction),
        role: None,
        capacitance: Barred {
            value: (0..extraction.nets.len()).map(charge).sum(),
            bar: extraction.bars.to_reference.get(row).copied().unwrap_or(f64::NAN) + ground_bars,
        },
    });
    found.sort_by(|a, b| b.capacitance.value.abs().total_cmp(&a.capacitance.value.abs()));
    found
}

/// The names in the reference that are no nets, joined: "bottom + infinity".
fn rest_of_reference(extraction: &Extraction) -> String {
    let is_net = |name: &String| extraction.nets.iter().any(|net| net.name == *name);
    let rest: Vec<&str> =
        extraction.reference.iter().filter(|name| !is_net(name)).map(String::as_str).collect();
    if rest.is_empty() { "infinity".to_owned() } else { rest.join(" + ") }
}

/// The word for a role in files.
pub(crate) fn role_word(role: Option<&Role>) -> &'static str {
    match role {
        Some(Role::Row) => "row",
        Some(Role::Ground) => "ground",
        Some(Role::Float { .. }) => "float",
        None => "reference",
    }
}
