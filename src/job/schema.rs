//! JSON Schemas of the job file and the stackup file, so that editors can complete and explain their keys.
//!
//! The structs here are only described, never filled: the readers report problems with their places, which derived
//! reading does not. A test holds these structs to the key lists of the readers.
#![expect(dead_code, reason = "the structs are described, never filled")]

use crate::units::Unit;
use schemars::generate::SchemaSettings;
use schemars::transform::RecursiveTransform;
use schemars::{JsonSchema, Schema, SchemaGenerator, json_schema};
use std::borrow::Cow;
use std::collections::BTreeMap;

/// Which file a schema describes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SchemaKind {
    /// The job file.
    Job,
    /// The stackup file.
    Stackup,
}

/// The JSON Schema (draft 7, which most editors know) of a file, as indented text.
#[must_use]
pub fn schema(which: SchemaKind) -> String {
    let generator = SchemaSettings::draft07().with_transform(RecursiveTransform(drop_null)).into_generator();
    let schema = match which {
        SchemaKind::Job => generator.into_root_schema_for::<JobFile>(),
        SchemaKind::Stackup => generator.into_root_schema_for::<StackupFile>(),
    };
    format!("{:#}", schema.to_value())
}

/// TOML has no null: a key that may be left out is left out.
fn drop_null(schema: &mut Schema) {
    let null = serde_json::json!("null");
    if let Some(types) = schema.get_mut("type").and_then(|types| types.as_array_mut()) {
        types.retain(|name| *name != null);
        if let [only] = types.as_slice() {
            let only = only.clone();
            schema.insert("type".to_owned(), only);
        }
    }
    let is_null = |choice: &serde_json::Value| choice.get("type") == Some(&null);
    if let Some(choices) = schema.get_mut("anyOf").and_then(|choices| choices.as_array_mut()) {
        choices.retain(|choice| !is_null(choice));
        if choices.len() == 1 {
            // Draft 7 ignores what stands beside `$ref`, so that the description must keep the choice around it.
            let only = serde_json::Value::Array(std::mem::take(choices));
            schema.remove("anyOf");
            schema.insert("allOf".to_owned(), only);
        }
    }
}

/// A string type for each quantity: its pattern comes from the unit table.
macro_rules! quantity {
    ($name:ident, $unit:expr) => {
        struct $name;

        impl JsonSchema for $name {
            fn schema_name() -> Cow<'static, str> {
                stringify!($name).into()
            }

            fn json_schema(_: &mut SchemaGenerator) -> Schema {
                quantity_schema($unit)
            }
        }
    };
}

quantity!(Length, Unit::Length);
quantity!(Frequency, Unit::Frequency);
quantity!(Ratio, Unit::Ratio);
quantity!(Conductivity, Unit::Conductivity);
quantity!(FieldStrength, Unit::FieldStrength);
quantity!(Charge, Unit::Charge);
quantity!(Angle, Unit::Angle);

fn quantity_schema(unit: Unit) -> Schema {
    // Both micro signs and the degree sign are read as well.
    let symbols = unit.symbols().join("|").replace('u', "[u\u{b5}\u{3bc}]").replace("deg", "(deg|\u{b0})");
    json_schema!({
        "type": "string",
        "description": format!("{} with its unit: {}", unit.what(), unit.symbols().join(", ")),
        "pattern": format!("^\\s*[-+]?([0-9]+\\.?[0-9]*|\\.[0-9]+)([eE][-+]?[0-9]+)?\\s*({symbols})\\s*$"),
        "examples": [unit.example()],
    })
}

type Point = [Length; 2];

/// A job of chargeskin: what to extract from which artwork and stackup.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct JobFile {
    /// Free text, for the heads of the reports.
    title: Option<String>,
    /// Path of the stackup, TOML or Gerber job file, relative to this file.
    stackup: String,
    /// Frequency at which tables of permittivity are read.
    frequency: Option<Frequency>,
    /// Where the artwork lies.
    artwork: Option<ArtworkTable>,
    /// Artwork drawn right here.
    shape: Option<Vec<ShapeTable>>,
    /// What part of the artwork is modelled; all of it when left out.
    region: Option<RegionTable>,
    /// What each net does.
    nets: Option<NetsTable>,
    /// Completes or overrides the stackup, by layer or material name.
    materials: Option<BTreeMap<String, MaterialTable>>,
    /// When refinement stops.
    accuracy: Option<AccuracyTable>,
}

/// Where the artwork lies. Paths are relative to the job file.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct ArtworkTable {
    /// Folder whose files are found by their own attributes.
    folder: Option<String>,
    /// Files listed one by one.
    files: Option<Vec<FileTable>>,
    /// IPC-D-356A netlist.
    netlist: Option<String>,
}

/// A file of artwork or drill holes.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct FileTable {
    /// Path of the file.
    path: String,
    /// Stackup layer whose artwork it is.
    layer: Option<String>,
    /// What it is, when it is no layer.
    role: Option<FileRole>,
    /// Whether the holes are plated; left out: as the file says.
    plated: Option<bool>,
    /// Uppermost conductor layer of the holes; left out: as the file says, else the top.
    from: Option<String>,
    /// Lowest conductor layer of the holes; left out: as the file says, else the bottom.
    to: Option<String>,
    /// What the tool diameter means; `drilled` when left out.
    hole: Option<HoleWord>,
    /// Thickness of the metal in finished holes.
    plating: Option<Length>,
}

#[derive(JsonSchema)]
#[schemars(rename_all = "kebab-case")]
enum FileRole {
    Profile,
    Drill,
    BackDrill,
}

#[derive(JsonSchema)]
#[schemars(rename_all = "lowercase")]
enum HoleWord {
    Drilled,
    Finished,
}

/// A shape: exactly one of `rectangle`, `circle`, `polygon`, `stroke`.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct ShapeTable {
    /// Its net; left out on a dielectric layer, where the shape is the layer's pattern.
    net: Option<String>,
    /// The layer it lies in.
    layer: String,
    /// Further layers with the same outline: posts and anchors.
    through: Option<Vec<String>>,
    /// Two opposite corners.
    rectangle: Option<RectangleTable>,
    /// Centre and diameter.
    circle: Option<CircleTable>,
    /// Corners in order.
    polygon: Option<Vec<Point>>,
    /// A path drawn with a round pen.
    stroke: Option<StrokeTable>,
    /// Outlines cut out of it.
    holes: Option<Vec<HoleTable>>,
}

/// An outline cut out: exactly one of its keys.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct HoleTable {
    /// Two opposite corners.
    rectangle: Option<RectangleTable>,
    /// Centre and diameter.
    circle: Option<CircleTable>,
    /// Corners in order.
    polygon: Option<Vec<Point>>,
    /// A path drawn with a round pen.
    stroke: Option<StrokeTable>,
}

#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct RectangleTable {
    /// One corner.
    from: Point,
    /// The opposite corner.
    to: Point,
}

#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct CircleTable {
    /// Centre.
    at: Point,
    /// Diameter.
    diameter: Length,
}

#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct StrokeTable {
    /// Points of the path, two or more.
    path: Vec<Point>,
    /// Diameter of the pen.
    width: Length,
}

/// What part of the artwork is modelled: `around` or `window`.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct RegionTable {
    /// Nets whose copper is modelled, with everything within `margin`.
    around: Option<Vec<String>>,
    /// How far around; left out: from the accuracy target and the height to the nearest plane.
    margin: Option<Length>,
    /// Two opposite corners.
    window: Option<[Point; 2]>,
}

/// What each net does.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct NetsTable {
    /// Nets at 0 V: the reference.
    ground: Option<Vec<String>>,
    /// Nets with a row each in the matrix, in this order; left out: every net of the region without another part.
    rows: Option<Vec<String>>,
    /// What named nets do that no list mentions; `ground` when left out.
    others: Option<OthersWord>,
    /// Nets of unknown potential and given net charge.
    float: Option<Vec<FloatTable>>,
    /// Groups of nets that are tied together outside the region.
    join: Option<Vec<Vec<String>>>,
    /// Names for copper that carries none.
    label: Option<Vec<LabelTable>>,
    /// One or two conductor layers that are unbroken infinite planes at 0 V, done by images.
    ground_plane: Option<OneOrTwo>,
}

#[derive(JsonSchema)]
#[schemars(rename_all = "lowercase")]
enum OthersWord {
    Ground,
    Float,
    Rows,
}

#[derive(JsonSchema)]
#[schemars(untagged)]
enum OneOrTwo {
    One(String),
    Two(Vec<String>),
}

#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct FloatTable {
    /// The net.
    net: String,
    /// Its net free charge; zero when left out.
    charge: Option<Charge>,
}

#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct LabelTable {
    /// The name to give.
    net: String,
    /// The layer to look at.
    layer: String,
    /// A point on the copper.
    at: Point,
}

/// What is known about a material or a layer.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct MaterialTable {
    /// Relative permittivity.
    er: Option<Er>,
    /// Loss tangent.
    loss_tangent: Option<f64>,
    /// Dielectric strength.
    strength: Option<FieldStrength>,
    /// Thickness of a layer that has none of its own.
    thickness: Option<Length>,
    /// Depth of a coating on the copper's top.
    depth_on_copper: Option<Length>,
    /// Whether the dielectric flows between the copper of the adjoining inner layer.
    prepreg: Option<bool>,
}

/// Relative permittivity: a number, or pairs of frequency and number in rising order.
#[derive(JsonSchema)]
#[schemars(untagged)]
enum Er {
    Number(f64),
    Table(Vec<(Frequency, f64)>),
}

/// When refinement stops.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct AccuracyTable {
    /// Relative error bar wanted on each entry of the matrix; 1 % when left out.
    target: Option<Ratio>,
    /// Entries below this fraction of the mean of their diagonal entries are judged against it; 1 % when left out.
    floor: Option<Ratio>,
}

/// A stackup for chargeskin, from top to bottom as on a fabrication drawing.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct StackupFile {
    /// The layers, from top to bottom.
    layer: Vec<LayerTable>,
}

/// A layer. Which keys have a meaning depends on `kind`.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct LayerTable {
    /// Unique in the stackup.
    name: String,
    /// What it is.
    kind: KindWord,
    /// Relative permittivity, of all but conductors.
    er: Option<Er>,
    /// Name of the material, by which the job's `[materials]` may complete it.
    material: Option<String>,
    /// Loss tangent.
    loss_tangent: Option<f64>,
    /// Conductivity.
    conductivity: Option<Conductivity>,
    /// Dielectric strength.
    strength: Option<FieldStrength>,
    /// Thickness of a conductor (zero: a sheet) or, copper face to copper face, of a dielectric.
    thickness: Option<Length>,
    /// Whether this dielectric flows between the copper of the adjoining inner layer.
    prepreg: Option<bool>,
    /// Layer whose material lies where this layer's copper or pattern is absent.
    fill: Option<String>,
    /// Artwork outside of which this dielectric is absent.
    pattern: Option<String>,
    /// Angle of the copper's side walls from the horizontal; 90 deg, upright, when left out.
    side_slope: Option<Angle>,
    /// Which face of the copper has the width of the artwork; left out: the one on its core.
    wide_face: Option<FaceWord>,
    /// Outward shift of every edge of the artwork; negative where etching takes away.
    etch_bias: Option<Length>,
    /// Thickness of a coating where there is no copper.
    depth_on_laminate: Option<Length>,
    /// Thickness of a coating on the copper's top.
    depth_on_copper: Option<Length>,
    /// Thickness of a coating beside the copper's walls; as on copper when left out.
    depth_beside_copper: Option<Length>,
    /// How far quantities may be off to either side.
    tolerance: Option<ToleranceTable>,
}

#[derive(JsonSchema)]
#[schemars(rename_all = "lowercase")]
enum KindWord {
    Open,
    Coating,
    Conductor,
    Dielectric,
}

#[derive(JsonSchema)]
#[schemars(rename_all = "lowercase")]
enum FaceWord {
    Upper,
    Lower,
}

/// Half-widths: a percentage of the nominal value, or a value in the unit of the quantity.
#[derive(JsonSchema)]
#[schemars(deny_unknown_fields)]
struct ToleranceTable {
    /// Of the permittivity.
    er: Option<NumberOrRatio>,
    /// Of the thickness.
    thickness: Option<LengthOrRatio>,
    /// Of the angle of the side walls.
    side_slope: Option<AngleOrRatio>,
    /// Of the shift of the edges.
    etch_bias: Option<LengthOrRatio>,
    /// Of a coating where there is no copper.
    depth_on_laminate: Option<LengthOrRatio>,
    /// Of a coating on the copper's top.
    depth_on_copper: Option<LengthOrRatio>,
    /// Of a coating beside the copper.
    depth_beside_copper: Option<LengthOrRatio>,
}

#[derive(JsonSchema)]
#[schemars(untagged)]
enum NumberOrRatio {
    Number(f64),
    Ratio(Ratio),
}

#[derive(JsonSchema)]
#[schemars(untagged)]
enum LengthOrRatio {
    Length(Length),
    Ratio(Ratio),
}

#[derive(JsonSchema)]
#[schemars(untagged)]
enum AngleOrRatio {
    Angle(Angle),
    Ratio(Ratio),
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::job::keys;
    use crate::job::keys::KeySet;
    use std::collections::BTreeSet;

    const TABLES: [(&str, &KeySet); 16] = [
        ("ArtworkTable", &keys::ARTWORK),
        ("FileTable", &keys::FILE),
        ("ShapeTable", &keys::SHAPE),
        ("HoleTable", &keys::HOLE),
        ("RectangleTable", &keys::RECTANGLE),
        ("CircleTable", &keys::CIRCLE),
        ("StrokeTable", &keys::STROKE),
        ("RegionTable", &keys::REGION),
        ("NetsTable", &keys::NETS),
        ("FloatTable", &keys::FLOAT),
        ("LabelTable", &keys::LABEL),
        ("MaterialTable", &keys::MATERIAL),
        ("AccuracyTable", &keys::ACCURACY),
        ("LayerTable", &keys::LAYER),
        ("ToleranceTable", &keys::TOLERANCE),
        ("", &keys::JOB),
    ];

    fn read(which: SchemaKind) -> serde_json::Value {
        serde_json::from_str(&schema(which)).unwrap()
    }

    fn properties(table: &serde_json::Value) -> BTreeSet<&str> {
        assert_eq!(table["additionalProperties"], false, "unknown keys are refused in the schema as well");
        table["properties"].as_object().unwrap().keys().map(String::as_str).collect()
    }

    /// What: the schemas know exactly the keys that the readers accept, table by table, and no further table has
    /// keys. Seen to fail with: a key taken out of a list.
    #[test]
    fn the_schemas_have_the_readers_keys() {
        let (job, stackup) = (read(SchemaKind::Job), read(SchemaKind::Stackup));
        let listed = |set: &KeySet| set.keys.iter().copied().collect::<BTreeSet<_>>();
        assert_eq!(properties(&stackup), listed(&keys::STACKUP));
        let mut met = BTreeSet::new();
        for (name, set) in TABLES {
            if name.is_empty() {
                assert_eq!(properties(&job), listed(set));
                continue;
            }
            let homes: Vec<_> =
                [&job, &stackup].into_iter().filter_map(|root| root["definitions"].get(name)).collect();
            assert!(!homes.is_empty(), "{name}");
            for table in homes {
                assert_eq!(properties(table), listed(set), "{name}");
            }
            met.insert(name);
        }
        for root in [&job, &stackup] {
            for (name, definition) in root["definitions"].as_object().unwrap() {
                assert!(met.contains(name.as_str()) || definition.get("properties").is_none(), "{name}");
            }
        }
    }

    #[test]
    fn every_key_is_explained_and_none_is_null() {
        for which in [SchemaKind::Job, SchemaKind::Stackup] {
            let text = schema(which);
            assert!(!text.contains("null"), "{text}");
            let root = read(which);
            let tables = root["definitions"].as_object().unwrap().values().chain([&root]);
            for (key, property) in tables.filter_map(|table| table["properties"].as_object()).flatten() {
                assert!(property["description"].is_string(), "{key}: {property}");
            }
        }
    }

    /// What: every kind of layer takes only keys that the layer table has, and every key belongs to some kind.
    #[test]
    fn the_kinds_share_out_the_keys() {
        let common = ["name", "kind", "tolerance"];
        let mut of_kinds: BTreeSet<&str> =
            keys::LAYER_KINDS.iter().flat_map(|(_, keys)| *keys).copied().collect();
        of_kinds.extend(common);
        assert_eq!(of_kinds, keys::LAYER.keys.iter().copied().collect());
    }
}
