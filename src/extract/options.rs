//! What an extraction may use, and what a solve of given size takes.

/// Bytes per matrix entry of a dense solve, the factorisation in place and its workspace included.
const BYTES_PER_ENTRY: f64 = 1.35 * 8.0;
/// Bytes that the program takes besides the matrix.
const BYTES_BESIDES: u64 = 300_000_000;
/// Seconds per matrix entry to assemble, one core. Measured on two cores with AVX2: 3e-7 to 5.5e-7 from 3000 to 15 000 panels.
const SECONDS_PER_ENTRY: f64 = 4e-7;
/// Floating-point operations per second and core of the factorisation. Measured there.
const FLOPS_PER_CORE: f64 = 2.4e10;

/// Limits and starting point of an extraction.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ExtractOptions {
    /// Density of the coarsest mesh: panels from an edge to the middle of its face. Default 1.2.
    pub density: f64,
    /// Most panels of one mesh. Default 20 000.
    pub max_panels: usize,
    /// Most memory of one solve, bytes. Default 8 GB.
    pub max_memory: u64,
    /// Threads that will work; for the estimate of time only. Default 1.
    pub threads: usize,
    /// Relative part of every bar that covers arcs drawn as chords and the grid. Default 0.
    pub chord_share: f64,
}

impl Default for ExtractOptions {
    fn default() -> Self {
        ExtractOptions {
            density: 1.2,
            max_panels: 20_000,
            max_memory: 8_000_000_000,
            threads: 1,
            chord_share: 0.0,
        }
    }
}

/// What bounds the panels of one mesh.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Limit {
    /// [`ExtractOptions::max_memory`].
    Memory,
    /// [`ExtractOptions::max_panels`].
    Panels,
}

impl ExtractOptions {
    /// Panels whose dense solve fits the memory.
    #[expect(
        clippy::cast_precision_loss,
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "an estimate of a positive number"
    )]
    fn panels_in_memory(&self) -> usize {
        let bytes = self.max_memory.saturating_sub(BYTES_BESIDES) as f64;
        (bytes / BYTES_PER_ENTRY).sqrt() as usize
    }

    /// Panels whose dense solve fits both limits.
    #[must_use]
    pub fn panels_that_fit(&self) -> usize {
        self.panels_in_memory().min(self.max_panels)
    }

    /// The limit that decides how many panels fit.
    #[must_use]
    pub fn limit(&self) -> Limit {
        if self.panels_in_memory() < self.max_panels { Limit::Memory } else { Limit::Panels }
    }

    /// Panels at which making a mesh is given up: enough above what fits to say how far off it was.
    pub(crate) fn most_panels(&self) -> usize {
        self.panels_that_fit().saturating_mul(8)
    }

    /// Peak memory of a dense solve with `n_panels` panels, bytes.
    #[must_use]
    #[expect(
        clippy::cast_precision_loss,
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "an estimate of a positive number"
    )]
    pub fn memory_of(n_panels: usize) -> u64 {
        let entries = (n_panels as f64).powi(2);
        (entries * BYTES_PER_ENTRY) as u64 + BYTES_BESIDES
    }

    /// Time of one dense solve with `n_panels` panels, s.
    #[must_use]
    #[expect(clippy::cast_precision_loss, reason = "an estimate")]
    pub fn seconds_of(&self, n_panels: usize) -> f64 {
        let n = n_panels as f64;
        // LU takes 2/3 n³ operations (Golub and Van Loan, Matrix Computations, section 3.2).
        (n * n * SECONDS_PER_ENTRY + 2.0 / 3.0 * n.powi(3) / FLOPS_PER_CORE) / self.threads.max(1) as f64
    }
}
