//! Ground planes done by images: where they lie, and what touches them.

use crate::artwork::{Artwork, Lining};
use crate::diag::{Origin, Warning};
use crate::geom::region::Point;
use crate::job::{Job, LayerId, Stackup};
use crate::net::{ModelNet, NameSource, NetId, Role};
use crate::slab::ImagePlanes;
use crate::slab::copper::Metal;
use crate::slab::error::{Place, SlabError};
use crate::slab::pile::{EntryKind, Pile};

/// The planes with the layers that they stand for.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Planes {
    below: Option<(LayerId, f64)>,
    above: Option<(LayerId, f64)>,
}

impl Planes {
    /// For the model.
    pub(crate) fn images(&self) -> ImagePlanes {
        ImagePlanes { below: self.below.map(|(_, z)| z), above: self.above.map(|(_, z)| z) }
    }
}

/// A piece of metal as the planes see it: net of the model, the layers it spans, a point, where it comes from.
struct Piece {
    net: NetId,
    from: LayerId,
    to: LayerId,
    at: Point,
    origin: Origin,
}

/// The planes of `job`. The single plane lies below when row copper lies above its layer.
pub(crate) fn planes(
    stackup: &Stackup,
    pile: &Pile,
    job: &Job,
    row_layers: &[LayerId],
    errors: &mut Vec<SlabError>,
) -> Planes {
    let mut layers: Vec<LayerId> = Vec::new();
    for named in &job.nets.ground_planes {
        let mut bad =
            |why| errors.push(SlabError::BadPlane { name: named.name.clone(), why, origin: named.origin });
        let found = stackup.find(&named.name).and_then(|id| pile.entry(id));
        match found {
            None => bad("which the stackup lacks"),
            Some(entry) if entry.kind != EntryKind::Conductor => bad("which is not a conductor layer"),
            Some(entry) if layers.contains(&entry.layer) => bad("twice"),
            Some(_) if layers.len() == 2 => bad("the third plane"),
            Some(entry) => layers.push(entry.layer),
        }
    }
    // Counted from the top: the larger id lies lower.
    layers.sort();
    let z = |id: LayerId, upper: bool| pile.entry(id).map(|e| (id, if upper { e.z_hi } else { e.z_lo }));
    match layers.as_slice() {
        [] => Planes::default(),
        [one] if row_layers.iter().any(|row| row < one) => Planes { below: z(*one, true), above: None },
        [one] => Planes { below: None, above: z(*one, false) },
        [upper, lower, ..] => Planes { below: z(*lower, true), above: z(*upper, false) },
    }
}

/// Checks that no row or named floating net touches a plane; numbered islands that do become ground.
pub(crate) fn check_contact(
    (artwork, stackup, pile): (&Artwork, &Stackup, &Pile),
    planes: &Planes,
    (metals, model_id): (&[Metal], &[Option<NetId>]),
    nets: &mut [ModelNet],
    (errors, warnings): (&mut Vec<SlabError>, &mut Vec<Warning>),
) {
    let copper = metals.iter().filter_map(|m| {
        Some(Piece {
            net: model_id[m.net.idx()]?,
            from: m.layer,
            to: m.layer,
            at: m.wide.corner()?,
            origin: m.origin,
        })
    });
    let barrels = artwork.holes.iter().filter_map(|hole| match hole.lining {
        Lining::Plated(net) => Some(Piece {
            net: model_id[net.idx()]?,
            from: hole.from,
            to: hole.to,
            at: hole.at,
            origin: hole.origin,
        }),
        Lining::Bare => None,
    });
    for piece in copper.chain(barrels) {
        for (plane, sign) in [(planes.below, 1.0), (planes.above, -1.0)] {
            let Some((layer, z)) = plane else { continue };
            // Seen from the plane, the model lies in the direction of `sign`.
            let ends = [piece.from, piece.to].map(|id| pile.entry(id).map_or((z, z), |e| (e.z_lo, e.z_hi)));
            let nearest = sign * if sign > 0.0 { ends[1].0 } else { ends[0].1 };
            if nearest > sign * z + 1e-3 * artwork.grid.step() {
                continue;
            }
            let farthest = sign * if sign > 0.0 { ends[0].1 } else { ends[1].0 };
            let beyond = farthest <= sign * z && piece.from != layer && piece.to != layer;
            let net = &mut nets[piece.net.idx()];
            match (net.role, net.source) {
                (Role::Ground, _) => {}
                (Role::Float { .. }, NameSource::Numbered) => {
                    if !beyond {
                        net.role = Role::Ground;
                        let text = format!(
                            "the unnamed copper `{}` touches the ground plane and is ground",
                            net.name
                        );
                        warnings.push(Warning::new(text, piece.origin));
                    }
                }
                _ => errors.push(SlabError::PlaneShort {
                    net: net.name.clone(),
                    plane: stackup.get(layer).name.clone(),
                    how: if beyond { "has copper beyond" } else { "touches" },
                    place: Place::new(artwork.grid, piece.at),
                    origin: piece.origin,
                }),
            }
        }
    }
}
