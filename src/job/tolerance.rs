//! The `tolerance` table of a layer: accepted, checked and carried; the reports of a later stage use it.

use crate::job::error::JobProblem;
use crate::job::keys::{LAYER_KINDS, TOLERANCE};
use crate::job::section::{Item, Notes, Section, Size};
use crate::job::stackup::{LayerQuantity, Spread, Tolerance};
use crate::units::{Unit, brief};

const QUANTITIES: [(&str, LayerQuantity); 7] = [
    ("er", LayerQuantity::Er),
    ("thickness", LayerQuantity::Thickness),
    ("side_slope", LayerQuantity::SideSlope),
    ("etch_bias", LayerQuantity::EtchBias),
    ("depth_on_laminate", LayerQuantity::DepthOnLaminate),
    ("depth_on_copper", LayerQuantity::DepthOnCopper),
    ("depth_beside_copper", LayerQuantity::DepthBesideCopper),
];

/// The tolerances in the `tolerance` table of `layer_section`, in a fixed order.
pub(super) fn read_tolerance(layer_section: Section<'_>, layer: &str, notes: &mut Notes) -> Vec<Tolerance> {
    let Some(item) = layer_section.get("tolerance") else {
        return Vec::new();
    };
    let Some(section) = item.section(&TOLERANCE, notes) else {
        return Vec::new();
    };
    notes.unused(format!("tolerance of layer `{layer}`"), item.key_span);
    check_kind_keys(section, layer_section.get("kind").and_then(Item::text).unwrap_or_default(), notes);
    QUANTITIES
        .iter()
        .filter_map(|(key, quantity)| {
            let spread = read_spread(section.get(key)?, *quantity, notes)?;
            Some(Tolerance { quantity: *quantity, spread })
        })
        .collect()
}

/// Notes the keys of `section`, a layer or its tolerances, that a layer of kind `word` does not have. An unknown word
/// is reported where it is read.
pub(super) fn check_kind_keys(section: Section<'_>, word: &str, notes: &mut Notes) {
    let Some((kind, taken)) = LAYER_KINDS.iter().find(|(kind, _)| *kind == word) else {
        return;
    };
    for (key, span) in section.keys() {
        let takers: Vec<&'static str> =
            LAYER_KINDS.iter().filter(|(_, keys)| keys.contains(&key)).map(|(kind, _)| *kind).collect();
        // Keys that no kind takes are common to all, or already refused as unknown.
        if !takers.is_empty() && !taken.contains(&key) {
            let problem = JobProblem::KeyOfOtherKind { key: key.to_owned(), kind, takers, at: span.into() };
            notes.problem(problem);
        }
    }
}

fn read_spread(item: Item<'_>, quantity: LayerQuantity, notes: &mut Notes) -> Option<Spread> {
    if item.text().is_some_and(|text| text.trim_end().ends_with('%')) {
        let ratio = item.quantity(Unit::Ratio, notes)?;
        if (0.0..1.0).contains(&ratio) {
            return Some(Spread::Relative(ratio));
        }
        item.out_of_range(brief(ratio, Unit::Ratio), "0 % to under 100 %", notes);
        return None;
    }
    let (value, unit) = match quantity {
        LayerQuantity::Er => (item.number(notes)?, None),
        LayerQuantity::SideSlope => (item.quantity(Unit::Angle, notes)?, Some(Unit::Angle)),
        _ => (item.length(Size::NotNegative, notes)?, Some(Unit::Length)),
    };
    if value >= 0.0 {
        return Some(Spread::Absolute(value));
    }
    let found = unit.map_or_else(|| value.to_string(), |unit| brief(value, unit));
    item.out_of_range(found, "zero or more", notes);
    None
}
