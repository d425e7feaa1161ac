//! Gerber job files: real ones beside the project when they are there, and what is made of odd spellings.

use super::{FILE, job, render};
use chargeskin::diag::{FileId, Warned};
use chargeskin::job::{LayerKind, MaterialPatch, Stackup, check_names, read_gbrjob_stackup};
use std::collections::BTreeMap;
use std::path::Path;

const MATERIALS: &str = "stackup = \"s.gbrjob\"\n[artwork]\nfolder = \".\"\n[materials]\n\
    FR4 = { er = 4.4 }\nSolderMask = { er = 3.5 }\n";

/// The text of a real job file; `None`, said aloud, when it is not there.
fn real_file(path: &str) -> Option<String> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("../shared/boards").join(path);
    let text = std::fs::read_to_string(&path).ok();
    if text.is_none() {
        println!("skipped: {} is not there", path.display());
    }
    text
}

fn read(text: &str, materials: &BTreeMap<String, MaterialPatch>) -> Warned<Stackup> {
    read_gbrjob_stackup(text, FILE, materials, None)
        .unwrap_or_else(|errors| panic!("{}", render(errors, "x.gbrjob", text)))
}

fn thicknesses(stackup: &Stackup) -> Vec<(&str, f64)> {
    stackup
        .layers
        .iter()
        .filter_map(|layer| match layer.kind {
            LayerKind::Open { .. } => None,
            LayerKind::Coating { depth_on_laminate, .. } => Some((layer.name.as_str(), depth_on_laminate)),
            LayerKind::Conductor { thickness, .. } | LayerKind::Dielectric { thickness, .. } => {
                Some((layer.name.as_str(), thickness))
            }
        })
        .collect()
}

/// What: the stated thicknesses of real boards add up to the stated thickness of the board, 1.6 mm, masks included.
/// Source: the files' own `BoardThickness`. Tolerance: n additions, n * EPSILON * sum. Seen to fail with: the last
/// four entries dropped.
#[test]
fn real_boards_add_up() {
    for (path, n_layers) in [("ctrl4l/hardware-job.gbrjob", 9), ("arena6l/ni_arena_12-12-job.gbrjob", 13)] {
        let Some(text) = real_file(path) else { continue };
        let job = job(MATERIALS).value;
        let read = read(&text, &job.materials);
        let layers = thicknesses(&read.value);
        assert_eq!(layers.len(), n_layers);
        let sum: f64 = layers.iter().map(|(_, thickness)| thickness).sum();
        assert!((sum - 1.6e-3).abs() <= 13.0 * f64::EPSILON * 1.6e-3, "{path}: {sum}");
        assert!(read.value.find("F.Cu").is_some() && read.value.find("F.Cu/In1.Cu").is_some());
        assert_eq!(check_names(&job, &read.value), Ok(()));
        // Two depths of mask, one line for legend and paste.
        assert_eq!(read.warnings.len(), 3, "{:?}", read.warnings);
    }
}

/// What: a real file without any thickness: copper and mask by common practice, the laminate from the board's 1.6 mm.
/// Derived: 1.6 mm - 2 * 35 um - 2 * 20 um = 1.49 mm.
#[test]
fn a_real_board_without_thickness_is_completed_aloud() {
    let Some(text) = real_file("sense2l/hardware-job.gbrjob") else { return };
    let read = read(&text, &job(MATERIALS).value.materials);
    let layers = thicknesses(&read.value);
    assert_eq!(
        layers,
        [
            ("Top Solder Mask", 20e-6),
            ("F.Cu", 35e-6),
            ("F.Cu/B.Cu", 1.49e-3),
            ("B.Cu", 35e-6),
            ("Bottom Solder Mask", 20e-6)
        ]
    );
    let warnings: Vec<&str> = read.warnings.iter().map(|warning| warning.text.as_str()).collect();
    insta::assert_snapshot!(warnings.join("\n"));
}

#[test]
fn without_materials_every_gap_is_named() {
    let Some(text) = real_file("ctrl4l/hardware-job.gbrjob") else { return };
    let errors = read_gbrjob_stackup(&text, FileId(3), &BTreeMap::new(), None).unwrap_err();
    assert_eq!(errors.problems().len(), 5, "three dielectrics and two masks");
    assert_eq!(errors.file(), FileId(3));
    insta::assert_snapshot!(render(errors, "hardware-job.gbrjob", &text));
}

/// What: numbers as text, decimal commas, a byte order mark, keys in other case, types of other spelling, names left
/// out or repeated, prepreg said in four places.
#[test]
fn odd_spellings_are_understood() {
    let text = "\u{feff}{ \"GeneralSpecs\": { \"BoardThickness\": \"1,0\" }, \"materialStackup\": [
        { \"type\": \"Solder Mask\", \"thickness\": \"0,02\", \"DielectricConstant\": \"3,5\" },
        { \"Type\": \"COPPER\", \"Thickness\": \"18 um\" },
        { \"Type\": \"Prepreg\", \"Thickness\": 0.1, \"DielectricConstant\": \"4.1\", \"LossTangent\": 0.02 },
        { \"Type\": \"Copper\", \"Thickness\": null },
        { \"Type\": \"Core\", \"DielectricConstant\": 4.4, \"Frequency\": 1e9 },
        { \"Type\": \"Copper\", \"Name\": \"L3\", \"Thickness\": \"\" },
        { \"Type\": \"Dielectric\", \"Thickness\": 0.1, \"Notes\": \"2 sheets of Pre-preg\", \"DielectricConstant\": 4.1 },
        { \"Type\": \"Copper\", \"Name\": \"L3\", \"Thickness\": 0.035 }
    ] }";
    let read = read(text, &BTreeMap::new());
    let stackup = &read.value;
    let layers = thicknesses(stackup);
    let expected = [
        ("mask-top", 20e-6),
        ("top", 18e-6),
        ("dielectric-1", 0.1e-3),
        ("inner-1", 35e-6),
        ("dielectric-2", 657e-6),
        ("L3", 35e-6),
        ("dielectric-3", 0.1e-3),
        ("L3-2", 35e-6),
    ];
    // The deduced one, 1000 - 20 - 18 - 100 - 35 - 35 - 100 - 35 um, is rounded to 1 nm: EPSILON. The rest are read exactly.
    for (found, wanted) in layers.iter().zip(expected) {
        assert!(found.0 == wanted.0 && (found.1 - wanted.1).abs() <= f64::EPSILON * wanted.1, "{found:?}");
    }
    assert_eq!(layers.len(), expected.len());
    let is_prepreg = |name: &str| {
        let layer = stackup.get(stackup.find(name).unwrap());
        matches!(layer.kind, LayerKind::Dielectric { prepreg: true, .. })
    };
    assert_eq!(["dielectric-1", "dielectric-2", "dielectric-3"].map(is_prepreg), [true, false, true]);
    let core = stackup.get(stackup.find("dielectric-2").unwrap()).material().unwrap();
    assert_eq!(core.er_source, "stackup, at 1 GHz");
    let unused: Vec<&str> = stackup.unused.iter().map(|entry| entry.name.as_str()).collect();
    assert_eq!(unused, ["LossTangent of layer `dielectric-1`"]);
    let warnings: Vec<&str> = read.warnings.iter().map(|warning| warning.text.as_str()).collect();
    insta::assert_snapshot!(warnings.join("\n"));
}

/// What: a value that is no number is a problem, and only a warning when the job gives the value.
#[test]
fn the_job_stands_in_for_nonsense() {
    let text = "{ \"MaterialStackup\": [ { \"Type\": \"Copper\", \"Thickness\": 0.035 },
        { \"Type\": \"Dielectric\", \"Material\": \"FR4\", \"Thickness\": 1, \"DielectricConstant\": \"4.2-4.6\" } ] }";
    assert_eq!(read_gbrjob_stackup(text, FILE, &BTreeMap::new(), None).unwrap_err().problems().len(), 1);
    let read = read(text, &job(MATERIALS).value.materials);
    assert_eq!(read.warnings.len(), 1, "{:?}", read.warnings);
    assert_eq!(read.value.layers[2].material().map(|m| m.er), Some(4.4));
}

/// What: one bad file per way to be bad; each is refused with all its problems, none panics.
#[test]
fn bad_files_are_refused() {
    let cases = [
        ("not JSON", "{ \"MaterialStackup\": [ { \"Type\": \"Copper\", } ] }"),
        ("a list", "[1, 2]"),
        ("empty", ""),
        ("no stackup", "{ \"GeneralSpecs\": {} }"),
        ("a stackup of numbers", "{ \"MaterialStackup\": [1] }"),
        (
            "no copper",
            "{ \"MaterialStackup\": [ { \"Type\": \"Dielectric\", \"Thickness\": 1, \"DielectricConstant\": 4 } ] }",
        ),
        (
            "many",
            "{ \"MaterialStackup\": [\n  { \"Type\": \"Koper\" },\n  { \"Name\": \"x\" },\n  { \"Type\": \"Copper\", \"Thickness\": \"thick\" },\n  \
             { \"Type\": \"Dielectric\", \"Thickness\": 1e300, \"DielectricConstant\": -4 },\n  { \"Type\": \"Dielectric\" }\n] }",
        ),
    ];
    let mut out = String::new();
    for (name, text) in cases {
        let errors = read_gbrjob_stackup(text, FILE, &BTreeMap::new(), None).unwrap_err();
        out.push_str(&format!("==== {name}\n{}\n", render(errors, "board.gbrjob", text)));
    }
    insta::assert_snapshot!(out);
}
