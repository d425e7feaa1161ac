//! One `[[layer]]` of a stackup file.

use crate::job::error::JobProblem;
use crate::job::patch::{Stated, complete_material, patch_for, warn_idle, warn_idle_thickness};
use crate::job::permittivity::read_er;
use crate::job::section::{Item, Notes, Section, Size};
use crate::job::stackup::{Layer, LayerKind, Material, WideFace};
use crate::job::structure::Patches;
use crate::job::tolerance::{check_kind_keys, read_tolerance};
use crate::job::{MaterialPatch, Named};
use crate::units::{Unit, brief};
use std::f64::consts::FRAC_PI_2;

/// Side walls flatter than this are taken for slips, rad (5 deg).
const FLATTEST_SLOPE: f64 = 5.0 / 180.0 * std::f64::consts::PI;

/// What kind of layer a section describes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Kind {
    Open,
    Coating,
    Conductor,
    Dielectric,
}

/// A section with what its readers share.
#[derive(Debug, Clone, Copy)]
struct LayerText<'t> {
    section: Section<'t>,
    name: &'t Named,
    patch: Option<&'t MaterialPatch>,
}

/// The layer that `section` describes; `None` when it is not known well enough, and then a problem is noted.
pub(super) fn read_layer(
    section: Section<'_>,
    patches: &Patches,
    frequency: Option<f64>,
    notes: &mut Notes,
) -> Option<Layer> {
    let name = section.require("name", "a name such as `name = \"core\"`", notes).and_then(|i| i.name(notes));
    let kind = read_kind(section, notes);
    let material_name = section.get("material").and_then(|item| item.name(notes));
    let placeholder = Named { name: "this layer".to_owned(), origin: notes.origin(section.span()) };
    let shown = name.as_ref().unwrap_or(&placeholder);
    let patch = patch_for(patches, &shown.name, material_name.as_ref().map(|n| n.name.as_str()));
    let text = LayerText { section, name: shown, patch: patch.as_ref() };
    let material = read_material(text, material_name.as_ref(), frequency, kind, notes);
    let tolerance = read_tolerance(section, &shown.name, notes);
    let kind = match kind? {
        Kind::Open => material.map(|material| LayerKind::Open { material }),
        Kind::Coating => read_coating(text, material, notes),
        Kind::Conductor => read_conductor(text, notes),
        Kind::Dielectric => read_dielectric(text, material, notes),
    };
    let name = name?;
    Some(Layer { name: name.name, kind: kind?, tolerance, origin: name.origin })
}

fn read_kind(section: Section<'_>, notes: &mut Notes) -> Option<Kind> {
    let choices = [
        ("open", Kind::Open),
        ("coating", Kind::Coating),
        ("conductor", Kind::Conductor),
        ("dielectric", Kind::Dielectric),
    ];
    let item = section.require(
        "kind",
        "`kind = \"open\"`, `\"coating\"`, `\"conductor\"` or `\"dielectric\"`",
        notes,
    )?;
    let kind = item.word(&choices, notes)?;
    let word = choices.iter().find(|(_, k)| *k == kind).map_or("", |(word, _)| *word);
    check_kind_keys(section, word, notes);
    Some(kind)
}

/// The material of a layer that has one.
fn read_material(
    text: LayerText<'_>,
    material_name: Option<&Named>,
    frequency: Option<f64>,
    kind: Option<Kind>,
    notes: &mut Notes,
) -> Option<Material> {
    let section = text.section;
    let er_item = section.get("er");
    let er = er_item.and_then(|item| read_er(item, frequency, "stackup", notes));
    let loss_tangent = section.get("loss_tangent").and_then(|item| read_loss_tangent(item, notes));
    let conductivity =
        section.get("conductivity").and_then(|item| not_negative(item, Unit::Conductivity, notes));
    let strength = section.get("strength").and_then(|item| read_strength(item, notes));
    if matches!(kind, Some(Kind::Conductor) | None) || (er_item.is_some() && er.is_none()) {
        return None;
    }
    for (value, key) in
        [(loss_tangent, "loss_tangent"), (conductivity, "conductivity"), (strength, "strength")]
    {
        if let Some(item) = section.get(key).filter(|_| value.is_some_and(|v| v > 0.0)) {
            notes.unused(format!("{key} of layer `{}`", text.name.name), item.key_span);
        }
    }
    let stated = Stated {
        layer: &text.name.name,
        material: material_name.map(|n| n.name.as_str()),
        er,
        loss_tangent,
        vacuum_when_unsaid: kind == Some(Kind::Open),
        at: text.name.origin.span,
    };
    let material = complete_material(stated, text.patch, notes)?;
    Some(Material { conductivity, strength: material.strength.or(strength), ..material })
}

/// A loss tangent: zero or more, and far below the hundreds of a conductor.
pub(super) fn read_loss_tangent(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let value = item.number(notes)?;
    if (0.0..=100.0).contains(&value) {
        return Some(value);
    }
    item.out_of_range(value.to_string(), "0 to 100", notes);
    None
}

/// A dielectric strength, V/m.
pub(super) fn read_strength(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let value = item.quantity(Unit::FieldStrength, notes)?;
    if value > 0.0 {
        return Some(value);
    }
    item.out_of_range(brief(value, Unit::FieldStrength), "more than 0 V/m", notes);
    None
}

fn not_negative(item: Item<'_>, unit: Unit, notes: &mut Notes) -> Option<f64> {
    let value = item.quantity(unit, notes)?;
    if value >= 0.0 {
        return Some(value);
    }
    item.out_of_range(brief(value, unit), "zero or more", notes);
    None
}

fn read_coating(text: LayerText<'_>, material: Option<Material>, notes: &mut Notes) -> Option<LayerKind> {
    let section = text.section;
    let patched = |value: fn(&MaterialPatch) -> Option<f64>| text.patch.and_then(value);
    let on_laminate = read_depth(section, "depth_on_laminate", patched(|patch| patch.thickness), notes);
    let on_copper = read_depth(section, "depth_on_copper", patched(|patch| patch.depth_on_copper), notes);
    let beside = read_depth(section, "depth_beside_copper", on_copper, notes);
    if section.get("depth_on_laminate").is_some() {
        warn_idle_thickness(text.patch, &text.name.name, notes);
    }
    // A depth that is there but wrong is reported where it is read.
    if on_laminate.is_none() {
        section.require("depth_on_laminate", "a depth such as `depth_on_laminate = \"25 um\"`", notes);
    }
    if on_copper.is_none() {
        section.require("depth_on_copper", "a depth such as `depth_on_copper = \"12 um\"`", notes);
    }
    let (depth_on_laminate, depth_on_copper, depth_beside_copper) = (on_laminate?, on_copper?, beside?);
    if depth_on_laminate <= 0.0 && depth_on_copper <= 0.0 {
        let item = section.get("depth_on_laminate").or(section.get("depth_on_copper"))?;
        item.out_of_range("0 um, as on copper".to_owned(), "more than zero on laminate or on copper", notes);
        return None;
    }
    Some(LayerKind::Coating { material: material?, depth_on_laminate, depth_on_copper, depth_beside_copper })
}

/// The depth under `key`, else `other`.
fn read_depth(section: Section<'_>, key: &'static str, other: Option<f64>, notes: &mut Notes) -> Option<f64> {
    match section.get(key) {
        Some(item) => item.length(Size::NotNegative, notes),
        None => other,
    }
}

fn read_conductor(text: LayerText<'_>, notes: &mut Notes) -> Option<LayerKind> {
    let section = text.section;
    let thickness = read_thickness(text, Size::NotNegative, notes);
    let slope_item = section.get("side_slope");
    let side_slope = match slope_item {
        Some(item) => read_slope(item, notes),
        None => Some(FRAC_PI_2),
    };
    let words = [("upper", WideFace::Upper), ("lower", WideFace::Lower)];
    let wide_face = match section.get("wide_face") {
        Some(item) => item.word(&words, notes),
        None => Some(WideFace::OnCore),
    };
    let etch_bias = match section.get("etch_bias") {
        Some(item) => item.length(Size::Signed, notes),
        None => Some(0.0),
    };
    let fill = section.get("fill").and_then(|item| item.name(notes));
    warn_idle(text.patch, &text.name.name, notes);
    let thickness = thickness?;
    if let Some(item) = slope_item.filter(|_| thickness <= 0.0) {
        let text = format!("`side_slope` has no effect on `{}`, a sheet of no thickness", text.name.name);
        notes.warn(text, item.key_span);
    }
    Some(LayerKind::Conductor {
        thickness,
        fill,
        side_slope: side_slope?,
        wide_face: wide_face?,
        etch_bias: etch_bias?,
    })
}

fn read_slope(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let angle = item.quantity(Unit::Angle, notes)?;
    // "90 deg" may round to just above a right angle.
    if (FLATTEST_SLOPE * (1.0 - 1e-12)..=FRAC_PI_2 * (1.0 + 1e-12)).contains(&angle) {
        return Some(angle.min(FRAC_PI_2));
    }
    item.out_of_range(brief(angle, Unit::Angle), "5 deg to 90 deg, where 90 deg is upright", notes);
    None
}

fn read_dielectric(text: LayerText<'_>, material: Option<Material>, notes: &mut Notes) -> Option<LayerKind> {
    let section = text.section;
    let thickness = read_thickness(text, Size::Positive, notes);
    let stated = match section.get("prepreg") {
        Some(item) => item.flag(notes),
        None => Some(false),
    };
    let prepreg = text.patch.and_then(|patch| patch.prepreg).or(stated);
    let fill = section.get("fill").and_then(|item| item.name(notes));
    let pattern = section.get("pattern").and_then(|item| item.name(notes));
    Some(LayerKind::Dielectric {
        material: material?,
        thickness: thickness?,
        prepreg: prepreg?,
        fill,
        pattern,
    })
}

/// The thickness stated, else the job's.
fn read_thickness(text: LayerText<'_>, size: Size, notes: &mut Notes) -> Option<f64> {
    let layer = text.name.name.clone();
    let Some(item) = text.section.get("thickness") else {
        let patched = text.patch.and_then(|patch| patch.thickness);
        if patched.is_none() {
            notes.problem(JobProblem::MissingThickness { layer, at: text.name.origin.span.into() });
        }
        return patched;
    };
    warn_idle_thickness(text.patch, &layer, notes);
    let thickness = item.length(Size::NotNegative, notes)?;
    if size == Size::Positive && thickness <= 0.0 {
        let found = brief(thickness, Unit::Length);
        notes.problem(JobProblem::ZeroThickness { layer, found, at: item.span().into() });
        return None;
    }
    Some(thickness)
}
