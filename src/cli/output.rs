//! Whole files or none: everything is written beside its final place first, and renamed only when all of it is there.

use std::io::Write as _;
use std::path::Path;

use crate::cli::error::CliError;
use crate::report::ReportFile;

/// Makes sure that `directory` is there and can be written to, before a long computation.
///
/// # Errors
/// [`CliError::Write`] when it cannot.
pub(crate) fn prepare(directory: &Path) -> Result<(), CliError> {
    let failed = |source| CliError::Write { path: directory.to_owned(), source };
    std::fs::create_dir_all(directory).map_err(failed)?;
    scratch(directory).map(drop).map_err(failed)
}

/// Writes all `files` into `directory`, replacing those of an earlier run.
///
/// # Errors
/// [`CliError::Write`] when one cannot be written; then none of the files has changed, unless a rename failed half way.
pub(crate) fn write_all(directory: &Path, files: &[ReportFile]) -> Result<(), CliError> {
    let mut written = Vec::with_capacity(files.len());
    for file in files {
        let path = directory.join(file.name);
        let write = || -> std::io::Result<tempfile::NamedTempFile> {
            let mut scratch = scratch(directory)?;
            scratch.write_all(file.text.as_bytes())?;
            scratch.as_file().sync_all()?;
            Ok(scratch)
        };
        let scratch = write().map_err(|source| CliError::Write { path: path.clone(), source })?;
        written.push((path, scratch));
    }
    for (path, scratch) in written {
        if let Err(error) = scratch.persist(&path) {
            return Err(CliError::Write { path, source: error.error });
        }
    }
    Ok(())
}

/// A hidden file that vanishes unless it is renamed. It may be read by others, as a plain new file could.
fn scratch(directory: &Path) -> std::io::Result<tempfile::NamedTempFile> {
    let mut builder = tempfile::Builder::new();
    builder.prefix(".chargeskin-").suffix(".part");
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt as _;
        // The process's umask takes away from these bits what the user does not want.
        builder.permissions(std::fs::Permissions::from_mode(0o666));
    }
    builder.tempfile_in(directory)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn file(name: &'static str, text: &str) -> ReportFile {
        ReportFile { name, text: text.to_owned() }
    }

    #[test]
    fn all_files_are_replaced_and_nothing_else_is_left() {
        let directory = tempfile::tempdir().unwrap();
        let out = directory.path().join("new");
        prepare(&out).unwrap();
        write_all(&out, &[file("a", "old"), file("b", "old")]).unwrap();
        write_all(&out, &[file("a", "new"), file("b", "new")]).unwrap();
        let entries = std::fs::read_dir(&out).unwrap().count();
        assert_eq!(entries, 2, "no scratch file stays");
        for name in ["a", "b"] {
            assert_eq!(std::fs::read_to_string(out.join(name)).unwrap(), "new");
        }
    }

    #[test]
    fn a_file_that_cannot_be_replaced_leaves_no_scratch() {
        let directory = tempfile::tempdir().unwrap();
        std::fs::create_dir(directory.path().join("b")).unwrap();
        std::fs::write(directory.path().join("b/inside"), "x").unwrap();
        let error = write_all(directory.path(), &[file("b", "new")]).unwrap_err();
        assert!(matches!(error, CliError::Write { .. }));
        assert_eq!(std::fs::read_dir(directory.path()).unwrap().count(), 1);
    }

    #[test]
    fn a_directory_under_a_file_is_refused() {
        let directory = tempfile::tempdir().unwrap();
        std::fs::write(directory.path().join("file"), "x").unwrap();
        assert!(matches!(prepare(&directory.path().join("file/out")), Err(CliError::Write { .. })));
    }
}
