//! Stackups, jobs and files made in memory, for the tests of artwork.

use chargeskin::artwork::{Artwork, ArtworkErrors, ArtworkOptions, InputFile, read};
use chargeskin::diag::{FileId, Origin, Warned};
use chargeskin::job::{
    Accuracy, ArtworkPlan, FileContent, Job, Layer, LayerKind, Material, Named, NetRules, RegionChoice,
    Stackup, WideFace,
};

/// A name that stands nowhere.
pub(super) fn named(name: &str) -> Named {
    Named { name: name.to_owned(), origin: Origin::default() }
}

fn material(er: f64) -> Material {
    Material {
        name: "m".into(),
        er,
        er_source: "test".into(),
        loss_tangent: None,
        conductivity: None,
        strength: None,
    }
}

/// A copper layer.
pub(super) fn conductor(name: &str) -> Layer {
    let kind = LayerKind::Conductor {
        thickness: 35e-6,
        fill: None,
        side_slope: std::f64::consts::FRAC_PI_2,
        wide_face: WideFace::OnCore,
        etch_bias: 0.0,
    };
    Layer::new(name, kind)
}

/// A dielectric layer.
pub(super) fn dielectric(name: &str) -> Layer {
    let kind = LayerKind::Dielectric {
        material: material(4.3),
        thickness: 2e-4,
        prepreg: false,
        fill: None,
        pattern: None,
    };
    Layer::new(name, kind)
}

/// A solder mask.
pub(super) fn coating(name: &str) -> Layer {
    let kind = LayerKind::Coating {
        material: material(3.5),
        depth_on_laminate: 2e-5,
        depth_on_copper: 1e-5,
        depth_beside_copper: 1e-5,
    };
    Layer::new(name, kind)
}

/// Air, mask, `n_conductors` copper layers `L1`.. with cores `D1`.. between, mask, air.
pub(super) fn board(n_conductors: usize) -> Stackup {
    let open = |name: &str| Layer::new(name, LayerKind::Open { material: material(1.0) });
    let mut layers = vec![open("above"), coating("mask-top")];
    for k in 1..=n_conductors {
        layers.push(conductor(&format!("L{k}")));
        if k < n_conductors {
            layers.push(dielectric(&format!("D{k}")));
        }
    }
    layers.extend([coating("mask-bottom"), open("below")]);
    Stackup { layers, unused: Vec::new() }
}

/// A job that says nothing.
pub(super) fn job() -> Job {
    Job {
        title: "test".into(),
        stackup: named("stackup.toml"),
        frequency: None,
        artwork: ArtworkPlan::default(),
        shapes: Vec::new(),
        region: RegionChoice::Whole,
        nets: NetRules::default(),
        materials: std::collections::BTreeMap::new(),
        accuracy: Accuracy::default(),
        unused: Vec::new(),
    }
}

/// A file of the folder.
pub(super) fn file(k: u32, name: &str, bytes: impl Into<Vec<u8>>) -> InputFile {
    InputFile { file: FileId(k), name: name.into(), bytes: bytes.into(), content: FileContent::Unsaid }
}

/// A file that the job maps to a layer.
pub(super) fn mapped(k: u32, layer: &str, bytes: impl Into<Vec<u8>>) -> InputFile {
    InputFile { content: FileContent::Layer(named(layer)), ..file(k, layer, bytes) }
}

/// Reads with the default options.
pub(super) fn import(
    files: &[InputFile],
    job: &Job,
    stackup: &Stackup,
) -> Result<Warned<Artwork>, ArtworkErrors> {
    read(files, job, stackup, &ArtworkOptions::default())
}
