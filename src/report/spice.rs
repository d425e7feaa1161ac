//! `capacitance.cir`: the mutual capacitances as a SPICE subcircuit.
//!
//! Only what every dialect reads (common practice): comments are whole lines that begin with `*`, names are letters,
//! digits and underscores told apart without regard to case, values are plain numbers in F, and long lines go on after
//! a `+`. The reference is a pin, never the global node 0, so that the caller decides where it lies.

use std::fmt::Write as _;

use crate::extract::Extraction;
use crate::report::figures::{percent, stable, with_bar};
use crate::report::values::{self, Barred};
use crate::report::{Notes, head};
use crate::units::{self, Unit};

/// Longest line, in characters: some readers cut at 80.
const LINE_LIMIT: usize = 78;

/// The whole file.
pub(crate) fn subcircuit(x: &Extraction, notes: Notes) -> String {
    let names = values::row_names(x);
    let nodes = legal_nodes(&names);
    let network = Network::new(x);
    let mut text = String::new();
    comment(&mut text, &x.title);
    for (label, line) in head::lines(x, notes) {
        comment(&mut text, &format!("{label}: {line}"));
    }
    comment(&mut text, "mutual capacitances; pin ref is the reference");
    network.describe(&mut text, x);
    comment(&mut text, "node = net");
    for (node, name) in nodes.iter().zip(&names) {
        comment(&mut text, &format!("{node} = {name}"));
    }
    let pins = nodes.iter().map(String::as_str).chain(["ref"]);
    wrapped(&mut text, [".subckt chargeskin", "+"], pins);
    for (k, part) in network.parts.iter().enumerate() {
        let [a, b] = part.between.map(|node| node.map_or("ref", |i| nodes[i].as_str()));
        let Barred { value, bar } = part.capacitance;
        let picofarad = with_bar(value * 1e12, bar * 1e12);
        comment(&mut text, &format!("c{} = {picofarad} pF", k + 1));
        let _ = writeln!(text, "c{} {a} {b} {:e}", k + 1, stable(value, bar, value));
    }
    text.push_str(".ends chargeskin\n");
    text
}

/// One capacitor; `None` is the reference.
struct Part {
    between: [Option<usize>; 2],
    capacitance: Barred,
}

/// The capacitors, and what was left out.
struct Network {
    parts: Vec<Part>,
    n_lumped: usize,
    /// Sum of what was lumped, F.
    lumped: f64,
    n_negative: usize,
}

impl Network {
    /// Couplings under the floor go to the reference, which leaves the self capacitances as they are; what is negative
    /// beyond that is no capacitor and is left out.
    fn new(x: &Extraction) -> Self {
        let n_rows = x.results.rows.len();
        let mut to_reference: Vec<Barred> = (0..n_rows).map(|i| values::mutual(x, i, i)).collect();
        let mut network = Network { parts: Vec::new(), n_lumped: 0, lumped: 0.0, n_negative: 0 };
        for i in 0..n_rows {
            for j in i + 1..n_rows {
                let coupling = values::mutual(x, i, j);
                if coupling.value.abs() < x.accuracy.floor * values::scale(x, i, j) {
                    network.n_lumped += 1;
                    network.lumped += coupling.value;
                    to_reference[i].value += coupling.value;
                    to_reference[j].value += coupling.value;
                } else {
                    network.push([Some(i), Some(j)], coupling);
                }
            }
        }
        for (i, capacitance) in to_reference.into_iter().enumerate() {
            network.push([Some(i), None], capacitance);
        }
        network
    }

    fn push(&mut self, between: [Option<usize>; 2], capacitance: Barred) {
        if 0.0 < capacitance.value {
            self.parts.push(Part { between, capacitance });
        } else {
            self.n_negative += 1;
        }
    }

    fn describe(&self, text: &mut String, x: &Extraction) {
        let line = format!(
            "{} couplings under {} of sqrt(cii cjj) lumped to the reference, {} in all",
            self.n_lumped,
            percent(x.accuracy.floor),
            units::show(self.lumped, Unit::Capacitance, 2)
        );
        comment(text, &line);
        if 0 < self.n_negative {
            comment(text, &format!("{} values that came out not positive left out", self.n_negative));
        }
        if x.results.idle_charge.iter().any(|q| 0.0 < q.abs()) {
            comment(text, "the charge given to floating nets is not part of this circuit");
        }
    }
}

/// Node names that every dialect takes: a letter first, then letters, digits, underscores; told apart without regard to
/// case; never the name of the reference pin or of a global node.
fn legal_nodes(names: &[&str]) -> Vec<String> {
    const TAKEN: [&str; 3] = ["ref", "gnd", "0"];
    let mut nodes: Vec<String> = Vec::new();
    for name in names {
        let mut base: String = name
            .chars()
            .map(|c| if c.is_ascii_alphanumeric() { c.to_ascii_lowercase() } else { '_' })
            .collect();
        if !base.starts_with(|c: char| c.is_ascii_alphabetic()) || TAKEN.contains(&base.as_str()) {
            base = format!("n_{base}");
        }
        let mut node = base.clone();
        let mut turn = 2;
        while nodes.contains(&node) {
            node = format!("{base}_{turn}");
            turn += 1;
        }
        nodes.push(node);
    }
    nodes
}

/// A comment, broken at spaces where it is too long. Line breaks in names become spaces.
fn comment(text: &mut String, line: &str) {
    wrapped(text, ["*", "*  "], line.split_whitespace());
}

/// Words after the first head, and on further lines after the second. A line that is too long already for its first word
/// takes it all the same.
fn wrapped<'a>(text: &mut String, [head, further]: [&str; 2], words: impl Iterator<Item = &'a str>) {
    let mut current = head.to_owned();
    for word in words {
        if LINE_LIMIT < current.chars().count() + 1 + word.chars().count() && 1 < current.len() {
            text.push_str(&current);
            text.push('\n');
            current = further.to_owned();
        }
        current.push(' ');
        current.push_str(word);
    }
    text.push_str(&current);
    text.push('\n');
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn node_names_are_legal_and_unique_without_regard_to_case() {
        let nodes = legal_nodes(&["GND", "Net-(R1-Pad2)", "net_(r1_pad2)", "3V3", "REF", "5", "µ"]);
        assert_eq!(nodes, ["n_gnd", "net__r1_pad2_", "net__r1_pad2__2", "n_3v3", "n_ref", "n_5", "n__"]);
    }

    #[test]
    fn long_cards_go_on_after_a_plus() {
        let pins: Vec<String> = (0..40).map(|k| format!("net_number_{k}")).collect();
        let mut text = String::new();
        wrapped(&mut text, [".subckt chargeskin", "+"], pins.iter().map(String::as_str));
        assert!(text.lines().all(|line| line.len() <= LINE_LIMIT));
        assert!(text.lines().skip(1).all(|line| line.starts_with("+ ")));
        assert_eq!(text.split_whitespace().filter(|word| word.starts_with("net_")).count(), 40);
    }
}
