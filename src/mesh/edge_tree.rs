//! Boxes around edges, halved again and again, to find those near a point without looking at all.

use crate::geom::Vec3;

/// At most this many edges in a leaf.
const LEAF: usize = 8;

/// A tree of boxes over edges that are known by number.
#[derive(Debug, Default)]
pub(super) struct EdgeTree {
    order: Vec<u32>,
    nodes: Vec<Box3>,
}

#[derive(Debug, Clone, Copy)]
struct Box3 {
    lo: Vec3,
    hi: Vec3,
    /// Range of `order`.
    range: [usize; 2],
    /// Second child; the first follows its parent. `None` for a leaf.
    second: Option<usize>,
}

impl EdgeTree {
    /// The tree of these edges, given by number and end points.
    pub(super) fn new(mut edges: Vec<(u32, Vec3, Vec3)>) -> EdgeTree {
        let mut nodes = Vec::new();
        if !edges.is_empty() {
            build(&mut edges, 0, &mut nodes);
        }
        EdgeTree { order: edges.iter().map(|edge| edge.0).collect(), nodes }
    }

    /// Numbers of the edges whose box, shared with neighbours, is within `reach` of `at`; in increasing order.
    pub(super) fn within(&self, at: Vec3, reach: f64) -> Vec<u32> {
        let mut found = Vec::new();
        let mut open = if self.nodes.is_empty() { vec![] } else { vec![0] };
        while let Some(k) = open.pop() {
            let node = &self.nodes[k];
            let gap = (node.lo - at).sup(&(at - node.hi)).sup(&Vec3::zeros());
            if gap.norm_squared() > reach * reach {
                continue;
            }
            match node.second {
                Some(second) => open.extend([k + 1, second]),
                None => found.extend(&self.order[node.range[0]..node.range[1]]),
            }
        }
        found.sort_unstable();
        found
    }
}

fn build(edges: &mut [(u32, Vec3, Vec3)], first: usize, nodes: &mut Vec<Box3>) {
    let lo = edges.iter().fold(Vec3::repeat(f64::INFINITY), |m, e| m.inf(&e.1).inf(&e.2));
    let hi = edges.iter().fold(Vec3::repeat(f64::NEG_INFINITY), |m, e| m.sup(&e.1).sup(&e.2));
    let here = nodes.len();
    nodes.push(Box3 { lo, hi, range: [first, first + edges.len()], second: None });
    if edges.len() <= LEAF {
        return;
    }
    let axis = (hi - lo).imax();
    let middle = edges.len() / 2;
    // Ties by number, so that the order never depends on the sort.
    edges.select_nth_unstable_by(middle, |p, q| {
        (p.1[axis] + p.2[axis]).total_cmp(&(q.1[axis] + q.2[axis])).then(p.0.cmp(&q.0))
    });
    let (low, high) = edges.split_at_mut(middle);
    build(low, first, nodes);
    nodes[here].second = Some(nodes.len());
    build(high, first + middle, nodes);
}
