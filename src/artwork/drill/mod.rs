//! Drill files, XNC and the Excellon dialects met in practice, to holes and slots.
//!
//! Reading is by line. The digits of a coordinate without a decimal point mean nothing by themselves; a file that
//! does not declare them is read with each customary format in turn by the caller, who compares with the copper.

mod error;
mod header;
mod read;

pub use error::DrillError;
pub(crate) use header::Digits;
pub(crate) use read::{DrillFile, Hit, read};

/// Whether the bytes look like a drill file: `M48` on a line of its own near the start, or tools and `M30`.
pub(crate) fn has_signature(bytes: &[u8]) -> bool {
    let head = &bytes[..bytes.len().min(4000)];
    let mut lines = head.split(|b| *b == b'\n' || *b == b'\r').map(<[u8]>::trim_ascii);
    lines.any(|line| line == b"M48")
}
