//! Copper that touches is one net: in a layer, through plated holes, and where posts stand on copper.
//!
//! Names come from the files, from shapes and from labels; what has none is numbered. Two names on one piece of
//! metal are a short.

use super::contact::{Part, contacts};
use super::error::{ArtworkError, Problem};
use super::layer_role::conductor;
use super::netlist::TestPoint;
use super::{Artwork, ArtworkOptions, Copper, Hole, Lining, Pattern};
use crate::diag::{Origin, Warning};
use crate::geom::region::{Grid, Point, Region};
use crate::job::{Job, LayerId, LayerKind, Stackup};
use crate::net::{NameSource, NetId, NetTable};
use std::collections::{BTreeMap, BTreeSet};

/// Copper as the files give it.
#[derive(Debug, Clone)]
pub(super) struct DraftCopper {
    pub(super) layer: LayerId,
    /// `None`: no name.
    pub(super) name: Option<String>,
    pub(super) region: Region,
    pub(super) origin: Origin,
}

/// A hole before its net is known.
#[derive(Debug, Clone)]
pub(super) struct DraftHole {
    pub(super) region: Region,
    pub(super) at: Point,
    /// m.
    pub(super) diameter: f64,
    pub(super) from: LayerId,
    pub(super) to: LayerId,
    /// `None`: nobody says.
    pub(super) plated: Option<bool>,
    pub(super) origin: Origin,
}

/// Everything that was read, before nets are settled.
#[derive(Debug, Clone, Default)]
pub(super) struct Draft {
    pub(super) copper: Vec<DraftCopper>,
    pub(super) holes: Vec<DraftHole>,
    pub(super) patterns: Vec<Pattern>,
    pub(super) openings: Vec<Pattern>,
    pub(super) profile: Option<Region>,
    /// Names from a netlist.
    pub(super) names: Vec<(Origin, TestPoint)>,
}

/// One connected thing: all metal of a name, one island without a name, or one plated hole.
struct Node {
    name: Option<String>,
    origin: Origin,
}

/// The sets of nodes that are one net.
struct Nodes {
    nodes: Vec<Node>,
    parent: Vec<usize>,
}

impl Nodes {
    fn add(&mut self, name: Option<String>, origin: Origin) -> usize {
        self.nodes.push(Node { name, origin });
        self.parent.push(self.parent.len());
        self.parent.len() - 1
    }

    fn root(&mut self, mut node: usize) -> usize {
        while self.parent[node] != node {
            self.parent[node] = self.parent[self.parent[node]];
            node = self.parent[node];
        }
        node
    }

    /// Makes two nodes one; on two names returns them and changes nothing.
    fn join(&mut self, a: usize, b: usize) -> Result<(), (String, String)> {
        let (a, b) = (self.root(a), self.root(b));
        if a == b {
            return Ok(());
        }
        match (&self.nodes[a].name, &self.nodes[b].name) {
            (Some(one), Some(other)) => {
                let (one, other) = (one.clone(), other.clone());
                Err(if one < other { (one, other) } else { (other, one) })
            }
            // The named one stays at the root, else the earlier one.
            (Some(_), None) => {
                self.parent[b] = a;
                Ok(())
            }
            (None, Some(_)) => {
                self.parent[a] = b;
                Ok(())
            }
            (None, None) => {
                self.parent[a.max(b)] = a.min(b);
                Ok(())
            }
        }
    }
}

/// A region of metal in a layer, and its node.
struct Metal {
    layer: LayerId,
    node: usize,
    region: Region,
    origin: Origin,
}

/// Settles the nets.
pub(super) fn connect(
    mut draft: Draft,
    job: &Job,
    stackup: &Stackup,
    options: &ArtworkOptions,
    warnings: &mut Vec<Warning>,
) -> Result<Artwork, Vec<ArtworkError>> {
    let ArtworkOptions { grid, chord_error } = *options;
    let mut errors = Vec::new();
    settle_plating(&mut draft, stackup, warnings);
    drill_out(&mut draft, warnings);
    let mut nodes = Nodes { nodes: Vec::new(), parent: Vec::new() };
    let mut metal = gather(draft.copper, &mut nodes);
    let n_copper_nodes = nodes.nodes.len();
    let hole_nodes: Vec<Option<usize>> = draft
        .holes
        .iter()
        .map(|hole| (hole.plated == Some(true)).then(|| nodes.add(None, hole.origin)))
        .collect();
    label(job, stackup, grid, &metal, &mut nodes, &mut errors);
    let layers = LayerParts { metal: &metal, holes: &draft.holes, hole_nodes: &hole_nodes };
    let mut seen = BTreeSet::new();
    for (layer, _) in stackup.iter() {
        layers.join(layer, stackup, grid, (&mut nodes, &mut seen, &mut errors));
    }
    name_by_netlist(&draft.names, stackup, grid, &metal, (&mut nodes, warnings, &mut errors));
    if !errors.is_empty() {
        return Err(errors);
    }
    let nets = name_nodes(&mut nodes, n_copper_nodes);
    let copper = merge(&mut metal, &nets.1);
    let holes = draft.holes.into_iter().zip(hole_nodes).map(|(hole, node)| Hole {
        region: hole.region,
        at: hole.at,
        diameter: hole.diameter,
        from: hole.from,
        to: hole.to,
        lining: node.map_or(Lining::Bare, |node| Lining::Plated(nets.1[node])),
        origin: hole.origin,
    });
    let holes: Vec<Hole> = holes.collect();
    tell_islands(&copper, &holes, &nets.0, stackup, warnings);
    Ok(Artwork {
        grid,
        holes,
        nets: nets.0,
        copper,
        patterns: draft.patterns,
        openings: draft.openings,
        profile: draft.profile,
        chord_error,
    })
}

/// Holes of which nobody says whether they are plated: plated where they meet copper, bare elsewhere.
fn settle_plating(draft: &mut Draft, stackup: &Stackup, warnings: &mut Vec<Warning>) {
    let unsaid: Vec<usize> = (0..draft.holes.len()).filter(|k| draft.holes[*k].plated.is_none()).collect();
    let Some(first) = unsaid.first() else { return };
    let origin = draft.holes[*first].origin;
    let mut meets = vec![false; draft.holes.len()];
    for layer in stackup.conductors() {
        let here = unsaid.iter().filter(|k| (draft.holes[**k].from..=draft.holes[**k].to).contains(&layer));
        let here: Vec<usize> = here.copied().collect();
        // Copper is one node and each hole another, so that only copper against holes is looked at.
        let mut parts: Vec<Part<'_>> =
            here.iter().zip(1u32..).map(|(k, node)| Part { node, region: &draft.holes[*k].region }).collect();
        let copper = draft.copper.iter().filter(|copper| copper.layer == layer);
        parts.extend(copper.map(|copper| Part { node: 0, region: &copper.region }));
        let found = std::cell::RefCell::new(&mut meets);
        contacts(
            &parts,
            |a, b| here.get(a.min(b)).is_none_or(|k| found.borrow()[*k]),
            |a, b, _| {
                if a.max(b) >= here.len()
                    && let Some(k) = here.get(a.min(b))
                {
                    found.borrow_mut()[*k] = true;
                }
            },
        );
    }
    let plated = unsaid.iter().filter(|k| meets[**k]).count();
    for k in &unsaid {
        draft.holes[*k].plated = Some(meets[*k]);
    }
    let text = format!(
        "whether holes are plated is not said: the {plated} that meet copper are taken as plated, the {} others as bare; `plated = true` or `false` in the job settles it",
        unsaid.len() - plated
    );
    warnings.push(Warning::new(text, origin));
}

/// Copper inside bare holes is gone.
fn drill_out(draft: &mut Draft, warnings: &mut Vec<Warning>) {
    let bare: Vec<&DraftHole> = draft.holes.iter().filter(|hole| hole.plated == Some(false)).collect();
    let Some(first) = bare.first() else { return };
    let mut cut = 0;
    for copper in &mut draft.copper {
        let Some(bounds) = copper.region.bounds() else { continue };
        let here = bare.iter().filter(|hole| (hole.from..=hole.to).contains(&copper.layer));
        let met: Vec<&Region> =
            here.map(|h| &h.region).filter(|r| r.bounds().is_some_and(|b| b.meets(&bounds))).collect();
        if met.is_empty() {
            continue;
        }
        let drilled = copper.region.difference(&Region::union_all(met));
        if (drilled.area() - copper.region.area()).abs() > 0.5 {
            cut += 1;
            copper.region = drilled;
        }
    }
    if cut > 0 {
        let text = format!("copper inside unplated holes is removed ({cut} pairs of a layer and a name)");
        warnings.push(Warning::new(text, first.origin));
    }
}

/// Regions of one name in one layer, and what made them.
type Group = Vec<(Region, Origin)>;

/// All metal of a name in a layer is one region with the name's node; each island without a name has a node of its own.
fn gather(copper: Vec<DraftCopper>, nodes: &mut Nodes) -> Vec<Metal> {
    let mut groups: BTreeMap<(LayerId, Option<String>), Group> = BTreeMap::new();
    let mut names: BTreeMap<String, usize> = BTreeMap::new();
    for part in copper {
        if let Some(name) = &part.name
            && !names.contains_key(name)
        {
            names.insert(name.clone(), nodes.add(Some(name.clone()), part.origin));
        }
        groups.entry((part.layer, part.name)).or_default().push((part.region, part.origin));
    }
    let mut metal = Vec::new();
    for ((layer, name), parts) in groups {
        let origin = parts[0].1;
        let region = match parts.as_slice() {
            [(only, _)] => only.clone(),
            several => Region::union_all(several.iter().map(|(region, _)| region)),
        };
        match name.and_then(|name| names.get(&name).copied()) {
            Some(node) => metal.push(Metal { layer, node, region, origin }),
            None => {
                let mut pieces = region.pieces();
                pieces.sort_by_key(|piece| piece.bounds().map(|b| (b.lo.x, b.lo.y, b.hi.x, b.hi.y)));
                for region in pieces {
                    let node = nodes.add(None, origin);
                    metal.push(Metal { layer, node, region, origin });
                }
            }
        }
    }
    metal.retain(|m| !m.region.is_empty());
    metal
}

/// Names copper at the points that the job gives.
fn label(
    job: &Job,
    stackup: &Stackup,
    grid: Grid,
    metal: &[Metal],
    nodes: &mut Nodes,
    errors: &mut Vec<ArtworkError>,
) {
    for label in &job.nets.labels {
        let Some(layer) = stackup.find(&label.layer.name) else {
            errors.push(ArtworkError::at(
                label.layer.origin,
                Problem::UnknownLayer {
                    name: label.layer.name.clone(),
                    known: stackup.layers.iter().map(|l| l.name.clone()).collect(),
                    span: label.layer.origin.span,
                },
            ));
            continue;
        };
        let at = grid.snap(label.at[0]).zip(grid.snap(label.at[1])).map(|(x, y)| Point::new(x, y));
        let place = [label.at[0] * 1e3, label.at[1] * 1e3];
        let Some(hit) = metal.iter().find(|m| m.layer == layer && at.is_some_and(|at| m.region.contains(at)))
        else {
            errors.push(ArtworkError::at(
                label.net.origin,
                Problem::LabelMisses {
                    net: label.net.name.clone(),
                    layer: label.layer.name.clone(),
                    at_mm: place,
                    span: label.net.origin.span,
                },
            ));
            continue;
        };
        let known = nodes.nodes.iter().position(|n| n.name.as_deref() == Some(&label.net.name));
        let node = known.unwrap_or_else(|| nodes.add(Some(label.net.name.clone()), label.net.origin));
        if let Err((a, b)) = nodes.join(hit.node, node) {
            errors.push(ArtworkError::at(
                label.net.origin,
                Problem::Short {
                    a,
                    b,
                    layer: label.layer.name.clone(),
                    at_mm: place,
                    span: label.net.origin.span,
                },
            ));
        }
    }
}

/// Gives the names of a netlist to copper that has none. Two of its names on one piece are a short; a name other than
/// the copper's own is told.
fn name_by_netlist(
    names: &[(Origin, TestPoint)],
    stackup: &Stackup,
    grid: Grid,
    metal: &[Metal],
    (nodes, warnings, errors): (&mut Nodes, &mut Vec<Warning>, &mut Vec<ArtworkError>),
) {
    let mut given: BTreeSet<String> = BTreeSet::new();
    let mut known: BTreeMap<String, usize> = BTreeMap::new();
    for k in 0..nodes.nodes.len() {
        if let Some(name) = nodes.nodes[k].name.clone() {
            known.entry(name).or_insert(k);
        }
    }
    let (mut misses, mut differ) = (0, Vec::new());
    for (origin, point) in names {
        let layers: Vec<LayerId> = match point.layer {
            Some(number) => conductor(stackup, number).into_iter().collect(),
            None => stackup.conductors().collect(),
        };
        let hit = metal.iter().find(|m| layers.contains(&m.layer) && m.region.contains(point.at));
        let Some(hit) = hit else {
            misses += 1;
            continue;
        };
        let root = nodes.root(hit.node);
        match nodes.nodes[root].name.clone() {
            Some(name) if name == point.net => {}
            Some(name) if given.contains(&name) => errors.push(ArtworkError::at(
                *origin,
                Problem::Short {
                    a: name,
                    b: point.net.clone(),
                    layer: stackup.get(hit.layer).name.clone(),
                    at_mm: [grid.length(point.at.x) * 1e3, grid.length(point.at.y) * 1e3],
                    span: origin.span,
                },
            )),
            Some(name) => differ.push(format!("`{name}` is `{}`", point.net)),
            None => {
                given.insert(point.net.clone());
                match known.get(&point.net) {
                    Some(node) => {
                        let named = nodes.root(*node);
                        nodes.parent[root] = named;
                    }
                    None => {
                        nodes.nodes[root].name = Some(point.net.clone());
                        known.insert(point.net.clone(), root);
                    }
                }
            }
        }
    }
    let origin = names.first().map_or_else(Origin::default, |(origin, _)| *origin);
    if misses > 0 {
        warnings.push(Warning::new(format!("{misses} points of the netlist hit no copper"), origin));
    }
    if !differ.is_empty() {
        differ.sort();
        differ.dedup();
        let text = format!(
            "the netlist disagrees with the names in the artwork, which are kept: {}",
            differ.join(", ")
        );
        warnings.push(Warning::new(text, origin));
    }
}

struct LayerParts<'a> {
    metal: &'a [Metal],
    holes: &'a [DraftHole],
    hole_nodes: &'a [Option<usize>],
}

impl LayerParts<'_> {
    /// Joins what touches in `layer`; metal that stands on it in an adjoining dielectric counts as touching.
    fn join(
        &self,
        layer: LayerId,
        stackup: &Stackup,
        grid: Grid,
        (nodes, seen, errors): (&mut Nodes, &mut BTreeSet<(String, String)>, &mut Vec<ArtworkError>),
    ) {
        let stands_on = |m: &&Metal| m.layer == layer || adjoining_dielectric(stackup, layer, m.layer);
        let mut parts: Vec<Part<'_>> = Vec::new();
        let mut origins = Vec::new();
        for m in self.metal.iter().filter(stands_on) {
            parts.push(Part { node: u32::try_from(m.node).unwrap_or(u32::MAX), region: &m.region });
            origins.push(m.origin);
        }
        if !self.metal.iter().any(|m| m.layer == layer) {
            return;
        }
        for (hole, node) in self.holes.iter().zip(self.hole_nodes) {
            if let Some(node) = node
                && (hole.from..=hole.to).contains(&layer)
            {
                parts.push(Part { node: u32::try_from(*node).unwrap_or(u32::MAX), region: &hole.region });
                origins.push(hole.origin);
            }
        }
        let node = |k: usize| parts[k].node as usize;
        let cell = std::cell::RefCell::new(nodes);
        contacts(
            &parts,
            |a, b| {
                let mut nodes = cell.borrow_mut();
                nodes.root(node(a)) == nodes.root(node(b))
            },
            |a, b, at| {
                if let Err((one, other)) = cell.borrow_mut().join(node(a), node(b))
                    && seen.insert((one.clone(), other.clone()))
                {
                    let mm = |steps: i64| (grid.length(steps) * 1e9).round() / 1e6;
                    errors.push(ArtworkError::at(
                        origins[a],
                        Problem::Short {
                            a: one,
                            b: other,
                            layer: stackup.get(layer).name.clone(),
                            at_mm: [mm(at.x), mm(at.y)],
                            span: origins[a].span,
                        },
                    ));
                }
            },
        );
    }
}

/// The table of nets, and the net of every node: given names first, in the order in which they were met; then islands
/// in the order of their layer and place; then holes that touch nothing.
fn name_nodes(nodes: &mut Nodes, n_copper_nodes: usize) -> (NetTable, Vec<NetId>) {
    let mut table = NetTable::default();
    for node in &nodes.nodes {
        if let Some(name) = &node.name {
            table.intern(name, NameSource::Given, node.origin);
        }
    }
    let mut number = 0;
    let mut of_root: BTreeMap<usize, NetId> = BTreeMap::new();
    let mut ids = Vec::with_capacity(nodes.nodes.len());
    debug_assert!(n_copper_nodes <= nodes.nodes.len());
    for node in 0..nodes.nodes.len() {
        let root = nodes.root(node);
        let id = *of_root.entry(root).or_insert_with(|| {
            let Node { name, origin } = &nodes.nodes[root];
            if let Some(name) = name {
                return table.intern(name, NameSource::Given, *origin);
            }
            loop {
                number += 1;
                let name = format!("island-{number}");
                if table.find(&name).is_none() {
                    return table.intern(&name, NameSource::Numbered, *origin);
                }
            }
        });
        ids.push(id);
    }
    (table, ids)
}

/// One region per layer and net.
fn merge(metal: &mut Vec<Metal>, net_of: &[NetId]) -> Vec<Copper> {
    let mut groups: BTreeMap<(LayerId, NetId), Vec<Metal>> = BTreeMap::new();
    for m in metal.drain(..) {
        groups.entry((m.layer, net_of[m.node])).or_default().push(m);
    }
    groups
        .into_iter()
        .map(|((layer, net), mut parts)| {
            let origin = parts[0].origin;
            let region = if parts.len() == 1 {
                std::mem::take(&mut parts[0].region)
            } else {
                Region::union_all(parts.iter().map(|m| &m.region))
            };
            Copper { layer, net, region, origin }
        })
        .collect()
}

/// Tells which given names lie on several islands that nothing joins: each is kept as one net.
fn tell_islands(
    copper: &[Copper],
    holes: &[Hole],
    nets: &NetTable,
    stackup: &Stackup,
    warnings: &mut Vec<Warning>,
) {
    let pieces: Vec<(LayerId, NetId, Region)> = copper
        .iter()
        .flat_map(|c| c.region.pieces().into_iter().map(|piece| (c.layer, c.net, piece)))
        .collect();
    let mut islands = Nodes { nodes: Vec::new(), parent: (0..pieces.len() + holes.len()).collect() };
    for (layer, _) in stackup.iter() {
        let stands_on = |other: LayerId| other == layer || adjoining_dielectric(stackup, layer, other);
        let mut parts: Vec<Part<'_>> = Vec::new();
        for (node, piece) in (0u32..).zip(&pieces).filter(|(_, piece)| stands_on(piece.0)) {
            parts.push(Part { node, region: &piece.2 });
        }
        let first_hole = u32::try_from(pieces.len()).unwrap_or(u32::MAX);
        for (node, hole) in (first_hole..).zip(holes) {
            if matches!(hole.lining, Lining::Plated(_)) && (hole.from..=hole.to).contains(&layer) {
                parts.push(Part { node, region: &hole.region });
            }
        }
        let node = |k: usize| parts[k].node as usize;
        let cell = std::cell::RefCell::new(&mut islands);
        let same = |a, b| {
            let mut islands = cell.borrow_mut();
            islands.root(node(a)) == islands.root(node(b))
        };
        contacts(&parts, same, |a, b, _| {
            let mut islands = cell.borrow_mut();
            let (a, b) = (islands.root(node(a)), islands.root(node(b)));
            islands.parent[a.max(b)] = a.min(b);
        });
    }
    let mut roots: BTreeMap<NetId, BTreeSet<usize>> = BTreeMap::new();
    for (k, piece) in pieces.iter().enumerate() {
        roots.entry(piece.1).or_default().insert(islands.root(k));
    }
    let several = roots.iter().filter(|(_, roots)| roots.len() > 1);
    let told: Vec<String> =
        several.map(|(net, roots)| format!("`{}` ({})", nets.get(*net).name, roots.len())).collect();
    if !told.is_empty() {
        let text =
            format!("nets whose copper lies in several islands that nothing joins: {}", told.join(", "));
        warnings.push(Warning::new(text, Origin::default()));
    }
}

/// Whether `other` is a dielectric right above or below `layer`, so that metal in it stands on `layer`.
fn adjoining_dielectric(stackup: &Stackup, layer: LayerId, other: LayerId) -> bool {
    layer.0.abs_diff(other.0) == 1 && matches!(stackup.get(other).kind, LayerKind::Dielectric { .. })
}
