//! What must hold whatever the shape: scaling, motion, symmetry, images, neutrality, superposition.

use crate::solids::{body, box_faces, cuboid, empty, graded, group, interface, metal, net, rectangle, sheet};
use chargeskin::faces::{GroupKind, OuterEr, Truncation};
use chargeskin::geom::{PanelShape, Vec3};
use chargeskin::mesh::{Mesh, PanelKind};
use chargeskin::net::{NetId, Role};
use chargeskin::results::{self, CheckOutcome, GroupCharge, Results};
use chargeskin::slab::ImagePlanes;
use chargeskin::{solve, system};

/// Mesh to results.
fn solved(mesh: &Mesh) -> Results {
    results::evaluate(mesh, &solve::solve_dense(system::assemble(mesh).unwrap()).unwrap()).unwrap()
}

/// Value of the check of that name, and whether it passed.
fn check(results: &Results, name: &str) -> (f64, bool) {
    let check = results.checks.iter().find(|check| check.kind.name() == name).unwrap();
    match check.outcome {
        CheckOutcome::Made { value, .. } => (value, check.passed().unwrap()),
        CheckOutcome::NotApplicable(ref why) => panic!("{name}: {why}"),
    }
}

/// The mesh with every corner mapped; normals mapped by `turn`.
fn moved(mesh: &Mesh, place: impl Fn(Vec3) -> Vec3, turn: impl Fn(Vec3) -> Vec3) -> Mesh {
    let mut out = mesh.clone();
    for panel in &mut out.panels {
        let corners: Vec<Vec3> = panel.shape.corners().iter().map(|c| place(*c)).collect();
        panel.shape = PanelShape::new(&corners, turn(panel.shape.normal())).unwrap();
    }
    out
}

/// Two boxes of net 0 and 1 in vacuum, the second coated by a dielectric of permittivity `er`.
fn coated_pair(er: f64) -> Mesh {
    let mut mesh = empty(&["a", "b"], vec![body(1.0, false), body(er, true)]);
    let (one, two, skin) = (metal(&mesh, 0, 0), metal(&mesh, 1, 1), interface(&mesh, 1, 0));
    let cuts = graded(4, 3.0);
    cuboid(&mut mesh, Vec3::zeros(), Vec3::new(1.0, 1.0, 1.0), &cuts, one);
    cuboid(&mut mesh, Vec3::new(2.0, 0.2, 0.1), Vec3::new(2.8, 1.2, 0.9), &cuts, two);
    cuboid(&mut mesh, Vec3::new(1.8, 0.0, -0.1), Vec3::new(3.0, 1.4, 1.1), &cuts, skin);
    mesh
}

/// Largest |A - B| over the largest |A|.
fn difference(one: &Results, two: &Results, scale: f64) -> f64 {
    let n = one.maxwell.nrows();
    let pairs = || (0..n).flat_map(|i| (0..n).map(move |j| (i, j)));
    let largest = pairs().map(|at| one.maxwell[at].abs()).fold(0.0, f64::max);
    pairs().map(|at| (one.maxwell[at] - two.maxwell[at] / scale).abs()).fold(0.0, f64::max) / largest
}

/// What: lengths times s give C times s; a turned and displaced body has the same C.
/// Tolerance: 1e-12. The regimes are the same, and the closed double integrals lose at most 1e5 ε = 2e-11 of a few entries
/// (`rectangles::MAX_LOSS`), with signs that do not add up. Measured 2e-15 scaled, 2e-14 turned.
/// Seen to fail with: limits of the regimes that are round numbers (2e-8).
#[test]
fn scaling_and_motion_change_nothing_else() {
    let mesh = coated_pair(3.0);
    let plain = solved(&mesh);
    let large = solved(&moved(&mesh, |p| p * 10.0, |n| n));
    assert!(difference(&plain, &large, 10.0) < 1e-12, "scaled: {:e}", difference(&plain, &large, 10.0));
    let turn = nalgebra::Rotation3::from_euler_angles(0.3, -0.7, 1.1);
    let turned = solved(&moved(&mesh, |p| turn * p + Vec3::new(3.0, -2.0, 5.0), |n| turn * n));
    assert!(difference(&plain, &turned, 1.0) < 1e-12, "turned: {:e}", difference(&plain, &turned, 1.0));
}

/// What: an interface between equal permittivities carries no charge and changes nothing.
/// Tolerance: rounding, 1e-12. Seen to fail with: `er_to` for `er_to - er_from` in `Row::of`.
#[test]
fn an_interface_between_equals_is_none() {
    let mesh = coated_pair(1.0);
    let with = solved(&mesh);
    let mut without = mesh.clone();
    without.panels.retain(|panel| panel.kind.net().is_some());
    let is_interface = |group: &&GroupCharge| {
        matches!(mesh.groups[group.group.0 as usize].kind, GroupKind::Interface { .. })
    };
    let skin = with.groups.iter().find(is_interface).unwrap();
    assert!(skin.bound.iter().all(|q| q.abs() < 1e-12 * with.maxwell[(0, 0)]), "{:?}", skin.bound);
    assert!(difference(&with, &solved(&without), 1.0) < 1e-12);
}

/// What: reciprocity, signs, dominance, charge at infinity and the neutrality of the coat all pass, and mean something:
/// the same solution read with one permittivity 1.3 times too large fails, however coarse the target.
/// Tolerance: the checks' own. Seen to fail with: the cap on the target's share left out. Should fail with (not yet tried): `er - 1` for `1 - er` in `shares`; the coat's own faces left out.
#[test]
fn a_coated_pair_passes_every_check() {
    let mesh = coated_pair(4.0);
    let charge = solve::solve_dense(system::assemble(&mesh).unwrap()).unwrap();
    let found = results::evaluate(&mesh, &charge).unwrap();
    for name in ["reciprocity", "signs", "dominance", "charge_at_infinity", "neutrality"] {
        let (value, passed) = check(&found, name);
        assert!(passed, "{name}: {value}");
    }
    let mut wrong = mesh.clone();
    for panel in &mut wrong.panels {
        if let PanelKind::Conductor { er, .. } = &mut panel.kind {
            *er *= 1.3;
        }
    }
    let mut misread = results::evaluate(&wrong, &charge).unwrap();
    for target in [0.01, 0.05, 1.0] {
        misread.checks.iter_mut().for_each(|check| check.allow(target, target));
        for name in ["charge_at_infinity", "neutrality"] {
            let (value, passed) = check(&misread, name);
            assert!(!passed, "a wrong permittivity goes unnoticed at {target}: {name} {value}");
        }
        misread = results::evaluate(&wrong, &charge).unwrap();
    }
}

/// What: a box over an image plane has the charge of the box with its mirror image at -1 V, panel by panel.
/// Tolerance: 1e-12, as for a moved body: the pairs are the same but seen from the other side, and the closed double
/// integrals lose up to 1e5 ε = 2e-11 of a few entries (`rectangles::MAX_LOSS`).
/// Should fail with (not yet tried): the image's sign turned.
#[test]
fn an_image_plane_is_the_mirrored_conductor() {
    let cuts = graded(4, 3.0);
    let (lo, hi) = (Vec3::new(0.0, 0.0, 0.3), Vec3::new(1.0, 1.0, 0.8));
    let mut over = empty(&["a"], vec![body(1.0, false)]);
    let kind = metal(&over, 0, 0);
    cuboid(&mut over, lo, hi, &cuts, kind);
    over.planes = ImagePlanes { below: Some(0.0), above: None };
    let mut both = empty(&["a", "b"], vec![body(1.0, false)]);
    let (one, two) = (metal(&both, 0, 0), metal(&both, 1, 0));
    cuboid(&mut both, lo, hi, &cuts, one);
    cuboid(&mut both, Vec3::new(0.0, 0.0, -0.8), Vec3::new(1.0, 1.0, -0.3), &cuts, two);
    let (by_plane, by_pair) = (solved(&over).maxwell[(0, 0)], solved(&both).maxwell);
    let expected = by_pair[(0, 0)] - by_pair[(0, 1)];
    assert!((by_plane / expected - 1.0).abs() < 1e-12, "{by_plane} for {expected}");
}

/// What: a box half embedded in a plane interface has (er1 + er2)/2 times its capacitance in vacuum, wherever the
/// interface ends, and no charge on it.
/// Derived: with the mirror's symmetry `E_n` vanishes on the plane. Tolerance: the near rules' 1e-6 on either side.
/// Should fail with (not yet tried): er of the wrong half on the walls.
#[test]
fn a_half_embedded_box_has_the_mean_permittivity() {
    let build = |er: f64| {
        let mut mesh = empty(&["box"], vec![body(er, false), body(1.0, false)]);
        let cuts = graded(4, 3.0);
        for (b, z0, z1) in [(0, -0.5, 0.0), (1, 0.0, 0.5)] {
            let kind = metal(&mesh, 0, b);
            for (k, face) in
                box_faces(Vec3::new(0.0, 0.0, z0), Vec3::new(1.0, 1.0, z1)).into_iter().enumerate()
            {
                // No face in the cut itself.
                if k != 1 - b as usize {
                    rectangle(&mut mesh, face, [&cuts, &cuts], kind, false);
                }
            }
        }
        let plane = interface(&mesh, 0, 1);
        for x in -2..3 {
            for y in -2..3 {
                if (x, y) != (0, 0) {
                    let frame = [Vec3::new(f64::from(x), f64::from(y), 0.0), Vec3::x(), Vec3::y()];
                    rectangle(&mut mesh, frame, [&graded(2, 1.0), &graded(2, 1.0)], plane, true);
                }
            }
        }
        mesh.outer_er = OuterEr { above: Some(1.0), below: Some(er) };
        mesh.truncation = Some(Truncation { centre: [0.5; 2], copper: [0.5; 2], extent: [2.5; 2] });
        mesh
    };
    let (vacuum, half) = (solved(&build(1.0)), solved(&build(4.0)));
    let ratio = half.maxwell[(0, 0)] / vacuum.maxwell[(0, 0)] / 2.5;
    assert!((ratio - 1.0).abs() < 2e-6, "ratio {ratio}");
    let (value, passed) = check(&half, "charge_at_infinity");
    assert!(passed && value < 1e-4, "{value}");
}

/// What: a floating box has no net charge and the potential that makes it so; its given charge shows in the others; and
/// C with it floating is the Schur complement of C with it as a row.
/// Derived: `docs/formulation.md`, "Floating nets". Tolerance: rounding, 1e-12 of the largest entry.
/// Should fail with (not yet tried): the sign of the right-hand side in `superpose` turned.
#[test]
fn a_floating_net_is_a_row_eliminated() {
    let rows = coated_pair(3.0);
    let mut floating = rows.clone();
    floating.nets[1] = net("b", Role::Float { charge: 2e-12 });
    let (c, found) = (solved(&rows).maxwell, solved(&floating));
    let expected = c[(0, 0)] - c[(0, 1)] * c[(1, 0)] / c[(1, 1)];
    assert!((found.maxwell[(0, 0)] / expected - 1.0).abs() < 1e-12);
    assert!(found.net_charge[(1, 0)].abs() < 1e-12 * c[(0, 0)]);
    assert!((found.net_potential[(1, 0)] + c[(1, 0)] / c[(1, 1)]).abs() < 1e-12);
    assert!((found.idle_charge[1] / 2e-12 - 1.0).abs() < 1e-12);
    assert!((found.idle_charge[0] / (2e-12 * c[(0, 1)] / c[(1, 1)]) - 1.0).abs() < 1e-12);
    assert_eq!(found.rows, [NetId(0)]);
}

/// What: the matrix is the same, bit for bit, with one thread and with three.
#[test]
fn threads_change_no_bit_of_the_matrix() {
    let mesh = coated_pair(3.0);
    let with = |n: usize| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(n).build().unwrap();
        pool.install(|| system::assemble(&mesh).unwrap().matrix)
    };
    let (one, three) = (with(1), with(3));
    assert!(
        (0..one.ncols()).all(|j| (0..one.nrows()).all(|i| one[(i, j)].to_bits() == three[(i, j)].to_bits()))
    );
}

/// A square sheet of side 1 on a grounded slab of thickness 1 and permittivity `er`, whose top is panelled to `reach`
/// beyond the sheet.
fn patch(er: f64, reach: f64, n: usize) -> Mesh {
    let mut mesh = empty(&["patch"], vec![body(er, false), body(1.0, false)]);
    mesh.planes = ImagePlanes { below: Some(0.0), above: None };
    mesh.outer_er = OuterEr { above: Some(1.0), below: None };
    mesh.truncation = Some(Truncation { centre: [0.0; 2], copper: [0.5; 2], extent: [0.5 + reach; 2] });
    let (strip, top) = (sheet(&mesh, 0, 0, 1), interface(&mesh, 0, 1));
    let mut lines: Vec<f64> = graded(n, 4.0).iter().map(|s| s - 0.5).collect();
    let mut outward = Vec::new();
    let mut step = 0.02;
    let mut at = 0.0;
    while at + 1.3 * step < reach {
        at += step;
        step *= 1.6;
        outward.push(at);
    }
    outward.push(reach);
    for d in outward {
        lines.push(0.5 + d);
        lines.insert(0, -0.5 - d);
    }
    for x in lines.windows(2) {
        for y in lines.windows(2) {
            let inside =
                x[0] > -0.5 - 1e-12 && x[1] < 0.5 + 1e-12 && y[0] > -0.5 - 1e-12 && y[1] < 0.5 + 1e-12;
            let kind = if inside { strip } else { top };
            let frame = [
                Vec3::new(x[0], y[0], 1.0),
                Vec3::new(x[1] - x[0], 0.0, 0.0),
                Vec3::new(0.0, y[1] - y[0], 0.0),
            ];
            rectangle(&mut mesh, frame, [&[0.0, 1.0], &[0.0, 1.0]], kind, !inside);
        }
    }
    group(&mut mesh, &top, true);
    mesh
}

/// What: the square patch of B-patch-4.4-1 (width = height, er 4.4): C = 15.909 967 7 ε₀ width (computed reference, graded
/// Galerkin with the layered Green's function, 1.3e-7), and with the tail free charge is er times total charge.
/// Tolerance: C 5e-3, the mesh's error (10 x 10 graded: 1e-3 on the bare sheet, more beside the interface). The identity:
/// a quarter of the tail, since the images of a slab of er 4.4 lie 2 h, 4 h ... deep with weights 0.63^n, and their next
/// order is of size (4 h / 8 h)²; measured 1.5 % of the free charge with a tail of 9.5 % at 8 heights, 3.6 % and 19 % at 4.
/// Should fail with (not yet tried): the tail left out; `er_above` and `er_below` swapped in `free_charge`.
#[test]
fn a_patch_on_a_grounded_slab_has_its_charge_with_the_tail() {
    let mesh = patch(4.4, 8.0, 10);
    let found = solved(&mesh);
    let c = found.maxwell[(0, 0)] / chargeskin::kernel::EPS0;
    let (value, passed) = check(&found, "charge_at_infinity");
    let tail = found.groups.iter().find_map(|group| group.tail.as_ref()).unwrap()[0];
    let share = 4.4 * tail.abs() / found.maxwell[(0, 0)];
    assert!((c / 15.909_967_671_840_84 - 1.0).abs() < 5e-3, "C = {c} ε₀ m");
    assert!(passed && value < 0.25 * share && share > 0.05, "{value} with a tail of {share}");
}
