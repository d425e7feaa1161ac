//! [`Extraction`] to text: summary, JSON, CSV, SPICE; and the listing of what `inspect` found.
//!
//! A report adds nothing: every number is in the extraction, beside its bar. Each file format has its own structs, so
//! that a change of a handover type never changes a file by accident. Text names files nowhere; `cli` does.

mod csv;
mod error;
mod figures;
mod head;
pub mod inspect;
mod json;
#[cfg(test)]
mod sample;
mod spice;
mod summary;
mod values;

pub use error::ReportError;
pub use inspect::Inspection;
pub use summary::summary;

use crate::extract::Extraction;

/// What a report says that only the caller knows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Notes {
    /// Whether the stackup gives tolerances.
    pub stackup_tolerance: StackupTolerance,
}

/// Whether the stackup gives tolerances.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum StackupTolerance {
    /// It gives none.
    #[default]
    NotGiven,
    /// It gives some; no number in the report includes them yet.
    NotUsedYet,
}

/// One file to write: its name and its text.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ReportFile {
    /// Name inside the output directory.
    pub name: &'static str,
    /// Its whole text, UTF-8.
    pub text: String,
}

/// Every file that `extract` writes, in the order of `docs/output.md`.
///
/// # Errors
/// [`ReportError::Json`] and [`ReportError::Csv`] when a library refuses to print; no extraction is known to cause it.
pub fn files(extraction: &Extraction, notes: Notes) -> Result<Vec<ReportFile>, ReportError> {
    Ok(vec![
        ReportFile { name: "result.json", text: json::result(extraction, notes)? },
        ReportFile { name: "capacitance.csv", text: csv::capacitance(extraction)? },
        ReportFile { name: "neighbours.csv", text: csv::neighbours(extraction)? },
        ReportFile { name: "capacitance.cir", text: spice::subcircuit(extraction, notes) },
    ])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_json_has_every_stable_key() {
        let text = json::result(&sample::extraction(), Notes::default()).unwrap();
        let value: serde_json::Value = serde_json::from_str(&text).unwrap();
        for key in [
            "format",
            "title",
            "nets",
            "reference",
            "maxwell_F",
            "maxwell_bar_F",
            "mutual_F",
            "mutual_bar_F",
            "neighbours",
            "interfaces",
            "conductor_faces",
            "checks",
            "mesh",
            "solver",
            "warnings",
        ] {
            assert!(value.get(key).is_some_and(|found| !found.is_null()), "{key}");
        }
        assert_eq!(value["format"], "chargeskin-result/1");
        assert_eq!(value["maxwell_F"][0][1], -1.0004e-12);
        assert_eq!(value["mutual_F"][0][1], 1.0005e-12, "the mean of both entries");
        assert_eq!(value["interfaces"][0]["name"], "core|above");
        assert_eq!(value["checks"][1]["value"], serde_json::Value::Null);
        assert_eq!(value["checks"][1]["why"], "the model has no finite body");
    }

    /// What: the sum of a row net's neighbours is its self capacitance, as Gauss's law has it.
    /// Derived: what is not on a net is on the rest of the reference, which closes the sum.
    /// Tolerance: one rounding per net, 1e-15 of the self capacitance.  Not yet seen to fail.
    #[test]
    fn neighbours_sum_to_the_self_capacitance() {
        let x = sample::extraction();
        for row in 0..2 {
            let sum: f64 = values::neighbours(&x, row).iter().map(|n| n.capacitance.value).sum();
            assert!((sum - x.results.maxwell[(row, row)]).abs() < 4.0 * 1e-15 * sum);
        }
    }

    /// What: the circuit has the self capacitances of the matrix, lumped couplings included, and no negative element.
    /// Derived: what leaves a pair goes from each of its nodes to the reference.
    /// Tolerance: nine printed digits.  Not yet seen to fail.
    #[test]
    fn the_circuit_keeps_self_capacitances() {
        let mut x = sample::extraction();
        x.accuracy.floor = 0.9;
        let text = spice::subcircuit(&x, Notes::default());
        assert!(text.contains("1 couplings under 90 %"), "{text}");
        let elements: Vec<Vec<&str>> =
            text.lines().filter(|l| l.starts_with('c')).map(|l| l.split(' ').collect()).collect();
        assert_eq!(elements.len(), 2, "{text}");
        let to_reference: f64 = elements[0][3].parse().unwrap();
        let sum = x.results.maxwell[(0, 0)] + x.results.maxwell[(0, 1)] + values::mutual(&x, 0, 1).value;
        assert!((to_reference - sum).abs() < 1e-3 * 1e-14, "{text}");
        assert!(text.starts_with("* ") && text.ends_with(".ends chargeskin\n"));
    }

    #[test]
    fn the_summary_reads_well() {
        insta::assert_snapshot!(summary(&sample::extraction(), Notes::default()));
    }

    #[test]
    fn tables_of_numbers_read_well() {
        let x = sample::extraction();
        insta::assert_snapshot!(csv::capacitance(&x).unwrap() + &csv::neighbours(&x).unwrap());
    }

    #[test]
    fn the_circuit_reads_well() {
        insta::assert_snapshot!(spice::subcircuit(&sample::extraction(), Notes::default()));
    }
}
