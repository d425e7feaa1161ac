//! Bad job and stackup files: each case is a text that is wrong in one way, and the snapshot shows what is said.

use super::{FILE, job, render, stackup};
use chargeskin::job::{JobErrors, check_names, read_gbrjob_stackup, read_job, read_stackup};
use miette::Diagnostic;
use std::collections::{BTreeMap, BTreeSet};

const HEAD: &str = "stackup = \"stackup.toml\"\n[artwork]\nfolder = \".\"\n";

/// Name of the case, code of its first problem, text after [`HEAD`].
const JOBS: [(&str, &str, &str); 32] = [
    ("unknown section", "job::unknown_key", "[net]\nground = [\"GND\"]"),
    ("unknown key", "job::unknown_key", "[nets]\nfloor = \"1 %\"\ngrund = [\"GND\"]"),
    ("missing unit, bare number", "job::missing_unit", "[region]\naround = [\"A\"]\nmargin = 2"),
    ("missing unit, text", "job::missing_unit", "[region]\naround = [\"A\"]\nmargin = \"2\""),
    ("unit of another quantity", "job::bad_quantity", "[region]\naround = [\"A\"]\nmargin = \"2 pF\""),
    ("decimal comma", "job::bad_quantity", "[region]\naround = [\"A\"]\nmargin = \"2,5 mm\""),
    ("not a number", "job::bad_quantity", "[region]\naround = [\"A\"]\nmargin = \"nan mm\""),
    (
        "coordinate of 1e300",
        "job::absurd_length",
        "[[shape]]\nnet = \"A\"\nlayer = \"top\"\nrectangle = { from = [\"0 m\", \"0 m\"], to = [\"1e300 mm\", \"1 mm\"] }",
    ),
    (
        "coordinate of 1e400",
        "job::bad_quantity",
        "[region]\nwindow = [[\"0 m\", \"0 m\"], [\"1e400 mm\", \"1 mm\"]]",
    ),
    ("zero margin", "job::out_of_range", "[region]\naround = [\"A\"]\nmargin = \"0 mm\""),
    ("flat window", "job::no_area", "[region]\nwindow = [[\"0 mm\", \"0 mm\"], [\"1 mm\", \"0 mm\"]]"),
    (
        "window and around",
        "job::conflicting_keys",
        "[region]\naround = [\"A\"]\nwindow = [[\"0 mm\", \"0 mm\"], [\"1 mm\", \"1 mm\"]]",
    ),
    ("margin of nothing", "job::missing_key", "[region]\nmargin = \"1 mm\""),
    ("target too small", "job::out_of_range", "[accuracy]\ntarget = \"1e-9 %\"\nfloor = \"200 %\""),
    ("wrong word", "job::unknown_word", "[nets]\nothers = \"grounded\""),
    ("wrong type", "job::wrong_type", "[nets]\nground = \"GND\""),
    ("empty list", "job::list_length", "[nets]\nrows = []"),
    ("empty name", "job::empty_name", "[nets]\nrows = [\" \"]"),
    ("ground and row", "job::net_with_two_roles", "[nets]\nground = [\"GND\"]\nrows = [\"A\", \"GND\"]"),
    (
        "joined ground and row",
        "job::net_with_two_roles",
        "[nets]\nground = [\"GND\"]\nrows = [\"A\"]\njoin = [[\"A\", \"GND\"]]",
    ),
    ("lonely join", "job::list_length", "[nets]\njoin = [[\"A\"]]"),
    ("three planes", "job::list_length", "[nets]\nground_plane = [\"a\", \"b\", \"c\"]"),
    ("charge of a cloud", "job::out_of_range", "[nets]\nfloat = [{ net = \"A\", charge = \"20 C\" }]"),
    ("negative er", "job::permittivity", "[materials]\nFR4 = { er = -4.3 }"),
    ("er of infinity", "job::out_of_range", "[materials]\nFR4 = { er = inf }"),
    (
        "table out of order",
        "job::out_of_range",
        "[materials]\nFR4 = { er = [[\"1 GHz\", 4.2], [\"1 MHz\", 4.5]] }",
    ),
    (
        "shape of two outlines",
        "job::conflicting_keys",
        "[[shape]]\nlayer = \"top\"\nrectangle = { from = [\"0 mm\", \"0 mm\"], to = [\"1 mm\", \"1 mm\"] }\ncircle = { at = [\"0 mm\", \"0 mm\"], diameter = \"1 mm\" }",
    ),
    ("shape of none", "job::missing_key", "[[shape]]\nlayer = \"top\""),
    (
        "polygon on a line",
        "job::no_area",
        "[[shape]]\nlayer = \"top\"\npolygon = [[\"0 mm\", \"0 mm\"], [\"1 mm\", \"1 mm\"], [\"2 mm\", \"2 mm\"]]",
    ),
    (
        "circle of no size",
        "job::out_of_range",
        "[[shape]]\nlayer = \"top\"\ncircle = { at = [\"0 mm\", \"0 mm\"], diameter = \"0 mm\" }",
    ),
    (
        "finished holes without plating",
        "job::missing_key",
        "files = [{ path = \"a.drl\", hole = \"finished\" }]",
    ),
    ("syntax", "job::syntax", "[nets\nrows = [\"A\"]"),
];

/// Name of the case, code of its first problem, text.
const STACKUPS: [(&str, &str, &str); 17] = [
    ("empty", "job::missing_key", ""),
    (
        "zero thickness",
        "job::zero_thickness",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"0 um\"\n[[layer]]\nname = \"core\"\nkind = \"dielectric\"\ner = 4\nthickness = \"0 mm\"",
    ),
    (
        "negative thickness",
        "job::out_of_range",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"-35 um\"",
    ),
    (
        "negative er",
        "job::permittivity",
        "[[layer]]\nname = \"core\"\nkind = \"dielectric\"\ner = -4\nthickness = \"1 mm\"",
    ),
    (
        "er left out",
        "job::missing_permittivity",
        "[[layer]]\nname = \"core\"\nkind = \"dielectric\"\nthickness = \"1 mm\"",
    ),
    (
        "thickness left out",
        "job::missing_thickness",
        "[[layer]]\nname = \"my core\"\nkind = \"dielectric\"\ner = 4",
    ),
    (
        "absurd thickness",
        "job::absurd_length",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 m\"",
    ),
    (
        "unknown kind",
        "job::unknown_word",
        "[[layer]]\nname = \"top\"\nkind = \"conducter\"\nthickness = \"35 um\"",
    ),
    (
        "key of another kind",
        "job::key_of_other_kind",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\ner = 4\ntolerance = { er = \"5 %\" }",
    ),
    (
        "names twice",
        "job::duplicate_layer",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\n[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"",
    ),
    (
        "open inside",
        "job::open_inside",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\n[[layer]]\nname = \"air\"\nkind = \"open\"\ner = 1\n[[layer]]\nname = \"bottom\"\nkind = \"conductor\"\nthickness = \"35 um\"",
    ),
    (
        "coating inside",
        "job::coating_inside",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\n[[layer]]\nname = \"mask\"\nkind = \"coating\"\ner = 3\ndepth_on_laminate = \"9 um\"\ndepth_on_copper = \"9 um\"\n[[layer]]\nname = \"bottom\"\nkind = \"conductor\"\nthickness = \"35 um\"",
    ),
    (
        "no conductor",
        "job::no_conductor",
        "[[layer]]\nname = \"core\"\nkind = \"dielectric\"\ner = 4\nthickness = \"1 mm\"",
    ),
    (
        "fill that is not there",
        "job::unknown_layer",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\nfill = \"cor\"\n[[layer]]\nname = \"core\"\nkind = \"dielectric\"\ner = 4\nthickness = \"1 mm\"",
    ),
    (
        "fill of metal",
        "job::wrong_layer_kind",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\nfill = \"top\"",
    ),
    (
        "flat slope",
        "job::out_of_range",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\nside_slope = \"120 deg\"",
    ),
    (
        "tolerance of all",
        "job::out_of_range",
        "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"35 um\"\ntolerance = { thickness = \"150 %\", etch_bias = \"8\" }",
    ),
];

const TWO_LAYERS: &str = "
[[layer]]
name = \"top\"
kind = \"conductor\"
thickness = \"35 um\"
[[layer]]
name = \"core\"
kind = \"dielectric\"
er = 4.3
thickness = \"1 mm\"
[[layer]]
name = \"bottom\"
kind = \"conductor\"
thickness = \"35 um\"
";

/// Name of the case, code of its first problem, text after [`HEAD`], against [`TWO_LAYERS`].
const PAIRS: [(&str, &str, &str); 8] = [
    ("unknown layer", "job::unknown_layer", "files = [{ path = \"a.gbr\", layer = \"topp\" }]"),
    (
        "artwork of the open space",
        "job::wrong_layer_kind",
        "files = [{ path = \"a.gbr\", layer = \"above\" }]",
    ),
    (
        "net on a dielectric",
        "job::net_on_dielectric",
        "[[shape]]\nnet = \"A\"\nlayer = \"core\"\ncircle = { at = [\"0 mm\", \"0 mm\"], diameter = \"1 mm\" }",
    ),
    (
        "copper without a net",
        "job::shape_without_net",
        "[[shape]]\nlayer = \"top\"\ncircle = { at = [\"0 mm\", \"0 mm\"], diameter = \"1 mm\" }",
    ),
    (
        "post through the air",
        "job::wrong_layer_kind",
        "[[shape]]\nnet = \"A\"\nlayer = \"top\"\nthrough = [\"above\"]\ncircle = { at = [\"0 mm\", \"0 mm\"], diameter = \"1 mm\" }",
    ),
    ("plane of glass", "job::wrong_layer_kind", "[nets]\nground_plane = \"core\""),
    (
        "span upside down",
        "job::span_order",
        "files = [{ path = \"a.drl\", from = \"bottom\", to = \"top\" }]",
    ),
    ("material of nothing", "job::unknown_material", "[materials]\ncoer = { er = 4 }"),
];

fn first_code(errors: &JobErrors) -> String {
    errors.problems()[0].code().map(|code| code.to_string()).unwrap_or_default()
}

/// What: every bad text is refused with the code that its case names first. Seen to fail with: a rule taken out.
fn check(cases: &[(&str, &str, &str)], file: &str, read: impl Fn(&str) -> (String, JobErrors)) -> String {
    let mut out = String::new();
    for (name, code, text) in cases {
        let (text, errors) = read(text);
        assert_eq!(first_code(&errors), *code, "{name}");
        out.push_str(&format!("==== {name}\n{}\n", render(errors, file, &text)));
    }
    out
}

#[test]
fn bad_jobs_are_explained() {
    let said = check(&JOBS, "job.toml", |text| {
        let text = format!("{HEAD}{text}\n");
        let errors = read_job(&text, FILE).unwrap_err();
        (text, errors)
    });
    insta::assert_snapshot!(said);
}

#[test]
fn bad_stackups_are_explained() {
    let said = check(&STACKUPS, "stackup.toml", |text| {
        let errors = read_stackup(text, FILE, &BTreeMap::new(), None).unwrap_err();
        (text.to_owned(), errors)
    });
    insta::assert_snapshot!(said);
}

#[test]
fn names_that_do_not_fit_the_stackup_are_explained() {
    let layers = stackup(TWO_LAYERS).value;
    let said = check(&PAIRS, "job.toml", |text| {
        let text = format!("{HEAD}{text}\n");
        let errors = check_names(&job(&text).value, &layers).unwrap_err();
        (text, errors)
    });
    insta::assert_snapshot!(said);
}

/// What: one run reports everything, in the order of the text.
#[test]
fn all_problems_come_at_once() {
    let text = "titel = \"x\"\nfrequency = \"0 Hz\"\n[nets]\nrows = [\"A\", \"A\"]\n[region]\nmargin = \"1\"\n[accuracy]\ntarget = 1\n";
    let errors = read_job(text, FILE).unwrap_err();
    let codes: Vec<String> =
        errors.problems().iter().filter_map(|p| p.code().map(|code| code.to_string())).collect();
    let distinct: BTreeSet<&String> = codes.iter().collect();
    assert_eq!(codes.len(), 8, "{codes:?}");
    assert_eq!(distinct.len(), 6, "{codes:?}");
    insta::assert_snapshot!(render(errors, "job.toml", text));
}

/// What: a job without artwork names only nets that it draws.
#[test]
fn a_net_that_nobody_draws_is_found() {
    let text = "stackup = \"s.toml\"\n[nets]\nrows = [\"DRIVE\", \"SENS\"]\n[[shape]]\nnet = \"SENSE\"\nlayer = \"top\"\n\
                circle = { at = [\"0 mm\", \"0 mm\"], diameter = \"1 mm\" }\n[[shape]]\nnet = \"DRIVE\"\nlayer = \"top\"\n\
                circle = { at = [\"3 mm\", \"0 mm\"], diameter = \"1 mm\" }\n";
    let errors = read_job(text, FILE).unwrap_err();
    insta::assert_snapshot!(render(errors, "job.toml", text));
}

/// What: any prefix of a good file is read or refused, but never panics; the same with one byte changed.
#[test]
fn cut_and_changed_files_do_not_panic() {
    for text in [super::complete::JOB, super::complete::STACKUP] {
        for (end, _) in text.char_indices() {
            let read = read_job(&text[..end], FILE);
            if end % 32 == 0 {
                let _ = read.map_err(|errors| render(errors, "x", &text[..end]));
            }
            let _ = read_stackup(&text[..end], FILE, &BTreeMap::new(), None);
            for other in ["\"", "9", "["] {
                let changed = format!("{}{other}{}", &text[..end], &text[(end + 1).min(text.len())..]);
                let _ = read_job(&changed, FILE);
                let _ = read_stackup(&changed, FILE, &BTreeMap::new(), Some(1e6));
            }
        }
    }
}

/// What: files of noise, some megabytes each, end soon and with a bounded list of problems.
/// Tolerance: 20 s for each on a shared machine; a quadratic search over 100,000 entries would take hours.
#[test]
fn floods_are_borne() {
    let many = |line: &dyn Fn(usize) -> String| (0..100_000).map(line).collect::<String>();
    let keys = many(&|k| format!("k{k} = 1\n"));
    let layers = "[[layer]]\nname = \"a\"\nkind = \"open\"\n".repeat(20_000);
    let nets = format!(
        "[nets]\nrows = [{}]\n[[shape]]\nnet = \"A\"\nlayer = \"t\"\ncircle = {{ at = [\"0 m\", \"0 m\"], diameter = \"1 mm\" }}\nstackup = 1\n",
        many(&|k| format!("\"N{k}\","))
    );
    let copper = "{ \"Type\": \"Copper\" },".repeat(100_000);
    let board = format!("{{ \"MaterialStackup\": [{}] }}", copper.trim_end_matches(','));
    let start = std::time::Instant::now();
    let counts = [
        read_job(&keys, FILE).unwrap_err().problems().len(),
        read_stackup(&layers, FILE, &BTreeMap::new(), None).unwrap_err().problems().len(),
        read_job(&nets, FILE).unwrap_err().problems().len(),
        read_gbrjob_stackup(&board, FILE, &BTreeMap::new(), None).unwrap_err().problems().len(),
    ];
    assert_eq!(counts, [1000, 1, 102, 1]);
    assert!(start.elapsed().as_secs() < 80, "{:?}", start.elapsed());
}
