//! Half-widths of error bars, from the sequence of levels.
//!
//! ```text
//! bar(q) = |q_fine - q_coarse| / (gain - 1) + truncation + (chord + residual) |q|
//! ```
//! The first term is what is left when the fine mesh has 1/gain of the coarse one's error. The gain is what refinement
//! promises if each panel's share of the error fell as 1/N (`adapt::gain`). On graded meshes the measured rate is near N^-1.5
//! (`docs/formulation.md`, "Error bars"), for which the true rest is about half of that: the bar is meant to be 1 to 4
//! times the error. Two guards catch a difference that is small by accident: a quarter of what the
//! level before predicts, and a quarter of the relative bar that the two diagonal entries have.

use crate::extract::{Accuracy, Bars};
use crate::results::Results;
use faer::Mat;

/// Part of the previous level's prediction that a bar never falls below.
const PREVIOUS_SHARE: f64 = 0.25;
/// Two levels do not show how fast the sequence converges: the bar of the first pair is wider by this. Measured on two disks at a
/// gap of a tenth of their radius, where the first pair promises 0.8 % and 1.04 % is left.
const UNTRIED: f64 = 1.5;
/// Part of the diagonal bars, relative to their entries, that another bar of their rows never falls below.
const DIAGONAL_SHARE: f64 = 0.25;
/// The border of the extent is moved in by this factor to see what truncation does.
pub(crate) const BORDER_MOVE: f64 = 1.5;

/// What enters a bar besides the levels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct OtherParts {
    /// Relative error by arcs drawn as chords and by the grid.
    pub(crate) chord: f64,
    /// Relative residual of the solver.
    pub(crate) residual: f64,
}

/// One solved mesh of the sequence: its results, and the factor by which its error is taken to be below that of the mesh before.
pub(crate) type Step<'a> = (&'a Results, f64);

/// The two results of moving the border of the extent in, on one coarse mesh: whole and moved.
pub(crate) type Moved<'a> = Option<(&'a Results, &'a Results)>;

/// Bars of the values of the last step; `steps` holds two or more, coarse to fine.
///
/// A sequence of one step has no bar: every bar is infinite then.
pub(crate) fn bars(steps: &[Step<'_>], moved: Moved<'_>, other: OtherParts) -> Bars {
    let Some((fine, _)) = steps.last() else { return empty() };
    let bar = |get: &dyn Fn(&Results) -> f64, truncated: bool| {
        let truncation = if truncated { truncation(moved, get) } else { 0.0 };
        levels(steps, get) + truncation + (other.chord + other.residual) * get(fine).abs()
    };
    let n_rows = fine.rows.len();
    let mut maxwell = Mat::from_fn(n_rows, n_rows, |i, j| {
        let defect = (fine.maxwell[(i, j)] - fine.maxwell[(j, i)]).abs();
        bar(&|r| r.maxwell[(i, j)], true).max(defect)
    });
    let relative: Vec<f64> = (0..n_rows).map(|i| (maxwell[(i, i)] / fine.maxwell[(i, i)]).abs()).collect();
    for i in 0..n_rows {
        for j in 0..n_rows {
            let floor = DIAGONAL_SHARE * (relative[i] * relative[j]).sqrt() * fine.maxwell[(i, j)].abs();
            maxwell[(i, j)] = maxwell[(i, j)].max(floor);
        }
    }
    Bars {
        net_charge: Mat::from_fn(fine.net_charge.nrows(), n_rows, |k, j| {
            bar(&|r| r.net_charge[(k, j)], true)
        }),
        to_reference: (0..n_rows)
            .map(|i| {
                bar(&|r| (0..n_rows).map(|j| r.maxwell[(i, j)]).sum(), true)
                    .max(DIAGONAL_SHARE * maxwell[(i, i)])
            })
            .collect(),
        group_free: per_group(fine, |g, j| bar(&|r| r.groups[g].free[j], false)),
        group_bound: per_group(fine, |g, j| bar(&|r| r.groups[g].bound[j], false)),
        maxwell,
    }
}

/// Whether every bar of the matrix satisfies `bar_ij <= target * max(|C_ij|, floor * sqrt(C_ii C_jj))`.
pub(crate) fn meets(results: &Results, bars: &Bars, accuracy: Accuracy) -> bool {
    let n = results.maxwell.nrows();
    (0..n)
        .all(|i| (0..n).all(|j| bars.maxwell[(i, j)] <= accuracy.target * measure(results, accuracy, (i, j))))
}

/// Row, column and size of the bar that is widest against `max(|C_ij|, floor * sqrt(C_ii C_jj))`.
pub(crate) fn widest(results: &Results, bars: &Bars, accuracy: Accuracy) -> (usize, usize, f64) {
    let n = results.maxwell.nrows();
    let relative = |i, j| (i, j, bars.maxwell[(i, j)] / measure(results, accuracy, (i, j)));
    let all = (0..n).flat_map(|i| (0..n).map(move |j| (i, j))).map(|(i, j)| relative(i, j));
    all.max_by(|a, b| a.2.total_cmp(&b.2)).unwrap_or((0, 0, 0.0))
}

/// What the bar of an entry is measured by, F.
fn measure(results: &Results, accuracy: Accuracy, (i, j): (usize, usize)) -> f64 {
    let c = &results.maxwell;
    c[(i, j)].abs().max(accuracy.floor * (c[(i, i)] * c[(j, j)]).abs().sqrt())
}

fn levels(steps: &[Step<'_>], get: &dyn Fn(&Results) -> f64) -> f64 {
    let rest = |pair: &[Step<'_>]| {
        let [(coarse, _), (fine, gain)] = pair else { return f64::INFINITY };
        if *gain <= 1.0 { f64::INFINITY } else { (get(fine) - get(coarse)).abs() / (gain - 1.0) }
    };
    match steps {
        [] | [_] => f64::INFINITY,
        [.., a, b, c] => rest(&[*b, *c]).max(PREVIOUS_SHARE * rest(&[*a, *b])),
        [a, b] => UNTRIED * rest(&[*a, *b]),
    }
}

/// Error left by ending the interfaces where they end. It falls at least as R^-2 with the extent R (potential of
/// a charge ring that falls as R^-3 or faster), so what moving the border from R/m to R changed, divided by m² - 1,
/// bounds what is left.
fn truncation(moved: Moved<'_>, get: &dyn Fn(&Results) -> f64) -> f64 {
    moved.map_or(0.0, |(whole, inner)| (get(whole) - get(inner)).abs() / (BORDER_MOVE * BORDER_MOVE - 1.0))
}

fn per_group(fine: &Results, bar: impl Fn(usize, usize) -> f64) -> Vec<Vec<f64>> {
    (0..fine.groups.len()).map(|g| (0..fine.rows.len()).map(|j| bar(g, j)).collect()).collect()
}

fn empty() -> Bars {
    Bars {
        maxwell: Mat::zeros(0, 0),
        net_charge: Mat::zeros(0, 0),
        to_reference: Vec::new(),
        group_free: Vec::new(),
        group_bound: Vec::new(),
    }
}
