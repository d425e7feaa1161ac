//! Drill files: dialects, slots, plating, spans, digits; and whole folders of real boards.

use super::boards::shared;
use super::world::{board, file, import, job, mapped, named};
use chargeskin::artwork::{Hole, InputFile, Lining};
use chargeskin::job::{DrillPlan, FileContent, HoleMeaning};
use std::f64::consts::PI;

fn holes(text: &str) -> Result<Vec<Hole>, String> {
    import(&[file(0, "holes.drl", text)], &job(), &board(4))
        .map(|read| read.value.holes)
        .map_err(|errors| errors.to_string())
}

fn one(text: &str) -> Hole {
    let mut found = holes(text).unwrap();
    assert_eq!(found.len(), 1);
    found.remove(0)
}

fn area_mm2(hole: &Hole) -> f64 {
    hole.region.area() * 1e-12
}

/// What: places of one hole at (1.5 mm, -2.25 mm) in every dialect. Derived: by reading the digits.
#[test]
fn dialects_put_the_hole_in_the_same_place() {
    let texts = [
        "M48\nMETRIC\nT1C0.3\n%\nG05\nT1\nX1.5Y-2.25\nM30\n",
        "M48\nMETRIC,TZ\n;FILE_FORMAT=3:3\nT1C0.3\n%\nT1\nX1500Y-2250\nM30\n",
        "M48\r\n; Format  : 3.3 / Absolute / MM / Leading\r\nMETRIC,TZ\r\nT01C0.3\r\n%\r\nT01\r\nX1500Y-2250\r\nM30\r\n",
        "M48\nMETRIC,LZ\n;FILE_FORMAT=4:4\nT1F00S00C0.3\n%\nT01\nX00015Y-000225\nM30\n",
        "M48\nMETRIC,LZ,000.000\nT1C0.3\n%\nT1\nX0015Y-00225\nM30\n",
        "M48\nT1C0.3\nMETRIC\n%\nT1\nX1.5Y-2.25\nM30\n",
        "M48\nMETRIC\nT1C0.3\n%\nT1\nG91\nX1.0Y-2.0\nM30\n",
    ];
    for text in &texts[..5] {
        let hole = one(text);
        assert_eq!((hole.at.x, hole.at.y), (1_500_000, -2_250_000), "{text}");
        assert!((hole.diameter - 0.3e-3).abs() < 1e-12);
    }
    assert!(holes(texts[5]).unwrap_err().contains("unit"));
    assert_eq!(one(texts[6]).at.x, 1_000_000);
    let inch = one("M48\nINCH\nT1C0.01\n%\nT1\nX0.1Y0.2\nM30\n");
    assert_eq!((inch.at.x, inch.at.y), (2_540_000, 5_080_000));
}

/// What: slots by G85 and by routing, straight and round. Derived: length times width and the round ends.
#[test]
fn slots_have_their_areas() {
    let ends = PI / 4.0;
    let head = "M48\nMETRIC\nT1C1.0\n%\nT1\n";
    for body in ["X0.0Y0.0G85X3.0Y0.0", "G00X0.0Y0.0\nM15\nG01X3.0Y0.0\nM16\nG05"] {
        assert!((area_mm2(&one(&format!("{head}{body}\nM30\n"))) - 3.0 - ends).abs() < 1e-5);
    }
    let angle = "G00X0.0Y0.0\nM15\nG01X3.0Y0.0\nG01X3.0Y4.0\nM16";
    let wanted = 7.0 + ends - (0.25 - PI / 16.0);
    assert!((area_mm2(&one(&format!("{head}{angle}\nM30\n"))) - wanted - 0.0).abs() < 0.06);
    let arc = "G00X2.0Y0.0\nM15\nG03X0.0Y2.0A2.0\nM16";
    let found = area_mm2(&one(&format!("{head}{arc}\nM30\n")));
    assert!((found - PI - ends).abs() < 0.01, "{found}");
}

fn planned(plan: DrillPlan, text: &str) -> InputFile {
    InputFile { content: FileContent::Drill(plan), ..file(9, "holes.drl", text) }
}

const PAD: &str = "%FSLAX46Y46*%%MOMM*%%ADD10C,1*%D10*X0Y0D03*M02*";
const HOLE: &str = "M48\nMETRIC\nT1C0.4\n%\nT1\nX0.0Y0.0\nM30\n";

/// What: finished diameters grow by twice the plating; spans come from the job or the file; a back-drill is bare and
/// takes the copper.
#[test]
fn plans_are_followed() {
    let stackup = board(4);
    let pads: Vec<InputFile> = (1..=4).map(|k| mapped(k, &format!("L{k}"), PAD)).collect();
    let with = |plans: &[DrillPlan]| {
        let mut files = pads.clone();
        files.extend(plans.iter().map(|plan| planned(plan.clone(), HOLE)));
        import(&files, &job(), &stackup).unwrap().value
    };
    let hole = HoleMeaning::Finished { plating: 25e-6 };
    let plated = DrillPlan { plated: Some(true), hole, ..DrillPlan::default() };
    let read = with(std::slice::from_ref(&plated));
    assert!((read.holes[0].diameter - 0.45e-3).abs() < 1e-12);
    assert_eq!(read.nets.len(), 1);
    let blind = DrillPlan { to: Some(named("L2")), ..plated.clone() };
    let read = with(&[blind]);
    assert_eq!(read.nets.len(), 3);
    assert_eq!(stackup.get(read.holes[0].to).name, "L2");
    let back = DrillPlan {
        from: Some(named("L4")),
        to: Some(named("L3")),
        removes_metal: true,
        ..DrillPlan::default()
    };
    let read = with(&[plated, back]);
    assert_eq!((read.holes[1].lining, stackup.get(read.holes[1].from).name.as_str()), (Lining::Bare, "L3"));
    let area = read.layer_area(stackup.find("L4").unwrap()) * 1e6;
    assert!((area - PI / 4.0 * (1.0 - 0.16)).abs() < 1e-4, "{area}");
}

/// What: digits that nobody declares are settled by the copper, or refused with the line to add.
#[test]
fn undeclared_digits() {
    let pads = "%FSLAX46Y46*%%MOMM*%%ADD10C,1*%D10*X12345000Y23456000D03*X34567000Y45678000D03*M02*";
    let text = "M48\nMETRIC,TZ\nT1C0.4\n%\nT1\nX12345Y23456\nX34567Y45678\nM30\n";
    let read = import(&[mapped(0, "L1", pads), file(1, "h.drl", text)], &job(), &board(1)).unwrap();
    assert_eq!(read.value.holes[1].at.x, 34_567_000);
    assert!(read.warnings.iter().any(|w| w.text.contains("does not declare its digits")));
    assert!(holes(text).unwrap_err().contains("digits"));
}

/// What: whole folders of boards with X2 attributes or customary extensions: holes, their nets and the outline.
/// Derived: holes counted in the files by hand (lines that begin with X or Y below the header, slots once); outline
/// from the job files' `Size` less the width of the outline's line (0.1 or 0.3 mm).
#[test]
fn folders_of_real_boards() {
    let Some(folder) = shared() else { return };
    for (name, n_layers, size) in [
        ("ctrl4l", 4, Some([36.83, 67.31])),
        ("sense2l", 2, Some([65.5, 31.0])),
        ("arena6l", 6, Some([228.6, 228.6])),
        ("video2l", 2, None),
        ("probe4l", 4, None),
    ] {
        let mut files = Vec::new();
        let mut paths: Vec<_> =
            std::fs::read_dir(folder.join(name)).unwrap().map(|entry| entry.unwrap().path()).collect();
        paths.sort();
        for (k, path) in (0u32..).zip(paths) {
            let name = path.file_name().unwrap().to_string_lossy().into_owned();
            files.push(file(k, &name, std::fs::read(path).unwrap()));
        }
        let hits: usize = files
            .iter()
            .filter(|f| [".drl", ".txt"].iter().any(|e| f.name.to_ascii_lowercase().ends_with(e)))
            .map(|f| count_holes(&f.bytes))
            .sum();
        let read = match import(&files, &job(), &board(n_layers)) {
            Ok(read) => read,
            Err(errors) => panic!("{name}: {errors}"),
        };
        for warning in &read.warnings {
            println!("{name}: {}", warning.text);
        }
        let artwork = read.value;
        assert_eq!(artwork.holes.len(), hits, "{name}");
        let bounds = artwork.profile.as_ref().expect(name).bounds().unwrap();
        let found =
            [bounds.hi.x - bounds.lo.x, bounds.hi.y - bounds.lo.y].map(|d| artwork.grid.length(d) * 1e3);
        println!("{name}: {} holes, {} nets, outline {found:?} mm", artwork.holes.len(), artwork.nets.len());
        if let Some(size) = size {
            // The job files round to 0.01 mm or coarser.
            assert!((0..2).all(|k| (found[k] - size[k]).abs() < 0.011), "{name}: {found:?}");
        }
        assert_eq!(artwork.openings.len(), 2, "{name}");
    }
}

fn count_holes(bytes: &[u8]) -> usize {
    let text: String = bytes.iter().copied().map(char::from).collect();
    let Some((_, body)) = text.split_once("\n%") else { return 0 };
    let mut routing = false;
    let mut count = 0;
    for line in body.lines() {
        match line {
            _ if line.starts_with("G00") => routing = true,
            _ if line.starts_with("G05") => routing = false,
            "M15" => count += 1,
            _ if (line.starts_with('X') || line.starts_with('Y')) && !routing => count += 1,
            _ => {}
        }
    }
    count
}

/// What: a board whose files say nothing about themselves, mapped by hand: slots routed in `ContourPlated`, plating by
/// comment. Derived: holes counted in the files; bare are those of the file that says `Non-Plated`.
#[test]
fn a_board_mapped_by_hand() {
    let Some(folder) = shared() else { return };
    let load = |name: &str| std::fs::read(folder.join("laser2l").join(name)).unwrap();
    let drills = ["ContourPlated.ncd", "ThruHoleNonPlated.ncd", "ThruHolePlated.ncd"];
    let mut files =
        vec![mapped(0, "L1", load("EtchLayerTop.gdo")), mapped(1, "L2", load("EtchLayerBottom.gdo"))];
    files.push(InputFile { content: FileContent::Profile, ..file(2, "edge", load("BoardOutlline.gdo")) });
    files.push(mapped(3, "mask-top", load("SoldermaskTop.gdo")));
    files.extend((4u32..).zip(drills).map(|(k, name)| file(k, name, load(name))));
    let wanted: usize = files[4..].iter().map(|f| count_holes(&f.bytes)).sum();
    let read = import(&files, &job(), &board(2)).unwrap();
    assert!(read.warnings.iter().all(|w| !w.text.contains("digits")));
    assert_eq!(read.value.holes.len(), wanted);
    assert_eq!(
        read.value.holes.iter().filter(|h| h.lining == Lining::Bare).count(),
        count_holes(&files[5].bytes)
    );
    assert_eq!(read.value.openings.len(), 1);
    assert!(read.value.profile.is_some());
    println!("laser2l: {wanted} holes, {} nets", read.value.nets.len());
}
