//! Artwork drawn in the job: `[[shape]]` and its outlines.

use crate::job::error::JobProblem;
use crate::job::keys::{CIRCLE, HOLE, RECTANGLE, SHAPE, STROKE};
use crate::job::section::{Item, Notes, Section, Size};
use crate::job::{DrawnShape, Outline};

/// The keys that draw an outline.
const OUTLINES: [&str; 4] = ["rectangle", "circle", "polygon", "stroke"];

/// Every shape of the list.
pub(super) fn read_shapes(item: Item<'_>, notes: &mut Notes) -> Vec<DrawnShape> {
    let sections = item.sections(&SHAPE, notes);
    if item.is_empty_list() {
        item.list_length(0, "one shape or more", notes);
    }
    sections.into_iter().filter_map(|section| read_shape(section, notes)).collect()
}

fn read_shape(section: Section<'_>, notes: &mut Notes) -> Option<DrawnShape> {
    let net = section.get("net").and_then(|item| item.name(notes));
    let layer = section.require("layer", "a layer of the stackup, `layer = \"top\"`", notes);
    let layer = layer.and_then(|item| item.name(notes));
    let through = section.get("through").and_then(|item| item.names(notes)).unwrap_or_default();
    let outline = read_outline(section, "`[[shape]]`", notes);
    let holes = section.get("holes").map(|item| item.sections(&HOLE, notes)).unwrap_or_default();
    let holes: Vec<Outline> =
        holes.into_iter().filter_map(|hole| read_outline(hole, "an entry of `holes`", notes)).collect();
    let origin = notes.origin(section.span());
    Some(DrawnShape { net, layer: layer?, through, outline: outline?, holes, origin })
}

/// The one outline that `section` draws.
fn read_outline(section: Section<'_>, name: &'static str, notes: &mut Notes) -> Option<Outline> {
    let drawn: Vec<Item<'_>> = OUTLINES.iter().filter_map(|key| section.get(key)).collect();
    let Some(item) = drawn.first() else {
        notes.problem(JobProblem::MissingKey {
            key: "rectangle",
            section: name,
            example: "one of `rectangle`, `circle`, `polygon`, `stroke`",
            at: section.span().into(),
        });
        return None;
    };
    for other in &drawn[1..] {
        section.exclude(item.key, other.key, notes);
    }
    match item.key {
        "rectangle" => read_rectangle(*item, notes),
        "circle" => read_circle(*item, notes),
        "polygon" => read_polygon(*item, notes),
        _ => read_stroke(*item, notes),
    }
}

fn read_rectangle(item: Item<'_>, notes: &mut Notes) -> Option<Outline> {
    let section = item.section(&RECTANGLE, notes)?;
    let corner = "a corner such as `[\"0 mm\", \"0 mm\"]`";
    let from = section.require("from", corner, notes).and_then(|item| item.point(notes));
    let to = section.require("to", corner, notes).and_then(|item| item.point(notes));
    let (from, to) = (from?, to?);
    let has_area = (from[0] - to[0]).abs() > 0.0 && (from[1] - to[1]).abs() > 0.0;
    with_area(has_area, "rectangle", item, notes).then_some(Outline::Rectangle { from, to })
}

fn read_circle(item: Item<'_>, notes: &mut Notes) -> Option<Outline> {
    let section = item.section(&CIRCLE, notes)?;
    let at = section.require("at", "the centre, `at = [\"0 mm\", \"0 mm\"]`", notes);
    let at = at.and_then(|item| item.point(notes));
    let diameter = section.require("diameter", "`diameter = \"1 mm\"`", notes);
    let diameter = diameter.and_then(|item| item.length(Size::Positive, notes));
    Some(Outline::Circle { at: at?, diameter: diameter? })
}

fn read_polygon(item: Item<'_>, notes: &mut Notes) -> Option<Outline> {
    let points = read_points(item, 3, "three corners or more", notes)?;
    let has_area = twice_area(&points).abs() > 0.0;
    with_area(has_area, "polygon", item, notes).then_some(Outline::Polygon(points))
}

fn read_stroke(item: Item<'_>, notes: &mut Notes) -> Option<Outline> {
    let section = item.section(&STROKE, notes)?;
    let path =
        section.require("path", "points, `path = [[\"0 mm\", \"0 mm\"], [\"2 mm\", \"0 mm\"]]`", notes);
    let path = path.and_then(|item| read_points(item, 2, "two points or more", notes));
    let width = section.require("width", "`width = \"0.2 mm\"`", notes);
    let width = width.and_then(|item| item.length(Size::Positive, notes));
    Some(Outline::Stroke { path: path?, width: width? })
}

fn read_points(
    item: Item<'_>,
    least: usize,
    expected: &'static str,
    notes: &mut Notes,
) -> Option<Vec<[f64; 2]>> {
    let list = item.list("a list of points such as [[\"0 mm\", \"0 mm\"], [\"2 mm\", \"0 mm\"]]", notes)?;
    if list.len() < least {
        item.list_length(list.len(), expected, notes);
        return None;
    }
    let n_points = list.len();
    let points: Vec<[f64; 2]> = list.into_iter().filter_map(|point| point.point(notes)).collect();
    (points.len() == n_points).then_some(points)
}

fn with_area(has_area: bool, what: &'static str, item: Item<'_>, notes: &mut Notes) -> bool {
    if !has_area {
        notes.problem(JobProblem::NoArea { what, at: item.span().into() });
    }
    has_area
}

/// Twice the signed area, from corners relative to the first so that far-off shapes lose no digits.
fn twice_area(points: &[[f64; 2]]) -> f64 {
    let Some(origin) = points.first() else {
        return 0.0;
    };
    let relative = |p: [f64; 2]| [p[0] - origin[0], p[1] - origin[1]];
    points
        .windows(2)
        .map(|pair| {
            let (a, b) = (relative(pair[0]), relative(pair[1]));
            a[0] * b[1] - b[0] * a[1]
        })
        .sum()
}
