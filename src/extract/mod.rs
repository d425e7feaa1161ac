//! The loop: [`SlabModel`] to [`Extraction`], mesh after mesh until each error bar fits.

mod adapt;
mod border;
mod chord;
mod error;
mod error_bar;
mod level;
mod options;
mod prepared;
mod sequence;
mod stop;
mod uniform;

use crate::diag::Warning;
use crate::faces::FaceGroup;
use crate::job::{Accuracy, Job};
use crate::net::{ModelNet, NameSource, Role};
use crate::results::Results;
use crate::slab::SlabModel;
use faer::Mat;

pub use error::ExtractError;
pub use options::{ExtractOptions, Limit};
pub use prepared::{Expectation, Prepared, prepare};
pub use sequence::{Refinement, refine};
pub use stop::{NoFiner, Stop, Unmet};

/// Speed of light in vacuum, m/s: exact by the definition of the metre.
const SPEED_OF_LIGHT: f64 = 299_792_458.0;
/// A region is electrically small up to this part of a wavelength. Common practice.
const SMALL_PART_OF_WAVELENGTH: f64 = 20.0;

/// Where an extraction stands, for progress lines.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Progress {
    /// Which level, from 1.
    pub level: usize,
    /// What is being done.
    pub stage: &'static str,
    /// Panels of this level.
    pub panels: usize,
}

/// Extracts `model` under the rules of `job`: panels and solves level after level until the error bars fit the
/// accuracy that the job asks for, or until `options` allows no finer level (then `target_met` is false and a
/// warning says what stopped it). `progress` is told each step and must not mind the thread it is called on.
///
/// # Errors
/// [`ExtractError::NoRows`] when no net has a row; [`ExtractError::TooLarge`] when two levels do not fit the limits;
/// [`ExtractError::NotFiner`] when the faces give one mesh only; otherwise what the stages report.
pub fn extract(
    model: &SlabModel,
    job: &Job,
    options: &ExtractOptions,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Extraction, ExtractError> {
    extract_prepared(prepare(model, options)?, model, job, options, progress)
}

/// As [`extract`], with what [`prepare`] made of the same `model` and `options`.
///
/// # Errors
/// As [`extract`].
pub fn extract_prepared(
    prepared: Prepared,
    model: &SlabModel,
    job: &Job,
    options: &ExtractOptions,
    progress: &(dyn Fn(Progress) + Sync),
) -> Result<Extraction, ExtractError> {
    if !model.nets.iter().any(|net| net.role == Role::Row) {
        return Err(ExtractError::NoRows);
    }
    let Prepared { faces, coarsest, mut warnings, faces_seconds } = prepared;
    let options = ExtractOptions { chord_share: options.chord_share + chord::share(model), ..*options };
    let refined = sequence::refine_from(&faces, coarsest, job.accuracy, &options, &mut warnings, progress)?;
    let mut seconds = vec![("faces".to_owned(), faces_seconds)];
    seconds.extend(refined.seconds);
    Ok(Extraction {
        title: job.title.clone(),
        nets: faces.nets.clone(),
        reference: reference(model, job),
        bars: refined.bars,
        groups: faces.groups.clone(),
        dielectrics: model
            .materials
            .iter()
            .map(|m| Dielectric { name: m.name.clone(), er: m.er, source: m.er_source.clone() })
            .collect(),
        mesh: refined.count,
        solver: SolverReport {
            method: refined.info.method,
            relative_residual: refined.info.relative_residual,
            seconds,
            peak_memory: None,
        },
        results: refined.results,
        target_met: refined.stopped.is_none(),
        accuracy: job.accuracy,
        quasi_static_limit: quasi_static_limit(model),
        frequency: job.frequency,
        defaulted: defaulted(model, job),
        warnings,
    })
}

/// What is at 0 V: the ground nets, the layers of the image planes, and infinity, always.
fn reference(model: &SlabModel, job: &Job) -> Vec<String> {
    let grounds = model.nets.iter().filter(|net| net.role == Role::Ground).map(|net| net.name.clone());
    let planes = job.nets.ground_planes.iter().map(|layer| layer.name.clone());
    grounds.chain(planes).chain(["infinity".to_owned()]).collect()
}

/// Highest frequency at which the window's diagonal is at most a twentieth of the wavelength in its densest
/// dielectric, Hz.
fn quasi_static_limit(model: &SlabModel) -> f64 {
    let (lo, hi) = (model.window.lo, model.window.hi);
    let diagonal = model.grid.length(hi.x - lo.x).hypot(model.grid.length(hi.y - lo.y));
    let densest = model.materials.iter().map(|m| m.er).fold(1.0, f64::max);
    SPEED_OF_LIGHT / (SMALL_PART_OF_WAVELENGTH * diagonal * densest.sqrt())
}

fn defaulted(model: &SlabModel, job: &Job) -> DefaultedNets {
    let named = |name: &str| job.nets.ground.iter().any(|ground| ground.name == name);
    DefaultedNets {
        grounded: model.nets.iter().filter(|net| net.role == Role::Ground && !named(&net.name)).count(),
        floating: model
            .nets
            .iter()
            .filter(|net| matches!(net.role, Role::Float { .. }) && net.source == NameSource::Numbered)
            .count(),
    }
}

/// The answer, every number with its bar.
#[derive(Debug, Clone)]
pub struct Extraction {
    /// Title of the job.
    pub title: String,
    /// Every conductor; `NetId` in `results` points here.
    pub nets: Vec<ModelNet>,
    /// Names of what is at 0 V: ground nets, plane layers, and always "infinity".
    pub reference: Vec<String>,
    /// The values that are reported, on the finest mesh.
    pub results: Results,
    /// Half-widths of the error bars of those values.
    pub bars: Bars,
    /// Face groups; `GroupId` in `results` points here.
    pub groups: Vec<FaceGroup>,
    /// One line per dielectric: name, permittivity, where it comes from.
    pub dielectrics: Vec<Dielectric>,
    /// How many panels, of what kind, on how many levels.
    pub mesh: MeshCount,
    /// How it was solved.
    pub solver: SolverReport,
    /// Whether every bar met the target and no physical check failed; if not, a warning says what stopped the refinement.
    pub target_met: bool,
    /// The rule for the bars.
    pub accuracy: Accuracy,
    /// Highest frequency at which the region is smaller than a twentieth of a wavelength, Hz.
    pub quasi_static_limit: f64,
    /// Frequency at which permittivities were read, Hz.
    pub frequency: Option<f64>,
    /// How many nets were made ground or left floating without being named in the job.
    pub defaulted: DefaultedNets,
    /// In the order in which they arose.
    pub warnings: Vec<Warning>,
}

/// Half-widths of error bars; shapes as in [`Results`].
#[derive(Debug, Clone)]
pub struct Bars {
    /// `n_rows × n_rows`, F.
    pub maxwell: Mat<f64>,
    /// `n_nets × n_rows`, C.
    pub net_charge: Mat<f64>,
    /// Of the sum of each row of the matrix (the capacitance to the reference), F.
    pub to_reference: Vec<f64>,
    /// Per group of [`Results::groups`] and row, C.
    pub group_free: Vec<Vec<f64>>,
    /// Per group of [`Results::groups`] and row, C.
    pub group_bound: Vec<Vec<f64>>,
}

/// A dielectric of the model, for the head of every report.
#[derive(Debug, Clone, PartialEq)]
pub struct Dielectric {
    /// Layer name.
    pub name: String,
    /// Relative permittivity.
    pub er: f64,
    /// Where it comes from.
    pub source: String,
}

/// Panels of the finest mesh.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct MeshCount {
    /// All panels.
    pub panels: usize,
    /// Panels on conductors and sheets.
    pub conductor_panels: usize,
    /// Panels on interfaces.
    pub interface_panels: usize,
    /// Meshes solved.
    pub levels: usize,
}

/// How the answer was computed.
#[derive(Debug, Clone, PartialEq)]
pub struct SolverReport {
    /// As in [`SolveInfo`](crate::solve::SolveInfo).
    pub method: String,
    /// Largest relative residual of the finest level.
    pub relative_residual: f64,
    /// Stage name and seconds, in order.
    pub seconds: Vec<(String, f64)>,
    /// Peak memory of the process, bytes; `None` where the system does not tell.
    pub peak_memory: Option<u64>,
}

/// Nets whose role no line of the job gave.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct DefaultedNets {
    /// Named nets held at 0 V.
    pub grounded: usize,
    /// Islands without a name, left floating.
    pub floating: usize,
}
