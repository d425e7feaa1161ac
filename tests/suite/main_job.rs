//! The main job through the built command: what `inspect` and `schema` print, and what is refused.

use std::path::{Path, PathBuf};
use std::process::Command;

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// What one run of the command did.
struct Run {
    code: Option<i32>,
    stdout: String,
    stderr: String,
}

fn chargeskin(words: &[&str]) -> Run {
    let output =
        Command::new(env!("CARGO_BIN_EXE_chargeskin")).args(words).current_dir(root()).output().unwrap();
    let run = Run {
        code: output.status.code(),
        stdout: String::from_utf8(output.stdout).unwrap(),
        stderr: String::from_utf8(output.stderr).unwrap(),
    };
    assert!(!run.stderr.contains("panicked"), "{words:?}: {}", run.stderr);
    run
}

fn fixture(name: &str) -> PathBuf {
    root().join("fixtures").join(name)
}

/// What: what `inspect` says of the lift plate is what the job draws.
/// Derived: areas of the rectangles in the job, in m2.
/// Tolerance: one rounding per rectangle, 1e-12 of the area.
#[test]
fn inspect_lists_what_the_job_draws() {
    let job = fixture("lift-plate").join("job.toml");
    let run = chargeskin(&["inspect", job.to_str().unwrap(), "--json"]);
    assert_eq!(run.code, Some(0), "{}", run.stderr);
    let found: serde_json::Value = serde_json::from_str(&run.stdout).unwrap();
    let layers = found["layers"].as_array().unwrap();
    let names: Vec<&str> = layers.iter().map(|layer| layer["name"].as_str().unwrap()).collect();
    assert_eq!(names, ["above", "plate", "gap", "film", "electrode", "glass"]);
    let area = |k: usize| layers[k]["area_m2"].as_f64().unwrap();
    let plate = (60.0 * 60.0 - 4.0 * 36.0 + 8.0 * 10.0) * 1e-12;
    let electrode = (48.0 * 48.0 + 6.0 * 60.0) * 1e-12;
    assert!((area(1) - plate).abs() < 1e-12 * plate, "{}", area(1));
    assert!((area(4) - electrode).abs() < 1e-12 * electrode, "{}", area(4));
    assert_eq!((&layers[1]["nets"], &layers[1]["pieces"]), (&1.into(), &1.into()));
    assert_eq!((&layers[4]["nets"], &layers[4]["pieces"]), (&2.into(), &2.into()));
    for key in ["panels", "memory_B", "seconds"] {
        assert!(0.0 < found[key].as_f64().unwrap(), "{key}");
    }
    let text = chargeskin(&["inspect", job.to_str().unwrap()]).stdout;
    assert!(
        text.contains("film") && text.contains("er 7.5 (stackup)") && text.contains("Shorts: none"),
        "{text}"
    );
}

#[test]
fn schemas_are_printed() {
    for kind in ["job", "stackup"] {
        let run = chargeskin(&["schema", kind]);
        assert_eq!(run.code, Some(0));
        let schema: serde_json::Value = serde_json::from_str(&run.stdout).unwrap();
        assert!(schema["$schema"].is_string() && schema["properties"].is_object(), "{kind}");
    }
}

#[test]
fn wrong_words_are_exit_code_2() {
    for words in [&["extract"][..], &["schema", "nonsense"], &["--threads", "0", "schema", "job"], &[]] {
        let run = chargeskin(words);
        assert_eq!(run.code, Some(2), "{words:?}");
        assert!(run.stdout.is_empty() && run.stderr.contains("Usage"), "{words:?}: {}", run.stderr);
    }
    assert_eq!(chargeskin(&["--help"]).code, Some(0));
}

fn copy(from: &Path, to: &Path) {
    std::fs::create_dir_all(to).unwrap();
    for entry in std::fs::read_dir(from).unwrap() {
        let (path, target) = {
            let entry = entry.unwrap();
            (entry.path(), to.join(entry.file_name()))
        };
        if path.is_dir() {
            copy(&path, &target);
        } else {
            std::fs::copy(&path, &target).unwrap();
        }
    }
}

/// Runs `extract` on a copy of a fixture after `change`: it must end with exit code 2, one error with this code, and
/// write nothing.
fn check_refused(name: &str, file: &str, change: impl Fn(&str) -> String, code: &str) {
    let directory = tempfile::tempdir().unwrap();
    let copied = directory.path().join(name);
    copy(&fixture(name), &copied);
    let path = copied.join(file);
    let before = std::fs::read_to_string(&path).unwrap();
    let after = change(&before);
    assert_ne!(before, after, "the change found nothing to change");
    std::fs::write(&path, after).unwrap();
    let out = directory.path().join("out");
    let job = copied.join("job.toml");
    let run = chargeskin(&["extract", job.to_str().unwrap(), "--out", out.to_str().unwrap()]);
    assert_eq!(run.code, Some(2), "{}{}", run.stdout, run.stderr);
    assert!(run.stdout.is_empty(), "{}", run.stdout);
    assert_eq!(run.stderr.matches('\u{d7}').count(), 1, "one error: {}", run.stderr);
    assert!(run.stderr.contains(code), "{code}: {}", run.stderr);
    assert!(run.stderr.contains("help: "), "what to do is said: {}", run.stderr);
    assert!(!run.stderr.contains('\u{1b}'), "no colour where there is no terminal");
    let left = std::fs::read_dir(&out).map_or(0, Iterator::count);
    assert_eq!(left, 0, "nothing is written");
}

#[test]
fn an_unknown_key_is_refused() {
    check_refused("lift-plate", "job.toml", |text| text.replace("rows =", "rowz ="), "job::unknown_key");
}

#[test]
fn a_missing_unit_is_refused() {
    check_refused("lift-plate", "stackup.toml", |text| text.replacen("2 um", "2", 1), "job::missing_unit");
}

#[test]
fn an_unknown_layer_is_refused() {
    let change = |text: &str| text.replacen("layer = \"electrode\"", "layer = \"electrod\"", 1);
    check_refused("lift-plate", "job.toml", change, "job::unknown_layer");
}

#[test]
fn a_missing_file_is_refused() {
    check_refused("lift-plate", "job.toml", |text| text.replace("stackup.toml", "stakup.toml"), "cli::read");
    let change = |text: &str| text.replace("folder = \"gerber\"", "folder = \"gerbers\"");
    check_refused("oil-probe", "job.toml", change, "cli::read");
    let run = chargeskin(&["extract", "no/such/job.toml", "--out", "out"]);
    assert_eq!(run.code, Some(2));
    assert!(run.stderr.contains("cli::read") && run.stderr.contains("no/such/job.toml"), "{}", run.stderr);
}

#[test]
fn a_truncated_gerber_file_is_refused() {
    let half = |text: &str| text[..text.len() / 2].to_owned();
    check_refused("oil-probe", "gerber/oil-probe-top.gbr", half, "artwork::");
}

#[test]
fn shorted_nets_are_refused() {
    let change =
        |text: &str| text.replace("from = [\"28 um\", \"-30 um\"]", "from = [\"20 um\", \"-30 um\"]");
    check_refused("lift-plate", "job.toml", change, "short");
}

#[test]
fn an_empty_region_is_refused() {
    let window = "[region]\nwindow = [[\"1 mm\", \"1 mm\"], [\"2 mm\", \"2 mm\"]]\n\n[nets]\n";
    check_refused("lift-plate", "job.toml", |text| text.replace("[nets]\n", window), "slab::empty_region");
}

#[test]
fn a_dielectric_of_no_thickness_is_refused() {
    let change = |text: &str| text.replacen("0.3 um", "0 um", 1);
    check_refused("lift-plate", "stackup.toml", change, "job::zero_thickness");
}

#[test]
fn a_negative_permittivity_is_refused() {
    let change = |text: &str| text.replace("er = 7.5", "er = -7.5");
    check_refused("lift-plate", "stackup.toml", change, "job::permittivity");
}

#[test]
fn an_absurd_coordinate_is_refused() {
    let change = |text: &str| text.replace("to = [\"24 um\"", "to = [\"1e300 um\"");
    check_refused("lift-plate", "job.toml", change, "job::absurd_length");
}

#[test]
fn text_that_is_not_utf8_is_refused() {
    let directory = tempfile::tempdir().unwrap();
    let job = directory.path().join("job.toml");
    std::fs::write(&job, b"title = \"K\xfchler\"\n").unwrap();
    let run = chargeskin(&["inspect", job.to_str().unwrap()]);
    assert_eq!(run.code, Some(2));
    assert!(run.stderr.contains("cli::not_utf8") && run.stderr.contains("byte 10"), "{}", run.stderr);
}
