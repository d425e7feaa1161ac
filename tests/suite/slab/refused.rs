//! Nasty inputs: each gives one typed error that names what is wrong and where.

use super::bench::{Board, dielectric, etched_conductor, named, rect, two_layer};
use chargeskin::job::RegionChoice;
use chargeskin::slab::SlabError;
use miette::Diagnostic;

#[track_caller]
fn refused(board: &Board, code: &str, words: &[&str]) {
    let errors = board.slabs().unwrap_err().0;
    assert_eq!(errors.len(), 1, "{errors:?}");
    assert_eq!(errors[0].code().map(|c| c.to_string()).as_deref(), Some(code));
    let text = format!("{} {}", errors[0], errors[0].help().map(|h| h.to_string()).unwrap_or_default());
    for word in words {
        assert!(text.contains(word), "`{word}` is not in: {text}");
    }
}

fn trace() -> Board {
    two_layer().copper("top", "SIG", rect(0, 0, 1000, 100))
}

#[test]
fn a_net_that_the_artwork_lacks() {
    refused(&trace().rows(&["SIGN"]), "slab::unknown_net", &["`rows`", "`SIGN`", "`SIG`"]);
    refused(&trace().ground(&["gnd"]), "slab::unknown_net", &["`ground`", "`gnd`"]);
}

#[test]
fn a_net_with_two_roles() {
    refused(&trace().rows(&["SIG"]).ground(&["SIG"]), "slab::two_roles", &["`SIG`", "`rows`", "`ground`"]);
}

#[test]
fn a_row_outside_of_the_window() {
    let window = RegionChoice::Window { lo: [0.0, 0.0], hi: [1e-3, 1e-3] };
    let board = trace().copper("top", "FAR", rect(5000, 0, 6000, 100)).rows(&["SIG", "FAR"]).region(window);
    refused(&board, "slab::row_outside", &["`FAR`"]);
}

#[test]
fn an_empty_region() {
    let window = RegionChoice::Window { lo: [5e-3, 5e-3], hi: [6e-3, 6e-3] };
    refused(&trace().region(window), "slab::empty_region", &["(0 mm, 0 mm)", "(1 mm, 0.1 mm)"]);
    refused(&two_layer(), "slab::empty_region", &[]);
}

#[test]
fn a_window_turned_inside_out() {
    let window = RegionChoice::Window { lo: [1e-3, 1e-3], hi: [0.0, 0.0] };
    refused(&trace().region(window), "slab::bad_window", &["lower left"]);
    let window = RegionChoice::Window { lo: [0.0, 0.0], hi: [1e300, f64::NAN] };
    refused(&trace().region(window), "slab::bad_window", &[]);
}

#[test]
fn a_barrel_through_copper_of_another_net() {
    let board = trace().copper("bottom", "GND", rect(-500, -500, 1500, 500)).barrel(
        "top",
        "bottom",
        "SIG",
        rect(20, 20, 60, 60),
    );
    refused(&board, "slab::short", &["`SIG`", "`GND`", "`bottom`", "(0.02 mm, 0.02 mm)", "plated hole"]);
}

#[test]
fn a_bias_that_makes_copper_touch() {
    let mut board = trace().copper("top", "NEAR", rect(0, 108, 1000, 200));
    board.stackup.layers[1] = etched_conductor("top", 35.0, 90.0, 5.0);
    refused(&board, "slab::short", &["`SIG`", "`NEAR`", "`top`", "etch bias"]);
    // Edges that only just touch are found one stage later.
    board.stackup.layers[1] = etched_conductor("top", 35.0, 90.0, 4.0);
    let model = board.slabs().unwrap().value;
    let error = chargeskin::faces::derive(&model).unwrap_err();
    assert_eq!(error.code().map(|c| c.to_string()).as_deref(), Some("faces::short"));
    assert!(error.to_string().contains("`SIG`") && error.to_string().contains("0.104 mm"), "{error}");
}

#[test]
fn numbers_that_cannot_be_built() {
    let mut board = trace();
    board.stackup.layers[2] = dielectric("core", -4.0, 200.0);
    refused(&board, "slab::bad_number", &["`core`", "er", "-4"]);
    board.stackup.layers[2] = dielectric("core", 4.0, 0.0);
    refused(&board, "slab::bad_number", &["`core`", "thickness"]);
    board.stackup.layers[2] = dielectric("core", f64::NAN, 200.0);
    refused(&board, "slab::bad_number", &["NaN"]);
    board.stackup.layers[2] = dielectric("core", 4.0, 1e300);
    refused(&board, "slab::too_large", &["grid"]);
}

#[test]
fn planes_that_cannot_be() {
    refused(&trace().planes(&["core"]), "slab::bad_plane", &["`core`", "not a conductor"]);
    refused(&trace().planes(&["cellar"]), "slab::bad_plane", &["`cellar`", "lacks"]);
    refused(&trace().planes(&["bottom", "bottom"]), "slab::bad_plane", &["twice"]);
    let via = trace().barrel("top", "bottom", "SIG", rect(20, 20, 60, 60)).planes(&["bottom"]);
    refused(&via, "slab::plane_short", &["`SIG`", "touches", "`bottom`"]);
}

#[test]
fn a_row_beyond_the_plane() {
    let layers = vec![
        super::open("above", 1.0),
        super::conductor("top", 35.0),
        dielectric("a", 4.0, 100.0),
        super::conductor("mid", 18.0),
        dielectric("b", 4.0, 100.0),
        super::conductor("low", 35.0),
        super::open("below", 1.0),
    ];
    let board = Board::new(layers)
        .copper("top", "SIG", rect(0, 0, 100, 100))
        .copper("low", "UNDER", rect(0, 0, 100, 100))
        .planes(&["mid"]);
    refused(&board, "slab::plane_short", &["`UNDER`", "beyond", "`mid`"]);
}

#[test]
fn no_rows_at_all() {
    refused(&trace().ground(&["SIG"]), "slab::no_rows", &["1 named nets"]);
}

#[test]
fn a_fill_without_material() {
    let mut board = trace();
    if let chargeskin::job::LayerKind::Conductor { fill, .. } = &mut board.stackup.layers[1].kind {
        *fill = Some(named("bottom"));
    }
    refused(&board, "slab::bad_fill", &["`top`", "`bottom`"]);
}

#[test]
fn many_problems_are_reported_at_once() {
    let errors = trace().rows(&["X", "Y"]).ground(&["Z"]).slabs().unwrap_err().0;
    assert_eq!(errors.len(), 3);
    assert!(errors.iter().all(|e| matches!(e, SlabError::UnknownNet { .. })));
}
