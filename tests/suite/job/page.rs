//! The reference page of both files: its examples are read, and it names every key.

use super::{job, stackup};
use chargeskin::job::{SchemaKind, check_names, schema};

const PAGE: &str = include_str!("../../../docs/job-file.md");

/// The TOML blocks of the page.
fn blocks() -> Vec<&'static str> {
    PAGE.split("```toml\n").skip(1).filter_map(|rest| rest.split("```").next()).collect()
}

/// What: every example of the page is read without a warning, and the jobs fit the stackup.
#[test]
fn the_examples_are_read() {
    let (stackups, jobs): (Vec<&str>, Vec<&str>) =
        blocks().into_iter().partition(|block| block.contains("[[layer]]"));
    let layers = stackup(stackups[0]);
    assert_eq!((stackups.len(), jobs.len()), (1, 2));
    assert_eq!(layers.warnings, []);
    for text in jobs {
        let read = job(text);
        assert_eq!(read.warnings, []);
        assert_eq!(check_names(&read.value, &layers.value), Ok(()), "{text}");
    }
}

/// What: the page explains every key that the schemas know, as code in a table. Seen to fail with: a key that stands nowhere else misspelt.
#[test]
fn every_key_stands_on_the_page() {
    for which in [SchemaKind::Job, SchemaKind::Stackup] {
        let root: serde_json::Value = serde_json::from_str(&schema(which)).unwrap();
        let tables = root["definitions"].as_object().unwrap().values().chain([&root]);
        let keys: Vec<&String> =
            tables.filter_map(|table| table["properties"].as_object()).flat_map(|keys| keys.keys()).collect();
        assert!(30 < keys.len() || which == SchemaKind::Stackup);
        for key in keys {
            let is_there = [format!("`{key}`"), format!("{key} = "), format!("[{key}]")];
            assert!(is_there.iter().any(|form| PAGE.contains(form)), "docs/job-file.md lacks `{key}`");
        }
    }
}
