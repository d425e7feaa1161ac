//! Artwork: boards against their measured areas, the examples of the specification, and input that is wrong.

#![expect(
    clippy::unwrap_used,
    clippy::print_stdout,
    clippy::disallowed_methods,
    reason = "a test that cannot read its input or is skipped must say so; the boards are files"
)]

mod bad_input;
mod boards;
mod drills;
mod mutation;
mod nets;
mod spec_examples;
mod transforms;
mod world;
