//! Six real boards against areas, nets and pieces measured with other means (`areas.json` beside the boards).

use super::world::{board, import, mapped};
use chargeskin::artwork::{Artwork, InputFile};
use chargeskin::job::Stackup;
use chargeskin::net::NameSource;
use serde_json::Value;
use std::path::PathBuf;

/// The shared boards; `None`, said aloud, where they are not at hand.
pub(super) fn shared() -> Option<PathBuf> {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("../shared/boards");
    if folder.is_dir() {
        return Some(folder);
    }
    println!("skipped: ../shared/boards is not at hand");
    None
}

fn areas(folder: &std::path::Path) -> Value {
    let text = std::fs::read_to_string(folder.join("areas.json")).unwrap();
    serde_json::from_str(&text).unwrap()
}

/// The copper files of a board, mapped to its layers.
fn copper_files(folder: &std::path::Path, board: &str, layers: &Value) -> Vec<InputFile> {
    let layers = layers.as_object().unwrap();
    (0u32..)
        .zip(layers)
        .map(|(k, (layer, entry))| {
            let path = folder.join(board).join(entry["file"].as_str().unwrap());
            mapped(k, layer, std::fs::read(path).unwrap())
        })
        .collect()
}

/// What: copper area, net names and pieces of every copper layer of six boards.
/// Source: `areas.json`, made by a general Gerber library with another polygon library, checked by a second one.
/// Tolerance: 0.1 %, as that file states; its own two ways agree within 0.05 %. Pieces must be the same: on these
/// boards none hangs on rounding.
#[test]
fn copper_areas_and_nets_of_six_boards() {
    let Some(folder) = shared() else { return };
    let areas = areas(&folder);
    let mut failures = Vec::new();
    for (name, entry) in areas["boards"].as_object().unwrap() {
        let n = entry["layers"].as_object().unwrap().len();
        let stackup = board(n);
        let files = copper_files(&folder, name, &entry["layers"]);
        let start = std::time::Instant::now();
        let artwork = match import(&files, &super::world::job(), &stackup) {
            Ok(read) => read.value,
            Err(errors) => {
                failures.push(format!("{name}: {errors}"));
                continue;
            }
        };
        println!("{name}: {:.2} s", start.elapsed().as_secs_f64());
        for (layer, entry) in entry["layers"].as_object().unwrap() {
            compare(&artwork, &stackup, (name, layer), entry, &mut failures);
        }
        let given = artwork.nets.iter().filter(|(_, net)| net.source == NameSource::Given).count();
        let wanted = usize::try_from(entry["nets_total"].as_u64().unwrap_or(0)).unwrap();
        if given != wanted {
            failures.push(format!("{name}: {given} names, expected {wanted}"));
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}

fn compare(
    artwork: &Artwork,
    stackup: &Stackup,
    (board, layer): (&str, &str),
    entry: &Value,
    failures: &mut Vec<String>,
) {
    let id = stackup.find(layer).unwrap();
    let figures = artwork.layer_figures(id);
    let wanted = entry["area_mm2"].as_f64().unwrap();
    let error = figures.area * 1e6 / wanted - 1.0;
    let here = artwork.copper.iter().filter(|c| c.layer == id);
    let nets = here.filter(|c| artwork.nets.get(c.net).source == NameSource::Given).count();
    println!(
        "{board} {layer}: {:.4} mm2, {:+.5} %, {nets} nets, {} pieces (listed {})",
        figures.area * 1e6,
        error * 100.0,
        figures.pieces,
        entry["pieces"]
    );
    if error.abs() > 1e-3 {
        failures.push(format!("{board} {layer}: area off by {:+.4} %", error * 100.0));
    }
    if figures.pieces as u64 != entry["pieces"].as_u64().unwrap() {
        failures.push(format!("{board} {layer}: {} pieces, expected {}", figures.pieces, entry["pieces"]));
    }
    if nets as u64 != entry["nets"].as_u64().unwrap() {
        failures.push(format!("{board} {layer}: {nets} nets, expected {}", entry["nets"]));
    }
}
