//! The `[nets]` section, and the rule that a net has one part to play.

use crate::job::error::{JobProblem, nearest};
use crate::job::keys::{FLOAT, LABEL};
use crate::job::section::{Item, Notes, Section};
use crate::job::{FloatingNet, Job, Label, Named, NetRules, Others, RegionChoice};
use crate::units::{Unit, brief};
use std::collections::BTreeMap;

/// The rules that `section` states.
pub(super) fn read_nets(section: Section<'_>, notes: &mut Notes) -> NetRules {
    let words = [("ground", Others::Ground), ("float", Others::Float), ("rows", Others::Rows)];
    let rows = section.get("rows").and_then(|item| item.names(notes));
    if let Some(item) = section.get("rows").filter(|item| item.is_empty_list()) {
        item.list_length(0, "one net or more", notes);
    }
    let floating = section.get("float").map(|item| item.sections(&FLOAT, notes)).unwrap_or_default();
    let labels = section.get("label").map(|item| item.sections(&LABEL, notes)).unwrap_or_default();
    let rules = NetRules {
        ground: section.get("ground").and_then(|item| item.names(notes)).unwrap_or_default(),
        rows,
        others: section.get("others").and_then(|item| item.word(&words, notes)).unwrap_or_default(),
        floating: floating.into_iter().filter_map(|entry| read_float(entry, notes)).collect(),
        join: section.get("join").map(|item| read_join(item, notes)).unwrap_or_default(),
        labels: labels.into_iter().filter_map(|entry| read_label(entry, notes)).collect(),
        ground_planes: section.get("ground_plane").map(|i| read_planes(i, notes)).unwrap_or_default(),
    };
    check_roles(&rules, notes);
    rules
}

fn read_float(section: Section<'_>, notes: &mut Notes) -> Option<FloatingNet> {
    let net = section.require("net", "`net = \"SHIELD\"`", notes).and_then(|item| item.name(notes));
    let charge = match section.get("charge") {
        Some(item) => read_charge(item, notes),
        None => Some(0.0),
    };
    Some(FloatingNet { net: net?, charge: charge? })
}

/// A net charge; more than a coulomb is a slip of the unit on anything that fits on a table.
fn read_charge(item: Item<'_>, notes: &mut Notes) -> Option<f64> {
    let charge = item.quantity(Unit::Charge, notes)?;
    if charge.abs() <= 1.0 {
        return Some(charge);
    }
    item.out_of_range(brief(charge, Unit::Charge), "-1 C to 1 C", notes);
    None
}

fn read_label(section: Section<'_>, notes: &mut Notes) -> Option<Label> {
    let net = section.require("net", "`net = \"SENSE\"`", notes).and_then(|item| item.name(notes));
    let layer = section.require("layer", "`layer = \"top\"`", notes).and_then(|item| item.name(notes));
    let at = section.require("at", "a point on the copper, `at = [\"3.2 mm\", \"4.0 mm\"]`", notes);
    let at = at.and_then(|item| item.point(notes));
    Some(Label { net: net?, layer: layer?, at: at? })
}

fn read_join(item: Item<'_>, notes: &mut Notes) -> Vec<Vec<Named>> {
    let groups = item.list("groups of nets such as [[\"A1\", \"A2\"]]", notes).unwrap_or_default();
    let mut joined = Vec::new();
    for group in groups {
        let Some(names) = group.names(notes) else { continue };
        if group.n_entries() < 2 {
            group.list_length(names.len(), "two nets or more in each group", notes);
        }
        joined.push(names);
    }
    joined
}

/// One layer name, or up to two in a list.
fn read_planes(item: Item<'_>, notes: &mut Notes) -> Vec<Named> {
    if !item.is_list() {
        return item.name(notes).into_iter().collect();
    }
    let planes = item.names(notes).unwrap_or_default();
    let repeated = planes.len() == 2 && planes[0].name == planes[1].name;
    if !(1..=2).contains(&item.n_entries()) || repeated {
        item.list_length(item.n_entries(), "one or two different layers", notes);
    }
    planes
}

/// Notes the nets that are listed twice, in one list or in two, themselves or through what they are joined with.
fn check_roles(rules: &NetRules, notes: &mut Notes) {
    let listed = rules
        .ground
        .iter()
        .map(|net| ("ground", net))
        .chain(rules.rows.iter().flatten().map(|net| ("rows", net)))
        .chain(rules.floating.iter().map(|float| ("float", &float.net)));
    let mut roles: BTreeMap<&str, (&'static str, &Named)> = BTreeMap::new();
    for (role, net) in listed {
        if let Some((earlier, first)) = roles.get(net.name.as_str()) {
            notes.problem(two_roles(net, (earlier, first), role));
        } else {
            roles.insert(&net.name, (role, net));
        }
    }
    let mut joined: BTreeMap<&str, &Named> = BTreeMap::new();
    for group in &rules.join {
        for net in group {
            if let Some(first) = joined.get(net.name.as_str()) {
                notes.problem(two_roles(net, ("join", first), "join"));
            } else {
                joined.insert(&net.name, net);
            }
        }
        let mut parts = group.iter().filter_map(|net| roles.get(net.name.as_str()));
        if let Some((earlier, first)) = parts.next() {
            for (role, net) in parts.filter(|(role, _)| role != earlier || *role == "float") {
                notes.problem(two_roles(net, (earlier, first), role));
            }
        }
    }
}

fn two_roles(net: &Named, (earlier, first): (&'static str, &Named), role: &'static str) -> JobProblem {
    JobProblem::NetWithTwoRoles {
        net: if first.name == net.name {
            net.name.clone()
        } else {
            format!("{}` joined with `{}", first.name, net.name)
        },
        earlier,
        role,
        earlier_at: first.origin.span.into(),
        at: net.origin.span.into(),
    }
}

/// In a job without artwork every net that is named must be drawn.
pub(super) fn check_drawn_nets(job: &Job, notes: &mut Notes) {
    let mut drawn: Vec<&str> =
        job.shapes.iter().filter_map(|shape| shape.net.as_ref()).map(|net| net.name.as_str()).collect();
    drawn.extend(job.nets.labels.iter().map(|label| label.net.name.as_str()));
    drawn.sort_unstable();
    drawn.dedup();
    let rules = &job.nets;
    let around: &[Named] = match &job.region {
        RegionChoice::Around { nets, .. } => nets,
        _ => &[],
    };
    let named = rules
        .ground
        .iter()
        .chain(rules.rows.iter().flatten())
        .chain(rules.floating.iter().map(|float| &float.net))
        .chain(rules.join.iter().flatten())
        .chain(around);
    // A search for the nearest of many names takes its time: a hundred problems of one sort say enough.
    for net in named.filter(|net| drawn.binary_search(&net.name.as_str()).is_err()).take(100) {
        notes.problem(JobProblem::UnknownNet {
            name: net.name.clone(),
            nearest: nearest(&net.name, drawn.iter().copied()),
            known: drawn.iter().take(20).map(|name| (*name).to_owned()).collect(),
            at: net.origin.span.into(),
        });
    }
}
