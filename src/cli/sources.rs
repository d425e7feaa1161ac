//! The files that were read: turns the ids and byte spans of the stages back into names, lines and text.

use std::path::{Path, PathBuf};
use std::sync::Arc;

use crate::cli::error::{CliError, PathOrigin};
use crate::diag::{FileId, Origin, Warning};

/// Every file read so far; `FileId(k)` is entry `k`.
#[derive(Debug, Clone, Default)]
pub struct Sources {
    files: Vec<SourceFile>,
}

#[derive(Debug, Clone)]
struct SourceFile {
    path: PathBuf,
    bytes: Arc<[u8]>,
}

impl Sources {
    /// Reads the file at `path`.
    ///
    /// # Errors
    /// [`CliError::Read`] when the system cannot.
    pub fn read(&mut self, path: &Path, role: &'static str, from: PathOrigin) -> Result<FileId, CliError> {
        let bytes = std::fs::read(path).map_err(|source| CliError::Read {
            role,
            path: path.to_owned(),
            from_job: from,
            source,
        })?;
        self.files.push(SourceFile { path: path.to_owned(), bytes: bytes.into() });
        Ok(FileId(u32::try_from(self.files.len() - 1).unwrap_or(u32::MAX)))
    }

    /// Reads the text file at `path`.
    ///
    /// # Errors
    /// [`CliError::Read`] when the system cannot; [`CliError::NotUtf8`] when it is no text.
    pub fn read_text(
        &mut self,
        path: &Path,
        role: &'static str,
        from: PathOrigin,
    ) -> Result<(FileId, String), CliError> {
        let id = self.read(path, role, from)?;
        match std::str::from_utf8(self.bytes(id)) {
            // A byte order mark is no part of the text; spans then count from behind it, as the text does.
            Ok(text) => Ok((id, text.to_owned())),
            Err(error) => Err(CliError::NotUtf8 { role, path: path.to_owned(), offset: error.valid_up_to() }),
        }
    }

    /// The bytes of a file.
    #[must_use]
    pub fn bytes(&self, id: FileId) -> &[u8] {
        self.files.get(id.0 as usize).map_or(&[], |file| &file.bytes)
    }

    /// The name of a file, as it was looked for.
    #[must_use]
    pub fn name(&self, id: FileId) -> String {
        self.files.get(id.0 as usize).map_or_else(|| "?".to_owned(), |file| file.path.display().to_string())
    }

    /// The text of a file with byte offsets kept: bytes that are no text become question marks.
    #[must_use]
    pub fn text(&self, id: FileId) -> String {
        let bytes = self.bytes(id);
        std::str::from_utf8(bytes).map_or_else(
            |_| bytes.iter().map(|b| if b.is_ascii() { char::from(*b) } else { '?' }).collect(),
            str::to_owned,
        )
    }

    /// Line and column, both from 1, of a byte. CR, LF and CR LF end lines.
    #[must_use]
    pub fn line_and_column(&self, id: FileId, offset: usize) -> (usize, usize) {
        let bytes = self.bytes(id);
        let before = &bytes[..offset.min(bytes.len())];
        let ends =
            |k: &usize| before[*k] == b'\n' || (before[*k] == b'\r' && bytes.get(*k + 1) != Some(&b'\n'));
        let line = (0..before.len()).filter(ends).count() + 1;
        let start = (0..before.len()).rev().find(ends).map_or(0, |k| k + 1);
        (line, String::from_utf8_lossy(&before[start..]).chars().count() + 1)
    }

    /// "job.toml:12:3", when the origin is a place in a file.
    #[must_use]
    pub fn place(&self, origin: Origin) -> Option<String> {
        let id = origin.file?;
        let (line, column) = self.line_and_column(id, origin.span.start);
        Some(format!("{}:{line}:{column}", self.name(id)))
    }

    /// A warning as one line, with its place.
    #[must_use]
    pub fn warning(&self, warning: &Warning) -> String {
        match self.place(warning.origin) {
            Some(place) => format!("{} ({place})", warning.text),
            None => warning.text.clone(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sources(bytes: &[u8]) -> Sources {
        Sources { files: vec![SourceFile { path: "dir/a.gbr".into(), bytes: bytes.into() }] }
    }

    #[test]
    fn places_count_lines_of_every_ending() {
        let sources = sources(b"ab\ncd\r\nef\rgh");
        let at = |offset| sources.line_and_column(FileId(0), offset);
        assert_eq!(
            [at(0), at(1), at(3), at(7), at(8), at(10), at(99)],
            [(1, 1), (1, 2), (2, 1), (3, 1), (3, 2), (4, 1), (4, 3)]
        );
        let warning = Warning::new("odd", Origin::new(FileId(0), 4..5));
        assert_eq!(sources.warning(&warning), "odd (dir/a.gbr:2:2)");
        assert_eq!(sources.warning(&Warning::new("odd", Origin::default())), "odd");
    }

    #[test]
    fn text_keeps_offsets_of_other_encodings() {
        assert_eq!(sources(b"\xb5m*").text(FileId(0)), "?m*");
    }
}
