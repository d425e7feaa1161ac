//! Bodies that are not slabs, built directly as `Faces`: boxes, prisms, spheres, tori, sheets.

use chargeskin::faces::{
    Body, BodyId, EdgeGrade, Face, FaceGroup, FaceKind, Faces, GroupId, GroupKind, Ring,
};
use chargeskin::geom::Vec3;
use chargeskin::net::{ModelNet, NameSource, NetId, Role};

use std::f64::consts::PI;

/// Corners of the polygon that stands for a disk.
const RIM_CORNERS: usize = 48;

/// Builds a set of faces piece by piece. Lengths in m.
#[derive(Default)]
pub(crate) struct Bodies {
    pub(crate) faces: Faces,
}

/// A triangle or quadrilateral mesh: points, and faces as index lists turning counter-clockwise seen from outside.
pub(crate) struct Surface {
    pub(crate) points: Vec<Vec3>,
    pub(crate) faces: Vec<Vec<usize>>,
}

impl Bodies {
    pub(crate) fn in_vacuum() -> (Self, BodyId) {
        let mut bodies = Bodies::default();
        let vacuum = bodies.dielectric("vacuum", 1.0, false);
        (bodies, vacuum)
    }

    pub(crate) fn dielectric(&mut self, name: &str, er: f64, finite: bool) -> BodyId {
        self.faces.bodies.push(Body { name: name.to_owned(), er, finite });
        BodyId(self.faces.bodies.len() as u32 - 1)
    }

    pub(crate) fn net(&mut self, name: &str, role: Role) -> NetId {
        self.faces.nets.push(ModelNet {
            name: name.to_owned(),
            source: NameSource::Given,
            role,
            cut: false,
            origin: chargeskin::diag::Origin::default(),
        });
        NetId(self.faces.nets.len() as u32 - 1)
    }

    pub(crate) fn row(&mut self, name: &str) -> NetId {
        self.net(name, Role::Row)
    }

    fn group(&mut self, kind: &FaceKind) -> GroupId {
        let name = |body: &BodyId| self.faces.bodies[body.0 as usize].name.clone();
        let kind = match kind {
            FaceKind::Conductor { net, .. } | FaceKind::Sheet { net, .. } => {
                GroupKind::Conductor { net: *net, layer: "body".to_owned() }
            }
            FaceKind::Interface { from, to } => GroupKind::Interface { from: name(from), to: name(to) },
        };
        let found = self.faces.groups.iter().position(|group| group.kind == kind);
        let idx = found.unwrap_or_else(|| {
            self.faces.groups.push(FaceGroup { kind, open: false });
            self.faces.groups.len() - 1
        });
        GroupId(idx as u32)
    }

    /// A flat face with one grade on all its edges; the normal follows from the turn of `[0]`.
    pub(crate) fn flat(&mut self, kind: FaceKind, rings: &[Vec<Vec3>], grade: EdgeGrade) {
        let grades: Vec<Vec<EdgeGrade>> = rings.iter().map(|ring| vec![grade; ring.len()]).collect();
        self.flat_with(kind, rings, &grades);
    }

    /// A flat face with a grade per edge.
    pub(crate) fn flat_with(&mut self, kind: FaceKind, rings: &[Vec<Vec3>], grades: &[Vec<EdgeGrade>]) {
        let outer = &rings[0];
        let newell: Vec3 =
            (1..outer.len() - 1).map(|k| (outer[k] - outer[0]).cross(&(outer[k + 1] - outer[0]))).sum();
        let group = self.group(&kind);
        let rings = rings
            .iter()
            .zip(grades)
            .map(|(points, edges)| Ring { points: points.clone(), edges: edges.clone() })
            .collect();
        self.faces.faces.push(Face { kind, normal: newell.normalize(), rings, group });
    }

    /// A solid box of metal.
    pub(crate) fn solid_box(&mut self, net: NetId, body: BodyId, lo: [f64; 3], hi: [f64; 3]) {
        let corner = |k: usize| {
            Vec3::new([lo[0], hi[0]][k & 1], [lo[1], hi[1]][k >> 1 & 1], [lo[2], hi[2]][k >> 2 & 1])
        };
        for quad in [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]] {
            let ring = quad.map(corner).to_vec();
            self.flat(FaceKind::Conductor { net, body }, &[ring], EdgeGrade::Solid);
        }
    }

    /// Every face of a closed or open surface, all edges smooth.
    pub(crate) fn surface(&mut self, kind: FaceKind, surface: &Surface) {
        for face in &surface.faces {
            let ring: Vec<Vec3> = face.iter().map(|&k| surface.points[k]).collect();
            self.flat(kind, &[ring], EdgeGrade::Smooth);
        }
    }

    /// Every face of an open surface; edges that belong to one face only are rims.
    pub(crate) fn surface_with_rim(&mut self, kind: FaceKind, surface: &Surface) {
        let edge = |face: &[usize], k: usize| (face[k], face[(k + 1) % face.len()]);
        let all: Vec<(usize, usize)> =
            surface.faces.iter().flat_map(|face| (0..face.len()).map(move |k| edge(face, k))).collect();
        for face in &surface.faces {
            let grades = (0..face.len())
                .map(|k| edge(face, k))
                .map(|(a, b)| if all.contains(&(b, a)) { EdgeGrade::Smooth } else { EdgeGrade::Rim });
            let ring: Vec<Vec3> = face.iter().map(|&k| surface.points[k]).collect();
            self.flat_with(kind, &[ring], &[grades.collect()]);
        }
    }

    /// A solid round cylinder or tube, axis along z, as a prism of the same section area, with `n` corners. The first
    /// radius is the outer one, the second that of a hole through it, 0 for none.
    pub(crate) fn prism(&mut self, net: NetId, body: BodyId, radii: [f64; 2], z: [f64; 2], n: usize) {
        let kind = FaceKind::Conductor { net, body };
        let [radius, bore] = radii;
        let outer = ring_points(radius, n);
        let at = |p: &[f64; 2], z: f64| Vec3::new(p[0], p[1], z);
        let lid = |z: f64, points: &[[f64; 2]], up: bool| {
            let mut ring: Vec<Vec3> = points.iter().map(|p| at(p, z)).collect();
            if !up {
                ring.reverse();
            }
            ring
        };
        let hole = if bore > 0.0 { ring_points(bore, n) } else { Vec::new() };
        for (z, up) in [(z[0], false), (z[1], true)] {
            let mut rings = vec![lid(z, &outer, up)];
            if !hole.is_empty() {
                rings.push(lid(z, &hole, !up));
            }
            self.flat(kind, &rings, EdgeGrade::Solid);
        }
        let mut wall = |points: &[[f64; 2]], outward: bool| {
            for k in 0..points.len() {
                let (p, q) = (&points[k], &points[(k + 1) % points.len()]);
                let (p, q) = if outward { (p, q) } else { (q, p) };
                let ring = vec![at(p, z[0]), at(q, z[0]), at(q, z[1]), at(p, z[1])];
                let grades = vec![EdgeGrade::Solid, EdgeGrade::Smooth, EdgeGrade::Solid, EdgeGrade::Smooth];
                self.flat_with(kind, &[ring], &[grades]);
            }
        };
        wall(&outer, true);
        wall(&hole, false);
    }

    /// A flat disk or ring of no thickness at height z, as a polygon of the same area with [`RIM_CORNERS`], in one
    /// dielectric.
    pub(crate) fn disk(&mut self, net: NetId, body: BodyId, semi_axes: [f64; 2], bore: f64, z: f64) {
        let n = RIM_CORNERS;
        let lift = |points: &[[f64; 2]], ratio: f64| -> Vec<Vec3> {
            points.iter().map(|p| Vec3::new(p[0], p[1] * ratio, z)).collect()
        };
        let mut rings = vec![lift(&ring_points(semi_axes[0], n), semi_axes[1] / semi_axes[0])];
        if bore > 0.0 {
            let mut hole = lift(&ring_points(bore, n), 1.0);
            hole.reverse();
            rings.push(hole);
        }
        self.flat(FaceKind::Sheet { net, below: body, above: body }, &rings, EdgeGrade::Rim);
    }
}

/// Corners of a regular polygon with `n` corners and the area of a circle of this radius, counter-clockwise.
pub(crate) fn ring_points(radius: f64, n: usize) -> Vec<[f64; 2]> {
    let step = 2.0 * PI / n as f64;
    let scaled = radius * (step / step.sin()).sqrt();
    (0..n).map(|k| ((k as f64 + 0.5) * step).sin_cos()).map(|(s, c)| [scaled * c, scaled * s]).collect()
}

/// An ellipsoid from an icosahedron whose faces are cut `cuts` times in each direction, scaled to the true volume.
pub(crate) fn ellipsoid(semi_axes: [f64; 3], centre: Vec3, cuts: usize) -> Surface {
    let golden = f64::midpoint(1.0, 5f64.sqrt());
    let mut seeds = Vec::new();
    for (a, b) in [(1.0, golden), (-1.0, golden), (1.0, -golden), (-1.0, -golden)] {
        seeds.extend([Vec3::new(0.0, a, b), Vec3::new(a, b, 0.0), Vec3::new(b, 0.0, a)]);
    }
    let side = 2.0;
    let mut surface = Surface { points: Vec::new(), faces: Vec::new() };
    for i in 0..12 {
        for j in i + 1..12 {
            for k in j + 1..12 {
                let near = |a: usize, b: usize| (seeds[a] - seeds[b]).norm() < side * 1.1;
                if near(i, j) && near(j, k) && near(i, k) {
                    let out = (seeds[j] - seeds[i]).cross(&(seeds[k] - seeds[i])).dot(&seeds[i]) > 0.0;
                    let (j, k) = if out { (j, k) } else { (k, j) };
                    cut_triangle(&mut surface, [seeds[i], seeds[j], seeds[k]], cuts);
                }
            }
        }
    }
    for p in &mut surface.points {
        *p = p.normalize().component_mul(&Vec3::from(semi_axes));
    }
    let scale = (4.0 / 3.0 * PI * semi_axes.iter().product::<f64>() / volume(&surface)).cbrt();
    for p in &mut surface.points {
        *p = *p * scale + centre;
    }
    surface
}

fn cut_triangle(surface: &mut Surface, [a, b, c]: [Vec3; 3], cuts: usize) {
    let n = cuts as f64;
    let at = |i: usize, j: usize| a + (b - a) * (i as f64 / n) + (c - a) * (j as f64 / n);
    let mut push = |corners: [Vec3; 3]| {
        let first = surface.points.len();
        surface.points.extend(corners);
        surface.faces.push(vec![first, first + 1, first + 2]);
    };
    for i in 0..cuts {
        for j in 0..cuts - i {
            push([at(i, j), at(i + 1, j), at(i, j + 1)]);
            if i + j + 1 < cuts {
                push([at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]);
            }
        }
    }
}

/// Volume inside a closed surface.
pub(crate) fn volume(surface: &Surface) -> f64 {
    surface
        .faces
        .iter()
        .flat_map(|face| (1..face.len() - 1).map(move |k| [face[0], face[k], face[k + 1]]))
        .map(|[a, b, c]| surface.points[a].dot(&surface.points[b].cross(&surface.points[c])) / 6.0)
        .sum()
}

/// A torus about the z axis from flat trapezoids, scaled to the true volume.
pub(crate) fn torus(ring_radius: f64, tube_radius: f64, n_around: usize, n_tube: usize) -> Surface {
    let mut surface = Surface { points: Vec::new(), faces: Vec::new() };
    for i in 0..n_around {
        for j in 0..n_tube {
            let (u, v) = (2.0 * PI * i as f64 / n_around as f64, 2.0 * PI * j as f64 / n_tube as f64);
            let rho = ring_radius + tube_radius * v.cos();
            surface.points.push(Vec3::new(rho * u.cos(), rho * u.sin(), tube_radius * v.sin()));
        }
    }
    let at = |i: usize, j: usize| (i % n_around) * n_tube + j % n_tube;
    for i in 0..n_around {
        for j in 0..n_tube {
            surface.faces.push(vec![at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]);
        }
    }
    let scale = (2.0 * PI * PI * ring_radius * tube_radius * tube_radius / volume(&surface)).cbrt();
    for p in &mut surface.points {
        *p *= scale;
    }
    surface
}

/// The cap of a sphere within `half_angle` of its pole, in `n_rings` bands of flat trapezoids.
pub(crate) fn cap(radius: f64, half_angle: f64, n_around: usize, n_rings: usize) -> Surface {
    let mut surface = Surface { points: vec![Vec3::new(0.0, 0.0, radius)], faces: Vec::new() };
    for i in 1..=n_rings {
        for j in 0..n_around {
            let (theta, phi) =
                (half_angle * i as f64 / n_rings as f64, 2.0 * PI * j as f64 / n_around as f64);
            surface
                .points
                .push(radius * Vec3::new(theta.sin() * phi.cos(), theta.sin() * phi.sin(), theta.cos()));
        }
    }
    let at = |i: usize, j: usize| if i == 0 { 0 } else { 1 + (i - 1) * n_around + j % n_around };
    for i in 0..n_rings {
        for j in 0..n_around {
            let mut face = vec![at(i, j), at(i + 1, j), at(i + 1, j + 1)];
            if i > 0 {
                face.push(at(i, j + 1));
            }
            surface.faces.push(face);
        }
    }
    surface
}
