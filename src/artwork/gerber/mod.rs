//! Gerber Layer Format bytes to objects on the grid, with attributes.

mod aperture;
mod attribute;
mod command;
mod error;
pub(crate) mod image;
mod lex;
mod macros;
mod plot;

pub use error::GerberError;
pub(crate) use plot::{Plot, plot};

use crate::geom::region::Grid;

/// Largest coordinate and length that we take for meant, m: no board is larger.
const MAX_LENGTH_M: f64 = 10.0;

/// That length in steps.
fn max_steps(grid: Grid) -> f64 {
    MAX_LENGTH_M / grid.step()
}

/// Whether the bytes look like a Gerber file: a `%` block or function codes ended by `*` near the start.
pub(crate) fn has_signature(bytes: &[u8]) -> bool {
    let head = &bytes[..bytes.len().min(20_000)];
    let find = |what: &[u8]| head.windows(what.len()).any(|w| w == what);
    head.contains(&b'*') && (find(b"%FS") || find(b"%MO") || find(b"%AD") || (find(b"G04") && find(b"D0")))
}
