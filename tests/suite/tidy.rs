//! Housekeeping: rules of the house that a test can hold.
//!
//! These checks read the project's own files, nothing else. The checks of error
//! codes and forbidden words were seen to fail; the others have not been tried against a breach yet.

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

/// Every file under `directory` whose name ends in `ending`, with its text, sorted.
fn files(directory: &str, ending: &str) -> Vec<(String, String)> {
    let mut found = Vec::new();
    let mut open = vec![root().join(directory)];
    while let Some(path) = open.pop() {
        if path.is_dir() {
            open.extend(std::fs::read_dir(&path).unwrap().map(|entry| entry.unwrap().path()));
        } else if path.to_string_lossy().ends_with(ending) {
            found.push((shown(&path), std::fs::read_to_string(&path).unwrap()));
        }
    }
    found.sort();
    found
}

fn shown(path: &Path) -> String {
    path.strip_prefix(root()).unwrap().to_string_lossy().replace('\\', "/")
}

fn sources() -> Vec<(String, String)> {
    let all: Vec<_> = ["src", "tests"].into_iter().flat_map(|directory| files(directory, ".rs")).collect();
    assert!(40 < all.len(), "the sources were not found");
    all
}

#[test]
fn every_file_says_what_it_is_for() {
    let silent: Vec<String> =
        sources().into_iter().filter(|(_, text)| !text.starts_with("//! ")).map(|(path, _)| path).collect();
    assert!(silent.is_empty(), "these begin without `//!`: {silent:?}");
}

/// Which rooms each room may use: the table of the house style, section 2. Arrows point one way.
const MAY_USE: [(&str, &[&str]); 16] = [
    ("geom", &[]),
    ("diag", &[]),
    ("units", &[]),
    ("net", &["diag"]),
    ("job", &["diag", "net", "geom", "units"]),
    ("artwork", &["diag", "net", "geom", "units", "job"]),
    ("slab", &["diag", "net", "geom", "artwork", "job"]),
    ("faces", &["diag", "net", "geom", "slab"]),
    ("mesh", &["diag", "net", "geom", "faces", "slab"]),
    ("kernel", &["geom"]),
    ("system", &["diag", "net", "geom", "mesh", "kernel", "faces", "slab"]),
    ("solve", &["diag", "net", "geom", "system", "mesh"]),
    ("results", &["diag", "net", "geom", "mesh", "kernel", "solve", "faces", "slab"]),
    (
        "extract",
        &["diag", "net", "geom", "job", "slab", "faces", "mesh", "kernel", "system", "solve", "results"],
    ),
    ("report", &["diag", "net", "units", "extract", "results", "faces", "job"]),
    (
        "cli",
        &[
            "diag", "net", "geom", "units", "job", "artwork", "slab", "faces", "mesh", "kernel", "system",
            "solve", "results", "extract", "report",
        ],
    ),
];

/// Functions that run a stage: only `extract` and `cli` put stages in sequence.
const STAGE_FUNCTIONS: [&str; 9] = [
    "job::read_job(",
    "job::read_stackup(",
    "artwork::read(",
    "slab::build(",
    "faces::derive(",
    "mesh::panelize(",
    "system::assemble(",
    "solve::solve_dense(",
    "results::evaluate(",
];

/// The lines that are code and no test: comments and everything from the test module on are left out.
fn code_lines(text: &str) -> impl Iterator<Item = &str> {
    text.lines()
        .take_while(|line| !line.trim_start().starts_with("mod tests {"))
        .filter(|line| !line.trim_start().starts_with("//"))
}

#[test]
fn rooms_use_only_what_the_order_allows() {
    let allowed: BTreeMap<&str, &[&str]> = MAY_USE.into_iter().collect();
    let mut breaches = Vec::new();
    for (path, text) in files("src", ".rs") {
        let room = path.trim_start_matches("src/").split(['/', '.']).next().unwrap().to_owned();
        if room == "main" || room == "lib" || path.ends_with("/sample.rs") {
            continue;
        }
        let may =
            allowed.get(room.as_str()).unwrap_or_else(|| panic!("the room {room} has no line in the table"));
        for line in code_lines(&text) {
            if line.contains("use crate::{") {
                breaches.push(format!("{path}: write one `use crate::room::...` a line: {line}"));
            }
            for used in line.split("crate::").skip(1).filter(|rest| !rest.starts_with('{')) {
                let used: String = used.chars().take_while(|c| c.is_ascii_lowercase() || *c == '_').collect();
                if !used.is_empty() && used != room && !may.contains(&used.as_str()) {
                    breaches.push(format!("{path}: {room} may not use {used}: {}", line.trim()));
                }
            }
            if !matches!(room.as_str(), "extract" | "cli") {
                let runs = STAGE_FUNCTIONS.iter().filter(|call| line.contains(&format!("crate::{call}")));
                breaches.extend(runs.map(|call| format!("{path}: only extract and cli run a stage: {call}")));
            }
        }
    }
    assert!(breaches.is_empty(), "{}", breaches.join("\n"));
}

/// Every `code(...)` of a diagnostic under src.
fn error_codes() -> BTreeSet<String> {
    let mut codes = BTreeSet::new();
    for (_, text) in files("src", ".rs") {
        for line in code_lines(&text) {
            for rest in line.split("code(").skip(1) {
                let code: String = rest
                    .trim_start_matches('"')
                    .chars()
                    .take_while(|c| c.is_ascii_alphanumeric() || matches!(c, '_' | ':'))
                    .collect();
                if code.contains("::") {
                    codes.insert(code);
                }
            }
        }
    }
    codes
}

#[test]
fn every_error_code_has_its_section() {
    let codes = error_codes();
    assert!(codes.contains("report::json"), "the codes were not found");
    let page = std::fs::read_to_string(root().join("docs/errors.md")).unwrap();
    let sections: BTreeSet<String> = page
        .lines()
        .filter_map(|line| line.strip_prefix("### "))
        .map(|code| code.trim().replace('`', ""))
        .collect();
    let missing: Vec<_> = codes.difference(&sections).collect();
    let stale: Vec<_> = sections.difference(&codes).collect();
    assert!(missing.is_empty(), "docs/errors.md lacks {missing:?}");
    assert!(stale.is_empty(), "docs/errors.md describes what no code raises: {stale:?}");
}

/// Words such as Author1984 or Author1984b.
fn reference_keys(text: &str) -> BTreeSet<String> {
    text.split(|c: char| !c.is_ascii_alphanumeric())
        .filter(|word| {
            let Some(digits) = word.find(|c: char| c.is_ascii_digit()) else { return false };
            let (name, year) = word.split_at(digits);
            let number = year.trim_end_matches(|c: char| c.is_ascii_lowercase());
            3 <= name.len()
                && name.starts_with(|c: char| c.is_ascii_uppercase())
                && name.chars().skip(1).all(|c| c.is_ascii_alphabetic())
                && year.len() - number.len() <= 1
                && number.len() == 4
                && number.parse::<u32>().is_ok_and(|year| (1800..2100).contains(&year))
        })
        .map(str::to_owned)
        .collect()
}

#[test]
fn every_reference_has_its_entry() {
    let page = std::fs::read_to_string(root().join("docs/references.md")).unwrap();
    let known = reference_keys(&page);
    let mut missing = BTreeSet::new();
    for (path, text) in sources() {
        if path != "tests/suite/tidy.rs" {
            missing.extend(reference_keys(&text).difference(&known).map(|key| format!("{key} ({path})")));
        }
    }
    assert!(missing.is_empty(), "docs/references.md lacks {missing:?}");
}

#[test]
fn reference_keys_are_told_from_other_words() {
    let found =
        reference_keys("/// Author1984, eq. (3); Other2001b; C0603, Nets2, Unit1000000, a1984, AB1984");
    assert_eq!(found.into_iter().collect::<Vec<_>>(), ["Author1984", "Other2001b"]);
}

/// What stands nowhere in the project: notes to ourselves, paths of one machine. Split, so as not to find themselves.
const FORBIDDEN: [&str; 8] = [
    concat!("TO", "DO"),
    concat!("FIX", "ME"),
    concat!("XX", "X:"),
    concat!("/ho", "me/"),
    concat!("/wo", "rk/"),
    concat!("/tm", "p/"),
    concat!("lec", "ture"),
    concat!("stub", "bed"),
];

#[test]
fn forbidden_words_stand_nowhere() {
    let mut texts = sources();
    texts.extend(files("docs", ".md"));
    texts.extend(files("fixtures", ".toml"));
    for name in ["README.md", "DEVELOPERS.md", ".ci/run"] {
        texts.push((name.to_owned(), std::fs::read_to_string(root().join(name)).unwrap()));
    }
    let mut found = Vec::new();
    for (path, text) in texts {
        for word in FORBIDDEN {
            if text.to_lowercase().contains(&word.to_lowercase()) {
                found.push(format!("{path}: {word}"));
            }
        }
    }
    assert!(found.is_empty(), "{found:?}");
}

#[test]
fn the_top_level_holds_what_it_should() {
    let expected: BTreeSet<&str> = [
        "Cargo.lock",
        "Cargo.toml",
        "DEVELOPERS.md",
        "LICENSE-APACHE",
        "LICENSE-MIT",
        "README.md",
        "docs",
        "fixtures",
        "src",
        "tests",
    ]
    .into();
    // What the build and the README's commands leave, and what .gitignore therefore names.
    let ignored = ["target", "out"];
    let found: BTreeSet<String> = std::fs::read_dir(root())
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .filter(|name| !name.starts_with('.') && !ignored.contains(&name.as_str()))
        .collect();
    assert_eq!(found.iter().map(String::as_str).collect::<BTreeSet<_>>(), expected);
}

/// Whether a licence expression can be met with the `allowed` ones: OR, AND and the old slash, no brackets nested.
fn licence_allowed(expression: &str, allowed: &BTreeSet<String>) -> bool {
    let any = |choices: &str| {
        choices
            .replace('/', " OR ")
            .split(" OR ")
            .any(|choice| allowed.contains(choice.trim_matches([' ', '(', ')'])))
    };
    expression.split(" AND ").all(any)
}

/// What: every package that we link or test with has a licence of `.deny.toml`. Source: the packages' own manifests.
#[test]
fn licences_are_permissive() {
    let settings: toml::Table = std::fs::read_to_string(root().join(".deny.toml")).unwrap().parse().unwrap();
    let allowed: BTreeSet<String> = settings["licenses"]["allow"]
        .as_array()
        .unwrap()
        .iter()
        .map(|licence| licence.as_str().unwrap().to_owned())
        .collect();
    let rustc = std::process::Command::new("rustc").arg("-vV").output().unwrap();
    let host = String::from_utf8(rustc.stdout).unwrap();
    let host = host.lines().find_map(|line| line.strip_prefix("host: ")).unwrap();
    let output = std::process::Command::new(env!("CARGO"))
        .args([
            "metadata",
            "--offline",
            "--locked",
            "--format-version",
            "1",
            "--all-features",
            "--filter-platform",
            host,
        ])
        .current_dir(root())
        .output()
        .unwrap();
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    let metadata: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let packages = metadata["packages"].as_array().unwrap();
    assert!(20 < packages.len());
    let refused: Vec<String> = packages
        .iter()
        .filter(|package| !licence_allowed(package["license"].as_str().unwrap_or("none"), &allowed))
        .map(|package| format!("{} {}", package["name"], package["license"]))
        .collect();
    assert!(refused.is_empty(), "{refused:?}");
}

#[test]
fn licence_expressions_are_read() {
    let allowed: BTreeSet<String> = ["MIT", "ISC"].map(str::to_owned).into();
    for (expression, fine) in [
        ("MIT", true),
        ("GPL-3.0", false),
        ("GPL-3.0 OR MIT", true),
        ("GPL-3.0/MIT", true),
        ("MIT AND GPL-3.0", false),
        ("(GPL-3.0 OR MIT) AND ISC", true),
        ("(GPL-3.0 OR MIT) AND GPL-3.0", false),
    ] {
        assert_eq!(licence_allowed(expression, &allowed), fine, "{expression}");
    }
}
