//! Meshes made by hand, on graded grids, so that the numerical stages are tested without those before them.

use chargeskin::diag::Origin;
use chargeskin::faces::{Body, BodyId, FaceGroup, GroupId, GroupKind};
use chargeskin::geom::{PanelShape, Vec3};
use chargeskin::mesh::{Mesh, Panel, PanelKind};
use chargeskin::net::{ModelNet, NameSource, NetId, Role};

/// A net of that name and role.
pub(crate) fn net(name: &str, role: Role) -> ModelNet {
    ModelNet { name: name.to_owned(), source: NameSource::Given, role, cut: false, origin: Origin::default() }
}

/// A body of that permittivity.
pub(crate) fn body(er: f64, finite: bool) -> Body {
    Body { name: format!("er {er}"), er, finite }
}

/// A mesh with these nets (all rows) and bodies, no panels.
pub(crate) fn empty(nets: &[&str], bodies: Vec<Body>) -> Mesh {
    let nets = nets.iter().map(|name| net(name, Role::Row)).collect();
    Mesh { nets, bodies, ..Mesh::default() }
}

/// Metal of net `k` in body `b` of `mesh`.
pub(crate) fn metal(mesh: &Mesh, k: u32, b: u32) -> PanelKind {
    PanelKind::Conductor { net: NetId(k), body: BodyId(b), er: mesh.bodies[b as usize].er }
}

/// A sheet of net `k` with body `b` on both sides.
pub(crate) fn sheet(mesh: &Mesh, k: u32, below: u32, above: u32) -> PanelKind {
    PanelKind::Sheet {
        net: NetId(k),
        below: BodyId(below),
        above: BodyId(above),
        er_below: mesh.bodies[below as usize].er,
        er_above: mesh.bodies[above as usize].er,
    }
}

/// An interface from body `from` to body `to`.
pub(crate) fn interface(mesh: &Mesh, from: u32, to: u32) -> PanelKind {
    PanelKind::Interface {
        from: BodyId(from),
        to: BodyId(to),
        er_from: mesh.bodies[from as usize].er,
        er_to: mesh.bodies[to as usize].er,
    }
}

/// Adds a group for panels of `kind` to `mesh` when it has none like it, and returns it.
pub(crate) fn group(mesh: &mut Mesh, kind: &PanelKind, open: bool) -> GroupId {
    let kind = match *kind {
        PanelKind::Conductor { net, .. } | PanelKind::Sheet { net, .. } => {
            GroupKind::Conductor { net, layer: "metal".to_owned() }
        }
        PanelKind::Interface { from, to, .. } => GroupKind::Interface {
            from: mesh.bodies[from.0 as usize].name.clone(),
            to: mesh.bodies[to.0 as usize].name.clone(),
        },
    };
    let wanted = FaceGroup { kind, open };
    let found = mesh.groups.iter().position(|g| *g == wanted).unwrap_or_else(|| {
        mesh.groups.push(wanted);
        mesh.groups.len() - 1
    });
    GroupId(u32::try_from(found).unwrap())
}

/// Adds a panel with these corners, turned so that it faces along `normal`.
pub(crate) fn panel(mesh: &mut Mesh, corners: &[Vec3], normal: Vec3, kind: PanelKind, open: bool) {
    let mut corners = corners.to_vec();
    let turn = (corners[1] - corners[0]).cross(&(corners[2] - corners[0]));
    if turn.dot(&normal) < 0.0 {
        corners.reverse();
    }
    let shape = PanelShape::new(&corners, normal).unwrap();
    let group = group(mesh, &kind, open);
    mesh.panels.push(Panel { shape, kind, group, face: 0 });
}

/// `n + 1` places from 0 to 1, crowded at both ends: distance from an end as the power `b` of the count.
pub(crate) fn graded(n: usize, b: f64) -> Vec<f64> {
    (0..=n)
        .map(|k| {
            let s = k as f64 / n as f64;
            if s <= 0.5 { 0.5 * (2.0 * s).powf(b) } else { 1.0 - 0.5 * (2.0 * (1.0 - s)).powf(b) }
        })
        .collect()
}

/// Adds the parallelogram from `corner` along `u` and `v`, cut at the fractions `us` and `vs`, facing u × v.
pub(crate) fn rectangle(mesh: &mut Mesh, frame: [Vec3; 3], cuts: [&[f64]; 2], kind: PanelKind, open: bool) {
    let [corner, u, v] = frame;
    let normal = u.cross(&v).normalize();
    let at = |a: f64, b: f64| corner + u * a + v * b;
    for s in cuts[0].windows(2) {
        for t in cuts[1].windows(2) {
            let quad = [at(s[0], t[0]), at(s[1], t[0]), at(s[1], t[1]), at(s[0], t[1])];
            panel(mesh, &quad, normal, kind, open);
        }
    }
}

/// The six faces of the box from `lo` to `hi` as (corner, u, v) with u × v outward.
pub(crate) fn box_faces(lo: Vec3, hi: Vec3) -> [[Vec3; 3]; 6] {
    let d = hi - lo;
    let (x, y, z) = (Vec3::new(d.x, 0.0, 0.0), Vec3::new(0.0, d.y, 0.0), Vec3::new(0.0, 0.0, d.z));
    [[lo, y, x], [lo + z, x, y], [lo, z, y], [lo + x, y, z], [lo, x, z], [lo + y, z, x]]
}

/// Adds the box from `lo` to `hi`, every face cut at the fractions `cuts` both ways.
pub(crate) fn cuboid(mesh: &mut Mesh, lo: Vec3, hi: Vec3, cuts: &[f64], kind: PanelKind) {
    for face in box_faces(lo, hi) {
        rectangle(mesh, face, [cuts, cuts], kind, false);
    }
}

/// Triangles of a sphere about the origin: an icosahedron with every edge cut `n` times, its flat area (not its
/// corners) on the sphere of `radius`, so that the first-order error of flat panels cancels.
pub(crate) fn icosphere(n: usize, radius: f64) -> Vec<[Vec3; 3]> {
    let g = 0.5 * (1.0 + 5.0f64.sqrt());
    let mut corners = Vec::new();
    for (a, b) in [(1.0, g), (1.0, -g), (-1.0, g), (-1.0, -g)] {
        corners.extend([Vec3::new(0.0, a, b), Vec3::new(a, b, 0.0), Vec3::new(b, 0.0, a)]);
    }
    let mut triangles = Vec::new();
    let near = |p: Vec3, q: Vec3| (p - q).norm() < 2.1;
    for i in 0..12 {
        for j in i + 1..12 {
            for k in j + 1..12 {
                if near(corners[i], corners[j])
                    && near(corners[j], corners[k])
                    && near(corners[k], corners[i])
                {
                    triangles.extend(subdivided([corners[i], corners[j], corners[k]], n));
                }
            }
        }
    }
    let area: f64 = triangles.iter().map(|[a, b, c]| 0.5 * (b - a).cross(&(c - a)).norm()).sum();
    let scale = radius * (4.0 * std::f64::consts::PI / area).sqrt();
    triangles.iter().map(|t| t.map(|p| p * scale)).collect()
}

/// A triangle cut into n² with the corners on the unit sphere.
fn subdivided([a, b, c]: [Vec3; 3], n: usize) -> Vec<[Vec3; 3]> {
    let at = |i: usize, j: usize| (a * (n - i - j) as f64 + b * i as f64 + c * j as f64).normalize();
    let mut out = Vec::new();
    for i in 0..n {
        for j in 0..n - i {
            out.push([at(i, j), at(i + 1, j), at(i, j + 1)]);
            if i + j + 1 < n {
                out.push([at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]);
            }
        }
    }
    out
}

/// Adds a sphere about `centre`, facing outward.
pub(crate) fn sphere(mesh: &mut Mesh, centre: Vec3, radius: f64, n: usize, kind: PanelKind) {
    for t in icosphere(n, radius) {
        let normal = (t[1] - t[0]).cross(&(t[2] - t[0])).normalize();
        let outward = if normal.dot(&t[0]) > 0.0 { normal } else { -normal };
        panel(mesh, &t.map(|p| p + centre), outward, kind, false);
    }
}
