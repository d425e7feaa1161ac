//! Gerber job file: which file has which function. Its stackup is read by `job`.

use super::layer_role::{Role, by_function};
use serde::Deserialize;

#[derive(Deserialize)]
struct JobFile {
    #[serde(rename = "FilesAttributes", default)]
    files: Vec<FileEntry>,
}

#[derive(Deserialize)]
struct FileEntry {
    #[serde(rename = "Path", default)]
    path: String,
    #[serde(rename = "FileFunction", default)]
    function: String,
    #[serde(rename = "FilePolarity", default)]
    polarity: String,
}

/// What the job file says about one file.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Entry {
    /// File name, folders left out.
    pub(super) name: String,
    /// Its role.
    pub(super) role: Role,
    /// Its polarity, as written.
    pub(super) polarity: String,
}

/// The entries of a job file.
///
/// # Errors
/// What the JSON reader says.
pub(super) fn read(bytes: &[u8]) -> Result<Vec<Entry>, String> {
    let text = String::from_utf8_lossy(bytes);
    let job: JobFile =
        serde_json::from_str(text.trim_start_matches('\u{feff}')).map_err(|error| error.to_string())?;
    Ok(job.files.into_iter().filter_map(entry).collect())
}

fn entry(file: FileEntry) -> Option<Entry> {
    let fields: Vec<String> = file.function.split(',').map(str::to_owned).collect();
    let role = by_function(&fields)?;
    Some(Entry { name: base_name(&file.path).to_owned(), role, polarity: file.polarity })
}

/// The part after the last slash, either way round.
pub(super) fn base_name(path: &str) -> &str {
    path.rsplit(['/', '\\']).next().unwrap_or(path)
}
