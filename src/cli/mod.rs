//! The command: the only room that reads files, prints, or knows how words on a command line are spelt.
//!
//! [`read_plan`], [`build_model`] and [`solve`] are the whole pipeline for callers that have files; what the words mean
//! and what goes to the terminal is in `run`.
#![expect(clippy::disallowed_methods, reason = "the command reads files, so that no other room has to")]

pub mod args;
mod error;
mod failure;
mod inputs;
mod inspection;
mod memory;
mod output;
mod pipeline;
mod progress;
mod render;
mod run;
mod sources;

pub use error::{CliError, PathOrigin};
pub use failure::Failure;
pub use pipeline::{Model, Plan, build_model, read_plan, solve};
pub use render::Colour;
pub use run::main;
pub use sources::Sources;
