//! Options of the slab stage.

/// How far the model reaches.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SlabOptions {
    /// How far interfaces and planes go on past the window, in heights of the finite stack, when an image ground
    /// plane bounds the model. Default 8: leaves about 1e-5 of C (docs/formulation.md, "Open interfaces").
    pub reach_heights: f64,
    /// The same without an image plane, in heights from the row nets to the nearest other conductor layer. Default 12;
    /// the reach is then also at least the larger half-width of the window, because the far field is that of the whole
    /// window. What truncation leaves is measured by every extraction and is part of the bars.
    pub open_reach_heights: f64,
}

impl Default for SlabOptions {
    fn default() -> Self {
        SlabOptions { reach_heights: 8.0, open_reach_heights: 12.0 }
    }
}
