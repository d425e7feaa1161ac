//! What a drill file declares about itself: unit, digits, zeros, plating, span; in the header and in comments.

/// How a coordinate without a decimal point is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Digits {
    /// Digits before the point.
    pub(crate) integer: u8,
    /// Digits after it.
    pub(crate) decimal: u8,
    /// Trailing zeros are left out (`LZ`: leading ones are kept); else leading ones are.
    pub(crate) trailing_omitted: bool,
}

/// Declarations found so far.
#[derive(Debug, Clone, Default)]
pub(super) struct Header {
    /// m per unit.
    pub(super) unit: Option<f64>,
    /// Digits before and after the point.
    pub(super) counts: Option<(u8, u8)>,
    /// Whether trailing zeros are left out.
    pub(super) trailing_omitted: Option<bool>,
    /// Plating, by comment.
    pub(super) plated: Option<bool>,
    /// Fields of `.FileFunction`.
    pub(super) function: Option<Vec<String>>,
    /// Plating of the tools defined from here on (`.AperFunction`).
    pub(super) tool_plated: Option<bool>,
}

impl Header {
    /// Takes in a comment, `text` being what follows the semicolon.
    pub(super) fn comment(&mut self, text: &str) {
        let text = text.trim();
        if let Some(attribute) = text.strip_prefix("#@!") {
            self.attribute(attribute.trim());
            return;
        }
        let upper = text.to_ascii_uppercase();
        let compact: String = upper.chars().filter(|c| !c.is_whitespace()).collect();
        if let Some(format) = compact.strip_prefix("FILE_FORMAT=") {
            self.counts = counts(format).or(self.counts);
        } else if let Some(format) = compact.strip_prefix("FORMAT={").or(compact.strip_prefix("FORMAT:")) {
            self.counts = counts(format).or(self.counts);
            if format.contains("SUPPRESSLEADINGZEROS") {
                self.trailing_omitted.get_or_insert(false);
            } else if format.contains("SUPPRESSTRAILINGZEROS") {
                self.trailing_omitted.get_or_insert(true);
            }
        } else if let Some(kind) = compact.strip_prefix("TYPE=").or(compact.strip_prefix("CONTENTS:")) {
            let bare = ["NON_PLATED", "NON-PLATED", "NONPLATED"].iter().any(|word| kind.contains(word));
            if bare {
                self.plated = Some(false);
            } else if kind.contains("PLATED") {
                self.plated = Some(true);
            }
        }
    }

    fn attribute(&mut self, text: &str) {
        let fields: Vec<String> = text.split(',').map(|f| f.trim().to_owned()).collect();
        match fields[0].as_str() {
            "TF.FileFunction" => self.function = Some(fields[1..].to_vec()),
            "TA.AperFunction" => {
                self.tool_plated = match fields.get(1).map(String::as_str) {
                    Some("Plated") => Some(true),
                    Some("NonPlated") => Some(false),
                    _ => None,
                };
            }
            "TD" | "TD.AperFunction" => self.tool_plated = None,
            _ => {}
        }
    }

    /// Takes in `METRIC,LZ,000.000` or `INCH,TZ`.
    pub(super) fn unit_line(&mut self, line: &str) -> bool {
        let mut fields = line.split(',').map(str::trim);
        self.unit = match fields.next() {
            Some("METRIC") => Some(1e-3),
            Some("INCH") => Some(25.4e-3),
            _ => return false,
        };
        for field in fields {
            match field {
                "LZ" => self.trailing_omitted = Some(true),
                "TZ" => self.trailing_omitted = Some(false),
                zeros if !zeros.is_empty() && zeros.bytes().all(|b| b == b'0' || b == b'.') => {
                    if let Some((whole, part)) = zeros.split_once('.')
                        && let (Ok(whole), Ok(part)) = (u8::try_from(whole.len()), u8::try_from(part.len()))
                    {
                        self.counts = Some((whole, part));
                    }
                }
                _ => return false,
            }
        }
        true
    }

    /// The digits, when the file settles them.
    pub(super) fn digits(&self) -> Option<Digits> {
        let ((integer, decimal), trailing_omitted) = self.counts.zip(self.trailing_omitted)?;
        Some(Digits { integer, decimal, trailing_omitted })
    }
}

/// `4:4` or `3.3` at the start of `text`.
fn counts(text: &str) -> Option<(u8, u8)> {
    let digit = |k: usize| text.as_bytes().get(k).filter(|b| b.is_ascii_digit()).map(|b| b - b'0');
    matches!(text.as_bytes().get(1), Some(b':' | b'.')).then_some(())?;
    Some((digit(0)?, digit(2)?))
}
