//! Bisection of pieces, lengthwise and crosswise apart, until no line across a panel asks for more than one.
//!
//! A cut divides the panels that its direction asks for as evenly as whole numbers allow, so that a square plate at
//! whole density gets exactly the products of power-graded cuts, and any other shape what comes nearest.

use crate::geom::{PanelShape, Vec3};
use crate::mesh::MeshError;
use crate::mesh::decompose::Piece;
use crate::mesh::density::{Demand, Density, Nearby};
use std::sync::atomic::{AtomicUsize, Ordering};

/// Counting is given up at this multiple of the limit.
const GIVE_UP: usize = 8;
/// No piece is halved more often than this in a row.
const DEEPEST: u32 = 64;
/// A share just over a half rounds down, so that equal faces round alike.
const ROUND: f64 = 0.5 - 1e-6;

/// Panels made so far, over all threads.
#[derive(Debug)]
pub(super) struct Counter {
    made: AtomicUsize,
    limit: usize,
}

impl Counter {
    /// None made; `limit` allowed.
    pub(super) fn new(limit: usize) -> Counter {
        Counter { made: AtomicUsize::new(0), limit }
    }

    /// Counts one panel; whether it may be kept, or counting go on.
    pub(super) fn add(&self) -> (bool, bool) {
        let made = self.made.fetch_add(1, Ordering::Relaxed);
        (made < self.limit, made < self.limit.saturating_mul(GIVE_UP))
    }

    /// [`MeshError::TooMany`] when more were made than allowed.
    pub(super) fn check(&self) -> Result<(), MeshError> {
        let made = self.made.load(Ordering::Relaxed);
        if made <= self.limit {
            return Ok(());
        }
        let most = self.limit.saturating_mul(GIVE_UP);
        let needed = made.min(most);
        #[expect(clippy::cast_precision_loss, reason = "a count, for people")]
        let gigabytes = 8e-9 * needed as f64 * needed as f64;
        Err(MeshError::TooMany { needed, at_least: made > most, limit: self.limit, gigabytes })
    }
}

/// Panel shapes that cover `piece`; what is over the limit is only counted.
pub(super) fn refine(piece: &Piece, density: &Density, counter: &Counter) -> Vec<PanelShape> {
    let mut shapes = Vec::new();
    walk(piece, density, |patch| {
        let (keep, go_on) = counter.add();
        if keep {
            shapes.extend(patch.shape(piece.normal));
        }
        go_on
    });
    shapes
}

/// How many panels [`refine`] would make.
pub(super) fn count(piece: &Piece, density: &Density) -> usize {
    let mut panels = 0;
    walk(piece, density, |_| {
        panels += 1;
        true
    });
    panels
}

/// Calls `leaf` for every panel in a fixed order, until it says stop.
fn walk(piece: &Piece, density: &Density, mut leaf: impl FnMut(&Patch) -> bool) {
    let whole = Patch::new(&piece.corners);
    let (centre, radius) = whole.sphere();
    let mut open = vec![(whole, density.nearby(piece.face, centre, radius), 0)];
    while let Some((patch, above, depth)) = open.pop() {
        let (centre, radius) = patch.sphere();
        if density.is_remote(centre, radius) {
            if !leaf(&patch) {
                return;
            }
            continue;
        }
        let nearby = density.narrow(&above, centre, radius);
        match patch.cut(density, &nearby, piece.face).filter(|_| depth < DEEPEST) {
            Some([first, second]) => {
                open.push((second, nearby.clone(), depth + 1));
                open.push((first, nearby, depth + 1));
            }
            None => {
                if !leaf(&patch) {
                    return;
                }
            }
        }
    }
}

/// A quadrilateral, counter-clockwise; a triangle has its last corner twice.
#[derive(Debug, Clone, Copy)]
struct Patch {
    corners: [Vec3; 4],
    is_triangle: bool,
}

impl Patch {
    fn new(corners: &[Vec3]) -> Patch {
        match *corners {
            [a, b, c, d] => Patch { corners: [a, b, c, d], is_triangle: false },
            _ => Patch { corners: [corners[0], corners[1], corners[2], corners[2]], is_triangle: true },
        }
    }

    fn shape(&self, normal: Vec3) -> Option<PanelShape> {
        PanelShape::new(&self.corners[..if self.is_triangle { 3 } else { 4 }], normal)
    }

    fn sphere(&self) -> (Vec3, f64) {
        let centre = self.corners.iter().sum::<Vec3>() / 4.0;
        (centre, self.corners.iter().map(|c| (c - centre).norm()).fold(0.0, f64::max))
    }

    /// The same triangle with the next corner as its apex; a quadrilateral seen from the next side.
    fn turned(&self) -> Patch {
        let [a, b, c, d] = self.corners;
        let corners = if self.is_triangle { [b, c, a, a] } else { [b, c, d, a] };
        Patch { corners, ..*self }
    }

    /// The two parts, in the direction that asks for most; `None` when no direction asks for more than one panel.
    fn cut(&self, density: &Density, nearby: &Nearby, face: u32) -> Option<[Patch; 2]> {
        // Lines from the first side to the third: two ways for a quadrilateral, three for a triangle.
        let ways = if self.is_triangle { 3 } else { 2 };
        let mut best: Option<(f64, Demand, Patch)> = None;
        let mut view = *self;
        for _ in 0..ways {
            let demand = view.demand(density, nearby, face);
            if best.as_ref().is_none_or(|b| demand.total() > b.0 * (1.0 + 1e-9)) {
                best = Some((demand.total(), demand, view));
            }
            view = view.turned();
        }
        let (total, demand, view) = best?;
        let wanted = (total + ROUND).floor();
        if wanted < 1.5 {
            return None;
        }
        let part = (wanted / 2.0).floor() / wanted;
        Some(view.parted(density.place(&demand, part).clamp(1e-9, 1.0 - 1e-9)))
    }

    /// The most demanding of three lines from the first side to the third.
    fn demand(&self, density: &Density, nearby: &Nearby, face: u32) -> Demand {
        let [a, b, c, d] = self.corners;
        let line = |t: f64| density.demand(nearby, face, a + t * (b - a), d + t * (c - d));
        let (left, middle, right) = (line(0.0), line(0.5), line(1.0));
        let side = if right.total() > left.total() * (1.0 + 1e-9) { right } else { left };
        if side.total() > middle.total() * (1.0 + 1e-9) { side } else { middle }
    }

    /// Cut across the lines from the first side to the third, at the fraction `f` of each.
    fn parted(&self, f: f64) -> [Patch; 2] {
        let [a, b, c, d] = self.corners;
        let (left, right) = (a + f * (d - a), b + f * (c - b));
        [
            Patch { corners: [a, b, right, left], is_triangle: false },
            Patch { corners: [left, right, c, d], is_triangle: self.is_triangle },
        ]
    }
}
