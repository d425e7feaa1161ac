//! The size function: how many panels a line across a face must be cut into.
//!
//! Near a graded edge the k-th of n cuts lies at L (k/n)^b, so a stretch of line takes as many panels as
//! s(x) = n (x/L)^(1/b) grows along it; beyond L panels grow in proportion to x, and beyond X to x². Only distance counts that is gained
//! square to the edge: along it panels may be long. See `docs/formulation.md`, "Grading".

use crate::faces::{EdgeGrade, Face, FaceKind, Faces};
use crate::geom::Vec3;
use crate::mesh::edge_tree::EdgeTree;
use crate::net::{NetId, Role};
use std::collections::BTreeMap;

/// Every graded edge, sorted by face, and the density.
#[derive(Debug)]
pub(super) struct Density {
    edges: Vec<GradedEdge>,
    /// The edges of each face.
    own: Vec<EdgeTree>,
    /// Conductor edges, each once, that other nets and interfaces must heed.
    foreign: EdgeTree,
    nets: Vec<Option<NetId>>,
    n: f64,
    /// Boxes around the faces of row nets, m; empty when every net has a row.
    rows: Vec<[Vec3; 2]>,
}

/// An edge at which charge crowds.
#[derive(Debug, Clone, Copy)]
struct GradedEdge {
    start: Vec3,
    along: Vec3,
    length: f64,
    /// L: within this distance the power law holds, m.
    feature: f64,
    /// X: beyond this distance the edge looks short and its bearing fades, m.
    fades: f64,
    /// b.
    power: f64,
    face: u32,
    net: Option<NetId>,
}

/// Edges that bear on one panel; a panel's parts need no others.
#[derive(Debug, Clone, Default)]
pub(super) struct Nearby {
    own: Vec<u32>,
    foreign: Vec<u32>,
}

/// An interface nearer to an edge than 1 / `FILM` of the edge's feature size is graded less. Measured on a plate over a
/// film of 1/80 of its half width, er 7.5: with 10 the error at a given number of panels is half of that with 1.
const FILM: f64 = 10.0;
/// Nearer than this part of L a point is on the edge: a cube root makes 1e-5 panels of a distance that is only rounding, and
/// the same face would be cut differently at another size. The first of 100 cuts lies at 1e-8 L.
const ON_EDGE: f64 = 1e-11;
/// Points at which a line is probed, less one.
const STEPS: usize = 8;
/// Edges that ask for less than this many panels across a panel are left out for its parts.
const NEGLIGIBLE: f64 = 0.4;

/// What a line across a panel asks for.
#[derive(Debug, Clone, Copy)]
pub(super) struct Demand {
    /// Panels asked for from the start to each probe.
    sums: [f64; STEPS + 1],
    /// For each step, the own edge that asked, and its distance at both ends.
    by: [Option<(u32, f64, f64)>; STEPS],
}

impl Density {
    /// Edges of `faces` at density `n`.
    pub(super) fn new(all: &Faces, n: f64) -> Density {
        let faces = all.faces.as_slice();
        let mut edges = Vec::new();
        let mut ranges = Vec::with_capacity(faces.len());
        for (face, id) in faces.iter().zip(0u32..) {
            let first = index(edges.len());
            edges.extend(graded_edges(face, id));
            ranges.push(first..index(edges.len()));
        }
        let foreign = share_features(&mut edges);
        let tree = |numbers: Vec<u32>| {
            let ends = |k: u32| {
                let edge = &edges[k as usize];
                (k, edge.start, edge.start + edge.length * edge.along)
            };
            EdgeTree::new(numbers.into_iter().map(ends).collect())
        };
        let own = ranges.into_iter().map(|range| tree(range.collect())).collect();
        let foreign = tree(foreign);
        let nets = faces.iter().map(net_of).collect();
        Density { edges, own, foreign, nets, n, rows: row_boxes(all) }
    }

    /// Whether a panel inside the sphere is so small for its distance from every row net that it need not be
    /// cut, whatever edges are near it: its diameter is at most 1/n of that distance.
    pub(super) fn is_remote(&self, centre: Vec3, radius: f64) -> bool {
        let distance = |[lo, hi]: &[Vec3; 2]| (lo - centre).sup(&(centre - hi)).sup(&Vec3::zeros()).norm();
        !self.rows.is_empty() && self.rows.iter().all(|row| 2.0 * radius * self.n <= distance(row) - radius)
    }

    /// Edges that bear on a panel of `face` inside the sphere.
    pub(super) fn nearby(&self, face: u32, centre: Vec3, radius: f64) -> Nearby {
        // Beyond this distance no edge asks for more than a negligible part, whatever its power (3 or more).
        let reach = radius * (1.0 + 2.0 * self.n / (3.0 * NEGLIGIBLE));
        let net = self.nets[face as usize];
        let heeds = |k: &u32| {
            let edge = &self.edges[*k as usize];
            edge.face != face && (net.is_none() || edge.net != net)
        };
        Nearby {
            own: self.own[face as usize].within(centre, reach),
            foreign: self.foreign.within(centre, reach).into_iter().filter(heeds).collect(),
        }
    }

    /// Those of `nearby` that bear on a part inside the sphere.
    pub(super) fn narrow(&self, nearby: &Nearby, centre: Vec3, radius: f64) -> Nearby {
        let far = |k: u32| {
            let edge = &self.edges[k as usize];
            let distance = edge.distance(centre);
            (edge, (distance - radius).max(0.0), distance + radius)
        };
        let mut own: Vec<(f64, u32)> = Vec::with_capacity(nearby.own.len());
        for &k in &nearby.own {
            let (edge, lo, hi) = far(k);
            if edge.most(lo, hi, self.n) > NEGLIGIBLE
                && edge.cells(hi, self.n) - edge.cells(lo, self.n) > NEGLIGIBLE
            {
                own.push((lo + hi, k));
            }
        }
        // The nearest first, since what asks for most rules the others out cheaply.
        own.sort_unstable_by(|p, q| p.0.total_cmp(&q.0).then(p.1.cmp(&q.1)));
        let foreign = nearby.foreign.iter().copied().filter(|k| {
            let (edge, lo, _) = far(*k);
            edge.most(lo, lo + 2.0 * radius, self.n) > NEGLIGIBLE
        });
        Nearby { own: own.into_iter().map(|(_, k)| k).collect(), foreign: foreign.collect() }
    }

    /// What the line from `from` to `to`, on a panel of `face`, asks for.
    pub(super) fn demand(&self, nearby: &Nearby, face: u32, from: Vec3, to: Vec3) -> Demand {
        let mut steps = [0.0; STEPS];
        let mut by = [None; STEPS];
        for &k in &nearby.own {
            let edge = &self.edges[k as usize];
            let distance = |i: usize| edge.distance(from + (to - from) * fraction(i));
            let mut near = distance(0);
            for i in 0..STEPS {
                let far = distance(i + 1);
                if edge.most(near.min(far), near.max(far), self.n) <= steps[i] {
                    near = far;
                    continue;
                }
                let asked = (edge.cells(far, self.n) - edge.cells(near, self.n)).abs();
                if asked > steps[i] {
                    steps[i] = asked;
                    by[i] = Some((k, near, far));
                }
                near = far;
            }
        }
        for &k in &nearby.foreign {
            let asked = self.edges[k as usize].passing(from, to, self.n, self.nets[face as usize].is_some());
            for i in 0..STEPS {
                if asked[i] > steps[i] {
                    steps[i] = asked[i];
                    by[i] = None;
                }
            }
        }
        let mut sums = [0.0; STEPS + 1];
        for i in 0..STEPS {
            sums[i + 1] = sums[i] + steps[i];
        }
        Demand { sums, by }
    }

    /// Where along the line of `demand`, 0 to 1, the share `part` of the panels is reached.
    pub(super) fn place(&self, demand: &Demand, part: f64) -> f64 {
        let wanted = part * demand.total();
        let i = (0..STEPS - 1).find(|i| wanted <= demand.sums[i + 1]).unwrap_or(STEPS - 1);
        let step = demand.sums[i + 1] - demand.sums[i];
        let share = if step > 0.0 { ((wanted - demand.sums[i]) / step).clamp(0.0, 1.0) } else { 0.5 };
        let within = match demand.by[i] {
            Some((k, near, far)) => {
                let edge = &self.edges[k as usize];
                let (a, b) = (edge.cells(near, self.n), edge.cells(far, self.n));
                ((edge.distance_at(a + share * (b - a), self.n) - near) / (far - near)).clamp(0.0, 1.0)
            }
            None => share,
        };
        fraction(i) + within / STEPS as f64
    }
}

impl Demand {
    /// Panels asked for along the whole line.
    pub(super) fn total(&self) -> f64 {
        self.sums[STEPS]
    }
}

impl GradedEdge {
    fn distance(&self, at: Vec3) -> f64 {
        let offset = at - self.start;
        let nearest = offset.dot(&self.along).clamp(0.0, self.length);
        (offset - nearest * self.along).norm()
    }

    /// s(x): panels from the edge to distance `x`.
    fn cells(&self, x: f64, n: f64) -> f64 {
        let ratio = x / self.feature;
        if ratio < ON_EDGE {
            0.0
        } else if ratio <= 1.0 {
            n * if self.power < 3.5 { ratio.cbrt() } else { ratio.sqrt().sqrt() }
        } else if x <= self.fades {
            n * (1.0 + ratio.ln() / self.power)
        } else {
            n * (1.0 + (self.fades / self.feature).ln() / self.power + (1.0 - self.fades / x) / self.power)
        }
    }

    /// Bound on what [`Self::cells`] gains from distance `lo` to `hi`.
    fn most(&self, lo: f64, hi: f64, n: f64) -> f64 {
        n / self.power * (hi - lo) / lo * (self.fades / lo).min(1.0)
    }

    /// The inverse of [`Self::cells`].
    fn distance_at(&self, cells: f64, n: f64) -> f64 {
        let share = cells / n;
        if share <= 1.0 {
            return self.feature * share.powf(self.power);
        }
        let beyond = (share - 1.0) * self.power;
        let tail = beyond - (self.fades / self.feature).ln();
        if tail <= 0.0 { self.feature * beyond.exp() } else { self.fades / (1.0 - tail).max(f64::EPSILON) }
    }

    /// Panels that the steps of a line take which passes the edge at a distance. `at_full` ignores that an edge
    /// much nearer than its feature size concentrates little charge there.
    fn passing(&self, from: Vec3, to: Vec3, n: f64, at_full: bool) -> [f64; STEPS] {
        let length = (to - from).norm();
        let along = (to - from) / length;
        let cosine = along.dot(&self.along);
        let sine = (1.0 - cosine * cosine).max(0.0).sqrt();
        // Closest approach of the line to the segment: first of the two lines, then with the segment's ends kept.
        let offset = from - self.start;
        let on_edge = if sine > 1e-6 {
            ((offset.dot(&self.along) - cosine * offset.dot(&along)) / (sine * sine)).clamp(0.0, self.length)
        } else {
            offset.dot(&self.along).clamp(0.0, self.length)
        };
        let nearest = self.start + on_edge * self.along;
        let s0 = (nearest - from).dot(&along);
        let gap = (nearest - from - s0 * along).norm().max(1e-9 * self.feature);
        let near = if at_full { 1.0 } else { (FILM * gap / self.feature).powf(1.0 / self.power).min(1.0) };
        let weight = near * (self.fades / gap).min(1.0);
        let upto = |i: usize| (sine * (fraction(i) * length - s0) / gap).asinh();
        let mut asked = [0.0; STEPS];
        let mut before = upto(0);
        for (i, slot) in asked.iter_mut().enumerate() {
            let after = upto(i + 1);
            *slot = weight * n / self.power * (after - before);
            before = after;
        }
        asked
    }
}

/// Position of probe `i` along its line.
fn fraction(i: usize) -> f64 {
    i as f64 / STEPS as f64
}

/// Boxes around the faces of row nets; none when every conductor face belongs to one.
fn row_boxes(all: &Faces) -> Vec<[Vec3; 2]> {
    let is_row = |net: NetId| all.nets.get(net.idx()).is_some_and(|net| net.role == Role::Row);
    if all.faces.iter().filter_map(net_of).all(is_row) {
        return Vec::new();
    }
    let of_rows = all.faces.iter().filter(|face| net_of(face).is_some_and(is_row));
    of_rows
        .map(|face| {
            let points = || face.rings.iter().flat_map(|ring| &ring.points);
            let lo = points().fold(Vec3::repeat(f64::INFINITY), |m, p| m.inf(p));
            [lo, points().fold(Vec3::repeat(f64::NEG_INFINITY), |m, p| m.sup(p))]
        })
        .collect()
}

fn index(k: usize) -> u32 {
    u32::try_from(k).unwrap_or(u32::MAX)
}

fn net_of(face: &Face) -> Option<NetId> {
    match face.kind {
        FaceKind::Conductor { net, .. } | FaceKind::Sheet { net, .. } => Some(net),
        FaceKind::Interface { .. } => None,
    }
}

/// The graded edges of a face; L is half the width of the face square to the edge, and no more than twice its area
/// over its perimeter, so that the end of a long strip counts the strip's width and not its length.
fn graded_edges(face: &Face, id: u32) -> Vec<GradedEdge> {
    let sides = || {
        face.rings.iter().flat_map(|ring| {
            let n = ring.points.len();
            (0..n).map(move |k| (ring.points[k], ring.points[(k + 1) % n], ring.edges.get(k).copied()))
        })
    };
    let perimeter: f64 = sides().map(|(p, q, _)| (q - p).norm()).sum();
    let first = face.rings.first().and_then(|ring| ring.points.first()).copied().unwrap_or_default();
    let area: f64 = sides().map(|(p, q, _)| 0.5 * face.normal.dot(&(p - first).cross(&(q - first)))).sum();
    let mut edges = Vec::new();
    for (start, end, grade) in sides() {
        let length = (end - start).norm();
        let power = match grade {
            Some(EdgeGrade::Solid) => 3.0,
            Some(EdgeGrade::Rim) => 4.0,
            Some(EdgeGrade::Smooth) | None => continue,
        };
        if length <= 0.0 {
            continue;
        }
        let along = (end - start) / length;
        let inward = face.normal.cross(&along);
        let middle = 0.5 * (start + end);
        // Width of the face square to the middle of the edge.
        let mut width = f64::INFINITY;
        for (p, q, _) in sides() {
            let (pu, qu) = ((p - middle).dot(&along), (q - middle).dot(&along));
            if (pu > 0.0) != (qu > 0.0) {
                let (pv, qv) = ((p - middle).dot(&inward), (q - middle).dot(&inward));
                let v = pv + (qv - pv) * pu / (pu - qu);
                if v > 1e-9 * perimeter && v < width {
                    width = v;
                }
            }
        }
        let feature = (0.5 * width).min(2.0 * area / perimeter);
        let fades = length.max(2.0 * feature);
        edges.push(GradedEdge { start, along, length, feature, fades, power, face: id, net: net_of(face) });
    }
    edges
}

/// Gives the copies of an edge, one per face that meets there, the largest L that a conductor's face has; returns
/// one copy of each conductor edge.
fn share_features(edges: &mut [GradedEdge]) -> Vec<u32> {
    let reach = edges.iter().map(|e| e.start.amax().max(e.length)).fold(0.0, f64::max);
    let round = |v: Vec3| {
        #[expect(clippy::cast_possible_truncation, reason = "below 1e9")]
        (v * (1e9 / reach)).iter().map(|c| c.round() as i64).collect::<Vec<_>>()
    };
    let key = |edge: &GradedEdge| {
        let (a, b) = (round(edge.start), round(edge.start + edge.length * edge.along));
        if a <= b { (a, b) } else { (b, a) }
    };
    let mut shared: BTreeMap<_, (f64, u32)> = BTreeMap::new();
    for (edge, k) in edges.iter().zip(0u32..).filter(|(edge, _)| edge.net.is_some()) {
        let entry = shared.entry(key(edge)).or_insert((edge.feature, k));
        entry.0 = entry.0.max(edge.feature);
    }
    for edge in edges.iter_mut() {
        if let Some((feature, _)) = shared.get(&key(edge)) {
            edge.feature = *feature;
            edge.fades = edge.length.max(2.0 * feature);
        }
    }
    shared.values().map(|(_, k)| *k).collect()
}
