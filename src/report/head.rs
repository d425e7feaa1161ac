//! The head of every report: what the numbers stand on, and what they leave out.

use crate::extract::Extraction;
use crate::report::figures::{percent, significant};
use crate::report::values;
use crate::report::{Notes, StackupTolerance};
use crate::units::{self, Unit};

/// What no number includes, in the words of every head.
pub(crate) const NOT_MODELLED: &str = "roughness, weave and anisotropy not modelled";

/// Label and text of each line.
pub(crate) fn lines(extraction: &Extraction, notes: Notes) -> Vec<(&'static str, String)> {
    let frequency = extraction.frequency.map_or_else(
        || "not given; permittivities as they stand".to_owned(),
        |f| units::brief(f, Unit::Frequency),
    );
    let dielectrics: Vec<String> = extraction
        .dielectrics
        .iter()
        .map(|d| format!("{} {} ({})", d.name, significant(d.er, 6), d.source))
        .collect();
    let mut lines = vec![
        ("rows", values::row_names(extraction).join(", ")),
        ("reference", reference(extraction)),
        ("permittivity", dielectrics.join(", ")),
        ("frequency", frequency),
        ("left out", NOT_MODELLED.to_owned()),
        (
            "valid to",
            format!(
                "{}, up to which the region is electrically small",
                units::show(extraction.quasi_static_limit, Unit::Frequency, 3)
            ),
        ),
        ("by default", defaulted(extraction)),
    ];
    let cut: Vec<&str> = cut_rows(extraction);
    if !cut.is_empty() {
        lines.push(("cut nets", format!("{}: self capacitance inside the window only", cut.join(", "))));
    }
    lines.push(("accuracy", accuracy(extraction, notes)));
    lines
}

/// Row nets that the border of the region cuts.
pub(crate) fn cut_rows(extraction: &Extraction) -> Vec<&str> {
    let rows = &extraction.results.rows;
    rows.iter()
        .filter_map(|row| extraction.nets.get(row.idx()))
        .filter(|net| net.cut)
        .map(|net| net.name.as_str())
        .collect()
}

fn reference(extraction: &Extraction) -> String {
    if extraction.reference.len() == 1 {
        return format!("reference is {}", extraction.reference[0]);
    }
    extraction.reference.join(", ")
}

fn defaulted(extraction: &Extraction) -> String {
    let (grounded, floating) = (extraction.defaulted.grounded, extraction.defaulted.floating);
    format!("named nets grounded: {grounded}; unnamed pieces of copper floating: {floating}")
}

/// "numerical 0.3 % (target 1 %, met); stackup tolerance not given".
fn accuracy(extraction: &Extraction, notes: Notes) -> String {
    let met = if extraction.target_met { "met" } else { "NOT met" };
    format!(
        "numerical {} (target {}, {met}); {}",
        percent(values::worst_relative_bar(extraction)),
        percent(extraction.accuracy.target),
        tolerance(notes)
    )
}

/// What the stackup's tolerances do to the numbers.
pub(crate) fn tolerance(notes: Notes) -> &'static str {
    match notes.stackup_tolerance {
        StackupTolerance::NotGiven => "stackup tolerance not given",
        StackupTolerance::NotUsedYet => "stackup tolerance given, not used yet",
    }
}
