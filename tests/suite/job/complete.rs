//! Files that use every key, read back value by value; and the defaults of files that use none.

use super::{FILE, job, stackup};
use chargeskin::diag::Warned;
use chargeskin::job::{
    Accuracy, FileContent, HoleMeaning, Layer, LayerKind, LayerQuantity, Others, Outline, RegionChoice,
    Spread, Stackup, WideFace, check_names, read_gbrjob_stackup, read_stackup,
};
use std::f64::consts::FRAC_PI_2;
use std::path::Path;

/// Every key of a job file but `window` and `stroke`, `circle` and `polygon` at the top level.
pub(super) const JOB: &str = r#"
title = "Everything"
stackup = "stackup.toml"
frequency = "10 MHz"

[artwork]
folder = "gerber"
netlist = "board.ipc"
files = [
  { path = "top.gbr", layer = "top" },
  { path = "edge.gbr", role = "profile" },
  { path = "pth.drl", plated = true, from = "top", to = "bottom", hole = "finished", plating = "25 um" },
  { path = "back.drl", role = "back-drill", from = "inner", to = "bottom" },
  { path = "other.gbr" },
]

[[shape]]
net = "DRIVE"
layer = "top"
through = ["core"]
rectangle = { from = ["0 mm", "0 mm"], to = ["2 mm", "0.3 mm"] }
holes = [
  { circle = { at = ["1 mm", "0.15 mm"], diameter = "0.1 mm" } },
  { polygon = [["0 mm", "0 mm"], ["1 um", "0 mm"], ["0 mm", "1 um"]] },
]

[[shape]]
layer = "film"
stroke = { path = [["0 mm", "1 mm"], ["2 mm", "1 mm"]], width = "0.2 mm" }

[region]
around = ["SENSE"]
margin = "2 mm"

[nets]
ground = ["GND"]
rows = ["SENSE", "DRIVE"]
others = "float"
float = [{ net = "SHIELD", charge = "-3 pC" }, { net = "GUARD" }]
join = [["A1", "A2"]]
label = [{ net = "SENSE", layer = "top", at = ["3.2 mm", "4.0 mm"] }]
ground_plane = "bottom"

[materials]
FR4 = { er = [["1 MHz", 4.6], ["100 MHz", 4.2]], loss_tangent = 0.02, strength = "20 MV/m" }
mask-bottom = { thickness = "20 um", depth_on_copper = "9 um", prepreg = false }

[accuracy]
target = "0.5 %"
floor = "2 %"
"#;

/// Every key of a stackup file.
pub(super) const STACKUP: &str = r#"
[[layer]]
name = "oil"
kind = "open"
er = 2.2
strength = "12 kV/mm"

[[layer]]
name = "mask-top"
kind = "coating"
er = 3.5
depth_on_laminate = "25 um"
depth_on_copper = "12 um"
depth_beside_copper = "8 um"
tolerance = { er = 0.2, depth_on_laminate = "5 um", depth_on_copper = "30 %", depth_beside_copper = "3 um" }

[[layer]]
name = "top"
kind = "conductor"
thickness = "35 um"
fill = "oil"
side_slope = "70 deg"
wide_face = "upper"
etch_bias = "-5 um"
tolerance = { etch_bias = "8 um", thickness = "5 um", side_slope = "5 deg" }

[[layer]]
name = "film"
kind = "dielectric"
er = 7.5
thickness = "300 nm"
fill = "oil"
pattern = "nitride.gbr"

[[layer]]
name = "core"
kind = "dielectric"
material = "FR4"
er = 4.3
loss_tangent = 0.02
conductivity = "1 pS/m"
strength = "20 MV/m"
thickness = "0.2 mm"
prepreg = true
tolerance = { er = "5 %", thickness = "10 %" }

[[layer]]
name = "inner"
kind = "conductor"
thickness = "0 um"

[[layer]]
name = "core-2"
kind = "dielectric"
material = "FR4"
thickness = "8 mil"

[[layer]]
name = "bottom"
kind = "conductor"
thickness = "35 um"

[[layer]]
name = "mask-bottom"
kind = "coating"
er = 3.5
depth_on_laminate = "25 um"
depth_on_copper = "12 um"
"#;

#[test]
fn every_key_of_a_job_is_read() {
    let Warned { value: job, warnings } = job(JOB);
    assert_eq!(warnings, []);
    assert_eq!(job.title, "Everything");
    assert_eq!(job.stackup.name, "stackup.toml");
    assert_eq!(job.frequency, Some(10e6));
    assert_eq!(job.artwork.folder.as_ref().map(|f| f.name.as_str()), Some("gerber"));
    let contents: Vec<&FileContent> = job.artwork.files.iter().map(|file| &file.content).collect();
    let [
        FileContent::Layer(layer),
        FileContent::Profile,
        FileContent::Drill(pth),
        FileContent::Drill(back),
        rest,
    ] = contents.as_slice()
    else {
        panic!("{contents:?}");
    };
    assert_eq!((layer.name.as_str(), *rest), ("top", &FileContent::Unsaid));
    assert_eq!((pth.plated, pth.removes_metal), (Some(true), false));
    assert_eq!(pth.hole, HoleMeaning::Finished { plating: 25e-6 });
    assert_eq!((back.plated, back.removes_metal, back.hole), (None, true, HoleMeaning::Drilled));
    let [plate, pattern] = job.shapes.as_slice() else { panic!("{:?}", job.shapes) };
    assert_eq!(plate.outline, Outline::Rectangle { from: [0.0, 0.0], to: [2e-3, 0.3e-3] });
    assert_eq!(plate.holes[0], Outline::Circle { at: [1e-3, 0.15e-3], diameter: 0.1e-3 });
    assert_eq!(plate.holes[1], Outline::Polygon(vec![[0.0, 0.0], [1e-6, 0.0], [0.0, 1e-6]]));
    assert_eq!(plate.through[0].name, "core");
    assert_eq!((pattern.net.as_ref(), pattern.layer.name.as_str()), (None, "film"));
    assert_eq!(pattern.outline, Outline::Stroke { path: vec![[0.0, 1e-3], [2e-3, 1e-3]], width: 0.2e-3 });
    let RegionChoice::Around { nets, margin } = &job.region else { panic!("{:?}", job.region) };
    assert_eq!((nets[0].name.as_str(), *margin), ("SENSE", Some(2e-3)));
    assert_eq!(job.nets.others, Others::Float);
    let floats: Vec<(&str, f64)> =
        job.nets.floating.iter().map(|float| (float.net.name.as_str(), float.charge)).collect();
    assert_eq!(floats, [("SHIELD", -3e-12), ("GUARD", 0.0)]);
    assert_eq!(job.nets.join[0].len(), 2);
    assert_eq!(job.nets.labels[0].at.map(f64::to_bits), [3.2e-3, 4e-3].map(f64::to_bits));
    assert_eq!(job.nets.ground_planes[0].name, "bottom");
    assert_eq!(job.materials["FR4"].er_source, "job, table at 10 MHz");
    let er = job.materials["FR4"].er.unwrap();
    assert!((er - 4.4).abs() <= 4.0 * f64::EPSILON * er, "log-frequency midpoint, two logarithms: {er}");
    assert_eq!(job.materials["mask-bottom"].depth_on_copper, Some(9e-6));
    assert_eq!(job.accuracy, Accuracy { target: 0.005, floor: 0.02 });
    let unused: Vec<&str> = job.unused.iter().map(|entry| entry.name.as_str()).collect();
    assert_eq!(unused, ["netlist", "loss_tangent of material `FR4`", "strength of material `FR4`"]);
}

/// What: a name of the job points at its own text.
#[test]
fn origins_point_at_the_text() {
    let job = job(JOB).value;
    let text = |origin: chargeskin::diag::Origin| &JOB[origin.span.start..origin.span.end];
    assert_eq!(job.stackup.origin.file, Some(FILE));
    assert_eq!(text(job.stackup.origin), "\"stackup.toml\"");
    assert_eq!(text(job.nets.labels[0].net.origin), "\"SENSE\"");
    assert_eq!(text(job.materials["FR4"].origin), "FR4");
}

#[test]
fn the_least_job_takes_the_defaults() {
    let job = job("stackup = \"s.toml\"\n[artwork]\nfolder = \".\"\n").value;
    assert_eq!(job.title, "untitled");
    assert_eq!(job.region, RegionChoice::Whole);
    assert_eq!(job.nets.rows, None);
    assert_eq!(job.nets.others, Others::Ground);
    assert_eq!(job.accuracy, Accuracy { target: 0.01, floor: 0.01 });
}

#[test]
fn a_window_is_put_in_order() {
    let text = "stackup = \"s.toml\"\n[artwork]\nfolder = \".\"\n[region]\n\
                window = [[\"20 mm\", \"-1 mm\"], [\"0 mm\", \"12 mm\"]]\n";
    assert_eq!(job(text).value.region, RegionChoice::Window { lo: [0.0, -1e-3], hi: [20e-3, 12e-3] });
}

fn layer<'s>(stackup: &'s Stackup, name: &str) -> &'s Layer {
    stackup.get(stackup.find(name).unwrap())
}

#[test]
fn every_key_of_a_stackup_is_read() {
    let job = job(JOB).value;
    let read = read_stackup(STACKUP, FILE, &job.materials, job.frequency).unwrap();
    let stackup = read.value;
    let names: Vec<&str> = stackup.layers.iter().map(|layer| layer.name.as_str()).collect();
    assert_eq!(
        names,
        ["oil", "mask-top", "top", "film", "core", "inner", "core-2", "bottom", "mask-bottom", "below"]
    );
    let LayerKind::Conductor { thickness, fill, side_slope, wide_face, etch_bias } =
        &layer(&stackup, "top").kind
    else {
        panic!("a conductor");
    };
    assert_eq!((*thickness, *wide_face, *etch_bias), (35e-6, WideFace::Upper, -5e-6));
    assert_eq!(fill.as_ref().map(|f| f.name.as_str()), Some("oil"));
    assert!((side_slope.to_degrees() - 70.0).abs() <= 4.0 * f64::EPSILON * 70.0, "two roundings");
    let tolerance = |name, quantity| {
        layer(&stackup, name).tolerance.iter().find(|t| t.quantity == quantity).map(|t| t.spread)
    };
    assert_eq!(tolerance("top", LayerQuantity::EtchBias), Some(Spread::Absolute(8e-6)));
    assert_eq!(tolerance("core", LayerQuantity::Er), Some(Spread::Relative(0.05)));
    assert_eq!(tolerance("mask-top", LayerQuantity::Er), Some(Spread::Absolute(0.2)));
    let LayerKind::Coating { depth_beside_copper, .. } = layer(&stackup, "mask-bottom").kind else {
        panic!("a coating");
    };
    assert_eq!(depth_beside_copper.to_bits(), 12e-6_f64.to_bits(), "as on copper");
    let LayerKind::Dielectric { thickness, prepreg, .. } = layer(&stackup, "core").kind else {
        panic!("a dielectric");
    };
    assert_eq!((thickness, prepreg), (0.2e-3, true));
    let core = layer(&stackup, "core").material().unwrap();
    assert_eq!((core.conductivity, core.loss_tangent), (Some(1e-12), Some(0.02)));
    assert_eq!((core.name.as_str(), core.er_source.as_str()), ("FR4", "job, table at 10 MHz"));
    assert_eq!(layer(&stackup, "core-2").material().map(|m| m.er), Some(core.er), "completed from the job");
    assert_eq!(layer(&stackup, "oil").material().unwrap().er_source, "stackup");
    let warnings: Vec<&str> = read.warnings.iter().map(|warning| warning.text.as_str()).collect();
    assert_eq!(warnings.len(), 2, "{warnings:?}");
    assert_eq!(warnings[1], "`thickness` has no effect on `mask-bottom`: the stackup gives it");
    assert!(warnings[0].starts_with("`er` of `core` is 4.3 in the stackup and 4.4"), "{}", warnings[0]);
    let unused: Vec<&str> = stackup.unused.iter().map(|entry| entry.name.as_str()).collect();
    assert!(
        unused.contains(&"tolerance of layer `core`") && unused.contains(&"conductivity of layer `core`")
    );
    assert_eq!(check_names(&job, &stackup), Ok(()));
}

#[test]
fn half_spaces_left_out_are_vacuum() {
    let stackup = stackup("[[layer]]\nname = \"above\"\nkind = \"conductor\"\nthickness = \"1 um\"\n").value;
    let names: Vec<&str> = stackup.layers.iter().map(|layer| layer.name.as_str()).collect();
    assert_eq!(names, ["above-2", "above", "below"]);
    let vacuum = stackup.layers[0].material().unwrap();
    assert_eq!((vacuum.er, vacuum.er_source.as_str()), (1.0, "vacuum, layer left out"));
    let LayerKind::Conductor { side_slope, wide_face, etch_bias, .. } = stackup.layers[1].kind else {
        panic!("a conductor");
    };
    assert_eq!((side_slope, wide_face, etch_bias), (FRAC_PI_2, WideFace::OnCore, 0.0));
}

/// What: `above` in `[materials]` fills the half-space that the file left out, and its name can be used as a fill.
#[test]
fn the_job_fills_the_open_space() {
    let text = "stackup = \"s.toml\"\n[artwork]\nfolder = \".\"\n[materials]\nabove = { er = 2.2 }\n";
    let materials = job(text).value.materials;
    let layers = "[[layer]]\nname = \"top\"\nkind = \"conductor\"\nthickness = \"1 um\"\nfill = \"above\"\n";
    let stackup = read_stackup(layers, FILE, &materials, None).unwrap().value;
    let oil = stackup.layers[0].material().unwrap();
    assert_eq!((oil.er, oil.er_source.as_str(), oil.name.as_str()), (2.2, "job", "above"));
    assert_eq!(stackup.layers[2].material().map(|m| m.er), Some(1.0));
}

/// What: the jobs of the project itself are read, and fit their stackups.
#[test]
fn the_fixtures_are_read() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures");
    for name in ["oil-probe", "via-fan", "lift-plate"] {
        let folder = root.join(name);
        let text = std::fs::read_to_string(folder.join("job.toml")).unwrap();
        let job = job(&text).value;
        let layers = std::fs::read_to_string(folder.join(&job.stackup.name)).unwrap();
        let read = if job.stackup.name.ends_with(".gbrjob") {
            read_gbrjob_stackup(&layers, FILE, &job.materials, job.frequency)
        } else {
            read_stackup(&layers, FILE, &job.materials, job.frequency)
        };
        assert_eq!(check_names(&job, &read.unwrap().value), Ok(()), "{name}");
    }
}
