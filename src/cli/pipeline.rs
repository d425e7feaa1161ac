//! The stages in sequence, from the path of a job file to an extraction: which file is read when, and who gets it.

use std::path::{Path, PathBuf};

use crate::artwork::{self, Artwork, ArtworkOptions};
use crate::cli::error::PathOrigin;
use crate::cli::failure::Failure;
use crate::cli::inputs;
use crate::cli::sources::Sources;
use crate::diag::Warning;
use crate::extract::{self, ExtractOptions, Extraction, Prepared, Progress};
use crate::geom::Grid;
use crate::job::{self, Job, LayerKind, Stackup};
use crate::slab::{self, SlabModel, SlabOptions};

/// A job and its stackup, checked against each other.
#[derive(Debug, Clone)]
pub struct Plan {
    /// The job.
    pub job: Job,
    /// The stackup.
    pub stackup: Stackup,
    /// The job file; its paths are relative to the folder that it lies in.
    pub job_path: PathBuf,
    /// Whether the stackup came from a `.gbrjob`.
    pub stackup_is_job_file: bool,
    /// In the order in which they arose.
    pub warnings: Vec<Warning>,
}

impl Plan {
    /// Folder that the paths of the job are relative to.
    #[must_use]
    pub fn folder(&self) -> PathBuf {
        self.job_path.parent().map(Path::to_owned).unwrap_or_default()
    }
}

/// Reads the job file at `path` and the stackup that it names.
///
/// # Errors
/// [`Failure::Command`] when a file cannot be read; [`Failure::Job`] when one of them is wrong.
pub fn read_plan(path: &Path, sources: &mut Sources) -> Result<Plan, Failure> {
    let mut warnings = Vec::new();
    let (job_id, text) = sources.read_text(path, "the job file", PathOrigin::CommandLine)?;
    let job = job::read_job(&text, job_id)?.drain(&mut warnings);
    let stackup_path = path.parent().unwrap_or(Path::new("")).join(&job.stackup.name);
    let (stackup_id, text) = sources
        .read_text(&stackup_path, "the stackup", PathOrigin::Job)
        .map_err(|error| Failure::Command(error, job.stackup.origin))?;
    let is_job_file = stackup_path.extension().is_some_and(|ending| ending.eq_ignore_ascii_case("gbrjob"));
    let read = if is_job_file { job::read_gbrjob_stackup } else { job::read_stackup };
    let stackup = read(&text, stackup_id, &job.materials, job.frequency)?.drain(&mut warnings);
    job::check_names(&job, &stackup)?;
    Ok(Plan { job, stackup, job_path: path.to_owned(), stackup_is_job_file: is_job_file, warnings })
}

/// A model ready to be solved, with what it was made from.
#[derive(Debug, Clone)]
pub struct Model {
    /// The job and its stackup.
    pub plan: Plan,
    /// The artwork.
    pub artwork: Artwork,
    /// The pile of slabs.
    pub slabs: SlabModel,
    /// Every warning so far.
    pub warnings: Vec<Warning>,
}

/// Reads the artwork of `plan` and builds its model.
///
/// # Errors
/// What reading and the stages report.
pub fn build_model(plan: Plan, sources: &mut Sources) -> Result<Model, Failure> {
    let files = inputs::gather(&plan, sources)?;
    let mut warnings = plan.warnings.clone();
    let options = artwork_options(&plan.stackup);
    let artwork = artwork::read(&files, &plan.job, &plan.stackup, &options)?.drain(&mut warnings);
    let slabs =
        slab::build(&artwork, &plan.stackup, &plan.job, &SlabOptions::default())?.drain(&mut warnings);
    Ok(Model { plan, artwork, slabs, warnings })
}

/// Solves `model`, which `prepared` was made of with the same options; the warnings of all stages are in the extraction.
///
/// # Errors
/// [`Failure::Extract`] with what the stages report.
pub fn solve(
    model: &Model,
    prepared: Prepared,
    options: &ExtractOptions,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Extraction, Failure> {
    let mut extraction =
        extract::extract_prepared(prepared, &model.slabs, &model.plan.job, options, progress)?;
    extraction.warnings.splice(0..0, model.warnings.iter().cloned());
    Ok(extraction)
}

/// How fine the artwork must be read for this stackup: a board needs nothing finer than the defaults, thin films do.
fn artwork_options(stackup: &Stackup) -> ArtworkOptions {
    /// A film under this is given a finer grid, m: design page, section 3.
    const FINE_BELOW: f64 = 100e-9;
    let mut options = ArtworkOptions::default();
    let thicknesses = stackup.layers.iter().filter_map(|layer| match layer.kind {
        LayerKind::Dielectric { thickness, .. } => Some(thickness),
        _ => None,
    });
    let thinnest = thicknesses.fold(f64::INFINITY, f64::min);
    // Arcs are drawn to a tenth of the thinnest gap, so that the gap beside a round edge is one all the same.
    options.chord_error = options.chord_error.min(thinnest / 10.0);
    if thinnest < FINE_BELOW {
        let finer = Grid::new(Grid::default().step() / 10.0);
        options.grid = finer.unwrap_or_default();
    }
    options
}
