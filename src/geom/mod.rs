//! Geometry without electrostatics: vectors, grid regions, flat panel shapes.

pub mod offset;
pub mod panel_shape;
pub mod region;
pub mod snap;
pub mod strip;

pub use panel_shape::PanelShape;
pub use region::{Contour, Grid, Point, Region};

/// A point or direction in space, m.
pub type Vec3 = nalgebra::Vector3<f64>;
