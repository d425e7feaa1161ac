//! What `inspect` prints: the region as it was read, before anything is solved.

use serde::Serialize;
use std::fmt::Write as _;

use crate::report::ReportError;
use crate::report::figures::{memory, significant};
use crate::units::{self, Unit};

/// What the region holds. Plain data: `cli` fills it from the stages, this room prints it. SI.
#[derive(Debug, Clone, PartialEq)]
pub struct Inspection {
    /// Title of the job.
    pub title: String,
    /// From top to bottom.
    pub layers: Vec<LayerLine>,
    /// Every net of the region.
    pub nets: Vec<NetLine>,
    /// Drilled holes.
    pub drills: Vec<DrillLine>,
    /// Where copper of two nets touches; empty, since a short is an error, unless reading became tolerant.
    pub shorts: Vec<String>,
    /// What solving would take; or why that is not known.
    pub cost: Result<Cost, String>,
    /// Warnings so far.
    pub warnings: Vec<String>,
}

/// One layer.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LayerLine {
    /// Its name.
    pub name: String,
    /// "open", "coating", "conductor" or "dielectric".
    pub kind: &'static str,
    /// Relative permittivity; `None` for a conductor.
    pub er: Option<f64>,
    /// Where the permittivity comes from.
    pub er_source: Option<String>,
    /// Thickness, m; `None` for a half-space.
    pub thickness_m: Option<f64>,
    /// Area of its copper, m²; 0 for a dielectric.
    pub area_m2: f64,
    /// Named nets that have copper in it.
    pub nets: usize,
    /// Connected pieces of copper.
    pub pieces: usize,
}

/// One net.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NetLine {
    /// Its name.
    pub name: String,
    /// "row", "ground" or "float"; "unsettled" where the model could not be built.
    pub role: &'static str,
    /// Whether the name was given, not numbered by us.
    pub named: bool,
    /// Whether the border of the region cuts it.
    pub cut: bool,
    /// Area of its copper over all layers, m².
    pub area_m2: f64,
}

/// Holes of one kind.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct DrillLine {
    /// Diameter of the metal, or of the bare hole, m.
    pub diameter_m: f64,
    /// Whether the holes are plated.
    pub plated: bool,
    /// Uppermost layer.
    pub from: String,
    /// Lowest layer.
    pub to: String,
    /// How many.
    pub holes: usize,
}

/// What solving would take at least: the first two levels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cost {
    /// Panels of the second level.
    pub panels: usize,
    /// Peak memory, bytes.
    pub memory: u64,
    /// Time, s, with that of moving the border when that is done.
    pub seconds: f64,
    /// Whether one more solve sees what moving the border of the region's open interfaces does.
    pub moves_border: bool,
}

#[derive(Serialize)]
#[expect(non_snake_case, reason = "a key carries its unit, and units have capitals")]
struct InspectionFile<'a> {
    format: &'static str,
    title: &'a str,
    layers: &'a [LayerLine],
    nets: &'a [NetLine],
    drills: &'a [DrillLine],
    shorts: &'a [String],
    panels: Option<usize>,
    memory_B: Option<u64>,
    seconds: Option<f64>,
    cost_unknown: Option<&'a str>,
    warnings: &'a [String],
}

/// The inspection as JSON, ending in a line break.
///
/// # Errors
/// [`ReportError::Json`] when the library refuses to print.
pub fn json(inspection: &Inspection) -> Result<String, ReportError> {
    let cost = inspection.cost.as_ref();
    let file = InspectionFile {
        format: "chargeskin-inspection/1",
        title: &inspection.title,
        layers: &inspection.layers,
        nets: &inspection.nets,
        drills: &inspection.drills,
        shorts: &inspection.shorts,
        panels: cost.ok().map(|c| c.panels),
        memory_B: cost.ok().map(|c| c.memory),
        seconds: cost.ok().map(|c| c.seconds),
        cost_unknown: cost.err().map(String::as_str),
        warnings: &inspection.warnings,
    };
    let mut text = serde_json::to_string_pretty(&file)?;
    text.push('\n');
    Ok(text)
}

/// The inspection for people, ending in a line break.
#[must_use]
pub fn text(inspection: &Inspection) -> String {
    let mut text = format!("{}\n\nLayers, from top to bottom\n", inspection.title);
    let name_width = inspection.layers.iter().map(|layer| layer.name.chars().count()).max().unwrap_or(0);
    for layer in &inspection.layers {
        let mut line = format!("  {:<name_width$}  {:<10}", layer.name, layer.kind);
        let thickness = layer.thickness_m.map_or_else(String::new, |t| units::brief(t, Unit::Length));
        let _ = write!(line, "  {thickness:>9}");
        if let (Some(er), Some(source)) = (layer.er, &layer.er_source) {
            let _ = write!(line, "  er {} ({source})", significant(er, 6));
        }
        if layer.kind == "conductor" {
            let (nets, pieces) = (layer.nets, layer.pieces);
            let _ = write!(
                line,
                "  {} of copper, {nets} nets, {pieces} pieces",
                units::show(layer.area_m2, Unit::Area, 5)
            );
        }
        let _ = writeln!(text, "{}", line.trim_end());
    }
    let _ = writeln!(text, "\nNets: {}", inspection.nets.len());
    let name_width = inspection.nets.iter().map(|net| net.name.chars().count()).max().unwrap_or(0);
    for net in &inspection.nets {
        let cut = if net.cut { "  cut by the border of the region" } else { "" };
        let _ = writeln!(
            text,
            "  {:<name_width$}  {:<9}  {}{cut}",
            net.name,
            net.role,
            units::show(net.area_m2, Unit::Area, 4)
        );
    }
    if inspection.drills.is_empty() {
        text.push_str("\nDrills: none\n");
    } else {
        text.push_str("\nDrills\n");
    }
    for drill in &inspection.drills {
        let lining = if drill.plated { "plated" } else { "bare" };
        let (n, from, to) = (drill.holes, &drill.from, &drill.to);
        let _ = writeln!(
            text,
            "  {n} x {} {lining}, {from} to {to}",
            units::brief(drill.diameter_m, Unit::Length)
        );
    }
    let shorts = if inspection.shorts.is_empty() { "none".to_owned() } else { inspection.shorts.join("; ") };
    let _ = writeln!(text, "\nShorts: {shorts}");
    match &inspection.cost {
        Ok(cost) => {
            let _ = writeln!(text, "To solve: {}", cost.line());
        }
        Err(why) => {
            let _ = writeln!(text, "To solve: not known, {why}");
        }
    }
    for warning in &inspection.warnings {
        let _ = writeln!(text, "warning: {warning}");
    }
    text
}

impl Cost {
    /// "1234 panels, 56 MB, at least 3 s for the first two levels".
    #[must_use]
    pub fn line(&self) -> String {
        let border = if self.moves_border { " and a moved border" } else { "" };
        let (memory, seconds) = (memory(self.memory), significant(self.seconds, 2));
        format!("{} panels, {memory}, at least {seconds} s for the first two levels{border}", self.panels)
    }
}
