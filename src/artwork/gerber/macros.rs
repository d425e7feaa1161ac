//! Aperture macros: primitives 0, 1, 2, 4, 5, 6, 7, 20, 21, 22, expressions and variables.
//!
//! Types of our own: those of `gerber-types` have no primitives 2 and 22 and no free order of variables.

use super::command::number;
use super::error::GerberError;
use crate::artwork::curve::{Pen, Xy, snap};
use crate::diag::Span;
use crate::geom::region::{Contour, Fill, Region};
use std::collections::BTreeMap;

/// Most corners and parts that one macro may make.
const MAX_CORNERS: f64 = 100_000.0;
/// Deepest nesting of brackets.
const MAX_DEPTH: u32 = 64;

/// A macro as defined.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Macro {
    pub(super) name: String,
    parts: Vec<(Part, Span)>,
}

#[derive(Debug, Clone, PartialEq)]
enum Part {
    Assign(u32, Expr),
    Primitive(u32, Vec<Expr>),
}

#[derive(Debug, Clone, PartialEq)]
enum Expr {
    Number(f64),
    Variable(u32),
    Negative(Box<Expr>),
    Binary(u8, Box<Expr>, Box<Expr>),
}

/// The macro whose head word is `head` (`AMname`) and whose content words are `content`.
pub(super) fn parse(bytes: &[u8], head: Span, content: &[Span]) -> Result<Macro, GerberError> {
    let name = String::from_utf8_lossy(bytes[head.start + 2..head.end].trim_ascii()).into_owned();
    let mut parts = Vec::new();
    for span in content {
        let raw = &bytes[span.start..span.end];
        if raw.first() == Some(&b'0') && raw.get(1).is_none_or(|b| !b.is_ascii_digit() && *b != b'.') {
            continue;
        }
        let text: Vec<u8> = raw.iter().copied().filter(|b| !b.is_ascii_whitespace()).collect();
        if text.is_empty() {
            continue;
        }
        let part = part(&text).ok_or_else(|| GerberError::Malformed {
            construct: format!("macro line `{}`", String::from_utf8_lossy(&text[..text.len().min(40)])),
            expected: "a primitive `1,1,$1,0,0` or an assignment `$4=$1x0.5`",
            span: *span,
        })?;
        parts.push((part, *span));
    }
    Ok(Macro { name, parts })
}

fn part(text: &[u8]) -> Option<Part> {
    if text[0] == b'$' {
        let equals = text.iter().position(|b| *b == b'=')?;
        let variable = std::str::from_utf8(&text[1..equals]).ok()?.parse().ok()?;
        return Some(Part::Assign(variable, expression(&text[equals + 1..])?));
    }
    let mut fields = text.strip_suffix(b",").unwrap_or(text).split(|b| *b == b',');
    let code = std::str::from_utf8(fields.next()?).ok()?.parse().ok()?;
    Some(Part::Primitive(code, fields.map(expression).collect::<Option<_>>()?))
}

fn expression(text: &[u8]) -> Option<Expr> {
    let mut at = 0;
    let value = sum(text, &mut at, 0)?;
    (at == text.len()).then_some(value)
}

fn sum(text: &[u8], at: &mut usize, depth: u32) -> Option<Expr> {
    let mut left = product(text, at, depth)?;
    while let Some(op @ (b'+' | b'-')) = text.get(*at) {
        *at += 1;
        left = Expr::Binary(*op, Box::new(left), Box::new(product(text, at, depth)?));
    }
    Some(left)
}

fn product(text: &[u8], at: &mut usize, depth: u32) -> Option<Expr> {
    let mut left = operand(text, at, depth)?;
    while let Some(op @ (b'x' | b'X' | b'/')) = text.get(*at) {
        *at += 1;
        left = Expr::Binary(op.to_ascii_lowercase(), Box::new(left), Box::new(operand(text, at, depth)?));
    }
    Some(left)
}

fn operand(text: &[u8], at: &mut usize, depth: u32) -> Option<Expr> {
    if depth > MAX_DEPTH {
        return None;
    }
    match text.get(*at)? {
        b'-' => {
            *at += 1;
            Some(Expr::Negative(Box::new(operand(text, at, depth + 1)?)))
        }
        b'+' => {
            *at += 1;
            operand(text, at, depth + 1)
        }
        b'(' => {
            *at += 1;
            let inner = sum(text, at, depth + 1)?;
            (text.get(*at) == Some(&b')')).then(|| *at += 1)?;
            Some(inner)
        }
        b'$' => {
            let n = text[*at + 1..].iter().take_while(|b| b.is_ascii_digit()).count();
            let variable = std::str::from_utf8(&text[*at + 1..*at + 1 + n]).ok()?.parse().ok()?;
            *at += 1 + n;
            Some(Expr::Variable(variable))
        }
        _ => {
            let n = text[*at..].iter().take_while(|b| b.is_ascii_digit() || **b == b'.').count();
            let value = number(&text[*at..*at + n])?;
            *at += n;
            Some(Expr::Number(value))
        }
    }
}

impl Expr {
    /// A variable that was never set is 0, by the format.
    fn value(&self, variables: &BTreeMap<u32, f64>) -> f64 {
        match self {
            Expr::Number(value) => *value,
            Expr::Variable(k) => variables.get(k).copied().unwrap_or(0.0),
            Expr::Negative(inner) => -inner.value(variables),
            Expr::Binary(op, a, b) => {
                let (a, b) = (a.value(variables), b.value(variables));
                match op {
                    b'+' => a + b,
                    b'-' => a - b,
                    b'/' => a / b,
                    _ => a * b,
                }
            }
        }
    }
}

impl Macro {
    /// The region of the macro with `values` for `$1`, `$2`...; `unit` is the length of the file's unit in steps.
    ///
    /// # Errors
    /// [`GerberError::Malformed`], [`GerberError::Unsupported`], [`GerberError::OutOfRange`], [`GerberError::TooMany`].
    pub(super) fn region(&self, values: &[f64], unit: f64, chord_error: f64) -> Result<Region, GerberError> {
        let mut variables: BTreeMap<u32, f64> = (1u32..).zip(values.iter().copied()).collect();
        let mut region = Region::empty();
        // Parts of one exposure are collected and joined at once.
        let mut pending: (bool, Vec<Contour>) = (true, Vec::new());
        for (part, span) in &self.parts {
            let (code, arguments) = match part {
                Part::Assign(k, value) => {
                    variables.insert(*k, value.value(&variables));
                    continue;
                }
                Part::Primitive(code, arguments) => (*code, arguments),
            };
            let values: Vec<f64> = arguments.iter().map(|a| a.value(&variables)).collect();
            let drawn = primitive(code, &values, *span, unit, chord_error)?;
            if drawn.exposed != pending.0 {
                flush(&mut region, &mut pending);
                pending.0 = drawn.exposed;
            }
            pending.1.extend(drawn.contours);
        }
        flush(&mut region, &mut pending);
        Ok(region)
    }
}

fn flush(region: &mut Region, pending: &mut (bool, Vec<Contour>)) {
    let contours = std::mem::take(&mut pending.1);
    if contours.is_empty() {
        return;
    }
    let drawn = Region::from_contours(&contours, Fill::NonZero);
    *region = if pending.0 { region.union(&drawn) } else { region.difference(&drawn) };
}

struct Drawn {
    exposed: bool,
    contours: Vec<Contour>,
}

fn primitive(code: u32, v: &[f64], span: Span, unit: f64, chord_error: f64) -> Result<Drawn, GerberError> {
    let malformed =
        |expected| GerberError::Malformed { construct: format!("macro primitive {code}"), expected, span };
    let (fewest, names) = match code {
        1 => (4, "exposure, diameter, centre x, y and perhaps a rotation"),
        2 | 20 => (7, "exposure, width, start x, y, end x, y, rotation"),
        21 => (6, "exposure, width, height, centre x, y, rotation"),
        22 => (6, "exposure, width, height, lower left x, y, rotation"),
        4 => (5, "exposure, corner count, corners, rotation"),
        5 => (6, "exposure, corner count, centre x, y, diameter, rotation"),
        6 => (9, "centre x, y, diameter, ring, gap, count, cross width, length, rotation"),
        7 => (6, "centre x, y, outer and inner diameter, gap, rotation"),
        _ => {
            return Err(GerberError::Unsupported { construct: format!("macro primitive {code}"), span });
        }
    };
    // The rotation of primitives 20 to 22 and 5 to 7 is left out by some writers.
    if v.len() + usize::from(matches!(code, 2 | 20 | 21 | 22 | 5 | 6 | 7)) < fewest {
        return Err(malformed(names));
    }
    // 10 m bounds every length; a factor 1e3 leaves room for angles.
    if v.iter().any(|x| !x.is_finite() || x.abs() > 1e4) {
        return Err(GerberError::OutOfRange { what: "a macro parameter", span });
    }
    let exposed = matches!(code, 6 | 7) || (v[0] - 1.0).abs() < 1e-9;
    if !exposed && v[0].abs() > 1e-9 {
        return Err(malformed("an exposure of 0 or 1"));
    }
    let rotation = |k: usize| v.get(k).copied().unwrap_or(0.0).to_radians();
    let s = |k: usize| v[k] * unit;
    let turned = |points: Vec<Xy>, angle: f64| vec![positive(snap(&turn(points, angle)))];
    let contours = match code {
        1 => {
            let centre = turn(vec![[s(2), s(3)]], rotation(4));
            vec![snap(&Pen::new(s(1).abs() / 2.0, chord_error).dot(centre[0]))]
        }
        2 | 20 => {
            let (dx, dy) = (s(4) - s(2), s(5) - s(3));
            let length = dx.hypot(dy);
            if length <= 0.0 {
                return Ok(Drawn { exposed, contours: Vec::new() });
            }
            let (nx, ny) = (-dy / length * s(1) / 2.0, dx / length * s(1) / 2.0);
            let corners = vec![
                [s(2) + nx, s(3) + ny],
                [s(2) - nx, s(3) - ny],
                [s(4) - nx, s(5) - ny],
                [s(4) + nx, s(5) + ny],
            ];
            turned(corners, rotation(6))
        }
        21 => turned(rectangle([s(3) - s(1) / 2.0, s(4) - s(2) / 2.0], s(1), s(2)), rotation(5)),
        22 => turned(rectangle([s(3), s(4)], s(1), s(2)), rotation(5)),
        4 => outline(v, unit)
            .ok_or_else(|| malformed("1 to 100000 corners, the first again, and a rotation"))?,
        5 => {
            let n = v[1].round();
            if !(3.0..=12.0).contains(&n) {
                return Err(malformed("3 to 12 corners"));
            }
            #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "3 to 12")]
            let corners = regular(s(4) / 2.0, n as u32, 0.0);
            turned(corners.into_iter().map(|c| [c[0] + s(2), c[1] + s(3)]).collect(), rotation(5))
        }
        6 => moire(v, unit, chord_error, rotation(8), span)?,
        _ => thermal(v, unit, chord_error, rotation(5)),
    };
    Ok(Drawn { exposed, contours })
}

/// Primitive 4: a closed outline; `None` when its corners are not what it counts.
fn outline(v: &[f64], unit: f64) -> Option<Vec<Contour>> {
    if !(1.0..=MAX_CORNERS).contains(&v[1]) {
        return None;
    }
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "in range, just checked")]
    let n = v[1].round() as usize;
    let corners = v.get(2..2 + 2 * (n + 1))?;
    let corners = corners.chunks_exact(2).map(|c| [c[0] * unit, c[1] * unit]).collect();
    let angle = v.get(4 + 2 * n).copied().unwrap_or(0.0).to_radians();
    let ring = snap(&turn(corners, angle));
    Some(Region::from_contours(&[ring], Fill::NonZero).contours().cloned().collect())
}

/// Primitive 6: rings and a cross.
fn moire(
    v: &[f64],
    unit: f64,
    chord_error: f64,
    angle: f64,
    span: Span,
) -> Result<Vec<Contour>, GerberError> {
    let centre = [v[0] * unit, v[1] * unit];
    let (mut outer, ring, gap) = (v[2], v[3], v[4]);
    if !(0.0..=1000.0).contains(&v[5]) {
        return Err(GerberError::TooMany {
            what: "a moire",
            #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "bounded by 1e4")]
            count: v[5].abs() as u64,
            unit: "rings",
            limit: 1000,
            span,
        });
    }
    let mut region = Region::empty();
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "0 to 1000")]
    for _ in 0..v[5].round() as usize {
        if outer <= 0.0 {
            break;
        }
        let disc = |d: f64| {
            let dot = Pen::new(d * unit / 2.0, chord_error).dot(centre);
            Region::from_contours(&[snap(&turn(dot, angle))], Fill::NonZero)
        };
        let inner = outer - 2.0 * ring;
        let this = if inner > 0.0 { disc(outer).difference(&disc(inner)) } else { disc(outer) };
        region = region.union(&this);
        outer = inner - 2.0 * gap;
    }
    let (thick, length) = (v[6] * unit, v[7] * unit);
    for (w, h) in [(length, thick), (thick, length)] {
        if w > 0.0 && h > 0.0 {
            let bar = rectangle([centre[0] - w / 2.0, centre[1] - h / 2.0], w, h);
            region = region.union(&Region::from_contours(&[snap(&turn(bar, angle))], Fill::NonZero));
        }
    }
    Ok(region.contours().cloned().collect())
}

/// Primitive 7: a ring with four gaps.
fn thermal(v: &[f64], unit: f64, chord_error: f64, angle: f64) -> Vec<Contour> {
    let centre = [v[0] * unit, v[1] * unit];
    let disc = |d: f64| {
        let dot = Pen::new(d.abs() * unit / 2.0, chord_error).dot(centre);
        Region::from_contours(&[snap(&turn(dot, angle))], Fill::NonZero)
    };
    let mut region = disc(v[2]);
    if v[3] > 0.0 {
        region = region.difference(&disc(v[3]));
    }
    let (gap, length) = (v[4] * unit, v[2] * unit * 1.01);
    if gap > 0.0 {
        for (w, h) in [(length, gap), (gap, length)] {
            let bar = rectangle([centre[0] - w / 2.0, centre[1] - h / 2.0], w, h);
            region = region.difference(&Region::from_contours(&[snap(&turn(bar, angle))], Fill::NonZero));
        }
    }
    region.contours().cloned().collect()
}

/// A rectangle, counter-clockwise from its lower left corner.
pub(super) fn rectangle(lo: Xy, width: f64, height: f64) -> Vec<Xy> {
    let (x, y) = (lo[0] + width, lo[1] + height);
    vec![lo, [x, lo[1]], [x, y], [lo[0], y]]
}

/// A regular polygon about the origin, its first corner at `angle` rad.
pub(super) fn regular(radius: f64, corners: u32, angle: f64) -> Vec<Xy> {
    (0..corners)
        .map(|k| angle + std::f64::consts::TAU * f64::from(k) / f64::from(corners))
        .map(|a| [radius * a.cos(), radius * a.sin()])
        .collect()
}

/// `points` turned about the origin by `angle` rad; quarter turns are exact.
pub(super) fn turn(mut points: Vec<Xy>, angle: f64) -> Vec<Xy> {
    let (sin, cos) = sin_cos(angle);
    for p in &mut points {
        *p = [p[0] * cos - p[1] * sin, p[0] * sin + p[1] * cos];
    }
    points
}

/// Sine and cosine, exact at quarter turns.
pub(super) fn sin_cos(angle: f64) -> (f64, f64) {
    let quarters = angle / std::f64::consts::FRAC_PI_2;
    if (quarters - quarters.round()).abs() < 1e-12 {
        return match quarters.round().rem_euclid(4.0) {
            q if q < 0.5 => (0.0, 1.0),
            q if q < 1.5 => (1.0, 0.0),
            q if q < 2.5 => (0.0, -1.0),
            _ => (-1.0, 0.0),
        };
    }
    angle.sin_cos()
}

/// The ring, turned counter-clockwise.
pub(super) fn positive(mut ring: Contour) -> Contour {
    if crate::geom::region::signed_area(&ring) < 0.0 {
        ring.reverse();
    }
    ring
}
