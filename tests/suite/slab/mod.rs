//! Piles to faces: areas, volumes and closedness of known boards, and what is refused.

mod bench;
mod closed;
mod refused;

use bench::{
    Board, UM, area, assert_all_closed, assert_close, body, body_named, coating, conductor, conductor_faces,
    dielectric, disc, etched_conductor, metal, named, open, polygon, rect, solid_angle_of_net, two_layer,
};
use chargeskin::Faces;
use chargeskin::faces::{EdgeGrade, Face, FaceKind, GroupKind};
use chargeskin::geom::region::Point;
use chargeskin::job::RegionChoice;
use chargeskin::net::Role;

/// Sums of products of lengths that are exact on the grid: some hundred roundings.
const ROUNDING: f64 = 1e3 * f64::EPSILON;

fn interface_faces<'a>(faces: &'a Faces, from: &str, to: &str) -> Vec<&'a Face> {
    let group =
        faces.groups.iter().position(|g| g.kind == GroupKind::Interface { from: from.into(), to: to.into() });
    assert!(group.is_some(), "no group {from}|{to}: {:?}", faces.groups);
    let group = group.unwrap();
    faces.faces.iter().filter(|f| f.group.0 as usize == group).collect()
}

fn interface_area(faces: &Faces, from: &str, to: &str) -> f64 {
    interface_faces(faces, from, to).into_iter().map(area).sum()
}

fn grades(face: &Face) -> Vec<Vec<EdgeGrade>> {
    face.rings.iter().map(|r| r.edges.clone()).collect()
}

/// What: a trace on a dielectric over an image plane: every area and edge grade. Derived: by hand.
/// Tolerance: rounding.
#[test]
fn a_trace_over_an_image_plane() {
    let board = two_layer().copper("top", "SIG", rect(0, 0, 1000, 100)).planes(&["bottom"]);
    let (model, faces) = board.build();
    assert_eq!(model.planes.below, Some(35e-6));
    assert_eq!(model.slabs.len(), 3);
    // Reach: 8 x (200 + 35) um.
    assert_eq!(model.extent.hi.x - model.window.hi.x, 8 * 235 * UM);
    let trace = metal(&faces, "SIG");
    assert_close(trace.area, (2.0 * 1000.0 * 100.0 + 2.0 * 1100.0 * 35.0) * 1e-12, ROUNDING);
    assert_close(trace.volume, 1000.0 * 100.0 * 35.0 * 1e-18, ROUNDING);
    assert_all_closed(&faces);
    assert_close(
        solid_angle_of_net(&faces, "SIG", [300.0, 40.0, 250.0]),
        4.0 * std::f64::consts::PI,
        ROUNDING,
    );
    assert!(solid_angle_of_net(&faces, "SIG", [300.0, 40.0, 300.0]).abs() < ROUNDING);
    let side = |length: f64| (length + 2.0 * 1880.0) * 1e-6;
    assert_close(interface_area(&faces, "core", "above"), side(1000.0) * side(100.0) - 1e-7, ROUNDING);
    assert!(faces.truncation.is_some());
    assert_eq!((faces.outer_er.above, faces.outer_er.below), (Some(1.0), None));
    for face in &faces.faces {
        match face.kind {
            FaceKind::Conductor { .. } => assert_eq!(grades(face), [vec![EdgeGrade::Solid; 4]]),
            _ => assert_eq!(grades(face), [vec![EdgeGrade::Smooth; 4], vec![EdgeGrade::Solid; 4]]),
        }
    }
    assert_eq!(faces.faces.len(), 7);
}

/// What: solder mask over a trace has shoulders: its outer surface goes over the copper without a gap. Derived: the
/// outer surface is the flat part plus the four shoulder walls, from the film on the laminate to the film on the copper.
#[test]
fn a_coated_trace_has_shoulders() {
    let board = Board::new(vec![
        open("above", 1.0),
        coating("mask", 3.5, 25.0, 12.0, 10.0),
        conductor("top", 35.0),
        dielectric("core", 4.0, 200.0),
        conductor("bottom", 0.0),
    ])
    .copper("top", "SIG", rect(0, 0, 1000, 100))
    .planes(&["bottom"]);
    let mut board = board;
    board.stackup.layers.push(open("below", 1.0));
    let (model, faces) = board.build();
    // core, film and copper, shoulder and copper, film over copper, above.
    assert_eq!(model.slabs.len(), 5);
    assert_all_closed(&faces);
    assert_close(metal(&faces, "SIG").volume, 1000.0 * 100.0 * 35.0 * 1e-18, ROUNDING);
    let whole = (model.extent.hi.x - model.extent.lo.x) as f64
        * (model.extent.hi.y - model.extent.lo.y) as f64
        * 1e-18;
    let shoulders = 2.0 * (1020.0 + 120.0) * (35.0 + 12.0 - 25.0) * 1e-12;
    assert_close(interface_area(&faces, "mask", "above"), whole + shoulders, ROUNDING);
    assert_close(interface_area(&faces, "core", "mask"), whole - 1e-7, ROUNDING);
    // All of the trace's top and walls is under the mask; only its foot is on the core.
    let on = |name: &str| {
        let id = body_named(&faces, name);
        conductor_faces(&faces, "SIG")
            .filter(|f| matches!(f.kind, FaceKind::Conductor { body, .. } if body == id))
            .map(area)
            .sum::<f64>()
    };
    assert_close(on("core"), 1e-7, ROUNDING);
    assert_close(on("mask"), (1e5 + 2.0 * 1100.0 * 35.0) * 1e-12, ROUNDING);
}

/// What: an opening of the mask bares the copper, and the same film below the board is its mirror image. Derived.
#[test]
fn openings_bare_the_copper_on_both_sides() {
    let board = Board::new(vec![
        open("above", 1.0),
        coating("mask-top", 3.5, 25.0, 12.0, 12.0),
        conductor("top", 35.0),
        dielectric("core", 4.0, 200.0),
        conductor("bottom", 35.0),
        coating("mask-bottom", 3.6, 25.0, 12.0, 12.0),
        open("below", 1.0),
    ])
    .copper("top", "A", rect(0, 0, 300, 300))
    .copper("bottom", "B", rect(0, 0, 300, 300))
    .opening("mask-top", rect(100, 100, 200, 200))
    .opening("mask-bottom", rect(100, 100, 200, 200));
    let (_, faces) = board.build();
    assert_all_closed(&faces);
    for net in ["A", "B"] {
        let bare: f64 = conductor_faces(&faces, net)
            .filter(
                |f| matches!(f.kind, FaceKind::Conductor { body, .. } if body == body_named(&faces, "above")),
            )
            .map(area)
            .sum();
        assert_close(bare, 1e-8, ROUNDING);
    }
    assert_close(
        interface_area(&faces, "mask-top", "above"),
        interface_area(&faces, "below", "mask-bottom"),
        ROUNDING,
    );
    // The four walls of the opening over the copper stand in the film of 12 um.
    let walls: f64 = interface_faces(&faces, "mask-top", "above")
        .iter()
        .filter(|f| f.normal.z.abs() < 0.5)
        .map(|f| area(f))
        .sum();
    assert_close(walls, (4.0 * 100.0 * 12.0 + 4.0 * 324.0 * 22.0) * 1e-12, ROUNDING);
}

/// What: a sheet on a slab has one face with rims, and the interface ends at it. Derived.
#[test]
fn a_sheet_on_a_slab() {
    let board = Board::new(vec![
        open("above", 1.0),
        conductor("patch", 0.0),
        dielectric("slab", 9.0, 100.0),
        conductor("bottom", 0.0),
        open("below", 1.0),
    ])
    .copper("patch", "P", rect(0, 0, 200, 100))
    .planes(&["bottom"]);
    let (model, faces) = board.build();
    assert_eq!(model.slabs.len(), 2);
    assert_eq!((model.sheets.len(), model.sheets[0].slab), (1, 1));
    let sheets: Vec<_> = faces.faces.iter().filter(|f| matches!(f.kind, FaceKind::Sheet { .. })).collect();
    assert_eq!(sheets.len(), 1);
    assert_close(area(sheets[0]), 2e-8, ROUNDING);
    assert_eq!(grades(sheets[0]), [vec![EdgeGrade::Rim; 4]]);
    let FaceKind::Sheet { below, above, .. } = sheets[0].kind else { panic!() };
    assert_close(faces.bodies[below.0 as usize].er, 9.0, 0.0);
    assert_close(faces.bodies[above.0 as usize].er, 1.0, 0.0);
    let top = interface_faces(&faces, "slab", "above");
    assert_eq!(grades(top[0])[1], vec![EdgeGrade::Rim; 4]);
    assert_eq!(faces.faces.len(), 2);
}

/// What: a via through a plane with an anti-pad is one closed body, and so is the plane's inside rim. Derived: the
/// volume is that of the pads and of the barrel between them.
#[test]
fn a_via_through_a_plane() {
    let plane = rect(-1200, -1200, 1200, 1200).difference(&disc(0, 0, 400, 32));
    let board = four_layer()
        .copper("top", "SIG", disc(0, 0, 250, 24))
        .copper("bottom", "SIG", disc(0, 0, 250, 24))
        .copper("in1", "GND", plane.clone())
        .barrel("top", "bottom", "SIG", disc(0, 0, 150, 24))
        .ground(&["GND"])
        .rows(&["SIG"])
        .region(RegionChoice::Around { nets: vec![named("SIG")], margin: Some(500e-6) });
    let (model, faces) = board.build();
    assert_all_closed(&faces);
    let um3 = |r: chargeskin::geom::Region, h: f64| model.grid.area(r.area()) * h * 1e-6;
    let volume = um3(disc(0, 0, 250, 24), 70.0) + um3(disc(0, 0, 150, 24), 500.0 + 2.0 * 18.0);
    assert_close(metal(&faces, "SIG").volume, volume, ROUNDING);
    assert_close(
        solid_angle_of_net(&faces, "SIG", [10.0, 20.0, 300.0]),
        4.0 * std::f64::consts::PI,
        ROUNDING,
    );
    // The plane goes on past the window, up to its own rim, for the extent is wider than it.
    assert_eq!(model.window.hi.x, 750 * UM);
    assert_close(metal(&faces, "GND").volume, um3(plane, 18.0), ROUNDING);
    assert!(model.nets.iter().all(|net| !net.cut));
}

fn four_layer() -> Board {
    Board::new(vec![
        open("above", 1.0),
        conductor("top", 35.0),
        dielectric("prepreg1", 4.2, 100.0),
        conductor("in1", 18.0),
        dielectric("core", 4.5, 300.0),
        conductor("in2", 18.0),
        dielectric("prepreg2", 4.2, 100.0),
        conductor("bottom", 35.0),
        open("below", 1.0),
    ])
}

/// What: a leaning trace has the volume of its frustum; its foot is the wide face. Derived: prismatoid formula with
/// inset 30 um / tan 60 deg = 17.3205 um on each side.
/// Tolerance: corners are rounded to 1 nm of some 65 um of width: 2e-5.
#[test]
fn a_leaning_trace_is_a_trapezoid_in_section() {
    let mut board = two_layer().copper("top", "SIG", rect(0, 0, 1000, 100)).planes(&["bottom"]);
    board.stackup.layers[1] = etched_conductor("top", 30.0, 60.0, 0.0);
    let (_, faces) = board.build();
    assert_all_closed(&faces);
    let inset = 30.0 / 60_f64.to_radians().tan();
    let at = |s: f64| (1000.0 - 2.0 * s) * (100.0 - 2.0 * s);
    let volume = 30.0 / 6.0 * (at(0.0) + 4.0 * at(0.5 * inset) + at(inset)) * 1e-18;
    assert_close(metal(&faces, "SIG").volume, volume, 2e-5);
    let top: f64 = conductor_faces(&faces, "SIG").filter(|f| f.normal.z > 0.9).map(area).sum();
    assert_close(top, at(inset) * 1e-12, 4e-5);
    assert_close(solid_angle_of_net(&faces, "SIG", [300.0, 40.0, 240.0]), 4.0 * std::f64::consts::PI, 1e-9);
}

/// What: leaning copper under a mask is split at the film's depth and stays closed, mask and all. Derived as above.
#[test]
fn a_leaning_trace_under_a_mask() {
    let board = Board::new(vec![
        open("above", 1.0),
        coating("mask", 3.5, 10.0, 12.0, 10.0),
        etched_conductor("top", 30.0, 60.0, 0.0),
        dielectric("core", 4.0, 200.0),
        conductor("bottom", 0.0),
        open("below", 1.0),
    ])
    .copper("top", "SIG", disc(0, 0, 200, 36).union(&rect(0, -50, 1000, 50)))
    .copper("top", "NEAR", rect(0, 300, 1000, 400))
    .planes(&["bottom"]);
    let (model, faces) = board.build();
    assert_eq!(model.slabs.len(), 5);
    // Slanted edges are rounded where the film's depth cuts them, both sides alike.
    assert_all_closed(&faces);
    let inset = 30.0 / 60_f64.to_radians().tan();
    let at = |s: f64| (1000.0 - 2.0 * s) * (100.0 - 2.0 * s);
    let volume = 30.0 / 6.0 * (at(0.0) + 4.0 * at(0.5 * inset) + at(inset)) * 1e-18;
    assert_close(metal(&faces, "NEAR").volume, volume, 4e-5);
}

/// What: a neck narrower than the inset gets upright walls, with a warning that names net, layer and place.
#[test]
fn a_narrow_neck_stands_upright() {
    let mut board = two_layer()
        .copper("top", "SIG", rect(0, 0, 1000, 30))
        .copper("top", "WIDE", rect(0, 100, 1000, 300))
        .planes(&["bottom"]);
    board.stackup.layers[1] = etched_conductor("top", 30.0, 60.0, 0.0);
    let (_, faces, warnings) = board.build_warned();
    assert_eq!(warnings.len(), 1, "{warnings:?}");
    assert!(warnings[0].contains("`SIG` in `top`") && warnings[0].contains("(0 mm, 0 mm)"), "{warnings:?}");
    assert_all_closed(&faces);
    let inset = 30.0 / 60_f64.to_radians().tan();
    assert_close(metal(&faces, "SIG").volume, (1000.0 - inset) * (30.0 - inset) * 30.0 * 1e-18, 2e-4);
}

/// What: etch bias moves every edge. Derived.
#[test]
fn etch_bias_moves_every_edge() {
    let mut board = two_layer().copper("top", "SIG", rect(0, 0, 1000, 100)).planes(&["bottom"]);
    board.stackup.layers[1] = etched_conductor("top", 35.0, 90.0, -5.0);
    let (_, faces) = board.build();
    assert_close(metal(&faces, "SIG").volume, 990.0 * 90.0 * 35.0 * 1e-18, ROUNDING);
}

/// What: a patterned film is a finite body; a board with an outline and a cut-out is one too. Derived.
#[test]
fn patterns_and_outlines_end_bodies() {
    let film = Board::new(vec![
        open("above", 1.0),
        conductor("plate", 2.0),
        dielectric("gap", 1.0, 2.0),
        dielectric("film", 7.0, 1.0),
        conductor("electrode", 0.0),
        open("below", 1.0),
    ])
    .copper("plate", "PLATE", rect(0, 0, 100, 100))
    .copper("electrode", "E", rect(20, 20, 80, 80))
    .pattern("film", rect(10, 10, 90, 90));
    let (_, faces) = film.build();
    assert_all_closed(&faces);
    let id = body_named(&faces, "film");
    assert!(faces.bodies[id.0 as usize].finite && faces.truncation.is_none());
    assert_close(body(&faces, id).volume, 80.0 * 80.0 * 1e-18, ROUNDING);

    let slot = rect(400, 400, 600, 600);
    let board = two_layer()
        .copper("top", "SIG", rect(100, 100, 900, 200))
        .copper("bottom", "GND", rect(50, 50, 950, 350))
        .ground(&["GND"])
        .profile(rect(0, 0, 1000, 1000).difference(&slot));
    let (_, faces) = board.build();
    assert_all_closed(&faces);
    let id = body_named(&faces, "core");
    assert!(faces.bodies[id.0 as usize].finite && faces.truncation.is_none());
    assert_close(body(&faces, id).volume, (1e6 - 4e4) * 200.0 * 1e-18, ROUNDING);
    let walls: f64 = interface_faces(&faces, "core", "above")
        .iter()
        .filter(|f| f.normal.z.abs() < 0.5)
        .map(|f| area(f))
        .sum();
    assert_close(walls, (4000.0 + 800.0) * 200.0 * 1e-12, ROUNDING);
}

/// What: a bare hole takes copper, laminate and mask with it. Derived.
#[test]
fn a_bare_hole_is_vacuum() {
    let board = Board::new(vec![
        open("above", 2.2),
        coating("mask", 3.5, 25.0, 12.0, 12.0),
        conductor("top", 35.0),
        dielectric("core", 4.0, 200.0),
        conductor("bottom", 35.0),
        open("below", 2.2),
    ])
    .copper("top", "SIG", rect(0, 0, 1000, 1000))
    .bare("top", "bottom", rect(400, 400, 600, 600));
    let (_, faces) = board.build();
    assert_all_closed(&faces);
    assert_close(metal(&faces, "SIG").volume, (1e6 - 4e4) * 35.0 * 1e-18, ROUNDING);
    let id = body_named(&faces, "vacuum");
    assert!(faces.bodies[id.0 as usize].finite);
    // Through core and copper, mask (12 um over the copper) and the space of the bottom layer.
    assert_close(body(&faces, id).volume, 4e4 * (200.0 + 35.0 + 12.0 + 35.0) * 1e-18, ROUNDING);
}

/// What: roles, joins and cuts. Derived from the rules of `NetRules`.
#[test]
fn roles_are_settled() {
    let board = two_layer()
        .copper("top", "A1", rect(0, 0, 100, 100))
        .copper("top", "A2", rect(200, 0, 300, 100))
        .copper("top", "LONG", rect(0, 200, 5000, 300))
        .copper("top", "#1", rect(400, 0, 450, 50))
        .copper("top", "OTHER", rect(500, 0, 550, 50))
        .copper("top", "SHIELD", rect(600, 0, 650, 50))
        .copper("bottom", "GND", rect(-5000, -5000, 5000, 5000))
        .join(&["A1", "A2"])
        .rows(&["LONG", "A2"])
        .float("SHIELD", 1e-12)
        .region(RegionChoice::Window { lo: [-100e-6, -100e-6], hi: [1000e-6, 400e-6] });
    let (model, faces) = board.build();
    let seen: Vec<_> = model.nets.iter().map(|n| (n.name.as_str(), n.role, n.cut)).collect();
    let float = |charge| Role::Float { charge };
    assert_eq!(
        seen,
        [
            ("LONG", Role::Row, true),
            ("A1+A2", Role::Row, false),
            ("#1", float(0.0), false),
            ("OTHER", Role::Ground, false),
            ("SHIELD", float(1e-12), false),
            ("GND", Role::Ground, false)
        ]
    );
    // Cut at the window, with a wall there; ground goes on to the extent, without one.
    assert_close(metal(&faces, "LONG").volume, 1000.0 * 100.0 * 35.0 * 1e-18, ROUNDING);
    let walls = conductor_faces(&faces, "GND").filter(|f| f.normal.z.abs() < 0.5).count();
    assert_eq!(walls, 0, "the plane is cut by the extent, which makes no walls");
}

/// What: interfaces between equal permittivities make no face, and nothing is truncated then.
#[test]
fn equal_permittivities_leave_metal_only() {
    let mut board = two_layer().copper("top", "SIG", rect(0, 0, 1000, 100));
    board.stackup.layers[2] = dielectric("core", 1.0, 200.0);
    let (_, faces) = board.build();
    assert_eq!(faces.faces.len(), 6);
    assert!(faces.truncation.is_none());
    assert_eq!(faces.bodies.iter().map(|b| b.name.as_str()).collect::<Vec<_>>(), ["below+core+above"]);
}

/// What: facets of an arc are smooth, its rims are not, and a right angle is solid.
#[test]
fn corners_are_graded() {
    let quarter = polygon(
        std::iter::once(Point::new(0, 0))
            .chain((0..=9).map(|k| {
                let a = f64::from(k) * 10f64.to_radians();
                Point::new((1e5 * a.cos()).round() as i64, (1e5 * a.sin()).round() as i64)
            }))
            .collect(),
    );
    let (_, faces) = two_layer().copper("top", "Q", quarter).planes(&["bottom"]).build();
    let upright: Vec<EdgeGrade> = conductor_faces(&faces, "Q")
        .filter(|f| f.normal.z.abs() < 0.5)
        .flat_map(|f| [f.rings[0].edges[1], f.rings[0].edges[3]])
        .collect();
    let solid = upright.iter().filter(|g| **g == EdgeGrade::Solid).count();
    assert_eq!((solid, upright.len()), (6, 22), "three corners, seen from both sides");
}

/// What: between two planes done by images there is one dielectric and no truncation; no half-space is left. Derived.
#[test]
fn a_stripline_between_two_planes() {
    let board = Board::new(vec![
        open("above", 1.0),
        conductor("lid", 35.0),
        dielectric("upper", 4.0, 200.0),
        conductor("strip", 18.0),
        dielectric("lower", 4.0, 200.0),
        conductor("floor", 35.0),
        open("below", 1.0),
    ])
    .copper("strip", "SIG", rect(0, 0, 1000, 100))
    .planes(&["lid", "floor"]);
    let (model, faces) = board.build();
    assert_close(model.planes.below.unwrap(), 35e-6, ROUNDING);
    assert_close(model.planes.above.unwrap(), 453e-6, ROUNDING);
    assert_eq!((model.slabs.len(), faces.faces.len()), (3, 6));
    assert!(faces.truncation.is_none());
    assert_eq!((faces.outer_er.above, faces.outer_er.below), (None, None));
    assert_all_closed(&faces);
}

/// What: a plane above the rows, with a post of a ground net that ends on it: the post has no face there. Derived.
#[test]
fn a_post_ends_on_a_plane_above() {
    let board = two_layer()
        .copper("bottom", "SIG", rect(0, 0, 1000, 100))
        .copper("bottom", "GND", rect(0, 200, 100, 300))
        .copper("core", "GND", rect(0, 200, 100, 300))
        .ground(&["GND"])
        .planes(&["top"]);
    let (model, faces) = board.build();
    assert_close(model.planes.above.unwrap(), 235e-6, ROUNDING);
    let post = metal(&faces, "GND");
    assert_close(post.area, (1e4 + 400.0 * 235.0) * 1e-12, ROUNDING);
    assert_close(post.vector.z, -1e-8, ROUNDING);
    assert_close(metal(&faces, "SIG").volume, 1000.0 * 100.0 * 35.0 * 1e-18, ROUNDING);
}

/// What: unnamed copper that touches the plane is ground, with a warning; elsewhere it floats.
#[test]
fn unnamed_copper_on_the_plane_is_ground() {
    let board = two_layer()
        .copper("top", "SIG", rect(0, 0, 100, 100))
        .copper("top", "#1", rect(200, 0, 300, 100))
        .barrel("top", "bottom", "#1", rect(220, 20, 280, 80))
        .copper("top", "#2", rect(400, 0, 500, 100))
        .planes(&["bottom"]);
    let (model, _, warnings) = board.build_warned();
    let role = |name: &str| model.nets.iter().find(|n| n.name == name).unwrap().role;
    assert_eq!((role("#1"), role("#2")), (Role::Ground, Role::Float { charge: 0.0 }));
    assert!(warnings.len() == 1 && warnings[0].contains("`#1`"), "{warnings:?}");
}
