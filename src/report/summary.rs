//! The summary that a person reads: head, matrices, neighbours, interfaces, checks, mesh, warnings.

use std::fmt::Write as _;

use crate::extract::Extraction;
use crate::faces::GroupKind;
use crate::report::figures::{memory, percent, significant, with_bar};
use crate::report::values::{self, Barred, Neighbour};
use crate::report::{Notes, head};
use crate::results::CheckOutcome;
use crate::units::{self, Unit};

/// Widest table that is printed, in columns; the files hold the rest.
const MAX_COLUMNS: usize = 8;
/// Neighbours that are printed one by one.
const MAX_NEIGHBOURS: usize = 8;

/// The whole summary, ending in a line break.
#[must_use]
pub fn summary(extraction: &Extraction, notes: Notes) -> String {
    let mut text = format!("{}\n\n", extraction.title);
    for (label, line) in head::lines(extraction, notes) {
        push(&mut text, &format!("  {label:<13} {line}"));
    }
    matrix(&mut text, extraction, "Maxwell capacitance matrix", values::maxwell);
    matrix(&mut text, extraction, "Mutual capacitance (diagonal: to the reference)", values::mutual);
    for row in 0..extraction.results.rows.len().min(MAX_COLUMNS) {
        neighbours(&mut text, extraction, row);
    }
    interfaces(&mut text, extraction);
    idle(&mut text, extraction);
    checks(&mut text, extraction);
    mesh(&mut text, extraction);
    for warning in &extraction.warnings {
        push(&mut text, &format!("warning: {}", warning.text));
    }
    text
}

fn push(text: &mut String, line: &str) {
    text.push_str(line.trim_end());
    text.push('\n');
}

/// One table of the matrix kind, in the unit that suits its largest entry.
fn matrix(text: &mut String, x: &Extraction, title: &str, entry: fn(&Extraction, usize, usize) -> Barred) {
    let names = values::row_names(x);
    let n_shown = names.len().min(MAX_COLUMNS);
    let largest = (0..names.len())
        .flat_map(|i| (0..names.len()).map(move |j| (i, j)))
        .map(|(i, j)| entry(x, i, j).value.abs());
    let (unit, symbol) = units::scale(largest.fold(0.0, f64::max), Unit::Capacitance);
    push(text, &format!("\n{title}, {symbol}"));
    let mut table =
        vec![std::iter::once("").chain(names.iter().copied()).map(str::to_owned).take(n_shown + 1).collect()];
    for (i, name) in names.iter().enumerate().take(n_shown) {
        let cells = (0..n_shown).map(|j| {
            let Barred { value, bar } = entry(x, i, j);
            with_bar(value / unit, bar / unit)
        });
        table.push(std::iter::once((*name).to_owned()).chain(cells).collect());
    }
    aligned(text, &table);
    if n_shown < names.len() {
        push(text, &format!("  ({n_shown} of {} nets; all of them in capacitance.csv)", names.len()));
    }
}

/// Prints a table: first column to the left, the others to the right.
fn aligned(text: &mut String, table: &[Vec<String>]) {
    let n_columns = table.iter().map(Vec::len).max().unwrap_or(0);
    let width = |k: usize| table.iter().filter_map(|row| row.get(k)).map(|cell| cell.chars().count()).max();
    let widths: Vec<usize> = (0..n_columns).map(|k| width(k).unwrap_or(0)).collect();
    for row in table {
        let mut line = String::from(" ");
        for (k, cell) in row.iter().enumerate() {
            let space = widths[k] - cell.chars().count();
            let (before, after) = if k == 0 { (0, space) } else { (space + 1, 0) };
            let _ = write!(line, " {:before$}{cell}{:after$}", "", "");
        }
        push(text, &line);
    }
}

fn neighbours(text: &mut String, x: &Extraction, row: usize) {
    let Barred { value: own, bar } = values::maxwell(x, row, row);
    let (unit, symbol) = units::scale(own, Unit::Capacitance);
    let shown = |b: &Barred| with_bar(b.value / unit, b.bar / unit);
    let title = format!(
        "\nNeighbours of {}, {symbol} (self {})",
        values::row_names(x)[row],
        shown(&Barred { value: own, bar })
    );
    push(text, &title);
    let all = values::neighbours(x, row);
    let table: Vec<Vec<String>> = all
        .iter()
        .take(MAX_NEIGHBOURS)
        .map(|n: &Neighbour<'_>| {
            let part = percent(n.capacitance.value / own);
            vec![n.name.clone(), shown(&n.capacitance), part, values::role_word(n.role).to_owned()]
        })
        .collect();
    aligned(text, &table);
    if MAX_NEIGHBOURS < all.len() {
        let rest: f64 = all[MAX_NEIGHBOURS..].iter().map(|n| n.capacitance.value).sum();
        let line = format!(
            "  and {} more, together {}; all of them in neighbours.csv",
            all.len() - MAX_NEIGHBOURS,
            percent(rest / own)
        );
        push(text, &line);
    }
}

/// Bound charge per interface and excitation.
fn interfaces(text: &mut String, x: &Extraction) {
    let n_shown = x.results.rows.len().min(MAX_COLUMNS);
    let found: Vec<(usize, String)> = x
        .results
        .groups
        .iter()
        .enumerate()
        .filter_map(|(k, group)| match &x.groups.get(group.group.0 as usize)?.kind {
            GroupKind::Interface { from, to } => Some((k, format!("{from}|{to}"))),
            GroupKind::Conductor { .. } => None,
        })
        .collect();
    if found.is_empty() {
        return;
    }
    let largest =
        found.iter().flat_map(|(k, _)| &x.results.groups[*k].bound).map(|q| q.abs()).fold(0.0, f64::max);
    let (unit, symbol) = units::scale(largest, Unit::Charge);
    let title = "Bound charge on interfaces (from|to along the normal)";
    push(text, &format!("\n{title}, {symbol} at 1 V on each row net"));
    let names = values::row_names(x);
    let mut table: Vec<Vec<String>> =
        vec![["", "area"].into_iter().chain(names).take(n_shown + 2).map(str::to_owned).collect()];
    for (k, name) in found {
        let group = &x.results.groups[k];
        let bars = &x.bars.group_bound[k];
        let cells = group.bound.iter().zip(bars).take(n_shown);
        let cells = cells.map(|(q, bar)| with_bar(q / unit, bar / unit));
        table.push([name, units::show(group.area, Unit::Area, 4)].into_iter().chain(cells).collect());
        if let Some(tail) = &group.tail {
            let cells = tail.iter().take(n_shown).map(|q| significant(q / unit, 2));
            table
                .push(["  beyond, to infinity".to_owned(), String::new()].into_iter().chain(cells).collect());
        }
    }
    aligned(text, &table);
}

/// Charge that is there with every row at 0 V, beside nets of given charge.
fn idle(text: &mut String, x: &Extraction) {
    let charged = x.nets.iter().zip(&x.results.idle_charge).filter(|(_, q)| 0.0 < q.abs());
    let table: Vec<Vec<String>> =
        charged.map(|(net, q)| vec![net.name.clone(), units::show(*q, Unit::Charge, 4)]).collect();
    if !table.is_empty() {
        push(text, "\nFree charge with every row net at 0 V, from nets of given charge");
        aligned(text, &table);
    }
}

fn checks(text: &mut String, x: &Extraction) {
    push(text, "\nChecks");
    let table: Vec<Vec<String>> = x
        .results
        .checks
        .iter()
        .map(|check| {
            let (word, what) = match &check.outcome {
                CheckOutcome::Made { value, threshold } => {
                    let word = if check.passed() == Some(true) { "passed" } else { "FAILED" };
                    (word, format!("{}, at most {}", defect(*value), significant(*threshold, 2)))
                }
                CheckOutcome::NotApplicable(why) => ("-", format!("not applicable: {why}")),
            };
            vec![format!("{word:<6}  {}", check.kind), format!("{what} ({})", check.kind.meaning())]
        })
        .collect();
    let width = table.iter().map(|row| row[0].chars().count()).max().unwrap_or(0);
    for row in &table {
        push(text, &format!("  {:<width$}  {}", row[0], row[1]));
    }
}

/// A defect, without the digits that are rounding.
fn defect(value: f64) -> String {
    if value.abs() < 1e-9 { "below 1e-9".to_owned() } else { significant(value, 2) }
}

fn mesh(text: &mut String, x: &Extraction) {
    let count = &x.mesh;
    let line = format!(
        "\nMesh: {} panels ({} on conductors, {} on interfaces), {} levels; {}",
        count.panels, count.conductor_panels, count.interface_panels, count.levels, x.solver.method
    );
    push(text, &line);
    let total: f64 = x.solver.seconds.iter().map(|(_, s)| s).sum();
    let memory =
        x.solver.peak_memory.map_or_else(String::new, |bytes| format!("; peak memory {}", memory(bytes)));
    push(text, &format!("Time: {total:.1} s{memory}"));
}
