//! Nets: names, islands, barrels, labels, shapes, shorts; masks and outlines.

use super::world::{board, file, import, job, mapped, named};
use chargeskin::artwork::{Artwork, Lining};
use chargeskin::diag::Origin;
use chargeskin::job::{DrawnShape, Job, Label, Outline};

const HEAD: &str = "%FSLAX46Y46*%%MOMM*%%ADD10C,1*%%ADD11C,0.3*%D10*G01*";

fn layer(k: u32, name: &str, body: &str) -> chargeskin::artwork::InputFile {
    mapped(k, name, format!("{HEAD}{body}M02*"))
}

fn drill(k: u32, body: &str) -> chargeskin::artwork::InputFile {
    file(k, "holes.drl", format!("M48\nMETRIC\n;TYPE=PLATED\nT1C0.4\n%\nT1\n{body}\nM30\n"))
}

fn names(artwork: &Artwork) -> Vec<String> {
    artwork.nets.iter().map(|(_, net)| net.name.clone()).collect()
}

/// What: copper without a name takes the name it touches, through a plated hole as well; what touches none is
/// numbered; a hole that touches nothing has a number too.
#[test]
fn names_travel_over_copper_and_barrels() {
    let top = "%TO.N,A*%X0Y0D03*%TD*%X500000Y0D03*X9000000Y0D03*";
    let bottom = "X500000Y0D03*X0Y5000000D03*";
    let files = [layer(0, "L1", top), layer(1, "L2", bottom), drill(2, "X0.5Y0\nX20.0Y20.0")];
    let read = import(&files, &job(), &board(2)).unwrap().value;
    assert_eq!(names(&read), ["A", "island-1", "island-2", "island-3"]);
    assert_eq!(read.copper.len(), 4);
    assert_eq!(read.holes[0].lining, Lining::Plated(read.nets.find("A").unwrap()));
    assert_eq!(read.holes[1].lining, Lining::Plated(read.nets.find("island-3").unwrap()));
}

/// What: two names that overlap, touch in a point, lie one in the other, or are joined by a barrel are shorts that name
/// both nets, the layer and the place.
#[test]
fn shorts_are_named() {
    let overlap = "%TO.N,A*%X0Y0D03*%TO.N,B*%X700000Y0D03*";
    let touch = "%TO.N,A*%X0Y0D03*%TO.N,B*%X1000000Y0D03*";
    let inside = "%TO.N,A*%X0Y0D03*%TO.N,B*%D11*X0Y0D03*";
    let bridge = "%TO.N,A*%X0Y0D03*%TO.N,B*%X1500000Y0D03*%TD*%X750000Y0D03*";
    for body in [overlap, touch, inside, bridge] {
        let errors = import(&[layer(0, "L1", body)], &job(), &board(1)).unwrap_err();
        let text = errors.to_string();
        assert!(text.contains("nets `A` and `B` are shorted in layer `L1` at ("), "{text}");
    }
    let apart = "%TO.N,A*%X0Y0D03*%TO.N,B*%X1001000Y0D03*";
    assert!(import(&[layer(0, "L1", apart)], &job(), &board(1)).is_ok());
    let files =
        [layer(0, "L1", "%TO.N,A*%X0Y0D03*"), layer(1, "L2", "%TO.N,B*%X0Y0D03*"), drill(2, "X0.0Y0.0")];
    let text = import(&files, &job(), &board(2)).unwrap_err().to_string();
    assert!(text.contains("nets `A` and `B` are shorted in layer `L2`"), "{text}");
}

/// What: empty names and `N/C` are no names; the three spellings are.
#[test]
fn spellings_of_names() {
    let body = "G04 #@! TO.N,A*X0Y0D03*G04 #@!TO.N,B*X3000000D03*%TO.N,*%X6000000D03*%TO.N,N/C*%X9000000D03*\
        %TO.N,\\u00B5*%X12000000D03*";
    let read = import(&[layer(0, "L1", body)], &job(), &board(1)).unwrap().value;
    assert_eq!(names(&read), ["A", "B", "\u{b5}", "island-1", "island-2"]);
    let apart = "%TO.N,A*%X0Y0D03*X9000000D03*%TO.N,B*%X3000000D03*X3500000D03*";
    let read = import(&[layer(0, "L1", apart)], &job(), &board(1)).unwrap();
    assert!(read.warnings.iter().any(|w| w.text.ends_with("nothing joins: `A` (2)")), "{:?}", read.warnings);
}

fn shape(net: Option<&str>, layer: &str, from: [f64; 2], to: [f64; 2]) -> DrawnShape {
    DrawnShape {
        net: net.map(named),
        layer: named(layer),
        through: Vec::new(),
        outline: Outline::Rectangle { from, to },
        holes: Vec::new(),
        origin: Origin::default(),
    }
}

/// What: a label names unnamed copper; a second name there is a short; a label beside the copper is an error.
#[test]
fn labels_name_copper() {
    let with = |labels: &[(&str, [f64; 2])]| {
        let mut job = job();
        for (net, at) in labels {
            job.nets.labels.push(Label { net: named(net), layer: named("L1"), at: *at });
        }
        import(&[layer(0, "L1", "X0Y0D03*X5000000Y0D03*")], &job, &board(1))
    };
    assert_eq!(names(&with(&[("P", [0.0, 0.0])]).unwrap().value), ["P", "island-1"]);
    assert!(with(&[("P", [0.0, 0.0]), ("Q", [0.1e-3, 0.0])]).unwrap_err().to_string().contains("shorted"));
    assert!(with(&[("P", [2e-3, 0.0])]).unwrap_err().to_string().contains("hits no copper"));
    let both = with(&[("P", [0.0, 0.0]), ("P", [5e-3, 0.0])]).unwrap().value;
    assert_eq!(names(&both), ["P"]);
}

/// What: shapes: copper with a net, posts through dielectrics, patterns without a net; a post on unnamed copper names it.
#[test]
fn shapes_and_posts() {
    let mut job: Job = job();
    let mut post = shape(Some("PLATE"), "L1", [0.0, 0.0], [1e-3, 1e-3]);
    post.through = vec![named("D1")];
    post.holes = vec![Outline::Rectangle { from: [0.25e-3, 0.25e-3], to: [0.75e-3, 0.75e-3] }];
    job.shapes = vec![
        post,
        shape(None, "L2", [0.0, 0.0], [2e-3, 1e-3]),
        shape(None, "D2", [0.0, 0.0], [2e-3, 2e-3]),
        shape(Some("PLATE"), "L1", [0.5e-3, 0.0], [3e-3, 1e-3]),
    ];
    let stackup = board(3);
    let read = import(&[], &job, &stackup).unwrap().value;
    assert_eq!(names(&read), ["PLATE"]);
    let area = |name: &str| read.layer_area(stackup.find(name).unwrap()) * 1e6;
    assert!(
        (area("D1") - 0.75).abs() < 1e-9
            && (area("L1") - 2.875).abs() < 1e-9
            && (area("L2") - 2.0).abs() < 1e-9
    );
    assert_eq!(read.patterns.len(), 1);
    assert_eq!(stackup.get(read.patterns[0].layer).name, "D2");
    job.shapes.push(shape(Some("X"), "L2", [0.0, 0.0], [1e-3, 1e-3]));
    assert!(import(&[], &job, &stackup).unwrap_err().to_string().contains("`PLATE` and `X` are shorted"));
}

/// What: a mask opens the coating of its side, and is loudly left out where there is none; the profile closes with its
/// cut-out; an open one is told.
#[test]
fn masks_and_outlines() {
    let mask = "%TF.FileFunction,Soldermask,Top*%%TF.FilePolarity,Negative*%X0Y0D03*";
    let outline = "%TF.FileFunction,Profile,NP*%D11*X0Y0D02*X10000000D01*Y8000000D01*X0D01*Y0D01*\
        X2000000Y2000000D02*X4000000D01*Y4000000D01*X2000000D01*Y2000000D01*";
    let whole = |body: &str| format!("{HEAD}{body}M02*");
    let copper = layer(0, "L1", "X5000000Y5000000D03*");
    let files = [copper.clone(), file(1, "mask.gbr", whole(mask)), file(2, "edge.gbr", whole(outline))];
    let mut stackup = board(1);
    let read = import(&files, &job(), &stackup).unwrap().value;
    assert_eq!(read.openings.len(), 1);
    assert_eq!(stackup.get(read.openings[0].layer).name, "mask-top");
    let profile = read.profile.unwrap();
    assert!((read.grid.area(profile.area()) * 1e6 - 76.0).abs() < 1e-9);
    stackup.layers.remove(1);
    let warnings = import(&files, &job(), &stackup).unwrap().warnings;
    assert!(warnings.iter().any(|w| w.text.starts_with("SOLDER MASK LEFT OUT")));
    let open = outline.replace("X0D01*Y0D01*\x20", "");
    let open = open.replacen("X0D01*Y0D01*", "", 1);
    let files = [copper, file(2, "edge.gbr", whole(&open))];
    let read = import(&files, &job(), &board(1)).unwrap();
    assert_eq!(read.value.profile, None);
    assert!(read.warnings.iter().any(|w| w.text.contains("does not close")));
}

/// What: negative copper and positive masks are refused; legend is left out with a word.
#[test]
fn polarities_and_legends() {
    let make = |head: &str| [file(0, "x.gbr", format!("{head}{HEAD}X0Y0D03*M02*"))];
    let bad = make("%TF.FileFunction,Copper,L1,Top*%%TF.FilePolarity,Negative*%");
    assert!(import(&bad, &job(), &board(1)).unwrap_err().to_string().contains("Negative polarity"));
    let bad = make("%TF.FileFunction,Copper,L3,Bot*%");
    assert!(import(&bad, &job(), &board(2)).unwrap_err().to_string().contains("conductor layer 3"));
    let legend = make("%TF.FileFunction,Legend,Top*%");
    let warnings = import(&legend, &job(), &board(1)).unwrap().warnings;
    assert!(warnings.iter().any(|w| w.text.contains("legend")));
    let unknown = make("");
    assert!(
        import(&unknown, &job(), &board(1)).unwrap_err().to_string().contains("nothing says which layer")
    );
}

/// What: a netlist names copper that has no name; two of its names on one piece are a short; names of the artwork stay.
#[test]
fn netlists_name_copper() {
    let body = "X1000000Y-2000000D03*X5000000Y0D03*%TO.N,C*%X9000000Y0D03*";
    let line =
        |net: &str, x: u32| format!("327{net:<14}   R1    -1         PA01X+{x:06}Y+000000X0600Y0500R000S2\n");
    let with = |rest: &str| {
        let text = format!(
            "P  JOB x\nP  UNITS CUST 1\n317A                VIA   -     D0300PA00X+001000Y-002000X0600Y0000\n{rest}999\n"
        );
        import(&[layer(0, "L1", body), file(1, "board.ipc", text)], &job(), &board(1))
    };
    let read = with(&(line("B", 5000) + &line("D", 9000))).unwrap();
    assert_eq!(names(&read.value).iter().collect::<std::collections::BTreeSet<_>>().len(), 3);
    for name in ["A", "B", "C"] {
        assert!(read.value.nets.find(name).is_some(), "{name}");
    }
    assert!(read.warnings.iter().any(|w| w.text.contains("`C` is `D`")));
    let text = with(&(line("B", 5000) + &line("E", 5100))).unwrap_err().to_string();
    assert!(text.contains("`B` and `E` are shorted"), "{text}");
}
