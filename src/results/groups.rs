//! Charge of each face group, with the rest beyond the extent for those that go on to infinity.

use crate::faces::GroupId;
use crate::mesh::Mesh;
use crate::results::GroupCharge;
use crate::results::free_charge::free_charge;
use crate::results::tail::Tail;
use faer::MatRef;

/// One entry per group that holds panels, in group order.
///
/// - `density`, `field`: `n_panels × n_rows`, C/m² and V/m.
pub(super) fn group_charges(
    mesh: &Mesh,
    density: MatRef<'_, f64>,
    field: MatRef<'_, f64>,
) -> Vec<GroupCharge> {
    let n_rows = density.ncols();
    let tail = mesh.truncation.as_ref().map(Tail::new);
    let empty = |id: u32| Sums {
        group: GroupCharge {
            group: GroupId(id),
            area: 0.0,
            free: vec![0.0; n_rows],
            bound: vec![0.0; n_rows],
            tail: None,
        },
        ring: vec![0.0; n_rows],
        modelled: 0.0,
    };
    let mut sums: Vec<Sums> = (0u32..).take(mesh.groups.len()).map(empty).collect();
    for (i, panel) in mesh.panels.iter().enumerate() {
        let at = panel.group.0 as usize;
        let (sum, open) = (&mut sums[at], mesh.groups[at].open);
        let (area, centre) = (panel.shape.area(), panel.shape.centroid());
        sum.group.area += area;
        let ring = tail.filter(|tail| open && tail.in_ring(centre.x, centre.y));
        sum.modelled += ring.map_or(0.0, |tail| area * tail.model(centre.x, centre.y));
        for r in 0..n_rows {
            let free = free_charge(panel, density[(i, r)], field[(i, r)]);
            let bound = density[(i, r)] * area - free;
            sum.group.free[r] += free;
            sum.group.bound[r] += bound;
            sum.ring[r] += if ring.is_some() { bound } else { 0.0 };
        }
    }
    sums.into_iter()
        .filter(|sum| sum.group.area > 0.0)
        .map(|sum| {
            let open = mesh.groups[sum.group.group.0 as usize].open;
            let rest = tail
                .filter(|_| open)
                .map(|tail| sum.ring.iter().map(|q| tail.rest(*q, sum.modelled)).collect());
            GroupCharge { tail: rest, ..sum.group }
        })
        .collect()
}

struct Sums {
    group: GroupCharge,
    /// Bound charge on the outer ring, C.
    ring: Vec<f64>,
    /// The model's charge there.
    modelled: f64,
}
