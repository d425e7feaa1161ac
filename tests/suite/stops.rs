//! What a refinement is expected to take, what stops it short of its target, and what is then said.

use crate::bodies::{Bodies, ellipsoid};
use crate::pipeline::{job, model, stackup};
use chargeskin::diag::Warning;
use chargeskin::extract::{ExtractError, ExtractOptions, Limit, NoFiner, Refinement, Unmet, prepare, refine};
use chargeskin::faces::{BodyId, EdgeGrade, FaceKind, Faces, derive};
use chargeskin::geom::Vec3;
use chargeskin::job::Accuracy;
use chargeskin::mesh::{MeshOptions, panelize};
use chargeskin::results::CheckKind;

/// Refines to `target`; the answer, and the text of the one warning about what stopped it.
fn stopped(faces: &Faces, target: f64, options: &ExtractOptions) -> (Refinement, String) {
    let mut warnings: Vec<Warning> = Vec::new();
    let accuracy = Accuracy { target, ..Accuracy::default() };
    let refined = refine(faces, accuracy, options, &mut warnings, &|_| {}).unwrap();
    assert_eq!(warnings.len(), 1, "{warnings:?}");
    assert_eq!(refined.stopped.as_ref().unwrap().to_string(), warnings[0].text);
    (refined, warnings.remove(0).text)
}

/// A metal cube of side 1 m.
fn cube() -> Faces {
    let (mut bodies, vacuum) = Bodies::in_vacuum();
    let net = bodies.row("CUBE");
    bodies.solid_box(net, vacuum, [0.0; 3], [1.0; 3]);
    bodies.faces
}

/// A metal ellipsoid of 320 flat facets, whose edges are all smooth.
fn ellipsoid_alone() -> Faces {
    let (mut bodies, vacuum) = Bodies::in_vacuum();
    let net = bodies.row("BALL");
    bodies.surface(FaceKind::Conductor { net, body: vacuum }, &ellipsoid([1.0, 0.6, 0.4], Vec3::zeros(), 4));
    bodies.faces
}

/// A metal cube in a cubic coat of er 4, of whose outer faces the last `missing` are not there.
fn coated_cube(missing: usize) -> Faces {
    let (mut bodies, vacuum) = Bodies::in_vacuum();
    let coat: BodyId = bodies.dielectric("coat", 4.0, true);
    let net = bodies.row("CUBE");
    bodies.solid_box(net, coat, [0.0; 3], [1.0; 3]);
    let corner = |k: usize| Vec3::new((k & 1) as f64, (k >> 1 & 1) as f64, (k >> 2 & 1) as f64);
    let quads = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]];
    for quad in &quads[..6 - missing] {
        let ring = quad.map(|k| corner(k) * 1.6 - Vec3::repeat(0.3)).to_vec();
        bodies.flat(FaceKind::Interface { from: coat, to: vacuum }, &[ring], EdgeGrade::Solid);
    }
    bodies.faces
}

/// What: a target that no mesh of 300 panels reaches ends for lack of room, whether panels or memory are the limit; the
/// warning has the panels of the next mesh, which do not fit, and those that do.
/// Derived: the finest mesh fits and the next does not. Tolerance: none.
/// Seen to fail with: the limit of panels given for that of memory.
#[test]
fn no_room_for_a_finer_mesh() {
    let plain = ExtractOptions::default();
    for (options, expected) in [
        (ExtractOptions { max_panels: 300, ..plain }, Limit::Panels),
        (ExtractOptions { max_memory: ExtractOptions::memory_of(300), ..plain }, Limit::Memory),
    ] {
        let (refined, text) = stopped(&cube(), 1e-6, &options);
        let stop = refined.stopped.unwrap();
        let NoFiner::Room { panels, fits, limit, .. } = stop.cause else { panic!("{text}") };
        assert_eq!(limit, expected);
        assert!((299..=300).contains(&fits) && refined.count.panels <= fits && fits < panels, "{text}");
        assert!(text.contains(&panels.to_string()) && text.contains(&fits.to_string()), "{text}");
        assert_eq!(text.contains("memory"), limit == Limit::Memory, "{text}");
        let Unmet::Bar { nets, relative, target } = stop.unmet else { panic!("{text}") };
        assert!(nets == ["CUBE", "CUBE"] && target < relative, "{text}");
        assert!((relative - refined.bars.maxwell[(0, 0)] / refined.results.maxwell[(0, 0)]).abs() < 1e-12);
    }
}

/// What: a smooth body begun near the largest density that a mesh may have ends because its faces get no finer.
/// Derived: 60, 60 sqrt(2) = 85, then 120, which is more than 100. Tolerance: none.
/// Seen to fail with: a density out of range handed on as an error.
#[test]
fn faces_that_get_no_finer() {
    let options = ExtractOptions { density: 60.0, ..ExtractOptions::default() };
    let (refined, text) = stopped(&ellipsoid_alone(), 1e-6, &options);
    let stop = refined.stopped.unwrap();
    assert_eq!(stop.cause, NoFiner::Faces { panels: refined.count.panels }, "{text}");
    assert!(matches!(stop.unmet, Unmet::Bar { .. }) && refined.count.levels == 2, "{text}");
    assert!(!text.contains("memory") && !text.contains("margin"), "{text}");
}

/// What: a coat with a hole fails its checks at whatever target, and that is what is said; the whole coat passes.
/// Derived: the bound charge of the missing face is missing from its body and from the total. Tolerance: the checks' own.
/// Seen to fail with: the caps on thresholds left out.
#[test]
fn a_check_that_fails() {
    let options = ExtractOptions { max_panels: 500, ..ExtractOptions::default() };
    let (refined, text) = stopped(&coated_cube(1), 0.3, &options);
    let stop = refined.stopped.unwrap();
    let Unmet::Check { kind, value, threshold } = stop.unmet else { panic!("{text}") };
    assert_eq!(kind, CheckKind::ChargeAtInfinity);
    assert!(threshold < value && threshold <= 0.1 && text.contains("charge_at_infinity"), "{text}");
    assert!(matches!(stop.cause, NoFiner::Room { .. }), "{text}");
    let accuracy = Accuracy { target: 0.3, ..Accuracy::default() };
    let whole = refine(&coated_cube(0), accuracy, &options, &mut Vec::new(), &|_| {}).unwrap();
    assert_eq!(whole.stopped, None);
}

/// What: what stops the first level, which alone has no bar, is an error that says what it was.
/// Derived: at density 0.05 to 0.2 every face of a cube is one panel; at 1.2 a cube takes more than 6.
/// Tolerance: none. Seen to fail with: `TooLarge` for either.
#[test]
fn one_level_is_no_answer() {
    let with = |options: &ExtractOptions| {
        refine(&cube(), Accuracy::default(), options, &mut Vec::new(), &|_| {}).unwrap_err()
    };
    let sparse = with(&ExtractOptions { density: 0.05, ..ExtractOptions::default() });
    assert!(matches!(sparse, ExtractError::NotFiner { panels: 6 }), "{sparse}");
    let coarsest = panelize(&cube(), &MeshOptions { density: 1.2, ..MeshOptions::default() });
    let n_panels = coarsest.unwrap().value.panels.len();
    for max_panels in [6, n_panels] {
        let small = with(&ExtractOptions { max_panels, ..ExtractOptions::default() });
        let ExtractError::TooLarge { panels, allowed, .. } = small else { panic!("{small}") };
        assert!(allowed == max_panels && allowed < panels, "{panels}");
    }
}

/// What: the expectation covers both levels that a bar needs, and where interfaces are open the two solves that move
/// their border; the text says so.
/// Derived: the sum of the estimates of those solves; cutting at the border takes at least a panel, and at most as many again
/// in each of its four rounds.
/// Tolerance: the order of a sum of two, ε. Seen to fail with: the coarse level left out.
#[test]
fn the_expectation_covers_both_levels() {
    let options = ExtractOptions::default();
    let square = [("A", "top", ["0 mm", "0 mm", "1 mm", "1 mm"])];
    for (er, moves_border) in [(1.0, false), (4.0, true)] {
        let layers = [("top", "0 um"), ("slab", "0.5 mm"), ("plane", "35 um")];
        let model = model(&job(&["A"], &square, "ground_plane = \"plane\"\n"), &stackup(&layers, er));
        let found = prepare(&model, &options).unwrap().expectation(&options);
        let mesh = MeshOptions { density: options.density, ..MeshOptions::default() };
        let coarse = panelize(&derive(&model).unwrap().value, &mesh).unwrap().value.panels.len();
        let levels = options.seconds_of(coarse) + options.seconds_of(2 * coarse);
        assert_eq!((found.panels, found.moves_border), (2 * coarse, moves_border));
        if moves_border {
            assert!(levels + options.seconds_of(coarse) < found.seconds);
            assert!(found.seconds <= levels + 2.0 * options.seconds_of(16 * coarse));
        } else {
            assert!((found.seconds / levels - 1.0).abs() <= f64::EPSILON, "{} {levels}", found.seconds);
        }
    }
}
