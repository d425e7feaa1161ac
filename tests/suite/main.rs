//! The suite: one binary, one module per kind of check.
mod mesh;
