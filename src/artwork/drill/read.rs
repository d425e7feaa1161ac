//! The lines of a drill file, one by one.

use super::error::DrillError;
use super::header::{Digits, Header};
use crate::artwork::curve::{Arc, Xy};
use crate::diag::Span;
use crate::geom::region::Grid;
use std::collections::BTreeMap;

/// Most holes of one file.
const MAX_HITS: usize = 500_000;
/// Largest coordinate, m.
const MAX_LENGTH_M: f64 = 10.0;

/// What a drill file holds.
#[derive(Debug, Clone, Default)]
pub(crate) struct DrillFile {
    /// Holes and slots in file order.
    pub(crate) hits: Vec<Hit>,
    /// Fields of `.FileFunction`.
    pub(crate) function: Option<Vec<String>>,
    /// Plating of the whole file, by comment.
    pub(crate) plated: Option<bool>,
    /// The first coordinate whose digits are not declared.
    pub(crate) undeclared: Option<Span>,
}

/// A hole (a path of one point) or a slot.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Hit {
    /// Centre line, grid steps.
    pub(crate) path: Vec<Xy>,
    /// Tool diameter, m.
    pub(crate) diameter: f64,
    /// Plating by the tool's own attribute.
    pub(crate) plated: Option<bool>,
    /// Its line.
    pub(crate) span: Span,
}

/// Reads a drill file; `assumed` are the digits when the file does not declare them.
///
/// # Errors
/// Everything found that the dialects do not allow or that we do not represent.
pub(crate) fn read(
    bytes: &[u8],
    grid: Grid,
    chord_error: f64,
    assumed: Option<Digits>,
) -> Result<DrillFile, Vec<DrillError>> {
    let mut reader = Reader { grid, chord_error: chord_error / grid.step(), assumed, ..Reader::default() };
    let mut errors = Vec::new();
    let mut start = 0;
    for line in bytes.split(|b| *b == b'\n' || *b == b'\r') {
        let span = Span { start, end: start + line.len() };
        start += line.len() + 1;
        let text: String = line.iter().copied().map(char::from).collect();
        if let Err(error) = reader.line(text.trim(), span) {
            errors.push(error);
        }
        if reader.ended || errors.len() >= 20 {
            break;
        }
    }
    if errors.is_empty() && !reader.ended {
        errors.push(DrillError::Truncated { span: (bytes.len().saturating_sub(1)..bytes.len()).into() });
    }
    if !errors.is_empty() {
        return Err(errors);
    }
    reader.end_route();
    reader.file.function = reader.header.function;
    reader.file.plated = reader.header.plated;
    Ok(reader.file)
}

#[derive(Default)]
struct Tool {
    diameter: f64,
    plated: Option<bool>,
}

#[derive(Default)]
struct Reader {
    grid: Grid,
    chord_error: f64,
    assumed: Option<Digits>,
    header: Header,
    in_header: bool,
    tools: BTreeMap<u32, Tool>,
    tool: Option<u32>,
    at: Xy,
    incremental: bool,
    routing: bool,
    down: bool,
    /// 1 straight, 2 clockwise, 3 counter-clockwise.
    motion: u32,
    route: Vec<Xy>,
    route_span: Span,
    ended: bool,
    file: DrillFile,
}

/// The letters and numbers of a line.
type Words<'a> = Vec<(u8, &'a str)>;

impl Reader {
    fn line(&mut self, line: &str, span: Span) -> Result<(), DrillError> {
        let malformed =
            |expected| DrillError::Malformed { line: line.chars().take(40).collect(), expected, span };
        if line.is_empty() || line == "%" {
            self.in_header &= line != "%";
            return Ok(());
        }
        if let Some(comment) = line.strip_prefix(';') {
            self.header.comment(comment);
            return Ok(());
        }
        if line.starts_with('(') {
            return Ok(());
        }
        let line = line.split(';').next().unwrap_or_default().trim();
        match line {
            "M48" => {
                self.in_header = true;
                return Ok(());
            }
            "M95" => {
                self.in_header = false;
                return Ok(());
            }
            "FMAT,2" | "ICI,OFF" | "ICI" => return Ok(()),
            "ICI,ON" => {
                self.incremental = true;
                return Ok(());
            }
            "FMAT,1" => {
                return Err(DrillError::Unsupported { construct: "`FMAT,1` (command set 1)".into(), span });
            }
            _ => {}
        }
        if line.starts_with("METRIC") || line.starts_with("INCH") {
            let known = self.header.unit_line(line);
            return if known {
                Ok(())
            } else {
                Err(malformed("`METRIC` or `INCH`, with `LZ`, `TZ` or digits"))
            };
        }
        const IDLE: [&str; 16] = [
            "VER", "DETECT", "ATC", "TCST", "FSB", "OM48", "BLKD", "AFS", "CCW", "CP", "SBK", "SG", "UP",
            "ZA", "ZC", "ZS",
        ];
        if IDLE.iter().any(|word| line.starts_with(word)) || line.starts_with("M47") {
            return Ok(());
        }
        if !line.bytes().all(|b| b.is_ascii_alphanumeric() || matches!(b, b'+' | b'-' | b'.' | b' ')) {
            return Err(malformed("a command of XNC or Excellon"));
        }
        let words = split(line).ok_or_else(|| malformed("letters, each with a number"))?;
        self.words(&words, line, span)
    }

    fn words(&mut self, words: &Words<'_>, line: &str, span: Span) -> Result<(), DrillError> {
        let malformed =
            |expected| DrillError::Malformed { line: line.chars().take(40).collect(), expected, span };
        if words.first().is_some_and(|w| w.0 == b'T') {
            self.tool_line(words, span).unwrap_or_else(|| Err(malformed("`T1C0.3` or `T1`")))?;
            let rest: Words<'_> =
                words.iter().skip(1).filter(|w| matches!(w.0, b'X' | b'Y')).copied().collect();
            return if rest.is_empty() { Ok(()) } else { self.words(&rest, line, span) };
        }
        let mut slot_from = None;
        let mut target = self.at;
        let (mut moved, mut repeat, mut radius, mut centre) = (false, None, None, [None, None]);
        for (letter, number) in words {
            match letter {
                b'X' | b'Y' => {
                    let axis = usize::from(*letter == b'Y');
                    let length = self.length(number, span)?;
                    target[axis] =
                        if self.incremental || repeat.is_some() { self.at[axis] + length } else { length };
                    moved = true;
                }
                b'A' => radius = Some(self.length(number, span)?),
                b'I' => centre[0] = Some(self.length(number, span)?),
                b'J' => centre[1] = Some(self.length(number, span)?),
                b'R' => repeat = Some(number.parse::<u32>().map_err(|_| malformed("a repeat count"))?),
                b'G' => {
                    let code: u32 = number.parse().map_err(|_| malformed("a G code"))?;
                    if code == 85 {
                        slot_from = Some(if std::mem::replace(&mut moved, false) { target } else { self.at });
                    } else if code == 93 {
                        return if words
                            .iter()
                            .all(|(l, n)| *l == b'G' || n.parse::<f64>().is_ok_and(|v| v.abs() <= 0.0))
                        {
                            Ok(())
                        } else {
                            Err(DrillError::Unsupported {
                                construct: "`G93` (zero set) off the origin".into(),
                                span,
                            })
                        };
                    } else {
                        self.g_code(code, span)?;
                    }
                }
                b'M' => {
                    let code: u32 = number.parse().map_err(|_| malformed("an M code"))?;
                    self.m_code(code, span)?;
                }
                b'N' | b'S' | b'F' | b'H' | b'B' | b'Z' => {}
                _ => return Err(malformed("one of T, X, Y, G, M, A, I, J, R")),
            }
        }
        if !moved {
            return Ok(());
        }
        self.check(target, span)?;
        if let Some(from) = slot_from {
            self.check(from, span)?;
            self.at = target;
            return self.hit(vec![from, target], span);
        }
        if let Some(count) = repeat {
            let step = [target[0] - self.at[0], target[1] - self.at[1]];
            if usize::try_from(count).unwrap_or(usize::MAX) > MAX_HITS {
                return Err(DrillError::TooMany { limit: MAX_HITS, span });
            }
            for _ in 0..count {
                self.at = [self.at[0] + step[0], self.at[1] + step[1]];
                self.check(self.at, span)?;
                self.hit(vec![self.at], span)?;
            }
            return Ok(());
        }
        if !self.routing {
            self.at = target;
            return self.hit(vec![target], span);
        }
        self.rout(target, radius, centre, span)
    }

    /// A move of the router to `target`, cutting when its tool is down.
    fn rout(
        &mut self,
        target: Xy,
        radius: Option<f64>,
        centre: [Option<f64>; 2],
        span: Span,
    ) -> Result<(), DrillError> {
        if self.down {
            let number = self.tool.unwrap_or(0);
            if !self.tools.contains_key(&number) {
                return Err(DrillError::UndefinedTool { tool: number, span });
            }
            if self.route.is_empty() {
                self.route.push(self.at);
                self.route_span = span;
            }
            if self.motion < 2 {
                self.route.push(target);
            } else {
                let counter = self.motion == 3;
                let about = match (radius, centre) {
                    (Some(radius), _) => centre_by_radius(self.at, target, radius, counter),
                    (None, [None, None]) => None,
                    (None, [i, j]) => Some([self.at[0] + i.unwrap_or(0.0), self.at[1] + j.unwrap_or(0.0)]),
                };
                let Some(about) = about else {
                    return Err(DrillError::Malformed {
                        line: format!("G0{}", self.motion),
                        expected: "a radius `A` that reaches, or `I` and `J`",
                        span,
                    });
                };
                let arc = Arc::about(about, self.at, target, counter);
                self.route.extend(arc.path(self.chord_error).into_iter().skip(1));
            }
            if self.route.len() > MAX_HITS {
                return Err(DrillError::TooMany { limit: MAX_HITS, span });
            }
        }
        self.at = target;
        Ok(())
    }

    fn g_code(&mut self, code: u32, span: Span) -> Result<(), DrillError> {
        match code {
            0 => {
                self.end_route();
                (self.routing, self.down, self.motion) = (true, false, 1);
            }
            1..=3 => {
                self.routing = true;
                self.motion = code;
            }
            5 | 81 => {
                self.end_route();
                (self.routing, self.down) = (false, false);
            }
            40 | 80 => {}
            90 => self.incremental = false,
            91 => self.incremental = true,
            other => return Err(DrillError::Unsupported { construct: format!("`G{other:02}`"), span }),
        }
        Ok(())
    }

    fn m_code(&mut self, code: u32, span: Span) -> Result<(), DrillError> {
        match code {
            0 | 30 => self.ended = true,
            15 => self.down = true,
            16 | 17 => {
                self.end_route();
                self.down = false;
            }
            71 => self.header.unit = Some(1e-3),
            72 => self.header.unit = Some(25.4e-3),
            6 | 8 | 9 | 14 => {}
            other => return Err(DrillError::Unsupported { construct: format!("`M{other:02}`"), span }),
        }
        Ok(())
    }

    /// `T1C0.3F200S65` defines, `T1` selects; `None` when the line is neither.
    fn tool_line(&mut self, words: &Words<'_>, span: Span) -> Option<Result<(), DrillError>> {
        self.end_route();
        let tool: u32 = words[0].1.parse().ok()?;
        match words.iter().find(|w| w.0 == b'C') {
            Some((_, size)) => {
                let size: f64 = size.parse().ok()?;
                let Some(unit) = self.header.unit else { return Some(Err(DrillError::NoUnit { span })) };
                if !(size >= 0.0 && size * unit <= MAX_LENGTH_M) {
                    return Some(Err(DrillError::OutOfRange { what: "a tool diameter", span }));
                }
                self.tools.insert(tool, Tool { diameter: size * unit, plated: self.header.tool_plated });
                if !self.in_header {
                    self.tool = Some(tool);
                }
            }
            None if self.in_header => {}
            None => self.tool = (tool != 0).then_some(tool),
        }
        Some(Ok(()))
    }

    fn length(&mut self, number: &str, span: Span) -> Result<f64, DrillError> {
        let unit = self.header.unit.ok_or(DrillError::NoUnit { span })? / self.grid.step();
        let bad = || DrillError::Malformed {
            line: number.chars().take(20).collect(),
            expected: "a coordinate",
            span,
        };
        if number.contains('.') {
            let value: f64 = number.parse().map_err(|_| bad())?;
            return Ok(value * unit);
        }
        if number.bytes().all(|b| matches!(b, b'0' | b'+' | b'-')) && number.contains('0') {
            return Ok(0.0);
        }
        let digits = match self.header.digits() {
            Some(digits) => digits,
            None => {
                self.file.undeclared.get_or_insert(span);
                // Any value will do: the caller asks for the digits before it uses them.
                self.assumed.unwrap_or(Digits { integer: 3, decimal: 3, trailing_omitted: false })
            }
        };
        let count = number.bytes().filter(u8::is_ascii_digit).count();
        let value: f64 = number.parse().map_err(|_| bad())?;
        let count = i32::try_from(count.min(40)).unwrap_or(40);
        let decimals = if digits.trailing_omitted {
            count - i32::from(digits.integer)
        } else {
            i32::from(digits.decimal)
        };
        Ok(value * 10f64.powi(-decimals) * unit)
    }

    fn check(&self, p: Xy, span: Span) -> Result<(), DrillError> {
        let limit = MAX_LENGTH_M / self.grid.step();
        if p[0].abs() <= limit && p[1].abs() <= limit {
            return Ok(());
        }
        Err(DrillError::OutOfRange { what: "a coordinate", span })
    }

    fn hit(&mut self, path: Vec<Xy>, span: Span) -> Result<(), DrillError> {
        let number = self.tool.unwrap_or(0);
        let Some(tool) = self.tools.get(&number) else {
            return Err(DrillError::UndefinedTool { tool: number, span });
        };
        if self.file.hits.len() >= MAX_HITS {
            return Err(DrillError::TooMany { limit: MAX_HITS, span });
        }
        self.file.hits.push(Hit { path, diameter: tool.diameter, plated: tool.plated, span });
        Ok(())
    }

    /// Ends a routed path. A path of an undefined tool cannot occur: the tool is looked up when it starts.
    fn end_route(&mut self) {
        let path = std::mem::take(&mut self.route);
        if path.len() > 1
            && let Some(tool) = self.tool.and_then(|number| self.tools.get(&number))
        {
            let (diameter, plated) = (tool.diameter, tool.plated);
            self.file.hits.push(Hit { path, diameter, plated, span: self.route_span });
        }
    }
}

/// `X1.5Y-2G85X3` to letters and numbers.
fn split(line: &str) -> Option<Words<'_>> {
    let mut words = Vec::new();
    let mut rest = line.trim();
    while let Some(letter) = rest.bytes().next() {
        if !letter.is_ascii_uppercase() {
            return None;
        }
        let end = rest[1..].find(|c: char| c.is_ascii_alphabetic()).map_or(rest.len(), |k| k + 1);
        words.push((letter, rest[1..end].trim()));
        rest = rest[end..].trim_start();
    }
    Some(words)
}

/// The centre of the arc of `radius` from `a` to `b` of at most half a turn; `None` when the radius does not reach.
fn centre_by_radius(a: Xy, b: Xy, radius: f64, counter: bool) -> Option<Xy> {
    let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
    let chord = dx.hypot(dy);
    let square = radius * radius - chord * chord / 4.0;
    // Half a turn may miss by the rounding of the digits.
    if chord < 0.5 || square < -0.01 * radius * radius {
        return None;
    }
    let height = square.max(0.0).sqrt() / chord;
    let side = if counter { 1.0 } else { -1.0 };
    Some([f64::midpoint(a[0], b[0]) - side * dy * height, f64::midpoint(a[1], b[1]) + side * dx * height])
}
