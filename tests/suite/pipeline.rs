//! Job and stackup text through the stages, for tests whose geometry is a pile of slabs.

use chargeskin::diag::FileId;
use chargeskin::extract::{ExtractOptions, Refinement, refine};
use chargeskin::slab::SlabModel;

/// A stackup of conductor and dielectric layers in turn, starting with a conductor; every dielectric has `er`.
pub(crate) fn stackup(layers: &[(&str, &str)], er: f64) -> String {
    let layer = |(k, (name, thickness)): (usize, &(&str, &str))| {
        let kind = if k % 2 == 0 {
            "kind = \"conductor\"".to_owned()
        } else {
            format!("kind = \"dielectric\"\ner = {er:?}")
        };
        format!("[[layer]]\nname = \"{name}\"\n{kind}\nthickness = \"{thickness}\"\n")
    };
    layers.iter().enumerate().map(layer).collect()
}

/// A job with one rectangle per entry: net, layer, corners.
pub(crate) fn job(rows: &[&str], rectangles: &[(&str, &str, [&str; 4])], nets: &str) -> String {
    let shape = |(net, layer, [x0, y0, x1, y1]): &(&str, &str, [&str; 4])| {
        format!(
            "[[shape]]\nnet = \"{net}\"\nlayer = \"{layer}\"\nrectangle = {{ from = [\"{x0}\", \"{y0}\"], to = [\"{x1}\", \"{y1}\"] }}\n"
        )
    };
    job_with(rows, &rectangles.iter().map(shape).collect::<String>(), nets)
}

/// A job with the given shapes and further lines of `[nets]`.
pub(crate) fn job_with(rows: &[&str], shapes: &str, nets: &str) -> String {
    format!("title = \"test\"\nstackup = \"stackup.toml\"\n{shapes}[nets]\nrows = {rows:?}\n{nets}")
}

/// The slab model of a job without artwork files.
pub(crate) fn model(job: &str, stackup: &str) -> SlabModel {
    let job = chargeskin::job::read_job(job, FileId(0)).unwrap().value;
    let stackup =
        chargeskin::job::read_stackup(stackup, FileId(1), &job.materials, job.frequency).unwrap().value;
    chargeskin::job::check_names(&job, &stackup).unwrap();
    let options = chargeskin::artwork::ArtworkOptions { chord_error: 2e-5, ..Default::default() };
    let artwork = chargeskin::artwork::read(&[], &job, &stackup, &options).unwrap().value;
    chargeskin::slab::build(&artwork, &stackup, &job, &Default::default()).unwrap().value
}

/// The refined answer for a job without artwork files, at default settings.
pub(crate) fn refine_text(job: &str, stackup: &str) -> Refinement {
    let faces = chargeskin::faces::derive(&model(job, stackup)).unwrap().value;
    refine(&faces, Default::default(), &ExtractOptions::default(), &mut Vec::new(), &|_| {}).unwrap()
}

/// A rectangular sheet on a grounded slab.
pub(crate) fn on_grounded_slab(rectangle: [&str; 4], height: &str, er: f64) -> Refinement {
    let stackup = stackup(&[("top", "0 um"), ("slab", height), ("plane", "35 um")], er);
    refine_text(&job(&["A"], &[("A", "top", rectangle)], "ground_plane = \"plane\"\n"), &stackup)
}
