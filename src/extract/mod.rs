//! The loop: [`SlabModel`](crate::slab::SlabModel) to [`Extraction`], mesh after mesh until each error bar fits.

use crate::diag::Warning;
use crate::faces::FaceGroup;
use crate::net::ModelNet;
use crate::results::Results;
use faer::Mat;

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
    /// Whether every bar met the target.
    pub target_met: bool,
    /// The rule for the bars.
    pub accuracy: crate::job::Accuracy,
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
