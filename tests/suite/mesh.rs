//! Panels: they cover their faces, once, convexly, and get small where charge crowds.

use chargeskin::faces::{
    Body, BodyId, EdgeGrade, Face, FaceGroup, FaceKind, Faces, GroupId, GroupKind, Ring,
};
use chargeskin::geom::{PanelShape, Vec3};
use chargeskin::mesh::decompose::{Piece, decompose};
use chargeskin::mesh::quality::face_area;
use chargeskin::mesh::split::halves;
use chargeskin::mesh::{
    FaceProblem, MeshError, MeshOptions, Panel, PanelId, SplitDirection, check_invariants, estimate, panelize,
};
use chargeskin::net::NetId;
use proptest::prelude::*;

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

/// Points of the plane z = 0 as a ring in space.
fn flat(points: &[(f64, f64)], grade: EdgeGrade) -> Ring {
    ring(points.iter().map(|(x, y)| Vec3::new(*x, *y, 0.0)).collect(), grade)
}

fn regular(n: u32, centre: (f64, f64), radius: f64, turn: f64) -> Vec<(f64, f64)> {
    let angle = |k: u32| turn * std::f64::consts::TAU * f64::from(k) / f64::from(n);
    (0..n).map(|k| (centre.0 + radius * angle(k).cos(), centre.1 + radius * angle(k).sin())).collect()
}

/// Area of a piece about its normal, by the fan of triangles from its first corner.
fn piece_area(piece: &Piece) -> f64 {
    let first = piece.corners[0];
    let fan = piece.corners.windows(2).map(|p| (p[0] - first).cross(&(p[1] - first)).dot(&piece.normal));
    0.5 * fan.sum::<f64>()
}

/// Checks that the pieces of `face` are convex, lie side by side and cover it; returns them.
///
/// Derived: one rounding of a coordinate, ε times the extent, shifts an area by ε times extent times perimeter; the
/// tolerance allows 64 of them, and 1e-12 for faces whose area is near the square of their extent.
fn checked_pieces(face: &Face) -> Vec<Piece> {
    let pieces = decompose(face, 0).unwrap();
    let area = face_area(face);
    let points = || face.rings.iter().flat_map(|ring| &ring.points);
    let extent = points().map(|p| (p - face.rings[0].points[0]).norm()).fold(0.0, f64::max);
    let perimeter: f64 = face
        .rings
        .iter()
        .flat_map(|ring| ring.points.iter().zip(ring.points.iter().cycle().skip(1)))
        .map(|(p, q)| (p - q).norm())
        .sum();
    let covered: f64 = pieces.iter().map(piece_area).sum();
    let slack = (64.0 * f64::EPSILON * extent * perimeter).max(1e-12 * area);
    assert!((covered - area).abs() <= slack, "pieces cover {covered:e}, face {area:e}");
    for piece in &pieces {
        let n = piece.corners.len();
        assert!((3..=4).contains(&n));
        for k in 0..n {
            let [a, b, c] = [0, 1, 2].map(|i| piece.corners[(k + i) % n]);
            let turn = (b - a).cross(&(c - b)).dot(&piece.normal);
            assert!(turn > -1e-11 * extent * (c - a).norm(), "not convex: {:?}", piece.corners);
        }
    }
    pieces
}

/// How many pieces hold `at`, and whether it is too near a border to say.
fn holders(pieces: &[Piece], at: Vec3, margin: f64) -> Option<usize> {
    let mut count = 0;
    for piece in pieces {
        let n = piece.corners.len();
        let depth = (0..n)
            .map(|k| {
                let (a, b) = (piece.corners[k], piece.corners[(k + 1) % n]);
                piece.normal.cross(&(b - a)).dot(&(at - a)) / (b - a).norm()
            })
            .fold(f64::INFINITY, f64::min);
        if depth.abs() < margin {
            return None;
        }
        count += usize::from(depth > 0.0);
    }
    Some(count)
}

/// What: pieces of shapes whose best decomposition is plain. Derived: by hand.
/// Seen to fail with: pieces priced by shape alone, not by size (the trace was cut along its diagonal).
#[test]
fn plain_shapes_take_few_pieces() {
    let solid = EdgeGrade::Solid;
    let up = Vec3::z();
    let count = |rings: Vec<Ring>| checked_pieces(&conductor(up, rings)).len();
    let l = [(0.0, 0.0), (9.0, 0.0), (9.0, 1.0), (1.0, 1.0), (1.0, 9.0), (0.0, 9.0)];
    assert_eq!(count(vec![flat(&l, solid)]), 2);
    let cross = [
        (1.0, 0.0),
        (2.0, 0.0),
        (2.0, 1.0),
        (3.0, 1.0),
        (3.0, 2.0),
        (2.0, 2.0),
        (2.0, 3.0),
        (1.0, 3.0),
        (1.0, 2.0),
        (0.0, 2.0),
        (0.0, 1.0),
        (1.0, 1.0),
    ];
    assert!(count(vec![flat(&cross, solid)]) <= 5);
    let collinear = [(0.0, 0.0), (0.5, 0.0), (1.0, 0.0), (1.0, 0.25), (1.0, 1.0), (0.0, 1.0), (0.0, 0.1)];
    assert_eq!(count(vec![flat(&collinear, solid)]), 1);
    // A frame: four pieces.
    let hole = [(1.0, 1.0), (1.0, 2.0), (2.0, 2.0), (2.0, 1.0)];
    let outer = [(0.0, 0.0), (3.0, 0.0), (3.0, 3.0), (0.0, 3.0)];
    assert_eq!(count(vec![flat(&outer, solid), flat(&hole, solid)]), 4);
    // A trace with round ends: the straight part stays whole.
    let mut stadium = regular(16, (10.0, 0.0), 0.5, 1.0);
    stadium.rotate_right(4);
    let (right, left) = (stadium[..=8].to_vec(), stadium[8..].iter().chain(&stadium[..=0]).copied());
    let stadium: Vec<_> = right.into_iter().chain(left.map(|(x, y)| (x - 10.0, y))).collect();
    let pieces = checked_pieces(&conductor(up, vec![flat(&stadium, solid)]));
    assert!(pieces.len() <= 9, "{}", pieces.len());
    let largest = pieces.iter().map(piece_area).fold(0.0, f64::max);
    assert!((largest - 10.0).abs() < 1e-9, "{pieces:?}");
}

/// What: holes that touch each other and the outer ring at corners.
#[test]
fn touching_holes_are_kept_apart() {
    let diamond = |x: f64, y: f64| [(x - 1.0, y), (x, y + 1.0), (x + 1.0, y), (x, y - 1.0)];
    let outer = [(0.0, 0.0), (6.0, 0.0), (6.0, 3.0), (6.0, 6.0), (0.0, 6.0), (0.0, 3.0)];
    let solid = EdgeGrade::Solid;
    // A chain from side to side: the face is in two parts that meet in points.
    let mut all = vec![flat(&outer, solid)];
    all.extend([1.0, 3.0, 5.0].map(|x| flat(&diamond(x, 3.0), solid)));
    let pieces = checked_pieces(&conductor(Vec3::z(), all));
    assert_eq!(holders(&pieces, Vec3::new(3.1, 3.1, 0.0), 1e-9), Some(0));
    assert_eq!(holders(&pieces, Vec3::new(0.5, 0.7, 0.0), 1e-9), Some(1));
}

/// What: 300 anti-pads of 12 corners, and features of nanometres on a plane of 100 mm.
/// Derived: every corner of a hole needs a cut, and a cut may settle two, so a hole of 12 takes 6 to 12 pieces.
#[test]
fn a_plane_with_many_holes_does_not_explode() {
    let solid = EdgeGrade::Solid;
    let mut rings = vec![flat(&[(0.0, 0.0), (0.1, 0.0), (0.1, 0.075), (0.0, 0.075)], solid)];
    for k in 0..300_u32 {
        let (i, j, wobble) = (k % 20, k / 20, f64::from(k * 7919 % 97) * 1e-6);
        let centre = (5e-3 * (f64::from(i) + 0.5) + wobble, 5e-3 * (f64::from(j) + 0.5) - 0.7 * wobble);
        rings.push(flat(&regular(12, centre, if k % 50 == 0 { 5e-9 } else { 0.4e-3 }, -1.0), solid));
    }
    let pieces = checked_pieces(&conductor(Vec3::z(), rings));
    assert!((6 * 300..12 * 300).contains(&pieces.len()), "{}", pieces.len());
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    /// What: any star-shaped outline with star-shaped holes, turned anywhere: pieces are convex, cover it, and every
    /// point is in one piece when it is in the face, in none when not.
    #[test]
    fn pieces_lie_side_by_side(
        outer in prop::collection::vec(1.2_f64..2.0, 8..40),
        holes in prop::collection::vec(prop::option::of(prop::collection::vec(0.04_f64..0.14, 3..9)), 9),
        (yaw, pitch, log_scale) in (0.0_f64..6.0, 0.0_f64..3.0, -7.0_f64..-1.0),
        samples in prop::collection::vec((-2.0_f64..2.0, -2.0_f64..2.0), 50),
    ) {
        let scale = 10f64.powf(log_scale);
        let turn = nalgebra::Rotation3::from_euler_angles(pitch, 0.3, yaw);
        let place = |x: f64, y: f64| scale * (turn * Vec3::new(x, y, 0.4));
        let star = |radii: &[f64], centre: (f64, f64), sign: f64| {
            let n = u32::try_from(radii.len()).unwrap();
            let unit = regular(n, (0.0, 0.0), 1.0, sign);
            let points = unit.iter().zip(radii).map(|((x, y), r)| place(centre.0 + r * x, centre.1 + r * y));
            ring(points.collect(), EdgeGrade::Solid)
        };
        let mut rings = vec![star(&outer, (0.0, 0.0), 1.0)];
        for (radii, k) in holes.iter().zip(0_u32..) {
            let centre = (0.3 * f64::from(k % 3) - 0.3, 0.3 * f64::from(k / 3) - 0.3);
            rings.extend(radii.as_ref().map(|radii| star(radii, centre, -1.0)));
        }
        let face = conductor(turn * Vec3::z(), rings);
        let pieces = checked_pieces(&face);
        for (x, y) in samples {
            let at = place(x, y);
            // Even-odd count of the rings that the ray towards local x crosses.
            let (ex, ey) = (turn * Vec3::x(), turn * Vec3::y());
            let crossings = face.rings.iter().flat_map(|ring| {
                ring.points.iter().zip(ring.points.iter().cycle().skip(1))
            }).filter(|(p, q)| {
                let (py, qy) = ((*p - at).dot(&ey), (*q - at).dot(&ey));
                let (px, qx) = ((*p - at).dot(&ex), (*q - at).dot(&ex));
                (py > 0.0) != (qy > 0.0) && px + (qx - px) * py / (py - qy) > 0.0
            }).count();
            if let Some(found) = holders(&pieces, at, 1e-9 * scale) {
                prop_assert_eq!(found, crossings % 2);
            }
        }
        // And the graded mesh keeps every promise.
        let faces = faces(vec![face]);
        let mesh = panelize(&faces, &MeshOptions { density: 1.2, ..MeshOptions::default() }).unwrap().value;
        prop_assert!(check_invariants(&mesh, &faces).is_ok());
    }
}

/// What: faces without graded edges stay as they are at any density: a triangulated sphere keeps its facets.
#[test]
fn smooth_faces_stay_whole() {
    let triangle = [(0.0, 0.0), (1.0, 0.0), (0.3, 0.8)];
    let body = faces(vec![conductor(Vec3::z(), vec![flat(&triangle, EdgeGrade::Smooth)])]);
    let mesh = panelize(&body, &MeshOptions { density: 20.0, ..MeshOptions::default() }).unwrap().value;
    assert_eq!(mesh.panels.len(), 1);
    assert_eq!(mesh.panels[0].shape.corners(), body.faces[0].rings[0].points.as_slice());
}

/// What: a plane under a trace is fine across the trace and coarse along it, and coarsens outwards.
/// Derived: at density 3 and power 4 an edge at height g asks for 3/4 asinh(w/g) panels on a width w beside it, and up to
/// 1.5 are left in one: w = 3.63 g.
#[test]
fn a_plane_is_graded_across_a_trace() {
    let rectangle = |net: u32, lo: (f64, f64), hi: (f64, f64), z: f64| {
        let points =
            [(lo.0, lo.1), (hi.0, lo.1), (hi.0, hi.1), (lo.0, hi.1)].map(|(x, y)| Vec3::new(x, y, z));
        let kind = FaceKind::Sheet { net: NetId(net), below: BodyId(0), above: BodyId(0) };
        Face { kind, ..conductor(Vec3::z(), vec![ring(points.to_vec(), EdgeGrade::Rim)]) }
    };
    let gap = 0.2;
    let both = faces(vec![
        rectangle(0, (-0.5, -20.0), (0.5, 20.0), gap),
        rectangle(1, (-30.0, -30.0), (30.0, 30.0), 0.0),
    ]);
    let mesh = panelize(&both, &MeshOptions::default()).unwrap().value;
    check_invariants(&mesh, &both).unwrap();
    let size = |panel: &Panel, axis: usize| {
        let all = || panel.shape.corners().iter().map(|c| c[axis]);
        all().fold(f64::NEG_INFINITY, f64::max) - all().fold(f64::INFINITY, f64::min)
    };
    let plane = || mesh.panels.iter().filter(|p| p.face == 1);
    let beneath: Vec<_> =
        plane().filter(|p| p.shape.centroid().x.abs() < 0.6 && p.shape.centroid().y.abs() < 8.0).collect();
    assert!(!beneath.is_empty());
    for panel in &beneath {
        assert!(size(panel, 0) < 3.7 * gap && size(panel, 1) > 8.0 * gap, "{:?}", panel.shape.corners());
    }
    let widest = plane().map(|p| size(p, 0)).fold(0.0, f64::max);
    assert!(widest > 5.0, "{widest}");
}

/// What: bisection keeps area, kind and face, and the other panels; listed twice, a panel becomes four.
#[test]
fn split_keeps_the_surface() {
    let cube = cuboid([1.0, 2.0, 0.5]);
    let mesh = panelize(&cube, &MeshOptions { density: 1.0, ..MeshOptions::default() }).unwrap().value;
    let n = mesh.panels.len();
    let splits = [
        (PanelId(0), SplitDirection::First),
        (PanelId(2), SplitDirection::First),
        (PanelId(2), SplitDirection::Second),
    ];
    let finer = mesh.split(&splits);
    assert_eq!(finer.panels.len(), n + 1 + 3);
    check_invariants(&finer, &cube).unwrap();
    assert_eq!(finer.panels[2], mesh.panels[1]);
    assert_eq!(finer.panels[7..], mesh.panels[3..]);
    // A triangle: both ways conserve its area and keep the normal.
    let corners = [Vec3::zeros(), Vec3::new(3.0, 0.0, 0.0), Vec3::new(1.0, 1.0, 0.0)];
    let triangle = PanelShape::new(&corners, Vec3::z()).unwrap();
    for direction in [SplitDirection::First, SplitDirection::Second] {
        let [a, b] = halves(&triangle, direction).unwrap();
        assert!((a.area() + b.area() - triangle.area()).abs() < 4.0 * f64::EPSILON);
    }
}

/// What: what is no polygon is refused with what is wrong; crossing rings do not lose area in silence.
#[test]
fn bad_faces_are_refused() {
    let solid = EdgeGrade::Solid;
    let problem = |points: &[(f64, f64)]| match panelize(
        &faces(vec![conductor(Vec3::z(), vec![flat(points, solid)])]),
        &MeshOptions::default(),
    ) {
        Err(MeshError::BadFace { face: 0, problem }) => problem,
        other => panic!("{other:?}"),
    };
    assert!(matches!(problem(&[(0.0, 0.0), (1.0, 0.0), (1.0, 0.0)]), FaceProblem::TooFewCorners));
    assert!(matches!(problem(&[(0.0, 0.0), (1.0, f64::NAN), (1.0, 0.0)]), FaceProblem::NotFinite));
    assert!(matches!(problem(&[(0.0, 0.0), (0.0, 1.0), (1.0, 0.0)]), FaceProblem::NoArea { .. }));
    let eight = [(0.0, 0.0), (3.0, 3.0), (3.0, 0.0), (0.0, 2.0)];
    assert!(matches!(problem(&eight), FaceProblem::Crossing { .. } | FaceProblem::NoArea { .. }));
    let cube = cuboid([1.0; 3]);
    for density in [0.0, f64::NAN, 1e9] {
        let options = MeshOptions { density, ..MeshOptions::default() };
        assert!(matches!(panelize(&cube, &options), Err(MeshError::BadDensity { .. })));
    }
}
