//! Fills in what `inspect` prints from the stages' types.

use std::collections::BTreeMap;

use crate::artwork::{Artwork, Hole, Lining};
use crate::cli::pipeline::Model;
use crate::cli::sources::Sources;
use crate::extract::{self, Expectation, ExtractOptions};
use crate::geom::Region;
use crate::job::{Layer, LayerId, LayerKind, Stackup};
use crate::net::{NameSource, NetId, Role};
use crate::report::inspect::{Cost, DrillLine, Inspection, LayerLine, NetLine};

/// What the region of `model` holds, and what solving it would take.
pub(crate) fn inspect(model: &Model, options: &ExtractOptions, sources: &Sources) -> Inspection {
    let (artwork, stackup) = (&model.artwork, &model.plan.stackup);
    let pieces = copper_in_window(model);
    let layers = stackup.iter().map(|(id, layer)| layer_line(artwork, &pieces, id, layer)).collect();
    let nets = model
        .slabs
        .nets
        .iter()
        .map(|net| NetLine {
            name: net.name.clone(),
            role: role_word(net.role),
            named: net.source == NameSource::Given,
            cut: net.cut,
            area_m2: net_area(model, &pieces, &net.name),
        })
        .collect();
    let cost = extract::prepare(&model.slabs, options)
        .map(|prepared| prepared.expectation(options))
        .map(cost)
        .map_err(|error| error.to_string());
    Inspection {
        title: model.plan.job.title.clone(),
        layers,
        nets,
        drills: drills(&artwork.holes, stackup),
        shorts: Vec::new(),
        cost,
        warnings: model.warnings.iter().map(|warning| sources.warning(warning)).collect(),
    }
}

/// What the reports say of an expectation.
pub(crate) fn cost(expected: Expectation) -> Cost {
    let Expectation { panels, memory, seconds, moves_border, .. } = expected;
    Cost { panels, memory, seconds, moves_border }
}

/// Copper inside the window: layer, net of the artwork, region.
type Piece = (LayerId, NetId, Region);

fn copper_in_window(model: &Model) -> Vec<Piece> {
    let window = model.slabs.window.region();
    let clip = |copper: &crate::artwork::Copper| {
        let region = copper.region.intersection(&window);
        (!region.is_empty()).then_some((copper.layer, copper.net, region))
    };
    model.artwork.copper.iter().filter_map(clip).collect()
}

fn layer_line(artwork: &Artwork, pieces: &[Piece], id: LayerId, layer: &Layer) -> LayerLine {
    let here: Vec<&Piece> = pieces.iter().filter(|(at, ..)| *at == id).collect();
    let (kind, thickness) = match layer.kind {
        LayerKind::Open { .. } => ("open", None),
        LayerKind::Coating { depth_on_laminate, .. } => ("coating", Some(depth_on_laminate)),
        LayerKind::Conductor { thickness, .. } => ("conductor", Some(thickness)),
        LayerKind::Dielectric { thickness, .. } => ("dielectric", Some(thickness)),
    };
    let material = layer.material();
    let named = |net: &NetId| artwork.nets.get(*net).source == NameSource::Given;
    LayerLine {
        name: layer.name.clone(),
        kind,
        er: material.map(|m| m.er),
        er_source: material.map(|m| m.er_source.clone()),
        thickness_m: thickness,
        area_m2: here.iter().map(|(.., region)| artwork.grid.area(region.area())).sum(),
        nets: here.iter().filter(|(_, net, _)| named(net)).count(),
        pieces: here.iter().map(|(.., region)| region.shapes().len()).sum(),
    }
}

/// Copper of the model's net `name` over all layers; nets that the job joins count together.
fn net_area(model: &Model, pieces: &[Piece], name: &str) -> f64 {
    let group = model.plan.job.nets.join.iter().find(|group| group.iter().any(|net| net.name == name));
    let is_own = |net: &NetId| {
        let other = &model.artwork.nets.get(*net).name;
        other == name || group.is_some_and(|group| group.iter().any(|net| net.name == *other))
    };
    let own = pieces.iter().filter(|(_, net, _)| is_own(net));
    own.map(|(.., region)| model.artwork.grid.area(region.area())).sum()
}

fn role_word(role: Role) -> &'static str {
    match role {
        Role::Row => "row",
        Role::Ground => "ground",
        Role::Float { .. } => "float",
    }
}

/// Holes counted by layers, lining and diameter.
fn drills(holes: &[Hole], stackup: &Stackup) -> Vec<DrillLine> {
    let mut kinds: BTreeMap<(LayerId, LayerId, bool, u64), usize> = BTreeMap::new();
    for hole in holes {
        let plated = matches!(hole.lining, Lining::Plated(_));
        // Diameters are positive, so their bits sort as they do.
        *kinds.entry((hole.from, hole.to, plated, hole.diameter.to_bits())).or_insert(0) += 1;
    }
    let line = |((from, to, plated, diameter), n_holes): ((LayerId, LayerId, bool, u64), usize)| DrillLine {
        diameter_m: f64::from_bits(diameter),
        plated,
        from: stackup.get(from).name.clone(),
        to: stackup.get(to).name.clone(),
        holes: n_holes,
    };
    kinds.into_iter().map(line).collect()
}
