//! The one rule: which pair of fills gives which face, and which gives none.

use crate::faces::body::Bodies;
use crate::faces::{BodyId, FaceKind};
use crate::net::NetId;
use crate::slab::Fill;

/// What separates two fills.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Verdict {
    /// Same net, or equal permittivity.
    Nothing,
    /// A face whose normal points from the first fill to the second.
    Forward(FaceKind),
    /// A face whose normal points from the second fill to the first.
    Backward(FaceKind),
    /// Two nets touch.
    Short(NetId, NetId),
}

/// What lies between `first` and `second`. Metal's faces point out of the metal; interfaces from `first` to `second`.
pub(crate) fn verdict(first: Fill, second: Fill, bodies: &Bodies) -> Verdict {
    match (first, second) {
        (Fill::Metal(a), Fill::Metal(b)) if a == b => Verdict::Nothing,
        (Fill::Metal(a), Fill::Metal(b)) => Verdict::Short(a, b),
        (Fill::Metal(net), Fill::Dielectric(m)) => {
            Verdict::Forward(FaceKind::Conductor { net, body: bodies.of(m) })
        }
        (Fill::Dielectric(m), Fill::Metal(net)) => {
            Verdict::Backward(FaceKind::Conductor { net, body: bodies.of(m) })
        }
        (Fill::Dielectric(a), Fill::Dielectric(b)) => {
            let (from, to): (BodyId, BodyId) = (bodies.of(a), bodies.of(b));
            if from == to { Verdict::Nothing } else { Verdict::Forward(FaceKind::Interface { from, to }) }
        }
    }
}
