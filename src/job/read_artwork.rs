//! The `[artwork]` section: a folder, files one by one, a netlist.

use crate::job::error::JobProblem;
use crate::job::keys::FILE;
use crate::job::section::{Notes, Section, Size};
use crate::job::{ArtworkPlan, DrillPlan, FileContent, HoleMeaning, PlannedFile};

/// The keys that only a drill entry has.
const DRILL_KEYS: [&str; 5] = ["plated", "from", "to", "hole", "plating"];

/// What a file is said to be beside the artwork of a layer.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum FileRole {
    Profile,
    Drill,
    BackDrill,
}

/// The plan that `section` makes.
pub(super) fn read_artwork(section: Section<'_>, notes: &mut Notes) -> ArtworkPlan {
    let folder = section.get("folder").and_then(|item| item.name(notes));
    let files = section.get("files").map(|item| item.sections(&FILE, notes)).unwrap_or_default();
    let files: Vec<PlannedFile> = files.into_iter().filter_map(|file| read_file(file, notes)).collect();
    let netlist = section.get("netlist").and_then(|item| item.name(notes));
    if let Some(item) = section.get("netlist") {
        notes.unused("netlist".to_owned(), item.key_span);
    }
    if section.get("folder").is_none() && section.get("files").is_none() {
        notes.problem(JobProblem::MissingKey {
            key: "folder",
            section: "`[artwork]`",
            example: "`folder = \"gerber\"`, or list `files`",
            at: section.span().into(),
        });
    }
    ArtworkPlan { folder, files, netlist }
}

fn read_file(section: Section<'_>, notes: &mut Notes) -> Option<PlannedFile> {
    let path = section.require("path", "a path such as `path = \"gerber/top.gbr\"`", notes);
    let path = path.and_then(|item| item.name(notes));
    let roles =
        [("profile", FileRole::Profile), ("drill", FileRole::Drill), ("back-drill", FileRole::BackDrill)];
    let role = section.get("role").and_then(|item| item.word(&roles, notes));
    section.exclude("layer", "role", notes);
    let drill_key = DRILL_KEYS.iter().copied().find(|key| section.get(key).is_some());
    if let Some(key) = drill_key {
        section.exclude("layer", key, notes);
        if role == Some(FileRole::Profile) {
            section.exclude("role", key, notes);
        }
    }
    let layer = section.get("layer").and_then(|item| item.name(notes));
    let content = match (layer, role) {
        (Some(layer), _) => FileContent::Layer(layer),
        (None, Some(FileRole::Profile)) => FileContent::Profile,
        (None, None) if drill_key.is_none() => FileContent::Unsaid,
        (None, _) => FileContent::Drill(read_drill(section, role == Some(FileRole::BackDrill), notes)),
    };
    Some(PlannedFile { path: path?, content })
}

fn read_drill(section: Section<'_>, removes_metal: bool, notes: &mut Notes) -> DrillPlan {
    let plated = section.get("plated").and_then(|item| item.flag(notes));
    let from = section.get("from").and_then(|item| item.name(notes));
    let to = section.get("to").and_then(|item| item.name(notes));
    let words = [("drilled", false), ("finished", true)];
    let is_finished = section.get("hole").and_then(|item| item.word(&words, notes)).unwrap_or(false);
    let plating_item = section.get("plating");
    let plating = plating_item.and_then(|item| item.length(Size::Positive, notes));
    let hole = match plating {
        Some(plating) if is_finished => HoleMeaning::Finished { plating },
        _ => HoleMeaning::Drilled,
    };
    if is_finished && plating_item.is_none() {
        section.require("plating", "the thickness of the metal, `plating = \"25 um\"`", notes);
    }
    if let Some(item) = plating_item.filter(|_| !is_finished) {
        let text = "`plating` has no effect: a drilled diameter is filled by metal; say `hole = \"finished\"` \
                    when the files give finished diameters";
        notes.warn(text.to_owned(), item.key_span);
    }
    if let Some(item) = section.get("plated").filter(|_| removes_metal && plated == Some(true)) {
        item.out_of_range("true on a back-drill".to_owned(), "false, or left out", notes);
    }
    DrillPlan { plated, from, to, hole, removes_metal }
}
