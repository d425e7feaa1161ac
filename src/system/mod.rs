//! [`Mesh`] to [`System`]: one row per panel, the physics of `docs/formulation.md`.
//!
//! Each entry is a pure function of its two panels, so that the matrix is the same, bit for bit, whatever the number of
//! threads.

mod error;
pub mod row;

pub use error::SystemError;

use crate::mesh::Mesh;
use crate::net::{NetId, Role};
use crate::system::row::{Row, Sources};
use faer::Mat;
use rayon::prelude::{IndexedParallelIterator, ParallelIterator};

/// The linear system for the total charge density.
#[derive(Debug, Clone)]
pub struct System {
    /// `n_panels × n_panels`; row = field panel, column = source panel. Rows are scaled so that the diagonal is near 1.
    pub matrix: Mat<f64>,
    /// `n_panels × n_excited`: column k is the right-hand side with net `excited[k]` at 1 V and every other at 0 V.
    pub right_sides: Mat<f64>,
    /// Nets that get a right-hand side: rows and floating nets, by net id.
    pub excited: Vec<NetId>,
    /// Row i of the matrix is [`row::Row::of`] panel i times `row_scales[i]`: 1 over the panel's own mean potential at unit
    /// density for a conductor, 1 over the factor of its own density for an interface.
    pub row_scales: Vec<f64>,
}

/// Largest matrix that [`assemble`] makes, bytes: 8 GiB, 32768 panels.
pub const DEFAULT_LIMIT: u64 = 8 << 30;

/// The system of `mesh`, of at most [`DEFAULT_LIMIT`] bytes.
///
/// # Errors
/// Those of [`assemble_within`].
pub fn assemble(mesh: &Mesh) -> Result<System, SystemError> {
    assemble_within(mesh, DEFAULT_LIMIT)
}

/// The system of `mesh`.
///
/// - `limit`: largest size of the matrix, bytes.
///
/// # Errors
/// - [`SystemError::NoPanels`] when the mesh is empty.
/// - [`SystemError::TooLarge`] when the matrix would take more than `limit`.
/// - [`SystemError::PlanesOutOfOrder`], [`SystemError::BeyondPlane`] when the image planes do not enclose the panels.
pub fn assemble_within(mesh: &Mesh, limit: u64) -> Result<System, SystemError> {
    let n = mesh.panels.len();
    check_size(n, limit)?;
    check_planes(mesh)?;
    let sources = Sources::new(mesh);
    let rows: Vec<Row> = mesh.panels.iter().map(|panel| Row::of(&panel.kind)).collect();
    let row_scales: Vec<f64> = rows
        .iter()
        .enumerate()
        .map(|(i, row)| 1.0 / if row.own == 0.0 { sources.entry(row, sources.flat(i), i) } else { row.own })
        .collect();
    let scaled: Vec<Row> = rows
        .iter()
        .zip(&row_scales)
        .map(|(row, s)| Row { own: row.own * s, potential: row.potential * s, flux: row.flux * s })
        .collect();
    let mut matrix = Mat::zeros(n, n);
    matrix.as_mut().par_col_chunks_mut(CHUNK).enumerate().for_each(|(chunk, mut columns)| {
        for (i, row) in scaled.iter().enumerate() {
            for c in 0..columns.ncols() {
                let k = chunk * CHUNK + c;
                if !is_mirrored(&rows, i, k) {
                    let own = if i == k { row.own } else { 0.0 };
                    columns[(i, c)] = sources.entry(row, sources.flat(i), k) + own;
                }
            }
        }
    });
    mirror(&mut matrix, &rows, &sources, &row_scales);
    let excited: Vec<NetId> = (0u32..)
        .map(NetId)
        .zip(&mesh.nets)
        .filter(|(_, net)| net.role != Role::Ground)
        .map(|(id, _)| id)
        .collect();
    let right_sides = Mat::from_fn(n, excited.len(), |i, c| {
        if mesh.panels[i].kind.net() == Some(excited[c]) { row_scales[i] } else { 0.0 }
    });
    Ok(System { matrix, right_sides, excited, row_scales })
}

/// Columns that are worked out together, so that a test panel is fetched once for all of them.
const CHUNK: usize = 8;

/// Whether entry (i, k) follows from entry (k, i): below the diagonal between two potential rows.
fn is_mirrored(rows: &[Row], i: usize, k: usize) -> bool {
    i > k && rows[i].is_potential() && rows[k].is_potential()
}

/// Fills the entries that [`is_mirrored`] left out: `A_i P_ik = A_k P_ki`, since the mean potential of one panel's charge over the
/// other is the same double integral either way, images included.
fn mirror(matrix: &mut Mat<f64>, rows: &[Row], sources: &Sources, row_scales: &[f64]) {
    let factor = |i: usize| row_scales[i] / sources.flat(i).area;
    for k in 0..rows.len() {
        for i in (k + 1..rows.len()).filter(|i| is_mirrored(rows, *i, k)) {
            matrix[(i, k)] = matrix[(k, i)] * factor(i) / factor(k);
        }
    }
}

fn check_size(n: usize, limit: u64) -> Result<(), SystemError> {
    if n == 0 {
        return Err(SystemError::NoPanels);
    }
    let bytes = 8u64.saturating_mul(n as u64).saturating_mul(n as u64);
    if bytes > limit {
        let fitting = usize::try_from((limit / 8).isqrt()).unwrap_or(usize::MAX);
        return Err(SystemError::TooLarge { panels: n, bytes, limit, fitting });
    }
    Ok(())
}

/// A panel may touch a plane, within rounding.
const TOUCHING: f64 = 1e-9;

fn check_planes(mesh: &Mesh) -> Result<(), SystemError> {
    let (below, above) = (mesh.planes.below, mesh.planes.above);
    if let (Some(below), Some(above)) = (below, above)
        && below >= above
    {
        return Err(SystemError::PlanesOutOfOrder { below, above });
    }
    for (panel, p) in mesh.panels.iter().enumerate() {
        let slack = TOUCHING * p.shape.diameter();
        for corner in p.shape.corners() {
            let beyond = below
                .filter(|plane| corner.z < plane - slack)
                .or(above.filter(|plane| corner.z > plane + slack));
            if let Some(plane) = beyond {
                return Err(SystemError::BeyondPlane { panel, z: corner.z, plane });
            }
        }
    }
    Ok(())
}
