//! Cuts from re-entrant corners, shortest first, until every piece of a polygon with holes is convex.
//!
//! The rings are linked lists; a cut from one corner to another either splits a list or joins two, by the same
//! relinking, so holes need no bridges of their own. A cut lies between the straight continuations of the two edges
//! at its corner and so settles that corner at once; a target that is re-entrant too may be settled by the same cut.

use crate::mesh::outline::{Corner, Outline, P2, cross};
use std::cmp::Reverse;
use std::collections::{BTreeMap, BinaryHeap};

/// Rounding of a coordinate, relative to the extent: a hit this close to a corner is the corner.
const SNAP: f64 = 1e-13;
/// A corner re-entrant by less than this, relative to the extent, counts as straight.
const STRAIGHT: f64 = 1e-12;

/// Scores are whole multiples of this part of the extent. Cuts of equal worth then stay equal whatever rounding did to them,
/// and the one that is found first is taken: the same shape is cut in the same way at any size.
const TIE: f64 = 1e-9;

/// Convex rings that cover the outline; `None` when its rings cross.
pub(super) fn convex_rings(outline: &Outline) -> Option<Vec<Vec<Corner>>> {
    let mut web = Web::new(outline);
    web.separate_touching();
    let mut heap: BinaryHeap<Reverse<(u64, usize)>> =
        (0..web.nodes.len()).filter(|k| web.is_reentrant(*k)).map(|k| Reverse((0, k))).collect();
    while let Some(Reverse((key, node))) = heap.pop() {
        if !web.is_reentrant(node) {
            continue;
        }
        let cut = web.best_cut(node)?;
        // Scores are not negative, so their bits order as they do.
        let now = cut.score.to_bits();
        if now > key {
            heap.push(Reverse((now, node)));
            continue;
        }
        let target = match cut.target {
            Target::Corner(target) => target,
            Target::Edge(start, fraction) => web.insert(start, fraction),
        };
        let first_new = web.nodes.len();
        web.link(node, target);
        let touched = [node, target, first_new, first_new + 1];
        heap.extend(touched.iter().filter(|k| web.is_reentrant(**k)).map(|k| Reverse((0, *k))));
    }
    Some(web.rings())
}

#[derive(Debug, Clone, Copy)]
struct Node {
    corner: Corner,
    prev: usize,
    next: usize,
}

#[derive(Debug, Clone, Copy)]
enum Target {
    Corner(usize),
    /// The edge that starts at a node, and where along it.
    Edge(usize, f64),
}

#[derive(Debug, Clone, Copy)]
struct Cut {
    score: f64,
    target: Target,
}

struct Web {
    nodes: Vec<Node>,
    grid: Grid,
    extent: f64,
}

impl Web {
    fn new(outline: &Outline) -> Web {
        let mut nodes = Vec::new();
        for ring in &outline.rings {
            let (base, n) = (nodes.len(), ring.len());
            nodes.extend(ring.iter().enumerate().map(|(k, corner)| Node {
                corner: *corner,
                prev: base + (k + n - 1) % n,
                next: base + (k + 1) % n,
            }));
        }
        let mut web = Web { grid: Grid::new(&nodes), nodes, extent: outline.extent };
        for k in 0..web.nodes.len() {
            web.index(k);
        }
        web
    }

    fn at(&self, k: usize) -> P2 {
        self.nodes[k].corner.at
    }

    /// Direction of the edge that ends at `k` and of the one that starts there.
    fn edges(&self, k: usize) -> (P2, P2) {
        let node = &self.nodes[k];
        (self.at(k) - self.at(node.prev), self.at(node.next) - self.at(k))
    }

    fn index(&mut self, k: usize) {
        let (from, to) = (self.at(k), self.at(self.nodes[k].next));
        self.grid.add(from, to, k);
    }

    fn is_reentrant(&self, k: usize) -> bool {
        let (a, b) = self.edges(k);
        let (turn, reach) = (cross(a, b), STRAIGHT * self.extent * (a.norm() + b.norm()));
        turn < -reach || (turn.abs() <= reach && a.dot(&b) < 0.0)
    }

    /// At points where several rings meet, pairs the edges so that the inner angles do not overlap.
    fn separate_touching(&mut self) {
        let mut meets: BTreeMap<(u64, u64), Vec<usize>> = BTreeMap::new();
        for k in 0..self.nodes.len() {
            let at = self.at(k) + P2::zeros();
            meets.entry((at.x.to_bits(), at.y.to_bits())).or_default().push(k);
        }
        for group in meets.values().filter(|group| group.len() > 1) {
            let incoming: Vec<(usize, P2)> =
                group.iter().map(|k| (self.nodes[*k].prev, -self.edges(*k).0)).collect();
            for &k in group {
                let out = self.edges_out(k);
                let angle = |d: &P2| {
                    let turn = cross(out, *d).atan2(out.dot(d));
                    if turn > 0.0 { turn } else { turn + std::f64::consts::TAU }
                };
                if let Some((prev, _)) = incoming.iter().min_by(|p, q| angle(&p.1).total_cmp(&angle(&q.1))) {
                    self.nodes[k].prev = *prev;
                    self.nodes[*prev].next = k;
                }
            }
        }
    }

    fn edges_out(&self, k: usize) -> P2 {
        // The successor of k never changes position while rings are separated, only its identity.
        self.at(self.nodes[k].next) - self.at(k)
    }

    /// Whether the direction `d` from `k` settles it: on neither side an angle above 180 degrees stays.
    fn settles(&self, k: usize, d: P2) -> bool {
        let (a, b) = self.edges(k);
        let slack = -1e-12 * d.norm();
        cross(a, d) >= slack * a.norm() && cross(b, d) >= slack * b.norm()
    }

    /// Whether the direction `d` from `k` points into the polygon.
    fn points_inside(&self, k: usize, d: P2) -> bool {
        let (a, b) = self.edges(k);
        if self.is_reentrant(k) {
            cross(a, d) > 0.0 || cross(b, d) > 0.0
        } else {
            cross(a, d) > 0.0 && cross(b, d) > 0.0
        }
    }

    /// The cheapest cut that settles the re-entrant corner `k`.
    fn best_cut(&self, k: usize) -> Option<Cut> {
        let (a, b) = self.edges(k);
        let mut best: Option<Cut> = None;
        let mut offer = |cut: Cut| {
            if best.is_none_or(|b| cut.score < b.score) {
                best = Some(cut);
            }
        };
        let bisector = a.normalize() - b.normalize();
        let rays = [(a, 1.0), (-b, 1.0), (bisector, 1.2)];
        let mut walls = Vec::new();
        for (d, factor) in rays {
            if d.norm() > 0.0
                && self.settles(k, d)
                && let Some(hit) = self.cast(k, d.normalize())
            {
                walls.push(hit.edge);
                self.judge(k, &hit, factor).into_iter().for_each(&mut offer);
            }
        }
        for edge in walls {
            // Square onto a wall that a ray has met.
            let f = self.at(self.nodes[edge].next) - self.at(edge);
            let d = P2::new(f.y, -f.x);
            if self.settles(k, d)
                && let Some(hit) = self.cast(k, d.normalize())
            {
                self.judge(k, &hit, 1.1).into_iter().for_each(&mut offer);
            }
        }
        let reach = best.map_or(2.0 * self.extent, |b| b.score / BOTH);
        let mut targets = self.corner_targets(k, reach);
        targets.sort_by(|p, q| p.0.total_cmp(&q.0).then(p.1.cmp(&q.1)));
        for (score, target) in targets {
            if best.is_some_and(|b| b.score <= score) {
                break;
            }
            if self.sees(k, target) {
                return Some(Cut { score, target: Target::Corner(target) });
            }
        }
        best
    }

    /// At least 1: how much dearer a cut is for the sharp corner that it leaves between the direction `d` and an
    /// edge at `k`.
    fn sharpness(&self, k: usize, d: P2) -> f64 {
        let (a, b) = self.edges(k);
        let worth = |e: P2| if e.dot(&d) <= 0.0 { 1.0 } else { cross(e, d).abs() / (e.norm() * d.norm()) };
        1.0 / worth(b).min(worth(-a)).max(0.1)
    }

    /// The cut along a ray: to the corner that it meets, or to the edge.
    fn judge(&self, k: usize, hit: &Hit, factor: f64) -> Option<Cut> {
        let next = self.nodes[hit.edge].next;
        let length = (self.at(next) - self.at(hit.edge)).norm();
        let ends = [(hit.edge, hit.fraction * length), (next, (1.0 - hit.fraction) * length)];
        for (end, gap) in ends {
            if gap <= SNAP * self.extent {
                let back = self.at(k) - self.at(end);
                let factor = if self.settles_too(end, back) { BOTH } else { factor };
                let score = hit.distance * factor * self.sharpness(k, -back).max(self.sharpness(end, back));
                let score = self.rounded(score);
                return self.points_inside(end, back).then_some(Cut { score, target: Target::Corner(end) });
            }
        }
        let near = ends.iter().any(|(_, gap)| *gap < 0.15 * hit.distance);
        let (d, f) = (hit.direction, (self.at(next) - self.at(hit.edge)) / length);
        let sharp = self.sharpness(k, d).max(1.0 / cross(d, f).abs().max(0.1));
        let score = hit.distance * factor * sharp * if near { 1.6 } else { 1.0 };
        Some(Cut { score: self.rounded(score), target: Target::Edge(hit.edge, hit.fraction) })
    }

    /// A score without what rounding may have added.
    fn rounded(&self, score: f64) -> f64 {
        let unit = TIE * self.extent;
        (score / unit).round() * unit
    }

    fn settles_too(&self, k: usize, d: P2) -> bool {
        self.is_reentrant(k) && self.settles(k, d)
    }

    /// Corners within `reach` that settle `k`, with their scores; sight is not yet checked.
    fn corner_targets(&self, k: usize, reach: f64) -> Vec<(f64, usize)> {
        let here = self.at(k);
        let mut found = Vec::new();
        self.grid.visit_box(here, reach, |edge| found.push(edge));
        found.sort_unstable();
        found.dedup();
        found
            .into_iter()
            .filter_map(|target| {
                let d = self.at(target) - here;
                let distance = d.norm();
                if !(distance > 0.0
                    && distance < reach
                    && self.settles(k, d)
                    && self.points_inside(target, -d))
                {
                    return None;
                }
                let factor = if self.settles_too(target, -d) { BOTH } else { 0.9 };
                let sharp = self.sharpness(k, d).max(self.sharpness(target, -d));
                Some((self.rounded(distance * factor * sharp), target))
            })
            .collect()
    }

    fn sees(&self, k: usize, target: usize) -> bool {
        let d = self.at(target) - self.at(k);
        let distance = d.norm();
        match self.cast_up_to(k, d / distance, distance * (1.0 - 1e-9)) {
            None => true,
            Some(hit) => hit.distance >= distance - 2.0 * SNAP * self.extent,
        }
    }

    fn cast(&self, k: usize, d: P2) -> Option<Hit> {
        let mut reach = 2.0 * self.grid.cell;
        loop {
            if let Some(hit) = self.cast_up_to(k, d, reach) {
                return Some(hit);
            }
            if reach > 4.0 * self.extent {
                return None;
            }
            reach *= 4.0;
        }
    }

    /// The nearest edge that faces `k` along the unit direction `d`, no farther than `reach`.
    fn cast_up_to(&self, k: usize, d: P2, reach: f64) -> Option<Hit> {
        let here = self.at(k);
        let snap = SNAP * self.extent;
        let mut best: Option<Hit> = None;
        self.grid.visit_line(here, here + d * reach, |edge| {
            let (start, end) = (self.at(edge), self.at(self.nodes[edge].next));
            if start == here || end == here {
                return;
            }
            let (p, f) = (start - here, end - start);
            let (ahead, facing, length) = (cross(d, f), cross(p, f), f.norm());
            if !(ahead > 0.0 && facing > snap * length) {
                return;
            }
            let (distance, fraction) = (facing / ahead, cross(p, d) / ahead);
            let slack = snap / length;
            if distance > reach || fraction < -slack || fraction > 1.0 + slack {
                return;
            }
            if best.is_none_or(|b| distance < b.distance) {
                best = Some(Hit { edge, fraction, distance, direction: d });
            }
        });
        best
    }

    /// A new node on the edge that starts at `start`.
    fn insert(&mut self, start: usize, fraction: f64) -> usize {
        let end = self.nodes[start].next;
        let at = self.at(start) + fraction * (self.at(end) - self.at(start));
        let new = self.nodes.len();
        self.nodes.push(Node { corner: Corner { at, source: u32::MAX }, prev: start, next: end });
        self.nodes[start].next = new;
        self.nodes[end].prev = new;
        self.index(new);
        new
    }

    /// Cuts along the segment from `a` to `b`: both get a twin, and the lists are exchanged behind them.
    fn link(&mut self, a: usize, b: usize) {
        let (a_twin, b_twin) = (self.nodes.len(), self.nodes.len() + 1);
        let (a_next, b_prev) = (self.nodes[a].next, self.nodes[b].prev);
        self.nodes.push(Node { corner: self.nodes[a].corner, prev: b_twin, next: a_next });
        self.nodes.push(Node { corner: self.nodes[b].corner, prev: b_prev, next: a_twin });
        self.nodes[a_next].prev = a_twin;
        self.nodes[b_prev].next = b_twin;
        self.nodes[a].next = b;
        self.nodes[b].prev = a;
        for k in [a, a_twin, b_twin] {
            self.index(k);
        }
    }

    /// Every ring once, without corners that are straight to rounding.
    fn rings(&self) -> Vec<Vec<Corner>> {
        let mut seen = vec![false; self.nodes.len()];
        let mut rings = Vec::new();
        for start in 0..self.nodes.len() {
            let mut ring = Vec::new();
            let mut k = start;
            while !seen[k] {
                seen[k] = true;
                ring.push(self.nodes[k].corner);
                k = self.nodes[k].next;
            }
            if !ring.is_empty() {
                rings.push(without_straight(&ring, 1e-15 * self.extent));
            }
        }
        rings
    }
}

/// A cut that settles two re-entrant corners may be this much dearer.
const BOTH: f64 = 0.55;

#[derive(Debug, Clone, Copy)]
struct Hit {
    edge: usize,
    fraction: f64,
    distance: f64,
    direction: P2,
}

/// The ring without corners nearer than `tolerance` to the chord of their neighbours.
fn without_straight(ring: &[Corner], tolerance: f64) -> Vec<Corner> {
    let mut kept: Vec<Corner> = Vec::with_capacity(ring.len());
    let n = ring.len();
    for (k, corner) in ring.iter().enumerate() {
        let before = kept.last().unwrap_or(&ring[n - 1]).at;
        let after = ring[(k + 1) % n].at;
        let (a, b) = (corner.at - before, after - corner.at);
        if cross(a, b).abs() > tolerance * (a.norm() + b.norm()) {
            kept.push(*corner);
        }
    }
    kept
}

/// Edges by the square cells that they pass through; entries are never removed, so some are out of date.
struct Grid {
    lo: P2,
    cell: f64,
    size: [usize; 2],
    cells: Vec<Vec<usize>>,
}

impl Grid {
    fn new(nodes: &[Node]) -> Grid {
        let all = || nodes.iter().map(|node| node.corner.at);
        let lo = all().fold(P2::repeat(f64::INFINITY), |m, p| m.inf(&p));
        let span = all().fold(P2::repeat(f64::NEG_INFINITY), |m, p| m.sup(&p)) - lo;
        #[expect(clippy::cast_precision_loss, reason = "a count of corners")]
        let wanted = nodes.len() as f64;
        // About one corner per cell, and no more than `wanted` cells along a thin outline.
        let cell = (span.x * span.y / wanted).sqrt().max(span.max() / wanted);
        let count = |length: f64| to_index(length / cell, usize::MAX) + 1;
        let size = [count(span.x), count(span.y)];
        Grid { lo, cell, size, cells: vec![Vec::new(); size[0] * size[1]] }
    }

    fn add(&mut self, from: P2, to: P2, edge: usize) {
        let mut at = Vec::new();
        self.cells_on(from, to, |cell| at.push(cell));
        for cell in at {
            self.cells[cell].push(edge);
        }
    }

    fn visit_line(&self, from: P2, to: P2, mut visit: impl FnMut(usize)) {
        self.cells_on(from, to, |cell| self.cells[cell].iter().for_each(|edge| visit(*edge)));
    }

    fn visit_box(&self, centre: P2, reach: f64, mut visit: impl FnMut(usize)) {
        let half = P2::repeat(reach);
        let ([x0, x1], [y0, y1]) =
            (self.range(0, centre - half, centre + half), self.range(1, centre - half, centre + half));
        for y in y0..=y1 {
            for x in x0..=x1 {
                self.cells[y * self.size[0] + x].iter().for_each(|edge| visit(*edge));
            }
        }
    }

    /// First and last cell along `axis` for coordinates from `a` to `b`.
    fn range(&self, axis: usize, a: P2, b: P2) -> [usize; 2] {
        [a[axis].min(b[axis]), a[axis].max(b[axis])]
            .map(|c| to_index((c - self.lo[axis]) / self.cell, self.size[axis] - 1))
    }

    /// Cells that the segment passes through, row by row, with a margin for rounding.
    fn cells_on(&self, from: P2, to: P2, mut visit: impl FnMut(usize)) {
        let (low, high) = if from.y <= to.y { (from, to) } else { (to, from) };
        let [y0, y1] = self.range(1, low, high);
        let rise = high.y - low.y;
        let margin = P2::new(1e-6 * self.cell, 0.0);
        for y in y0..=y1 {
            let along = |line: usize| {
                #[expect(clippy::cast_precision_loss, reason = "a count of cells")]
                let height = self.lo.y + line as f64 * self.cell;
                let fraction = if rise > 0.0 { ((height - low.y) / rise).clamp(0.0, 1.0) } else { 0.0 };
                low + fraction * (high - low)
            };
            let start = if y == y0 { low } else { along(y) };
            let end = if y == y1 { high } else { along(y + 1) };
            let (left, right) = if start.x <= end.x { (start, end) } else { (end, start) };
            let [x0, x1] = self.range(0, left - margin, right + margin);
            (x0..=x1).for_each(|x| visit(y * self.size[0] + x));
        }
    }
}

/// A coordinate in cells as an index, from 0 to `last`.
fn to_index(cells: f64, last: usize) -> usize {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "negative and NaN saturate at 0"
    )]
    let index = cells.floor() as usize;
    index.min(last)
}
