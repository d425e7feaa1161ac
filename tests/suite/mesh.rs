//! Panels: they cover their faces, once, convexly, and get small where charge crowds.

use chargeskin::faces::{
    Body, BodyId, EdgeGrade, Face, FaceGroup, FaceKind, Faces, GroupId, GroupKind, Ring,
};
use chargeskin::geom::Vec3;
use chargeskin::mesh::{MeshError, MeshOptions, check_invariants, estimate, panelize};
use chargeskin::net::NetId;

fn ring(points: Vec<Vec3>, grade: EdgeGrade) -> Ring {
    let edges = vec![grade; points.len()];
    Ring { points, edges }
}

fn conductor(normal: Vec3, rings: Vec<Ring>) -> Face {
    let kind = FaceKind::Conductor { net: NetId(0), body: BodyId(0) };
    Face { kind, normal, rings, group: GroupId(0) }
}

fn faces(faces: Vec<Face>) -> Faces {
    let group = FaceGroup { kind: GroupKind::Conductor { net: NetId(0), layer: "top".into() }, open: false };
    let body = Body { name: "air".into(), er: 1.0, finite: false };
    Faces { faces, groups: vec![group], bodies: vec![body], ..Faces::default() }
}

/// A box from the origin, all edges solid.
fn cuboid(size: [f64; 3]) -> Faces {
    let mut all = Vec::new();
    for axis in 0..3 {
        let (u, v) = ((axis + 1) % 3, (axis + 2) % 3);
        for end in [0.0, 1.0] {
            let at = |cu: f64, cv: f64| {
                let mut p = Vec3::zeros();
                (p[axis], p[u], p[v]) = (end * size[axis], cu * size[u], cv * size[v]);
                p
            };
            let mut points = vec![at(0.0, 0.0), at(1.0, 0.0), at(1.0, 1.0), at(0.0, 1.0)];
            let mut normal = Vec3::zeros();
            normal[axis] = 1.0;
            if end < 0.5 {
                points.reverse();
                normal = -normal;
            }
            all.push(conductor(normal, vec![ring(points, EdgeGrade::Solid)]));
        }
    }
    faces(all)
}

/// What: a cube's faces get the same panels each, a product of power-graded cuts.
/// Derived: at whole density n, cuts at (k/n)^3 / 2 from each edge: (2n)² panels a face.
#[test]
fn a_cube_gets_graded_products() {
    let cube = cuboid([1.0, 1.0, 1.0]);
    for (density, across) in [(1.0, 2), (2.0, 4), (2.5, 5), (3.0, 6)] {
        let options = MeshOptions { density, ..MeshOptions::default() };
        let mesh = panelize(&cube, &options).unwrap().value;
        check_invariants(&mesh, &cube).unwrap();
        assert_eq!(mesh.panels.len(), 6 * across * across);
        assert_eq!(estimate(&cube, &options).unwrap(), mesh.panels.len());
        for face in 0..6 {
            assert_eq!(mesh.panels.iter().filter(|p| p.face == face).count(), across * across);
        }
    }
}

/// What: the limit on panels is an error that gives both numbers.
#[test]
fn too_many_panels_are_refused() {
    let cube = cuboid([1.0, 1.0, 1.0]);
    let error = panelize(&cube, &MeshOptions { density: 3.0, max_panels: 100 }).unwrap_err();
    assert!(matches!(error, MeshError::TooMany { needed: 216, at_least: false, limit: 100, .. }), "{error}");
    let error = panelize(&cube, &MeshOptions { density: 50.0, max_panels: 100 }).unwrap_err();
    assert!(matches!(error, MeshError::TooMany { needed: 800, at_least: true, .. }), "{error}");
}
