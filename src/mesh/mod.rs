//! [`Faces`](crate::faces::Faces) to [`Mesh`]: flat convex panels, small where charge crowds.

pub mod panel;

pub use panel::{Mesh, Panel, PanelId, PanelKind};
