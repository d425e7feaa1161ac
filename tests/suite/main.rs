//! The suite: one binary, one module per kind of check.
#![expect(clippy::disallowed_methods, reason = "tests read files, which the library does not")]
#![expect(clippy::unwrap_used, reason = "helpers of tests are tests as well")]

mod closed_forms;
mod mesh;
mod solids;
mod tidy;
