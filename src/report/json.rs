//! `result.json`, format `chargeskin-result/1`: every number with its bar. Keys are stable; `docs/output.md` lists them.
#![expect(non_snake_case, reason = "a key carries its unit, and units have capitals")]

use serde::Serialize;
use std::collections::BTreeMap;

use crate::extract::Extraction;
use crate::faces::GroupKind;
use crate::report::figures::{decade_above, significant, stable, stable_bar};
use crate::report::values::{self, Barred};
use crate::report::{Notes, ReportError, head};
use crate::results::{Check, CheckOutcome, GroupCharge};

/// Name and version of the format.
const FORMAT: &str = "chargeskin-result/1";

#[derive(Serialize)]
struct ResultFile<'a> {
    format: &'static str,
    title: &'a str,
    head: Head<'a>,
    nets: Vec<&'a str>,
    reference: &'a [String],
    maxwell_F: Vec<Vec<f64>>,
    maxwell_bar_F: Vec<Vec<f64>>,
    mutual_F: Vec<Vec<f64>>,
    mutual_bar_F: Vec<Vec<f64>>,
    neighbours: Vec<RowNeighbours<'a>>,
    interfaces: Vec<Interface>,
    conductor_faces: Vec<ConductorFace<'a>>,
    idle_charge_C: BTreeMap<&'a str, f64>,
    checks: Vec<CheckLine<'a>>,
    mesh: MeshLine,
    solver: SolverLine<'a>,
    warnings: Vec<&'a str>,
}

#[derive(Serialize)]
struct Head<'a> {
    dielectrics: Vec<DielectricLine<'a>>,
    frequency_Hz: Option<f64>,
    quasi_static_limit_Hz: f64,
    not_modelled: &'static str,
    stackup_tolerance: &'static str,
    nets_grounded_by_default: usize,
    nets_floating_by_default: usize,
    cut_nets: Vec<&'a str>,
    target: f64,
    floor: f64,
    target_met: bool,
}

#[derive(Serialize)]
struct DielectricLine<'a> {
    name: &'a str,
    er: f64,
    source: &'a str,
}

#[derive(Serialize)]
struct RowNeighbours<'a> {
    net: &'a str,
    self_F: f64,
    self_bar_F: f64,
    neighbours: Vec<NeighbourLine>,
}

#[derive(Serialize)]
struct NeighbourLine {
    net: String,
    role: &'static str,
    capacitance_F: f64,
    bar_F: f64,
}

#[derive(Serialize)]
struct Interface {
    name: String,
    area_m2: f64,
    bound_charge_C: Vec<f64>,
    tail_C: Option<Vec<f64>>,
    bound_charge_bar_C: Vec<f64>,
}

#[derive(Serialize)]
struct ConductorFace<'a> {
    net: &'a str,
    layer: &'a str,
    area_m2: f64,
    free_charge_C: Vec<f64>,
    free_charge_bar_C: Vec<f64>,
    bound_charge_C: Vec<f64>,
    bound_charge_bar_C: Vec<f64>,
}

#[derive(Serialize)]
struct CheckLine<'a> {
    name: &'a str,
    meaning: &'a str,
    value: Option<f64>,
    threshold: Option<f64>,
    passed: Option<bool>,
    why: Option<&'a str>,
}

#[derive(Serialize)]
struct MeshLine {
    panels: usize,
    conductor_panels: usize,
    interface_panels: usize,
    levels: usize,
}

#[derive(Serialize)]
struct SolverLine<'a> {
    method: &'a str,
    relative_residual_below: f64,
    seconds: BTreeMap<&'a str, f64>,
    peak_memory_B: Option<u64>,
}

/// The whole file, ending in a line break.
pub(crate) fn result(x: &Extraction, notes: Notes) -> Result<String, ReportError> {
    let (maxwell_F, maxwell_bar_F) = matrix(x, values::maxwell);
    let (mutual_F, mutual_bar_F) = matrix(x, values::mutual);
    let file = ResultFile {
        format: FORMAT,
        title: &x.title,
        head: head(x, notes),
        nets: values::row_names(x),
        reference: &x.reference,
        maxwell_F,
        maxwell_bar_F,
        mutual_F,
        mutual_bar_F,
        neighbours: neighbours(x),
        interfaces: interfaces(x),
        conductor_faces: conductor_faces(x),
        idle_charge_C: x
            .nets
            .iter()
            .zip(&x.results.idle_charge)
            .filter(|(_, q)| 0.0 < q.abs())
            .map(|(net, q)| (net.name.as_str(), stable(*q, 0.0, *q)))
            .collect(),
        checks: x.results.checks.iter().map(check).collect(),
        mesh: MeshLine {
            panels: x.mesh.panels,
            conductor_panels: x.mesh.conductor_panels,
            interface_panels: x.mesh.interface_panels,
            levels: x.mesh.levels,
        },
        solver: solver(x),
        warnings: x.warnings.iter().map(|warning| warning.text.as_str()).collect(),
    };
    let mut text = serde_json::to_string_pretty(&file)?;
    text.push('\n');
    Ok(text)
}

fn head(x: &Extraction, notes: Notes) -> Head<'_> {
    Head {
        dielectrics: x
            .dielectrics
            .iter()
            .map(|d| DielectricLine { name: &d.name, er: d.er, source: &d.source })
            .collect(),
        frequency_Hz: x.frequency,
        quasi_static_limit_Hz: rounded(x.quasi_static_limit, 4),
        not_modelled: head::NOT_MODELLED,
        stackup_tolerance: head::tolerance(notes),
        nets_grounded_by_default: x.defaulted.grounded,
        nets_floating_by_default: x.defaulted.floating,
        cut_nets: head::cut_rows(x),
        target: x.accuracy.target,
        floor: x.accuracy.floor,
        target_met: x.target_met,
    }
}

fn rounded(value: f64, digits: usize) -> f64 {
    significant(value, digits).parse().unwrap_or(value)
}

/// Values and bars of one matrix, `n_rows × n_rows` each.
fn matrix(x: &Extraction, entry: fn(&Extraction, usize, usize) -> Barred) -> (Vec<Vec<f64>>, Vec<Vec<f64>>) {
    let n_rows = x.results.rows.len();
    let row = |i: usize| {
        (0..n_rows)
            .map(|j| {
                let Barred { value, bar } = entry(x, i, j);
                (stable(value, bar, values::scale(x, i, j)), stable_bar(bar))
            })
            .unzip()
    };
    (0..n_rows).map(row).unzip()
}

fn neighbours(x: &Extraction) -> Vec<RowNeighbours<'_>> {
    let row_neighbours = |(row, net)| {
        let own = values::maxwell(x, row, row);
        let line = |n: values::Neighbour<'_>| NeighbourLine {
            role: values::role_word(n.role),
            capacitance_F: stable(n.capacitance.value, n.capacitance.bar, own.value),
            bar_F: stable_bar(n.capacitance.bar),
            net: n.name,
        };
        RowNeighbours {
            net,
            self_F: stable(own.value, own.bar, own.value),
            self_bar_F: stable_bar(own.bar),
            neighbours: values::neighbours(x, row).into_iter().map(line).collect(),
        }
    };
    values::row_names(x).into_iter().enumerate().map(row_neighbours).collect()
}

/// Charges per excitation, rounded against the self capacitance of the excited net at 1 V.
fn charges(x: &Extraction, charges: &[f64], bars: &[f64]) -> Vec<f64> {
    let round = |(row, (q, bar)): (usize, (&f64, &f64))| stable(*q, *bar, values::scale(x, row, row));
    charges.iter().zip(bars).enumerate().map(round).collect()
}

fn bars(bars: &[f64]) -> Vec<f64> {
    bars.iter().map(|bar| stable_bar(*bar)).collect()
}

/// Index into the bars, charge and kind of each group that holds panels.
fn groups(x: &Extraction) -> impl Iterator<Item = (usize, &GroupCharge, &GroupKind)> {
    let with_kind = |(k, group): (usize, _)| -> Option<(usize, &GroupCharge, &GroupKind)> {
        let group: &GroupCharge = group;
        Some((k, group, &x.groups.get(group.group.0 as usize)?.kind))
    };
    x.results.groups.iter().enumerate().filter_map(with_kind)
}

fn interfaces(x: &Extraction) -> Vec<Interface> {
    let mut found = Vec::new();
    for (k, group, kind) in groups(x) {
        let GroupKind::Interface { from, to } = kind else { continue };
        let half_widths = &x.bars.group_bound[k];
        found.push(Interface {
            name: format!("{from}|{to}"),
            area_m2: rounded(group.area, 9),
            bound_charge_C: charges(x, &group.bound, half_widths),
            tail_C: group.tail.as_ref().map(|tail| charges(x, tail, half_widths)),
            bound_charge_bar_C: bars(half_widths),
        });
    }
    found
}

fn conductor_faces(x: &Extraction) -> Vec<ConductorFace<'_>> {
    let mut found = Vec::new();
    for (k, group, kind) in groups(x) {
        let GroupKind::Conductor { net, layer } = kind else { continue };
        found.push(ConductorFace {
            net: values::name(x, *net),
            layer,
            area_m2: rounded(group.area, 9),
            free_charge_C: charges(x, &group.free, &x.bars.group_free[k]),
            free_charge_bar_C: bars(&x.bars.group_free[k]),
            bound_charge_C: charges(x, &group.bound, &x.bars.group_bound[k]),
            bound_charge_bar_C: bars(&x.bars.group_bound[k]),
        });
    }
    found
}

fn check(check: &Check) -> CheckLine<'_> {
    let (value, threshold, why) = match &check.outcome {
        CheckOutcome::Made { value, threshold } => {
            (Some(stable(*value, value / 10.0, 1.0)), Some(rounded(*threshold, 4)), None)
        }
        CheckOutcome::NotApplicable(why) => (None, None, Some(why.as_str())),
    };
    CheckLine {
        name: check.kind.name(),
        meaning: check.kind.meaning(),
        value,
        threshold,
        passed: check.passed(),
        why,
    }
}

fn solver(x: &Extraction) -> SolverLine<'_> {
    let mut seconds = BTreeMap::new();
    for (stage, spent) in &x.solver.seconds {
        *seconds.entry(stage.as_str()).or_insert(0.0) += spent;
    }
    seconds.values_mut().for_each(|s| *s = (*s * 1e3_f64).round() / 1e3);
    SolverLine {
        method: &x.solver.method,
        relative_residual_below: decade_above(x.solver.relative_residual),
        seconds,
        peak_memory_B: x.solver.peak_memory,
    }
}
