//! IPC-D-356A netlists: names for copper at points.
//!
//! Fixed columns, one test point a line: `317` through holes, `327` surface pads, `367` holes without plating (their
//! names are taken all the same). Names longer than their field stand in `NNAME` parameters.

use crate::artwork::curve::{Xy, round};
use crate::diag::Span;
use crate::geom::region::{Grid, Point};
use std::collections::BTreeMap;

/// Largest coordinate, m.
const MAX_LENGTH_M: f64 = 10.0;

/// A name at a point.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct TestPoint {
    /// The net.
    pub(super) net: String,
    /// Conductor layer from 1; `None`: reachable from both sides.
    pub(super) layer: Option<u32>,
    /// The point.
    pub(super) at: Point,
    /// Its line.
    pub(super) span: Span,
}

/// Whether the bytes look like a netlist of this format.
pub(super) fn has_signature(bytes: &[u8]) -> bool {
    let head = &bytes[..bytes.len().min(20_000)];
    let mut lines = head.split(|b| *b == b'\n').map(<[u8]>::trim_ascii_end);
    lines.any(|line| {
        line.starts_with(b"P  UNITS") || line.starts_with(b"P  JOB") || line.starts_with(b"P  VER")
    })
}

/// The test points that name a net.
///
/// # Errors
/// The line that breaks the format, and what should stand there.
pub(super) fn read(bytes: &[u8], grid: Grid) -> Result<Vec<TestPoint>, (&'static str, Span)> {
    let mut points = Vec::new();
    let mut long_names: BTreeMap<String, String> = BTreeMap::new();
    // Without a `UNITS` parameter: ten-thousandths of an inch.
    let mut unit = 25.4e-3 / 1e4;
    let mut start = 0;
    for line in bytes.split(|b| *b == b'\n') {
        let span = Span { start, end: start + line.trim_ascii_end().len() };
        start += line.len() + 1;
        let text: String = line.trim_ascii_end().iter().copied().map(char::from).collect();
        if let Some(parameter) = text.strip_prefix("P  ") {
            let words: Vec<&str> = parameter.split_whitespace().collect();
            match words.as_slice() {
                ["UNITS", .., "0"] => unit = 25.4e-3 / 1e4,
                ["UNITS", .., "1"] => unit = 1e-6,
                ["UNITS", ..] => return Err(("`UNITS CUST 0` (inch) or `UNITS CUST 1` (mm)", span)),
                [key, name] if key.starts_with("NNAME") => {
                    long_names.insert((*key).to_owned(), (*name).to_owned());
                }
                _ => {}
            }
            continue;
        }
        if text.starts_with("999") {
            break;
        }
        if !["317", "327", "367"].iter().any(|code| text.starts_with(code)) {
            continue;
        }
        let net = text.get(3..17).map(str::trim).unwrap_or_default();
        let net = long_names.get(net).map_or(net, String::as_str);
        if net.is_empty() || net == "N/C" {
            continue;
        }
        let found = place(&text, unit / grid.step());
        let Some((layer, at)) =
            found.filter(|(_, p)| p.iter().all(|c| c.abs() * grid.step() <= MAX_LENGTH_M))
        else {
            return Err(("access `A00` and coordinates `X+001234Y-005678`", span));
        };
        points.push(TestPoint {
            net: net.to_owned(),
            layer: (layer > 0).then_some(layer),
            at: round(at),
            span,
        });
    }
    Ok(points)
}

/// `A01X+012345Y-006789` in the columns from 39 on.
fn place(text: &str, unit: f64) -> Option<(u32, Xy)> {
    let rest = text.get(32..)?;
    let access = rest.find('A')?;
    let layer: u32 = rest.get(access + 1..access + 3)?.trim().parse().ok()?;
    let rest = rest.get(access + 3..)?;
    let rest = rest.get(rest.find('X')? + 1..)?;
    let middle = rest.find('Y')?;
    let digits = |text: &str| -> Option<f64> {
        let n = text.bytes().take_while(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b' ')).count();
        text[..n].trim().parse().ok()
    };
    Some((layer, [digits(&rest[..middle])? * unit, digits(&rest[middle + 1..])? * unit]))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn points_are_read() {
        let text = "C  a comment\nP  UNITS CUST 1\nP  NNAME1 A_VERY_LONG_NET_NAME\n\
            317NNAME1           VIA   -     D0300PA00X+001000Y-002000X0600Y0000R000S0\n\
            327GND              R1    -1    \x20    PA02X 003000Y+004000X0600Y0500R000S2\n\
            327N/C              R2    -1    \x20    PA02X 003000Y+004000X0600Y0500R000S2\n999\n";
        let points = read(text.as_bytes(), Grid::default()).unwrap();
        assert_eq!(points.len(), 2);
        assert_eq!((points[0].net.as_str(), points[0].layer), ("A_VERY_LONG_NET_NAME", None));
        assert_eq!((points[0].at.x, points[0].at.y), (1_000_000, -2_000_000));
        assert_eq!((points[1].net.as_str(), points[1].layer, points[1].at.y), ("GND", Some(2), 4_000_000));
        assert!(has_signature(text.as_bytes()));
    }
}
