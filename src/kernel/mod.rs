//! Formulas of one flat panel and one point, or of two panels; no mesh, no storage.
//!
//! Two quantities are all that the rows need: the potential and the flux of a uniformly charged flat panel, averaged
//! over another one ([`pair::potential`], [`pair::flux`]). Everything else in this room serves those two. The
//! formulas and their derivations are in `docs/formulation.md`, "Panel integrals".

pub mod batch;
pub mod flat;
pub mod flux;
pub mod galerkin;
pub mod image;
pub mod lanes;
pub mod moment;
pub mod outer;
pub mod pair;
pub mod points;
pub mod potential;
pub mod quadrature;
pub mod rectangles;
pub mod regime;

pub use flat::Flat;

/// Electric constant, F/m: CODATA 2022 (`Codata2022` in `docs/references.md`).
pub const EPS0: f64 = 8.854_187_818_8e-12;

/// 1 / (4 π ε₀), m/F: the potential of a unit point charge at unit distance.
pub const COULOMB: f64 = 1.0 / (4.0 * std::f64::consts::PI * EPS0);
