//! What can go wrong while a system is assembled.

use miette::Diagnostic;
use thiserror::Error;

/// Why there is no system.
#[derive(Debug, Clone, PartialEq, Error, Diagnostic)]
#[non_exhaustive]
pub enum SystemError {
    /// A limit: the dense matrix does not fit.
    #[error("the matrix of {panels} panels takes {bytes} bytes, more than the limit of {limit} bytes")]
    #[diagnostic(
        code(system::too_large),
        help("refine less, model a smaller region, or allow more memory: {fitting} panels would fit")
    )]
    TooLarge {
        /// Number of panels, and of unknowns.
        panels: usize,
        /// Bytes the matrix would take.
        bytes: u64,
        /// Bytes allowed.
        limit: u64,
        /// Largest number of panels within the limit.
        fitting: usize,
    },
    /// The caller: a mesh without panels.
    #[error("the mesh has no panels")]
    #[diagnostic(code(system::no_panels), help("model at least one conductor"))]
    NoPanels,
    /// The content: a panel that lies on or beyond an image plane.
    #[error("panel {panel} reaches z = {z} m, beyond the image plane at z = {plane} m")]
    #[diagnostic(
        code(system::beyond_plane),
        help("move the part to the other side of the plane, or model the plane with panels")
    )]
    BeyondPlane {
        /// The panel's number.
        panel: usize,
        /// How far it reaches, m.
        z: f64,
        /// The plane, m.
        plane: f64,
    },
    /// The content: two image planes in the wrong order.
    #[error("the upper image plane, z = {above} m, is not above the lower one, z = {below} m")]
    #[diagnostic(
        code(system::planes_out_of_order),
        help("order the layers of the stackup from top to bottom")
    )]
    PlanesOutOfOrder {
        /// Lower plane, m.
        below: f64,
        /// Upper plane, m.
        above: f64,
    },
}
