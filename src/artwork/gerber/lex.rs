//! Gerber bytes to words: what stands between `*`, alone or in a `%...%` block.
//!
//! Bytes, not characters: files in Latin-1, with CR-only line ends or with stray bytes are read alike.

use super::error::GerberError;
use crate::diag::Span;

/// A word of the file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Word {
    /// Its bytes, white space at both ends left out.
    pub(super) span: Span,
    /// Whether it stands in a `%...%` block.
    pub(super) extended: bool,
    /// Whether it is the last of its block.
    pub(super) last: bool,
}

/// Walks over the words of a file.
#[derive(Debug)]
pub(super) struct Words<'a> {
    bytes: &'a [u8],
    at: usize,
    block: Option<usize>,
}

impl<'a> Words<'a> {
    pub(super) fn new(bytes: &'a [u8]) -> Self {
        // A byte-order mark is no part of the file's text.
        let at = if bytes.starts_with(&[0xEF, 0xBB, 0xBF]) { 3 } else { 0 };
        Words { bytes, at, block: None }
    }

    fn skip_space(&mut self) {
        while self.bytes.get(self.at).is_some_and(|b| b.is_ascii_whitespace() || *b == 0) {
            self.at += 1;
        }
    }

    /// The next word; `None` at the end of the file.
    pub(super) fn next_word(&mut self) -> Option<Result<Word, GerberError>> {
        loop {
            self.skip_space();
            match (self.bytes.get(self.at), self.block) {
                (None, Some(start)) => {
                    self.block = None;
                    return Some(Err(GerberError::Truncated {
                        what: "a `%` block that is not closed",
                        span: (start..start + 1).into(),
                    }));
                }
                (None, None) => return None,
                (Some(b'%'), Some(_)) => {
                    self.block = None;
                    self.at += 1;
                }
                (Some(b'%'), None) => {
                    self.block = Some(self.at);
                    self.at += 1;
                }
                (Some(_), _) => return Some(self.read_word()),
            }
        }
    }

    fn read_word(&mut self) -> Result<Word, GerberError> {
        let start = self.at;
        let extended = self.block.is_some();
        let rest = &self.bytes[start..];
        let Some(length) = rest.iter().position(|b| *b == b'*' || (extended && *b == b'%')) else {
            self.at = self.bytes.len();
            self.block = None;
            return Err(GerberError::Truncated {
                what: "a word that no `*` ends",
                span: (start..self.bytes.len()).into(),
            });
        };
        let mut end = start + length;
        self.at = if rest[length] == b'*' { end + 1 } else { end };
        while end > start && self.bytes[end - 1].is_ascii_whitespace() {
            end -= 1;
        }
        let mut peek = self.at;
        while self.bytes.get(peek).is_some_and(u8::is_ascii_whitespace) {
            peek += 1;
        }
        let last = !extended || self.bytes.get(peek) == Some(&b'%');
        Ok(Word { span: (start..end).into(), extended, last })
    }
}
