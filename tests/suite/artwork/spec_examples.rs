//! The examples of the Gerber specification, against areas worked out by hand.

use super::boards::shared;
use super::world::{board, import, job, mapped};
use chargeskin::artwork::{ArtworkOptions, read};
use std::f64::consts::PI;

/// Copper area of one example in mm2; `prefix` is put before the file's text.
fn area(name: &str, prefix: &str) -> Option<Result<f64, String>> {
    let bytes = std::fs::read(shared()?.join("spec-examples").join(name)).unwrap();
    let bytes = [prefix.as_bytes(), &bytes].concat();
    let stackup = board(1);
    let options = ArtworkOptions { chord_error: 1e-7, ..ArtworkOptions::default() };
    let read = read(&[mapped(0, "L1", bytes)], &job(), &stackup, &options);
    Some(match read {
        Ok(read) => Ok(read.value.layer_area(stackup.find("L1").unwrap()) * 1e6),
        Err(errors) => Err(errors.to_string()),
    })
}

/// Area within a circle of radius `r` of a strip of half-width `h` through its centre.
fn strip(r: f64, h: f64) -> f64 {
    2.0 * (h * (r * r - h * h).sqrt() + r * r * (h / r).asin())
}

/// Area of a circle segment cut off at distance `d` from the centre.
fn segment(r: f64, d: f64) -> f64 {
    r * r * (d / r).acos() - d * (r * r - d * d).sqrt()
}

/// What: area of every example whose shape has one in closed form.
/// Derived: beside each entry; coordinates from the example itself.
/// Tolerance: 1e-4 of the area. Grid rounding is 1 nm times the outline, under 1e-5 here; a skew stroke of 20 corners
/// and more loses up to r^2 d^3 / 6 of its end caps, under 1e-4 of any of these.
#[test]
fn areas_by_hand() {
    let inch2 = 645.16;
    let (w, lens) = (0.01f64, {
        let (big, r, d) = (5.0f64, 2.5f64, 4.0f64);
        let root: f64 = (r + big - d) * (d + r - big) * (d - r + big) * (d + r + big);
        r * r * ((d * d + r * r - big * big) / (2.0 * d * r)).acos()
            + big * big * ((d * d + big * big - r * r) / (2.0 * d * big)).acos()
            - root.sqrt() / 2.0
    });
    let line = w * 0.03f64.hypot(0.05) + PI * 0.005 * 0.005;
    let cases = [
        // A square path of side 5 with a round pen, twice.
        ("two_square_boxes.gbr", 2.0 * (20.0 * w + (PI / 4.0 - 1.0) * w * w)),
        ("example_two_square_boxes.gbr", 2.0 * (20.0 * w + (PI / 4.0 - 1.0) * w * w)),
        ("example_flash_circle.gbr", PI * (2.0 * 0.0625 - 0.015_625)),
        ("example_flash_rectangle.gbr", 2.0 * 0.44 * 0.25 - PI * 0.095 * 0.095),
        ("example_flash_obround.gbr", 2.0 * (0.2 * 0.26 + PI * 0.13 * 0.13) - PI * 0.095 * 0.095),
        // A hexagon in a circle of diameter 0.4, twice, and a round hole.
        ("example_flash_polygon.gbr", 2.0 * 1.5 * 3f64.sqrt() * 0.04 - PI * 0.095 * 0.095),
        // An arrow: rectangle 5 x 4 and triangle 8 x 4 / 2, in inches.
        ("example_simple_contour.gbr", 36.0 * inch2),
        ("example_single_contour_1.gbr", 0.01 + line),
        ("example_single_contour_2.gbr", 0.01 + line),
        // 9 x 15 less 4 x 4 and 4 x 3.
        ("example_cutin_multiple.gbr", 107.0),
        // A square of side 10 and diamonds of diagonals 8 x 8 or 9 x 8.
        ("example_fully_coincident.gbr", 132.0),
        ("example_coincident_hole.gbr", 68.0),
        ("example_overlapping_contour.gbr", 100.0),
        ("example_overlapping_touching.gbr", 100.0),
        ("example_not_overlapping_contour.gbr", 132.0),
        ("example_not_overlapping_touching.gbr", 136.0),
        // Square 15, less circle 5, plus square 5, less a circle of 2.5 that meets both.
        ("example_level_holes.gbr", 225.0 - 25.0 * PI + 25.0 - segment(2.5, 1.5) - (PI * 6.25 - lens)),
        // A ring 1 / 0.5 over a stroke that shows through its hole.
        (
            "example_holes_dont_clear.gbr",
            inch2
                * (PI * 0.1875 + 0.1 * 2f64.hypot(0.5) + PI * 0.0025
                    - (strip(0.5, 0.05) - strip(0.25, 0.05))),
        ),
        // A ring of radius 0.4 drawn in four quarters, and a cross.
        (
            "example_single_quadrant.gbr",
            inch2 * (PI * (0.405f64.powi(2) - 0.395f64.powi(2)) + 2.0 * strip(0.395, 0.005) - 1e-4),
        ),
    ];
    let mut failures = Vec::new();
    for (name, wanted) in cases {
        let Some(found) = area(name, "") else { return };
        match found {
            Ok(found) if (found / wanted - 1.0).abs() < 1e-4 => {}
            other => failures.push(format!("{name}: {other:?}, expected {wanted}")),
        }
    }
    assert!(failures.is_empty(), "{}", failures.join("\n"));
}

/// What: an example without a unit is refused by name, and is right once the unit is there.
/// Derived: 10 x 8 less a circle of radius 3.
#[test]
fn the_cut_in_example_lacks_its_unit() {
    let Some(bare) = area("example_cutin.gbr", "") else { return };
    assert!(bare.unwrap_err().contains("the unit is not declared"));
    let found = area("example_cutin.gbr", "%MOMM*%").unwrap().unwrap();
    assert!((found / (80.0 - 9.0 * PI) - 1.0).abs() < 1e-4);
}

/// What: an exposure that is neither 0 nor 1 is refused; the large sample reads.
#[test]
fn the_exposure_of_one_example_is_neither_on_nor_off() {
    let Some(found) = area("example_am_exposure_modifier.gbr", "") else { return };
    assert!(found.unwrap_err().contains("macro primitive 21"));
    assert!(area("polarities_and_apertures.gbr", "").unwrap().is_ok());
}

/// What: the drill example gives its 29 holes with their diameters. Derived: counted in the file.
#[test]
fn the_drill_example_gives_its_holes() {
    let Some(folder) = shared() else { return };
    let bytes = std::fs::read(folder.join("spec-examples/drill_file.gbr")).unwrap();
    let stackup = board(8);
    let read = import(&[super::world::file(0, "drill_file.gbr", bytes)], &job(), &stackup).unwrap().value;
    let count = |d: f64| read.holes.iter().filter(|h| (h.diameter - d).abs() < 1e-9).count();
    assert_eq!([0.14e-3, 0.24e-3, 0.43e-3, 0.22e-3].map(count), [8, 8, 2, 11]);
    assert_eq!(read.holes.len(), 29);
}
