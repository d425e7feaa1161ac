//! What a row says: the physics of `docs/formulation.md`, "Unknown and rows", written once.
//!
//! Every row is a combination of the total charge density on its own panel, the mean potential and the mean normal
//! field over that panel. Storage and loops are elsewhere.

use crate::geom::PanelShape;
use crate::kernel::image::{Mirrors, Source};
use crate::kernel::{EPS0, Flat};
use crate::mesh::{Mesh, PanelId, PanelKind};
use faer::MatRef;
use rayon::prelude::{IntoParallelIterator, ParallelIterator};

/// A row before scaling: `own σ + potential φ + flux E_n` is the net's potential (conductor, sheet: V), or the trapped
/// charge over ε₀ (interface: V/m).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Row {
    /// Factor of the density on the row's own panel: (er1 + er2) / (2 ε₀) on an interface.
    pub own: f64,
    /// Factor of the mean potential: 1 on a conductor.
    pub potential: f64,
    /// Factor of the principal value of the mean normal field: er2 - er1 on an interface.
    pub flux: f64,
}

impl Row {
    /// The row of a panel of this kind.
    ///
    /// Normal n from medium 1 (`er_from`) into medium 2 (`er_to`):
    /// `(er1 + er2)/2 σ/ε₀ + (er2 - er1) E_n = 0`; the trapped charge of a film would stand on the right.
    #[must_use]
    pub fn of(kind: &PanelKind) -> Self {
        match *kind {
            PanelKind::Conductor { .. } | PanelKind::Sheet { .. } => {
                Row { own: 0.0, potential: 1.0, flux: 0.0 }
            }
            PanelKind::Interface { er_from, er_to, .. } => {
                Row { own: 0.5 * (er_from + er_to) / EPS0, potential: 0.0, flux: er_to - er_from }
            }
        }
    }

    /// Whether the row is the mean potential alone.
    #[must_use]
    pub(crate) fn is_potential(&self) -> bool {
        self.own == 0.0 && self.flux == 0.0
    }
}

/// The panels of a mesh with their images, ready to act on any test panel.
#[derive(Debug, Clone)]
pub struct Sources {
    mirrors: Mirrors,
    sources: Vec<Source>,
}

impl Sources {
    /// The panels of `mesh`.
    #[must_use]
    pub fn new(mesh: &Mesh) -> Self {
        let mirrors = Mirrors::new(mesh.planes.below, mesh.planes.above);
        Sources { mirrors, sources: mesh.panels.iter().map(|panel| mirrors.source(&panel.shape)).collect() }
    }

    /// How many.
    #[must_use]
    pub fn len(&self) -> usize {
        self.sources.len()
    }

    /// Whether there is none.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.sources.is_empty()
    }

    /// Panel `k`, ready for integration.
    ///
    /// # Panics
    /// When there is no such panel.
    #[must_use]
    pub fn flat(&self, k: usize) -> &Flat {
        self.sources[k].direct()
    }

    /// Entry of `row` over `test` for unit density on source `k`, images included, without the `own` term.
    #[must_use]
    #[inline]
    pub(crate) fn entry(&self, row: &Row, test: &Flat, k: usize) -> f64 {
        couple(&self.mirrors, row, test, &self.sources[k])
    }

    fn act(&self, row: &Row, test: &Flat, density: MatRef<'_, f64>) -> Vec<f64> {
        let entries: Vec<f64> = (0..self.len()).into_par_iter().map(|k| self.entry(row, test, k)).collect();
        (0..density.ncols())
            .map(|c| entries.iter().enumerate().map(|(k, e)| e * density[(k, c)]).sum())
            .collect()
    }
}

#[inline]
fn couple(mirrors: &Mirrors, row: &Row, test: &Flat, source: &Source) -> f64 {
    let mut entry = 0.0;
    if row.potential != 0.0 {
        entry += row.potential * mirrors.potential(test, source);
    }
    if row.flux != 0.0 {
        entry += row.flux * mirrors.flux(test, source);
    }
    entry
}

/// Left side of the row that a panel `test` of this kind would have, one value per column of `density`: V on a
/// conductor or sheet (its mean potential), V/m on an interface (0 where the row holds). Nothing is stored.
///
/// - `on`: the mesh's panel that `test` is a part of, whose density is that on `test`; `None` for a test panel without
///   charge of its own.
/// - `density`: `n_panels × n_columns`, C/m².
#[must_use]
pub fn apply(
    sources: &Sources,
    test: &PanelShape,
    kind: &PanelKind,
    on: Option<PanelId>,
    density: MatRef<'_, f64>,
) -> Vec<f64> {
    let row = Row::of(kind);
    let mut out = sources.act(&row, &Flat::new(test), density);
    if let Some(PanelId(k)) = on {
        for (c, value) in out.iter_mut().enumerate() {
            *value += row.own * density[(k as usize, c)];
        }
    }
    out
}

/// Entry, without scaling, of the row of a panel `test` of this kind for unit density on a panel `source`, images
/// included; neither needs to be in the mesh. The `own` term is added when both are the same panel.
#[must_use]
pub fn coupling(sources: &Sources, test: &PanelShape, kind: &PanelKind, source: &PanelShape) -> f64 {
    let row = Row::of(kind);
    let own = if test == source { row.own } else { 0.0 };
    own + couple(&sources.mirrors, &row, &Flat::new(test), &sources.mirrors.source(source))
}
