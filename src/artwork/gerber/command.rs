//! Words to commands: the whole of the format, current and deprecated, with the bytes each came from.
//!
//! Values are those of `gerber-types` where that crate has a type that can hold them; coordinates keep their digits,
//! since their meaning hangs on the format declared elsewhere.

use super::attribute::{self, Attribute};
use super::error::GerberError;
use super::lex::{Word, Words};
use super::macros::{self, Macro};
use crate::diag::Span;
use gerber_types::{InterpolationMode, Mirroring, Polarity, QuadrantMode, Unit};

/// One command.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Command {
    Format(Format),
    Unit(Unit),
    Interpolation(InterpolationMode),
    Quadrant(QuadrantMode),
    Region {
        open: bool,
    },
    Incremental {
        on: bool,
    },
    Select(u32),
    Operation {
        coords: Coords,
        kind: Option<Operation>,
    },
    Define {
        code: u32,
        shape: Box<Definition>,
    },
    Macro(Box<Macro>),
    Polarity(Polarity),
    Mirror(Mirroring),
    Rotate(f64),
    Scale(f64),
    BlockOpen(u32),
    BlockClose,
    Repeat {
        nx: u32,
        ny: u32,
        dx: f64,
        dy: f64,
    },
    RepeatClose,
    ImageMirror {
        a: bool,
        b: bool,
    },
    ImageOffset {
        a: f64,
        b: f64,
    },
    ImageScale(f64),
    ImageRotate(u16),
    Attribute(Box<Attribute>),
    /// Known, and of no effect on the image.
    Nothing,
    End,
}

/// What a `D01`, `D02`, `D03` does.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Operation {
    Draw,
    Move,
    Flash,
}

/// `FS`: how the digits of a coordinate are read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Format {
    /// Trailing instead of leading zeros are left out.
    pub(super) trailing_omitted: bool,
    pub(super) incremental: bool,
    /// Integer and decimal digits of X.
    pub(super) x: (u8, u8),
    /// Integer and decimal digits of Y.
    pub(super) y: (u8, u8),
}

/// The digits of a coordinate as written.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Digits {
    /// The signed value of the digits, decimal point left out.
    pub(super) value: i64,
    /// How many digits there are.
    pub(super) count: u8,
    /// How many of them stand after a decimal point, if there is one.
    pub(super) decimals: Option<u8>,
}

/// The coordinates of an operation.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Coords {
    pub(super) x: Option<Digits>,
    pub(super) y: Option<Digits>,
    pub(super) i: Option<Digits>,
    pub(super) j: Option<Digits>,
}

/// An aperture as defined; lengths in the file's unit.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Definition {
    Circle { diameter: f64, hole: Hole },
    Rectangle { x: f64, y: f64, hole: Hole },
    Obround { x: f64, y: f64, hole: Hole },
    Polygon { diameter: f64, corners: u32, rotation: f64, hole: Hole },
    Macro { name: String, values: Vec<f64> },
}

/// The hole of a standard aperture.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Hole {
    None,
    Round(f64),
    Rectangular(f64, f64),
}

/// Reads the commands of a file one by one.
#[derive(Debug)]
pub(super) struct Commands<'a> {
    bytes: &'a [u8],
    words: Words<'a>,
    peeked: Option<Word>,
}

type Found = (Command, Span);

impl<'a> Commands<'a> {
    pub(super) fn new(bytes: &'a [u8]) -> Self {
        Commands { bytes, words: Words::new(bytes), peeked: None }
    }

    /// Appends the commands of the next word to `into`; `false` at the end of the file.
    ///
    /// # Errors
    /// The first thing wrong with the word; commands before it in the word are in `into`.
    pub(super) fn read(&mut self, into: &mut Vec<Found>) -> Result<bool, GerberError> {
        let word = match self.peeked.take() {
            Some(word) => word,
            None => match self.words.next_word() {
                Some(word) => word?,
                None => return Ok(false),
            },
        };
        let text = &self.bytes[word.span.start..word.span.end];
        match text.get(..2) {
            _ if text.is_empty() => {}
            Some(b"AM") if word.extended => self.read_macro(word, into)?,
            _ if word.extended && text[0].is_ascii_uppercase() && !is_function(text) => {
                into.push((extended(text, word.span)?, word.span));
            }
            _ => function_word(text, word.span, into)?,
        }
        Ok(true)
    }

    /// `AM`: its content runs on over the words of the block that begin like content.
    fn read_macro(&mut self, head: Word, into: &mut Vec<Found>) -> Result<(), GerberError> {
        let mut content = Vec::new();
        let mut word = head;
        while !word.last {
            let Some(next) = self.words.next_word() else { break };
            word = next?;
            let first = self.bytes[word.span.start..word.span.end].first();
            if first.is_some_and(|b| !b.is_ascii_digit() && *b != b'$') {
                self.peeked = Some(word);
                break;
            }
            content.push(word.span);
        }
        let parsed = macros::parse(self.bytes, head.span, &content)?;
        into.push((Command::Macro(Box::new(parsed)), head.span));
        Ok(())
    }
}

/// Whether a word in a `%` block is a function code all the same (`%G70*%` is met in old files).
fn is_function(text: &[u8]) -> bool {
    matches!(text[0], b'G' | b'D' | b'M' | b'X' | b'Y' | b'N') && text.get(1).is_some_and(u8::is_ascii_digit)
}

/// A word such as `G01X100Y200D01`.
fn function_word(text: &[u8], span: Span, into: &mut Vec<Found>) -> Result<(), GerberError> {
    let mut at = 0;
    let mut coords = Coords::default();
    let mut any = false;
    while at < text.len() {
        let letter = text[at];
        if letter.is_ascii_whitespace() {
            at += 1;
            continue;
        }
        let start = at;
        at += 1;
        let digits = read_digits(text, &mut at);
        let here = Span { start: span.start + start, end: span.start + at };
        let Some(digits) = digits else {
            let shown = String::from_utf8_lossy(&text[start..text.len().min(start + 12)]).into_owned();
            return Err(GerberError::Malformed {
                construct: format!("`{shown}`"),
                expected: "a function code or a coordinate, up to 15 digits",
                span: here,
            });
        };
        match letter {
            b'X' => (coords.x, any) = (Some(digits), true),
            b'Y' => (coords.y, any) = (Some(digits), true),
            b'I' => (coords.i, any) = (Some(digits), true),
            b'J' => (coords.j, any) = (Some(digits), true),
            b'N' => {}
            b'G' if digits.value == 4 => {
                if let Some(attribute) = attribute::in_comment(&text[at..]) {
                    into.push((Command::Attribute(Box::new(attribute)), span));
                }
                return Ok(());
            }
            b'G' => into.push((g_code(digits.value, here)?, here)),
            b'D' => match digits.value {
                1 => {
                    into.push((Command::Operation { coords, kind: Some(Operation::Draw) }, span));
                    (coords, any) = (Coords::default(), false);
                }
                2 => {
                    into.push((Command::Operation { coords, kind: Some(Operation::Move) }, span));
                    (coords, any) = (Coords::default(), false);
                }
                3 => {
                    into.push((Command::Operation { coords, kind: Some(Operation::Flash) }, span));
                    (coords, any) = (Coords::default(), false);
                }
                code => match u32::try_from(code) {
                    Ok(code) if code >= 10 => into.push((Command::Select(code), here)),
                    _ => return Err(unsupported(format!("`D{code}`"), here)),
                },
            },
            b'M' => match digits.value {
                0 | 2 => into.push((Command::End, here)),
                1 => {}
                code => return Err(unsupported(format!("`M{code:02}`"), here)),
            },
            other => {
                return Err(GerberError::Malformed {
                    construct: format!("`{}`", char::from(other)),
                    expected: "one of G, D, M, N, X, Y, I, J",
                    span: here,
                });
            }
        }
    }
    if any {
        into.push((Command::Operation { coords, kind: None }, span));
    }
    Ok(())
}

fn g_code(code: i64, span: Span) -> Result<Command, GerberError> {
    Ok(match code {
        // `G00`, a rapid move of the earliest files, is drawn by the D code beside it.
        0 | 1 => Command::Interpolation(InterpolationMode::Linear),
        2 => Command::Interpolation(InterpolationMode::ClockwiseCircular),
        3 => Command::Interpolation(InterpolationMode::CounterclockwiseCircular),
        36 => Command::Region { open: true },
        37 => Command::Region { open: false },
        54 | 55 => Command::Nothing,
        70 => Command::Unit(Unit::Inches),
        71 => Command::Unit(Unit::Millimeters),
        74 => Command::Quadrant(QuadrantMode::Single),
        75 => Command::Quadrant(QuadrantMode::Multi),
        90 => Command::Incremental { on: false },
        91 => Command::Incremental { on: true },
        other => return Err(unsupported(format!("`G{other:02}`"), span)),
    })
}

/// Sign, digits and perhaps a point at `*at`, white space within skipped; at most 15 digits.
fn read_digits(text: &[u8], at: &mut usize) -> Option<Digits> {
    let mut negative = false;
    let mut digits = Digits { value: 0, count: 0, decimals: None };
    let mut first = true;
    while let Some(b) = text.get(*at) {
        match b {
            b'0'..=b'9' => {
                if digits.count == 15 {
                    return None;
                }
                digits.value = digits.value * 10 + i64::from(b - b'0');
                digits.count += 1;
                digits.decimals = digits.decimals.map(|d| d + 1);
            }
            b'+' if first => {}
            b'-' if first => negative = true,
            b'.' if digits.decimals.is_none() => digits.decimals = Some(0),
            b'\r' | b'\n' => {
                *at += 1;
                continue;
            }
            _ => break,
        }
        first = false;
        *at += 1;
    }
    if negative {
        digits.value = -digits.value;
    }
    (digits.count > 0).then_some(digits)
}

/// A command of a `%` block, macros aside.
fn extended(text: &[u8], span: Span) -> Result<Command, GerberError> {
    let (name, rest) = text.split_at(text.len().min(2));
    let rest: Vec<u8> = match name {
        b"TF" | b"TA" | b"TO" | b"TD" => Vec::new(),
        _ => rest.iter().copied().filter(|b| !b.is_ascii_whitespace()).collect(),
    };
    let rest = rest.as_slice();
    let malformed = |expected: &'static str| GerberError::Malformed {
        construct: format!("`{}`", String::from_utf8_lossy(&text[..text.len().min(40)])),
        expected,
        span,
    };
    let shown = || format!("`{}`", String::from_utf8_lossy(&text[..text.len().min(40)]));
    let number = |text: &[u8]| number(text).ok_or_else(|| malformed("a decimal number"));
    let ab =
        |default: f64| letter_pair(rest, b'A', b'B', default).ok_or_else(|| malformed("`A` and `B` values"));
    Ok(match name {
        b"FS" => Command::Format(format(rest).ok_or_else(|| malformed("`FSLAX46Y46` or the like"))?),
        b"MO" => Command::Unit(match rest {
            b"MM" => Unit::Millimeters,
            b"IN" => Unit::Inches,
            _ => return Err(malformed("`MOMM` or `MOIN`")),
        }),
        b"AD" => define(rest).ok_or_else(|| malformed("`ADD10C,0.5` or the like"))?,
        b"LP" => Command::Polarity(match rest {
            b"D" => Polarity::Dark,
            b"C" => Polarity::Clear,
            _ => return Err(malformed("`LPD` or `LPC`")),
        }),
        b"LM" => Command::Mirror(match rest {
            b"N" => Mirroring::None,
            b"X" => Mirroring::X,
            b"Y" => Mirroring::Y,
            b"XY" => Mirroring::XY,
            _ => return Err(malformed("`LMN`, `LMX`, `LMY` or `LMXY`")),
        }),
        b"LR" => Command::Rotate(number(rest)?),
        b"LS" => Command::Scale(number(rest)?),
        b"AB" if rest.is_empty() => Command::BlockClose,
        b"AB" => Command::BlockOpen(d_code(rest).ok_or_else(|| malformed("`ABD10`"))?.0),
        b"SR" if rest.is_empty() => Command::RepeatClose,
        b"SR" => repeat(rest).ok_or_else(|| malformed("`SRX2Y3I1.5J2.5`"))?,
        b"TF" | b"TA" | b"TO" | b"TD" => match attribute::parse(text) {
            Some(attribute) => Command::Attribute(Box::new(attribute)),
            None => return Err(malformed("an attribute name")),
        },
        b"LN" | b"IN" | b"PF" => Command::Nothing,
        b"IP" if rest == b"POS" => Command::Nothing,
        b"IC" if rest == b"AS" || rest.is_empty() => Command::Nothing,
        b"AS" if rest == b"AXBY" => Command::Nothing,
        b"IJ" if matches!(rest, b"" | b"ALBL" | b"A0B0" | b"AL" | b"BL") => Command::Nothing,
        b"IO" if ab(0.0)? == (0.0, 0.0) => Command::Nothing,
        b"MI" => {
            let (a, b) = ab(0.0)?;
            Command::ImageMirror { a: a > 0.5, b: b > 0.5 }
        }
        b"OF" => {
            let (a, b) = ab(0.0)?;
            Command::ImageOffset { a, b }
        }
        b"SF" => match ab(1.0)? {
            (a, b) if (a - b).abs() < 1e-12 && a > 0.0 => Command::ImageScale(a),
            _ => return Err(unsupported(format!("{} (factors that differ)", shown()), span)),
        },
        b"IR" => match rest {
            b"0" => Command::Nothing,
            b"90" => Command::ImageRotate(90),
            b"180" => Command::ImageRotate(180),
            b"270" => Command::ImageRotate(270),
            _ => return Err(malformed("0, 90, 180 or 270")),
        },
        b"IP" | b"IC" | b"AS" | b"IJ" | b"IO" | b"KO" | b"IF" | b"RO" => {
            return Err(unsupported(shown(), span));
        }
        _ => return Err(malformed("a command of the format")),
    })
}

/// `LAX46Y46` and its variants, `N` and `G` digit counts of old files included.
fn format(text: &[u8]) -> Option<Format> {
    let mut format = Format { trailing_omitted: false, incremental: false, x: (0, 0), y: (0, 0) };
    let (mut seen_x, mut seen_y) = (false, false);
    let mut at = 0;
    while let Some(letter) = text.get(at) {
        at += 1;
        match letter {
            b'L' | b'D' | b'A' => {}
            b'T' => format.trailing_omitted = true,
            b'I' => format.incremental = true,
            b'X' | b'Y' => {
                let digit = |k: usize| text.get(k).filter(|b| b.is_ascii_digit()).map(|b| b - b'0');
                let pair = (digit(at)?, digit(at + 1)?);
                at += 2;
                match letter {
                    b'X' => (format.x, seen_x) = (pair, true),
                    _ => (format.y, seen_y) = (pair, true),
                }
            }
            b'N' | b'G' | b'M' => at += text[at..].iter().take_while(|b| b.is_ascii_digit()).count(),
            _ => return None,
        }
    }
    (seen_x && seen_y).then_some(format)
}

/// `D10` at the start of `text`, and how many bytes it takes.
fn d_code(text: &[u8]) -> Option<(u32, usize)> {
    let digits = text.strip_prefix(b"D")?;
    let n = digits.iter().take_while(|b| b.is_ascii_digit()).count();
    let code: u32 = std::str::from_utf8(&digits[..n]).ok()?.parse().ok()?;
    (code >= 10 && code <= i32::MAX as u32).then_some((code, n + 1))
}

/// What follows `AD`.
fn define(text: &[u8]) -> Option<Command> {
    let (code, used) = d_code(text)?;
    let rest = &text[used..];
    let comma = rest.iter().position(|b| *b == b',').unwrap_or(rest.len());
    let name = &rest[..comma];
    let values: Vec<f64> = match rest.get(comma + 1..) {
        None | Some(b"") => Vec::new(),
        Some(list) => list
            .strip_suffix(b"X")
            .unwrap_or(list)
            .split(|b| *b == b'X')
            .map(number)
            .collect::<Option<_>>()?,
    };
    let hole = |from: usize| match (values.get(from), values.get(from + 1), values.len() > from + 2) {
        (_, _, true) => None,
        (None, _, _) => Some(Hole::None),
        (Some(d), None, _) if *d <= 0.0 => Some(Hole::None),
        (Some(d), None, _) => Some(Hole::Round(*d)),
        (Some(x), Some(y), _) => Some(Hole::Rectangular(*x, *y)),
    };
    let shape = match name {
        b"C" => Definition::Circle { diameter: *values.first()?, hole: hole(1)? },
        b"R" => Definition::Rectangle { x: *values.first()?, y: *values.get(1)?, hole: hole(2)? },
        b"O" => Definition::Obround { x: *values.first()?, y: *values.get(1)?, hole: hole(2)? },
        b"P" => {
            let corners = *values.get(1)?;
            // 3 to 12 corners by the format.
            let corners = (3..=12u32).find(|n| (f64::from(*n) - corners).abs() < 1e-9)?;
            let rotation = values.get(2).copied().unwrap_or(0.0);
            Definition::Polygon { diameter: *values.first()?, corners, rotation, hole: hole(3)? }
        }
        b"" => return None,
        name => Definition::Macro { name: String::from_utf8_lossy(name).into_owned(), values },
    };
    Some(Command::Define { code, shape: Box::new(shape) })
}

/// `X2Y3I1.5J2.5`, with or without I and J.
fn repeat(text: &[u8]) -> Option<Command> {
    let mut values = [1.0, 1.0, 0.0, 0.0];
    let mut at = 0;
    while at < text.len() {
        let slot = b"XYIJ".iter().position(|b| *b == text[at])?;
        let n = text[at + 1..].iter().take_while(|b| !b.is_ascii_uppercase()).count();
        values[slot] = number(&text[at + 1..at + 1 + n])?;
        at += 1 + n;
    }
    let count = |v: f64| {
        #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "whole and in range")]
        (v >= 1.0 && v <= f64::from(u32::MAX) && v.fract() == 0.0).then_some(v as u32)
    };
    Some(Command::Repeat { nx: count(values[0])?, ny: count(values[1])?, dx: values[2], dy: values[3] })
}

/// `A1.0B2.0`, either left out.
fn letter_pair(text: &[u8], a: u8, b: u8, default: f64) -> Option<(f64, f64)> {
    let mut pair = (default, default);
    let mut at = 0;
    while at < text.len() {
        let n = text[at + 1..].iter().take_while(|c| **c != a && **c != b).count();
        let value = number(&text[at + 1..at + 1 + n])?;
        match text[at] {
            letter if letter == a => pair.0 = value,
            letter if letter == b => pair.1 = value,
            _ => return None,
        }
        at += 1 + n;
    }
    Some(pair)
}

/// A finite decimal number; no exponent, as the format has none.
pub(super) fn number(text: &[u8]) -> Option<f64> {
    let plain = text.iter().all(|b| b.is_ascii_digit() || matches!(b, b'+' | b'-' | b'.'));
    let value: f64 = std::str::from_utf8(text).ok().filter(|_| plain)?.parse().ok()?;
    value.is_finite().then_some(value)
}

fn unsupported(construct: String, span: Span) -> GerberError {
    GerberError::Unsupported { construct, span }
}
