//! The main job, end to end: the built command on our own fixtures, on broken inputs, and as the README says.

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::process::Command;
use std::sync::LazyLock;

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// What one run of the command did.
pub(crate) struct Run {
    pub(crate) code: Option<i32>,
    pub(crate) stdout: String,
    pub(crate) stderr: String,
}

pub(crate) fn chargeskin(words: &[&str]) -> Run {
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

/// What an extraction left behind.
struct Extracted {
    run: Run,
    result: serde_json::Value,
    files: Vec<String>,
}

/// Extracts a fixture, whatever the checks say of it.
fn extract(name: &str, more: &[&str]) -> Extracted {
    let out = tempfile::tempdir().unwrap();
    let job = format!("fixtures/{name}/job.toml");
    let mut words = vec!["extract", &job, "--out", out.path().to_str().unwrap()];
    words.extend(more);
    let run = chargeskin(&words);
    assert!(matches!(run.code, Some(0 | 1)), "{name}: {:?}\n{}", run.code, run.stderr);
    let text = std::fs::read_to_string(out.path().join("result.json")).unwrap();
    let mut files: Vec<String> = std::fs::read_dir(out.path())
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    files.sort();
    Extracted { run, result: serde_json::from_str(&text).unwrap(), files }
}

/// The one run of the README's example that several tests look at.
static OIL_PROBE: LazyLock<Extracted> = LazyLock::new(|| extract("oil-probe", &[]));

fn numbers(value: &serde_json::Value) -> Vec<f64> {
    value.as_array().unwrap().iter().map(|v| v.as_f64().unwrap()).collect()
}

/// Every key at every depth, but for those of maps whose keys are names: of nets, of stages.
fn keys(value: &serde_json::Value, found: &mut BTreeSet<String>) {
    match value {
        serde_json::Value::Object(map) => {
            for (key, inner) in map {
                found.insert(key.clone());
                if key != "idle_charge_C" && key != "seconds" {
                    keys(inner, found);
                }
            }
        }
        serde_json::Value::Array(items) => items.iter().for_each(|item| keys(item, found)),
        _ => {}
    }
}

/// What: the four files are there; every key of `result.json` is documented; the matrix has the signs that physics
/// asks for; a net's neighbours sum to its self capacitance; the exit code says what the checks say.
/// Derived: free charge of the excited net is positive and of every other net negative (the maximum principle).
/// Tolerance: an entry may have the wrong sign within its own bar; a sum agrees within the bars of what is summed.
fn check_fixture(name: &str, found: &Extracted, rows: &[&str], reference: &[&str]) {
    let Extracted { run, result, files } = found;
    assert_eq!(result["format"], "chargeskin-result/1");
    let page = std::fs::read_to_string(root().join("docs/output.md")).unwrap();
    let mut all = BTreeSet::new();
    keys(result, &mut all);
    for key in &all {
        assert!(page.contains(&format!("`{key}`")), "{name}: `{key}` is not in docs/output.md");
    }
    for key in ["head", "neighbours", "interfaces", "conductor_faces", "checks", "mesh", "solver", "warnings"]
    {
        assert!(all.contains(key), "{name}: no {key}");
    }
    assert_eq!(result["nets"], serde_json::json!(rows));
    assert_eq!(result["reference"], serde_json::json!(reference));
    for i in 0..rows.len() {
        let (row, bars) = (numbers(&result["maxwell_F"][i]), numbers(&result["maxwell_bar_F"][i]));
        assert_eq!((row.len(), bars.len()), (rows.len(), rows.len()));
        for j in 0..rows.len() {
            let sign = if i == j { 1.0 } else { -1.0 };
            assert!(-bars[j] <= sign * row[j], "{name}: entry {i} {j} of {row:?}");
        }
        let to_reference = result["mutual_F"][i][i].as_f64().unwrap();
        assert!(0.0 < to_reference, "{name}: row {i} has no capacitance to the reference");
        let neighbours = result["neighbours"][i]["neighbours"].as_array().unwrap();
        let sum: f64 = neighbours.iter().map(|n| n["capacitance_F"].as_f64().unwrap()).sum();
        let bar: f64 = neighbours.iter().map(|n| n["bar_F"].as_f64().unwrap()).sum();
        assert!(
            (sum - row[i]).abs() <= bar + bars[i],
            "{name}: neighbours of {i} sum to {sum}, not {}",
            row[i]
        );
    }
    assert!(!result["interfaces"].as_array().unwrap().is_empty());
    assert!(!result["conductor_faces"].as_array().unwrap().is_empty());
    let failed = result["checks"].as_array().unwrap().iter().any(|check| check["passed"] == false);
    let doubtful = failed || result["head"]["target_met"] == false;
    assert_eq!(run.code, Some(i32::from(doubtful)), "{name}: {}", run.stdout);
    assert!(run.stdout.contains("Maxwell capacitance matrix"));
    assert!(run.stderr.starts_with("to solve: "), "{}", run.stderr);
    assert_eq!(run.stderr.lines().count(), 1, "no progress where there is no terminal: {}", run.stderr);
    assert_eq!(files[..], ["capacitance.cir", "capacitance.csv", "neighbours.csv", "result.json"]);
}

#[test]
fn the_lift_plate_is_extracted() {
    check_fixture("lift-plate", &extract("lift-plate", &[]), &["SENSE", "DRIVE"], &["GUARD", "infinity"]);
}

#[test]
fn the_oil_probe_is_extracted() {
    let rows = ["SENSE", "DRIVE", "GUARD"];
    check_fixture("oil-probe", &OIL_PROBE, &rows, &["GND", "bottom", "infinity"]);
}

#[test]
fn the_via_fan_is_extracted() {
    if std::env::var_os("SLOW_TESTS").is_none() {
        println!("skipped: the via fan takes a minute or two without optimisation; SLOW_TESTS=1 runs it");
        return;
    }
    check_fixture("via-fan", &extract("via-fan", &[]), &["SENSE", "DRIVE"], &["GND", "GUARD", "infinity"]);
}

/// What: the reports do not depend on the number of threads, but for times and memory.
#[test]
fn threads_change_no_digit() {
    let results = ["1", "3"].map(|threads| {
        let mut found = extract("lift-plate", &["--threads", threads, "--quiet"]);
        assert!(found.run.stdout.is_empty() && found.run.stderr.is_empty(), "quiet means quiet");
        assert!(found.result.as_object_mut().unwrap().remove("solver").is_some());
        found.result
    });
    assert_eq!(results[0], results[1]);
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
    assert!(text.contains(" s for the first two levels and a moved border\n"), "{text}");
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
        assert!(
            run.stdout.is_empty() && (run.stderr.contains("Usage") || run.stderr.contains("--help")),
            "{words:?}: {}",
            run.stderr
        );
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

/// Lines of the blocks of one kind in a page.
fn block_lines(page: &str, kind: &str) -> Vec<String> {
    let opening = format!("```{kind}");
    let (mut lines, mut inside) = (Vec::new(), None);
    for line in page.lines().map(str::trim_end) {
        match inside {
            None if line.starts_with("```") => inside = Some(line == opening),
            Some(_) if line == "```" => inside = None,
            Some(true) => lines.push(line.to_owned()),
            _ => {}
        }
    }
    lines
}

/// What: every command of our own in the README and in docs does what the page says: it ends with exit code 0.
#[test]
fn documented_commands_run() {
    const EXAMPLE: &str = "extract fixtures/oil-probe/job.toml --out out";
    let mut pages = vec![root().join("README.md"), root().join("DEVELOPERS.md")];
    pages.extend(std::fs::read_dir(root().join("docs")).unwrap().map(|entry| entry.unwrap().path()));
    let mut n_run = 0;
    for page in pages.into_iter().filter(|page| page.extension().is_some_and(|ending| ending == "md")) {
        for line in block_lines(&std::fs::read_to_string(&page).unwrap(), "sh") {
            // What else a page may show: the suite itself, and the gates.
            let Some(words) = line.strip_prefix("cargo run --release -- ") else {
                assert!(
                    line.starts_with("cargo test") || line == ".ci/run",
                    "{}: what is `{line}`?",
                    page.display()
                );
                continue;
            };
            n_run += 1;
            if words == EXAMPLE {
                assert_eq!(OIL_PROBE.run.code, Some(0), "{line}: {}", OIL_PROBE.run.stdout);
                continue;
            }
            let run = chargeskin(&words.split_whitespace().collect::<Vec<_>>());
            assert_eq!(run.code, Some(0), "{line}: {}{}", run.stdout, run.stderr);
        }
    }
    assert!(0 < n_run);
}

/// The words of a line that hold no digit. What stands beside a number may change with it: a unit, `below`.
fn plain_words(line: &str) -> Vec<&str> {
    let varies = ["below", "fF", "pF", "nF"];
    line.split_whitespace()
        .filter(|word| !word.contains(|c: char| c.is_ascii_digit()) && !varies.contains(word))
        .collect()
}

/// What: the README shows what the command prints. Words are compared and digits are not: they may differ in the last
/// places from one processor to the next.
#[test]
fn readme_shows_what_is_printed() {
    let page = std::fs::read_to_string(root().join("README.md")).unwrap();
    let shown = block_lines(&page, "text");
    let printed: Vec<String> = OIL_PROBE.run.stdout.lines().map(|line| line.trim_end().to_owned()).collect();
    assert!(10 < printed.len());
    assert_eq!(shown.len(), printed.len(), "{}", OIL_PROBE.run.stdout);
    for (shown, printed) in shown.iter().zip(&printed) {
        assert_eq!(plain_words(shown), plain_words(printed), "README: {shown}\nprinted: {printed}");
    }
}
