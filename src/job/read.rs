//! A job file: its head, region, materials and accuracy. Artwork, shapes and nets have rooms of their own.

use crate::diag::{FileId, Origin, Warned};
use crate::job::error::{JobErrors, JobProblem};
use crate::job::keys;
use crate::job::permittivity::read_er;
use crate::job::read_artwork::read_artwork;
use crate::job::read_layer::{read_loss_tangent, read_strength};
use crate::job::read_nets::{check_drawn_nets, read_nets};
use crate::job::read_shape::read_shapes;
use crate::job::section::{Item, Notes, Section, Size, parse_toml, span_of};
use crate::job::structure::Patches;
use crate::job::{Accuracy, ArtworkPlan, Job, MaterialPatch, Named, NetRules, RegionChoice};
use crate::units::{Unit, brief};
use std::ops::RangeInclusive;

/// Error bars beyond this are no answer; below the smallest the arithmetic ends.
const TARGETS: RangeInclusive<f64> = 1e-8..=0.5;
/// A floor of 1 judges every entry against its diagonal; the least keeps small entries from refining for ever.
const FLOORS: RangeInclusive<f64> = 1e-6..=1.0;

/// Reads a job file. Names of layers are not yet compared with the stackup: that is `check_names`.
///
/// # Errors
/// Every problem of the file, with its place.
pub fn read_job(text: &str, file: FileId) -> Result<Warned<Job>, JobErrors> {
    let mut notes = Notes::new(file);
    let mut job = blank(file);
    if let Some(table) = parse_toml(text, &mut notes) {
        // A label on the whole file would bury the message: the first byte stands for it.
        let start = span_of(0..text.len().min(1));
        let root = Section::open(table.get_ref(), start, &keys::JOB, &mut notes);
        fill(&mut job, root, &mut notes);
    }
    job.unused = notes.take_unused();
    notes.finish(job, "job file")
}

fn blank(file: FileId) -> Job {
    Job {
        title: "untitled".to_owned(),
        stackup: Named { name: String::new(), origin: Origin::new(file, 0..0) },
        frequency: None,
        artwork: ArtworkPlan::default(),
        shapes: Vec::new(),
        region: RegionChoice::Whole,
        nets: NetRules::default(),
        materials: Patches::new(),
        accuracy: Accuracy::default(),
        unused: Vec::new(),
    }
}

fn fill(job: &mut Job, root: Section<'_>, notes: &mut Notes) {
    if let Some(title) = root.get("title").and_then(|item| item.name(notes)) {
        job.title = title.name;
    }
    let stackup = root.require("stackup", "the stackup's path, `stackup = \"stackup.toml\"`", notes);
    if let Some(path) = stackup.and_then(|item| item.name(notes)) {
        job.stackup = path;
    }
    job.frequency = root.get("frequency").and_then(|item| read_frequency(item, notes));
    let artwork = root.get("artwork");
    if let Some(section) = artwork.and_then(|item| item.section(&keys::ARTWORK, notes)) {
        job.artwork = read_artwork(section, notes);
    }
    let shapes = root.get("shape");
    if let Some(item) = shapes {
        job.shapes = read_shapes(item, notes);
    }
    if artwork.is_none() && shapes.is_none() {
        notes.problem(JobProblem::NothingToModel { at: root.span().into() });
    }
    if let Some(section) = root.get("region").and_then(|item| item.section(&keys::REGION, notes)) {
        job.region = read_region(section, notes).unwrap_or_default();
    }
    if let Some(section) = root.get("nets").and_then(|item| item.section(&keys::NETS, notes)) {
        job.nets = read_nets(section, notes);
    }
    if let Some(item) = root.get("materials") {
        job.materials = read_materials(item, job.frequency, notes);
    }
    if let Some(section) = root.get("accuracy").and_then(|item| item.section(&keys::ACCURACY, notes)) {
        job.accuracy = read_accuracy(section, notes);
    }
    // A shape that could not be read may have drawn the net.
    if artwork.is_none() && shapes.is_some_and(|item| item.n_entries() == job.shapes.len()) {
        check_drawn_nets(job, notes);
    }
}

fn read_frequency(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let frequency = item.quantity(Unit::Frequency, notes)?;
    if frequency > 0.0 && frequency <= 1e12 {
        return Some(frequency);
    }
    item.out_of_range(brief(frequency, Unit::Frequency), "more than 0 Hz, up to 1 THz", notes);
    None
}

fn read_region(section: Section<'_>, notes: &mut Notes) -> Option<RegionChoice> {
    section.exclude("around", "window", notes);
    section.exclude("margin", "window", notes);
    let margin_item = section.get("margin");
    let margin = margin_item.and_then(|item| item.length(Size::Positive, notes));
    if let Some(item) = section.get("window") {
        return read_window(item, notes);
    }
    let around = match margin_item {
        Some(_) => {
            section.require("around", "the nets that the margin is about, `around = [\"SENSE\"]`", notes)?
        }
        None => section.get("around")?,
    };
    let nets = around.names(notes)?;
    if around.is_empty_list() {
        around.list_length(0, "one net or more", notes);
    }
    Some(RegionChoice::Around { nets, margin })
}

fn read_window(item: Item<'_>, notes: &mut Notes) -> Option<RegionChoice> {
    let corners = item.list("two corners such as [[\"0 mm\", \"0 mm\"], [\"20 mm\", \"12 mm\"]]", notes)?;
    let [a, b] = corners.as_slice() else {
        item.list_length(corners.len(), "two corners", notes);
        return None;
    };
    let (a, b) = (a.point(notes), b.point(notes));
    let (a, b) = (a?, b?);
    let lo = [a[0].min(b[0]), a[1].min(b[1])];
    let hi = [a[0].max(b[0]), a[1].max(b[1])];
    if hi[0] <= lo[0] || hi[1] <= lo[1] {
        notes.problem(JobProblem::NoArea { what: "window", at: item.span().into() });
        return None;
    }
    Some(RegionChoice::Window { lo, hi })
}

fn read_materials(item: Item<'_>, frequency: Option<f64>, notes: &mut Notes) -> Patches {
    let mut patches = Patches::new();
    for (name, entry) in item.entries(notes) {
        let Some(section) = entry.section(&keys::MATERIAL, notes) else {
            continue;
        };
        let er = section.get("er").and_then(|item| read_er(item, frequency, "job", notes));
        let loss_tangent = section.get("loss_tangent").and_then(|item| read_loss_tangent(item, notes));
        let strength = section.get("strength").and_then(|item| read_strength(item, notes));
        for (key, value) in [("loss_tangent", loss_tangent), ("strength", strength)] {
            if let Some(item) = section.get(key).filter(|_| value.is_some_and(|v| v > 0.0)) {
                notes.unused(format!("{key} of material `{name}`"), item.key_span);
            }
        }
        let patch = MaterialPatch {
            er: er.as_ref().map(|er| er.value),
            er_source: er.map(|er| er.source).unwrap_or_default(),
            loss_tangent,
            strength,
            thickness: section.get("thickness").and_then(|item| item.length(Size::Positive, notes)),
            depth_on_copper: section.get("depth_on_copper").and_then(|i| i.length(Size::NotNegative, notes)),
            prepreg: section.get("prepreg").and_then(|item| item.flag(notes)),
            origin: notes.origin(entry.key_span),
        };
        patches.insert(name.to_owned(), patch);
    }
    patches
}

fn read_accuracy(section: Section<'_>, notes: &mut Notes) -> Accuracy {
    let mut ratio = |key, range: RangeInclusive<f64>, allowed| {
        let item = section.get(key)?;
        let value = item.quantity(Unit::Ratio, notes)?;
        if !range.contains(&value) {
            item.out_of_range(brief(value, Unit::Ratio), allowed, notes);
        }
        Some(value)
    };
    let usual = Accuracy::default();
    let target = ratio("target", TARGETS, "0.000001 % to 50 %").unwrap_or(usual.target);
    let floor = ratio("floor", FLOORS, "0.0001 % to 100 %").unwrap_or(usual.floor);
    Accuracy { target, floor }
}
