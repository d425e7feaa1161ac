//! The suite: one binary, one module per kind of check.
#![expect(clippy::disallowed_methods, reason = "tests read files, which the library does not")]
#![expect(clippy::unwrap_used, clippy::panic, reason = "helpers of tests are tests as well")]
#![expect(clippy::print_stdout, reason = "a test that skips says so")]

mod artwork;
mod bodies;
mod closed_forms;
mod identities;
mod invariance;
mod job;
mod main_job;
mod mesh;
mod oracles;
mod pipeline;
mod references;
mod slab;
mod solids;
mod stops;
mod tidy;
